//! Steepest ascent of the effective potential, followed no farther than is needed to know where it ends.

use nalgebra::Vector3;

use super::Region;
use crate::equilibria::{Equilibria, Point};
use crate::potential::gradient_about_smaller;
use crate::quantity::{MassParameter, Quantity};

/// Step times the largest eigenvalue that the Hessian can have: the classical Runge-Kutta method then errs by
/// 2e-5 of the step's own length, whatever that is, so that a start a hair beside a border stays on its side.
const STEP: f64 = 0.3;

/// Steps after which the ascent counts as having ended on a saddle. A hundred e-foldings off it, or from the
/// greatest height on the axis away from it, take fewer.
const MOST_STEPS: usize = 512;

/// The surfaces that tell where an ascent ends; see [`Region::of`].
pub(super) struct Basins {
    mass_parameter: MassParameter,
    smaller_ball_squared: f64,
    larger_ball_squared: f64,
    cylinder_squared: f64,
}

impl Basins {
    pub(super) fn of(equilibria: &Equilibria) -> Self {
        let (l1, l2) = (equilibria.get(Point::L1), equilibria.get(Point::L2));
        let squared = |r: f64| r * r;
        Self {
            mass_parameter: equilibria.mass_parameter(),
            smaller_ball_squared: squared(l1.distance_to_smaller()),
            larger_ball_squared: squared(l1.distance_to_larger()),
            cylinder_squared: squared(l2.distance_to_larger()),
        }
    }

    /// Follows the ascent from a position; `enclosed` if it is known not to escape.
    pub(super) fn ascend(&self, position: &Vector3<f64>, enclosed: bool) -> Region {
        let mu = self.mass_parameter.get();
        // Taken about the smaller primary, where distances may be far below the round-off of x.
        let mut offset = Vector3::new((position.x - 1.0) + mu, position.y, position.z);
        for _ in 0..MOST_STEPS {
            if let Some(region) = self.certain(&offset, enclosed) {
                return region;
            }
            offset = step(mu, &offset);
        }
        if offset.x < -1.0 { Region::AroundLarger } else { Region::AroundSmaller }
    }

    fn certain(&self, offset: &Vector3<f64>, enclosed: bool) -> Option<Region> {
        let from_larger = offset.x + 1.0;
        let across = offset.y * offset.y;
        let cylinder_smaller = offset.x * offset.x + across;
        let cylinder_larger = from_larger * from_larger + across;
        let height = offset.z * offset.z;
        if cylinder_smaller + height <= self.smaller_ball_squared {
            Some(Region::AroundSmaller)
        } else if cylinder_larger + height <= self.larger_ball_squared {
            Some(Region::AroundLarger)
        } else if !enclosed
            && (cylinder_larger >= self.cylinder_squared
                || (cylinder_larger >= 1.0 && cylinder_smaller >= 1.0))
        {
            Some(Region::Outside)
        } else {
            None
        }
    }
}

/// One step of the classical fourth-order Runge-Kutta method along the gradient.
fn step(mu: f64, offset: &Vector3<f64>) -> Vector3<f64> {
    let attraction = |share: f64, d: &Vector3<f64>| {
        let squared = d.norm_squared();
        share / (squared * squared.sqrt())
    };
    let from_larger = Vector3::new(offset.x + 1.0, offset.y, offset.z);
    let steepest = 1.0 + 2.0 * (attraction(1.0 - mu, &from_larger) + attraction(mu, offset));
    let h = STEP / steepest;
    let k1 = gradient_about_smaller(mu, offset);
    let k2 = gradient_about_smaller(mu, &(offset + 0.5 * h * k1));
    let k3 = gradient_about_smaller(mu, &(offset + 0.5 * h * k2));
    let k4 = gradient_about_smaller(mu, &(offset + h * k3));
    offset + (k1 + 2.0 * (k2 + k3) + k4) * (h / 6.0)
}
