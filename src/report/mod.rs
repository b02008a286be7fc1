//! What is shown: rendered entries, records, diagnostics as text.

pub mod diagnostics;
pub mod entry;
pub mod help;
pub mod json;
pub mod paint;
pub mod reference;
pub mod replay;
