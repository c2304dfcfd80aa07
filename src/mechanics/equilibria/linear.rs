//! Linear motion about an equilibrium: eigenvalues of the linearised equations in closed form.
//!
//! Szebehely 1967, *Theory of Orbits*, 5.2-5.5. With c₂ = (1 − μ)/r₁³ + μ/r₂³ the in-plane eigenvalues of a
//! collinear point solve λ⁴ + (2 − c₂)λ² + (1 + 2c₂)(1 − c₂) = 0, those of a triangular point
//! λ⁴ + λ² + 27μ(1 − μ)/4 = 0; the vertical ones are ±i√c₂. Of the two roots in λ² the one whose formula adds
//! is evaluated, the other follows from their product.

use std::f64::consts::TAU;

use nalgebra::Complex;

use super::Point;
use crate::arithmetic::DoubleDouble;
use crate::potential::larger_share;

/// Routh's critical mass parameter (1 − √69/9)/2: L4 and L5 are linearly stable below it. Routh 1875,
/// Proceedings of the London Mathematical Society 6:86.
pub const ROUTH: f64 = 0.038_520_896_504_551_4;

/// c₂ of a collinear point, in both forms that are needed.
pub(super) struct Attraction {
    c2: f64,
    c2_minus_1: f64,
}

impl Attraction {
    pub(super) fn new(point: Point, mu: f64, larger: DoubleDouble, smaller: DoubleDouble) -> Self {
        let (share, mass) = (larger_share(mu), DoubleDouble::from(mu));
        // Not by the cube, which underflows before the quotient does.
        let per_cube = |mass: DoubleDouble, r: DoubleDouble| mass / r / r.squared();
        let c2 = per_cube(share, larger) + per_cube(mass, smaller);
        let c2_minus_1 = if point == Point::L3 {
            // The condition of equilibrium, x(c₂ − 1) = μ(1 − μ)(1/r₂³ − 1/r₁³), keeps the digits when c₂ is
            // all but 1.
            share * (per_cube(mass, larger) - per_cube(mass, smaller)) / (larger + mu)
        } else {
            c2 - 1.0
        };
        Self { c2: c2.to_f64(), c2_minus_1: c2_minus_1.to_f64() }
    }
}

/// Linear motion about an equilibrium, per unit of normalised time.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LinearMotion {
    /// The six eigenvalues, by decreasing real part, then by decreasing imaginary part.
    pub eigenvalues: [Complex<f64>; 6],
    /// Whether all eigenvalues are imaginary and simple in the plane: never at L1 to L3, below [`ROUTH`] at L4
    /// and L5.
    pub stable: bool,
    /// Largest real part; 0 if none.
    pub growth_rate: f64,
    /// c₂ = (1 − μ)/r₁³ + μ/r₂³, the square of the vertical frequency; 1 at L4 and L5.
    pub c2: f64,
    /// Period of the vertical oscillation.
    pub vertical_period: f64,
    in_plane_frequencies: [Option<f64>; 2],
}

impl LinearMotion {
    pub(super) fn collinear(attraction: &Attraction) -> Self {
        let &Attraction { c2, c2_minus_1 } = attraction;
        let discriminant = (c2 * (9.0 * c2_minus_1 + 1.0)).sqrt();
        let product = (1.0 + 2.0 * c2) * c2_minus_1;
        let (growth_squared, frequency_squared) = if c2 > 2.0 {
            let growth_squared = 0.5 * ((c2 - 2.0) + discriminant);
            (growth_squared, product / growth_squared)
        } else {
            let frequency_squared = 0.5 * ((2.0 - c2) + discriminant);
            (product / frequency_squared, frequency_squared)
        };
        let (growth, frequency) = (growth_squared.sqrt(), frequency_squared.sqrt());
        let in_plane = [(growth, 0.0), (-growth, 0.0), (0.0, frequency), (0.0, -frequency)];
        Self::new(in_plane, c2, false, [Some(frequency), None])
    }

    pub(super) fn triangular(mu: f64) -> Self {
        let product = larger_share(mu) * mu * 27.0;
        let discriminant = (DoubleDouble::from(1.0) - product).to_f64();
        let quarter = 0.25 * product.to_f64();
        if discriminant > 0.0 {
            let short_squared = 0.5 * (1.0 + discriminant.sqrt());
            let (short, long) = (short_squared.sqrt(), (quarter / short_squared).sqrt());
            let in_plane = [(0.0, short), (0.0, -short), (0.0, long), (0.0, -long)];
            Self::new(in_plane, 1.0, true, [Some(long), Some(short)])
        } else {
            // λ = ±a ± ib with b² − a² = 1/2, 2ab = √(−discriminant)/2.
            let frequency = (0.5 * (quarter.sqrt() + 0.5)).sqrt();
            let growth = (-discriminant).sqrt() / (4.0 * frequency);
            let in_plane =
                [(growth, frequency), (growth, -frequency), (-growth, frequency), (-growth, -frequency)];
            Self::new(in_plane, 1.0, false, [Some(frequency), None])
        }
    }

    fn new(in_plane: [(f64, f64); 4], c2: f64, stable: bool, in_plane_frequencies: [Option<f64>; 2]) -> Self {
        let vertical = c2.sqrt();
        let [a, b, c, d] = in_plane;
        // Adding 0 turns a negative zero into zero.
        let mut eigenvalues =
            [a, b, c, d, (0.0, vertical), (0.0, -vertical)].map(|(re, im)| Complex::new(re + 0.0, im + 0.0));
        eigenvalues.sort_unstable_by(|a, b| b.re.total_cmp(&a.re).then(b.im.total_cmp(&a.im)));
        let growth_rate = eigenvalues[0].re;
        Self { eigenvalues, stable, growth_rate, c2, vertical_period: TAU / vertical, in_plane_frequencies }
    }

    /// 2π/|im| of each oscillating in-plane pair, longest first: one at L1 to L3, two at stable L4 and L5, one
    /// above [`ROUTH`].
    pub fn in_plane_periods(&self) -> impl Iterator<Item = f64> + use<> {
        self.in_plane_frequencies.into_iter().flatten().map(|frequency| TAU / frequency)
    }

    /// k, amplitude along y over amplitude along x of the in-plane oscillation about a collinear point
    /// (Richardson 1980, *Celestial Mechanics* 22:241); absent at L4 and L5, whose axes are oblique.
    #[must_use]
    pub fn amplitude_ratio(&self) -> Option<f64> {
        let fastest_growing = self.eigenvalues[0];
        let collinear = fastest_growing.re > 0.0 && fastest_growing.im == 0.0;
        let w = self.in_plane_frequencies[0].filter(|_| collinear)?;
        Some((w * w + 1.0 + 2.0 * self.c2) / (2.0 * w))
    }
}
