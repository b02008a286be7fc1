//! A diagnostic as data: where, what is wrong, what to type instead. Drawing it is `report::diagnostics`' business.

use serde::Serialize;

use super::tree::Span;

/// Whether a diagnostic stops an entry or only stands beside its value.
#[derive(Clone, Copy, PartialEq, Eq, Debug, Serialize)]
#[serde(rename_all = "lowercase")]
pub enum Severity {
    Error,
    Warning,
}

/// One thing to tell the person who wrote the text.
///
/// Prose is lower case and speaks of states, operators and brackets. Spans are bytes of the text the diagnostic was made for.
#[derive(Clone, PartialEq, Eq, Debug, Serialize)]
pub struct Diagnostic {
    pub severity: Severity,
    pub span: Span,
    /// What is wrong, both what was got and what was wanted.
    pub message: String,
    /// What to say at the underlined place; may be empty.
    pub label: String,
    /// What to type instead.
    pub help: Option<String>,
    pub notes: Vec<String>,
    /// Other places that belong to the story (`the ( opened here`).
    pub related: Vec<(Span, String)>,
}

impl Diagnostic {
    pub fn new(span: Span, message: impl Into<String>) -> Self {
        Diagnostic {
            severity: Severity::Error,
            span,
            message: message.into(),
            label: String::new(),
            help: None,
            notes: Vec::new(),
            related: Vec::new(),
        }
    }

    pub fn warning(span: Span, message: impl Into<String>) -> Self {
        Diagnostic { severity: Severity::Warning, ..Diagnostic::new(span, message) }
    }

    #[must_use]
    pub fn with_label(mut self, label: impl Into<String>) -> Self {
        self.label = label.into();
        self
    }

    #[must_use]
    pub fn with_help(mut self, help: impl Into<String>) -> Self {
        self.help = Some(help.into());
        self
    }

    #[must_use]
    pub fn with_note(mut self, note: impl Into<String>) -> Self {
        self.notes.push(note.into());
        self
    }

    #[must_use]
    pub fn with_related(mut self, span: Span, label: impl Into<String>) -> Self {
        self.related.push((span, label.into()));
        self
    }

    /// Moves all spans by `by` bytes: from the text of an entry to the text of its file.
    #[must_use]
    pub fn shifted(mut self, by: usize) -> Self {
        let shift = |span: Span| Span::new(span.start.saturating_add(by), span.end.saturating_add(by));
        self.span = shift(self.span);
        for (span, _) in &mut self.related {
            *span = shift(*span);
        }
        self
    }
}

/// Returns the candidate most like `word`, when one is near enough to be a slip of the finger.
///
/// Capitals are told apart only in ranking; the first of equally near candidates wins, so the order of candidates is the order of preference.
pub fn did_you_mean<'a>(word: &str, candidates: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    // Distances cost length times length; no name anyone means is longer than this.
    const LONGEST: usize = 60;
    let length = word.chars().count();
    if length == 0 || length > LONGEST {
        return None;
    }
    let lower = word.to_lowercase();
    let mut best: Option<(usize, &str)> = None;
    for candidate in candidates {
        let reach = candidate.chars().count();
        if candidate == word || reach > LONGEST {
            continue;
        }
        let allowed = match length.min(reach) {
            0..=2 => 0,
            3..=4 => 1,
            5..=8 => 2,
            _ => 3,
        };
        let small_letters = candidate.to_lowercase();
        let distance = strsim::osa_distance(&lower, &small_letters);
        // One rank below an exact hit, so that `D_Z` prefers `D_z` over `P_z`.
        let rank = 2 * distance + usize::from(small_letters != candidate && lower == word);
        if distance <= allowed && best.is_none_or(|(other, _)| rank < other) {
            best = Some((rank, candidate));
        }
    }
    best.map(|(_, candidate)| candidate)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn nearest_word_is_offered_and_a_far_one_is_not() {
        let words = ["operator", "resolvent", "state", "digits", "D_z", "P_z"];
        assert_eq!(did_you_mean("operater", words), Some("operator"));
        assert_eq!(did_you_mean("sate", words), Some("state"));
        assert_eq!(did_you_mean("D_Z", words), Some("D_z"));
        assert_eq!(did_you_mean("alpha", words), None);
        assert_eq!(did_you_mean("q", words), None);
        assert_eq!(did_you_mean(&"x".repeat(100_000), words), None);
    }

    #[test]
    fn shifting_moves_every_span() {
        let moved = Diagnostic::new(Span::new(1, 2), "m").with_related(Span::new(0, 1), "r").shifted(10);
        assert_eq!(moved.span, Span::new(11, 12));
        assert_eq!(moved.related[0].0, Span::new(10, 11));
    }
}
