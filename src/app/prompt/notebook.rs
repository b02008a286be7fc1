//! The session at the prompt with everything that keeps its work safe: the file it belongs to, and the journal.

use crate::app::files::folder::FolderFiles;
use crate::app::files::journal::{Event, Journal, Leftover, Owner, Safety};
use crate::app::files::read::{self, ReadProblem};
use crate::app::files::save::{self, Before, SaveProblem};
use crate::app::provenance::provenance;
use crate::app::worker::{WorkProblem, Worker};
use crate::lang::diagnostic::Diagnostic;
use crate::lang::file::EntryText;
use crate::lang::tree::EntryKind;
use crate::session::{Entered, Outcome, Refusal, Report, Session};
use std::io;
use std::path::{Path, PathBuf};
use std::sync::Arc;

/// The session's file, and what it held when it was read or written here last.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct KnownFile {
    pub path: PathBuf,
    pub text: String,
}

/// Why a session was not opened.
#[derive(Debug)]
pub enum OpenProblem {
    Read(ReadProblem),
    /// What is wrong with the text as a whole, with the name and the text it is about.
    Text {
        name: String,
        text: String,
        diagnostics: Vec<Diagnostic>,
    },
}

/// Why an entry was not taken in.
#[derive(Debug)]
pub enum EntryProblem {
    Text(Vec<Diagnostic>),
    /// It was evaluated, and failed.
    Failed(Vec<Report>),
    Refused(Refusal),
    Work(WorkProblem),
}

/// A session with its file and its journal.
pub struct Notebook {
    pub session: Session,
    pub file: Option<KnownFile>,
    folder: PathBuf,
    journal: Journal,
    /// Changes since the session was opened or saved.
    pub unsaved: usize,
    /// Why the journal could not be written, until that has been told.
    pub journal_trouble: Option<io::Error>,
}

impl Notebook {
    /// An empty session in the current folder.
    pub fn new(data_folder: Option<PathBuf>, safety: Safety) -> Self {
        let folder = std::env::current_dir().unwrap_or_else(|_| PathBuf::from("."));
        Notebook {
            session: Session::new(Arc::new(FolderFiles::below(&folder))),
            file: None,
            folder,
            journal: Journal::new(data_folder, safety),
            unsaved: 0,
            journal_trouble: None,
        }
    }

    /// Puts the session of a file in place of this one; nothing is evaluated yet.
    pub fn open(&mut self, path: &Path) -> Result<(), OpenProblem> {
        let text = read::session_file(path).map_err(OpenProblem::Read)?;
        let path = std::path::absolute(path).unwrap_or_else(|_| path.to_path_buf());
        let folder = path.parent().map_or_else(|| PathBuf::from("."), Path::to_path_buf);
        self.session = open_text(&path.display().to_string(), &text, &folder)?;
        self.folder = folder;
        self.file = Some(KnownFile { path, text });
        self.settled();
        Ok(())
    }

    /// Takes back what a crash left; nothing is evaluated yet.
    pub fn recover(&mut self, leftover: Leftover) -> Result<(), OpenProblem> {
        let owner = leftover.owner.clone();
        self.session = open_text("the unsaved work", &leftover.text, &owner.folder)?;
        self.folder = owner.folder;
        self.file = owner.file.map(|path| KnownFile { path, text: owner.known.unwrap_or_default() });
        self.settled();
        self.unsaved = 1;
        // The old journal goes only when the new one is on the disk.
        match self.journal.restart(&self.owner(), leftover.text.clone()) {
            Ok(()) => {
                let _ = leftover.delete();
            }
            Err(error) => self.journal_trouble = Some(error),
        }
        Ok(())
    }

    fn owner(&self) -> Owner {
        Owner {
            journal: 1,
            file: self.file.as_ref().map(|file| file.path.clone()),
            known: self.file.as_ref().map(|file| file.text.clone()),
            folder: self.folder.clone(),
        }
    }

    fn note(&mut self, event: &Event) {
        let owner = self.owner();
        let session = &self.session;
        let noted = self.journal.note(&owner, || session.to_text(&provenance()), event);
        self.keep_trouble(noted);
    }

    fn note_whole(&mut self) {
        let noted = self.journal.restart(&self.owner(), self.session.to_text(&provenance()));
        self.keep_trouble(noted);
    }

    fn keep_trouble(&mut self, noted: io::Result<()>) {
        if let Err(error) = noted {
            self.journal_trouble = Some(error);
        }
    }

    /// Nothing is unsaved any more.
    pub fn settled(&mut self) {
        self.unsaved = 0;
        self.journal.clear();
    }

    /// Adds an entry; it is in the journal before it is evaluated.
    ///
    /// A new entry that fails is not kept, so that a slip of the finger never gets into the file; an expectation is, since it says what ought to hold.
    pub fn enter(&mut self, text: &str, worker: &Worker) -> Result<Entered, EntryProblem> {
        let tree = EntryText::new(text).parsed.map_err(EntryProblem::Text)?;
        self.note(&Event::Entry(text.to_string()));
        let effort = self.session.effort();
        let session = &mut self.session;
        let done = worker.run(&effort, || session.enter(text)).map_err(EntryProblem::Work)?;
        match done {
            Ok(entered) => {
                if !entered.revised
                    && !matches!(tree.kind, EntryKind::Expect { .. })
                    && let Some(Outcome::Failed(reports)) =
                        self.session.entry(entered.number).and_then(|view| view.outcome.cloned())
                    && self.session.drop_entry(entered.number).is_ok()
                {
                    self.note(&Event::Refused);
                    return Err(EntryProblem::Failed(reports));
                }
                self.unsaved += 1;
                if entered.revised {
                    self.note_whole();
                }
                Ok(entered)
            }
            Err(diagnostics) => {
                self.note(&Event::Refused);
                Err(EntryProblem::Text(diagnostics))
            }
        }
    }

    pub fn add_prose(&mut self, line: &str) {
        self.note(&Event::Prose(line.to_string()));
        self.session.add_prose(line);
        self.unsaved += 1;
    }

    pub fn revise(&mut self, number: usize, text: &str, worker: &Worker) -> Result<Entered, EntryProblem> {
        let effort = self.session.effort();
        let session = &mut self.session;
        let done = worker.run(&effort, || session.revise(number, text)).map_err(EntryProblem::Work)?;
        let entered = done.map_err(EntryProblem::Text)?;
        self.changed();
        Ok(entered)
    }

    pub fn drop_entry(&mut self, number: usize, worker: &Worker) -> Result<Entered, EntryProblem> {
        let effort = self.session.effort();
        let session = &mut self.session;
        let done = worker.run(&effort, || session.drop_entry(number)).map_err(EntryProblem::Work)?;
        let entered = done.map_err(EntryProblem::Refused)?;
        self.changed();
        Ok(entered)
    }

    fn changed(&mut self) {
        self.unsaved += 1;
        self.note_whole();
    }

    /// Saves the session under this name from now on, or where it was.
    ///
    /// *Errors*: as `files::save`; `None` when the session has no name yet.
    pub fn save(&mut self, name: Option<&Path>, over: bool) -> Result<&Path, Option<SaveProblem>> {
        let (path, known) = match (name, &self.file) {
            (None, None) => return Err(None),
            (None, Some(file)) => (file.path.clone(), Some(file.text.clone())),
            (Some(name), file) => {
                let path = std::path::absolute(name).unwrap_or_else(|_| name.to_path_buf());
                let known = file.as_ref().filter(|file| file.path == path).map(|file| file.text.clone());
                (path, known)
            }
        };
        let before = match &known {
            _ if over => Before::Anything,
            Some(text) => Before::Known(text),
            None => Before::Nothing,
        };
        let text = self.session.to_text(&provenance());
        save::save(&path, &text, before)?;
        self.settled();
        Ok(&self.file.insert(KnownFile { path, text }).path)
    }
}

fn open_text(name: &str, text: &str, folder: &Path) -> Result<Session, OpenProblem> {
    Session::open(text, Arc::new(FolderFiles::below(folder))).map_err(|diagnostics| OpenProblem::Text {
        name: name.to_string(),
        text: text.to_string(),
        diagnostics,
    })
}
