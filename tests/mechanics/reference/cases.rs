//! The cases that accuracy, effort and speed are stated for. Tests, benches and the race take them from here.

use mechanics::frame::Frame;
use mechanics::propagation::{Arithmetic, Contact, Durations, Limits, MatrixOutput, RequestParts, Sampling};
use mechanics::quantity::{Duration, MassParameter, Quantity, Tolerance};
use mechanics::state::State;

/// A mass parameter near the Earth–Moon one, and a halo orbit about its L2.
pub(crate) const MU: f64 = 0.01215058560962404;
pub(crate) const HALO: [f64; 6] = [1.1720459535998, 0.0, -0.0862, 0.0, -0.1880035431733172, 0.0];
pub(crate) const HALO_PERIOD: f64 = 3.3517255182390353;
/// A near-rectilinear orbit: fast near the smaller primary, slow far from it; a revolution takes 1.511.
pub(crate) const RECTILINEAR: [f64; 6] = [1.022026179865368, 0.0, -0.1821, 0.0, -0.10326652171473427, 0.0];
const RECTILINEAR_PERIOD: f64 = 1.511;
/// Periodic orbit of Hairer, Nørsett & Wanner, *Solving Ordinary Differential Equations I*, §II.0.
pub(crate) const ARENSTORF_MU: f64 = 0.012277471;
pub(crate) const ARENSTORF: [f64; 6] = [0.994, 0.0, 0.0, 0.0, -2.00158510637908252240537862224, 0.0];
pub(crate) const ARENSTORF_PERIOD: f64 = 17.0652165601579625588917206249;
/// A regular orbit about the larger primary and about its period.
pub(crate) const REGULAR: [f64; 6] = [0.31, 0.0, 0.05, 0.0, 1.52, 0.1];
pub(crate) const REGULAR_PERIOD: f64 = 1.117;

/// Trajectories of the cases whose matrices are computed many at once.
const LANES: usize = 256;

/// A request for one state with the defaults of everything else.
pub(crate) fn parts(mass_parameter: f64, state: [f64; 6], duration: f64) -> RequestParts {
    RequestParts {
        mass_parameter: MassParameter::new(mass_parameter).expect("in range"),
        frame: Frame::default(),
        states: vec![State::new(0.0, state)],
        durations: Durations::All(Duration::new(duration).expect("in range")),
        tolerance: Tolerance::new(1e-15).expect("in range"),
        sampling: Sampling::None,
        matrix: MatrixOutput::None,
        events: Vec::new(),
        manoeuvres: Vec::new(),
        contact: Contact::default(),
        arithmetic: Arithmetic::Double,
        audit: false,
        limits: Limits { steps: 1_000_000, events: 100_000, sample_values: 20_000_000 },
    }
}

/// The cases that are raced.
pub(crate) const NAMES: [&str; 9] = [
    "halo_period",
    "halo_period_double_double",
    "nrho_30",
    "arenstorf",
    "ensemble_10k",
    "stm_halo",
    "stm_nrho",
    "stm_halo_lanes",
    "stm_nrho_lanes",
];

/// The request of a case.
pub(crate) fn case(name: &str) -> Option<RequestParts> {
    let with_matrix = |state, duration, count| RequestParts {
        matrix: MatrixOutput::Final,
        states: vec![State::new(0.0, state); count],
        ..parts(MU, state, duration)
    };
    Some(match name {
        "halo_period" => parts(MU, HALO, HALO_PERIOD),
        "halo_period_double_double" => {
            RequestParts { arithmetic: Arithmetic::DoubleDouble, ..parts(MU, HALO, HALO_PERIOD) }
        }
        "nrho_30" => parts(MU, RECTILINEAR, 30.0),
        "arenstorf" => parts(ARENSTORF_MU, ARENSTORF, ARENSTORF_PERIOD),
        "ensemble_10k" => RequestParts { states: ensemble(), ..parts(MU, HALO, 10.0) },
        "stm_halo" => with_matrix(HALO, HALO_PERIOD, 1),
        "stm_nrho" => with_matrix(RECTILINEAR, RECTILINEAR_PERIOD, 1),
        "stm_halo_lanes" => with_matrix(HALO, HALO_PERIOD, LANES),
        "stm_nrho_lanes" => with_matrix(RECTILINEAR, RECTILINEAR_PERIOD, LANES),
        _ => return None,
    })
}

/// States of each of the four blocks of the ensemble.
const BLOCK: usize = 2500;

/// 10,000 states of all kinds: near L1 and leaving towards the larger primary, near L2 and leaving outwards, around the
/// smaller and around the larger primary in both senses. By `+ - * /` and `sqrt` alone, so that any language gets the
/// same bits.
pub(crate) fn ensemble() -> Vec<State> {
    (0..4 * BLOCK).map(|index| State::new(0.0, member(index))).collect()
}

fn member(index: usize) -> [f64; 6] {
    const L1: f64 = 0.8369151257723572;
    const L2: f64 = 1.1556821654448841;
    let u: [f64; 8] = std::array::from_fn(|k| uniform(8 * index as u64 + k as u64));
    let s = u.map(|u| 2.0 * u - 1.0);
    let leaving = |x: f64, outwards: f64| {
        [x + 0.01 * s[0], 0.02 * s[1], 0.03 * s[2], outwards + 0.02 * s[3], 0.02 * s[4], 0.03 * s[5]]
    };
    let sense = if u[5] < 0.5 { 1.0 } else { -1.0 };
    let (mass, centre, radius, factor) = match index / BLOCK {
        0 => return leaving(L1 - 0.02, -0.01),
        1 => return leaving(L2 + 0.02, 0.01),
        2 => {
            let width = if sense > 0.0 { 0.02 } else { 0.07 };
            (MU, 1.0 - MU, 0.03 + width * u[0], 0.95 + 0.1 * u[4])
        }
        _ => (1.0 - MU, -MU, 0.1 + 0.4 * u[0], 0.9 + 0.2 * u[4]),
    };
    let flip = if u[2] < 0.5 { 1.0 } else { -1.0 };
    // The angle in the plane and the inclination by the tangent of their half, without sine and cosine.
    let (cosine, sine) = turned(s[1]);
    let (cosine, sine) = (flip * cosine, flip * sine);
    let (level, raised) = turned(0.3 * s[3]);
    let speed = sense * (factor * (mass / radius).sqrt());
    let (x, y) = (cosine * radius, sine * radius);
    [centre + x, y, 0.0, -(sine * speed) * level + y, (cosine * speed) * level - x, speed * raised]
}

/// Cosine and sine of an angle from the tangent of its half.
fn turned(t: f64) -> (f64, f64) {
    let d = 1.0 + t * t;
    ((1.0 - t * t) / d, 2.0 * t / d)
}

/// Output `n` of splitmix64 (Steele, Lea & Flood 2014, OOPSLA) as a number in [0, 1).
#[expect(clippy::cast_precision_loss, reason = "53 bits are kept, which a double holds")]
fn uniform(n: u64) -> f64 {
    const SEED: u64 = 20261201;
    let z = SEED.wrapping_add((n + 1).wrapping_mul(0x9E37_79B9_7F4A_7C15));
    let z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
    let z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
    ((z ^ (z >> 31)) >> 11) as f64 / (1u64 << 53) as f64
}
