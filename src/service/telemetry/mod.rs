//! Logs, on the standard error stream: for people on a terminal, one JSON object a line otherwise.

mod json;
mod writer;

use std::io::IsTerminal;

use tracing_subscriber::EnvFilter;

use crate::config::{Log, LogFormat};
pub use writer::Writing;

/// Starts logging; the last lines may be lost unless what it returns lives until the end.
///
/// # Errors
/// The operating system's, if it grants no thread.
pub fn start(log: &Log) -> std::io::Result<Writing> {
    let writing = Writing::start()?;
    let terminal = std::io::stderr().is_terminal();
    let human = match log.format {
        LogFormat::Human => true,
        LogFormat::Json => false,
        LogFormat::Auto => terminal,
    };
    let filter = EnvFilter::builder().parse_lossy(&log.filter);
    let builder = tracing_subscriber::fmt().with_writer(writing.lines()).with_env_filter(filter);
    // It fails if there is a subscriber already, as in tests, and that one will do.
    let _ = if human {
        builder.with_ansi(terminal).try_init()
    } else {
        builder.with_ansi(false).event_format(json::Json).try_init()
    };
    std::panic::set_hook(Box::new(|panic| {
        let place = panic.location().map(ToString::to_string).unwrap_or_default();
        let cause = panic.payload_as_str().unwrap_or("unknown");
        tracing::error!(%place, cause, "panic");
    }));
    Ok(writing)
}
