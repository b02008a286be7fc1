//! Evaluation on a thread of its own, with room for deep recursion, while the main thread shows progress and Ctrl-C stays heard.

use super::interrupt::Interrupts;
use super::progress::Progress;
use crate::num::Effort;
use std::sync::mpsc::{RecvTimeoutError, channel};
use std::thread;
use std::time::Duration;

/// Stack of the evaluating thread; only what is touched takes memory.
const STACK: usize = 256 << 20;
const BETWEEN_TICKS: Duration = Duration::from_millis(100);

/// Why work did not come to its end.
#[derive(Clone, PartialEq, Eq, Debug, thiserror::Error)]
pub enum WorkProblem {
    #[error("the system gives no thread to evaluate on: {0}")]
    NoThread(String),
    /// The details have been told by then.
    #[error("the evaluation broke off because of a mistake in the program, not in the session")]
    Broken,
}

/// What every evaluation needs around it.
pub struct Worker {
    pub interrupts: Interrupts,
    pub progress: Progress,
}

impl Worker {
    /// Does the work on the large stack and waits for it.
    pub fn run<T: Send>(&self, effort: &Effort, work: impl FnOnce() -> T + Send) -> Result<T, WorkProblem> {
        self.interrupts.begin(effort);
        let outcome = thread::scope(|scope| {
            let (finished, waiting) = channel::<()>();
            let task = move || {
                // Dropped at the end, also when the work breaks off: that ends the waiting.
                let _finished = finished;
                work()
            };
            let handle = thread::Builder::new()
                .name("evaluation".into())
                .stack_size(STACK)
                .spawn_scoped(scope, task)
                .map_err(|error| WorkProblem::NoThread(error.to_string()))?;
            while waiting.recv_timeout(BETWEEN_TICKS) == Err(RecvTimeoutError::Timeout) {
                self.progress.tick();
            }
            self.progress.clear();
            handle.join().map_err(|_| WorkProblem::Broken)
        });
        self.interrupts.end();
        outcome
    }
}

/// Makes a mistake of the program known as such, in one line.
pub fn announce_mistakes() {
    std::panic::set_hook(Box::new(|mistake| {
        let place = mistake.location().map_or_else(String::new, |at| format!(" ({}:{})", at.file(), at.line()));
        let payload = mistake.payload();
        let what = payload
            .downcast_ref::<&str>()
            .map(|text| (*text).to_string())
            .or_else(|| payload.downcast_ref::<String>().cloned())
            .unwrap_or_default();
        super::console::tell(&format!("a mistake in ketwork itself{place}: {what}"));
    }));
}

#[cfg(test)]
mod tests {
    use super::super::interrupt::WhenIdle;
    use super::*;

    fn worker() -> Worker {
        Worker { interrupts: Interrupts::listen(WhenIdle::Stay), progress: Progress::new(false) }
    }

    #[test]
    fn deep_recursion_has_room() {
        fn depth(n: u64) -> u64 {
            let marks = std::hint::black_box([n; 16]);
            if n == 0 { 0 } else { 1 + depth(n - 1).min(marks[3]) }
        }
        assert_eq!(worker().run(&Effort::new(), || depth(200_000)), Ok(200_000));
    }

    #[test]
    fn a_mistake_does_not_take_the_program_along() {
        let broken: Result<(), WorkProblem> = worker().run(&Effort::new(), || panic!("on purpose"));
        assert_eq!(broken, Err(WorkProblem::Broken));
        assert_eq!(worker().run(&Effort::new(), || 3), Ok(3));
    }

    #[test]
    fn the_switch_is_ready_for_every_evaluation() {
        let effort = Effort::new();
        effort.stop();
        assert_eq!(worker().run(&effort, || effort.check().is_ok()), Ok(true));
    }
}
