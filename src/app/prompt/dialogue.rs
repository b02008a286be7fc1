//! Does what is typed, and says what came of it: results on standard output, everything else on standard error.

use super::command::{self, Command};
use super::gather::Unit;
use super::notebook::{EntryProblem, Notebook, OpenProblem};
use crate::app::console::{Console, OutputEnd, print, tell};
use crate::app::files::journal::Leftover;
use crate::app::files::save::SaveProblem;
use crate::app::worker::Worker;
use crate::lang::diagnostic::Diagnostic;
use crate::report::{diagnostics, entry, help};
use crate::session::{Entered, Outcome, Report};
use std::path::{Path, PathBuf};

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
enum Asked {
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
    asked: Option<Asked>,
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

    fn wrong(&mut self, message: &str) {
        self.failed = true;
        tell(&self.console.messages.warning(message));
    }

    fn note(&self, message: &str) {
        tell(&self.console.messages.faint(message));
    }

    // Entries

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
            EntryProblem::Refused(refusal) => self.wrong(&refusal.to_string()),
            EntryProblem::Work(problem) => self.wrong(&problem.to_string()),
        }
    }

    fn draw(&self, name: &str, text: &str, found: &[Diagnostic]) {
        for diagnostic in found {
            tell(&diagnostics::render(name, text, diagnostic, self.console.messages.is_on()));
        }
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
        for Report { entry_number, diagnostic } in &reports {
            let text =
                self.notebook.session.entry(*entry_number).map_or_else(String::new, |view| view.text.to_string());
            self.draw(&format!("entry {entry_number}"), &text, std::slice::from_ref(diagnostic));
        }
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

    // Files

    fn save(&mut self, over: bool, name: Option<String>) {
        let path = name.as_deref().map(named);
        match self.notebook.save(path.as_deref(), over) {
            Ok(path) => {
                let message = format!("saved in {}", path.display());
                self.note(&message);
            }
            Err(None) => self.wrong("under which name? write `save stark`"),
            Err(Some(problem)) => {
                let way_out = match &problem {
                    SaveProblem::Changed(_) | SaveProblem::Exists(_) => {
                        let again = path.map_or_else(String::new, |path| format!(" {}", path.display()));
                        format!("; `save NAME` keeps both, `save over{again}` replaces it")
                    }
                    _ => String::new(),
                };
                self.wrong(&format!("{problem}{way_out}"));
            }
        }
    }

    fn open_command(&mut self, name: String, asked: Option<Asked>) -> Result<(), OutputEnd> {
        let again = Asked::Open(name.clone());
        if self.must_ask(&again, asked.as_ref(), &format!("`open {name}` again leaves them")) {
            return Ok(());
        }
        let path = typed_path(&name);
        let path = if path.exists() { path } else { named(&name) };
        self.open(&path)?;
        Ok(())
    }

    /// Opens a session and evaluates it; tells whether it could be opened.
    pub fn open(&mut self, path: &Path) -> Result<bool, OutputEnd> {
        match self.notebook.open(path) {
            Ok(()) => self.evaluate_pending(true).map(|()| true),
            Err(problem) => {
                self.tell_open_problem(problem);
                Ok(false)
            }
        }
    }

    fn tell_open_problem(&mut self, problem: OpenProblem) {
        match problem {
            OpenProblem::Read(problem) => self.wrong(&problem.to_string()),
            OpenProblem::Text { name, text, diagnostics } => {
                self.failed = true;
                self.draw(&name, &text, &diagnostics);
            }
        }
    }

    // What a crash left behind

    /// Says what was left behind and how to take it back.
    pub fn tell_leftovers(&self) {
        if self.leftovers.is_empty() {
            return;
        }
        self.note("work was left unsaved when the program ended unexpectedly:");
        for (position, leftover) in self.leftovers.iter().enumerate() {
            tell(&format!("  {}  {}", position + 1, super::leftover::described(leftover)));
        }
        let which = if self.leftovers.len() == 1 { "" } else { " (or `recover 2`, ...)" };
        self.note(&format!(
            "`recover`{which} takes it back, `discard` deletes it, `list` and anything else leaves it for later"
        ));
    }

    fn recover(&mut self, which: usize, asked: Option<Asked>) -> Result<(), OutputEnd> {
        if !self.is_left(which) || self.must_ask(&Asked::Recover, asked.as_ref(), "`recover` again leaves them") {
            return Ok(());
        }
        let leftover = self.leftovers.remove(which - 1);
        match self.notebook.recover(leftover) {
            Ok(()) => {
                self.evaluate_pending(false)?;
                self.note("taken back; it is not saved yet");
            }
            Err(problem) => self.tell_open_problem(problem),
        }
        Ok(())
    }

    fn discard(&mut self, which: usize) {
        if !self.is_left(which) {
            return;
        }
        match self.leftovers.remove(which - 1).delete() {
            Ok(()) => self.note("deleted"),
            Err(error) => self.wrong(&format!("it cannot be deleted: {error}")),
        }
    }

    fn is_left(&mut self, which: usize) -> bool {
        let there = which <= self.leftovers.len();
        if !there {
            let count = self.leftovers.len();
            self.wrong(&match count {
                0 => "no work was left unsaved".to_string(),
                _ => format!("there is no {which} in the list of unsaved work; it has {count}"),
            });
        }
        there
    }

    // Leaving

    /// The end of the input: asks once when work is unsaved and somebody is there to answer.
    pub fn leave(&mut self, asked_before: bool) -> Next {
        let asked = asked_before.then_some(Asked::Quit);
        if self.must_ask(&Asked::Quit, asked.as_ref(), "`quit` again leaves them") {
            return Next::Go;
        }
        self.notebook.settled();
        Next::Leave
    }

    /// Ctrl-D: like `quit`.
    pub fn end_of_input(&mut self) -> Next {
        let asked = self.asked.take() == Some(Asked::Quit);
        self.leave(asked)
    }

    fn must_ask(&mut self, wanted: &Asked, asked: Option<&Asked>, again: &str) -> bool {
        let unsaved = self.notebook.unsaved;
        if unsaved == 0 || asked == Some(wanted) || !self.console.interactive {
            return false;
        }
        let changes = if unsaved == 1 { "1 change is".to_string() } else { format!("{unsaved} changes are") };
        let save = if self.notebook.file.is_some() { "`save`" } else { "`save NAME`" };
        self.note(&format!("{changes} not saved: {save} keeps them, {again}"));
        self.asked = Some(wanted.clone());
        true
    }
}

/// A path as it is typed: quotes around it are dropped, and `~/` is the home folder.
fn typed_path(name: &str) -> PathBuf {
    let bare = name.strip_prefix('"').and_then(|rest| rest.strip_suffix('"')).unwrap_or(name);
    match (bare.strip_prefix("~/"), std::env::home_dir()) {
        (Some(below), Some(home)) => home.join(below),
        _ => PathBuf::from(bare),
    }
}

/// A session's file name as it is typed: without an ending it gets the usual one.
fn named(name: &str) -> PathBuf {
    let path = typed_path(name);
    if path.extension().is_some() { path } else { path.with_extension("ketwork") }
}
