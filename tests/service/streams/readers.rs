//! Clients that read slowly, stop reading or go away; and others that want in meanwhile. What happened is read from
//! answers and log lines, never from a clock.

use std::io::{Read, Write};
use std::net::TcpStream;

use http_body_util::{BodyExt, Full};
use hyper_util::rt::{TokioExecutor, TokioIo};
use serde_json::{Value, json};

use super::super::support::Server;
use super::{NDJSON, TRAJECTORIES, endless, lines, overflowing, parsed, post, states};

fn server(variables: &[(&str, &str)]) -> Server {
    let usual = [("SYNODIA_COMPUTE_THREADS", "1"), ("SYNODIA_LOG", "synodia=debug")];
    Server::with(&[&usual, variables].concat())
}

/// A stream whose client has read until the header line is there.
fn opened(server: &Server, body: &Value) -> TcpStream {
    let mut stream = server.connect();
    stream.write_all(post(TRAJECTORIES, NDJSON, &body.to_string()).as_bytes()).unwrap();
    let mut head = Vec::new();
    let mut byte = [0];
    while !head.ends_with(b"\n{\"kind\":\"header\"") {
        stream.read_exact(&mut byte).unwrap();
        head.push(byte[0]);
    }
    stream
}

/// A small request, which has to be answered.
fn small(server: &Server) {
    let body = json!({ "system": { "mass_parameter": 0.01 }, "initial_states": states(10), "duration": 1.0 });
    let reply = server.post(TRAJECTORIES, &body);
    assert_eq!(reply.status, 200);
    assert_eq!(reply.json()["outcomes"], json!({ "complete": 10 }));
}

/// Waits, in any order, for the lines that say that a stream was cut short with that outcome and that its computation
/// ended at a poll.
fn cancelled(server: &Server, outcome: &str) {
    let (mut told, mut ended) = (false, false);
    server.log(|line| {
        if line["message"] == "request" {
            assert_eq!((line["outcome"].as_str(), line["status"].as_u64()), (Some(outcome), Some(200)));
            told = true;
        }
        ended |= line["message"] == "computation cancelled" && line["polls"].as_u64() > Some(0);
        told && ended
    });
}

#[test]
fn a_client_that_goes_away_after_the_header_stops_the_computation() {
    for body in [endless(1000), overflowing()] {
        let server = server(&[("SYNODIA_COMPUTE_QUEUE", "0")]);
        let stream = opened(&server, &body);
        server.log(|line| line["message"] == "computation begun");
        drop(stream);
        cancelled(&server, "client_gone");
        small(&server);
    }
}

#[test]
fn a_client_that_stops_reading_is_given_up() {
    let server = server(&[("SYNODIA_COMPUTE_QUEUE", "0"), ("SYNODIA_SEND_TIMEOUT_MS", "300")]);
    let mut stream = opened(&server, &overflowing());
    cancelled(&server, "send_timeout");
    small(&server);
    // What lay between is still there to be read; then the connection ends without a summary.
    let mut rest = Vec::new();
    let _ = stream.read_to_end(&mut rest);
    assert!(!rest.windows(9).any(|window| window == b"\"summary\""));
}

/// One thread, and clients that are connected but read nothing: a huge trajectory of one that no room suffices for,
/// and very many small ones.
#[test]
fn clients_that_do_not_read_hold_no_thread() {
    let server = server(&[("SYNODIA_COMPUTE_QUEUE", "4")]);
    let mut many = endless(50_000);
    many["duration"] = json!(1.0);
    many["samples"] = json!({ "count": 20 });
    let _streams = [overflowing(), many, overflowing()].map(|body| opened(&server, &body));
    for _ in 0..3 {
        small(&server);
    }
}

/// With one thread, a small request is answered beside one of minutes, buffered or streamed.
#[test]
fn a_huge_request_keeps_no_small_one_waiting() {
    let server = server(&[]);
    let mut body = endless(100_000);
    body["duration"] = json!(1e5);
    let mut huge = server.connect();
    huge.write_all(post(TRAJECTORIES, "application/json", &body.to_string()).as_bytes()).unwrap();
    server.log(|line| line["message"] == "computation begun");
    small(&server);
    let line = server.log(|line| line["message"] == "request");
    assert_eq!(line["outcome"], "complete");
    let mut streamed = opened(&server, &body);
    small(&server);
    // Neither of the huge ones has ended: the only requests in the log are the small ones.
    let line = server.log(|line| line["message"] == "request");
    assert_eq!(line["outcome"], "complete");
    assert!(line["duration_us"].is_u64());
    for stream in [&mut huge, &mut streamed] {
        stream.set_nonblocking(true).unwrap();
    }
    let nothing = huge.read(&mut [0]).unwrap_err();
    assert_eq!(nothing.kind(), std::io::ErrorKind::WouldBlock, "the huge one is still computed");
}

/// With one thread, a small request is answered beside a single trajectory that takes very long.
#[test]
fn a_long_trajectory_keeps_no_small_one_waiting() {
    let server = server(&[("SYNODIA_MAX_STEPS", "1000000000000")]);
    let body = endless(1);
    let mut long = server.connect();
    long.write_all(post(TRAJECTORIES, "application/json", &body.to_string()).as_bytes()).unwrap();
    server.log(|line| line["message"] == "computation begun");
    for _ in 0..3 {
        small(&server);
    }
    long.set_nonblocking(true).unwrap();
    let nothing = long.read(&mut [0]).unwrap_err();
    assert_eq!(nothing.kind(), std::io::ErrorKind::WouldBlock, "the long one is still computed");
}

/// A connection of HTTP/2, with the window of its streams.
async fn http2(server: &Server) -> hyper::client::conn::http2::SendRequest<Full<bytes::Bytes>> {
    let stream = tokio::net::TcpStream::connect(server.address).await.unwrap();
    let (sender, connection) =
        hyper::client::conn::http2::handshake(TokioExecutor::new(), TokioIo::new(stream)).await.unwrap();
    tokio::spawn(connection);
    sender
}

fn request(server: &Server, body: &Value) -> http::Request<Full<bytes::Bytes>> {
    http::Request::post(format!("http://{}{TRAJECTORIES}", server.address))
        .header("content-type", "application/json")
        .header("accept", NDJSON)
        .body(Full::from(body.to_string()))
        .unwrap()
}

#[tokio::test]
async fn http2_streams_too() {
    let server = server(&[]);
    let mut body = endless(500);
    body["duration"] = json!(2.0);
    let answer = http2(&server).await.send_request(request(&server, &body)).await.unwrap();
    assert_eq!(answer.version(), http::Version::HTTP_2);
    let received = answer.into_body().collect().await.unwrap().to_bytes();
    let lines = parsed(&lines(&received));
    assert_eq!(lines.len(), 502);
    assert_eq!(lines[501]["outcomes"], json!({ "complete": 500 }));
}

/// Here the connection lives on, and its other streams with it.
#[tokio::test(flavor = "multi_thread", worker_threads = 2)]
async fn a_stream_of_http2_that_is_not_read_is_given_up() {
    let server = server(&[("SYNODIA_COMPUTE_QUEUE", "0"), ("SYNODIA_SEND_TIMEOUT_MS", "300")]);
    let mut connection = http2(&server).await;
    let unread = connection.send_request(request(&server, &overflowing())).await.unwrap();
    server.log(|line| line["message"] == "computation cancelled");
    let mut short = endless(10);
    short["duration"] = json!(1.0);
    let answer = connection.send_request(request(&server, &short)).await.unwrap();
    assert_eq!(lines(&answer.into_body().collect().await.unwrap().to_bytes()).len(), 12);
    drop(unread);
}
