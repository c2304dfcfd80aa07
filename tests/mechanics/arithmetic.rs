//! Double-double arithmetic.

use std::f64::consts::SQRT_2;

use mechanics::arithmetic::{DoubleDouble, Matrix, Quad, SumOfProducts};
use proptest::prelude::*;

/// Values of mpmath at 50 digits, each as its nearest double and that of the rest.
#[test]
fn double_double_agrees_with_50_digits() {
    let root = DoubleDouble::from(2.0).sqrt();
    let third = DoubleDouble::from(1.0) / 3.0;
    let exactly = [
        ("√2", root, SQRT_2, -9.667_293_313_452_913e-17),
        ("1/3", third, 0.333_333_333_333_333_3, 1.850_371_707_708_594e-17),
        ("√2/3", root * third, 0.471_404_520_791_031_7, 4.783_123_109_328_841e-18),
        ("3√2", root / third, 4.242_640_687_119_285, 3.761_150_153_715_065_5e-16),
        ("√2 + 1/3", root + third, 1.747_546_895_706_428_4, -2.265_806_482_618_536e-17),
        ("√(1/3)", third.sqrt(), 0.577_350_269_189_625_7, 3.345_028_073_935_634_5e-17),
    ];
    for (what, found, high, low) in exactly {
        let error = (found - high - low).to_f64() / high;
        // 2⁻¹⁰², and as much again for the two doubles' own rounding.
        assert!(error.abs() < 4e-31, "{what}: {error:e}");
    }
}

#[test]
fn sums_and_products_of_doubles_are_exact() {
    let tiny = 2.0_f64.powi(-90);
    assert_eq!(DoubleDouble::sum(1.0, tiny) - 1.0, DoubleDouble::from(tiny));
    // (1 + ε)² = 1 + 2ε + ε².
    let epsilon = f64::EPSILON;
    let rest = DoubleDouble::square(1.0 + epsilon) - 1.0 - 2.0 * epsilon;
    assert_eq!(rest, DoubleDouble::from(epsilon * epsilon));
    assert_eq!(DoubleDouble::default().sqrt(), DoubleDouble::default());
    assert!(DoubleDouble::sum(1.0, -tiny) < DoubleDouble::from(1.0));
}

/// An integer of up to 62 bits, exactly.
#[expect(clippy::cast_precision_loss, clippy::cast_possible_truncation, reason = "the rest makes up for it")]
fn from_integer(value: i64) -> DoubleDouble {
    let high = value as f64;
    DoubleDouble::sum(high, (i128::from(value) - high as i128) as f64)
}

/// The nearest integer to a number of up to 126 bits.
#[expect(clippy::cast_possible_truncation, reason = "the numbers are so chosen")]
fn to_integer(value: DoubleDouble) -> i128 {
    let [high, low] = value.halves();
    high as i128 + low.round() as i128
}

fn wide() -> std::ops::Range<i64> {
    -(1 << 60)..1 << 60
}

proptest! {
    /// Against integers, which are exact.
    #[test]
    fn double_double_agrees_with_integers(a in wide(), b in wide()) {
        let exact = i128::from(a) * i128::from(b);
        let (x, y) = (from_integer(a), from_integer(b));
        prop_assert!((to_integer(x * y) - exact).abs() <= exact.abs() >> 102);
        prop_assert_eq!(to_integer(x + y), i128::from(a) + i128::from(b));
        prop_assert_eq!(to_integer(x - y), i128::from(a) - i128::from(b));
        let halves = Quad::splat(0.5);
        let lanes = (DoubleDouble::of([x, y, x, y]) * DoubleDouble::of([y, y, x, x])).scaled(halves);
        prop_assert_eq!(lanes.lane(0), (x * y).scaled(0.5));
        prop_assert_eq!(lanes.lane(1), y.squared().scaled(0.5));
    }

    #[test]
    fn sums_of_products_agree_with_integers(factors in prop::collection::vec((wide(), wide()), 1..8)) {
        let exact: i128 = factors.iter().map(|(a, b)| i128::from(*a) * i128::from(*b)).sum();
        let size: i128 = factors.iter().map(|(a, b)| (i128::from(*a) * i128::from(*b)).abs()).sum();
        let mut sum = SumOfProducts::none();
        for (a, b) in &factors {
            sum = sum.and(from_integer(*a), from_integer(*b));
        }
        prop_assert!((to_integer(sum.total()) - exact).abs() <= (size >> 100) + 1);
    }

    #[test]
    fn quotients_and_roots_are_undone_by_products(a in 1..1_i64 << 60, b in 1..1_i64 << 60) {
        let (x, y) = (from_integer(a), from_integer(b));
        let limit = 2.0_f64.powi(-101) * x.to_f64();
        prop_assert!((x / y * y - x).abs().to_f64() <= limit);
        prop_assert!((x.sqrt().squared() - x).abs().to_f64() <= limit);
    }
}

#[test]
fn reciprocals_of_small_integers() {
    for n in 1..2000_u32 {
        let found = DoubleDouble::reciprocal(n as usize) * f64::from(n) - 1.0;
        assert!(found.abs().to_f64() < 2.0_f64.powi(-104), "{n}");
    }
}

#[test]
fn determinant_of_a_hilbert_matrix() {
    // The determinant of the matrix of 1/(i + j − 1), N = 5, is 1/266716800000 (Hilbert 1894, Acta Mathematica 18:155).
    let hilbert = Matrix::<5>::from_fn(|i, j| DoubleDouble::reciprocal(i + j + 1));
    let relative = hilbert.determinant() * 266_716_800_000.0 - 1.0;
    assert!(relative.abs().to_f64() < 1e-24, "{relative:?}");
    let mut swapped = hilbert;
    swapped.0.swap(0, 3);
    assert!((swapped.determinant() / hilbert.determinant() + 1.0).abs().to_f64() < 1e-24);
    let product = hilbert.transposed().times(&Matrix::identity());
    assert_eq!(product, hilbert);
}
