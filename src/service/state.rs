//! What all handlers share.

use std::ops::Deref;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};

use tokio::sync::{OwnedSemaphorePermit, Semaphore};

use crate::answer::Document;
use crate::config::Config;
use crate::pool::Pool;
use crate::problem::Problem;

/// Bodies of the largest size that are held at once; more large ones are turned away.
const LARGE_BODIES: usize = 8;
/// Memory for bodies is accounted in units of this size.
const UNIT: usize = 64 << 10;

/// Handle to what all handlers share.
#[derive(Clone, Debug)]
pub struct App(Arc<Shared>);

/// What all handlers share.
#[derive(Debug)]
pub struct Shared {
    /// The configuration.
    pub config: Config,
    /// The compute threads.
    pub pool: Pool,
    /// The `OpenAPI` document.
    pub openapi: Document,
    body_memory: Arc<Semaphore>,
    stopping: AtomicBool,
}

impl Deref for App {
    type Target = Shared;

    fn deref(&self) -> &Shared {
        &self.0
    }
}

impl App {
    /// Starts what the handlers share.
    ///
    /// # Errors
    /// The operating system's, if it grants no compute thread.
    pub fn start(config: Config, openapi: Document) -> std::io::Result<Self> {
        let pool = Pool::start(config.compute)?;
        let units = (config.limits.body_bytes.div_ceil(UNIT) * LARGE_BODIES).min(Semaphore::MAX_PERMITS);
        let body_memory = Arc::new(Semaphore::new(units));
        Ok(Self(Arc::new(Shared { config, pool, openapi, body_memory, stopping: AtomicBool::new(false) })))
    }

    /// Memory for a body of `bytes`, given back when the permit is dropped; small bodies need none.
    ///
    /// # Errors
    /// `overloaded` if too many large bodies are held already.
    pub fn body_memory(&self, bytes: usize) -> Result<Option<OwnedSemaphorePermit>, Problem> {
        if bytes <= UNIT {
            return Ok(None);
        }
        let units = u32::try_from(bytes.div_ceil(UNIT)).unwrap_or(u32::MAX);
        let permit = Arc::clone(&self.body_memory).try_acquire_many_owned(units);
        permit.map(Some).map_err(|_| Problem::overloaded("Too many large bodies are being received"))
    }

    /// From now on the server is not ready for new requests.
    pub fn stop(&self) {
        self.stopping.store(true, Ordering::Relaxed);
    }

    /// Whether the server is about to stop.
    #[must_use]
    pub fn is_stopping(&self) -> bool {
        self.stopping.load(Ordering::Relaxed)
    }
}
