//! The client's side: real requests over a real socket.

use std::net::SocketAddr;
use std::time::Duration;

use bytes::Bytes;
use http::{Request, header};
use http_body_util::{BodyExt, Full};
use hyper::client::conn::http1::{SendRequest, handshake};
use hyper_util::rt::TokioIo;
use serde_json::Value;
use tokio::net::TcpStream;
use tokio::time::timeout;

use super::Failure;

/// No answer of the story takes as long as this.
const PATIENCE: Duration = Duration::from_mins(1);

/// A connection to the server.
pub(super) struct Client {
    address: SocketAddr,
    sender: SendRequest<Full<Bytes>>,
}

impl Client {
    pub(super) async fn connect(address: SocketAddr) -> Result<Self, Failure> {
        let stream = TcpStream::connect(address).await?;
        let (sender, connection) = handshake(TokioIo::new(stream)).await?;
        tokio::spawn(connection);
        Ok(Self { address, sender })
    }

    /// The answer to a JSON text.
    pub(super) async fn post(&mut self, path: &str, body: String) -> Result<Answer, Failure> {
        timeout(PATIENCE, self.exchange(path, body)).await.map_err(|_| Failure::Silence)?
    }

    async fn exchange(&mut self, path: &str, body: String) -> Result<Answer, Failure> {
        let request = Request::post(path)
            .header(header::HOST, self.address.to_string())
            .header(header::CONTENT_TYPE, "application/json")
            .body(Full::from(body))?;
        self.sender.ready().await?;
        let response = self.sender.send_request(request).await?;
        let status = response.status();
        let body = response.into_body().collect().await?.to_bytes();
        if status.is_success() {
            Ok(Answer(serde_json::from_slice(&body)?))
        } else {
            Err(Failure::Refused { status, problem: String::from_utf8_lossy(&body).into_owned() })
        }
    }
}

/// An answer, read member by member.
pub(super) struct Answer(Value);

impl Answer {
    /// The member at a JSON pointer.
    pub(super) fn at(&self, pointer: &str) -> Result<&Value, Failure> {
        self.0.pointer(pointer).ok_or_else(|| Failure::Missing(pointer.to_owned()))
    }

    pub(super) fn items(&self, pointer: &str) -> Result<&[Value], Failure> {
        self.at(pointer)?.as_array().map(Vec::as_slice).ok_or_else(|| Failure::Missing(pointer.to_owned()))
    }

    pub(super) fn number(&self, pointer: &str) -> Result<f64, Failure> {
        self.at(pointer)?.as_f64().ok_or_else(|| Failure::Missing(pointer.to_owned()))
    }

    pub(super) fn text(&self, pointer: &str) -> Result<&str, Failure> {
        self.at(pointer)?.as_str().ok_or_else(|| Failure::Missing(pointer.to_owned()))
    }

    /// A list of words, separated by commas.
    pub(super) fn words(&self, pointer: &str) -> Result<String, Failure> {
        let words: Vec<&str> = self.items(pointer)?.iter().filter_map(Value::as_str).collect();
        Ok(if words.is_empty() { "none".to_owned() } else { words.join(", ") })
    }

    pub(super) fn vector(&self, pointer: &str) -> Result<[f64; 3], Failure> {
        let mut vector = [0.0; 3];
        for (index, component) in vector.iter_mut().enumerate() {
            *component = self.number(&format!("{pointer}/{index}"))?;
        }
        Ok(vector)
    }
}
