//! The kernels compiled for the instruction sets there are, and chosen at run time. Every path runs the same
//! operations in the same order, so it has the same bits; without fused multiply-add instructions `mul_add` is slow but
//! exact.

use std::sync::OnceLock;

use super::swarm::{Pause, Swarm};
use super::variational::Registers;
use super::{Columns, Halt, Place, Primaries, Series, StepSize, Stride, Transition, packed, variational};
use crate::arithmetic::sum::Compensated;
use crate::arithmetic::{Lanes, Packed, Quad};

/// The instructions that the kernels run on. All give the same bits. A path can only be had where it can run.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub struct Path(pub(super) Instructions);

/// The instruction sets.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub(super) enum Instructions {
    Portable,
    #[cfg(target_arch = "x86_64")]
    Avx2,
    #[cfg(target_arch = "x86_64")]
    Avx512,
}

impl Path {
    /// What the compiler makes of plain code.
    pub const PORTABLE: Self = Self(Instructions::Portable);

    /// The fastest one here.
    #[must_use]
    pub fn fastest() -> Self {
        static FASTEST: OnceLock<Path> = OnceLock::new();
        *FASTEST.get_or_init(|| Self::available().last().copied().unwrap_or(Self::PORTABLE))
    }

    /// Those there are here, the fastest last.
    #[must_use]
    pub fn available() -> Vec<Self> {
        #[cfg_attr(not(target_arch = "x86_64"), expect(unused_mut, reason = "there is one"))]
        let mut paths = vec![Self::PORTABLE];
        #[cfg(target_arch = "x86_64")]
        {
            use std::arch::is_x86_feature_detected as has;
            if has!("avx2") && has!("fma") && has!("bmi2") {
                paths.push(Self(Instructions::Avx2));
                if has!("avx512f") && has!("avx512dq") && has!("avx512vl") {
                    paths.push(Self(Instructions::Avx512));
                }
            }
        }
        paths
    }

    /// Its name: `portable`, `avx2` (four doubles a register) or `avx512` (eight).
    #[must_use]
    pub fn name(self) -> &'static str {
        match self.0 {
            Instructions::Portable => "portable",
            #[cfg(target_arch = "x86_64")]
            Instructions::Avx2 => "avx2",
            #[cfg(target_arch = "x86_64")]
            Instructions::Avx512 => "avx512",
        }
    }

    /// Whether its registers hold eight doubles.
    pub(crate) fn has_eight(self) -> bool {
        self.name() == "avx512"
    }

    /// Whether it multiplies and adds in one instruction.
    #[must_use]
    pub fn is_fused(self) -> bool {
        self != Self::PORTABLE || cfg!(target_arch = "aarch64")
    }
}

/// A line of the cache.
#[repr(align(64))]
struct Line(#[expect(dead_code, reason = "its place is what matters")] u8);

/// Makes the function that this is inlined into begin its stack at a line of the cache. Registers that are spilled across
/// two lines make a kernel up to twice as slow.
#[inline(always)]
pub(super) fn align_stack() {
    std::hint::black_box(&Line(0));
}

/// Defines a function that runs its body compiled for the path given.
macro_rules! on_path {
    ($($(#[$doc:meta])* $visibility:vis fn $name:ident<$lanes:ident: $trait:path = $plain:ty | $four:ty | $eight:ty>
        ($($argument:ident: $type:ty),* $(,)?) $(-> $result:ty)? $body:block)*) => {$(
        $(#[$doc])*
        #[inline]
        $visibility fn $name(path: $crate::taylor::Path, $($argument: $type),*) $(-> $result)? {
            #[inline(always)]
            fn body<$lanes: $trait>(_: std::marker::PhantomData<$lanes>, $($argument: $type),*) $(-> $result)? $body

            #[cfg(target_arch = "x86_64")]
            {
                #[target_feature(enable = "avx2,fma,bmi2")]
                fn on_avx2($($argument: $type),*) $(-> $result)? {
                    body(std::marker::PhantomData::<$four>, $($argument),*)
                }

                #[target_feature(enable = "avx512f,avx512dq,avx512vl,avx2,fma,bmi2")]
                fn on_avx512($($argument: $type),*) $(-> $result)? {
                    body(std::marker::PhantomData::<$eight>, $($argument),*)
                }

                #[expect(unsafe_code, reason = "functions compiled for instructions of this CPU")]
                match path.0 {
                    // SAFETY: a path is only made where `Path::available` has found the features it is compiled for.
                    $crate::taylor::dispatch::Instructions::Avx2 => return unsafe { on_avx2($($argument),*) },
                    // SAFETY: the same.
                    $crate::taylor::dispatch::Instructions::Avx512 => return unsafe { on_avx512($($argument),*) },
                    $crate::taylor::dispatch::Instructions::Portable => {}
                }
            }
            let _ = path;
            body(std::marker::PhantomData::<$plain>, $($argument),*)
        }
    )*};
}
pub(super) use on_path;

#[cfg(target_arch = "x86_64")]
pub(super) use crate::arithmetic::x86::Wide4;

on_path! {
    /// Expands the solution through `state` (x, y, z, vx, vy, vz) into `series`.
    pub fn expand<P: Packed = Quad<f64> | Wide4 | Wide4>(
        primaries: &Primaries,
        state: &[Compensated; 6],
        series: &mut Series,
    ) {
        packed::expand::<P>(primaries, state, series);
    }

    /// Takes steps from `place` on, in the direction ±1 of the stride, as long as they end before its target.
    pub fn run<P: Packed = Quad<f64> | Wide4 | Wide4>(
        primaries: &Primaries,
        sizes: StepSize,
        place: &mut Place,
        series: &mut Series,
        stride: &Stride,
    ) -> Halt {
        place.run::<P>(series, primaries, sizes, stride)
    }

    /// Moves on along `series` by `time` within the step.
    pub fn advance<P: Packed = Quad<f64> | Wide4 | Wide4>(place: &mut Place, series: &Series, time: f64) {
        place.advance::<P>(series, time);
    }

    /// Expands the columns of `matrix` along `series`.
    pub fn expand_variational<P: Registers = variational::Plain | variational::Four | variational::Eight>(
        series: &Series,
        matrix: &Transition,
        columns: &mut Columns,
    ) {
        variational::expand::<P>(series, matrix, columns);
    }

    /// Moves `matrix`, that of the series' instant, on by `time` along its columns.
    pub fn advance_variational<P: Registers = variational::Plain | variational::Four | variational::Eight>(
        columns: &Columns,
        matrix: &mut Transition,
        time: f64,
    ) {
        variational::advance::<P>(columns, matrix, time);
    }

    /// What position and velocity change by within `time` of the series' instant.
    pub fn flow<P: Packed = Quad<f64> | Wide4 | Wide4>(series: &Series, time: f64) -> [f64; 6] {
        let [place, rate] = packed::change::<P>(&series.position, time);
        let ([x, y, z, _], [vx, vy, vz, _]) = (place.0, rate.0);
        [x, y, z, vx, vy, vz]
    }

    /// The Jacobi constant 2Ω − v² of (x, y, z, vx, vy, vz).
    pub fn jacobi_constant<P: Packed = Quad<f64> | Wide4 | Wide4>(
        primaries: &Primaries,
        state: &[Compensated; 6],
    ) -> f64 {
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

    /// Steps of several trajectories at once, one a lane: see [`Swarm::run`].
    pub(crate) fn run_four<L: Four = Quad<f64> | Wide4 | Wide4>(
        primaries: &Primaries,
        sizes: StepSize,
        swarm: &mut Swarm<[f64; 4]>,
        most: u64,
    ) -> Pause {
        swarm.run::<L>(primaries, sizes, most)
    }

    /// Moves every lane on by its length.
    pub(crate) fn advance_four<L: Four = Quad<f64> | Wide4 | Wide4>(swarm: &mut Swarm<[f64; 4]>) {
        swarm.advance::<L>();
    }
}

/// Registers of four doubles.
trait Four: Lanes<Array = [f64; 4]> {}

impl<L: Lanes<Array = [f64; 4]>> Four for L {}

/// What [`run_four`] and [`advance_four`] do for eight lanes, where there are registers for that; elsewhere nothing.
pub(crate) mod eight {
    use super::{Path, Pause, Primaries, StepSize, Swarm};

    #[cfg(target_arch = "x86_64")]
    mod on_avx512 {
        use crate::arithmetic::x86::Wide8;
        use crate::taylor::swarm::{Pause, Swarm};
        use crate::taylor::{Primaries, StepSize};

        #[target_feature(enable = "avx512f,avx512dq,avx512vl,avx2,fma,bmi2")]
        pub(super) fn run(
            primaries: &Primaries,
            sizes: StepSize,
            swarm: &mut Swarm<[f64; 8]>,
            most: u64,
        ) -> Pause {
            swarm.run::<Wide8>(primaries, sizes, most)
        }

        #[target_feature(enable = "avx512f,avx512dq,avx512vl,avx2,fma,bmi2")]
        pub(super) fn advance(swarm: &mut Swarm<[f64; 8]>) {
            swarm.advance::<Wide8>();
        }
    }

    /// Steps of several trajectories at once: see [`Swarm::run`].
    pub(crate) fn run(
        path: Path,
        primaries: &Primaries,
        sizes: StepSize,
        swarm: &mut Swarm<[f64; 8]>,
        most: u64,
    ) -> Pause {
        #[cfg(target_arch = "x86_64")]
        if path.has_eight() {
            #[expect(unsafe_code, reason = "a function compiled for instructions of this CPU")]
            // SAFETY: the path has them.
            return unsafe { on_avx512::run(primaries, sizes, swarm, most) };
        }
        let _ = (path, primaries, sizes, swarm, most);
        Pause::default()
    }

    /// Moves every lane on by its length.
    pub(crate) fn advance(path: Path, swarm: &mut Swarm<[f64; 8]>) {
        #[cfg(target_arch = "x86_64")]
        if path.has_eight() {
            #[expect(unsafe_code, reason = "a function compiled for instructions of this CPU")]
            // SAFETY: the path has them.
            unsafe {
                on_avx512::advance(swarm);
            }
        }
        let _ = (path, swarm);
    }
}
