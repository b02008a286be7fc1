//! The journal of unsaved work: every accepted entry is on the disk before it is evaluated.
//!
//! A journal exists exactly while there is unsaved work. Its process holds a lock on it; a journal that nobody holds was left behind by a crash.

use super::read::{self, ReadProblem};
use super::save::sync_folder;
use serde::{Deserialize, Serialize};
use std::fs::{self, File, TryLockError};
use std::io::{self, Write};
use std::path::{Path, PathBuf};
use std::time::{SystemTime, UNIX_EPOCH};

const ENDING: &str = "unsaved";
/// Most bytes read back of a journal: a session of the largest size several times over.
const LONGEST_JOURNAL: u64 = 128 << 20;

/// Which session a journal belongs to: its first line.
#[derive(Clone, PartialEq, Eq, Debug, Serialize, Deserialize)]
pub struct Owner {
    /// The version of the journal.
    pub journal: u32,
    /// The session's file, where it has one.
    pub file: Option<PathBuf>,
    /// What was read from or written to that file last.
    pub known: Option<String>,
    /// Where the session looks for data files.
    pub folder: PathBuf,
}

/// Something that happened, a line each.
#[derive(Clone, PartialEq, Eq, Debug, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum Event {
    /// The whole text of the session, in place of everything before.
    Whole(String),
    /// An entry at the end.
    Entry(String),
    /// A comment line at the end.
    Prose(String),
    /// The entry before was not accepted after all.
    Refused,
}

/// What unsaved work must survive.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Safety {
    /// The end of the program: enough for input that comes from a pipe, at full speed.
    Crash,
    /// The end of the machine as well.
    PowerLoss,
}

/// Writes down unsaved work.
pub struct Journal {
    folder: Option<PathBuf>,
    safety: Safety,
    open: Option<(PathBuf, File)>,
}

impl Journal {
    /// A journal in this folder, which need not exist; without a folder nothing is written.
    pub fn new(folder: Option<PathBuf>, safety: Safety) -> Self {
        Journal { folder, safety, open: None }
    }

    /// Adds an event; the journal begins with the owner and the whole text as it was before.
    ///
    /// *Errors*: the disk is full or the folder cannot be written.
    pub fn note(&mut self, owner: &Owner, whole: impl FnOnce() -> String, event: &Event) -> io::Result<()> {
        if self.folder.is_none() {
            return Ok(());
        }
        if self.open.is_none() {
            self.restart(owner, whole())?;
        }
        let Some((_, file)) = &mut self.open else { return Ok(()) };
        file.write_all(line(event)?.as_bytes())?;
        match self.safety {
            Safety::PowerLoss => file.sync_data(),
            Safety::Crash => Ok(()),
        }
    }

    /// Begins again with the whole text, in one step.
    pub fn restart(&mut self, owner: &Owner, whole: String) -> io::Result<()> {
        let Some(folder) = &self.folder else { return Ok(()) };
        fs::create_dir_all(folder)?;
        let place = match &self.open {
            Some((place, _)) => place.clone(),
            None => folder.join(new_name()),
        };
        // Locked before it has its name, so that nobody takes it for one left behind.
        let mut new = tempfile::Builder::new().prefix(".ketwork-").suffix(".new").tempfile_in(folder)?;
        new.as_file().try_lock().map_err(io::Error::from)?;
        new.write_all(line(owner)?.as_bytes())?;
        new.write_all(line(&Event::Whole(whole))?.as_bytes())?;
        if self.safety == Safety::PowerLoss {
            new.as_file().sync_all()?;
        }
        let file = new.persist(&place).map_err(|error| error.error)?;
        sync_folder(folder);
        self.open = Some((place, file));
        Ok(())
    }

    /// The work is saved, or given up on purpose.
    pub fn clear(&mut self) {
        if let Some((place, _file)) = self.open.take() {
            let _ = fs::remove_file(place);
        }
    }
}

/// A name nobody else has: the time and the process.
fn new_name() -> String {
    let since = SystemTime::now().duration_since(UNIX_EPOCH).unwrap_or_default();
    format!("{:020}-{}.{ENDING}", since.as_nanos(), std::process::id())
}

fn line<T: Serialize>(value: &T) -> io::Result<String> {
    let mut line = serde_json::to_string(value)?;
    line.push('\n');
    Ok(line)
}

/// Work that a process left unsaved when it ended. It is locked, so that only one prompt can take it back.
pub struct Leftover {
    place: PathBuf,
    _lock: File,
    pub owner: Owner,
    /// The session as it was to be saved.
    pub text: String,
    pub changed: SystemTime,
}

impl Leftover {
    /// Deletes it.
    pub fn delete(self) -> io::Result<()> {
        fs::remove_file(self.place)
    }
}

/// Finds what was left behind, the latest first.
pub fn left_behind(folder: Option<&Path>) -> Vec<Leftover> {
    let Some(entries) = folder.and_then(|folder| fs::read_dir(folder).ok()) else { return Vec::new() };
    let mut found: Vec<Leftover> = entries
        .filter_map(Result::ok)
        .map(|entry| entry.path())
        .filter(|place| place.extension().is_some_and(|ending| ending == ENDING))
        .filter_map(|place| leftover(place).ok().flatten())
        .collect();
    found.sort_by(|a, b| b.changed.cmp(&a.changed).then_with(|| b.place.cmp(&a.place)));
    found
}

/// Takes hold of a journal, unless its process lives.
fn leftover(place: PathBuf) -> io::Result<Option<Leftover>> {
    let lock = File::open(&place)?;
    match lock.try_lock() {
        Ok(()) => {}
        Err(TryLockError::WouldBlock) => return Ok(None),
        Err(TryLockError::Error(error)) => return Err(error),
    }
    // Its process may have deleted it between the two steps; then this name is free or another file's.
    let bytes = match read::ordinary_file(&place, LONGEST_JOURNAL) {
        Ok(bytes) => bytes,
        Err(ReadProblem::Missing(_)) => return Ok(None),
        Err(problem) => return Err(io::Error::other(problem.to_string())),
    };
    let changed = lock.metadata()?.modified()?;
    let Some((owner, text)) = read_back(&bytes) else { return Ok(None) };
    Ok(Some(Leftover { place, _lock: lock, owner, text, changed }))
}

/// Puts the session together again. A last line that a power loss cut short is left out.
fn read_back(bytes: &[u8]) -> Option<(Owner, String)> {
    let mut lines = bytes.split(|byte| *byte == b'\n');
    let owner: Owner = serde_json::from_slice(lines.next()?).ok()?;
    let mut whole = None;
    let mut added: Vec<String> = Vec::new();
    for event in lines.map_while(|line| serde_json::from_slice::<Event>(line).ok()) {
        match event {
            Event::Whole(text) => {
                whole = Some(text);
                added.clear();
            }
            Event::Entry(text) | Event::Prose(text) => added.push(text),
            Event::Refused => {
                added.pop();
            }
        }
    }
    let mut text = whole?;
    for piece in added {
        if !text.ends_with('\n') {
            text.push('\n');
        }
        text.push_str(&piece);
        text.push('\n');
    }
    Some((owner, text))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn owner() -> Owner {
        Owner { journal: 1, file: None, known: None, folder: "/somewhere".into() }
    }

    fn entry(text: &str) -> Event {
        Event::Entry(text.into())
    }

    #[test]
    fn what_is_held_is_not_left_behind_and_what_is_let_go_is() {
        let folder = tempfile::tempdir().unwrap();
        let at = Some(folder.path());
        let mut journal = Journal::new(at.map(Path::to_path_buf), Safety::PowerLoss);
        assert!(left_behind(at).is_empty());
        journal.note(&owner(), || "head\n".into(), &entry("2 + 3")).unwrap();
        journal.note(&owner(), || "wrong".into(), &entry("4 +\n  5")).unwrap();
        journal.note(&owner(), || "wrong".into(), &Event::Refused).unwrap();
        journal.note(&owner(), || "wrong".into(), &Event::Prose("# why".into())).unwrap();
        assert!(left_behind(at).is_empty(), "its process lives");
        drop(journal);
        let mut left = left_behind(at);
        assert_eq!(left.len(), 1);
        assert!(left_behind(at).is_empty(), "somebody has taken hold of it");
        let leftover = left.remove(0);
        assert_eq!((leftover.text.as_str(), &leftover.owner), ("head\n2 + 3\n# why\n", &owner()));
        leftover.delete().unwrap();
        assert_eq!(fs::read_dir(folder.path()).unwrap().count(), 0);
    }

    #[test]
    fn saved_work_leaves_nothing() {
        let folder = tempfile::tempdir().unwrap();
        let mut journal = Journal::new(Some(folder.path().join("deep/er")), Safety::Crash);
        journal.note(&owner(), String::new, &entry("1")).unwrap();
        journal.restart(&owner(), "all".into()).unwrap();
        journal.clear();
        assert_eq!(fs::read_dir(folder.path().join("deep/er")).unwrap().count(), 0);
    }

    #[test]
    fn a_journal_cut_short_gives_what_is_whole() {
        let text = format!(
            "{}{}{}",
            line(&owner()).unwrap(),
            line(&Event::Whole("head".into())).unwrap(),
            line(&entry("1")).unwrap()
        );
        assert_eq!(read_back(text.as_bytes()), Some((owner(), "head\n1\n".into())));
        assert_eq!(read_back(&text.as_bytes()[..text.len() - 4]), Some((owner(), "head".into())));
        for length in 0..text.len() {
            let _ = read_back(&text.as_bytes()[..length]);
        }
        assert_eq!(read_back(b""), None);
        assert_eq!(read_back(b"\xff\n\xff"), None);
    }
}
