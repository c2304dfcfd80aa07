//! Jacobi constants, energies and regions of states.

use serde_json::{Value, json};

use super::router::{Local, close};

const POST: &str = "/v1/jacobi";

fn one(service: &Local, body: &Value) -> Value {
    service.answer(POST, body)["states"][0].clone()
}

fn at(service: &Local, mu: f64, position: [f64; 3], velocity: [f64; 3]) -> Value {
    let states = json!([{"position": position, "velocity": velocity}]);
    one(service, &json!({"system": {"mass_parameter": mu}, "states": states}))
}

#[test]
fn constants_of_published_orbits() {
    let service = Local::start();
    // Hairer, Norsett & Wanner, Solving Ordinary Differential Equations I, II.0; its constant worked out at 40 digits.
    let arenstorf =
        at(&service, 0.012277471, [0.994, 0.0, 0.0], [0.0, -2.00158510637908252240537862224, 0.0]);
    close(&arenstorf["jacobi_constant"], 2.856412520209858, 1e-14);
    close(&arenstorf["energy"], -1.428206260104929, 1e-14);
    close(&arenstorf["speed"], 2.00158510637908252240537862224, 1e-15);
    close(&arenstorf["distance_to_larger"], 1.006277471, 1e-15);
    close(&arenstorf["distance_to_smaller"], 0.006277471, 1e-17);
    // The 9:2 resonant near-rectilinear orbit, used as a baseline in the literature (from memory).
    let halo =
        at(&service, 0.0121505856, [1.0220281547241, 0.0, -0.18210136080006], [0.0, -0.10327082335568, 0.0]);
    close(&halo["jacobi_constant"], 3.046493809, 1e-9);
}

#[test]
fn the_two_forms_differ_by_the_published_term() {
    // Szebehely 1967, Theory of Orbits, 1.4 (from memory): the symmetric form is larger by mu(1 - mu) and has exactly 3 at
    // rest in the triangular points.
    let service = Local::start();
    let mu = 0.3;
    let states = json!([
        {"position": [0.5 - mu, 0.75_f64.sqrt(), 0.0], "velocity": [0.0, 0.0, 0.0]},
        {"position": [0.9, 0.2, -0.1], "velocity": [3.0, -40.0, 5.0]},
    ]);
    let ask = |form: &str| {
        service
            .answer(POST, &json!({"system": {"mass_parameter": mu}, "jacobi_form": form, "states": states}))
    };
    let (plain, symmetric) = (ask("plain"), ask("symmetric"));
    assert_eq!((&plain["jacobi_form"], &symmetric["jacobi_form"]), (&json!("plain"), &json!("symmetric")));
    close(&symmetric["states"][0]["jacobi_constant"], 3.0, 1e-15);
    assert_eq!(symmetric["equilibria"]["L4"], 3.0);
    for index in 0..2 {
        let (plain, symmetric) = (&plain["states"][index], &symmetric["states"][index]);
        let number = |value: &Value, name: &str| value[name].as_f64().unwrap();
        let constant = number(plain, "jacobi_constant");
        close(&symmetric["jacobi_constant"], constant + mu * (1.0 - mu), 1e-12);
        for state in [plain, symmetric] {
            let (constant, speed) = (number(state, "jacobi_constant"), number(state, "speed"));
            close(&state["energy"], -constant / 2.0, 1e-15);
            close(&state["effective_potential"], 0.5 * (constant + speed * speed), 1e-12);
            assert!(number(state, "effective_potential") > 0.0);
        }
        assert_eq!(plain["above"], symmetric["above"]);
    }
}

#[test]
fn the_definition_in_any_units() {
    let service = Local::start();
    let (mu, length, time): (f64, f64, f64) = (0.2, 5000.0, 250.0);
    let system = json!({"mass_parameter": mu, "length_km": length, "time_s": time});
    let state = json!({"position": [1.5e6, -2.5e6, 4e5], "velocity": [3000.0, 1000.0, -2000.0]});
    let units = json!({"length": "m", "time": "min", "velocity": "m/s"});
    let answer = service.answer(POST, &json!({"system": system, "units": units, "states": [state]}));
    assert_eq!(answer["units"], units);
    assert_eq!(
        answer["frame"],
        json!({"axes": "rotating", "origin": "barycenter", "x_axis": "toward_smaller"})
    );
    let (x, y, z): (f64, f64, f64) = (0.3, -0.5, 0.08);
    let speed_squared = 14.0 / (length / time).powi(2);
    let distance = |along: f64| (along * along + y * y + z * z).sqrt();
    let (r1, r2) = (distance(x + mu), distance(x - 1.0 + mu));
    let constant = x * x + y * y + 2.0 * (1.0 - mu) / r1 + 2.0 * mu / r2 - speed_squared;
    let velocity_squared = (1000.0 * length / time).powi(2);
    let found = &answer["states"][0];
    close(&found["jacobi_constant"], constant * velocity_squared, 1e-15 * 4.0 * velocity_squared);
    close(&found["speed"], 14e6_f64.sqrt(), 1e-11);
    close(&found["distance_to_larger"], r1 * length * 1e3, 1e-8);
    close(&found["distance_to_smaller"], r2 * length * 1e3, 1e-8);
    let above = constant * velocity_squared - answer["equilibria"]["L2"].as_f64().unwrap();
    close(&found["above"]["L2"], above, 1e-14 * velocity_squared);
    assert!(answer["evidence"]["largest_departure_from_definition"].as_f64().unwrap() < 1e-15);
    assert!(answer["evidence"]["largest_residual"].as_f64().unwrap() < 1e-15);
}

#[test]
fn no_frame_changes_a_constant() {
    let service = Local::start();
    let system = json!({"mass_parameter": 0.1});
    let state = json!({"time": 2.5, "position": [0.7, 0.3, 0.05], "velocity": [0.1, -0.2, 0.02]});
    let default = one(&service, &json!({"system": system, "states": [state]}));
    for axes in ["rotating", "inertial"] {
        for origin in ["barycenter", "larger", "smaller"] {
            for x_axis in ["toward_smaller", "toward_larger"] {
                let frame = json!({"axes": axes, "origin": origin, "x_axis": x_axis});
                let body = json!({"system": system, "states": [state], "to": {"frame": frame}});
                let converted = service.answer("/v1/frames/convert", &body);
                let body = json!({"system": system, "frame": frame, "states": converted["states"]});
                let found = one(&service, &body);
                for name in
                    ["jacobi_constant", "energy", "speed", "distance_to_larger", "distance_to_smaller"]
                {
                    close(&found[name], default[name].as_f64().unwrap(), 2e-15);
                }
                assert_eq!(found["region"], default["region"]);
            }
        }
    }
}

#[test]
fn digits_survive_near_a_primary() {
    // Far below the spacing of doubles near 1, so only numbers counted from the primary itself can hold it.
    let (service, distance, mu) = (Local::start(), 3e-20, 0.25);
    for (origin, share) in [("larger", 1.0 - mu), ("smaller", mu)] {
        for axes in ["rotating", "inertial"] {
            let states = json!([{"position": [distance, 0.0, 0.0], "velocity": [0.0, 0.0, 0.0]}]);
            let frame = json!({"origin": origin, "axes": axes});
            let body = json!({"system": {"mass_parameter": mu}, "frame": frame, "states": states});
            let found = one(&service, &body);
            close(&found[format!("distance_to_{origin}")], distance, 2e-16 * distance);
            let constant = 2.0 * share / distance;
            close(&found["jacobi_constant"], constant, 4e-16 * constant);
            assert_eq!(found["region"], format!("around_{origin}"));
        }
    }
}

#[test]
fn passages_open_in_order_and_join_regions() {
    // Hill 1878; Szebehely 1967, Theory of Orbits, 4.7 (common practice): L1, L2, L3 open in this order as C falls.
    let service = Local::start();
    let mu = 0.0121505856;
    let rest = json!([{"position": [-mu + 0.1, 0.0, 0.0], "velocity": [0.0, 0.0, 0.0]}]);
    let system = json!({"mass_parameter": mu});
    let first = service.answer(POST, &json!({"system": system, "states": rest}));
    let constants = &first["equilibria"];
    let potential = first["states"][0]["effective_potential"].as_f64().unwrap();
    let level = |name: &str| constants[name].as_f64().unwrap();
    let (all, two) =
        (json!(["around_larger", "around_smaller", "outside"]), json!(["around_larger", "around_smaller"]));
    for (constant, open, reachable) in [
        (level("L1") + 1e-3, json!([]), json!(["around_larger"])),
        (0.5 * (level("L1") + level("L2")), json!(["L1"]), two),
        (0.5 * (level("L2") + level("L3")), json!(["L1", "L2"]), all.clone()),
        (0.5 * (level("L3") + level("L4")), json!(["L1", "L2", "L3"]), all.clone()),
        (level("L4") - 1e-3, json!(["L1", "L2", "L3", "L4_L5"]), all),
    ] {
        let speed = (2.0 * potential - constant).sqrt();
        let found = at(&service, mu, [-mu + 0.1, 0.0, 0.0], [0.0, speed, 0.0]);
        close(&found["jacobi_constant"], constant, 1e-13);
        assert_eq!(found["region"], "around_larger");
        assert_eq!(found["open_passages"], open, "{constant}");
        assert_eq!(found["reachable_regions"], reachable, "{constant}");
    }
    assert_eq!(at(&service, mu, [1.0, 0.0, 0.0], [0.0; 3])["region"], "around_smaller");
    assert_eq!(at(&service, mu, [3.0, 1.0, 0.0], [0.0; 3])["region"], "outside");
}

#[test]
fn differences_from_the_equilibria_do_not_cancel() {
    // At rest a little beside L4, where the constant is extremal: C - C4 is of the second order, 3/4 dx^2 + 9/4 dy^2 with
    // the cross term 3 sqrt(3)/2 (1 - 2 mu) dx dy (Szebehely 1967, Theory of Orbits, 5.3, from memory).
    let (service, mu) = (Local::start(), 0.25);
    let height = 0.75_f64.sqrt();
    let found = at(&service, mu, [0.25, height + 1e-6, 0.0], [0.0; 3]);
    close(&found["above"]["L4"], 2.25e-12, 1e-17);
    assert_eq!(found["above"]["L4"], found["above"]["L5"]);
}

#[test]
fn states_come_in_every_form() {
    let service = Local::start();
    let system = json!({"mass_parameter": 0.1});
    let list = json!([
        {"position": [0.3, 0.4, 0.1], "velocity": [0.5, 0.6, 0.7]},
        {"time": 1.0, "position": [0.5, -0.4, 0.0], "velocity": [0.0, 0.1, 0.0]},
    ]);
    let columns = json!({
        "time": [0.0, 1.0],
        "position": [[0.3, 0.4, 0.1], [0.5, -0.4, 0.0]],
        "velocity": [[0.5, 0.6, 0.7], [0.0, 0.1, 0.0]],
    });
    // Canonical momenta: px = vx - y, py = vy + x, pz = vz.
    let momenta = json!([
        {"position": [0.3, 0.4, 0.1], "momentum": [0.5 - 0.4, 0.6 + 0.3, 0.7]},
        {"position": [0.5, -0.4, 0.0], "momentum": [0.4, 0.1 + 0.5, 0.0]},
    ]);
    let ask = |states: &Value| service.answer(POST, &json!({"system": system, "states": states}));
    assert_eq!(ask(&list), ask(&columns));
    let (by_velocity, by_momentum) = (ask(&list), ask(&momenta));
    for index in 0..2 {
        let expected = by_velocity["states"][index]["jacobi_constant"].as_f64().unwrap();
        close(&by_momentum["states"][index]["jacobi_constant"], expected, 1e-15);
    }
    // A circle about the larger primary against the whole sky's turn, told by its elements: C = 1/a + 2 sqrt(a) for mu -> 0
    // (Tisserand).
    let elements = json!([{
        "elements": {"semi_major_axis": 0.25, "eccentricity": 0.0, "inclination": 0.0, "mean_longitude": 40.0},
        "elements_about": "larger",
    }]);
    let body = json!({"system": {"mass_parameter": 1e-14}, "states": elements});
    close(&one(&service, &body)["jacobi_constant"], 5.0, 1e-12);
}

#[test]
fn what_is_returned_can_be_sent_and_the_bytes_repeat() {
    let service = Local::start();
    let mut body: Value =
        serde_json::from_str(include_str!("../../src/service/api/jacobi/example.json")).unwrap();
    let first = service.post(POST, &body);
    let answer = first.success();
    for name in ["system", "units", "frame", "jacobi_form"] {
        body[name] = answer[name].clone();
    }
    assert_eq!(service.post(POST, &body).body, first.body);
}

#[test]
fn a_hundred_thousand_states_and_no_more() {
    let service = Local::start();
    let columns = |count: usize| {
        json!({"system": "earth-moon", "states": {
            "position": vec![[0.1, 0.0, 0.0]; count], "velocity": vec![[0.0, 1.0, 0.0]; count],
        }})
    };
    let alone = service.answer(POST, &columns(1))["states"][0].to_string();
    let reply = service.post(POST, &columns(100_000));
    assert_eq!(reply.status, 200);
    let text = String::from_utf8(reply.body).unwrap();
    let (_, states) = text.split_once("\"states\":[").unwrap();
    let each = states.trim_end_matches("]}").split("},{").map(|state| state.trim_matches(['{', '}']));
    let expected = alone.trim_matches(['{', '}']);
    assert_eq!(
        each.filter(|state| *state == expected).count(),
        100_000,
        "the same bits alone and in a batch"
    );
    let reply = service.post(POST, &columns(100_001));
    reply.has_fault("work-limit", "pointer", "/states", "at most 100000 states");
    let fault = &reply.json()["errors"][0];
    assert_eq!((fault["limit"].as_u64(), fault["asked"].as_u64()), (Some(100_000), Some(100_001)));
}

#[test]
fn bad_requests_are_told_what_would_be_right() {
    let service = Local::start();
    let good = json!([{"position": [0.5, 0.1, 0.0], "velocity": [0.0, 0.0, 0.0]}]);
    let mass = |value: Value| json!({"system": {"mass_parameter": value}, "states": good});
    let states = |states: Value| json!({"system": {"mass_parameter": 0.25}, "states": states});
    let state = |position: [f64; 3]| states(json!([{"position": position, "velocity": [0, 0, 0]}]));
    let momentum = |frame: Value| {
        let states = json!([{"position": [0.5, 0, 0], "momentum": [0, 0, 0]}]);
        json!({"system": "earth-moon", "frame": frame, "states": states})
    };
    service.refuses(
        POST,
        &[
            (mass(json!(0)), "/system/mass_parameter", "above 0 and at most 0.5, got 0"),
            (mass(json!(0.6)), "/system/mass_parameter", "at most 0.5, got 0.6"),
            (mass(json!(-1)), "/system/mass_parameter", "got -1"),
            (mass(json!("0.1")), "/system/mass_parameter", "got a string"),
            (mass(json!(null)), "/system", "mass_parameter"),
            (state([-0.25, 0.0, 0.0]), "/states/0/position", "centre of the larger primary"),
            (state([0.75, 0.0, 0.0]), "/states/0/position", "centre of the smaller primary"),
            (
                states(json!({"position": [[0.5, 0, 0], [0.75, 0, 0]], "velocity": [[0, 0, 0], [0, 0, 0]]})),
                "/states/position/1",
                "centre of the smaller primary",
            ),
            (state([1e7, 0.0, 0.0]), "/states/0/position/0", "from -1000000 to 1000000, got 10000000"),
            (states(json!([])), "/states", "at least one state"),
            (states(json!([{"position": [0.1, 0.2, 0.3]}])), "/states/0", "exactly one of"),
            (states(json!([{"velocity": [0.1, 0.2, 0.3]}])), "/states/0/position", "is required"),
            (
                states(json!([{"position": [0.1, 0.2], "velocity": [0, 0, null]}])),
                "/states/0/velocity/2",
                "must be a finite number, got null",
            ),
            (
                states(json!([{"position": [0.1, 0.2], "velocity": [0, 0, null]}])),
                "/states/0/position",
                "exactly 3 items, got 2",
            ),
            (momentum(json!({"axes": "inertial"})), "/states/0/momentum", "rotating axes about the barycenter"),
            (momentum(json!({"origin": "larger"})), "/states/0/momentum", "rotating axes about the barycenter"),
            (
                json!({"system": {"mass_parameter": 0.1}, "units": {"length": "km", "time": "s"}, "states": good}),
                "/units",
                "needs a scale that the system lacks: `length_km` and `time_s`",
            ),
            (json!({"system": "earth-moon"}), "/states", "is required"),
            (json!({"system": "earth-moon", "state": good}), "/state", "did you mean `states`?"),
            (json!({"states": good}), "/system", "is required"),
            (json!({}), "/system", "is required"),
            (json!([]), "", "must be an object, got an array"),
        ],
    );
    assert_eq!(service.post_text(POST, "").json()["type"], "/problems/malformed-json");
    service
        .post_text(POST, r#"{"system": "earth-moon", "states": [{"position": [1e999, 0, 0]}]}"#)
        .has_fault("invalid-request", "pointer", "/states/0/position/0", "finite");
}

#[test]
fn faults_of_several_states_come_at_once() {
    let service = Local::start();
    let body = json!({"system": {"mass_parameter": 0.25}, "jacobi_form": "both", "states": [
        {"position": [0.75, 0.0, 0.0], "velocity": [0.0, 0.0, 0.0]},
        {"position": [0.5, 0.0, 0.0], "velocity": [0.0, 2e6, 0.0]},
        {"position": [-0.25, 0.0, 0.0], "velocity": [0.0, 0.0, 0.0]},
    ]});
    let reply = service.post(POST, &body).json();
    let pointers: Vec<&str> =
        reply["errors"].as_array().unwrap().iter().map(|fault| fault["pointer"].as_str().unwrap()).collect();
    assert_eq!(
        pointers,
        ["/jacobi_form", "/states/0/position", "/states/1/velocity/1", "/states/2/position"]
    );
    assert_eq!(reply["detail"], "4 members are not valid");
}
