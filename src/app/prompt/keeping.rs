//! Where the work of a conversation goes: saved, opened, taken back after a crash, or left.

use super::dialogue::{Asked, Dialogue, Next};
use super::notebook::OpenProblem;
use crate::app::console::{OutputEnd, tell};
use crate::app::files::save::SaveProblem;
use std::path::{Path, PathBuf};

impl Dialogue {
    pub(super) fn save(&mut self, over: bool, name: Option<String>) {
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

    pub(super) fn open_command(&mut self, name: String, asked: Option<Asked>) -> Result<(), OutputEnd> {
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

    pub(super) fn recover(&mut self, which: usize, asked: Option<Asked>) -> Result<(), OutputEnd> {
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

    pub(super) fn discard(&mut self, which: usize) {
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
