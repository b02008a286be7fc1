//! What `run` and `replay` share: reading and opening a session, the worker that evaluates it, and messages that do not drown the reader.

use super::console::{Console, OutputEnd, tell};
use super::interrupt::{Interrupts, WhenIdle};
use super::progress::Progress;
use super::source::SourceText;
use super::status::Status;
use super::worker::Worker;
use crate::session::{Report, Session};
use std::path::Path;

/// Most diagnostics drawn for one file.
const MOST_DIAGNOSTICS: usize = 30;

/// A batch command at work.
pub struct Batch {
    pub console: Console,
    pub worker: Worker,
}

impl Batch {
    pub fn new(console: Console) -> Self {
        let worker = Worker {
            interrupts: Interrupts::listen(WhenIdle::Leave),
            progress: Progress::new(console.messages_at_terminal),
        };
        Batch { console, worker }
    }

    /// Reads and opens a session; what is wrong with it as a whole is told here.
    pub fn open(&self, path: &Path) -> Result<(SourceText, Session), Status> {
        let source = SourceText::read(path).map_err(|problem| {
            tell(&format!("{} {problem}", self.console.messages.bad("error:")));
            Status::Unusable
        })?;
        match source.open() {
            Ok(session) => Ok((source, session)),
            Err(diagnostics) => {
                let mut told = Told::default();
                for diagnostic in &diagnostics {
                    told.tell(|| source.draw(diagnostic, self.console.messages.is_on()));
                }
                told.end();
                Err(Status::Unusable)
            }
        }
    }

    /// Draws the reports of a failed entry.
    pub fn tell_reports(&self, told: &mut Told, source: &SourceText, session: &Session, reports: &[Report]) {
        for report in reports {
            told.tell(|| source.draw_report(session, report, self.console.messages.is_on()));
        }
    }

    /// What is said when the output came to an end early.
    pub fn output_ended(&self, end: &OutputEnd) -> Status {
        if let OutputEnd::Broken(reason) = end {
            tell(&format!("{} the output cannot be written: {reason}", self.console.messages.bad("error:")));
        }
        Status::OutputClosed
    }
}

/// Counts diagnostics, and tells only the first of very many.
#[derive(Default)]
pub struct Told {
    count: usize,
}

impl Told {
    /// Tells one more; it is drawn only if it is shown.
    pub fn tell(&mut self, draw: impl FnOnce() -> String) {
        self.count += 1;
        if self.count <= MOST_DIAGNOSTICS {
            tell(&format!("{}\n", draw()));
        }
    }

    /// Says how many were left out.
    pub fn end(&self) {
        if self.count > MOST_DIAGNOSTICS {
            tell(&format!("and {} more errors, not shown", self.count - MOST_DIAGNOSTICS));
        }
    }
}
