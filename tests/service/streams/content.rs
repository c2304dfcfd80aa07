//! What a stream says, against what the buffered answer says.

use axum::body::Body;
use http::{Request, StatusCode, header};
use serde_json::{Value, json};

use super::super::router::{Local, Reply};
use super::{EQUILIBRIA, NDJSON, TRAJECTORIES, endless, lines, parsed, states};

fn stream(service: &Local, path: &str, body: &Value) -> Reply {
    let request = Request::post(path).header(header::CONTENT_TYPE, "application/json");
    let request = request.header(header::ACCEPT, NDJSON).header(header::ACCEPT_ENCODING, "gzip");
    service.send(request.body(Body::from(body.to_string())).unwrap())
}

fn with_threads(threads: usize) -> Local {
    Local::with(|config| config.compute.threads = threads)
}

/// The members of a line of that kind, without braces.
fn members<'a>(line: &'a str, kind: &str) -> &'a str {
    let start = format!("{{\"kind\":\"{kind}\",");
    line.strip_prefix(&*start)
        .and_then(|rest| rest.strip_suffix('}'))
        .unwrap_or_else(|| panic!("{kind}: {line}"))
}

/// The buffered answer put together from the lines of the stream.
fn put_together(lines: &[&str], kind: &str, array: &str) -> String {
    let [header, items @ .., summary] = lines else { panic!("{lines:?}") };
    let items: Vec<String> = items.iter().map(|line| format!("{{{}}}", members(line, kind))).collect();
    let (header, summary) = (members(header, "header"), members(summary, "summary"));
    format!("{{{header},{summary},\"{array}\":[{}]}}", items.join(","))
}

/// Trajectories with everything that one can have.
fn rich(count: u32) -> Value {
    json!({
        "system": "earth-moon", "units": { "length": "km", "time": "d" }, "frame": { "origin": "larger" },
        "initial_states": (0..count).map(|i| json!({
            "position": [150_000.0 + 40.0 * f64::from(i), 0.0, 20_000.0], "velocity": [0.0, 130_000.0, 0.0]
        })).collect::<Vec<_>>(),
        "duration": 9.0, "samples": { "count": 7 }, "state_transition_matrix": "samples",
        "events": [{ "name": "low", "when": { "periapsis": "larger" }, "stop_after": 2 }],
        "manoeuvres": [{ "time": 1.0, "delta_v": [0.0, 100.0, 0.0], "axes": "velocity_normal_binormal" }],
    })
}

#[test]
fn the_lines_are_the_buffered_answer_digit_for_digit() {
    let service = Local::start();
    let bare =
        json!({ "system": { "mass_parameter": 0.01 }, "initial_states": states(1500), "duration": 0.2 });
    for body in [rich(1), rich(150), bare] {
        let buffered = service.post(TRAJECTORIES, &body);
        assert_eq!(buffered.status, StatusCode::OK);
        let streamed = stream(&service, TRAJECTORIES, &body);
        assert_eq!(streamed.header("content-type"), NDJSON);
        let put = put_together(&lines(&streamed.body), "trajectory", "trajectories");
        assert!(put.as_bytes() == buffered.body, "{put}\n{}", String::from_utf8_lossy(&buffered.body));
    }
}

#[test]
fn a_stream_has_the_same_bytes_whatever_the_threads() {
    let body = rich(120);
    let first = stream(&with_threads(1), TRAJECTORIES, &body).body;
    for threads in [2, 5] {
        assert!(stream(&with_threads(threads), TRAJECTORIES, &body).body == first, "{threads} threads");
    }
}

#[test]
fn a_stream_has_the_headers_of_one() {
    let reply = stream(&Local::start(), TRAJECTORIES, &rich(50));
    assert_eq!(reply.status, StatusCode::OK);
    for absent in ["repr-digest", "content-encoding", "content-length"] {
        assert!(!reply.headers.contains_key(absent), "{absent}");
    }
    assert!(reply.headers.contains_key("x-request-id") && reply.header("vary").contains("accept"));
}

/// Samples beyond the last 10,000 come first, in lines of their own.
#[test]
fn long_samples_come_in_portions() {
    let service = Local::with(|config| config.limits.sample_values = 1_000_000);
    for sampling in [json!({ "count": 25_001 }), json!({ "interval": 0.0001 })] {
        let body = json!({ "system": { "mass_parameter": 0.01 }, "initial_states": states(2), "duration": 2.5,
            "samples": sampling, "units": "normalized" });
        let streamed = stream(&service, TRAJECTORIES, &body);
        let lines = parsed(&lines(&streamed.body));
        let kinds: Vec<&str> = lines.iter().map(|line| line["kind"].as_str().unwrap()).collect();
        let each = ["samples", "samples", "trajectory"];
        assert_eq!(kinds, [&["header"][..], &each, &each, &["summary"]].concat());
        let buffered = service.answer(TRAJECTORIES, &body);
        for (index, portions) in lines[1..7].chunks(3).enumerate() {
            assert!(portions.iter().all(|line| line["index"] == index));
            let whole = &buffered["trajectories"][index];
            assert_eq!(portions[2]["final"], whole["final"]);
            for column in ["time", "position", "velocity"] {
                let columns = [&portions[0][column], &portions[1][column], &portions[2]["samples"][column]];
                let columns = columns.map(|column| column.as_array().unwrap());
                assert_eq!(columns.map(Vec::len), [10_000, 10_000, 5_001]);
                assert!(
                    columns.into_iter().flatten().eq(whole["samples"][column].as_array().unwrap()),
                    "{column}"
                );
            }
        }
    }
}

#[test]
fn a_stream_has_no_limit_of_sample_values() {
    let service = Local::with(|config| config.limits.sample_values = 100);
    for samples in [json!({ "count": 100 }), json!("every_step")] {
        let body = json!({ "system": { "mass_parameter": 0.01 }, "initial_states": states(3), "duration": 9.0,
            "samples": samples });
        service.post(TRAJECTORIES, &body).has_fault("work-limit", "pointer", "/samples", "at most 100");
        let lines = parsed(&lines(&stream(&service, TRAJECTORIES, &body).body));
        assert_eq!(lines.last().unwrap()["outcomes"], json!({ "complete": 3 }));
    }
}

/// Of 100,000 states some are invalid: all are named, in a problem of its own, and nothing is computed.
#[test]
fn invalid_states_among_very_many_are_named_before_the_first_line() {
    let service = Local::start();
    let good = r#"{"position":[0.4,0,0],"velocity":[0,1,0]}"#;
    let mut all = vec![good; 100_000];
    all[70_001] = r#"{"position":[0.4,0,0],"velocity":[0,"1",0]}"#;
    all[99_999] = r#"{"position":[-0.01,0,0],"velocity":[0,1,0]}"#;
    let text = |all: &[&str]| {
        format!(
            r#"{{"system":{{"mass_parameter":0.01}},"duration":1e7,"contact":"ignore","initial_states":[{}]}}"#,
            all.join(",")
        )
    };
    for accept in ["application/json", NDJSON] {
        let ask = |text: String| {
            let request = Request::post(TRAJECTORIES).header(header::CONTENT_TYPE, "application/json");
            service.send(request.header(header::ACCEPT, accept).body(Body::from(text)).unwrap())
        };
        let reply = ask(text(&all));
        assert_eq!(reply.header("content-type"), "application/problem+json", "{accept}");
        reply.has_fault("invalid-request", "pointer", "/initial_states/70001/velocity/1", "got a string");
        all[70_001] = good;
        ask(text(&all)).has_fault("invalid-request", "pointer", "/initial_states/99999", "singular");
        all[70_001] = r#"{"position":[0.4,0,0],"velocity":[0,"1",0]}"#;
    }
}

#[test]
fn what_is_offered_is_told() {
    let service = Local::start();
    for (path, body) in [(TRAJECTORIES, rich(1)), (EQUILIBRIA, json!({ "system": "earth-moon" }))] {
        let request = Request::post(path).header(header::CONTENT_TYPE, "application/json");
        let reply =
            service.send(request.header(header::ACCEPT, "text/csv").body(body.to_string().into()).unwrap());
        assert_eq!(reply.status, StatusCode::NOT_ACCEPTABLE);
        assert_eq!(reply.json()["offered"], json!(["application/json", NDJSON]));
    }
}

/// The third state is at rest when the manoeuvre comes: its axes are undefined.
#[test]
fn a_failure_on_the_way_is_the_last_line() {
    let mut all = states(3);
    all[2]["velocity"] = json!([0.0, 0.0, 0.0]);
    let body = json!({ "system": { "mass_parameter": 0.01 }, "initial_states": all, "duration": 1.0,
        "manoeuvres": [{ "time": 0.0, "delta_v": [0.1, 0.0, 0.0], "axes": "velocity_normal_binormal" }] });
    let service = Local::start();
    let reply = stream(&service, TRAJECTORIES, &body);
    assert_eq!(reply.status, StatusCode::OK);
    let lines = parsed(&lines(&reply.body));
    let kinds: Vec<&str> = lines.iter().map(|line| line["kind"].as_str().unwrap()).collect();
    assert_eq!((kinds[0], *kinds.last().unwrap()), ("header", "problem"), "{kinds:?}");
    assert!(!kinds.contains(&"summary"));
    let problem = lines.last().unwrap();
    assert_eq!(problem["type"], "/problems/invalid-request");
    assert_eq!((problem["status"].as_u64(), problem["instance"].as_str()), (Some(422), Some(TRAJECTORIES)));
    assert_eq!(problem["request_id"], reply.header("x-request-id"));
    assert_eq!(problem["errors"][0]["pointer"], "/manoeuvres/0/axes");
    // Buffered, it is a problem document with the same fault.
    let buffered = service.post(TRAJECTORIES, &body).json();
    assert_eq!(buffered["errors"], problem["errors"]);
}

#[test]
fn time_that_runs_out_ends_a_stream_well() {
    let mut body = endless(600);
    body["limits"] = json!({ "wall_time_ms": 50 });
    let reply = stream(&Local::start(), TRAJECTORIES, &body);
    let lines = parsed(&lines(&reply.body));
    let [_, items @ .., summary] = &*lines else { panic!("{lines:?}") };
    assert_eq!(
        (summary["kind"].as_str(), summary["outcome"].as_str()),
        (Some("summary"), Some("wall_time_limit"))
    );
    assert!(items.iter().enumerate().all(|(index, line)| line["index"] == index), "ascending, none left out");
    assert_eq!(items.len(), 600);
    assert_eq!(items[599]["outcome"], "not_started");
    assert_eq!(items[599]["final"]["position"], body["initial_states"][599]["position"]);
    let counted: u64 = summary["outcomes"].as_object().unwrap().values().map(|n| n.as_u64().unwrap()).sum();
    assert_eq!(counted, 600);
}

/// More samples within the first step than anybody can wait for: the step is given up.
#[test]
fn a_step_of_endless_samples_ends_too() {
    let body = json!({ "system": { "mass_parameter": 0.01 }, "initial_states": states(1), "duration": 1.0,
        "samples": { "count": 1_u64 << 53 }, "limits": { "wall_time_ms": 1 } });
    let reply = stream(&Local::start(), TRAJECTORIES, &body);
    let last = parsed(&lines(&reply.body).split_off(1)).pop().unwrap();
    assert_eq!(last["type"], "/problems/wall-time-limit", "{last}");
}

#[test]
fn equilibria_of_many_systems_come_a_line_each() {
    let systems: Vec<Value> =
        (1..=1000).map(|i| json!({ "mass_parameter": 0.0005 * f64::from(i) })).collect();
    let body = json!({ "systems": systems, "jacobi_form": "symmetric", "frame": { "origin": "smaller" } });
    let service = Local::start();
    let streamed = stream(&service, EQUILIBRIA, &body);
    let lines = lines(&streamed.body);
    let summary = parsed(&lines[1001..]).remove(0);
    assert_eq!(
        (summary["outcome"].as_str(), &summary["outcomes"]),
        (Some("complete"), &json!({ "complete": 1000 }))
    );
    let buffered = service.answer(EQUILIBRIA, &body);
    assert_eq!(summary["evidence"], buffered["evidence"]);
    for (index, line) in parsed(&lines[1..1001]).iter().enumerate() {
        let mut line = line.as_object().unwrap().clone();
        assert_eq!(line.remove("kind").unwrap(), "points");
        assert_eq!(Value::Object(line), buffered["systems"][index]);
    }
    // One system is a sweep of one.
    let one = stream(&service, EQUILIBRIA, &json!({ "system": "earth-moon" }));
    let kinds = parsed(&super::lines(&one.body));
    assert_eq!(kinds.iter().map(|line| &line["kind"]).collect::<Vec<_>>(), ["header", "points", "summary"]);
    assert_eq!(kinds[1]["system"]["id"], "earth-moon");
}
