//! Long computations on the real binary: their clients leave, their time runs out, others want in, the server stops.
//! What happened is read from answers and log lines, never from a clock.

use std::io::Write;

use serde_json::{Value, json};

use super::support::{Reply, Server};

const PATH: &str = "/v1/trajectories";

/// Minutes of work: a thousand orbits of millions of steps.
fn endless() -> Value {
    let states: Vec<Value> = (0..1000)
        .map(|i| json!({ "position": [0.3 + 1e-4 * f64::from(i), 0.0, 0.0], "velocity": [0.0, 1.5, 0.0] }))
        .collect();
    json!({ "system": { "mass_parameter": 0.01 }, "initial_states": states, "duration": 1e7 })
}

fn head(body: &str) -> String {
    format!(
        "POST {PATH} HTTP/1.1\r\nhost: test\r\ncontent-type: application/json\r\ncontent-length: {}\r\n\r\n{body}",
        body.len()
    )
}

/// A server with one compute thread that is busy with a body, and the connection that waits for the answer.
fn busy(body: &Value, variables: &[(&str, &str)]) -> (Server, std::net::TcpStream) {
    let mut all = vec![
        ("SYNODIA_COMPUTE_THREADS", "1"),
        ("SYNODIA_COMPUTE_QUEUE", "0"),
        ("SYNODIA_LOG", "synodia=debug"),
    ];
    all.extend_from_slice(variables);
    let server = Server::with(&all);
    let mut stream = server.connect();
    stream.write_all(head(&body.to_string()).as_bytes()).unwrap();
    server.log(|line| line["message"] == "computation begun");
    (server, stream)
}

#[test]
fn a_full_queue_is_told_and_cheap_answers_still_come() {
    let (server, _waiting) = busy(&endless(), &[]);
    let refused = server.post(PATH, &endless());
    refused.problem("overloaded");
    assert_eq!(refused.status, 503);
    assert!(refused.header("retry-after").parse::<u32>().is_ok());
    let state = json!({ "position": [0.5, 0.0, 0.0], "velocity": [0.0, 1.0, 0.0] });
    let cheap = json!({ "system": "earth-moon", "states": [state] });
    assert_eq!(server.post("/v1/jacobi", &cheap).status, 200, "computed in place");
}

#[test]
fn a_client_that_goes_away_stops_its_computation() {
    let (server, waiting) = busy(&endless(), &[]);
    drop(waiting);
    let line = server.log(|line| line["outcome"] == "client_gone");
    assert_eq!((line["path"].as_str(), line["status"].as_u64()), (Some(PATH), Some(499)));
    let line = server.log(|line| line["message"] == "computation cancelled");
    assert!(line["polls"].as_u64().unwrap() > 0);
    // Its place is free again before the line is written.
    let short = json!({ "system": { "mass_parameter": 0.01 }, "duration": 1.0,
        "initial_states": [{ "position": [0.5, 0.0, 0.0], "velocity": [0.0, 1.0, 0.0] }] });
    assert_eq!(server.post(PATH, &short).status, 200);
}

#[test]
fn time_that_runs_out_cuts_the_answer_short_and_says_so() {
    let server = Server::start();
    let mut body = endless();
    body["limits"] = json!({ "wall_time_ms": 50 });
    body["samples"] = json!("none");
    let answer = server.post(PATH, &body).json();
    assert_eq!(answer["outcome"], "wall_time_limit");
    let all = answer["trajectories"].as_array().unwrap();
    assert_eq!(all.len(), 1000);
    assert!(
        all.iter().any(|t| t["outcome"] == "wall_time_limit" && t["evidence"]["steps"].as_u64() > Some(0))
    );
    let last = all.last().unwrap();
    assert_eq!(last["outcome"], "not_started");
    assert_eq!(last["final"]["position"], body["initial_states"][999]["position"], "from where it can go on");
    let counted: u64 = answer["outcomes"].as_object().unwrap().values().map(|n| n.as_u64().unwrap()).sum();
    assert_eq!(counted, 1000);
}

#[test]
fn a_stop_signal_lets_a_computation_end() {
    let mut body = endless();
    body["limits"] = json!({ "wall_time_ms": 4000 });
    let (server, mut waiting) = busy(&body, &[("SYNODIA_DRAIN_MS", "60000")]);
    server.terminate();
    let reply = Reply::read(&mut waiting);
    assert_eq!(reply.status, 200, "the answer is not lost");
    assert_eq!(reply.json()["trajectories"].as_array().unwrap().len(), 1000);
    assert!(server.wait().success());
}

#[test]
fn a_stop_signal_cancels_what_does_not_end_in_time() {
    let (server, mut waiting) = busy(&endless(), &[("SYNODIA_DRAIN_MS", "1")]);
    server.terminate();
    let told = Reply::read(&mut waiting);
    told.problem("overloaded");
    server.log(|line| line["message"] == "stopped");
    assert!(server.wait().success());
}
