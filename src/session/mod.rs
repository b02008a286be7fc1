//! Entries, names, the dependency graph, records, replay, the saved form.
//!
//! A session has no hidden state: what an entry gives depends only on the text of the entries above it. Binding a name again at the prompt revises
//! the entry that bound it, and every entry that depends on it is evaluated again.

mod compare;
mod declare;
mod diagnose;
mod evaluate;
pub mod files;
mod notebook;
pub mod outcome;
mod paths;
mod quantities;
mod replay;
mod scope;
mod words;

pub use files::{DataFiles, FileProblem, NoFiles};
pub use notebook::{Entered, EntryView, Refusal, Session};
pub use outcome::{Answer, AnswerKind, Outcome, Report};
pub use replay::{ReplayEntry, ReplayReport, ReplayVerdict};
