//! A session file with its text, and the entries' places in it: what a message about an entry needs to name file and line.

use super::files::read::{self, ReadProblem};
use super::files::{FolderFiles, StandardInput};
use crate::lang::diagnostic::Diagnostic;
use crate::report::diagnostics;
use crate::session::{DataFiles, Report, Session};
use std::path::Path;
use std::sync::Arc;

/// The text of a session and the name it goes by in messages.
pub struct SourceText {
    pub name: String,
    pub text: String,
    pub files: Arc<dyn DataFiles>,
}

impl SourceText {
    /// Reads the file; `-` is standard input.
    pub fn read(path: &Path) -> Result<Self, ReadProblem> {
        if path.as_os_str() == "-" {
            let text = read::standard_input()?;
            return Ok(SourceText { name: "standard input".into(), text, files: Arc::new(StandardInput) });
        }
        let text = read::session_file(path)?;
        Ok(SourceText { name: path.display().to_string(), text, files: Arc::new(FolderFiles::beside(path)) })
    }

    /// The session of this text, unevaluated.
    pub fn open(&self) -> Result<Session, Vec<Diagnostic>> {
        Session::open(&self.text, self.files.clone())
    }

    /// Draws a diagnostic whose places are places of the whole text.
    pub fn draw(&self, diagnostic: &Diagnostic, colour: bool) -> String {
        diagnostics::render(&self.name, &self.text, diagnostic, colour)
    }

    /// Draws the report of an entry at its place in the file.
    pub fn draw_report(&self, session: &Session, report: &Report, colour: bool) -> String {
        let start = session.entry(report.entry_number).map_or(0, |view| view.span.start);
        self.draw(&report.diagnostic.clone().shifted(start), colour)
    }
}
