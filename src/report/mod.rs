//! What is shown: rendered entries, records, diagnostics as text.

pub mod diagnostics;
