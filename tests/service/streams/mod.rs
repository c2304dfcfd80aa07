//! Answers sent while they are computed, as newline-delimited JSON.

mod content;
mod memory;
mod readers;

use serde_json::{Value, json};

const TRAJECTORIES: &str = "/v1/trajectories";
const EQUILIBRIA: &str = "/v1/equilibria";
const NDJSON: &str = "application/x-ndjson";

/// The lines of a stream.
fn lines(body: &[u8]) -> Vec<&str> {
    let text = std::str::from_utf8(body).unwrap();
    assert!(text.ends_with('\n'), "the last line is complete");
    text.lines().collect()
}

fn parsed(lines: &[&str]) -> Vec<Value> {
    lines.iter().map(|line| serde_json::from_str(line).unwrap()).collect()
}

/// So many different states on bounded orbits about the larger primary.
fn states(count: u32) -> Vec<Value> {
    (0..count)
        .map(|i| {
            let place = f64::from(i) / f64::from(count);
            json!({ "position": [0.3 + 0.1 * place, 0.0, 0.02], "velocity": [0.0, 1.5, 0.05] })
        })
        .collect()
}

/// A request that no machine ends in the time of a test.
fn endless(count: u32) -> Value {
    json!({ "system": { "mass_parameter": 0.01 }, "initial_states": states(count), "duration": 1e7 })
}

/// A request with more samples than can lie between a server and a client that does not read.
fn overflowing() -> Value {
    let mut body = endless(20);
    body["samples"] = json!({ "interval": 1e-3 });
    body
}

/// The text of a POST.
fn post(path: &str, accept: &str, body: &str) -> String {
    let length = body.len();
    format!(
        "POST {path} HTTP/1.1\r\nhost: test\r\naccept: {accept}\r\ncontent-type: application/json\r\n\
         content-length: {length}\r\n\r\n{body}"
    )
}
