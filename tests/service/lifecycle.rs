//! The end of the real program.

use std::io::Write;

use super::support::{Reply, Server};

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
