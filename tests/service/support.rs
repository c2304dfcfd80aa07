//! The real binary as a child process, and a plain HTTP client that can misbehave.

use std::collections::HashMap;
use std::io::{BufRead, BufReader, Read, Write};
use std::net::{SocketAddr, TcpStream};
use std::process::{Child, Command, Stdio};
use std::sync::mpsc::{Receiver, RecvTimeoutError, channel};
use std::time::Duration;

use serde_json::Value;

/// A test that waits longer than this has failed; nothing is measured by it.
pub(crate) const PATIENCE: Duration = Duration::from_mins(1);

/// A running server, stopped when dropped.
pub(crate) struct Server {
    child: Child,
    pub(crate) address: SocketAddr,
    logs: Receiver<Value>,
}

impl Server {
    /// The server with its defaults.
    pub(crate) fn start() -> Self {
        Self::with(&[])
    }

    /// The server with these variables set.
    pub(crate) fn with(variables: &[(&str, &str)]) -> Self {
        let mut child = Command::new(env!("CARGO_BIN_EXE_synodia"))
            .env_clear()
            .env("SYNODIA_LISTEN", "127.0.0.1:0")
            .envs(variables.iter().copied())
            .stdin(Stdio::null())
            .stderr(Stdio::piped())
            .spawn()
            .unwrap();
        let (sender, logs) = channel();
        let stderr = BufReader::new(child.stderr.take().unwrap());
        std::thread::spawn(move || {
            for line in stderr.lines().map_while(Result::ok) {
                let _ = sender.send(serde_json::from_str(&line).unwrap_or(Value::String(line)));
            }
        });
        let mut server = Self { child, address: SocketAddr::from(([127, 0, 0, 1], 0)), logs };
        let serving = server.log(|line| line["message"] == "serving");
        server.address = serving["address"].as_str().unwrap().parse().unwrap();
        server
    }

    /// The next log line that is wanted.
    pub(crate) fn log(&self, mut wanted: impl FnMut(&Value) -> bool) -> Value {
        loop {
            match self.logs.recv_timeout(PATIENCE) {
                Ok(line) if wanted(&line) => return line,
                Ok(_) => {}
                Err(RecvTimeoutError::Timeout | RecvTimeoutError::Disconnected) => panic!("no such log line"),
            }
        }
    }

    /// The process.
    pub(crate) fn id(&self) -> u32 {
        self.child.id()
    }

    /// Sends a stop signal.
    pub(crate) fn terminate(&self) {
        let id = self.child.id().to_string();
        assert!(Command::new("kill").args(["-TERM", &id]).status().unwrap().success());
    }

    /// Waits for the process to end.
    pub(crate) fn wait(mut self) -> std::process::ExitStatus {
        self.child.wait().unwrap()
    }

    pub(crate) fn connect(&self) -> TcpStream {
        connect(self.address)
    }

    pub(crate) fn send(&self, request: &str) -> Reply {
        self.send_bytes(request.as_bytes())
    }

    pub(crate) fn send_bytes(&self, request: &[u8]) -> Reply {
        let mut stream = self.connect();
        stream.write_all(request).unwrap();
        Reply::read(&mut stream)
    }

    pub(crate) fn get(&self, path: &str) -> Reply {
        self.get_with(path, "")
    }

    /// POST of a JSON value.
    pub(crate) fn post(&self, path: &str, body: &Value) -> Reply {
        self.post_text(path, &body.to_string())
    }

    /// POST of a text that claims to be JSON.
    pub(crate) fn post_text(&self, path: &str, body: &str) -> Reply {
        let length = body.len();
        self.send(&format!(
            "POST {path} HTTP/1.1\r\nhost: test\r\nconnection: close\r\ncontent-type: application/json\r\n\
             content-length: {length}\r\n\r\n{body}"
        ))
    }

    /// GET with more header lines, each ended by CRLF.
    pub(crate) fn get_with(&self, path: &str, headers: &str) -> Reply {
        self.send(&format!("GET {path} HTTP/1.1\r\nhost: test\r\nconnection: close\r\n{headers}\r\n"))
    }
}

impl Drop for Server {
    fn drop(&mut self) {
        let _ = self.child.kill();
        let _ = self.child.wait();
    }
}

pub(crate) fn connect(address: SocketAddr) -> TcpStream {
    let stream = TcpStream::connect(address).unwrap();
    stream.set_read_timeout(Some(PATIENCE)).unwrap();
    stream.set_write_timeout(Some(PATIENCE)).unwrap();
    stream
}

/// A response read to its end.
#[derive(Debug)]
pub(crate) struct Reply {
    pub(crate) status: u16,
    pub(crate) headers: HashMap<String, String>,
    pub(crate) body: Vec<u8>,
}

impl Reply {
    /// Reads one response: as many bytes as it declares, else until the connection ends.
    pub(crate) fn read(stream: &mut TcpStream) -> Self {
        Self::try_read(stream).expect("a response")
    }

    pub(crate) fn try_read(stream: &mut TcpStream) -> Option<Self> {
        let mut reader = BufReader::new(stream);
        let mut line = String::new();
        reader.read_line(&mut line).ok().filter(|read| *read > 0)?;
        let status = line.split(' ').nth(1)?.parse().ok()?;
        let mut headers = HashMap::new();
        loop {
            let mut line = String::new();
            reader.read_line(&mut line).ok()?;
            let Some((name, value)) = line.trim_end().split_once(": ") else { break };
            let earlier = headers.insert(name.to_owned(), value.to_owned());
            if let Some(earlier) = earlier {
                headers.insert(name.to_owned(), format!("{earlier}, {value}"));
            }
        }
        let mut body = Vec::new();
        match headers.get("content-length") {
            Some(length) if status != 304 => {
                reader.take(length.parse().ok()?).read_to_end(&mut body).ok()?;
            }
            _ => drop(reader.read_to_end(&mut body)),
        }
        Some(Self { status, headers, body })
    }

    pub(crate) fn json(&self) -> Value {
        serde_json::from_slice(&self.body).unwrap()
    }

    pub(crate) fn header(&self, name: &str) -> &str {
        self.headers.get(name).map_or("", String::as_str)
    }

    /// Checks that it is a complete problem of that kind and returns its body.
    pub(crate) fn problem(&self, slug: &str) -> Value {
        assert_eq!(self.header("content-type"), "application/problem+json", "{self:?}");
        let body = self.json();
        assert_eq!(body["type"], format!("/problems/{slug}"), "{body}");
        assert_eq!(body["status"], self.status);
        for member in ["title", "detail", "instance", "request_id"] {
            assert!(body[member].as_str().is_some_and(|text| !text.is_empty()), "{member} in {body}");
        }
        assert_eq!(self.header("x-request-id"), body["request_id"]);
        body
    }
}

/// The configuration without flags and variables.
pub(crate) fn config() -> synodia::config::Config {
    synodia::config::read(["synodia".into()], []).unwrap().1
}
