//! The invented mission: a binary that exists nowhere, a probe, and three burns that it might leave with.

use serde_json::{Value, json};

/// Distance of the two bodies, km.
pub(super) const SEPARATION_KM: f64 = 148_000.0;

/// Where the probe is when it burns: 30,000 km from the larger body's centre.
const POSITION_KM: [f64; 3] = [-19_200.0, -23_040.0, 0.0];

/// What the probe may do there.
pub(super) struct Course {
    pub(super) name: &'static str,
    /// Velocity afterwards in rotating axes, km/s: along the parking orbit, to the last digit.
    velocity_km_s: [f64; 3],
}

impl Course {
    pub(super) fn state(&self) -> Value {
        json!({ "position": POSITION_KM, "velocity": self.velocity_km_s })
    }
}

/// On a circular orbit about the larger body.
pub(super) const PARKED: Course = Course { name: "none, parked", velocity_km_s: [0.996, -0.83, 0.0] };

/// The burns, the longest last.
pub(super) const BURNS: [Course; 3] = [
    Course { name: "short", velocity_km_s: [1.236, -1.03, 0.0] },
    Course { name: "medium", velocity_km_s: [1.266, -1.055, 0.0] },
    Course { name: "long", velocity_km_s: [1.2678, -1.0565, 0.0] },
];

/// The two bodies.
pub(super) fn system() -> Value {
    json!({
        "larger": { "name": "Orvane (invented)", "gm_km3_s2": 61_250.0, "radius_km": 3_120.0 },
        "smaller": { "name": "Tessil (invented)", "gm_km3_s2": 1_904.0, "radius_km": 910.0 },
        "separation_km": SEPARATION_KM
    })
}

/// The units of all requests and answers.
pub(super) fn units() -> Value {
    json!({ "length": "km", "time": "d", "velocity": "km/s" })
}

/// The frame of the probe's states: rotating axes about the larger body.
pub(super) fn frame() -> Value {
    json!({ "origin": "larger" })
}
