//! Files: which may be read, how much of them, and how work is written so that nothing is lost.

pub mod data;
pub mod folder;
pub mod journal;
pub mod read;
pub mod save;

pub use folder::{FolderFiles, StandardInput};
