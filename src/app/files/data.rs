//! The person's own folder for what the program keeps between sessions: the history of the prompt and unsaved work.

use etcetera::{BaseStrategy, choose_base_strategy};
use std::path::PathBuf;

/// Names another folder, for tests and for machines whose home folder cannot be written.
const VARIABLE: &str = "KETWORK_DATA";

/// The folder, whether or not it exists; `None` when the person has no home.
pub fn data_folder() -> Option<PathBuf> {
    match std::env::var_os(VARIABLE) {
        Some(folder) if !folder.is_empty() => Some(PathBuf::from(folder)),
        _ => choose_base_strategy().ok().map(|base| base.data_dir().join("ketwork")),
    }
}
