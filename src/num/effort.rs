//! A running computation can be stopped from outside; every loop of unbounded length asks here.

use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};

/// The computation was stopped by the person who started it.
#[derive(Clone, Copy, PartialEq, Eq, Debug, thiserror::Error)]
#[error("stopped before it was finished")]
pub struct Interrupted;

/// The switch that ends a computation early. Clones share the switch.
#[derive(Clone, Debug, Default)]
pub struct Effort {
    stop: Arc<AtomicBool>,
}

impl Effort {
    pub fn new() -> Self {
        Self::default()
    }

    /// Asks every computation that holds a clone to end.
    pub fn stop(&self) {
        self.stop.store(true, Ordering::Relaxed);
    }

    /// Makes the switch ready for the next computation.
    pub fn reset(&self) {
        self.stop.store(false, Ordering::Relaxed);
    }

    /// Tells whether to go on.
    pub fn check(&self) -> Result<(), Interrupted> {
        if self.stop.load(Ordering::Relaxed) { Err(Interrupted) } else { Ok(()) }
    }
}
