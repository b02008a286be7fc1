//! Writes a session so that there is always either the old file or the new one, whole.

use super::read::{self, ReadProblem};
use std::fs::{self, File};
use std::io::{self, Write};
use std::path::{Path, PathBuf};

/// Why a session was not saved. The file is as it was.
#[derive(Debug, thiserror::Error)]
pub enum SaveProblem {
    #[error("{} has been changed by somebody else since it was opened here", .0.display())]
    Changed(PathBuf),
    #[error("there is a file {} already", .0.display())]
    Exists(PathBuf),
    #[error("{} is a folder", .0.display())]
    Folder(PathBuf),
    #[error("there is no folder {}", .0.display())]
    NoFolder(PathBuf),
    #[error("{} cannot be written: {reason}; what was there before is untouched", .file.display())]
    Unwritable { file: PathBuf, reason: String },
}

/// What may stand at the place before the session is written over it.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Before<'t> {
    /// Nothing.
    Nothing,
    /// What was read or written here last.
    Known(&'t str),
    /// Anything: the person has said so.
    Anything,
}

/// Replaces the file by `text` in one step.
///
/// *Errors*: when the disk is full, the folder cannot be written or the file is not what it was, the old file stays whole.
pub fn save(path: &Path, text: &str, before: Before<'_>) -> Result<(), SaveProblem> {
    // A link keeps standing; what it points at is replaced.
    let place = fs::canonicalize(path).unwrap_or_else(|_| path.to_path_buf());
    check(path, &place, before)?;
    let folder = match place.parent() {
        Some(folder) if !folder.as_os_str().is_empty() => folder,
        _ => Path::new("."),
    };
    if !folder.is_dir() {
        return Err(SaveProblem::NoFolder(folder.to_path_buf()));
    }
    replace(&place, folder, text)
        .map_err(|error| SaveProblem::Unwritable { file: path.to_path_buf(), reason: error.to_string() })
}

fn check(path: &Path, place: &Path, before: Before<'_>) -> Result<(), SaveProblem> {
    let Ok(metadata) = fs::metadata(place) else { return Ok(()) };
    if metadata.is_dir() {
        return Err(SaveProblem::Folder(path.to_path_buf()));
    }
    match before {
        Before::Anything => Ok(()),
        Before::Nothing => Err(SaveProblem::Exists(path.to_path_buf())),
        Before::Known(known) => match read::session_file(place) {
            Ok(text) if text == known => Ok(()),
            Err(ReadProblem::Missing(_)) => Ok(()),
            _ => Err(SaveProblem::Changed(path.to_path_buf())),
        },
    }
}

fn replace(place: &Path, folder: &Path, text: &str) -> io::Result<()> {
    let mut builder = tempfile::Builder::new();
    builder.prefix(".ketwork-").suffix(".saving");
    #[cfg(unix)]
    {
        use std::os::unix::fs::PermissionsExt;
        // What a new file gets from the person's own mask, not the private mode of temporary files.
        builder.permissions(fs::Permissions::from_mode(0o666));
    }
    let mut file = builder.tempfile_in(folder)?;
    file.write_all(text.as_bytes())?;
    if let Ok(metadata) = fs::metadata(place) {
        file.as_file().set_permissions(metadata.permissions())?;
    }
    file.as_file().sync_all()?;
    file.persist(place).map_err(|error| error.error)?;
    sync_folder(folder);
    Ok(())
}

/// Makes the new name last through a power loss, where the file system can do that.
pub fn sync_folder(folder: &Path) {
    if let Ok(folder) = File::open(folder) {
        let _ = folder.sync_all();
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_session_is_written_and_written_again() {
        let folder = tempfile::tempdir().unwrap();
        let file = folder.path().join("a.ketwork");
        save(&file, "one", Before::Nothing).unwrap();
        save(&file, "two", Before::Known("one")).unwrap();
        assert_eq!(fs::read_to_string(&file).unwrap(), "two");
        assert_eq!(fs::read_dir(folder.path()).unwrap().count(), 1);
    }

    #[test]
    fn what_somebody_else_wrote_is_not_lost() {
        let folder = tempfile::tempdir().unwrap();
        let file = folder.path().join("a.ketwork");
        fs::write(&file, "theirs").unwrap();
        assert!(matches!(save(&file, "mine", Before::Known("old")), Err(SaveProblem::Changed(_))));
        assert!(matches!(save(&file, "mine", Before::Nothing), Err(SaveProblem::Exists(_))));
        assert_eq!(fs::read_to_string(&file).unwrap(), "theirs");
        save(&file, "mine", Before::Anything).unwrap();
        assert_eq!(fs::read_to_string(&file).unwrap(), "mine");
    }

    #[test]
    fn folders_are_neither_replaced_nor_made() {
        let folder = tempfile::tempdir().unwrap();
        assert!(matches!(save(folder.path(), "x", Before::Anything), Err(SaveProblem::Folder(_))));
        let deep = folder.path().join("none/a.ketwork");
        assert!(matches!(save(&deep, "x", Before::Nothing), Err(SaveProblem::NoFolder(_))));
    }

    #[cfg(unix)]
    #[test]
    fn permissions_and_links_are_kept() {
        use std::os::unix::fs::PermissionsExt;
        let folder = tempfile::tempdir().unwrap();
        let file = folder.path().join("a.ketwork");
        let link = folder.path().join("link.ketwork");
        fs::write(&file, "one").unwrap();
        fs::set_permissions(&file, fs::Permissions::from_mode(0o640)).unwrap();
        std::os::unix::fs::symlink(&file, &link).unwrap();
        save(&link, "two", Before::Known("one")).unwrap();
        assert!(fs::symlink_metadata(&link).unwrap().is_symlink());
        assert_eq!(fs::read_to_string(&file).unwrap(), "two");
        assert_eq!(fs::metadata(&file).unwrap().permissions().mode() & 0o777, 0o640);
    }
}
