//! Reads session files and standard input with a limit, and refuses what is not text.

use std::fs::{self, File};
use std::io::{self, Read};
use std::path::{Path, PathBuf};

/// Most bytes a session may have.
pub const LONGEST_SESSION: u64 = 16 << 20;

/// Why a file was not read.
#[derive(Debug, thiserror::Error)]
pub enum ReadProblem {
    #[error("there is no file {}", .0.display())]
    Missing(PathBuf),
    #[error("{} is a folder, not a session file", .0.display())]
    Folder(PathBuf),
    #[error("{} is not an ordinary file; a session from somewhere else is read from standard input, with `-` for the file", .0.display())]
    NotOrdinary(PathBuf),
    #[error("{name} is longer than the {} MiB a session may have", limit >> 20)]
    TooLong { name: String, limit: u64 },
    #[error("{name} is not text: byte {byte:#04x} in line {line} is not UTF-8")]
    NotText { name: String, line: usize, byte: u8 },
    #[error("{name} is not text: there is a NUL byte in line {line}")]
    Nul { name: String, line: usize },
    #[error("{name} cannot be read: {reason}")]
    Unreadable { name: String, reason: String },
}

/// Reads a session file.
///
/// *Errors*: what is no ordinary file is not opened at all, so that nothing can make the program wait.
/// *Cost*: at most the limit and one byte are read.
pub fn session_file(path: &Path) -> Result<String, ReadProblem> {
    let bytes = ordinary_file(path, LONGEST_SESSION)?;
    text(bytes, &path.display().to_string())
}

/// Reads a session from standard input.
pub fn standard_input() -> Result<String, ReadProblem> {
    let name = "standard input";
    text(bounded(io::stdin().lock(), name, LONGEST_SESSION)?, name)
}

/// The bytes of an ordinary file, up to a limit.
pub fn ordinary_file(path: &Path, limit: u64) -> Result<Vec<u8>, ReadProblem> {
    let name = path.display().to_string();
    let unreadable = |error: io::Error| match error.kind() {
        io::ErrorKind::NotFound => ReadProblem::Missing(path.to_path_buf()),
        _ => ReadProblem::Unreadable { name: name.clone(), reason: error.to_string() },
    };
    // Looked at before it is opened: opening a pipe waits for its writer.
    let metadata = fs::metadata(path).map_err(unreadable)?;
    if metadata.is_dir() {
        return Err(ReadProblem::Folder(path.to_path_buf()));
    }
    if !metadata.is_file() {
        return Err(ReadProblem::NotOrdinary(path.to_path_buf()));
    }
    if metadata.len() > limit {
        return Err(ReadProblem::TooLong { name, limit });
    }
    let file = File::open(path).map_err(unreadable)?;
    bounded(file, &name, limit)
}

fn bounded(source: impl Read, name: &str, limit: u64) -> Result<Vec<u8>, ReadProblem> {
    let mut bytes = Vec::new();
    source
        .take(limit + 1)
        .read_to_end(&mut bytes)
        .map_err(|error| ReadProblem::Unreadable { name: name.to_string(), reason: error.to_string() })?;
    if bytes.len() as u64 > limit {
        return Err(ReadProblem::TooLong { name: name.to_string(), limit });
    }
    Ok(bytes)
}

/// Takes bytes as text: UTF-8 without NUL; a byte-order mark at the beginning is dropped.
pub fn text(bytes: Vec<u8>, name: &str) -> Result<String, ReadProblem> {
    let line_of = |at: usize, bytes: &[u8]| 1 + bytes[..at].iter().filter(|byte| **byte == b'\n').count();
    if let Some(at) = bytes.iter().position(|byte| *byte == 0) {
        return Err(ReadProblem::Nul { name: name.to_string(), line: line_of(at, &bytes) });
    }
    let text = String::from_utf8(bytes).map_err(|error| {
        let at = error.utf8_error().valid_up_to();
        let bytes = error.as_bytes();
        let byte = bytes.get(at).copied().unwrap_or_default();
        ReadProblem::NotText { name: name.to_string(), line: line_of(at, bytes), byte }
    })?;
    Ok(match text.strip_prefix('\u{feff}') {
        Some(rest) => rest.to_string(),
        None => text,
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_is_not_text_is_told_with_its_line() {
        let told = |bytes: &[u8]| text(bytes.to_vec(), "f").map_err(|problem| problem.to_string());
        assert_eq!(told(b"a\nb\0"), Err("f is not text: there is a NUL byte in line 2".into()));
        assert_eq!(told(b"\xff"), Err("f is not text: byte 0xff in line 1 is not UTF-8".into()));
        assert_eq!(told("\u{feff}2 + 3".as_bytes()), Ok("2 + 3".into()));
        assert_eq!(told("⟨g|".as_bytes()), Ok("⟨g|".into()));
    }

    #[test]
    fn folders_and_long_files_are_refused() {
        let folder = tempfile::tempdir().unwrap();
        assert!(matches!(session_file(folder.path()), Err(ReadProblem::Folder(_))));
        let long = folder.path().join("long");
        File::create(&long).unwrap().set_len(LONGEST_SESSION + 1).unwrap();
        assert!(matches!(session_file(&long), Err(ReadProblem::TooLong { .. })));
        assert!(matches!(session_file(&folder.path().join("none")), Err(ReadProblem::Missing(_))));
    }

    #[test]
    fn an_endless_stream_is_read_to_the_limit_only() {
        assert!(matches!(bounded(io::repeat(b'x'), "f", 1000), Err(ReadProblem::TooLong { .. })));
        assert_eq!(bounded(&b"abc"[..], "f", 3).unwrap(), b"abc");
    }
}
