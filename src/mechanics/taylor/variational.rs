//! The variational equations along a series: the state transition matrix by the same recurrences, whose
//! coefficients the six columns share.
//!
//! With A the gradient of the acceleration along the trajectory, each column (ξ, η, ζ) obeys
//! ξ″ = 2 η′ + (A ξ)_x, η″ = −2 ξ′ + (A ξ)_y, ζ″ = (A ξ)_z. A is made of the forces n and f of the recurrences and
//! of q = 3 n/r² for the nearer, p = 3 f/r² for the farther primary:
//!
//! ```text
//! A = diag(1, 1, 0) − (n + f) I + q d dᵀ + p (d + side·x̂)(d + side·x̂)ᵀ
//! ```

use super::{ORDER, Series, TERMS};
use crate::arithmetic::{Quad, Real};

/// Six columns of the matrix and two lanes of nothing.
type Row<R> = [Quad<R>; 2];

/// The columns of a matrix row.
#[must_use]
#[inline(always)]
fn row<R: Real>([a, b, c, d, e, f]: [R; 6]) -> Row<R> {
    let zero = R::from_f64(0.0);
    [Quad([a, b, c, d]), Quad([e, f, zero, zero])]
}

/// Taylor series of the six columns and of the gradient they share.
#[derive(Clone, Debug)]
#[repr(C, align(64))]
pub struct Columns<R> {
    /// Coefficient k of x, y and z of the six columns.
    pub position: [[Row<R>; 3]; TERMS],
    /// q and p.
    steep: [[R; 2]; TERMS],
    /// (q + p) d + side · p in x, (q + p) y, (q + p) z.
    lever: [Quad<R>; TERMS],
    /// y, z, z and d of the trajectory.
    shuffled: [Quad<R>; TERMS],
    /// xx, xy, xz, yy, yz, zz of the gradient.
    gradient: [[R; 6]; TERMS],
}

impl<R: Real> Columns<R> {
    /// Room for the series.
    #[must_use]
    pub fn new() -> Self {
        let zero = R::from_f64(0.0);
        let none = Quad::splat(zero);
        Self {
            position: [[[none; 2]; 3]; TERMS],
            steep: [[zero; 2]; TERMS],
            lever: [none; TERMS],
            shuffled: [none; TERMS],
            gradient: [[zero; 6]; TERMS],
        }
    }
}

impl<R: Real> Default for Columns<R> {
    fn default() -> Self {
        Self::new()
    }
}

/// Expands the columns of `matrix` (rows x, y, z, vx, vy, vz) along `series`.
#[inline(always)]
pub(super) fn expand<R: Real>(series: &Series<R>, matrix: &[[R; 6]; 6], columns: &mut Columns<R>) {
    gradient(series, columns);
    let [x, y, z, vx, vy, vz] = matrix.map(row);
    columns.position[0] = [x, y, z];
    columns.position[1] = [vx, vy, vz];
    for k in 0..ORDER {
        order(columns, k);
    }
}

/// The gradient: the convolutions four at a time.
#[inline(always)]
fn gradient<R: Real>(s: &Series<R>, c: &mut Columns<R>) {
    let zero = R::from_f64(0.0);
    let one = R::from_f64(1.0);
    let three_halves = R::from_f64(1.5);
    let inverse = s.half_square[0].map(|half_square| one / half_square);
    for k in 0..ORDER {
        let Quad([d, y, z, _]) = s.position[k];
        c.shuffled[k] = Quad([y, z, z, d]);
    }
    for k in 0..ORDER {
        // 2h · q = 3 n, so h_0 q_k = 3/2 n_k − Σ h_j q_{k−j}.
        let mut rest = s.force[k].map(|force| three_halves * force);
        for j in 1..=k {
            for which in 0..2 {
                rest[which] = (-s.half_square[j][which]).mul_add(c.steep[k - j][which], rest[which]);
            }
        }
        c.steep[k] = [rest[0] * inverse[0], rest[1] * inverse[1]];

        let mut lever = Quad([s.side * c.steep[k][1], zero, zero, zero]);
        for j in 0..=k {
            lever = Quad::splat(c.steep[j][0] + c.steep[j][1]).mul_add(s.position[k - j], lever);
        }
        c.lever[k] = lever;

        let mut along_x = Quad::splat(zero);
        let mut others = Quad::splat(zero);
        for j in 0..=k {
            let Quad([lever_x, lever_y, lever_z, _]) = c.lever[j];
            along_x = Quad::splat(lever_x).mul_add(s.position[k - j], along_x);
            others = Quad([lever_y, lever_y, lever_z, c.steep[j][1]]).mul_add(c.shuffled[k - j], others);
        }
        let (Quad([xx, xy, xz, _]), Quad([yy, yz, zz, far_d])) = (along_x, others);
        let diagonal = if k == 0 { one - s.total[0] } else { -s.total[k] };
        let offset = s.side.mul_add(far_d, c.steep[k][1]);
        c.gradient[k] = [(xx + offset) + diagonal, xy, xz, yy + diagonal, yz, zz - s.total[k]];
    }
}

/// From the columns' coefficients up to k + 1, those of order k + 2.
#[inline(always)]
fn order<R: Real>(c: &mut Columns<R>, k: usize) {
    let mut sums = [[Quad::splat(R::from_f64(0.0)); 2]; 3];
    for j in 0..=k {
        let [xx, xy, xz, yy, yz, zz] = c.gradient[j].map(Quad::splat);
        let [x, y, z] = &c.position[k - j];
        for half in 0..2 {
            let (x, y, z) = (x[half], y[half], z[half]);
            sums[0][half] = xz.mul_add(z, xy.mul_add(y, xx.mul_add(x, sums[0][half])));
            sums[1][half] = yz.mul_add(z, yy.mul_add(y, xy.mul_add(x, sums[1][half])));
            sums[2][half] = zz.mul_add(z, yz.mul_add(y, xz.mul_add(x, sums[2][half])));
        }
    }
    #[expect(clippy::cast_precision_loss, reason = "orders are small")]
    let (integrated, turned) = (
        Quad::splat(R::from_f64(1.0 / ((k + 1) * (k + 2)) as f64)),
        Quad::splat(R::from_f64(2.0 / (k + 2) as f64)),
    );
    let (before, after) = c.position.split_at_mut(k + 2);
    let (rates, next) = (&before[k + 1], &mut after[0]);
    for half in 0..2 {
        next[0][half] = sums[0][half].mul_add(integrated, turned * rates[1][half]);
        next[1][half] = sums[1][half].mul_add(integrated, -(turned * rates[0][half]));
        next[2][half] = sums[2][half] * integrated;
    }
}

/// What the columns change by within `time`: Horner's rule as for the trajectory.
#[inline(always)]
pub(super) fn change<R: Real>(c: &Columns<R>, time: R, rates: &[f64; TERMS]) -> [[R; 6]; 6] {
    let time = Quad::splat(time);
    let mut change = [[R::from_f64(0.0); 6]; 6];
    for axis in 0..3 {
        let mut ends = [[Quad::splat(R::from_f64(0.0)); 2]; 2];
        for half in 0..2 {
            let coefficient = |k: usize| c.position[k][axis][half];
            let rated = |k: usize| coefficient(k) * Quad::splat(R::from_f64(rates[k - 1]));
            let mut place = coefficient(TERMS - 1);
            let mut rate = rated(TERMS - 1);
            for k in (2..TERMS - 1).rev() {
                place = place.mul_add(time, coefficient(k));
                rate = rate.mul_add(time, rated(k));
            }
            ends[half] = [place.mul_add(time, coefficient(1)) * time, rate * time];
        }
        for which in 0..2 {
            let ([a, b, c, d], [e, f, ..]) = (ends[0][which].0, ends[1][which].0);
            change[axis + 3 * which] = [a, b, c, d, e, f];
        }
    }
    change
}
