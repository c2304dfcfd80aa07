//! The memory that a large stream takes.

use std::io::{BufRead, BufReader, Write};

use super::super::support::Server;
use super::{NDJSON, TRAJECTORIES, post};

/// States in the request, and samples of each.
const STATES: usize = 100_000;
const SAMPLES: usize = 10;
/// What the stream says is more than this, and the server may take no more; a body built first would.
const MEBIBYTES: usize = 128;

/// The most memory that the process had resident, in MiB.
fn peak(server: &Server) -> usize {
    let status = std::fs::read_to_string(format!("/proc/{}/status", server.id())).unwrap();
    let line = status.lines().find(|line| line.starts_with("VmHWM:")).unwrap();
    line.split_ascii_whitespace().nth(1).unwrap().parse::<usize>().unwrap() / 1024
}

#[test]
fn a_stream_takes_little_memory_however_long_it_is() {
    let server = Server::start();
    let mut stream = server.connect();
    let states: Vec<String> = (0..STATES)
        .map(|i| format!(r#"{{"position":[0.{:06},0.1,0.02],"velocity":[0.0,1.2,0.05]}}"#, 300_000 + i))
        .collect();
    let body = format!(
        r#"{{"system":{{"mass_parameter":0.01}},"duration":0.1,"samples":{{"count":{SAMPLES}}},"initial_states":[{}]}}"#,
        states.join(",")
    );
    let mut reader = BufReader::new(stream.try_clone().unwrap());
    let sending = std::thread::spawn(move || {
        stream.write_all(post(TRAJECTORIES, NDJSON, &body).as_bytes()).unwrap();
    });
    let (mut bytes, mut trajectories, mut line) = (0, 0, String::new());
    while !line.starts_with("{\"kind\":\"summary\"") {
        line.clear();
        bytes += reader.read_line(&mut line).unwrap();
        assert!(!line.is_empty() && !line.contains("\"kind\":\"problem\""), "{line}");
        trajectories += usize::from(line.contains("\"outcome\":\"complete\",\"final\""));
    }
    sending.join().unwrap();
    assert!(line.contains(&format!("\"outcomes\":{{\"complete\":{STATES}}}")), "{line}");
    assert!(trajectories > STATES / 2, "chunk sizes of HTTP cut some lines in two");
    assert!(bytes >> 20 > MEBIBYTES, "{bytes}");
    let peak = peak(&server);
    assert!(peak < MEBIBYTES, "{peak} MiB");
}
