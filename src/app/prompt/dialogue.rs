//! Does what is typed, and says what came of it: results on standard output, everything else on standard error.

use super::command::{self, Command};
use super::gather::Unit;
use super::notebook::{EntryProblem, Notebook};
use crate::app::console::{Console, OutputEnd, print, tell};
use crate::app::files::journal::Leftover;
use crate::app::worker::Worker;
use crate::lang::diagnostic::Diagnostic;
use crate::report::{diagnostics, entry, help};
use crate::session::{Entered, Outcome, Report};

/// What to do after a piece of input.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum Next {
    Go,
    /// Let the person edit the text of this entry.
    Edit {
        number: usize,
        text: String,
    },
    Leave,
}

/// What was asked for although work is unsaved; asking again does it.
#[derive(Clone, PartialEq, Eq, Debug)]
pub(super) enum Asked {
    Quit,
    Open(String),
    Recover,
}

/// A conversation about one notebook.
pub struct Dialogue {
    pub console: Console,
    pub worker: Worker,
    pub notebook: Notebook,
    pub leftovers: Vec<Leftover>,
    pub(super) asked: Option<Asked>,
    /// Whether anything went wrong; a session from a pipe ends with that.
    pub failed: bool,
    /// Whether it has been said what to do with an entry that failed.
    advised: bool,
    /// Whether it has been said that work cannot be kept safe.
    unsafe_told: bool,
}

impl Dialogue {
    pub fn new(console: Console, worker: Worker, notebook: Notebook) -> Self {
        Dialogue {
            console,
            worker,
            notebook,
            leftovers: Vec::new(),
            asked: None,
            failed: false,
            advised: false,
            unsafe_told: false,
        }
    }

    /// The number of the entry that is written next.
    pub fn next_number(&self) -> usize {
        self.notebook.session.len() + 1
    }

    /// Does one thing.
    pub fn take(&mut self, unit: &Unit) -> Result<Next, OutputEnd> {
        let asked = self.asked.take();
        let next = match unit {
            Unit::Entry(text) => self.enter(text).map(|()| Next::Go),
            Unit::Prose(line) => {
                self.notebook.add_prose(line);
                Ok(Next::Go)
            }
            Unit::TooLong => {
                self.wrong("this entry is longer than anyone can mean it to be; it has been left out");
                Ok(Next::Go)
            }
            Unit::Command(line) => match command::parse(line) {
                Ok(command) => self.command(command, asked),
                Err(message) => {
                    self.wrong(&message);
                    Ok(Next::Go)
                }
            },
        };
        if let Some(error) = self.notebook.journal_trouble.take()
            && !self.unsafe_told
        {
            self.unsafe_told = true;
            self.wrong(&format!(
                "unsaved entries would not survive a crash, since they cannot be kept on the disk: {error}"
            ));
        }
        next
    }

    fn command(&mut self, command: Command, asked: Option<Asked>) -> Result<Next, OutputEnd> {
        match command {
            Command::Save { over, name } => self.save(over, name),
            Command::Open(name) => self.open_command(name, asked)?,
            Command::Revise { number, text: None } => return Ok(self.edit(number)),
            Command::Revise { number, text: Some(text) } => self.revise(number, &text)?,
            Command::Drop(number) => self.drop_entry(number)?,
            Command::List(which) => self.list(which)?,
            Command::Resume => self.evaluate_pending(false)?,
            Command::Export => self.wrong(super::EXPORT_NOT_YET),
            Command::Help(word) => match help::page(&word, self.console.results) {
                Ok(page) => print(&page)?,
                Err(message) => self.wrong(&message),
            },
            Command::Recover(which) => self.recover(which, asked)?,
            Command::Discard(which) => self.discard(which),
            Command::Quit => return Ok(self.leave(asked == Some(Asked::Quit))),
        }
        Ok(Next::Go)
    }

    pub(super) fn wrong(&mut self, message: &str) {
        self.failed = true;
        tell(&self.console.messages.warning(message));
    }

    pub(super) fn note(&self, message: &str) {
        tell(&self.console.messages.faint(message));
    }

    fn enter(&mut self, text: &str) -> Result<(), OutputEnd> {
        let number = self.next_number();
        self.worker.progress.begin(format!("entry {number}"));
        match self.notebook.enter(text, &self.worker) {
            Ok(entered) => self.show_entered(&entered),
            Err(problem) => {
                self.tell_entry_problem(number, text, problem);
                Ok(())
            }
        }
    }

    /// Replaces the text of an entry.
    pub fn revise(&mut self, number: usize, text: &str) -> Result<(), OutputEnd> {
        let text = text.trim();
        self.worker.progress.begin(format!("entry {number}"));
        match self.notebook.revise(number, text, &self.worker) {
            Ok(entered) => self.show_entered(&entered),
            Err(problem) => {
                self.tell_entry_problem(number, text, problem);
                Ok(())
            }
        }
    }

    fn edit(&mut self, number: usize) -> Next {
        let Some(text) = self.notebook.session.entry(number).map(|view| view.text.to_string()) else {
            self.no_entry(number);
            return Next::Go;
        };
        if self.console.interactive {
            return Next::Edit { number, text };
        }
        self.wrong(&format!("write the new text behind the number: `revise {number} {text}`"));
        Next::Go
    }

    fn no_entry(&mut self, number: usize) {
        let count = self.notebook.session.len();
        self.wrong(&format!("there is no entry {number}; the session has {count}"));
    }

    fn drop_entry(&mut self, number: usize) -> Result<(), OutputEnd> {
        self.worker.progress.begin(format!("what depends on entry {number}"));
        match self.notebook.drop_entry(number, &self.worker) {
            Ok(entered) => {
                self.note(&format!("entry {number} is taken out; the entries below it have moved up"));
                self.show_each(&entered.evaluated)
            }
            Err(problem) => {
                self.tell_entry_problem(number, "", problem);
                Ok(())
            }
        }
    }

    fn tell_entry_problem(&mut self, number: usize, text: &str, problem: EntryProblem) {
        self.failed = true;
        match problem {
            EntryProblem::Text(diagnostics) => self.draw(&format!("entry {number}"), text, &diagnostics),
            EntryProblem::Failed(reports) => {
                reports.iter().for_each(|report| self.draw_report(Some((number, text)), report));
            }
            EntryProblem::Refused(refusal) => self.wrong(&refusal.to_string()),
            EntryProblem::Work(problem) => self.wrong(&problem.to_string()),
        }
    }

    pub(super) fn draw(&self, name: &str, text: &str, found: &[Diagnostic]) {
        for diagnostic in found {
            tell(&diagnostics::render(name, text, diagnostic, self.console.messages.is_on()));
        }
    }

    /// Draws a report on the text of the entry it points into; an entry that is not kept is given with its number.
    fn draw_report(&self, not_kept: Option<(usize, &str)>, report: &Report) {
        let number = report.entry_number;
        let text = match not_kept {
            Some((not_kept, text)) if not_kept == number => Some(text),
            _ => None,
        };
        let kept = self.notebook.session.entry(number);
        let text = text.or(kept.map(|view| view.text)).unwrap_or_default();
        self.draw(&format!("entry {number}"), text, std::slice::from_ref(&report.diagnostic));
    }

    /// Shows the result of a new entry, or every entry that a revision has evaluated.
    fn show_entered(&mut self, entered: &Entered) -> Result<(), OutputEnd> {
        if entered.revised {
            let others = entered.evaluated.len().saturating_sub(1);
            let again = if others == 0 { String::new() } else { format!(", and {others} more evaluated again") };
            self.note(&format!("entry {} is revised{again}", entered.number));
            return self.show_each(&entered.evaluated);
        }
        self.show_outcome(entered.number, "  ")
    }

    fn show_each(&mut self, numbers: &[usize]) -> Result<(), OutputEnd> {
        for number in numbers {
            self.show_numbered(*number)?;
        }
        Ok(())
    }

    /// Shows an entry with its number and result; what is wrong with it is drawn in place of the result.
    fn show_numbered(&mut self, number: usize) -> Result<(), OutputEnd> {
        let Some(view) = self.notebook.session.entry(number) else { return Ok(()) };
        print(&entry::numbered(&view, self.console.results))?;
        self.tell_reports(number);
        Ok(())
    }

    fn show_outcome(&mut self, number: usize, indent: &str) -> Result<(), OutputEnd> {
        let outcome = self.notebook.session.entry(number).and_then(|view| view.outcome.cloned());
        match outcome {
            Some(Outcome::Failed(_)) => self.tell_reports(number),
            Some(Outcome::Stopped) => {
                self.failed = true;
                self.wrong(&format!("stopped; entry {number} is kept, and `resume` evaluates it again"));
            }
            Some(outcome) => print(&entry::outcome(&outcome, indent, self.console.results))?,
            None => {}
        }
        Ok(())
    }

    fn tell_reports(&mut self, number: usize) {
        let Some(Outcome::Failed(reports)) = self.notebook.session.entry(number).and_then(|view| view.outcome.cloned())
        else {
            return;
        };
        self.failed = true;
        reports.iter().for_each(|report| self.draw_report(None, report));
        if !self.advised && self.console.interactive {
            self.advised = true;
            self.note(&format!("the entry is kept: `revise {number}` changes it, `drop {number}` takes it out"));
        }
    }

    fn list(&mut self, which: Option<usize>) -> Result<(), OutputEnd> {
        let paint = self.console.results;
        let session = &self.notebook.session;
        let mut text = String::new();
        match which {
            Some(number) => match session.entry(number) {
                Some(view) => text.push_str(&entry::numbered(&view, paint)),
                None => self.no_entry(number),
            },
            None => {
                for view in (1..=session.len()).filter_map(|number| session.entry(number)) {
                    for line in &view.prose_before {
                        text.push_str(&format!("{}\n", paint.faint(line)));
                    }
                    text.push_str(&entry::numbered(&view, paint));
                }
                for line in session.prose_after() {
                    text.push_str(&format!("{}\n", paint.faint(line)));
                }
            }
        }
        print(&text)
    }

    /// Evaluates what has no result yet, and shows each entry as it comes.
    pub fn evaluate_pending(&mut self, opened: bool) -> Result<(), OutputEnd> {
        let paint = self.console.results;
        let mut ended = None;
        let mut reported = Vec::new();
        let Dialogue { worker, notebook, .. } = self;
        let effort = notebook.session.effort();
        let session = &mut notebook.session;
        worker.progress.begin("the session".into());
        let done = worker.run(&effort, || {
            session.evaluate(&mut |session, number| {
                worker.progress.begin(format!("entry {}", number + 1));
                let Some(view) = session.entry(number) else { return };
                if let Some(Outcome::Failed(_)) = view.outcome {
                    reported.push(number);
                }
                if ended.is_none()
                    && let Err(end) = print(&entry::numbered(&view, paint))
                {
                    ended = Some(end);
                    session.effort().stop();
                }
            });
        });
        if let Err(problem) = done {
            self.wrong(&problem.to_string());
        }
        if let Some(end) = ended {
            return Err(end);
        }
        for number in reported {
            self.tell_reports(number);
        }
        self.tell_unfinished();
        if opened {
            self.tell_other_than_recorded();
        }
        Ok(())
    }

    fn tell_unfinished(&mut self) {
        let session = &self.notebook.session;
        let stopped = (1..=session.len()).find(|number| {
            matches!(session.entry(*number).map(|view| view.outcome.cloned()), Some(None | Some(Outcome::Stopped)))
        });
        if let Some(number) = stopped {
            self.wrong(&format!("stopped at entry {number}; `resume` evaluates it and what follows"));
        }
    }

    fn tell_other_than_recorded(&mut self) {
        let session = &self.notebook.session;
        let differing: Vec<String> = (1..=session.len())
            .filter_map(|number| session.entry(number))
            .filter(|view| matches!(view.outcome, Some(Outcome::Result(answer)) if !view.recorded.is_empty() && view.recorded != answer.lines))
            .map(|view| view.number.to_string())
            .collect();
        if !differing.is_empty() {
            let list = differing.join(", ");
            self.wrong(&format!(
                "the file records something else for entry {list}; `ketwork replay` compares digit by digit"
            ));
        }
    }
}
