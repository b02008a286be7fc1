//! Files: which may be read, how much of them, and how a session is written so that nothing is lost.

pub mod folder;
pub mod read;
pub mod save;

pub use folder::{FolderFiles, StandardInput};
