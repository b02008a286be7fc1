//! The door through which a session reads data files; who opens it decides what lies behind.

/// Reads files named by a session. Implementations keep to one folder and to a size.
pub trait DataFiles: Send + Sync {
    /// The text of a file, named relative to the session's folder.
    fn read(&self, name: &str) -> Result<String, FileProblem>;
}

/// Why a data file was not read.
#[derive(Clone, PartialEq, Eq, Debug, thiserror::Error)]
pub enum FileProblem {
    #[error("the file \"{name}\" is not inside the session's folder")]
    Outside { name: String },
    #[error("there is no file \"{name}\" in the session's folder")]
    Missing { name: String },
    #[error("\"{name}\" is a folder, not a file")]
    Folder { name: String },
    #[error("\"{name}\" has {size} bytes, more than the {limit} a data file may have")]
    TooLarge { name: String, size: u64, limit: u64 },
    #[error("\"{name}\" cannot be read: {reason}")]
    Unreadable { name: String, reason: String },
}

/// No files at all: for sessions from standard input, and tests.
pub struct NoFiles;

impl DataFiles for NoFiles {
    fn read(&self, name: &str) -> Result<String, FileProblem> {
        Err(FileProblem::Missing { name: name.to_string() })
    }
}
