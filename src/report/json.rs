//! Entries as JSON objects, one a line.

use crate::lang::diagnostic::{Diagnostic, Severity};
use crate::session::{Answer, EntryView, Outcome};
use serde::Serialize;

/// The version of the objects; it rises when a field changes its meaning or goes.
pub const VERSION: u32 = 1;

/// Where a diagnostic points, in the file: lines and columns count from 1, columns in characters.
#[derive(Clone, Copy, PartialEq, Eq, Debug, Serialize)]
pub struct Position {
    pub line: usize,
    pub column: usize,
}

#[derive(Serialize)]
struct EntryObject<'e> {
    version: u32,
    number: usize,
    line: usize,
    text: &'e str,
    /// What the entry is: `declaration`, `failed`, `stopped`, or the kind of its answer.
    kind: Kind,
    value: Option<&'e str>,
    digits: Option<u32>,
    unit: Option<&'e str>,
    /// An exact value with square roots or pi in it as a decimal.
    decimal: Option<&'e str>,
    verdict: &'e str,
    record: &'e [String],
    notes: Vec<&'e String>,
    diagnostics: Vec<DiagnosticObject<'e>>,
}

#[derive(Serialize)]
#[serde(untagged)]
enum Kind {
    Answer(crate::session::AnswerKind),
    Other(&'static str),
}

#[derive(Serialize)]
struct DiagnosticObject<'e> {
    severity: Severity,
    /// The entry whose text it points into.
    entry: usize,
    #[serde(flatten)]
    position: Position,
    message: &'e str,
    label: &'e str,
    help: Option<&'e str>,
    notes: &'e [String],
}

/// The object of one entry, with its line end. `place` finds the place in the file of a byte of an entry's text.
pub fn entry(view: &EntryView<'_>, place: &dyn Fn(usize, usize) -> Position) -> String {
    let answer = match view.outcome {
        Some(Outcome::Result(answer)) => Some(answer),
        _ => None,
    };
    let (kind, verdict) = match view.outcome {
        Some(Outcome::Result(Answer { kind, verdict, .. })) => (Kind::Answer(*kind), verdict.as_str()),
        Some(Outcome::Declared { .. }) => (Kind::Other("declaration"), "declared"),
        Some(Outcome::Failed(_)) => (Kind::Other("failed"), "failed"),
        Some(Outcome::Stopped) | None => (Kind::Other("stopped"), "stopped"),
    };
    let notes = match view.outcome {
        Some(Outcome::Result(answer)) => answer.remarks.iter().chain(&answer.notes).collect(),
        Some(Outcome::Declared { told }) => told.iter().collect(),
        _ => Vec::new(),
    };
    let diagnostics = match view.outcome {
        Some(Outcome::Failed(reports)) => {
            reports.iter().map(|report| diagnostic(report.entry_number, &report.diagnostic, place)).collect()
        }
        _ => Vec::new(),
    };
    let object = EntryObject {
        version: VERSION,
        number: view.number,
        line: place(view.number, 0).line,
        text: view.text,
        kind,
        value: answer.and_then(|a| a.value.as_deref()),
        digits: answer.and_then(|a| a.digits),
        unit: answer.and_then(|a| a.unit.as_deref()),
        decimal: answer.and_then(|a| a.decimal.as_deref()),
        verdict,
        record: view.outcome.map_or(&[], Outcome::record),
        notes,
        diagnostics,
    };
    // Writing plain fields of a structure into memory has no way to fail.
    let mut line = serde_json::to_string(&object).unwrap_or_default();
    line.push('\n');
    line
}

fn diagnostic<'e>(
    entry: usize,
    diagnostic: &'e Diagnostic,
    place: &dyn Fn(usize, usize) -> Position,
) -> DiagnosticObject<'e> {
    DiagnosticObject {
        severity: diagnostic.severity,
        entry,
        position: place(entry, diagnostic.span.start),
        message: &diagnostic.message,
        label: &diagnostic.label,
        help: diagnostic.help.as_deref(),
        notes: &diagnostic.notes,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::lang::tree::Span;
    use crate::session::{AnswerKind, Report};

    fn view<'v>(text: &'v str, outcome: &'v Outcome) -> EntryView<'v> {
        EntryView {
            number: 2,
            text,
            outcome: Some(outcome),
            recorded: Vec::new(),
            prose_before: Vec::new(),
            comment: None,
            span: Span::default(),
        }
    }

    fn place(_: usize, at: usize) -> Position {
        Position { line: 5, column: at + 1 }
    }

    #[test]
    fn a_result_has_all_its_fields() {
        let outcome = Outcome::Result(Answer {
            lines: vec!["~ 0.33".into()],
            kind: AnswerKind::Approximate,
            value: Some("0.33".into()),
            digits: Some(2),
            unit: None,
            decimal: None,
            verdict: "digits hold".into(),
            notes: Vec::new(),
            remarks: Vec::new(),
        });
        let wanted = "{\"version\":1,\"number\":2,\"line\":5,\"text\":\"sqrt(2) \\\"\",\"kind\":\"approximate\",\"value\":\"0.33\",\
                      \"digits\":2,\"unit\":null,\"decimal\":null,\"verdict\":\"digits hold\",\"record\":[\"~ 0.33\"],\"notes\":[],\"diagnostics\":[]}\n";
        assert_eq!(entry(&view("sqrt(2) \"", &outcome), &place), wanted);
    }

    #[test]
    fn a_failed_entry_carries_its_diagnostics() {
        let diagnostic = Diagnostic::new(Span::new(3, 4), "no state `g`").with_help("declare it");
        let outcome = Outcome::Failed(vec![Report { entry_number: 2, diagnostic, unmet: false }]);
        let line = entry(&view("E(g)", &outcome), &place);
        let wanted = "\"diagnostics\":[{\"severity\":\"error\",\"entry\":2,\"line\":5,\"column\":4,\"message\":\"no state `g`\",\
                      \"label\":\"\",\"help\":\"declare it\",\"notes\":[]}]}\n";
        assert!(line.ends_with(wanted), "{line}");
        assert!(line.contains("\"kind\":\"failed\",\"value\":null"), "{line}");
    }
}
