//! The same series in double-double arithmetic, for orbits so sensitive that double precision is the error.
//!
//! Coefficient k belongs to the k-th power of the time in units of a *trial step*, a power of two near the radius of
//! convergence: otherwise coefficients of this order overflow close to a primary, where the radius is 1e-9. The
//! scaling is exact, so it changes no bit of what does not overflow.

mod flow;
mod motion;
mod recurrence;
mod step;
mod variational;

#[cfg(target_arch = "x86_64")]
use super::dispatch::Wide4;
use super::dispatch::on_path;
use super::{Primaries, Series as RoundedSeries, TERMS as ROUNDED_TERMS};
use crate::arithmetic::{DoubleDouble, Packed, Quad};

pub use motion::Motion;
pub use step::EXTENDED_TOLERANCE;
pub use variational::Columns;

/// Order of the velocity series, even. From 32 to 38 the cost is the same within a few per cent.
pub const ORDER: usize = 36;

/// Coefficients of the position series.
const TERMS: usize = ORDER + 2;

/// Four double-doubles side by side.
type Wide = DoubleDouble<Quad<f64>>;

/// A series of what belongs to the two primaries, the nearer one first.
#[derive(Clone, Debug)]
#[repr(C, align(64))]
struct Pairs {
    leading: [[f64; 2]; TERMS],
    rest: [[f64; 2]; TERMS],
}

impl Pairs {
    fn new() -> Self {
        Self { leading: [[0.0; 2]; TERMS], rest: [[0.0; 2]; TERMS] }
    }

    #[inline(always)]
    fn at(&self, k: usize) -> [DoubleDouble; 2] {
        std::array::from_fn(|i| DoubleDouble::normal(self.leading[k][i], self.rest[k][i]))
    }

    #[inline(always)]
    fn set(&mut self, k: usize, pair: [DoubleDouble; 2]) {
        let halves = pair.map(DoubleDouble::halves);
        self.leading[k] = halves.map(|[leading, _]| leading);
        self.rest[k] = halves.map(|[_, rest]| rest);
    }

    /// Coefficients k and k + 1.
    #[inline(always)]
    fn with_next<P: Packed>(&self, k: usize) -> DoubleDouble<P> {
        let next = k + 1;
        let [[a, b], [c, d]] = [self.leading[k], self.leading[next]];
        let leading = P::load(&Quad([a, b, c, d]));
        let [[a, b], [c, d]] = [self.rest[k], self.rest[next]];
        DoubleDouble::normal(leading, P::load(&Quad([a, b, c, d])))
    }

    /// Coefficient k, twice.
    #[inline(always)]
    fn twice<P: Packed>(&self, k: usize) -> DoubleDouble<P> {
        DoubleDouble::normal(P::twice(&self.leading[k]), P::twice(&self.rest[k]))
    }
}

/// The Taylor series about one instant; see [`super::Series`] for what it holds. Coefficient k is that of the k-th power of
/// the time in trial steps.
#[derive(Clone, Debug)]
#[repr(C, align(64))]
pub struct Series {
    position: [Wide; TERMS],
    half_square: Pairs,
    force: Pairs,
    total: [DoubleDouble; TERMS],
    side: f64,
    trial_step: f64,
    jacobi: DoubleDouble,
    log2_radius: f64,
}

impl Series {
    /// Room for a series.
    #[must_use]
    pub fn new() -> Self {
        Self {
            position: [Wide::splat(DoubleDouble::default()); TERMS],
            half_square: Pairs::new(),
            force: Pairs::new(),
            total: [DoubleDouble::default(); TERMS],
            side: 0.0,
            trial_step: 1.0,
            jacobi: DoubleDouble::default(),
            log2_radius: 0.0,
        }
    }

    /// Whether no coefficient has overflowed: one that has spoils all later ones.
    #[must_use]
    pub fn is_finite(&self) -> bool {
        self.position[TERMS - 2..].iter().all(|place| {
            let Quad([x, y, z, _]) = place.to_double();
            (x + y + z).is_finite()
        })
    }

    /// How far the series may be carried.
    #[must_use]
    pub fn step(&self) -> f64 {
        step::from_log2_radius(self.log2_radius)
    }

    /// The Jacobi constant 2Ω − v².
    #[must_use]
    pub fn jacobi(&self) -> DoubleDouble {
        self.jacobi
    }

    /// The first coefficients in powers of the time, rounded: of the series what the search for events works on, and no
    /// forces. What it leaves out is below the round-off within a step of this series.
    pub fn round_to(&self, rounded: &mut RoundedSeries) {
        let per_time = 1.0 / self.trial_step;
        let mut factor = 1.0;
        for k in 0..ROUNDED_TERMS {
            let scale = |value: f64| value * factor;
            rounded.position[k] = Quad(self.position[k].to_double().0.map(scale));
            rounded.set_half_square(k, self.half_square.leading[k].map(scale));
            factor *= per_time;
        }
        rounded.side = self.side;
        rounded.jacobi = self.jacobi.to_f64();
        rounded.log2_radius = self.log2_radius;
    }
}

impl Default for Series {
    fn default() -> Self {
        Self::new()
    }
}

on_path! {
    /// Expands the solution through `state` (x, y, z, vx, vy, vz) into `series`.
    pub fn expand<P: Packed = Quad<f64> | Wide4 | Wide4>(primaries: &Primaries, state: &[DoubleDouble; 6], series: &mut Series) {
        recurrence::expand::<P>(primaries, state, series);
    }

    /// What position and velocity change by within `time` of the series' instant.
    pub fn flow<P: Packed = Quad<f64> | Wide4 | Wide4>(series: &Series, time: DoubleDouble) -> [DoubleDouble; 6] {
        flow::change::<P>(series, time)
    }

    /// Expands the columns of `matrix` (rows x, y, z, vx, vy, vz) along `series`.
    pub fn expand_variational<P: Packed = Quad<f64> | Wide4 | Wide4>(
        series: &Series, matrix: &[[DoubleDouble; 6]; 6], columns: &mut Columns,
    ) {
        variational::expand::<P>(series, matrix, columns);
    }

    /// What the columns of the matrix change by within `time` of the series' instant.
    pub fn flow_variational<P: Packed = Quad<f64> | Wide4 | Wide4>(
        series: &Series, columns: &Columns, time: DoubleDouble,
    ) -> [[DoubleDouble; 6]; 6] {
        flow::matrix_change::<P>(series, columns, time)
    }
}

#[cfg(test)]
mod tests {
    use super::{
        Columns, DoubleDouble, Primaries, Series, expand, expand_variational, flow, flow_variational,
    };
    use crate::taylor::Path;

    /// Without target features `mul_add` is the software's; the results are the same to the bit.
    #[test]
    fn all_paths_have_the_same_bits() {
        let primaries = Primaries::new(0.0121);
        let matrix = std::array::from_fn(|i| {
            std::array::from_fn(|j| DoubleDouble::from(if i == j { 1.0 } else { 0.25 }))
        });
        let time = DoubleDouble::reciprocal(17);
        let walk = |path| {
            let mut state = [0.83, 0.05, -0.03, 0.02, 0.31, -0.1].map(DoubleDouble::from);
            let (mut series, mut columns) = (Series::new(), Columns::new());
            let mut all = Vec::new();
            for _ in 0..20 {
                expand(path, &primaries, &state, &mut series);
                expand_variational(path, &series, &matrix, &mut columns);
                let matrix = flow_variational(path, &series, &columns, time);
                all.push(format!("{series:?} {columns:?} {matrix:?}"));
                for (component, moved) in state.iter_mut().zip(flow(path, &series, time)) {
                    *component = *component + moved;
                }
            }
            all
        };
        let plain = walk(Path::PORTABLE);
        for path in Path::available() {
            assert_eq!(walk(path), plain, "{}", path.name());
        }
    }
}
