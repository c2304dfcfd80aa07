//! The equilibria, against published values and rule by rule.

use std::f64::consts::TAU;

use serde_json::{Value, json};

use super::router::{Local, close};

const POST: &str = "/v1/equilibria";

fn point<'a>(answer: &'a Value, name: &str) -> &'a Value {
    answer["points"].as_array().unwrap().iter().find(|point| point["name"] == name).unwrap()
}

fn of(service: &Local, mass_parameter: f64) -> Value {
    service.answer(POST, &json!({"system": {"mass_parameter": mass_parameter}}))
}

#[test]
fn szebehely_and_williams_table() {
    // Szebehely & Williams 1964, Astronomical Journal 69:460, Table Ia: |x| of the point beyond the smaller primary and its
    // constant in the symmetric form.
    let service = Local::start();
    for (mu, x, constant) in [
        (0.1, 1.2597, 3.556684),
        (0.12, 1.26557, 3.599958),
        (0.14, 1.269193, 3.636081),
        (0.16, 1.271094, 3.666304),
        (0.18, 1.271628, 3.69152),
    ] {
        let answer =
            service.answer(POST, &json!({"system": {"mass_parameter": mu}, "jacobi_form": "symmetric"}));
        assert_eq!(answer["jacobi_form"], "symmetric");
        close(&point(&answer, "L2")["position"][0], x, 1e-6);
        close(&point(&answer, "L2")["jacobi_constant"], constant, 1e-6);
    }
}

#[test]
fn copenhagen_case() {
    // Equal masses; Szebehely 1967, Theory of Orbits (from memory).
    let answer = of(&Local::start(), 0.5);
    close(&point(&answer, "L1")["jacobi_constant"], 4.0, 1e-14);
    for (name, x) in [("L1", 0.0), ("L2", 1.19840614455492), ("L3", -1.19840614455492)] {
        close(&point(&answer, name)["position"][0], x, 1e-14);
    }
    close(&point(&answer, "L2")["jacobi_constant"], 3.45679622408615, 1e-14);
    close(&point(&answer, "L2")["energy"], -0.5 * 3.45679622408615, 1e-14);
    close(&point(&answer, "L4")["jacobi_constant"], 2.75, 1e-15);
}

#[test]
fn triangular_points_turn_stable_at_rouths_value() {
    // Routh 1875; Szebehely 1967 (from memory): (1 - sqrt(69)/9)/2.
    let service = Local::start();
    for (mu, stable, oscillations) in [(0.03852, true, 2), (0.03853, false, 1)] {
        let answer = of(&service, mu);
        close(&answer["critical_mass_parameter"], 0.0385208965045514, 1e-15);
        for name in ["L4", "L5"] {
            let linear = &point(&answer, name)["linear"];
            assert_eq!(linear["stable"], stable);
            assert_eq!(linear["in_plane_periods"].as_array().unwrap().len(), oscillations);
            assert_eq!(linear["growth_rate"].as_f64().unwrap() > 0.0, !stable);
            close(&linear["vertical_period"], TAU, 1e-15);
        }
        for name in ["L1", "L2", "L3"] {
            let linear = &point(&answer, name)["linear"];
            assert_eq!(linear["stable"], false);
            assert_eq!(linear["in_plane_periods"].as_array().unwrap().len(), 1);
        }
    }
}

#[test]
fn resonant_mass_parameters() {
    // Deprit & Deprit-Bartholome 1967, Astronomical Journal 72:173.
    let service = Local::start();
    for (mu, ratio) in [(0.024293897142052, 2.0), (0.013516016022453, 3.0)] {
        let answer = of(&service, mu);
        let periods = &point(&answer, "L4")["linear"]["in_plane_periods"];
        close(&json!(periods[0].as_f64().unwrap() / periods[1].as_f64().unwrap()), ratio, 1e-11);
    }
}

#[test]
fn linear_motion_in_both_units() {
    // Five digits of these appear throughout the literature on the Earth-Moon problem at this mass parameter (common
    // practice); they are frequencies and rates per inverse mean motion.
    let service = Local::start();
    let system = json!({"mass_parameter": 0.0121505856, "length_km": 384400.0, "time_s": 375190.26});
    let units = json!({"length": "km", "time": "d"});
    let normalised = service.answer(POST, &json!({"system": system}));
    let physical = service.answer(POST, &json!({"system": system, "units": units}));
    let unit_of_time = 375190.26 / 86400.0;
    for (name, in_plane, vertical, growth) in
        [("L1", 2.33439, 2.26883, 2.93206), ("L2", 1.86265, 1.78618, 2.15868)]
    {
        for (answer, time) in [(&normalised, 1.0), (&physical, unit_of_time)] {
            let linear = &point(answer, name)["linear"];
            close(&linear["in_plane_periods"][0], TAU / in_plane * time, 1e-4);
            close(&linear["vertical_period"], TAU / vertical * time, 1e-4);
            close(&linear["growth_rate"], growth / time, 1e-5);
            close(&linear["eigenvalues"][0][0], growth / time, 1e-5);
            close(&linear["eigenvalues"][1][1], in_plane / time, 1e-5);
            close(&linear["eigenvalues"][5][0], -growth / time, 1e-5);
        }
    }
    let periods = &point(&physical, "L4")["linear"]["in_plane_periods"];
    close(&periods[0], TAU / 0.29821 * unit_of_time, 2e-3);
    close(&periods[1], TAU / 0.9545 * unit_of_time, 2e-3);
}

#[test]
fn constants_and_distances_in_physical_units() {
    let service = Local::start();
    let system = json!({"mass_parameter": 0.5, "length_km": 1000.0, "time_s": 100.0});
    let units = json!({"length": "m", "time": "min", "velocity": "km/s"});
    let answer = service.answer(POST, &json!({"system": system, "units": units, "jacobi_form": "symmetric"}));
    assert_eq!(answer["units"], units);
    assert_eq!(answer["system"]["velocity_km_s"], 10.0);
    // The Copenhagen case as above: its unit of velocity is 10 km/s.
    close(&point(&answer, "L1")["jacobi_constant"], 425.0, 1e-12);
    close(&point(&answer, "L4")["jacobi_constant"], 300.0, 1e-12);
    close(&point(&answer, "L4")["distance_to_larger"], 1e6, 1e-9);
    close(&point(&answer, "L2")["position"][0], 1198406.14455492, 1e-7);
    close(&point(&answer, "L4")["linear"]["vertical_period"], TAU * 100.0 / 60.0, 1e-13);
}

#[test]
fn hills_limit_keeps_its_digits() {
    // Hill's problem, Szebehely 1967, Theory of Orbits, chapter 10 (from memory): 3^(-1/3) times the cube root of mu.
    let mu: f64 = 1e-15;
    let body = json!({"system": {"mass_parameter": mu}, "frame": {"origin": "smaller"}});
    let answer = Local::start().answer(POST, &body);
    for (name, sign) in [("L1", -1.0), ("L2", 1.0)] {
        let found = point(&answer, name);
        let expected = 0.6933612743506347e-5;
        close(&found["distance_to_smaller"], expected, 1e-5 * expected);
        assert_eq!(found["position"][0].as_f64(), found["distance_to_smaller"].as_f64().map(|r| sign * r));
    }
    assert!(answer["evidence"]["largest_residual"].as_f64().unwrap() < 1e-15);
}

#[test]
fn positions_are_in_the_frame_and_names_go_with_the_bodies() {
    let service = Local::start();
    let (mu, height) = (0.1, 0.75_f64.sqrt());
    let l1 = |frame: Value| service.answer(POST, &json!({"system": {"mass_parameter": mu}, "frame": frame}));
    let default = l1(json!({}));
    assert_eq!(
        default["frame"],
        json!({"axes": "rotating", "origin": "barycenter", "x_axis": "toward_smaller"})
    );
    let x = point(&default, "L1")["position"][0].as_f64().unwrap();
    for (origin, shift) in [("barycenter", 0.0), ("larger", mu), ("smaller", mu - 1.0)] {
        for (x_axis, sign) in [("toward_smaller", 1.0), ("toward_larger", -1.0)] {
            let answer = l1(json!({"origin": origin, "x_axis": x_axis}));
            close(&point(&answer, "L1")["position"][0], sign * (x + shift), 1e-15);
            close(&point(&answer, "L4")["position"][0], sign * (0.5 - mu + shift), 1e-15);
            close(&point(&answer, "L4")["position"][1], sign * height, 1e-15);
            close(&point(&answer, "L5")["position"][1], -sign * height, 1e-15);
            assert_eq!(point(&answer, "L1")["jacobi_constant"], point(&default, "L1")["jacobi_constant"]);
            assert!(!answer.to_string().contains("-0.0,"), "{answer}");
        }
    }
}

#[test]
fn get_and_post_agree() {
    let service = Local::start();
    let query = "length=km&time=d&velocity=m/s&axes=rotating&origin=larger&x_axis=toward_larger&jacobi_form=symmetric";
    let get = service.get(&format!("/v1/systems/earth-moon/equilibria?{query}")).success();
    let body = json!({
        "system": "earth-moon",
        "units": {"length": "km", "time": "d", "velocity": "m/s"},
        "frame": {"axes": "rotating", "origin": "larger", "x_axis": "toward_larger"},
        "jacobi_form": "symmetric",
    });
    assert_eq!(get, service.answer(POST, &body));
    assert_eq!(
        service.get("/v1/systems/earth-moon/equilibria").success(),
        service.answer(POST, &json!({"system": "earth-moon"}))
    );
}

#[test]
fn what_is_returned_can_be_sent() {
    let service = Local::start();
    let example: Value =
        serde_json::from_str(include_str!("../../src/service/api/equilibria/example.json")).unwrap();
    let first = service.answer(POST, &example);
    let again = service.answer(
        POST,
        &json!({
            "system": first["system"], "units": first["units"], "frame": first["frame"],
            "jacobi_form": first["jacobi_form"],
        }),
    );
    assert_eq!(first, again);
}

#[test]
fn many_systems_are_answered_each() {
    let service = Local::start();
    let mus: Vec<f64> = (1..=500).map(|index| f64::from(index) / 1000.0).collect();
    let systems: Vec<Value> = mus.iter().map(|mu| json!({"mass_parameter": mu})).collect();
    let body = json!({"systems": systems, "frame": {"origin": "larger"}, "jacobi_form": "symmetric"});
    let first = service.post(POST, &body);
    let answer = first.success();
    assert_eq!(answer["frame"]["origin"], "larger");
    let each = answer["systems"].as_array().unwrap();
    assert_eq!(each.len(), mus.len());
    for (mu, one) in mus.iter().zip(each) {
        assert_eq!(one["system"]["mass_parameter"].as_f64(), Some(*mu));
    }
    let alone = json!({"system": {"mass_parameter": 0.25}, "frame": {"origin": "larger"}, "jacobi_form": "symmetric"});
    let alone = service.answer(POST, &alone);
    assert_eq!(each[249]["points"], alone["points"]);
    let residuals = each.iter().map(|one| one["evidence"]["largest_residual"].as_f64().unwrap());
    assert_eq!(answer["evidence"]["largest_residual"].as_f64(), residuals.reduce(f64::max));
    assert_eq!(first.body, service.post(POST, &body).body, "the same request, the same bytes");
}

#[test]
fn ten_thousand_systems_and_no_more() {
    let service = Local::start();
    let systems = |count: usize| json!({"systems": vec![json!({"mass_parameter": 0.1}); count]});
    assert_eq!(service.answer(POST, &systems(10_000))["systems"].as_array().unwrap().len(), 10_000);
    let reply = service.post(POST, &systems(10_001));
    reply.has_fault("work-limit", "pointer", "/systems", "at most 10000 systems");
    let fault = &reply.json()["errors"][0];
    assert_eq!((fault["limit"].as_u64(), fault["asked"].as_u64()), (Some(10_000), Some(10_001)));
}

#[test]
fn bad_requests_are_told_what_would_be_right() {
    let service = Local::start();
    let mass = |value: Value| json!({"system": {"mass_parameter": value}});
    service.refuses(
        POST,
        &[
            (mass(json!(0)), "/system/mass_parameter", "above 0 and at most 0.5, got 0"),
            (mass(json!(0.6)), "/system/mass_parameter", "at most 0.5, got 0.6"),
            (mass(json!(-1)), "/system/mass_parameter", "got -1"),
            (mass(json!("0.1")), "/system/mass_parameter", "must be a finite number, got a string"),
            (mass(json!(null)), "/system", "mass_parameter"),
            (json!({"system": "erth-moon"}), "/system", "did you mean `earth-moon`?"),
            (json!({}), "", "exactly one of `system` and `systems`"),
            (json!([]), "", "must be an object, got an array"),
            (json!({"system": "earth-moon", "systems": ["earth-moon"]}), "", "exactly one of"),
            (json!({"systems": []}), "/systems", "at least one"),
            (json!({"systems": ["earth-moon", {"mass_parameter": 2}]}), "/systems/1/mass_parameter", "got 2"),
            (json!({"system": "earth-moon", "frame": {"axes": "inertial"}}), "/frame/axes", "need rotating axes"),
            (json!({"systems": ["earth-moon"], "frame": {"axes": "inertial"}}), "/frame/axes", "need rotating axes"),
            (
                json!({"system": {"mass_parameter": 0.1}, "units": {"length": "km", "time": "s"}}),
                "/units",
                "needs a scale that the system lacks: `length_km` and `time_s`",
            ),
            (
                json!({"systems": ["earth-moon", {"mass_parameter": 0.1}], "units": {"length": "km", "time": "s"}}),
                "/systems/1",
                "needs a scale that the system lacks",
            ),
            (json!({"system": "earth-moon", "jacobi_form": "plane"}), "/jacobi_form", "did you mean `plain`?"),
            (json!({"system": "earth-moon", "unit": "normalized"}), "/unit", "did you mean `units`?"),
        ],
    );
    assert_eq!(service.post_text(POST, "").json()["type"], "/problems/malformed-json");
    let beyond = json!({"system": "earth-moon", "limits": {"wall_time_ms": 1_000_000}});
    service.post(POST, &beyond).has_fault("work-limit", "pointer", "/limits/wall_time_ms", "at most");
}

#[test]
fn all_faults_come_at_once() {
    let service = Local::start();
    let body = json!({
        "system": {"mass_parameter": 0.7}, "units": {"length": "miles", "time": "s"}, "frame": {"axes": "inertial"},
        "jacobi_form": 3, "limits": {"steps": 0}, "extra": 1,
    });
    let reply = service.post(POST, &body).json();
    let mut pointers: Vec<&str> =
        reply["errors"].as_array().unwrap().iter().map(|fault| fault["pointer"].as_str().unwrap()).collect();
    pointers.sort_unstable();
    assert_eq!(
        pointers,
        ["/extra", "/frame/axes", "/jacobi_form", "/limits/steps", "/system/mass_parameter", "/units/length"]
    );
    let path = "/v1/systems/earth-moon/equilibria?time=x&lenght=km&axes=inertial&jacobi_form=";
    let reply = service.get(path).json();
    let mut names: Vec<&str> = reply["errors"]
        .as_array()
        .unwrap()
        .iter()
        .map(|fault| fault["parameter"].as_str().unwrap())
        .collect();
    names.sort_unstable();
    assert_eq!(names, ["axes", "jacobi_form", "lenght", "length", "time"]);
    service.get("/v1/systems/earth-moon/equilibria?origin=larger&origin=smaller").has_fault(
        "invalid-request",
        "parameter",
        "origin",
        "given twice",
    );
}
