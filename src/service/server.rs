//! The HTTP server: bounds on slow clients, and an end that loses no answer.

use std::io;
use std::pin::pin;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};
use std::time::Duration;

use axum::Router;
use http::Request;
use hyper::body::Incoming;
use hyper::service::service_fn;
use hyper_util::rt::{TokioExecutor, TokioIo, TokioTimer};
use hyper_util::server::conn::auto::Builder;
use hyper_util::server::graceful::{GracefulShutdown, Watcher};
use tokio::net::{TcpListener, TcpStream};
use tokio::signal::unix::{SignalKind, signal};
use tokio::time::{sleep, timeout};
use tokio_io_timeout::TimeoutStream;
use tower::ServiceExt;

use crate::config::Times;
use crate::state::App;

/// A request's head may take this many bytes in all, and this many fields.
const HEAD_BYTES: usize = 64 << 10;
const HEAD_FIELDS: usize = 100;
/// Requests at once on one HTTP/2 connection.
const STREAMS: u32 = 100;
/// Pause after a failure to accept, of which too many open files is the usual one.
const PAUSE: Duration = Duration::from_millis(50);
/// How long computations have to notice that they are cancelled, and their clients to be told.
const LAST_WORDS: Duration = Duration::from_millis(500);

/// Serves until SIGTERM or SIGINT, then lets requests in flight end for as long as the configuration says, cancels the
/// rest and returns.
///
/// # Errors
/// The operating system's, if it grants no signal handler.
pub async fn serve(listener: TcpListener, app: App, router: Router) -> io::Result<()> {
    let mut terminate = signal(SignalKind::terminate())?;
    let mut interrupt = signal(SignalKind::interrupt())?;
    let builder = Arc::new(builder(app.config.times));
    let graceful = GracefulShutdown::new();
    loop {
        tokio::select! {
            accepted = listener.accept() => match accepted {
                Ok((stream, _)) => {
                    let (builder, router, watcher) = (Arc::clone(&builder), router.clone(), graceful.watcher());
                    tokio::spawn(connection(stream, builder, router, watcher, app.config.times));
                }
                Err(error) => {
                    tracing::warn!(%error, "no connection accepted");
                    sleep(PAUSE).await;
                }
            },
            _ = terminate.recv() => break,
            _ = interrupt.recv() => break,
        }
    }
    app.stop();
    drop(listener);
    let drain = app.config.times.drain;
    tracing::info!(connections = graceful.count(), drain_ms = drain.as_millis(), "stopping");
    let mut drained = Box::pin(graceful.shutdown());
    if timeout(drain, &mut drained).await.is_err() {
        tracing::warn!("cancelling what is still computed");
        app.pool.close();
        let _ = timeout(LAST_WORDS, drained).await;
    }
    tracing::info!("stopped");
    Ok(())
}

fn builder(times: Times) -> Builder<TokioExecutor> {
    let mut builder = Builder::new(TokioExecutor::new());
    builder
        .http1()
        .timer(TokioTimer::new())
        .header_read_timeout(times.request)
        .max_buf_size(HEAD_BYTES)
        .max_headers(HEAD_FIELDS);
    builder
        .http2()
        .timer(TokioTimer::new())
        .max_header_list_size(u32::try_from(HEAD_BYTES).unwrap_or(u32::MAX))
        .max_concurrent_streams(STREAMS)
        .keep_alive_interval(times.request)
        .keep_alive_timeout(times.request);
    builder
}

/// Serves one connection. The protocol's own time-outs begin with its first bytes; a connection that opens no request
/// at all is closed here.
async fn connection(
    stream: TcpStream,
    builder: Arc<Builder<TokioExecutor>>,
    router: Router,
    watcher: Watcher,
    times: Times,
) {
    let _ = stream.set_nodelay(true);
    let mut stream = TimeoutStream::new(stream);
    stream.set_write_timeout(Some(times.send));
    let begun = Arc::new(AtomicBool::new(false));
    let begins = Arc::clone(&begun);
    let service = service_fn(move |request: Request<Incoming>| {
        begins.store(true, Ordering::Relaxed);
        router.clone().oneshot(request)
    });
    let serving =
        watcher.watch(builder.serve_connection(TokioIo::new(Box::pin(stream)), service).into_owned());
    let mut serving = pin!(serving);
    let mut ended = timeout(times.request, &mut serving).await.ok();
    if ended.is_none() && begun.load(Ordering::Relaxed) {
        ended = Some(serving.await);
    }
    match ended {
        Some(Ok(())) => {}
        Some(Err(error)) => tracing::debug!(error, "connection ended"),
        None => tracing::debug!("a connection without a request closed"),
    }
}
