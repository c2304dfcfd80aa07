//! The end of the real program.

use std::io::Write;

use super::support::{Reply, Server};

#[test]
fn a_stop_signal_lets_the_request_in_flight_end() {
    let server = Server::start();
    let mut stream = server.connect();
    // A request is in flight from the moment its head has come: its body follows after the signal.
    stream.write_all(b"GET /livez HTTP/1.1\r\nhost: t\r\n\r\n").unwrap();
    assert_eq!(Reply::read(&mut stream).status, 200);
    server.terminate();
    server.log(|line| line["message"] == "stopping");
    server.log(|line| line["message"] == "stopped");
    assert!(Reply::try_read(&mut stream).is_none(), "an idle connection is closed");
    assert!(server.wait().success());
}
