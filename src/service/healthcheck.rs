//! `synodia healthcheck`, for containers that have no other client.

use std::io::{self, BufRead, BufReader, Write};
use std::net::{IpAddr, Ipv4Addr, Ipv6Addr, SocketAddr, TcpStream};
use std::process::ExitCode;
use std::time::Duration;

/// A server that takes longer is not healthy.
const PATIENCE: Duration = Duration::from_secs(2);

/// Asks the server at `listen` whether it is ready.
pub(crate) fn run(listen: SocketAddr) -> ExitCode {
    match status(reachable(listen)) {
        Ok(line) if line.split(' ').nth(1) == Some("200") => ExitCode::SUCCESS,
        Ok(line) => crate::fail(&format_args!("not ready: {}", line.trim_end())),
        Err(error) => crate::fail(&format_args!("no answer from {listen}: {error}")),
    }
}

/// A server that listens everywhere is asked on the loopback.
fn reachable(listen: SocketAddr) -> SocketAddr {
    let loopback = match listen.ip() {
        IpAddr::V4(ip) if ip.is_unspecified() => Ipv4Addr::LOCALHOST.into(),
        IpAddr::V6(ip) if ip.is_unspecified() => Ipv6Addr::LOCALHOST.into(),
        ip => ip,
    };
    SocketAddr::new(loopback, listen.port())
}

fn status(address: SocketAddr) -> io::Result<String> {
    let mut stream = TcpStream::connect_timeout(&address, PATIENCE)?;
    stream.set_read_timeout(Some(PATIENCE))?;
    stream.set_write_timeout(Some(PATIENCE))?;
    write!(stream, "GET /readyz HTTP/1.1\r\nhost: {address}\r\nconnection: close\r\n\r\n")?;
    let mut line = String::new();
    BufReader::new(stream).read_line(&mut line)?;
    Ok(line)
}
