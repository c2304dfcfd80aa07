//! Logs: to the standard error stream, by a thread of their own, so that a slow reader of them delays nobody.

use std::io::{BufWriter, IsTerminal};

use tracing_appender::non_blocking::{NonBlocking, WorkerGuard};
use tracing_subscriber::EnvFilter;
use tracing_subscriber::fmt::format::FmtSpan;

use crate::config::{Log, LogFormat};

/// Starts logging; lines may be lost unless the guard lives until the end.
pub fn start(log: &Log) -> WorkerGuard {
    // The writing thread flushes whenever it has nothing more to write: many lines then go out in one call.
    let (writer, guard) = NonBlocking::new(BufWriter::new(std::io::stderr()));
    let human = match log.format {
        LogFormat::Human => true,
        LogFormat::Json => false,
        LogFormat::Auto => std::io::stderr().is_terminal(),
    };
    let filter = EnvFilter::builder().parse_lossy(&log.filter);
    let builder =
        tracing_subscriber::fmt().with_writer(writer).with_env_filter(filter).with_span_events(FmtSpan::NONE);
    let started = if human {
        builder.with_ansi(std::io::stderr().is_terminal()).try_init()
    } else {
        builder.json().flatten_event(true).with_current_span(false).with_span_list(false).try_init()
    };
    drop(started);
    std::panic::set_hook(Box::new(|panic| {
        let place = panic.location().map(ToString::to_string).unwrap_or_default();
        let cause = panic.payload_as_str().unwrap_or("unknown");
        tracing::error!(%place, cause, "panic");
    }));
    guard
}
