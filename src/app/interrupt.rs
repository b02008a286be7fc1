//! Ctrl-C: ends the running evaluation and nothing else.

use super::console::tell;
use super::status::Status;
use crate::num::Effort;
use std::sync::{Arc, Mutex, MutexGuard, Once, PoisonError};

/// What Ctrl-C does when nothing is being evaluated.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum WhenIdle {
    /// The line editor sees the key itself; a signal from elsewhere is not heeded.
    Stay,
    /// The program ends: it is reading a file or a pipe.
    Leave,
}

#[derive(Debug, Default)]
struct Watched {
    running: Option<Effort>,
    /// How often the person has asked during this evaluation.
    asked: u32,
}

/// Listens for Ctrl-C while an evaluation runs.
#[derive(Clone, Debug)]
pub struct Interrupts {
    watched: Arc<Mutex<Watched>>,
    when_idle: WhenIdle,
}

impl Interrupts {
    /// Begins to listen. There is one listener in a process; a second call leaves the first in charge.
    pub fn listen(when_idle: WhenIdle) -> Self {
        static LISTENING: Once = Once::new();
        let interrupts = Interrupts { watched: Arc::default(), when_idle };
        let heard = interrupts.clone();
        LISTENING.call_once(|| {
            if let Err(error) = ctrlc::set_handler(move || heard.heard()) {
                tell(&format!("Ctrl-C will end the program instead of the evaluation: {error}"));
            }
        });
        interrupts
    }

    fn lock(&self) -> MutexGuard<'_, Watched> {
        self.watched.lock().unwrap_or_else(PoisonError::into_inner)
    }

    fn heard(&self) {
        let mut watched = self.lock();
        watched.asked += 1;
        match (&watched.running, watched.asked) {
            (None, _) if self.when_idle == WhenIdle::Stay => watched.asked = 0,
            (None, _) => std::process::exit(Status::Failed.code().into()),
            (Some(effort), 1) => effort.stop(),
            (Some(_), 2) => tell("\nstopping; Ctrl-C once more leaves at once"),
            (Some(_), _) => std::process::exit(Status::Failed.code().into()),
        }
    }

    /// From now on Ctrl-C stops what holds this switch.
    pub fn begin(&self, effort: &Effort) {
        effort.reset();
        *self.lock() = Watched { running: Some(effort.clone()), asked: 0 };
    }

    /// The evaluation is over.
    pub fn end(&self) {
        *self.lock() = Watched::default();
    }
}
