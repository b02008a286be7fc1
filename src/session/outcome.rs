//! What came of an entry, and the record lines it leaves in the file.

use crate::lang::diagnostic::Diagnostic;
use serde::Serialize;

/// The result of evaluating one entry.
#[derive(Clone, PartialEq, Debug)]
pub enum Outcome {
    /// The entry bound a name or set something; what it bound is told in a line for the prompt and is not recorded.
    Declared { told: Vec<String> },
    /// The entry has a result.
    Result(Answer),
    /// The entry is wrong; every diagnostic's span is inside the text of the entry `entry` names (by number), which may stand above.
    Failed(Vec<Report>),
    /// The evaluation was stopped; it can be started again.
    Stopped,
}

/// A diagnostic and the entry whose text it points into.
#[derive(Clone, PartialEq, Debug)]
pub struct Report {
    pub entry_number: usize,
    pub diagnostic: Diagnostic,
    /// Whether it says that an `expect` was evaluated and is not met.
    pub unmet: bool,
}

/// A result as it is recorded and shown.
#[derive(Clone, PartialEq, Debug, Serialize)]
pub struct Answer {
    /// The record lines without their indent: `= 9/2`, `~ 4.78…`, `: …`.
    pub lines: Vec<String>,
    pub kind: AnswerKind,
    /// The value alone, where there is one.
    pub value: Option<String>,
    /// Digits that hold; `None` for exact results and tables.
    pub digits: Option<u32>,
    pub unit: Option<String>,
    /// An exact value with square roots or pi in it to the digits asked, to be shown beside it; not recorded.
    pub decimal: Option<String>,
    /// `exact`, `digits hold`, `fewer digits than asked`, `zero, not proved`, `zero, proved`, `holds`, `equal`, `different`
    pub verdict: String,
    /// Warnings said beside the value (why fewer digits hold, what was left out); not recorded.
    pub notes: Vec<String>,
    /// What is good to know of the value and no warning: where its uncertainty comes from; not recorded.
    pub remarks: Vec<String>,
}

#[derive(Clone, Copy, PartialEq, Eq, Debug, Serialize)]
#[serde(rename_all = "lowercase")]
pub enum AnswerKind {
    Exact,
    Approximate,
    Uncertain,
    Zero,
    Comparison,
    Expectation,
    Formula,
    Paths,
}

impl Outcome {
    /// The lines the file keeps below the entry.
    pub fn record(&self) -> &[String] {
        match self {
            Outcome::Result(answer) => &answer.lines,
            _ => &[],
        }
    }
}
