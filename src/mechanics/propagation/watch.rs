//! Finding the occurrences of events inside a step.
//!
//! The function whose zero is the event is composed with the step's Taylor polynomial; all changes of its sign
//! are isolated there, so several in one step are all found, and refined on the function itself.

use nalgebra::Vector3;

use super::event::{Plane, When};
use super::roots::{self, Composed, Polynomial};
use crate::arithmetic::{Quad, sum::Compensated};
use crate::frame::{Axes, Frame, XAxis};
use crate::quantity::Quantity;
use crate::system::Primary;
use crate::taylor::{self, Path, Series, TERMS};

/// Values this many round-offs of the largest term from zero have no certain sign.
const NOISE: f64 = 8.0 * f64::EPSILON;

/// What a polynomial leaves out, in terms of the last two it keeps: more than a geometric series leaves at the loosest
/// tolerance.
const BEYOND: f64 = 4.0;

/// Zeros this close to the start of a trajectory are the start's own, so that a trajectory can go on from an
/// event that another one ended at.
const START: f64 = 1e-12;

/// Newton steps on the function itself, from a root already good to the polynomial's truncation.
const POLISHES: usize = 4;

/// A Newton step longer than this share of the step is no refinement: the function touches zero there.
const LONGEST_POLISH: f64 = 0.01;

/// The stretch between two steps, as the search sees it.
pub(super) struct Stretch<'a> {
    pub path: Path,
    pub series: &'a Series,
    pub state: &'a [Compensated; 6],
    /// Instant at the start of the step on the absolute clock.
    pub time: f64,
    /// Signed length of the step.
    pub length: f64,
    /// Signed time since the start of the trajectory.
    pub elapsed: f64,
    /// Powers of the length.
    pub powers: Polynomial,
}

impl<'a> Stretch<'a> {
    pub(super) fn new(
        path: Path,
        series: &'a Series,
        state: &'a [Compensated; 6],
        time: f64,
        length: f64,
        elapsed: f64,
    ) -> Self {
        let mut powers = [1.0; TERMS];
        for k in 1..TERMS {
            powers[k] = powers[k - 1] * length;
        }
        Self { path, series, state, time, length, elapsed, powers }
    }

    fn scaled(&self, coefficient: impl Fn(usize) -> f64) -> Polynomial {
        std::array::from_fn(|k| coefficient(k) * self.powers[k])
    }

    fn is_near(&self, primary: Primary) -> bool {
        (self.series.side > 0.0) == (primary == Primary::Smaller)
    }

    fn half_square(&self, primary: Primary) -> impl Fn(usize) -> f64 {
        let lane = usize::from(!self.is_near(primary));
        move |k| self.series.half_square(k)[lane]
    }

    /// Position relative to a primary, and velocity, `at` a time after the start of the step.
    fn relative(&self, primary: Primary, at: f64) -> (Vector3<f64>, Vector3<f64>) {
        let moved = taylor::flow(self.path, self.series, at);
        let [Quad([d, y, z, _]), Quad([vx, vy, vz, _]), ..] = self.series.position;
        let x = if self.is_near(primary) { d } else { d + self.series.side };
        (
            Vector3::new(x + moved[0], y + moved[1], z + moved[2]),
            Vector3::new(vx + moved[3], vy + moved[4], vz + moved[5]),
        )
    }
}

/// The function whose zero is an event, in rotating barycentric coordinates.
#[derive(Clone, Debug)]
enum Function {
    /// n · (r − origin) − c, with n at rest in the rotating axes or turning backwards in them.
    Plane { normal: Vector3<f64>, offset: f64, origin: Compensated, turning: bool },
    /// Half of r² − R².
    Distance { primary: Primary, radius: f64 },
    /// r · v.
    RadialRate { primary: Primary },
}

/// An event's function, followed along one trajectory.
#[derive(Clone, Debug)]
pub(super) struct Watch {
    function: Function,
    /// The side of zero the function was last on; 0 before the first.
    side: f64,
    /// Only this sign of the rate in increasing time counts; 0 for both.
    wanted: f64,
}

/// An occurrence inside a step.
#[derive(Clone, Copy, Debug)]
pub(super) struct Hit {
    /// Signed time since the start of the step.
    pub at: f64,
    /// The sign of the function's rate in increasing time.
    pub rate: f64,
}

impl Watch {
    /// Follows a condition whose positions are in `frame`, the x of whose origin is given.
    pub(super) fn new(when: &When, frame: Frame, origin: Compensated) -> Self {
        let (function, wanted) = match when {
            When::Plane(plane) => (Function::of_plane(plane, frame, origin), 0.0),
            When::Distance(primary, radius) => {
                (Function::Distance { primary: *primary, radius: radius.get() }, 0.0)
            }
            When::Periapsis(primary) => (Function::RadialRate { primary: *primary }, 1.0),
            When::Apoapsis(primary) => (Function::RadialRate { primary: *primary }, -1.0),
        };
        Self { function, side: 0.0, wanted }
    }

    /// Appends the occurrences in a step, in the order of the integration. A function that comes to zero at the end of
    /// the step is left to the next one, but `at_end` of a trajectory there is none.
    pub(super) fn scan(
        &mut self,
        stretch: &Stretch,
        at_end: bool,
        scratch: &mut Vec<f64>,
        hits: &mut Vec<Hit>,
    ) {
        let composed = self.function.compose(stretch);
        scratch.clear();
        let mut end = roots::sign_changes(&composed, self.side, scratch);
        if at_end {
            let (value, slope) = roots::value_and_slope(&composed.polynomial, 1.0);
            // The end itself is an instant rounded on the clock.
            let instants =
                2.0 * f64::EPSILON * (stretch.time.abs() + stretch.elapsed.abs() + stretch.length.abs());
            let noise = composed.noise + (slope / stretch.length).abs() * instants;
            if value.abs() <= noise && slope * end < 0.0 {
                scratch.push(1.0);
                end = -end;
            }
        }
        // Each change flips the side; the last one leaves `end`.
        let mut side = if scratch.len() % 2 == 1 { -end } else { end };
        let direction = stretch.length.signum();
        for &root in &*scratch {
            let rate = -side * direction;
            side = -side;
            if self.wanted * rate < 0.0 {
                continue;
            }
            let at = self.function.polish(&composed.polynomial, root, stretch);
            if (stretch.elapsed + at).abs() > START {
                hits.push(Hit { at, rate });
            }
        }
        self.side = end;
    }
}

impl Function {
    fn of_plane(plane: &Plane, frame: Frame, origin: Compensated) -> Self {
        let mut normal = plane.normal();
        if frame.x_axis == XAxis::TowardLarger {
            normal.x = -normal.x;
            normal.y = -normal.y;
        }
        Self::Plane { normal, offset: plane.offset(), origin, turning: frame.axes == Axes::Inertial }
    }

    /// The function over the step as a polynomial in the share of the step.
    fn compose(&self, stretch: &Stretch) -> Composed {
        let polynomial;
        let magnitude;
        // The order that the polynomial is cut after, where it is cut.
        let cut;
        match self {
            Self::Plane { normal, offset, origin, turning } => {
                let start = position_from(stretch.state, *origin);
                let coordinates = |k: usize| {
                    let Quad([x, y, z, _]) = stretch.series.position[k];
                    if k == 0 { start } else { Vector3::new(x, y, z) }
                };
                if *turning {
                    let (x_series, y_series) = turned(normal, stretch.time);
                    polynomial = stretch.scaled(|k| {
                        let mut sum = normal.z * coordinates(k).z;
                        for i in 0..=k {
                            let place = coordinates(k - i);
                            sum += x_series[i] * place.x + y_series[i] * place.y;
                        }
                        if k == 0 { sum - offset } else { sum }
                    });
                } else {
                    polynomial = stretch.scaled(|k| {
                        let height = normal.dot(&coordinates(k));
                        if k == 0 { height - offset } else { height }
                    });
                }
                let reach = normal.abs().dot(&start.abs());
                magnitude = reach + offset.abs() + if *turning { reach * stretch.time.abs() } else { 0.0 };
                cut = turning.then_some(TERMS - 1);
            }
            Self::Distance { primary, radius } => {
                let half_square = stretch.half_square(*primary);
                let half_radius_square = 0.5 * radius * radius;
                polynomial = stretch.scaled(|k| match k {
                    0 => half_square(0) - half_radius_square,
                    k if k < TERMS - 2 => half_square(k),
                    _ => 0.0,
                });
                magnitude = half_square(0);
                cut = Some(TERMS - 3);
            }
            Self::RadialRate { primary } => {
                let half_square = stretch.half_square(*primary);
                #[expect(clippy::cast_precision_loss, reason = "orders are small")]
                let of = |k: usize| if k < TERMS - 3 { (k + 1) as f64 * half_square(k + 1) } else { 0.0 };
                polynomial = stretch.scaled(of);
                let speed: f64 = stretch.state[3..].iter().map(|v| v.value.abs()).sum();
                magnitude = (2.0 * half_square(0)).sqrt() * speed;
                cut = Some(TERMS - 4);
            }
        }
        let terms: f64 = polynomial.iter().map(|c| c.abs()).sum();
        let beyond = cut.map_or(0.0, |last| polynomial[last].abs() + polynomial[last - 1].abs());
        Composed { polynomial, noise: NOISE * (terms + magnitude) + BEYOND * beyond }
    }

    /// The function itself.
    fn value(&self, stretch: &Stretch, at: f64) -> f64 {
        match self {
            Self::Plane { normal, offset, origin, turning } => {
                let moved = taylor::flow(stretch.path, stretch.series, at);
                let from = position_from(stretch.state, *origin);
                let moved = Vector3::new(moved[0], moved[1], moved[2]);
                if *turning {
                    turn(normal, stretch.time + at).dot(&(from + moved)) - offset
                } else {
                    (normal.dot(&from) - offset) + normal.dot(&moved)
                }
            }
            Self::Distance { primary, radius } => {
                let (r, _) = stretch.relative(*primary, at);
                0.5 * (r.norm_squared() - radius * radius)
            }
            Self::RadialRate { primary } => {
                let (r, v) = stretch.relative(*primary, at);
                r.dot(&v)
            }
        }
    }

    /// Refines a root of the polynomial on the function itself; gives the time since the start of the step.
    fn polish(&self, polynomial: &Polynomial, root: f64, stretch: &Stretch) -> f64 {
        let slope = roots::value_and_slope(polynomial, root).1 / stretch.length;
        let mut at = root * stretch.length;
        for _ in 0..POLISHES {
            let correction = self.value(stretch, at) / slope;
            let better = at - correction;
            let inside = better / stretch.length;
            if !(correction.abs() < LONGEST_POLISH * stretch.length.abs() && (0.0..=1.0).contains(&inside)) {
                break;
            }
            at = better;
            if correction.abs() <= f64::EPSILON * at.abs() {
                break;
            }
        }
        at
    }
}

fn position_from(state: &[Compensated; 6], origin: Compensated) -> Vector3<f64> {
    Vector3::new(state[0].minus(origin), state[1].value, state[2].value)
}

/// A normal at rest in the inertial axes, seen in the rotating axes.
fn turn(normal: &Vector3<f64>, time: f64) -> Vector3<f64> {
    let (sin, cos) = libm::sincos(time);
    Vector3::new(normal.x * cos + normal.y * sin, normal.y * cos - normal.x * sin, normal.z)
}

/// The Taylor series of the x and y components of such a normal.
fn turned(normal: &Vector3<f64>, time: f64) -> (Polynomial, Polynomial) {
    let start = turn(normal, time);
    let (mut x, mut y) = ([0.0; TERMS], [0.0; TERMS]);
    (x[0], y[0]) = (start.x, start.y);
    for k in 1..TERMS {
        #[expect(clippy::cast_precision_loss, reason = "orders are small")]
        let order = k as f64;
        x[k] = y[k - 1] / order;
        y[k] = -x[k - 1] / order;
    }
    (x, y)
}
