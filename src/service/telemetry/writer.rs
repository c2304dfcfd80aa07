//! Lines are gathered in memory and written by a thread of their own, many at a time: a slow reader of the log delays
//! no request, and a busy server is not woken up for every line.

use std::io::{self, Write};
use std::mem::take;
use std::sync::mpsc::{Receiver, Sender, channel};
use std::sync::{Arc, Condvar, Mutex, MutexGuard, PoisonError};
use std::time::Duration;

use tracing_subscriber::fmt::MakeWriter;

/// How long lines are gathered after the first: unnoticeable to a reader, and hundreds of requests on a busy server.
const GATHER: Duration = Duration::from_millis(20);
/// Memory for lines that nobody takes; what comes then is counted, and the count is written when there is room again.
const ROOM: usize = 4 << 20;
/// How long the program waits at its end for the last lines to be taken.
const PARTING: Duration = Duration::from_secs(1);

#[derive(Debug, Default)]
struct Pending {
    bytes: Vec<u8>,
    lost: u64,
    ended: bool,
}

#[derive(Debug, Default)]
struct Shared {
    pending: Mutex<Pending>,
    filled: Condvar,
}

impl Shared {
    fn lock(&self) -> MutexGuard<'_, Pending> {
        self.pending.lock().unwrap_or_else(PoisonError::into_inner)
    }
}

/// Where log lines go.
#[derive(Clone, Debug)]
pub(super) struct Lines(Arc<Shared>);

impl Write for Lines {
    fn write(&mut self, line: &[u8]) -> io::Result<usize> {
        let mut pending = self.0.lock();
        if pending.bytes.len() + line.len() > ROOM {
            pending.lost += 1;
            return Ok(line.len());
        }
        let first = pending.bytes.is_empty();
        pending.bytes.extend_from_slice(line);
        drop(pending);
        if first {
            self.0.filled.notify_one();
        }
        Ok(line.len())
    }

    fn flush(&mut self) -> io::Result<()> {
        Ok(())
    }
}

impl<'a> MakeWriter<'a> for Lines {
    type Writer = Self;

    fn make_writer(&'a self) -> Self {
        self.clone()
    }
}

/// The writing thread; dropping this writes the lines that are left.
#[derive(Debug)]
pub struct Writing {
    lines: Lines,
    written: Receiver<()>,
}

impl Writing {
    pub(super) fn start() -> io::Result<Self> {
        let lines = Lines(Arc::default());
        let (done, written) = channel();
        let shared = Arc::clone(&lines.0);
        std::thread::Builder::new().name("log".to_owned()).spawn(move || write_all(&shared, &done))?;
        Ok(Self { lines, written })
    }

    pub(super) fn lines(&self) -> Lines {
        self.lines.clone()
    }
}

impl Drop for Writing {
    fn drop(&mut self) {
        self.lines.0.lock().ended = true;
        self.lines.0.filled.notify_one();
        let _ = self.written.recv_timeout(PARTING);
    }
}

fn write_all(shared: &Shared, done: &Sender<()>) {
    let mut stderr = io::stderr();
    loop {
        let nothing = |pending: &mut Pending| pending.bytes.is_empty() && !pending.ended;
        let waited = shared.filled.wait_while(shared.lock(), nothing).unwrap_or_else(PoisonError::into_inner);
        let ended = waited.ended;
        drop(waited);
        if !ended {
            std::thread::sleep(GATHER);
        }
        let mut pending = shared.lock();
        let (bytes, lost) = (take(&mut pending.bytes), take(&mut pending.lost));
        drop(pending);
        let mut outcome = stderr.write_all(&bytes);
        if lost > 0 {
            outcome = outcome.and_then(|()| {
                writeln!(stderr, "{{\"level\":\"WARN\",\"message\":\"log lines lost\",\"lines\":{lost}}}")
            });
        }
        if ended || outcome.is_err() {
            let _ = done.send(());
            return;
        }
    }
}
