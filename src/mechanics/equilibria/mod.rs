//! The five equilibria: where they lie, their Jacobi constants and the linear motion about them.
//!
//! Distances to the primaries are solved for, never differenced, so they keep their digits however small the
//! mass parameter is; the barycentric coordinates of a point near a primary cannot.

mod collinear;
mod linear;

use nalgebra::Vector3;

pub use linear::{LinearMotion, ROUTH};

use crate::arithmetic::DoubleDouble;
use crate::frame::Origin;
use crate::potential::{JacobiConstant, Place, larger_share};
use crate::quantity::{MassParameter, Quantity};
use crate::state::State;

/// Name of an equilibrium; it goes with the bodies and not with the frame.
#[derive(Clone, Copy, Debug, Eq, Hash, Ord, PartialEq, PartialOrd)]
pub enum Point {
    /// Between the primaries.
    L1,
    /// Beyond the smaller primary.
    L2,
    /// Beyond the larger primary.
    L3,
    /// 60 degrees ahead of the smaller primary.
    L4,
    /// 60 degrees behind the smaller primary.
    L5,
}

impl Point {
    /// All five, in order.
    pub const ALL: [Self; 5] = [Self::L1, Self::L2, Self::L3, Self::L4, Self::L5];

    /// `"L1"` to `"L5"`.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::L1 => "L1",
            Self::L2 => "L2",
            Self::L3 => "L3",
            Self::L4 => "L4",
            Self::L5 => "L5",
        }
    }
}

/// One equilibrium.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Equilibrium {
    point: Point,
    mass_parameter: MassParameter,
    larger: DoubleDouble,
    smaller: DoubleDouble,
    position: Vector3<f64>,
    jacobi_constant: JacobiConstant,
}

impl Equilibrium {
    fn new(point: Point, mass_parameter: MassParameter) -> Self {
        let mu = mass_parameter.get();
        let one = DoubleDouble::from(1.0);
        let (larger, smaller) = match point {
            Point::L1 => {
                let gamma = collinear::gamma(collinear::Side::Inner, mu);
                (one - gamma, gamma)
            }
            Point::L2 => {
                let gamma = collinear::gamma(collinear::Side::Outer, mu);
                (one + gamma, gamma)
            }
            Point::L3 => {
                let departure = collinear::departure(mu);
                (one - departure, one - departure + 1.0)
            }
            Point::L4 | Point::L5 => (one, one),
        };
        let height = 0.75_f64.sqrt();
        let position = match point {
            Point::L1 => Vector3::new((larger_share(mu) - smaller).to_f64(), 0.0, 0.0),
            Point::L2 => Vector3::new((larger_share(mu) + smaller).to_f64(), 0.0, 0.0),
            Point::L3 => Vector3::new((-larger - mu).to_f64(), 0.0, 0.0),
            Point::L4 => Vector3::new(0.5 - mu, height, 0.0),
            Point::L5 => Vector3::new(0.5 - mu, -height, 0.0),
        };
        let place = Place { larger, smaller, height_squared: DoubleDouble::default() };
        let jacobi_constant = JacobiConstant::of_place(mass_parameter, &place);
        Self { point, mass_parameter, larger, smaller, position, jacobi_constant }
    }

    /// Which of the five.
    #[must_use]
    pub fn point(&self) -> Point {
        self.point
    }

    /// Barycentric rotating position (x, y, z), in separations.
    #[must_use]
    pub fn position(&self) -> Vector3<f64> {
        self.position
    }

    /// Rotating position (x, y, z) from `origin`, in separations. From a primary its digits are those of the distances,
    /// however near the point is.
    #[must_use]
    pub fn position_from(&self, origin: Origin) -> Vector3<f64> {
        let (larger, smaller) = (self.distance_to_larger(), self.distance_to_smaller());
        let x = match (origin, self.point) {
            (Origin::Barycenter, _) => self.position.x,
            (Origin::Larger, Point::L1 | Point::L2) => larger,
            (Origin::Larger, Point::L3) => -larger,
            (Origin::Larger, Point::L4 | Point::L5) => 0.5,
            (Origin::Smaller, Point::L1 | Point::L3) => -smaller,
            (Origin::Smaller, Point::L2) => smaller,
            (Origin::Smaller, Point::L4 | Point::L5) => -0.5,
        };
        Vector3::new(x, self.position.y, self.position.z)
    }

    /// The state of rest in it at time 0.
    #[must_use]
    pub fn state(&self) -> State {
        State { time: 0.0, position: self.position, velocity: Vector3::zeros() }
    }

    /// Distance to the larger primary, correctly rounded, in separations.
    #[must_use]
    pub fn distance_to_larger(&self) -> f64 {
        self.larger.to_f64()
    }

    /// Distance to the smaller primary, correctly rounded, in separations.
    #[must_use]
    pub fn distance_to_smaller(&self) -> f64 {
        self.smaller.to_f64()
    }

    /// Jacobi constant of rest in it. `a.jacobi_constant().above(&b.jacobi_constant())` is the difference of two,
    /// without cancellation.
    #[must_use]
    pub fn jacobi_constant(&self) -> JacobiConstant {
        self.jacobi_constant
    }

    /// Linear motion about it.
    #[must_use]
    pub fn linear_motion(&self) -> LinearMotion {
        let mu = self.mass_parameter.get();
        match self.point {
            Point::L1 | Point::L2 | Point::L3 => {
                LinearMotion::collinear(&linear::Attraction::new(self.point, mu, self.larger, self.smaller))
            }
            Point::L4 | Point::L5 => LinearMotion::triangular(mu),
        }
    }

    /// Acceleration left over at rest in the point at the returned distance to its nearer primary (at the
    /// returned position for L4 and L5), in separations times mean motion squared. Measured, not assumed.
    #[must_use]
    pub fn residual(&self) -> f64 {
        match self.point {
            Point::L1 => self.residual_on_axis(DoubleDouble::from(-self.distance_to_smaller())),
            Point::L2 => self.residual_on_axis(DoubleDouble::from(self.distance_to_smaller())),
            Point::L3 => self.residual_on_axis(DoubleDouble::sum(-self.distance_to_larger(), -1.0)),
            Point::L4 | Point::L5 => crate::potential::gradient(self.mass_parameter, &self.position).norm(),
        }
    }

    /// |∂Ω/∂x| on the x axis, at an offset from the smaller primary.
    fn residual_on_axis(&self, from_smaller: DoubleDouble) -> f64 {
        let mu = self.mass_parameter.get();
        let from_larger = from_smaller + 1.0;
        let pull = |d: DoubleDouble| {
            let pull = DoubleDouble::from(1.0) / d.squared();
            if d < DoubleDouble::default() { -pull } else { pull }
        };
        let force = from_larger - mu - larger_share(mu) * pull(from_larger) - pull(from_smaller) * mu;
        force.to_f64().abs()
    }

    /// Distances to the larger and the smaller primary.
    pub(crate) fn exact_distances(&self) -> (DoubleDouble, DoubleDouble) {
        (self.larger, self.smaller)
    }
}

/// The five equilibria of one mass parameter.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Equilibria {
    mass_parameter: MassParameter,
    points: [Equilibrium; 5],
}

impl Equilibria {
    /// Solves for them. Needs a few microseconds; every iteration is capped.
    #[must_use]
    pub fn of(mass_parameter: MassParameter) -> Self {
        Self { mass_parameter, points: Point::ALL.map(|point| Equilibrium::new(point, mass_parameter)) }
    }

    /// μ of the system.
    #[must_use]
    pub fn mass_parameter(&self) -> MassParameter {
        self.mass_parameter
    }

    /// One of them.
    #[must_use]
    pub fn get(&self, point: Point) -> &Equilibrium {
        let [l1, l2, l3, l4, l5] = &self.points;
        match point {
            Point::L1 => l1,
            Point::L2 => l2,
            Point::L3 => l3,
            Point::L4 => l4,
            Point::L5 => l5,
        }
    }

    /// L1 to L5.
    pub fn iter(&self) -> impl Iterator<Item = &Equilibrium> {
        self.points.iter()
    }

    /// Largest of the five residuals.
    #[must_use]
    pub fn largest_residual(&self) -> f64 {
        self.iter().map(Equilibrium::residual).fold(0.0, f64::max)
    }
}
