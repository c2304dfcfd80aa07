//! Units against handbook values.

use mechanics::quantity::MassParameter;
use mechanics::state::State;
use mechanics::system::{Member, System, SystemParts, catalogue};
use mechanics::units::{ConvertError, Dimension, LengthUnit, TimeUnit, Unit, Units, VelocityUnit, convert};
use nalgebra::Matrix6;
use proptest::prelude::*;

use crate::close;

const DIMENSIONS: [Dimension; 7] = [
    Dimension::Length,
    Dimension::Time,
    Dimension::Velocity,
    Dimension::Acceleration,
    Dimension::Energy,
    Dimension::JacobiConstant,
    Dimension::AngleRate,
];

fn bare() -> System {
    System::from_mass_parameter(MassParameter::constant(0.1))
}

fn earth_moon() -> System {
    catalogue::find("earth-moon").expect("in the catalogue").system()
}

fn converted(
    dimension: Dimension,
    value: f64,
    from: &str,
    to: &str,
    system: &System,
) -> Result<f64, ConvertError> {
    let unit = |symbol| Unit::parse(dimension, symbol).expect("known unit");
    convert(value, unit(from), unit(to), system)
}

#[test]
fn physical_units_need_no_scale() {
    for (dimension, value, from, to, expected, tolerance) in [
        // IAU 2012 Resolution B2.
        (Dimension::Length, 1.0, "au", "m", 149597870700.0, 0.0),
        (Dimension::Length, 1.0, "au", "km", 149597870.7, 0.0),
        // Julian year, IAU style manual.
        (Dimension::Time, 1.0, "yr", "d", 365.25, 0.0),
        (Dimension::Time, 1.0, "yr", "s", 31557600.0, 0.0),
        (Dimension::Time, 90.0, "min", "h", 1.5, 0.0),
        // 1 au/d in km/s, the Explanatory Supplement's 1731.46 with the au of 2012.
        (Dimension::Velocity, 1.0, "au/d", "km/s", 1731.4568368055556, 1e-15),
        (Dimension::Velocity, 36.0, "km/h", "m/s", 10.0, 0.0),
        // Standard gravity, CGPM 1901.
        (Dimension::Acceleration, 9.80665, "m/s^2", "km/s^2", 0.00980665, 0.0),
        (Dimension::Energy, 1.0, "km^2/s^2", "m^2/s^2", 1e6, 0.0),
        (Dimension::JacobiConstant, -2.5e6, "m^2/s^2", "km^2/s^2", -2.5, 0.0),
        // Rotation of the Earth, WGS 84: 7.292115e-5 rad/s; 15.041067 degrees an hour, from memory.
        (Dimension::AngleRate, 7.292115e-5, "rad/s", "deg/h", 15.041067, 1e-7),
        (Dimension::AngleRate, 15.041067, "arcsec/s", "deg/h", 15.041067, 1e-15),
        (Dimension::AngleRate, 1.0, "rev/d", "deg/d", 360.0, 1e-15),
    ] {
        let result = converted(dimension, value, from, to, &bare()).expect("convertible");
        assert!(close(result, expected, tolerance), "{value} {from} is {expected} {to}, got {result}");
    }
}

#[test]
fn normalised_units_are_the_scales_of_the_system() {
    let system = earth_moon();
    let of = |dimension, to| converted(dimension, 1.0, "normalized", to, &system).expect("convertible");
    assert_eq!(Some(of(Dimension::Length, "km")), system.length_km());
    assert_eq!(Some(of(Dimension::Time, "s")), system.time_s());
    assert_eq!(Some(of(Dimension::Velocity, "km/s")), system.velocity_km_s());
    // The Moon's mean motion, 13.1764 degrees a day (Explanatory Supplement, from memory), within what the
    // circular problem with its mean distance is off.
    assert!(close(of(Dimension::AngleRate, "deg/d"), 13.176358, 4e-3));
    // The Moon falls towards the Earth with 2.73 mm/s², which Newton compared with the apple's 9.8 m/s²; the
    // separation times the mean motion squared has the Moon's own mass besides.
    assert!(close(of(Dimension::Acceleration, "m/s^2"), 2.73e-3, 1e-3));
    let energy = of(Dimension::JacobiConstant, "km^2/s^2");
    assert!(close(energy, 1.0245 * 1.0245, 1e-4));
}

#[test]
fn missing_scales_are_named() {
    let lone = SystemParts { mass_parameter: Some(0.1), length_km: Some(5.0), ..SystemParts::default() };
    let lone = lone.resolve().expect("valid");
    assert_eq!(converted(Dimension::Length, 2.0, "normalized", "km", &lone), Ok(10.0));
    let Err(ConvertError::MissingScale(missing)) =
        converted(Dimension::Velocity, 1.0, "m/s", "normalized", &lone)
    else {
        panic!("a system without a time has no velocity unit");
    };
    assert_eq!(missing.members().collect::<Vec<_>>(), [Member::TimeS]);
    let units = Units::Physical { length: LengthUnit::Km, time: TimeUnit::S, velocity: None };
    let missing = units.scale(&bare()).expect_err("no scale");
    assert_eq!(missing.to_string(), "needs a scale that the system lacks: `length_km` and `time_s`");
    assert!(Units::Normalized.scale(&bare()).is_ok());
}

#[test]
fn unknown_units_and_unwritable_results_are_refused() {
    for symbol in ["", "/", "Km", "km/s", "parsec", "km^2", " km"] {
        assert!(Unit::parse(Dimension::Length, symbol).is_err(), "{symbol}");
    }
    for symbol in ["km", "km/", "/s", "km/s/s", "s/km", "km/s^2"] {
        assert!(Unit::parse(Dimension::Velocity, symbol).is_err(), "{symbol}");
    }
    let error = Unit::parse(Dimension::Length, "mile").expect_err("unknown").to_string();
    assert_eq!(error, "must be one of normalized, m, km, au, got `mile`");
    assert_eq!(converted(Dimension::Length, 1e308, "au", "m", &bare()), Err(ConvertError::Range(1e308)));
    assert_eq!(converted(Dimension::Length, 5e-324, "m", "au", &bare()), Err(ConvertError::Range(5e-324)));
    let (length, time) = (Unit::parse(Dimension::Length, "m"), Unit::parse(Dimension::Time, "s"));
    assert_eq!(
        convert(1.0, length.expect("unit"), time.expect("unit"), &bare()),
        Err(ConvertError::Incompatible)
    );
}

#[test]
fn states_and_matrices_scale_together() {
    let system = earth_moon();
    let units =
        Units::Physical { length: LengthUnit::Km, time: TimeUnit::D, velocity: Some(VelocityUnit::MPerS) };
    let scale = units.scale(&system).expect("scales are known");
    assert_eq!(Some(scale.length), system.length_km());
    assert!(close(scale.time * 86400.0, system.time_s().expect("known"), 1e-15));
    assert!(close(scale.velocity, 1e3 * system.velocity_km_s().expect("known"), 1e-15));
    assert!(close(scale.energy(), 1e6 * 1.0245 * 1.0245, 1e-4));

    // A linear map of normalised states is the scaled matrix on scaled states.
    let matrix =
        Matrix6::from_fn(|row, column| f64::from(u8::try_from(7 * row + 3 * column).expect("small")) - 20.0);
    let state = State::new(0.5, [0.3, -0.2, 0.7, 1.1, -0.4, 0.9]);
    let image = matrix * state.components();
    let image = scale.state_out(&State::new(0.5, image.into()));
    let scaled = scale.matrix_out(&matrix) * scale.state_out(&state).components();
    assert!((scaled - image.components()).norm() <= 1e-13 * scaled.norm());

    let au_per_day = Units::Physical { length: LengthUnit::Au, time: TimeUnit::D, velocity: None };
    let derived = au_per_day.scale(&system).expect("scales are known");
    assert!(close(derived.velocity, derived.length / derived.time, 1e-14));
    assert_eq!(Units::Normalized.scale(&system).expect("always").state_out(&state), state);
}

proptest! {
    #[test]
    fn there_and_back(value in -1e12..1e12, dimension in 0..DIMENSIONS.len(), from in 0..100_usize, to in 0..100_usize) {
        let dimension = DIMENSIONS[dimension];
        let symbols = Unit::symbols(dimension);
        let (from, to) = (&symbols[from % symbols.len()], &symbols[to % symbols.len()]);
        let system = earth_moon();
        let there = converted(dimension, value, from, to, &system).expect("convertible");
        let back = converted(dimension, there, to, from, &system).expect("convertible");
        prop_assert!(close(back, value, 2e-15), "{value} {from} as {there} {to} came back as {back}");
        let same = converted(dimension, value, from, from, &system).expect("convertible");
        prop_assert_eq!(same.to_bits(), value.to_bits());
    }
}
