//! The kernels compiled for the CPU's fused multiply-add and chosen at run time. Every path runs the same
//! operations in the same order, so it has the same bits; without the instruction `mul_add` is slow but exact.

use super::{Columns, ORDER, Primaries, Series, TERMS, recurrence, variational};
use crate::arithmetic::{Real, sum::Compensated};

/// Whether the kernels run on fused multiply-add instructions here.
#[must_use]
pub fn accelerated() -> bool {
    #[cfg(target_arch = "x86_64")]
    {
        std::arch::is_x86_feature_detected!("avx2") && std::arch::is_x86_feature_detected!("fma")
    }
    #[cfg(not(target_arch = "x86_64"))]
    {
        cfg!(target_arch = "aarch64")
    }
}

/// Defines a public function that runs its body compiled for FMA where the CPU has it.
macro_rules! accelerated {
    ($($(#[$doc:meta])* pub fn $name:ident($($argument:ident: $type:ty),* $(,)?) $(-> $result:ty)? $body:block)*) => {$(
        $(#[$doc])*
        #[inline]
        pub fn $name($($argument: $type),*) $(-> $result)? {
            #[inline(always)]
            fn body($($argument: $type),*) $(-> $result)? $body

            #[cfg(target_arch = "x86_64")]
            {
                #[target_feature(enable = "avx2,fma,bmi2")]
                fn fused($($argument: $type),*) $(-> $result)? {
                    body($($argument),*)
                }

                if accelerated() {
                    #[expect(unsafe_code, reason = "a function compiled for instructions of this CPU")]
                    // SAFETY: `accelerated` has found every feature that `fused` is compiled for.
                    return unsafe { fused($($argument),*) };
                }
            }
            body($($argument),*)
        }
    )*};
}

accelerated! {
    /// Expands the solution through `state` (x, y, z, vx, vy, vz) into `series`.
    pub fn expand(primaries: &Primaries, state: &[Compensated; 6], series: &mut Series<f64>) {
        let to_larger = state[0].minus(primaries.larger_x());
        let to_smaller = state[0].minus(primaries.smaller_x());
        let rounded = state.map(|component| component.value);
        recurrence::expand(primaries, &rounded, to_larger, to_smaller, series);
    }

    /// Expands the columns of `matrix` along `series`.
    pub fn expand_variational(series: &Series<f64>, matrix: &[[f64; 6]; 6], columns: &mut Columns<f64>) {
        variational::expand(series, matrix, columns);
    }

    /// What position and velocity change by within `time` of the series' instant.
    pub fn flow(series: &Series<f64>, time: f64) -> [f64; 6] {
        change(&series.position, time)
    }

    /// What the columns of the matrix (rows x, y, z, vx, vy, vz) change by within `time` of the series' instant.
    pub fn flow_variational(columns: &Columns<f64>, time: f64) -> [[f64; 6]; 6] {
        let mut change = [[0.0; 6]; 6];
        let top = &columns.position[TERMS - 1];
        for axis in 0..3 {
            for column in 0..6 {
                change[axis][column] = top[axis][column];
                change[axis + 3][column] = top[axis][column] * RATE[ORDER];
            }
        }
        for k in (1..TERMS - 1).rev() {
            let coefficients = &columns.position[k];
            for axis in 0..3 {
                for column in 0..6 {
                    let p = coefficients[axis][column];
                    let place = &mut change[axis][column];
                    *place = place.mul_add(time, p);
                    if k > 1 {
                        let rate = &mut change[axis + 3][column];
                        *rate = rate.mul_add(time, p * RATE[k - 1]);
                    }
                }
            }
        }
        change.map(|row| row.map(|element| element * time))
    }

    /// The Jacobi constant 2Ω − v² of (x, y, z, vx, vy, vz).
    pub fn jacobi_constant(primaries: &Primaries, state: &[Compensated; 6]) -> f64 {
        let [x, y, z, vx, vy, vz] = state.map(|component| component.value);
        let off_axis = z.mul_add(z, y * y);
        let term = |centre: Compensated, share: f64| {
            let away = state[0].minus(centre);
            share / away.mul_add(away, off_axis).sqrt()
        };
        let potential = term(primaries.larger_x(), primaries.smaller_x().value)
            + term(primaries.smaller_x(), primaries.mass_parameter());
        2.0f64.mul_add(potential, y.mul_add(y, x * x)) - vz.mul_add(vz, vy.mul_add(vy, vx * vx))
    }
}

/// k + 1: from coefficient k + 1 of the position to coefficient k of the velocity.
#[expect(clippy::cast_precision_loss, reason = "orders are small")]
const RATE: [f64; TERMS] = {
    let mut rates = [0.0; TERMS];
    let mut k = 0;
    while k < TERMS {
        rates[k] = (k + 1) as f64;
        k += 1;
    }
    rates
};

/// Horner's rule for all orders above 0, so that the change is rounded relative to itself.
#[inline(always)]
fn change<R: Real>(position: &[[R; TERMS]; 3], time: R) -> [R; 6] {
    let mut moved = [R::from_f64(0.0); 6];
    for axis in 0..3 {
        let p = &position[axis];
        let mut place = p[TERMS - 1];
        let mut rate = p[TERMS - 1] * R::from_f64(RATE[ORDER]);
        for k in (1..TERMS - 1).rev() {
            place = place.mul_add(time, p[k]);
            if k > 1 {
                rate = rate.mul_add(time, p[k] * R::from_f64(RATE[k - 1]));
            }
        }
        moved[axis] = place * time;
        moved[axis + 3] = rate * time;
    }
    moved
}
