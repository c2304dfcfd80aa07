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
use crate::arithmetic::Real;

/// Columns of the matrix.
const COLUMNS: usize = 6;

/// Taylor series of the six columns and of the gradient they share.
#[derive(Clone, Debug)]
#[repr(C, align(64))]
pub struct Columns<R> {
    /// Coefficient k of x, y and z of the six columns.
    pub position: [[[R; COLUMNS]; 3]; TERMS],
    /// 3 × share/r⁵ of the nearer and the farther primary.
    steep: [[R; TERMS]; 2],
    /// (q + p) d + side · p and (q + p) y, (q + p) z.
    lever: [[R; TERMS]; 3],
    /// xx, xy, xz, yy, yz, zz of the gradient.
    gradient: [[R; TERMS]; 6],
}

impl<R: Real> Columns<R> {
    /// Room for the series.
    #[must_use]
    pub fn new() -> Self {
        let zero = R::from_f64(0.0);
        Self {
            position: [[[zero; COLUMNS]; 3]; TERMS],
            steep: [[zero; TERMS]; 2],
            lever: [[zero; TERMS]; 3],
            gradient: [[zero; TERMS]; 6],
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
pub(super) fn expand<R: Real>(series: &Series<R>, matrix: &[[R; COLUMNS]; 6], columns: &mut Columns<R>) {
    gradient(series, columns);
    let (places, rates) = matrix.split_at(3);
    columns.position[0].copy_from_slice(places);
    columns.position[1].copy_from_slice(rates);
    for k in 0..ORDER {
        order(columns, k);
    }
}

/// Coefficient k of the product of two series.
#[inline(always)]
fn product<R: Real>(a: &[R; TERMS], b: &[R; TERMS], k: usize) -> R {
    let mut sum = a[0] * b[k];
    for j in 1..=k {
        sum = a[j].mul_add(b[k - j], sum);
    }
    sum
}

#[inline(always)]
fn gradient<R: Real>(s: &Series<R>, c: &mut Columns<R>) {
    let three_halves = R::from_f64(1.5);
    let one = R::from_f64(1.0);
    let [d, y, z] = &s.position;
    let inverse = [one / s.half_square_near[0], one / s.half_square_far[0]];
    for k in 0..ORDER {
        // 2h · q = 3 n, so h_0 q_k = 3/2 n_k − Σ h_j q_{k−j}.
        for (which, (force, half_square)) in
            [(&s.near, &s.half_square_near), (&s.far, &s.half_square_far)].into_iter().enumerate()
        {
            let mut rest = three_halves * force[k];
            for j in 1..=k {
                rest = (-half_square[j]).mul_add(c.steep[which][k - j], rest);
            }
            c.steep[which][k] = rest * inverse[which];
        }
        let far = &c.steep[1];
        let mut both = [R::from_f64(0.0); TERMS];
        for j in 0..=k {
            both[j] = c.steep[0][j] + far[j];
        }
        c.lever[0][k] = s.side.mul_add(far[k], product(&both, d, k));
        c.lever[1][k] = product(&both, y, k);
        c.lever[2][k] = product(&both, z, k);
        let diagonal = if k == 0 { one - s.total[0] } else { -s.total[k] };
        let offset = s.side.mul_add(product(far, d, k), far[k]);
        c.gradient[0][k] = (product(&c.lever[0], d, k) + offset) + diagonal;
        c.gradient[1][k] = product(&c.lever[0], y, k);
        c.gradient[2][k] = product(&c.lever[0], z, k);
        c.gradient[3][k] = product(&c.lever[1], y, k) + diagonal;
        c.gradient[4][k] = product(&c.lever[1], z, k);
        c.gradient[5][k] = product(&c.lever[2], z, k) - s.total[k];
    }
}

/// From the columns' coefficients up to k + 1, those of order k + 2.
#[inline(always)]
fn order<R: Real>(c: &mut Columns<R>, k: usize) {
    let zero = R::from_f64(0.0);
    let [xx, xy, xz, yy, yz, zz] = &c.gradient;
    let mut sums = [[zero; COLUMNS]; 3];
    for j in 0..=k {
        let [x, y, z] = &c.position[k - j];
        for column in 0..COLUMNS {
            let (x, y, z) = (x[column], y[column], z[column]);
            sums[0][column] = xz[j].mul_add(z, xy[j].mul_add(y, xx[j].mul_add(x, sums[0][column])));
            sums[1][column] = yz[j].mul_add(z, yy[j].mul_add(y, xy[j].mul_add(x, sums[1][column])));
            sums[2][column] = zz[j].mul_add(z, yz[j].mul_add(y, xz[j].mul_add(x, sums[2][column])));
        }
    }
    #[expect(clippy::cast_precision_loss, reason = "orders are small")]
    let (integrated, turned) =
        (R::from_f64(1.0 / ((k + 1) * (k + 2)) as f64), R::from_f64(2.0 / (k + 2) as f64));
    let (before, after) = c.position.split_at_mut(k + 2);
    let (rates, next) = (&before[k + 1], &mut after[0]);
    for column in 0..COLUMNS {
        next[0][column] = sums[0][column].mul_add(integrated, turned * rates[1][column]);
        next[1][column] = sums[1][column].mul_add(integrated, -(turned * rates[0][column]));
        next[2][column] = sums[2][column] * integrated;
    }
}
