//! Computations in flight when the client goes away or the program is told to stop, in the real binary.

use std::io::Write;
use std::net::TcpStream;

use super::support::{Reply, Server};

/// A trajectory that takes longer than any test: it ends by its limit of wall time.
fn long_request(wall_time_ms: u32) -> String {
    let body = format!(
        r#"{{"system": {{"mass_parameter": 0.01215}}, "duration": 1e7, "limits": {{"wall_time_ms": {wall_time_ms}}},
            "initial_states": [{}{{"position": [0.4, 0, 0], "velocity": [0, 1.2, 0]}}]}}"#,
        r#"{"position": [0.4, 0, 0], "velocity": [0, 1.2, 0]},"#.repeat(999)
    );
    format!(
        "POST /v1/trajectories HTTP/1.1\r\nhost: t\r\ncontent-type: application/json\r\ncontent-length: {}\r\n\r\n{body}",
        body.len()
    )
}

/// A server with one compute thread and no queue.
fn narrow(variables: &[(&str, &str)]) -> Server {
    let narrow =
        [("SYNODIA_COMPUTE_THREADS", "1"), ("SYNODIA_COMPUTE_QUEUE", "0"), ("SYNODIA_LOG", "synodia=debug")];
    Server::with(&[&narrow[..], variables].concat())
}

/// Sends a long request and returns once it is being computed.
fn occupy(server: &Server, wall_time_ms: u32) -> TcpStream {
    let mut stream = server.connect();
    stream.write_all(long_request(wall_time_ms).as_bytes()).unwrap();
    server.log(|line| line["message"] == "computation begun");
    stream
}

#[test]
fn a_stop_signal_lets_the_computation_in_flight_end() {
    let server = narrow(&[]);
    let mut stream = occupy(&server, 1500);
    server.terminate();
    server.log(|line| line["message"] == "stopping");
    let reply = Reply::read(&mut stream);
    assert_eq!(reply.status, 200);
    let outcome = reply.json()["trajectories"][0]["outcome"].clone();
    assert_eq!(outcome, "wall_time_limit");
    server.log(|line| line["message"] == "stopped");
    assert!(server.wait().success());
}

#[test]
fn what_does_not_end_in_time_is_cancelled_and_its_client_told() {
    let server = narrow(&[("SYNODIA_DRAIN_MS", "1")]);
    let mut stream = occupy(&server, 100_000);
    server.terminate();
    let reply = Reply::read(&mut stream);
    reply.problem("overloaded");
    assert_eq!(reply.header("retry-after"), "1");
    assert!(server.wait().success());
}

#[test]
fn a_client_that_goes_away_frees_the_compute_thread() {
    let server = narrow(&[]);
    let stream = occupy(&server, 100_000);
    assert_eq!(server.send(&long_request(1)).status, 503);
    drop(stream);
    let line = server.log(|line| line["outcome"] == "client_gone");
    assert_eq!((line["path"].as_str(), line["status"].as_u64()), (Some("/v1/trajectories"), Some(499)));
    server.log(|line| line["message"] == "computation cancelled" && line["polls"].as_u64() > Some(0));
    assert_eq!(server.send(&long_request(1)).status, 200);
}

#[test]
fn idle_connections_do_not_hold_up_the_end() {
    let server = Server::start();
    let mut stream = server.connect();
    stream.write_all(b"GET /livez HTTP/1.1\r\nhost: t\r\n\r\n").unwrap();
    assert_eq!(Reply::read(&mut stream).status, 200);
    server.terminate();
    assert!(Reply::try_read(&mut stream).is_none(), "an idle connection is closed");
    assert!(server.wait().success());
}
