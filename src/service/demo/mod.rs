//! `synodia demo`: an invented mission, told as a few real requests to a server that the command itself starts.

mod client;
mod mission;
mod page;
mod story;

use std::io::{self, IsTerminal};

use http::StatusCode;
use synodia::config::Config;
use synodia::{api, server};
use thiserror::Error;
use tokio::net::TcpListener;

use client::Client;
use page::Page;

/// Why the story broke off.
#[derive(Debug, Error)]
pub(crate) enum Failure {
    #[error("{0}")]
    System(#[from] io::Error),
    #[error("the exchange failed: {0}")]
    Exchange(#[from] hyper::Error),
    #[error("the request cannot be written: {0}")]
    Request(#[from] http::Error),
    #[error("the answer is no JSON: {0}")]
    Answer(#[from] serde_json::Error),
    #[error("the answer has no {0}")]
    Missing(String),
    #[error("the request was refused with {status}: {problem}")]
    Refused { status: StatusCode, problem: String },
    #[error("no answer came")]
    Silence,
    #[error("stopped by a signal")]
    Stopped,
}

/// Serves on a free port of this machine and tells the story.
pub(crate) async fn run(config: Config) -> Result<(), Failure> {
    let listener = TcpListener::bind(("127.0.0.1", 0)).await?;
    let address = listener.local_addr()?;
    let (app, router) = api::start(config)?;
    let stdout = io::stdout();
    let telling = async {
        let page = Page::new(stdout.lock(), stdout.is_terminal());
        story::tell(Client::connect(address).await?, page).await
    };
    tokio::select! {
        told = telling => match told {
            // A reader who has seen enough, such as `head`, is no failure.
            Err(Failure::System(error)) if error.kind() == io::ErrorKind::BrokenPipe => Ok(()),
            told => told,
        },
        served = server::serve(listener, app, router) => Err(served.err().map_or(Failure::Stopped, Failure::System)),
    }
}
