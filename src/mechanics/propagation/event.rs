//! What is watched for along a trajectory.

use std::num::NonZeroU64;

use nalgebra::Vector3;

use crate::quantity::Distance;
use crate::system::Primary;

/// A condition, which of its occurrences count, and whether they end the trajectory.
#[derive(Clone, Debug, PartialEq)]
pub struct Event {
    /// The condition.
    pub when: When,
    /// The sign of the condition's rate in increasing time.
    pub direction: Direction,
    /// Drops the occurrences on the wrong side of a plane, before they are counted.
    pub only: Option<Only>,
    /// Ends the trajectory at this many occurrences.
    pub stop_after: Option<NonZeroU64>,
}

/// A condition: the zero of a function of the state, evaluated in the request's frame.
#[derive(Clone, Debug, PartialEq)]
pub enum When {
    /// The position crosses a plane.
    Plane(Plane),
    /// The distance to a primary's centre takes a value.
    Distance(Primary, Distance),
    /// The distance to a primary's centre is smallest.
    Periapsis(Primary),
    /// The distance to a primary's centre is largest.
    Apoapsis(Primary),
}

/// The plane n · r = c with unit normal n.
#[derive(Clone, Debug, PartialEq)]
pub struct Plane {
    normal: Vector3<f64>,
    offset: f64,
}

impl Plane {
    /// The plane on which the coordinate of axis 0, 1 or 2 (x, y, z) is `value`.
    #[must_use]
    pub fn across(axis: usize, value: f64) -> Self {
        let mut normal = Vector3::zeros();
        normal[axis] = 1.0;
        Self { normal, offset: value }
    }

    /// The plane at right angles to `normal` through a point; none for a normal without a direction.
    #[must_use]
    pub fn through(normal: Vector3<f64>, point: Vector3<f64>) -> Option<Self> {
        let largest = normal.amax();
        // Scaled first, so that the square of a long or short normal neither overflows nor vanishes.
        let scaled = normal / largest;
        let unit = scaled / scaled.norm();
        (largest > 0.0 && unit.iter().all(|c| c.is_finite()))
            .then(|| Self { normal: unit, offset: unit.dot(&point) })
    }

    /// The unit normal.
    #[must_use]
    pub fn normal(&self) -> Vector3<f64> {
        self.normal
    }

    /// The distance of the plane from the origin along its normal.
    #[must_use]
    pub fn offset(&self) -> f64 {
        self.offset
    }
}

/// The sign of a rate.
#[derive(Clone, Copy, Debug, Default, Eq, PartialEq)]
pub enum Direction {
    /// Both signs.
    #[default]
    Either,
    /// Positive in increasing time.
    Increasing,
    /// Negative in increasing time.
    Decreasing,
}

impl Direction {
    /// Whether a rate of this sign counts.
    #[must_use]
    pub fn admits(self, rate: f64) -> bool {
        match self {
            Self::Either => true,
            Self::Increasing => rate > 0.0,
            Self::Decreasing => rate < 0.0,
        }
    }
}

/// A half space of the request's frame, bounded by an axis plane.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Only {
    /// 0, 1 or 2: x, y or z.
    pub axis: usize,
    /// The side of the plane.
    pub side: Side,
    /// The coordinate of the plane.
    pub value: f64,
}

/// A side of an axis plane.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub enum Side {
    /// Larger coordinates.
    Above,
    /// Smaller coordinates.
    Below,
}

impl Only {
    /// Whether a position lies in the half space.
    #[must_use]
    pub fn admits(&self, position: &Vector3<f64>) -> bool {
        match self.side {
            Side::Above => position[self.axis] > self.value,
            Side::Below => position[self.axis] < self.value,
        }
    }
}
