//! Double-double arithmetic.

use std::f64::consts::SQRT_2;

use mechanics::arithmetic::DoubleDouble;

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
