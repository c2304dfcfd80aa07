//! What only shows on a real connection: slow, huge, broken and vanishing clients. The operations here belong to the
//! tests: they hold a compute thread for as long as a test wants.

use std::io::{Read, Write};
use std::net::SocketAddr;
use std::sync::mpsc;

use axum::Router;
use axum::extract::State;
use axum::middleware::from_fn_with_state;
use axum::routing::{get, post};
use mechanics::interrupt::Stop;
use synodia::answer::Document;
use synodia::config::Config;
use synodia::extract::Submission;
use synodia::middleware::observe;
use synodia::problem::Problem;
use synodia::state::App;

use super::support::{PATIENCE, Reply, Server, config, connect};

/// A server in this process with operations of the tests' own.
struct Own {
    address: SocketAddr,
    begun: mpsc::Receiver<()>,
    ended: mpsc::Receiver<Stop>,
    app: App,
}

/// More than the buffers between a server and a client that does not read can take.
const LARGE: usize = 256 << 20;

/// `POST /length` answers the body's length; `POST /hold` computes until it is told to stop; `GET /panic` panics;
/// `GET /large` has more to say than a client may want to hear.
fn own(config: Config) -> Own {
    let (begin, begun) = mpsc::channel();
    let (end, ended) = mpsc::channel();
    let app = App::start(config, Document::new("application/json", "{}")).unwrap();
    let hold = move |State(app): State<App>, _: Submission| {
        let (begin, end) = (begin.clone(), end.clone());
        async move {
            app.pool
                .run(move |context| {
                    begin.send(()).unwrap();
                    let stop = loop {
                        if let Some(stop) = context.interrupt().poll() {
                            break stop;
                        }
                        std::thread::yield_now();
                    };
                    let _ = end.send(stop);
                })
                .await
        }
    };
    let length =
        |submission: Submission| async move { Ok::<_, Problem>(submission.body().len().to_string()) };
    let router = Router::new()
        .route("/hold", post(async move |state: State<App>, body: Submission| hold(state, body).await))
        .route("/length", post(length))
        .route("/large", get(async || "x".repeat(LARGE)))
        .route("/panic", get(async || -> &'static str { panic!("planned") }))
        .layer(from_fn_with_state(app.clone(), observe))
        .with_state(app.clone());
    let (tell, told) = mpsc::channel();
    let served = app.clone();
    std::thread::spawn(move || {
        let runtime = tokio::runtime::Builder::new_multi_thread().enable_all().build().unwrap();
        runtime.block_on(async {
            let listener = tokio::net::TcpListener::bind("127.0.0.1:0").await.unwrap();
            tell.send(listener.local_addr().unwrap()).unwrap();
            synodia::server::serve(listener, served, router).await
        })
    });
    Own { address: told.recv_timeout(PATIENCE).unwrap(), begun, ended, app }
}

fn with(change: impl FnOnce(&mut Config)) -> Own {
    let mut config = config();
    config.compute.threads = 1;
    config.compute.queue = 0;
    change(&mut config);
    own(config)
}

fn post_head(path: &str, headers: &str) -> String {
    format!("POST {path} HTTP/1.1\r\nhost: t\r\ncontent-type: application/json\r\n{headers}\r\n")
}

fn exchange(address: SocketAddr, request: &str) -> Reply {
    let mut stream = connect(address);
    stream.write_all(request.as_bytes()).unwrap();
    Reply::read(&mut stream)
}

#[test]
fn a_head_that_trickles_is_cut_off() {
    let server = Server::with(&[("SYNODIA_REQUEST_TIMEOUT_MS", "200")]);
    for start in ["", "G", "GET /livez HTTP/1.1\r\nx: y\r\n", "PRI * HTTP/2.0\r\n\r\n"] {
        let mut stream = server.connect();
        stream.write_all(start.as_bytes()).unwrap();
        let mut rest = Vec::new();
        // The connection ends although the client goes on waiting; what it says before does not matter.
        let _ = stream.read_to_end(&mut rest);
    }
    assert_eq!(server.get("/livez").status, 200);
}

#[test]
fn a_body_that_trickles_is_a_time_out() {
    let own = with(|config| config.times.request = std::time::Duration::from_millis(200));
    let reply = exchange(own.address, &(post_head("/length", "content-length: 10\r\n") + "{"));
    assert_eq!(reply.status, 408);
    let body = reply.problem("request-timeout");
    assert!(body["detail"].as_str().unwrap().contains("200 ms"), "{body}");
}

#[test]
fn a_body_declared_too_large_is_refused_unread() {
    let own = with(|config| config.limits.body_bytes = 1000);
    let reply =
        exchange(own.address, &post_head("/length", "content-length: 104857600\r\nexpect: 100-continue\r\n"));
    assert_eq!(reply.status, 413);
    assert_eq!(reply.problem("content-too-large")["limit"], 1000);
}

#[test]
fn a_body_that_grows_too_large_is_refused() {
    let own = with(|config| config.limits.body_bytes = 1000);
    let chunk = format!("1f4\r\n{}\r\n", "x".repeat(500));
    let request = post_head("/length", "transfer-encoding: chunked\r\n") + &chunk.repeat(3) + "0\r\n\r\n";
    let reply = exchange(own.address, &request);
    assert_eq!(reply.problem("content-too-large")["limit"], 1000);
    let fitting = post_head("/length", "transfer-encoding: chunked\r\n") + &chunk.repeat(2) + "0\r\n\r\n";
    assert_eq!(exchange(own.address, &fitting).body, b"1000");
}

#[test]
fn large_bodies_are_received_whole() {
    let own = with(|config| config.limits.body_bytes = 8 << 20);
    let body = "x".repeat(5 << 20);
    let request = post_head("/length", &format!("content-length: {}\r\n", body.len())) + &body;
    assert_eq!(exchange(own.address, &request).body, body.len().to_string().as_bytes());
}

#[test]
fn media_types_other_than_json_are_refused() {
    let own = with(|_| ());
    for (headers, header) in [
        ("", "content-type"),
        ("content-type: text/plain\r\n", "content-type"),
        ("content-type: application/json; charset=latin1\r\n", "content-type"),
        ("content-type: application/json\r\ncontent-encoding: gzip\r\n", "content-encoding"),
    ] {
        let request = format!("POST /length HTTP/1.1\r\nhost: t\r\ncontent-length: 2\r\n{headers}\r\n{{}}");
        let reply = exchange(own.address, &request);
        let body = reply.problem("unsupported-media-type");
        assert_eq!(body["errors"][0]["header"], header, "{headers}");
        assert_eq!(reply.header("accept"), "application/json");
    }
    for good in ["application/json", "application/json; charset=utf-8", "Application/JSON;charset=\"UTF-8\""]
    {
        let request = format!(
            "POST /length HTTP/1.1\r\nhost: t\r\ncontent-length: 2\r\ncontent-type: {good}\r\n\r\n{{}}"
        );
        assert_eq!(exchange(own.address, &request).body, b"2", "{good}");
    }
}

#[test]
fn a_panic_is_a_problem_and_the_server_lives_on() {
    let own = with(|_| ());
    let reply = exchange(own.address, "GET /panic HTTP/1.1\r\nhost: t\r\n\r\n");
    assert_eq!(reply.status, 500);
    reply.problem("internal");
    assert_eq!(exchange(own.address, &(post_head("/length", "content-length: 2\r\n") + "{}")).body, b"2");
}

#[test]
fn a_full_queue_is_told_at_once_and_a_client_that_goes_away_frees_its_place() {
    let own = with(|_| ());
    let request = post_head("/hold", "content-length: 2\r\n") + "{}";
    let mut first = connect(own.address);
    first.write_all(request.as_bytes()).unwrap();
    own.begun.recv_timeout(PATIENCE).unwrap();
    let refused = exchange(own.address, &request);
    assert_eq!(refused.status, 503);
    refused.problem("overloaded");
    assert_eq!(refused.header("retry-after"), "1");
    drop(first);
    assert_eq!(own.ended.recv_timeout(PATIENCE), Ok(Stop::Cancelled));
}

#[test]
fn computations_are_cancelled_when_the_service_closes() {
    let own = with(|_| ());
    let mut stream = connect(own.address);
    stream.write_all((post_head("/hold", "content-length: 2\r\n") + "{}").as_bytes()).unwrap();
    own.begun.recv_timeout(PATIENCE).unwrap();
    own.app.pool.close();
    assert_eq!(own.ended.recv_timeout(PATIENCE), Ok(Stop::Cancelled));
}

#[test]
fn heads_have_a_limit() {
    let server = Server::start();
    let long = "x".repeat(100_000);
    assert_eq!(server.get_with("/livez", &format!("x: {long}\r\n")).status, 431);
    assert_eq!(server.get_with("/livez", &"x: y\r\n".repeat(200)).status, 431);
}

#[test]
fn a_client_that_does_not_read_is_cut_off() {
    let own = with(|config| config.times.send = std::time::Duration::from_millis(200));
    let mut stream = connect(own.address);
    stream.write_all(b"GET /large HTTP/1.1\r\nhost: t\r\n\r\n").unwrap();
    // Writing fails once the server has closed the connection; as long as it is open, this goes on.
    let patience = (PATIENCE.as_millis() / 10) as usize;
    let closed = (0..patience).any(|_| {
        std::thread::sleep(std::time::Duration::from_millis(10));
        stream.write_all(b"x").is_err()
    });
    assert!(closed);
}

#[test]
fn connections_are_kept_alive() {
    let server = Server::start();
    let mut stream = server.connect();
    for _ in 0..3 {
        stream.write_all(b"GET /livez HTTP/1.1\r\nhost: t\r\n\r\n").unwrap();
        assert_eq!(Reply::read(&mut stream).status, 200);
    }
}
