//! `POST /v1/trajectories`: what the contract says of it, rule by rule, on the real binary.

use serde_json::{Value, json};

use super::support::Server;

const PATH: &str = "/v1/trajectories";

/// Hairer, Nørsett & Wanner, *Solving Ordinary Differential Equations I*, §II.0: a closed orbit.
fn arenstorf() -> Value {
    json!({
        "system": { "mass_parameter": 0.012277471 },
        "initial_states": [{ "position": [0.994, 0.0, 0.0], "velocity": [0.0, -2.00158510637908252240537862224, 0.0] }],
        "duration": 17.0652165601579625588917206249
    })
}

/// A halo orbit and its period.
fn halo() -> Value {
    json!({
        "system": { "mass_parameter": 0.01215058560962404 },
        "initial_states": [{ "position": [1.1720459535998, 0.0, -0.0862], "velocity": [0.0, -0.1880035431733172, 0.0] }],
        "duration": 3.3517255182390353
    })
}

fn with(mut body: Value, members: &Value) -> Value {
    for (name, value) in members.as_object().unwrap() {
        body[name] = value.clone();
    }
    body
}

fn solved(server: &Server, body: &Value) -> Value {
    let reply = server.post(PATH, body);
    assert_eq!(reply.status, 200, "{}", String::from_utf8_lossy(&reply.body));
    reply.json()
}

/// The pointers of the faults of a request.
fn pointers(server: &Server, body: &Value) -> Vec<String> {
    let problem = server.post(PATH, body).problem("invalid-request");
    problem["errors"].as_array().unwrap().iter().map(|e| e["pointer"].as_str().unwrap().to_owned()).collect()
}

fn numbers(value: &Value) -> Vec<f64> {
    value.as_array().unwrap().iter().map(|number| number.as_f64().unwrap()).collect()
}

fn apart(a: &Value, b: &Value) -> f64 {
    numbers(a).iter().zip(numbers(b)).map(|(a, b)| (a - b) * (a - b)).sum::<f64>().sqrt()
}

#[test]
fn a_published_orbit_closes() {
    let server = Server::start();
    let body = arenstorf();
    let answer = solved(&server, &body);
    let trajectory = &answer["trajectories"][0];
    assert_eq!(trajectory["outcome"], "complete");
    assert!(apart(&trajectory["final"]["position"], &body["initial_states"][0]["position"]) <= 1e-12);
    assert_eq!(trajectory["final"]["time"], body["duration"]);
    assert!(trajectory["evidence"]["jacobi_drift"].as_f64().unwrap() < 1e-13);
    assert_eq!(answer["outcome"], "complete");
    assert_eq!(answer["contact_bodies"], json!([]));
    for member in ["samples", "stopped_by", "state_transition_matrix"] {
        assert!(trajectory[member].is_null(), "{member} was not asked for");
    }
}

#[test]
fn the_same_request_gives_the_same_bytes_and_their_digest() {
    let server = Server::start();
    let body = with(halo(), &json!({ "samples": { "count": 50 }, "state_transition_matrix": "samples" }));
    let (first, second) = (server.post(PATH, &body), server.post(PATH, &body));
    assert_eq!(first.body, second.body);
    assert_eq!(first.header("repr-digest"), second.header("repr-digest"));
    assert!(first.header("server-timing").starts_with("compute;dur="));
}

#[test]
fn physical_units_give_the_same_trajectory() {
    let server = Server::start();
    let plain = solved(&server, &with(halo(), &json!({ "system": "earth-moon", "contact": "ignore" })));
    let (length, time) =
        (plain["system"]["length_km"].as_f64().unwrap(), plain["system"]["time_s"].as_f64().unwrap());
    let body = json!({
        "system": plain["system"], "units": { "length": "km", "time": "d", "velocity": "m/s" }, "contact": "ignore",
        "initial_states": [{ "position": [1.1720459535998 * length, 0.0, -0.0862 * length],
            "velocity": [0.0, -0.1880035431733172 * length / time * 1000.0, 0.0] }],
        "duration": 3.3517255182390353 * time / 86400.0,
        "state_transition_matrix": "final"
    });
    let physical = solved(&server, &body);
    let (a, b) = (&plain["trajectories"][0], &physical["trajectories"][0]);
    let scaled: Vec<f64> = numbers(&b["final"]["position"]).iter().map(|x| x / length).collect();
    assert!(apart(&a["final"]["position"], &json!(scaled)) < 1e-11);
    assert_eq!(physical["units"], body["units"]);
    assert_eq!(b["final"]["time"], body["duration"], "in the client's own digits");
    // d(position)/d(velocity) is a time: kilometres per metre per second.
    let matrix = numbers(&b["state_transition_matrix"][0]);
    let mut normalised = halo();
    normalised["state_transition_matrix"] = json!("final");
    normalised["system"] = plain["system"].clone();
    normalised["contact"] = json!("ignore");
    let reference = numbers(&solved(&server, &normalised)["trajectories"][0]["state_transition_matrix"][0]);
    assert!((matrix[0] / reference[0] - 1.0).abs() < 1e-8);
    assert!((matrix[3] / (reference[3] * time / 1000.0) - 1.0).abs() < 1e-8);
}

#[test]
fn what_is_returned_can_be_sent() {
    let server = Server::start();
    let frame = json!({ "axes": "inertial", "origin": "smaller", "x_axis": "toward_larger" });
    let units = json!({ "length": "km", "time": "d", "velocity": "km/s" });
    let body = with(
        halo(),
        &json!({ "system": "earth-moon", "units": units, "frame": frame, "duration": 10.0, "contact": "ignore",
            "initial_states": [{ "position": [5000.0, 0.0, 30000.0], "velocity": [0.3, 0.2, 0.0] }] }),
    );
    let first = solved(&server, &body);
    let again = json!({
        "system": first["system"], "units": first["units"], "frame": first["frame"], "contact": "ignore",
        "initial_states": [first["trajectories"][0]["final"]], "duration": -10.0
    });
    let home = solved(&server, &again);
    let distance =
        apart(&home["trajectories"][0]["final"]["position"], &body["initial_states"][0]["position"]);
    assert!(distance < 1e-4, "{distance} km");
    assert_eq!(home["trajectories"][0]["final"]["time"], 0.0);
}

#[test]
fn columns_are_states_and_durations_may_differ() {
    let server = Server::start();
    let body = with(
        halo(),
        &json!({
            "initial_states": { "time": [0.0, 5.0], "position": [[1.1720459535998, 0.0, -0.0862], [0.5, 0.1, 0.0]],
                "velocity": [[0.0, -0.1880035431733172, 0.0], [0.0, 0.9, 0.0]] },
            "duration": [1.5, -0.5]
        }),
    );
    let answer = solved(&server, &body);
    let times: Vec<f64> = answer["trajectories"]
        .as_array()
        .unwrap()
        .iter()
        .map(|t| t["final"]["time"].as_f64().unwrap())
        .collect();
    assert_eq!(times, [1.5, 4.5]);
    assert_eq!(answer["trajectories"][1]["index"], 1);
    assert_eq!(pointers(&server, &with(body, &json!({ "duration": [1.0] }))), ["/duration"]);
}

#[test]
fn samples_of_each_kind() {
    let server = Server::start();
    for (samples, count) in [
        (json!({ "count": 5 }), 5),
        (json!({ "interval": 1.0 }), 4),
        (json!({ "times": [0.1, 0.2, 3.0] }), 3),
    ] {
        let answer = solved(&server, &with(halo(), &json!({ "samples": samples })));
        let samples = &answer["trajectories"][0]["samples"];
        for column in ["time", "position", "velocity"] {
            assert_eq!(samples[column].as_array().unwrap().len(), count, "{column}");
        }
        assert!(samples.get("state_transition_matrix").is_none());
    }
    let answer = solved(&server, &with(halo(), &json!({ "samples": "every_step" })));
    let trajectory = &answer["trajectories"][0];
    let steps = trajectory["evidence"]["steps"].as_u64().unwrap();
    assert_eq!(trajectory["samples"]["time"].as_array().unwrap().len() as u64, steps + 1);
}

#[test]
fn events_of_each_kind() {
    let server = Server::start();
    let events = json!([
        { "name": "down", "when": { "plane_crossing": { "axis": "z", "value": 0.0 } }, "direction": "decreasing" },
        { "when": { "plane": { "normal": [0.0, 2.0, 0.0], "through": [0.5, 0.0, 0.3] } } },
        { "when": { "distance": { "body": "smaller", "value": 0.2 } } },
        { "when": { "periapsis": "smaller" } },
        { "when": { "apoapsis": "larger" }, "only": { "axis": "x", "above": 1.0 } }
    ]);
    let answer = solved(&server, &with(halo(), &json!({ "events": events, "duration": 3.4 })));
    let found = answer["trajectories"][0]["events"].as_array().unwrap();
    let of = |entry: usize| found.iter().filter(|e| e["event"] == entry).collect::<Vec<_>>();
    assert_eq!(of(0).len(), 1);
    assert_eq!(of(0)[0]["name"], "down");
    assert!(of(0)[0]["velocity"][2].as_f64().unwrap() < 0.0);
    let half = 0.5 * 3.3517255182390353;
    assert!(
        (of(1)[0]["time"].as_f64().unwrap() - half).abs() < 1e-12,
        "half a period: the plane of symmetry"
    );
    assert!(of(2).iter().all(|event| {
        let position = numbers(&event["position"]);
        let x = position[0] - (1.0 - 0.01215058560962404);
        ((x * x + position[1] * position[1] + position[2] * position[2]).sqrt() - 0.2).abs() < 1e-15
    }));
    assert!(!of(3).is_empty() && !of(4).is_empty());

    let stop = json!([{ "when": { "plane_crossing": { "axis": "y", "value": 0.0 } }, "stop_after": 3 }]);
    let answer = solved(&server, &with(halo(), &json!({ "events": stop, "duration": 100.0 })));
    let trajectory = &answer["trajectories"][0];
    assert_eq!(trajectory["outcome"], "stopped_by_event");
    assert_eq!(trajectory["stopped_by"], 0);
    assert_eq!(trajectory["events"].as_array().unwrap().len(), 3);
    assert_eq!(trajectory["events"][2]["time"], trajectory["final"]["time"]);
}

#[test]
fn manoeuvres_are_where_they_are_said_to_be() {
    let server = Server::start();
    let manoeuvres = json!([{ "time": 0.5, "delta_v": [0.0, 0.01, 0.0] },
        { "time": 0.7, "delta_v": [0.02, 0.0, 0.0], "axes": "velocity_normal_binormal", "for": [0] }]);
    let body = with(halo(), &json!({ "manoeuvres": manoeuvres, "duration": 1.0 }));
    let with_burns = solved(&server, &body);
    let without = solved(&server, &with(halo(), &json!({ "duration": 1.0 })));
    let end = |answer: &Value| answer["trajectories"][0]["final"]["position"].clone();
    assert!(apart(&end(&with_burns), &end(&without)) > 1e-3);
    let faulty = json!([{ "time": 7.0, "delta_v": [0.0, 0.01, 0.0] },
        { "time": 0.7, "delta_v": [0.02, 0.0], "for": [3] },
        { "time": 0.7, "delta_v": [0.02, 0.0, 0.0], "for": [3] }]);
    assert_eq!(
        pointers(&server, &with(halo(), &json!({ "manoeuvres": faulty, "duration": 1.0 }))),
        ["/manoeuvres/1/delta_v"]
    );
    let faulty = json!([{ "time": 7.0, "delta_v": [0.0, 0.01, 0.0] },
        { "time": 0.7, "delta_v": [0.02, 0.0, 0.0], "for": [3] }]);
    assert_eq!(
        pointers(&server, &with(halo(), &json!({ "manoeuvres": faulty, "duration": 1.0 }))),
        ["/manoeuvres/0/time", "/manoeuvres/1/for/0"]
    );
}

#[test]
fn contact_ends_a_trajectory_where_a_radius_is_known() {
    let server = Server::start();
    let falling = json!([{ "position": [1.04, 0.0, 0.01], "velocity": [0.0, 0.0, 0.0] }]);
    let radii = json!({ "mass_parameter": 0.01215058560962404, "radius_smaller": 0.0045 });
    let body = with(halo(), &json!({ "system": radii, "initial_states": falling, "duration": 5.0 }));
    let answer = solved(&server, &body);
    assert_eq!(answer["contact_bodies"], json!(["smaller"]));
    assert_eq!(answer["trajectories"][0]["outcome"], "contact_smaller");
    assert_eq!(answer["outcomes"], json!({ "contact_smaller": 1 }));

    let inside = json!([{ "position": [0.988, 0.0, 0.001], "velocity": [0.0, 0.0, 0.0] }]);
    let answer = solved(&server, &with(body.clone(), &json!({ "initial_states": &inside })));
    assert_eq!(answer["trajectories"][0]["outcome"], "contact_smaller");
    assert_eq!(answer["trajectories"][0]["final"]["time"], 0.0, "an outcome, not an error");
    let sampled = with(body.clone(), &json!({ "initial_states": inside, "samples": "every_step" }));
    assert_eq!(solved(&server, &sampled)["trajectories"][0]["samples"]["time"], json!([0.0]));

    let ignored = solved(&server, &with(body, &json!({ "contact": "ignore", "duration": 0.1 })));
    assert_eq!(ignored["contact_bodies"], json!([]));
    assert_eq!(pointers(&server, &with(halo(), &json!({ "contact": "stop" }))), ["/contact"]);
}

#[test]
fn limits_are_told_before_any_work() {
    let server = Server::with(&[("SYNODIA_MAX_STATES", "2")]);
    let state = halo()["initial_states"][0].clone();
    let cases = [
        (json!({ "initial_states": [state, state, state] }), "/initial_states"),
        (json!({ "samples": { "count": 1_000_000_000_000_u64 } }), "/samples"),
        (json!({ "samples": { "interval": 1e-300 } }), "/samples"),
        (json!({ "limits": { "steps": 1_000_001 } }), "/limits/steps"),
        (json!({ "limits": { "wall_time_ms": 120_001 } }), "/limits/wall_time_ms"),
    ];
    for (members, pointer) in cases {
        let problem = server.post(PATH, &with(halo(), &members)).problem("work-limit");
        let error = &problem["errors"][0];
        assert_eq!(error["pointer"], pointer);
        assert!(error["limit"].as_f64().unwrap() < error["asked"].as_f64().unwrap());
    }
    let few = with(halo(), &json!({ "limits": { "steps": 5 } }));
    assert_eq!(solved(&server, &few)["trajectories"][0]["outcome"], "step_limit");
}

#[test]
fn samples_at_every_step_stay_within_the_limit() {
    let server = Server::with(&[("SYNODIA_MAX_SAMPLE_VALUES", "700")]);
    let long = with(halo(), &json!({ "samples": "every_step", "duration": 100.0 }));
    let problem = server.post(PATH, &long).problem("work-limit");
    assert_eq!(problem["errors"][0]["pointer"], "/samples");
}

#[test]
fn a_burn_along_an_undefined_axis_is_refused() {
    let server = Server::start();
    let burn = json!([{ "time": 0.0, "delta_v": [0.01, 0.02, 0.0], "axes": "velocity_normal_binormal" }]);
    for velocity in [json!([0.0, 0.0, 0.0]), json!([0.5, 0.0, 0.0])] {
        let states = json!([{ "position": [0.8, 0.0, 0.0], "velocity": velocity }]);
        let body = with(halo(), &json!({ "initial_states": states, "manoeuvres": burn }));
        assert_eq!(pointers(&server, &body), ["/manoeuvres/0/axes"]);
    }
}

#[test]
fn samples_are_told_in_the_digits_of_the_request() {
    let server = Server::start();
    let mut body = with(
        halo(),
        &json!({ "system": "earth-moon", "units": { "length": "km", "time": "d" }, "samples": { "count": 3 },
            "duration": 0.529, "initial_states":
                [{ "time": -124.225, "position": [200000.0, 0.0, 0.0], "velocity": [0.0, 60000.0, 0.0] }] }),
    );
    let trajectory = solved(&server, &body)["trajectories"][0].clone();
    assert_eq!(trajectory["samples"]["time"][0], -124.225);
    assert_eq!(trajectory["samples"]["time"][2], trajectory["final"]["time"]);
    body["samples"] = json!({ "interval": 0.1 });
    body["initial_states"][0]["time"] = json!(0.0);
    body["duration"] = json!(-1.0);
    let times = numbers(&solved(&server, &body)["trajectories"][0]["samples"]["time"]);
    assert_eq!(times[5].to_bits(), (-0.5_f64).to_bits());
    assert_eq!(times.len(), 11);
}

#[test]
fn events_stay_within_the_limit_of_a_buffered_answer() {
    let server = Server::with(&[("SYNODIA_MAX_SAMPLE_VALUES", "80")]);
    let events = json!([{ "when": { "plane_crossing": { "axis": "y", "value": 0.0 } } }]);
    let few = with(halo(), &json!({ "events": events, "duration": 16.0 }));
    assert_eq!(solved(&server, &few)["trajectories"][0]["events"].as_array().unwrap().len(), 9);
    let many = with(halo(), &json!({ "events": events, "duration": 100.0 }));
    let problem = server.post(PATH, &many).problem("work-limit");
    assert_eq!(problem["errors"][0]["pointer"], "/events");
}

#[test]
fn too_many_of_anything_is_all_that_is_said() {
    let server = Server::start();
    let burns = vec![json!({ "time": 99.0, "delta_v": [0.0, 0.0, 0.0] }); 1001];
    let problem = server.post(PATH, &with(halo(), &json!({ "manoeuvres": burns }))).problem("work-limit");
    assert_eq!(
        problem["errors"],
        json!([{ "pointer": "/manoeuvres", "limit": 1000, "asked": 1001,
        "detail": "at most 1000 manoeuvres are granted, got 1001" }])
    );
}

#[test]
fn each_fault_has_its_pointer_and_all_come_at_once() {
    let server = Server::start();
    let cases = [
        (json!({ "system": { "mass_parameter": 0.0 } }), "/system/mass_parameter"),
        (json!({ "system": { "mass_parameter": 0.6 } }), "/system/mass_parameter"),
        (json!({ "system": { "mass_parameter": -1.0 } }), "/system/mass_parameter"),
        (json!({ "system": { "mass_parameter": "0.1" } }), "/system/mass_parameter"),
        (json!({ "system": null }), "/system"),
        (json!({ "duration": 1e300 }), "/duration"),
        (json!({ "duration": null }), "/duration"),
        (json!({ "tolerance": 1e-30 }), "/tolerance"),
        (json!({ "samples": { "count": 0 } }), "/samples/count"),
        (json!({ "samples": { "interval": 7.0 } }), "/samples/interval"),
        (json!({ "samples": { "interval": 0.0 } }), "/samples/interval"),
        (json!({ "samples": { "times": [2.0, 1.0] } }), "/samples/times/1"),
        (json!({ "samples": { "times": [2.0, 4.0] } }), "/samples/times/1"),
        (json!({ "samples": "sometimes" }), "/samples"),
        (json!({ "units": { "length": "km", "time": "s" } }), "/units"),
        (
            json!({ "events": [{ "when": { "plane_crossing": { "axis": "w", "value": 0.0 } } }] }),
            "/events/0/when/plane_crossing/axis",
        ),
        (
            json!({ "events": [{ "when": { "plane": { "normal": [0.0, 0.0, 0.0], "through": [0.0, 0.0, 0.0] } } }] }),
            "/events/0/when/plane/normal",
        ),
        (
            json!({ "events": [{ "when": { "distance": { "body": "smaller", "value": -1.0 } } }] }),
            "/events/0/when/distance/value",
        ),
        (
            json!({ "events": [{ "when": { "periapsis": "smaller" }, "direction": "increasing" }] }),
            "/events/0/direction",
        ),
        (
            json!({ "events": [{ "when": { "periapsis": "smaller" }, "only": { "axis": "x" } }] }),
            "/events/0/only",
        ),
        (
            json!({ "events": [{ "when": { "periapsis": "smaller" }, "stop_after": 0 }] }),
            "/events/0/stop_after",
        ),
        (
            json!({ "frame": { "axes": "inertial" }, "initial_states": [{ "position": [1.0, 0.0, 0.0], "momentum": [0.0, 1.0, 0.0] }] }),
            "/initial_states/0/momentum",
        ),
        (
            json!({ "initial_states": [{ "position": [-0.01215058560962404, 0.0, 0.0], "velocity": [0.0, 1.0, 0.0] }] }),
            "/initial_states/0",
        ),
        (json!({ "initial_states": [] }), "/initial_states"),
        (json!({ "arithmetic": "quadruple" }), "/arithmetic"),
        (json!({ "audit": "true" }), "/audit"),
        (json!({ "arithmetic": "double_double", "audit": true }), "/audit"),
        (json!({ "tolerence": 1e-12 }), "/tolerence"),
    ];
    for (members, pointer) in &cases {
        assert_eq!(pointers(&server, &with(halo(), members)), [*pointer], "{members}");
    }
    let many = json!({ "tolerance": 1.0, "samples": { "interval": 9.0 }, "audit": 1,
        "manoeuvres": [{ "time": 99.0, "delta_v": [0.0, 0.0, 0.0] }],
        "events": [{ "when": { "apoapsis": "larger" }, "direction": "either" }] });
    let mut found = pointers(&server, &with(halo(), &many));
    found.sort();
    let system = json!({ "system": { "mass_parameter": 2.0 }, "frame": { "axes": "inertial" },
        "initial_states": [{ "position": [1.0, 0.0, 0.0], "momentum": [0.0, 1.0, 0.0] }] });
    assert_eq!(
        pointers(&server, &with(halo(), &system)),
        ["/system/mass_parameter", "/initial_states/0/momentum"]
    );
    let counts = json!({ "duration": [1.0, 2.0], "samples": { "times": [5.0, 4.0] },
        "manoeuvres": [{ "time": 99.0, "delta_v": [0.0, 0.0, 0.0], "for": [7] }] });
    assert_eq!(
        pointers(&server, &with(halo(), &counts)),
        ["/duration", "/samples/times/1", "/manoeuvres/0/for/0"]
    );
    assert_eq!(
        found,
        ["/audit", "/events/0/direction", "/manoeuvres/0/time", "/samples/interval", "/tolerance"]
    );
}

#[test]
fn an_audit_measures_the_true_error() {
    let server = Server::start();
    let audit = |members: &Value| {
        let answer = solved(&server, &with(with(halo(), &json!({ "audit": true })), members));
        answer["trajectories"][0]["evidence"]["audit"].clone()
    };
    let good = audit(&json!({}));
    assert_eq!((&good["arithmetic"], &good["outcome"]), (&json!("double_double"), &json!("complete")));
    let error = good["position_error"].as_f64().unwrap();
    assert!(error > 0.0 && error < 5e-14);

    // Against the 46-digit final state of `tests/mechanics/reference/trajectories.txt`.
    let loose = with(halo(), &json!({ "audit": true, "tolerance": 1e-6 }));
    let trajectory = &solved(&server, &loose)["trajectories"][0];
    let truth = json!([1.172_045_953_599_626_3, 4.483_386_743_635_753e-14, -0.086_199_999_999_972_41]);
    let (found, expected) =
        (&trajectory["evidence"]["audit"]["position_error"], apart(&trajectory["final"]["position"], &truth));
    assert!((found.as_f64().unwrap() / expected - 1.0).abs() < 1e-4, "{found} {expected}");

    // A step of the audit takes as long as 25 in double precision and counts as many.
    let cut = audit(&json!({ "limits": { "steps": 100 } }));
    assert_eq!(
        cut,
        json!({ "arithmetic": "double_double", "outcome": "step_limit", "position_error": null, "velocity_error": null })
    );
    assert_eq!(solved(&server, &halo())["trajectories"][0]["evidence"]["audit"], Value::Null);
}

#[test]
fn an_audit_beyond_the_limits_is_refused_before_any_work() {
    let server = Server::start();
    let long = with(halo(), &json!({ "audit": true, "duration": 1e6 }));
    let problem = server.post(PATH, &long).problem("work-limit");
    assert_eq!(problem["errors"][0]["pointer"], "/audit");

    let state = &halo()["initial_states"][0];
    for extended in [json!({ "audit": true }), json!({ "arithmetic": "double_double" })] {
        let many = with(with(halo(), &json!({ "initial_states": vec![state; 4001] })), &extended);
        let problem = server.post(PATH, &many).problem("work-limit");
        assert_eq!(problem["errors"][0]["pointer"], "/initial_states");
    }
}

#[test]
fn many_states_come_back_in_order() {
    let server = Server::start();
    let states: Vec<Value> = (0..200)
        .map(|i| json!({ "position": [0.3 + 0.001 * f64::from(i), 0.0, 0.0], "velocity": [0.0, 1.2, 0.0] }))
        .collect();
    let answer = solved(&server, &with(halo(), &json!({ "initial_states": states, "duration": 2.0 })));
    let all = answer["trajectories"].as_array().unwrap();
    assert!(all.iter().enumerate().all(|(i, t)| t["index"] == i));
    // Each has the bits it has alone.
    let alone = solved(&server, &with(halo(), &json!({ "initial_states": [states[77]], "duration": 2.0 })));
    assert_eq!(alone["trajectories"][0]["final"], all[77]["final"]);
}
