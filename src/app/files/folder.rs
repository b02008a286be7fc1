//! The data files a session may read: those below its own folder, and no others.

use super::read::{self, ReadProblem};
use crate::session::{DataFiles, FileProblem};
use std::fs;
use std::io;
use std::path::{Component, Path, PathBuf};

/// Most bytes a data file may have.
pub const LONGEST_DATA_FILE: u64 = 64 << 20;

/// The ordinary files below one folder.
pub struct FolderFiles {
    folder: PathBuf,
}

impl FolderFiles {
    pub fn below(folder: impl Into<PathBuf>) -> Self {
        FolderFiles { folder: folder.into() }
    }

    /// The files beside and below a session file.
    pub fn beside(session_file: &Path) -> Self {
        match session_file.parent() {
            Some(folder) if !folder.as_os_str().is_empty() => Self::below(folder),
            _ => Self::below("."),
        }
    }

    /// The place a name stands for, with all links followed, if it is inside.
    fn place(&self, name: &str) -> Result<PathBuf, FileProblem> {
        let outside = || FileProblem::Outside { name: name.to_string() };
        let relative = Path::new(name);
        let inside = |part: Component<'_>| matches!(part, Component::Normal(_) | Component::CurDir);
        if name.is_empty() || name.contains('\0') || !relative.components().all(inside) {
            return Err(outside());
        }
        let folder = fs::canonicalize(&self.folder).map_err(|error| unreadable(name, &error))?;
        let place = fs::canonicalize(folder.join(relative)).map_err(|error| unreadable(name, &error))?;
        if place.starts_with(&folder) { Ok(place) } else { Err(outside()) }
    }
}

fn unreadable(name: &str, error: &io::Error) -> FileProblem {
    match error.kind() {
        io::ErrorKind::NotFound | io::ErrorKind::NotADirectory => FileProblem::Missing { name: name.to_string() },
        _ => FileProblem::Unreadable { name: name.to_string(), reason: error.to_string() },
    }
}

impl DataFiles for FolderFiles {
    fn read(&self, name: &str) -> Result<String, FileProblem> {
        let place = self.place(name)?;
        let named = || name.to_string();
        let size = || fs::metadata(&place).map_or(LONGEST_DATA_FILE + 1, |metadata| metadata.len());
        let reason = |reason: &str| FileProblem::Unreadable { name: named(), reason: reason.to_string() };
        read::ordinary_file(&place, LONGEST_DATA_FILE).and_then(|bytes| read::text(bytes, name)).map_err(|problem| {
            match problem {
                ReadProblem::Missing(_) => FileProblem::Missing { name: named() },
                ReadProblem::Folder(_) => FileProblem::Folder { name: named() },
                ReadProblem::TooLong { limit, .. } => FileProblem::TooLarge { name: named(), size: size(), limit },
                ReadProblem::NotOrdinary(_) => reason("it is not an ordinary file"),
                ReadProblem::NotText { line, byte, .. } => {
                    reason(&format!("byte {byte:#04x} in line {line} is not UTF-8 text"))
                }
                ReadProblem::Nul { line, .. } => reason(&format!("there is a NUL byte in line {line}")),
                ReadProblem::Unreadable { reason: why, .. } => reason(&why),
            }
        })
    }
}

/// A session from standard input has no folder, so it has no data files either.
pub struct StandardInput;

impl DataFiles for StandardInput {
    fn read(&self, name: &str) -> Result<String, FileProblem> {
        Err(FileProblem::Unreadable {
            name: name.to_string(),
            reason: "a session from standard input has no folder to look in; save it as a file beside its data".into(),
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn folder() -> (tempfile::TempDir, FolderFiles) {
        let outer = tempfile::tempdir().unwrap();
        fs::write(outer.path().join("secret"), "outside").unwrap();
        let inner = outer.path().join("inner");
        fs::create_dir_all(inner.join("data")).unwrap();
        fs::write(inner.join("data/h.mtx"), "inside").unwrap();
        let files = FolderFiles::below(&inner);
        (outer, files)
    }

    #[test]
    fn files_below_the_folder_are_read() {
        let (_outer, files) = folder();
        assert_eq!(files.read("data/h.mtx"), Ok("inside".into()));
        assert_eq!(files.read("./data/h.mtx"), Ok("inside".into()));
        assert!(matches!(files.read("data/v.mtx"), Err(FileProblem::Missing { .. })));
        assert!(matches!(files.read("data"), Err(FileProblem::Folder { .. })));
    }

    #[test]
    fn nothing_else_is_read() {
        let (outer, files) = folder();
        let absolute = outer.path().join("secret").display().to_string();
        for name in ["../secret", "data/../../secret", &absolute, "", "h\0.mtx", "/etc/passwd"] {
            assert!(matches!(files.read(name), Err(FileProblem::Outside { .. })), "{name:?}");
        }
    }

    #[cfg(unix)]
    #[test]
    fn links_are_followed_only_inside() {
        let (outer, files) = folder();
        let inner = outer.path().join("inner");
        std::os::unix::fs::symlink(outer.path().join("secret"), inner.join("out")).unwrap();
        std::os::unix::fs::symlink(inner.join("data/h.mtx"), inner.join("in")).unwrap();
        std::os::unix::fs::symlink(inner.join("loop"), inner.join("loop")).unwrap();
        assert!(matches!(files.read("out"), Err(FileProblem::Outside { .. })));
        assert_eq!(files.read("in"), Ok("inside".into()));
        assert!(matches!(files.read("loop"), Err(FileProblem::Unreadable { .. })));
    }

    #[test]
    fn what_is_too_large_or_no_text_is_told() {
        let (outer, files) = folder();
        let inner = outer.path().join("inner");
        fs::File::create(inner.join("big")).unwrap().set_len(LONGEST_DATA_FILE + 7).unwrap();
        fs::write(inner.join("bytes"), [b'a', b'\n', 0xff]).unwrap();
        let told = |name: &str| files.read(name).unwrap_err().to_string();
        assert_eq!(told("big"), "\"big\" has 67108871 bytes, more than the 67108864 a data file may have");
        assert_eq!(told("bytes"), "\"bytes\" cannot be read: byte 0xff in line 2 is not UTF-8 text");
    }
}
