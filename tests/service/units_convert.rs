//! Quantities between normalised and physical units.

use serde_json::{Value, json};

use super::router::{Local, close};

const POST: &str = "/v1/units/convert";

fn convert(service: &Local, system: &Value, quantity: &str, value: f64, from: &str, to: &str) -> Value {
    let values = json!([{"quantity": quantity, "value": value, "from": from, "to": to}]);
    service.answer(POST, &json!({"system": system, "values": values}))["values"][0]["result"].clone()
}

#[test]
fn units_have_their_published_sizes() {
    let service = Local::start();
    let system = json!({"mass_parameter": 0.1});
    for (quantity, value, from, to, expected) in [
        // The astronomical unit: IAU 2012 Resolution B2. The Julian year of 365.25 d of 86 400 s: IAU 1976 (from memory).
        ("length", 1.0, "au", "m", 149_597_870_700.0),
        ("length", 1.0, "km", "m", 1000.0),
        ("time", 1.0, "yr", "d", 365.25),
        ("time", 1.0, "yr", "s", 31_557_600.0),
        ("time", 90.0, "min", "h", 1.5),
        // One au a year is 4.740 470 464 km/s, and one au a day 1731.456 836 8 km/s: common practice of astrometry.
        ("velocity", 1.0, "au/yr", "km/s", 4.740_470_463_533_349),
        ("velocity", 1.0, "au/d", "km/s", 1_731.456_836_805_555_6),
        ("velocity", 3.6, "km/h", "m/s", 1.0),
        ("acceleration", 1.0, "m/s^2", "km/h^2", 12_960.0),
        ("energy", 1.0, "km^2/s^2", "m^2/s^2", 1e6),
        ("jacobi_constant", 1.0, "km^2/s^2", "m^2/s^2", 1e6),
        // The mean motion of the geostationary orbit, 15.041 arcsec/s (from memory).
        ("angle_rate", 15.041_067, "arcsec/s", "deg/h", 15.041_067),
        ("angle_rate", 1.0, "rev/d", "deg/d", 360.0),
        ("angle_rate", 180.0, "deg/s", "rad/s", std::f64::consts::PI),
    ] {
        let result = convert(&service, &system, quantity, value, from, to);
        close(&result, expected, 4e-16 * expected);
    }
}

#[test]
fn normalised_units_are_those_of_the_system() {
    let service = Local::start();
    // 384 400 km and 1.0245 km/s to five digits appear throughout the Earth-Moon literature; the Moon's sidereal month is
    // 27.32 d (common practice).
    let moon = json!("earth-moon");
    close(&convert(&service, &moon, "length", 1.0, "normalized", "km"), 384400.0, 1e-9);
    close(&convert(&service, &moon, "velocity", 1.0, "normalized", "km/s"), 1.0245, 5e-5);
    close(&convert(&service, &moon, "time", std::f64::consts::TAU, "normalized", "d"), 27.3, 0.03);
    close(&convert(&service, &moon, "angle_rate", 1.0, "normalized", "deg/d"), 360.0 / 27.3, 0.02);
    let system = json!({"mass_parameter": 0.1, "length_km": 1000.0, "time_s": 100.0});
    for (quantity, to, expected) in [
        ("length", "m", 1e6),
        ("time", "min", 100.0 / 60.0),
        ("velocity", "km/s", 10.0),
        ("acceleration", "km/s^2", 0.1),
        ("energy", "km^2/s^2", 100.0),
        ("jacobi_constant", "m^2/s^2", 1e8),
        ("angle_rate", "rad/s", 0.01),
    ] {
        close(&convert(&service, &system, quantity, 1.0, "normalized", to), expected, 2e-16 * expected);
        close(&convert(&service, &system, quantity, expected, to, "normalized"), 1.0, 4e-16);
        assert_eq!(convert(&service, &system, quantity, 0.1, "normalized", "normalized"), 0.1);
    }
}

#[test]
fn values_are_repeated_with_their_results() {
    let values = json!([
        {"quantity": "length", "value": 2.0, "from": "km", "to": "m"},
        {"quantity": "time", "value": -0.0, "from": "h", "to": "s"},
    ]);
    let answer = Local::start().answer(POST, &json!({"system": "pluto-charon", "values": values}));
    assert_eq!(answer["system"]["id"], "pluto-charon");
    assert_eq!(
        answer["values"],
        json!([
            {"quantity": "length", "value": 2.0, "from": "km", "to": "m", "result": 2000.0},
            {"quantity": "time", "value": -0.0, "from": "h", "to": "s", "result": -0.0},
        ])
    );
    assert!(answer["evidence"]["largest_round_trip_error"].as_f64().unwrap() < 1e-15);
}

#[test]
fn what_is_returned_can_be_sent_and_the_bytes_repeat() {
    let service = Local::start();
    let mut body: Value =
        serde_json::from_str(include_str!("../../src/service/api/units_convert/example.json")).unwrap();
    let first = service.post(POST, &body);
    body["system"] = first.success()["system"].clone();
    assert_eq!(service.post(POST, &body).body, first.body);
}

#[test]
fn bad_requests_are_told_what_would_be_right() {
    let service = Local::start();
    let value = |system: Value, quantity: &str, value: Value, from: &str, to: &str| json!({"system": system, "values": [{"quantity": quantity, "value": value, "from": from, "to": to}]});
    let moon = || json!("earth-moon");
    let bare = || json!({"mass_parameter": 0.1});
    service.refuses(
        POST,
        &[
            (
                value(moon(), "length", json!(1), "mile", "km"),
                "/values/0/from",
                "must be one of normalized, m, km, au",
            ),
            (
                value(moon(), "length", json!(1), "km", "s"),
                "/values/0/to",
                "must be one of normalized, m, km, au",
            ),
            (value(moon(), "lenght", json!(1), "km", "m"), "/values/0/quantity", "did you mean `length`?"),
            (
                value(moon(), "length", json!("1"), "km", "m"),
                "/values/0/value",
                "must be a finite number, got a string",
            ),
            (value(moon(), "length", json!(null), "km", "m"), "/values/0/value", "got null"),
            (
                value(moon(), "length", json!(1e308), "km", "m"),
                "/values/0/value",
                "beyond the range of double precision",
            ),
            (value(bare(), "length", json!(1), "normalized", "km"), "/values/0/from", "`length_km`"),
            (value(bare(), "time", json!(1), "s", "normalized"), "/values/0/to", "`time_s`"),
            (json!({"system": "earth-moon"}), "/values", "is required"),
            (json!({"system": "earth-moon", "values": []}), "/values", "at least one value"),
            (json!({"system": "earth-moon", "values": [1]}), "/values/0", "must be an object, got a number"),
            (json!({"system": "earth-moon", "values": [{}]}), "/values/0/from", "is required"),
            (json!({"system": "earth-moon", "values": [], "unit": 1}), "/unit", "unknown member"),
            (
                value(json!({"mass_parameter": 0}), "length", json!(1), "km", "m"),
                "/system/mass_parameter",
                "got 0",
            ),
            (json!([]), "", "must be an object, got an array"),
        ],
    );
    assert_eq!(service.post_text(POST, "").json()["type"], "/problems/malformed-json");
    let one = json!({"quantity": "length", "value": 1, "from": "km", "to": "m"});
    let many = json!({"system": "earth-moon", "values": vec![one; 100_001]});
    service.post(POST, &many).has_fault("work-limit", "pointer", "/values", "at most 100000 values");
}
