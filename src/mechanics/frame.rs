//! Reference frames: which axes, about which origin, with which sense of x.
//!
//! The default frame, in which everything is computed, has rotating axes about the barycentre with x towards the
//! smaller primary. A state of it, r and v at time t, becomes in another frame
//!
//! ρ = R(t) S (r − o), ν = R(t) S (v + ẑ × (r − o))
//!
//! where o is the origin, S the half turn about z of the `toward_larger` convention, and for inertial axes R(t)
//! the rotation by the angle t that the primaries have turned through since time 0; for rotating axes R is the
//! identity and ẑ × (r − o) is left out. The map is affine and its linear part does not depend on the origin.
//!
//! See Szebehely 1967, *Theory of Orbits*, chapter 1, for the rotating (synodic) and inertial (sidereal) axes.

use nalgebra::{Matrix3, Matrix6, Vector3};
use thiserror::Error;

use crate::quantity::{MassParameter, Quantity};
use crate::state::State;

/// Which axes coordinates are along.
#[derive(Clone, Copy, Debug, Default, Eq, PartialEq)]
pub enum Axes {
    /// Turning with the primaries.
    #[default]
    Rotating,
    /// Fixed in space, coinciding with the rotating ones at time 0.
    Inertial,
}

/// Where coordinates are counted from. Velocities are relative to the origin.
#[derive(Clone, Copy, Debug, Default, Eq, PartialEq)]
pub enum Origin {
    /// The centre of mass of the primaries.
    #[default]
    Barycenter,
    /// The larger primary.
    Larger,
    /// The smaller primary.
    Smaller,
}

impl Origin {
    /// x of this origin, counted from `other` towards the smaller primary; none if they are the same.
    pub(crate) fn x_seen_from(self, other: Self, mass_parameter: MassParameter) -> Option<f64> {
        let mu = mass_parameter.get();
        match (self, other) {
            (Self::Barycenter, Self::Larger) => Some(mu),
            (Self::Barycenter, Self::Smaller) => Some(-(1.0 - mu)),
            (Self::Larger, Self::Barycenter) => Some(-mu),
            (Self::Smaller, Self::Barycenter) => Some(1.0 - mu),
            (Self::Larger, Self::Smaller) => Some(-1.0),
            (Self::Smaller, Self::Larger) => Some(1.0),
            (Self::Barycenter, Self::Barycenter)
            | (Self::Larger, Self::Larger)
            | (Self::Smaller, Self::Smaller) => None,
        }
    }
}

/// Which way the x axis points, at time 0 if the axes are inertial.
#[derive(Clone, Copy, Debug, Default, Eq, PartialEq)]
pub enum XAxis {
    /// From the larger primary to the smaller.
    #[default]
    TowardSmaller,
    /// From the smaller primary to the larger.
    TowardLarger,
}

/// A reference frame. The default one is rotating, barycentric, x towards the smaller primary.
#[derive(Clone, Copy, Debug, Default, Eq, PartialEq)]
pub struct Frame {
    /// Which axes coordinates are along.
    pub axes: Axes,
    /// Where coordinates are counted from.
    pub origin: Origin,
    /// Which way the x axis points.
    pub x_axis: XAxis,
}

/// Momenta were asked for in a frame other than a barycentric rotating one.
#[derive(Clone, Copy, Debug, Eq, Error, PartialEq)]
#[error("canonical momenta need rotating axes about the barycenter")]
pub struct NotCanonical;

impl Frame {
    /// Whether this is the frame that everything is computed in.
    #[must_use]
    pub fn is_default(self) -> bool {
        self == Self::default()
    }

    /// Whether the axes turn with the primaries, so that positions do not depend on time.
    #[must_use]
    pub fn is_rotating(self) -> bool {
        self.axes == Axes::Rotating
    }

    /// Rotating axes towards the smaller primary about the same origin: between these and this frame a position keeps
    /// its digits however near the origin it is.
    #[must_use]
    pub fn co_rotating(self) -> Self {
        Self { origin: self.origin, ..Self::default() }
    }

    /// A state of the default frame in this one. The default frame keeps the bits.
    #[must_use]
    pub fn from_default(self, mass_parameter: MassParameter, state: &State) -> State {
        Self::default().convert(self, mass_parameter, state)
    }

    /// A state of this frame in the default one. The default frame keeps the bits.
    #[must_use]
    pub fn to_default(self, mass_parameter: MassParameter, state: &State) -> State {
        self.convert(Self::default(), mass_parameter, state)
    }

    /// A state of this frame in `other`. Between frames of one origin a position keeps its digits however near the
    /// origin it is; a frame and itself keep the bits.
    #[must_use]
    pub fn convert(self, other: Self, mass_parameter: MassParameter, state: &State) -> State {
        if self == other {
            return *state;
        }
        let State { time, position, velocity } = *state;
        let (turn, other_turn) = (self.turn(time), other.turn(time));
        let mut position = turn.backward(&position);
        let mut velocity = turn.backward(&velocity);
        if self.axes == Axes::Inertial {
            velocity -= swept(&position);
        }
        if let Some(x) = self.origin.x_seen_from(other.origin, mass_parameter) {
            position.x += x;
        }
        if other.axes == Axes::Inertial {
            velocity += swept(&position);
        }
        State { time, position: other_turn.forward(&position), velocity: other_turn.forward(&velocity) }
    }

    /// A position of the default frame at `time` in this one.
    #[must_use]
    pub fn position_from_default(
        self,
        mass_parameter: MassParameter,
        time: f64,
        position: &Vector3<f64>,
    ) -> Vector3<f64> {
        let mut position = *position;
        if let Some(x) = Origin::default().x_seen_from(self.origin, mass_parameter) {
            position.x += x;
        }
        self.turn(time).forward(&position)
    }

    /// A position of this frame at `time` in the default one.
    #[must_use]
    pub fn position_to_default(
        self,
        mass_parameter: MassParameter,
        time: f64,
        position: &Vector3<f64>,
    ) -> Vector3<f64> {
        let mut position = self.turn(time).backward(position);
        if let Some(x) = self.origin.x_seen_from(Origin::default(), mass_parameter) {
            position.x += x;
        }
        position
    }

    /// A direction or Δv of the default frame at `time` in this one.
    #[must_use]
    pub fn direction_from_default(self, time: f64, direction: &Vector3<f64>) -> Vector3<f64> {
        self.turn(time).forward(direction)
    }

    /// A direction or Δv of this frame at `time` in the default one.
    #[must_use]
    pub fn direction_to_default(self, time: f64, direction: &Vector3<f64>) -> Vector3<f64> {
        self.turn(time).backward(direction)
    }

    /// The plane `normal`·ρ = `offset` of this frame as a plane of the default one at `time`: the (normal,
    /// offset) m, d with m·r − d = `normal`·ρ − `offset` for every position. In inertial axes m turns clockwise
    /// about z with unit rate, and d with it if the origin is a primary.
    #[must_use]
    pub fn plane_in_default(
        self,
        mass_parameter: MassParameter,
        time: f64,
        normal: &Vector3<f64>,
        offset: f64,
    ) -> (Vector3<f64>, f64) {
        let normal = self.turn(time).backward(normal);
        match self.origin.x_seen_from(Origin::default(), mass_parameter) {
            None => (normal, offset),
            Some(x) => (normal, offset + normal.x * x),
        }
    }

    /// d(state of this frame)/d(state of the default one) at `time`, 6×6 in the order x y z vx vy vz. It is the
    /// same for every state, mass parameter and origin, since the map is affine.
    #[must_use]
    pub fn jacobian(self, time: f64) -> Matrix6<f64> {
        let turn = self.turn(time).matrix();
        self.blocks(turn, turn * sweep())
    }

    /// d(state of the default frame)/d(state of this one) at `time`: the inverse of [`Frame::jacobian`].
    #[must_use]
    pub fn inverse_jacobian(self, time: f64) -> Matrix6<f64> {
        let turn = self.turn(time).matrix().transpose();
        self.blocks(turn, -(sweep() * turn))
    }

    /// Canonical momenta (px, py, pz) = (vx − y, vy + x, vz) of a state of this frame.
    ///
    /// # Errors
    /// [`NotCanonical`] unless the frame is rotating and barycentric.
    pub fn momentum(self, state: &State) -> Result<Vector3<f64>, NotCanonical> {
        if self.is_canonical() { Ok(state.velocity + swept(&state.position)) } else { Err(NotCanonical) }
    }

    /// The velocity at `position` that has the canonical momenta `momentum`, both of this frame.
    ///
    /// # Errors
    /// [`NotCanonical`] unless the frame is rotating and barycentric.
    pub fn velocity_from_momentum(
        self,
        position: &Vector3<f64>,
        momentum: &Vector3<f64>,
    ) -> Result<Vector3<f64>, NotCanonical> {
        if self.is_canonical() { Ok(momentum - swept(position)) } else { Err(NotCanonical) }
    }

    /// Whether canonical momenta are defined: the half turn of `toward_larger` leaves their form as it is.
    #[must_use]
    pub fn is_canonical(self) -> bool {
        self.is_rotating() && self.origin == Origin::Barycenter
    }

    fn blocks(self, turn: Matrix3<f64>, velocity_by_position: Matrix3<f64>) -> Matrix6<f64> {
        let mut jacobian = Matrix6::zeros();
        jacobian.fixed_view_mut::<3, 3>(0, 0).copy_from(&turn);
        jacobian.fixed_view_mut::<3, 3>(3, 3).copy_from(&turn);
        if self.axes == Axes::Inertial {
            jacobian.fixed_view_mut::<3, 3>(3, 0).copy_from(&velocity_by_position);
        }
        jacobian
    }

    /// The rotation from the default axes to this frame's at `time`.
    fn turn(self, time: f64) -> Turn {
        let (sin, cos) = match self.axes {
            Axes::Rotating => (0.0, 1.0),
            Axes::Inertial => libm::sincos(time),
        };
        match self.x_axis {
            XAxis::TowardSmaller => Turn { sin, cos, still: self.is_rotating() },
            XAxis::TowardLarger => Turn { sin: -sin, cos: -cos, still: false },
        }
    }
}

/// A rotation about z.
#[derive(Clone, Copy)]
struct Turn {
    sin: f64,
    cos: f64,
    /// Whether it is by no angle at all: negative zeros survive only if nothing is computed.
    still: bool,
}

impl Turn {
    fn forward(self, vector: &Vector3<f64>) -> Vector3<f64> {
        if self.still {
            return *vector;
        }
        let Self { sin, cos, .. } = self;
        Vector3::new(cos * vector.x - sin * vector.y, sin * vector.x + cos * vector.y, vector.z)
    }

    fn backward(self, vector: &Vector3<f64>) -> Vector3<f64> {
        Self { sin: -self.sin, ..self }.forward(vector)
    }

    fn matrix(self) -> Matrix3<f64> {
        let Self { sin, cos, .. } = self;
        Matrix3::new(cos, 0.0 - sin, 0.0, sin, cos, 0.0, 0.0, 0.0, 1.0)
    }
}

/// ẑ × r, the velocity of a point that turns with the primaries.
fn swept(position: &Vector3<f64>) -> Vector3<f64> {
    Vector3::new(-position.y, position.x, 0.0)
}

/// The matrix of [`swept`].
fn sweep() -> Matrix3<f64> {
    Matrix3::new(0.0, -1.0, 0.0, 1.0, 0.0, 0.0, 0.0, 0.0, 0.0)
}
