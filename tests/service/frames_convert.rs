//! States between units, frames, velocity, momentum and elements.

use serde_json::{Value, json};

use super::router::{Local, close};

const POST: &str = "/v1/frames/convert";

/// A light companion of a body with this gravitational parameter, km^3/s^2.
fn about(gm: f64) -> Value {
    json!({"larger": {"gm_km3_s2": gm}, "smaller": {"gm_km3_s2": gm * 1e-15}, "separation_km": 384400.0})
}

fn one(service: &Local, body: &Value) -> Value {
    service.answer(POST, body)["states"][0].clone()
}

#[test]
fn elements_of_textbook_examples() {
    let service = Local::start();
    let inertial =
        json!({"units": {"length": "km", "time": "s"}, "frame": {"axes": "inertial", "origin": "larger"}});
    let mut to = inertial.clone();
    to["elements_about"] = json!("larger");
    // Curtis, Orbital Mechanics for Engineering Students, example 4.3, and Vallado, Fundamentals of Astrodynamics and
    // Applications, example 2-5 (both from memory): a, e, and the four angles.
    for (gm, position, velocity, elements, relative, degrees) in [
        (
            398600.0,
            [-6045.0, -3490.0, 2500.0],
            [-3.457, 6.618, 2.533],
            [8788.0, 0.1712, 153.2, 255.3, 20.07, 28.45],
            3e-4,
            0.06,
        ),
        (
            398600.4418,
            [6524.834, 6862.875, 6448.296],
            [4.901327, 5.533756, -1.976341],
            [36127.343, 0.832853, 87.870, 227.898, 53.38, 92.335],
            1e-6,
            0.006,
        ),
    ] {
        let states = json!([{"position": position, "velocity": velocity}]);
        let answer =
            service.answer(POST, &json!({"system": about(gm), "states": states, "from": inertial, "to": to}));
        let state = &answer["states"][0];
        assert_eq!(state["elements_about"], "larger");
        let [a, e, i, node, periapsis, anomaly] = elements;
        let found = &state["elements"];
        close(&found["semi_major_axis"], a, relative * a);
        close(&found["eccentricity"], e, relative);
        close(&found["inclination"], i, degrees);
        close(&found["ascending_node"], node, degrees);
        close(&found["argument_of_periapsis"], periapsis, degrees);
        close(&found["true_anomaly"], anomaly, degrees);
        for index in 0..3 {
            close(&state["position"][index], position[index], 1e-9);
            close(&state["velocity"][index], velocity[index], 1e-12);
        }

        let told = json!([{"elements": found, "elements_about": "larger"}]);
        let back = one(
            &service,
            &json!({"system": about(gm), "states": told, "from": {"units": {"length": "km", "time": "s"}}, "to": inertial}),
        );
        for index in 0..3 {
            close(&back["position"][index], position[index], 1e-9);
            close(&back["velocity"][index], velocity[index], 1e-12);
        }
        for member in ["position_error", "velocity_error", "elements_error"] {
            assert!(answer["evidence"][member].as_f64().unwrap() < 1e-14, "{answer}");
        }
    }
}

#[test]
fn tisserand_parameters_of_comets() {
    // Published relative to Jupiter (from memory): 2P/Encke 3.026, 67P/Churyumov-Gerasimenko 2.746, of elements of the
    // Small-Body Database (from memory).
    let service = Local::start();
    for (a, e, i, published) in [(2.2178, 0.8471, 11.78, 3.026), (3.463, 0.641, 7.04, 2.746)] {
        let elements = json!({
            "semi_major_axis": a, "eccentricity": e, "inclination": i,
            "ascending_node": 30.0, "argument_of_periapsis": 60.0, "true_anomaly": 90.0,
        });
        let states = json!([{"elements": elements, "elements_about": "larger"}]);
        let units = json!({"units": {"length": "au", "time": "d"}});
        let to = json!({"units": {"length": "km", "time": "s"}, "elements_about": "larger"});
        let body = json!({"system": "sun-jupiter", "states": states, "from": units, "to": to});
        let found = one(&service, &body);
        close(&found["tisserand_parameter"], published, 2e-3);
        close(&found["elements"]["semi_major_axis"], a * 149597870.7, 1e-4);
        // It is the Jacobi constant but for terms of the order of the mass parameter (Tisserand).
        let body = json!({"system": "sun-jupiter", "states": states, "units": units["units"]});
        let physical = service.answer("/v1/jacobi", &body);
        let unit = physical["equilibria"]["L4"].as_f64().unwrap() / 3.0;
        close(&json!(physical["states"][0]["jacobi_constant"].as_f64().unwrap() / unit), published, 1e-2);
    }
}

#[test]
fn tisserand_goes_with_elements_about_the_larger_only() {
    let service = Local::start();
    let states = json!([{"position": [0.5, 0.2, 0.1], "velocity": [0.1, 0.5, 0.0]}]);
    let ask = |to: Value| one(&service, &json!({"system": "earth-moon", "states": states, "to": to}));
    assert!(ask(json!({"elements_about": "larger"}))["tisserand_parameter"].is_number());
    let about_smaller = ask(json!({"elements_about": "smaller"}));
    assert!(about_smaller.get("tisserand_parameter").is_none() && about_smaller["elements"].is_object());
    for to in [json!({}), json!({"elements_about": null}), json!(null)] {
        let plain = ask(to);
        let names: Vec<&String> = plain.as_object().unwrap().keys().collect();
        assert_eq!(names, ["time", "position", "velocity"]);
    }
}

#[test]
fn what_is_undefined_is_null() {
    let service = Local::start();
    let ask = |velocity: f64| {
        let states = json!([{"position": [0.25, 0.0, 0.0], "velocity": [0.0, velocity, 0.0]}]);
        let frame = json!({"axes": "inertial", "origin": "larger"});
        let to = json!({"elements_about": "larger"});
        let body = json!({"system": {"mass_parameter": 1e-300}, "states": states, "from": {"frame": frame}, "to": to});
        one(&service, &body)["elements"].clone()
    };
    let circle = ask(2.0);
    close(&circle["semi_major_axis"], 0.25, 1e-15);
    for name in ["ascending_node", "argument_of_periapsis", "true_anomaly", "mean_anomaly"] {
        assert!(circle[name].is_null(), "{circle}");
    }
    close(&circle["mean_longitude"], 0.0, 1e-12);
    let parabola = ask(8.0_f64.sqrt());
    assert!(parabola["semi_major_axis"].is_null() && parabola["mean_longitude"].is_null(), "{parabola}");
    close(&parabola["periapsis_distance"], 0.25, 1e-15);
    let hyperbola = ask(4.0);
    close(&hyperbola["semi_major_axis"], -0.125, 1e-15);
}

#[test]
fn momenta_are_the_canonical_ones() {
    // px = vx - y, py = vy + x, pz = vz (common practice).
    let service = Local::start();
    let states = json!([{"time": 3.0, "position": [0.5, 0.25, 0.125], "velocity": [1.0, 2.0, 4.0]}]);
    let body = json!({"system": "earth-moon", "states": states, "to": {"variables": "momentum"}});
    let answer = service.answer(POST, &body);
    assert_eq!(answer["variables"], "momentum");
    let state = &answer["states"][0];
    assert_eq!(*state, json!({"time": 3.0, "position": [0.5, 0.25, 0.125], "momentum": [0.75, 2.5, 4.0]}));
    assert_eq!(one(&service, &json!({"system": "earth-moon", "states": [state]})), states[0]);
}

#[test]
fn inertial_axes_turn_with_the_mean_motion() {
    let service = Local::start();
    let quarter = std::f64::consts::FRAC_PI_2;
    let mu = 0.25;
    let smaller = json!([{"time": quarter, "position": [1.0 - mu, 0.0, 0.0], "velocity": [0.0, 0.0, 0.0]}]);
    let ask = |frame: Value| {
        let body = json!({"system": {"mass_parameter": mu}, "states": smaller, "to": {"frame": frame}});
        one(&service, &body)
    };
    // The smaller primary itself, a quarter of a revolution on: ahead of it is -x.
    for (frame, position, velocity) in [
        (json!({"axes": "inertial"}), [0.0, 0.75, 0.0], [-0.75, 0.0, 0.0]),
        (json!({"axes": "inertial", "origin": "larger"}), [0.0, 1.0, 0.0], [-1.0, 0.0, 0.0]),
        (json!({"axes": "inertial", "origin": "smaller"}), [0.0, 0.0, 0.0], [0.0, 0.0, 0.0]),
        (json!({"axes": "inertial", "x_axis": "toward_larger"}), [0.0, -0.75, 0.0], [0.75, 0.0, 0.0]),
        (json!({"origin": "larger", "x_axis": "toward_larger"}), [-1.0, 0.0, 0.0], [0.0, 0.0, 0.0]),
    ] {
        let found = ask(frame);
        for index in 0..3 {
            close(&found["position"][index], position[index], 1e-16);
            close(&found["velocity"][index], velocity[index], 1e-16);
        }
    }
}

#[test]
fn every_pair_of_frames_leads_back() {
    let service = Local::start();
    let system = json!({"mass_parameter": 0.1, "length_km": 1000.0, "time_s": 100.0});
    let given = json!({"time": 2.5, "position": [0.7, 0.3, 0.05], "velocity": [0.1, -0.2, 0.02]});
    let units = json!({"length": "m", "time": "h", "velocity": "km/s"});
    for axes in ["rotating", "inertial"] {
        for origin in ["barycenter", "larger", "smaller"] {
            for x_axis in ["toward_smaller", "toward_larger"] {
                let there =
                    json!({"units": units, "frame": {"axes": axes, "origin": origin, "x_axis": x_axis}});
                let mut to = there.clone();
                to["elements_about"] = json!("smaller");
                let answer = service.answer(POST, &json!({"system": system, "states": [given], "to": to}));
                assert_eq!(answer["units"], units);
                assert_eq!(answer["frame"], there["frame"]);
                assert_eq!(answer["from"]["units"], "normalized");
                assert!(answer["evidence"]["position_error"].as_f64().unwrap() < 1e-15);
                // What is returned can be sent, elements included.
                let from = json!({"units": answer["units"], "frame": answer["frame"]});
                let body = json!({"system": answer["system"], "states": answer["states"], "from": from});
                let back = one(&service, &body);
                close(&back["time"], 2.5, 1e-15);
                for index in 0..3 {
                    close(&back["position"][index], given["position"][index].as_f64().unwrap(), 4e-16);
                    close(&back["velocity"][index], given["velocity"][index].as_f64().unwrap(), 4e-16);
                }
                let body = json!({
                    "system": answer["system"], "units": answer["units"], "frame": answer["frame"],
                    "states": answer["states"],
                });
                let normalised = json!({"system": system, "states": [given]});
                let here =
                    service.answer("/v1/jacobi", &body)["states"][0]["jacobi_constant"].as_f64().unwrap();
                let there = &service.answer("/v1/jacobi", &normalised)["states"][0]["jacobi_constant"];
                close(&json!(here / 100.0), there.as_f64().unwrap(), 2e-15);
            }
        }
    }
}

#[test]
fn digits_survive_near_a_primary() {
    // A state that doubles near 1 could not hold is carried from one frame of a primary to another.
    let service = Local::start();
    let system = json!({"mass_parameter": 0.25});
    let distance: f64 = 3e-11;
    for (origin, gm) in [("larger", 0.75), ("smaller", 0.25)] {
        let speed = (1.2 * gm / distance).sqrt();
        let states = json!([{"time": 0.5, "position": [distance, 0.0, 0.0], "velocity": [0.0, speed, 0.0]}]);
        let rotating = json!({"origin": origin, "x_axis": "toward_larger"});
        let inertial = json!({"origin": origin, "axes": "inertial"});
        let from = json!({"frame": rotating});
        let to = json!({"frame": inertial, "elements_about": origin});
        let there = one(&service, &json!({"system": system, "states": states, "from": from, "to": to}));
        let radius = there["position"][0].as_f64().unwrap().hypot(there["position"][1].as_f64().unwrap());
        close(&json!(radius), distance, 1e-15 * distance);
        close(&there["elements"]["periapsis_distance"], distance, 1e-13 * distance);
        let back = json!({"system": system, "states": [there], "from": {"frame": inertial}, "to": {"frame": rotating}});
        let back = one(&service, &back);
        close(&back["position"][0], distance, 1e-15 * distance);
        close(&back["position"][1], 0.0, 1e-15 * distance);
        // Elements alone hold it too.
        let told = json!([{"time": 0.5, "elements": there["elements"], "elements_about": origin}]);
        let told = one(&service, &json!({"system": system, "states": told, "to": {"frame": rotating}}));
        close(&told["position"][0], distance, 1e-13 * distance);
    }
}

#[test]
fn the_bytes_repeat_and_units_keep_the_bits() {
    let service = Local::start();
    let body: Value =
        serde_json::from_str(include_str!("../../src/service/api/frames_convert/example.json")).unwrap();
    assert_eq!(service.post(POST, &body).body, service.post(POST, &body).body);
    let states = json!([{"time": 0.1, "position": [0.1, -0.0, 0.3], "velocity": [-0.7, 1e-300, 5e-324]}]);
    let same = service.answer(POST, &json!({"system": "earth-moon", "states": states}));
    assert_eq!(same["states"].to_string(), states.to_string());
}

#[test]
fn bad_requests_are_told_what_would_be_right() {
    let service = Local::start();
    let good = || json!([{"position": [0.5, 0.1, 0.0], "velocity": [0.0, 0.0, 0.0]}]);
    let to = |to: Value| json!({"system": {"mass_parameter": 0.25}, "states": good(), "to": to});
    let from = |from: Value| json!({"system": {"mass_parameter": 0.25}, "states": good(), "from": from});
    let kilometres = || json!({"units": {"length": "km", "time": "s"}});
    let state = |state: Value| json!({"system": {"mass_parameter": 0.25}, "states": [state]});
    let elements = |members: Value| state(json!({"elements": members, "elements_about": "larger"}));
    service.refuses(
        POST,
        &[
            (
                to(json!({"variables": "momentum", "frame": {"axes": "inertial"}})),
                "/to/variables",
                "rotating axes",
            ),
            (
                to(json!({"variables": "momentum", "frame": {"origin": "larger"}})),
                "/to/variables",
                "barycenter",
            ),
            (to(json!({"variables": "momenta"})), "/to/variables", "did you mean `momentum`?"),
            (to(json!({"elements_about": "moon"})), "/to/elements_about", "known are `larger` and `smaller`"),
            (to(json!({"unit": "normalized"})), "/to/unit", "did you mean `units`?"),
            (to(kilometres()), "/to/units", "needs a scale that the system lacks"),
            (from(kilometres()), "/from/units", "needs a scale that the system lacks"),
            (from(json!({"frame": {"axis": "inertial"}})), "/from/frame/axis", "did you mean `axes`?"),
            (from(json!({"frame": {"axes": "fixed"}})), "/from/frame/axes", "unknown choice `fixed`"),
            (
                json!({"system": {"mass_parameter": 0.25}, "to": {"elements_about": "smaller"},
                    "states": [{"position": [0.75, 0, 0], "velocity": [0, 0, 0]}]}),
                "/states/0/position",
                "the primary's centre",
            ),
            (
                json!({"system": "earth-moon", "from": {"frame": {"axes": "inertial"}},
                    "states": [{"position": [0.5, 0, 0], "momentum": [0, 0, 0]}]}),
                "/states/0/momentum",
                "rotating axes about the barycenter",
            ),
            (elements(json!({"eccentricity": -1})), "/states/0/elements/eccentricity", "got -1"),
            (elements(json!({"eccentricity": 0.1})), "/states/0/elements/inclination", "missing"),
            (
                elements(json!({"eccentricty": 0.1})),
                "/states/0/elements/eccentricty",
                "did you mean `eccentricity`?",
            ),
            (state(json!({"elements": {"eccentricity": 0}})), "/states/0/elements_about", "is required"),
            (
                state(json!({"position": [1, 0, 0], "elements_about": "larger", "velocity": [0, 0, 0]})),
                "/states/0/elements_about",
                "goes with",
            ),
            (
                state(json!({"position": [1, 0, 0], "momentum": [0, 0, 0], "velocity": [0, 0, 0]})),
                "/states/0",
                "exactly one of",
            ),
            (
                state(json!({"time": "now", "position": [1, 0, 0], "velocity": [0, 0, 0]})),
                "/states/0/time",
                "got a string",
            ),
            (
                state(json!({"time": 1e300, "position": [1, 0, 0], "velocity": [0, 0, 0]})),
                "/states/0/time",
                "got 1e300",
            ),
            (json!({"system": "earth-moon"}), "/states", "is required"),
            (json!({"system": "earth-moon", "states": []}), "/states", "at least one state"),
            (json!({}), "/system", "is required"),
            (json!([]), "", "must be an object, got an array"),
        ],
    );
    assert_eq!(service.post_text(POST, "").json()["type"], "/problems/malformed-json");
    let columns = json!({"position": vec![[0.5, 0.0, 0.0]; 100_001], "velocity": vec![[0.0; 3]; 100_001]});
    service.post(POST, &json!({"system": "earth-moon", "states": columns})).has_fault(
        "work-limit",
        "pointer",
        "/states",
        "at most 100000 states",
    );
}
