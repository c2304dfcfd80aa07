//! The kernels compiled for the CPU's fused multiply-add and chosen at run time. Every path runs the same
//! operations in the same order, so it has the same bits; without the instruction `mul_add` is slow but exact.

use super::{Columns, Primaries, Series, TERMS, recurrence, variational};
use crate::arithmetic::{Quad, Real, sum::Compensated};

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
        variational::change(columns, time, &RATE)
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
fn change<R: Real>(position: &[Quad<R>; TERMS], time: R) -> [R; 6] {
    let time = Quad::splat(time);
    let rated = |k: usize| position[k] * Quad::splat(R::from_f64(RATE[k - 1]));
    let mut place = position[TERMS - 1];
    let mut rate = rated(TERMS - 1);
    for k in (2..TERMS - 1).rev() {
        place = place.mul_add(time, position[k]);
        rate = rate.mul_add(time, rated(k));
    }
    let Quad([x, y, z, _]) = place.mul_add(time, position[1]) * time;
    let Quad([vx, vy, vz, _]) = rate * time;
    [x, y, z, vx, vy, vz]
}

#[cfg(test)]
mod tests {
    use super::{Columns, Compensated, Primaries, Series, change, recurrence, variational};

    /// Without target features `mul_add` is the software's; the results are the same to the bit.
    #[test]
    fn portable_and_accelerated_paths_have_the_same_bits() {
        let primaries = Primaries::new(0.0121);
        let mut state = [0.83, 0.05, -0.03, 0.02, 0.31, -0.1].map(Compensated::new);
        let matrix = std::array::from_fn(|i| std::array::from_fn(|j| if i == j { 1.0 } else { 0.25 }));
        let (mut fast, mut plain) = (Series::new(), Series::new());
        let (mut fast_columns, mut plain_columns) = (Columns::new(), Columns::new());
        for _ in 0..50 {
            super::expand(&primaries, &state, &mut fast);
            let rounded = state.map(|component| component.value);
            let away = [primaries.larger_x(), primaries.smaller_x()].map(|centre| state[0].minus(centre));
            recurrence::expand(&primaries, &rounded, away[0], away[1], &mut plain);
            assert_eq!(format!("{fast:?}"), format!("{plain:?}"));

            super::expand_variational(&fast, &matrix, &mut fast_columns);
            variational::expand(&plain, &matrix, &mut plain_columns);
            assert_eq!(format!("{fast_columns:?}"), format!("{plain_columns:?}"));

            let moved = super::flow(&fast, 0.05);
            assert_eq!(moved.map(f64::to_bits), change(&plain.position, 0.05).map(f64::to_bits));
            for (component, moved) in state.iter_mut().zip(moved) {
                *component = component.plus(moved);
            }
        }
    }
}
