//! A line with the elapsed time under a long evaluation. It stands on standard error of a terminal only and is gone before anything is printed.

use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};
use std::sync::{Mutex, MutexGuard, PoisonError};
use std::time::{Duration, Instant};

/// An evaluation shorter than this shows nothing.
const PATIENCE: Duration = Duration::from_secs(1);

/// The progress line.
pub struct Progress {
    visible: bool,
    state: Mutex<State>,
}

struct State {
    label: String,
    since: Instant,
    bar: Option<ProgressBar>,
}

impl Progress {
    pub fn new(visible: bool) -> Self {
        Progress { visible, state: Mutex::new(State { label: String::new(), since: Instant::now(), bar: None }) }
    }

    fn lock(&self) -> MutexGuard<'_, State> {
        self.state.lock().unwrap_or_else(PoisonError::into_inner)
    }

    /// Something new is being evaluated: the time starts again.
    pub fn begin(&self, label: String) {
        let mut state = self.lock();
        state.clear();
        state.label = label;
        state.since = Instant::now();
    }

    /// Draws the line when it is time; called again and again while the evaluation runs.
    pub fn tick(&self) {
        let mut state = self.lock();
        if !self.visible || state.since.elapsed() < PATIENCE {
            return;
        }
        if state.bar.is_none() {
            let bar = ProgressBar::with_draw_target(None, ProgressDrawTarget::stderr())
                .with_elapsed(state.since.elapsed())
                .with_message(state.label.clone());
            if let Ok(style) = ProgressStyle::with_template("{spinner} {msg}, {elapsed}; Ctrl-C stops it") {
                bar.set_style(style);
            }
            state.bar = Some(bar);
        }
        if let Some(bar) = &state.bar {
            bar.tick();
        }
    }

    /// Takes the line away, so that something can be printed.
    pub fn clear(&self) {
        self.lock().clear();
    }
}

impl State {
    fn clear(&mut self) {
        if let Some(bar) = self.bar.take() {
            bar.finish_and_clear();
        }
    }
}
