//! Position and velocity of the third body at an instant.

use nalgebra::{Vector3, Vector6};

/// Position and velocity at an instant, normalised, in whatever frame goes with it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct State {
    /// Instant on the absolute clock, in inverse mean motions.
    pub time: f64,
    /// Position (x, y, z), in separations of the primaries.
    pub position: Vector3<f64>,
    /// Velocity (vx, vy, vz), in separations times mean motion.
    pub velocity: Vector3<f64>,
}

impl State {
    /// The state at `time` with the components (x, y, z, vx, vy, vz).
    #[must_use]
    pub fn new(time: f64, components: [f64; 6]) -> Self {
        let [x, y, z, vx, vy, vz] = components;
        Self { time, position: Vector3::new(x, y, z), velocity: Vector3::new(vx, vy, vz) }
    }

    /// The components (x, y, z, vx, vy, vz).
    #[must_use]
    pub fn components(&self) -> Vector6<f64> {
        let (r, v) = (&self.position, &self.velocity);
        Vector6::new(r.x, r.y, r.z, v.x, v.y, v.z)
    }
}
