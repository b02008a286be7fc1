//! Draws a diagnostic: the line it is about, the place underlined, and what to write instead.

use std::ops::Range;

use annotate_snippets::{AnnotationKind, Element, Level, Origin, Padding, Renderer, Snippet};

use crate::lang::diagnostic::{Diagnostic, Severity};
use crate::lang::tree::Span;

/// Lines longer than this are shown around the underlined place only, in characters.
const WIDEST_LINE: usize = 160;
/// How much of a long line is shown before the underlined place.
const LEAD: usize = 60;
/// A span over more lines than this is drawn at its first line.
const MOST_LINES: usize = 6;
/// A related place farther away than this many lines is told in a note.
const FARTHEST_LINES: usize = 20;

/// Draws a diagnostic about `text`, which is called `source_name`.
///
/// *Range*: any span; what lies beyond the text or inside a character is moved to the nearest place that can be shown.
/// *Cost*: proportional to the length of the text.
pub fn render(source_name: &str, text: &str, diagnostic: &Diagnostic, colour: bool) -> String {
    let primary = shown_span(text, diagnostic.span);
    let first_line = line_of(text, primary.start);
    let mut notes: Vec<String> = diagnostic.notes.clone();
    let mut related = Vec::new();
    for (span, label) in &diagnostic.related {
        let span = shown_span(text, *span);
        let line = line_of(text, span.start);
        if line.abs_diff(first_line) > FARTHEST_LINES {
            notes.push(format!("{label}, on line {}", line + 1));
        } else {
            related.push((span, label.as_str()));
        }
    }
    let from = related.iter().map(|(span, _)| span.start).fold(primary.start, usize::min);
    let to = related.iter().map(|(span, _)| span.end).fold(primary.end, usize::max);
    let spans: Vec<Range<usize>> =
        std::iter::once(&primary).chain(related.iter().map(|(span, _)| span)).cloned().collect();
    let excerpt = Excerpt::new(text, from..to, &spans);

    let mut snippet = Snippet::source(excerpt.text.as_str()).line_start(line_of(text, from) + 1);
    snippet = snippet.annotation(AnnotationKind::Primary.span(excerpt.span(&primary)).label(label(&diagnostic.label)));
    for (span, label) in &related {
        snippet = snippet.annotation(AnnotationKind::Context.span(excerpt.span(span)).label(*label));
    }
    let level = match diagnostic.severity {
        Severity::Error => Level::ERROR,
        Severity::Warning => Level::WARNING,
    };
    let group = level.primary_title(diagnostic.message.as_str());
    let mut group = if excerpt.is_verbatim(text) {
        group.element(snippet.path(source_name))
    } else {
        // Columns counted in a line that was cut or cleaned would be wrong.
        let column = text[line_start(text, primary.start)..primary.start].chars().count() + 1;
        group.element(Origin::path(source_name).line(first_line + 1).char_column(column)).element(snippet)
    };
    if diagnostic.help.is_some() || !notes.is_empty() {
        group = group.element(Element::from(Padding));
    }
    for note in &notes {
        group = group.element(Level::NOTE.message(note.as_str()));
    }
    if let Some(help) = &diagnostic.help {
        group = group.element(Level::HELP.message(help.as_str()));
    }
    let renderer = if colour { Renderer::styled() } else { Renderer::plain() };
    // The excerpt is cut to measure already.
    renderer.term_width(4 * WIDEST_LINE).render(&[group])
}

fn label(text: &str) -> Option<&str> {
    (!text.is_empty()).then_some(text)
}

/// Moves a span to bytes of the text at which characters begin, and to few lines.
fn shown_span(text: &str, span: Span) -> Range<usize> {
    let floor = |at: usize| {
        let mut at = at.min(text.len());
        while !text.is_char_boundary(at) {
            at -= 1;
        }
        at
    };
    let start = floor(span.start);
    let end = floor(span.end).max(start);
    let covered = &text[start..end];
    match covered.match_indices('\n').nth(MOST_LINES - 1) {
        Some(_) => start..start + covered.find('\n').unwrap_or(covered.len()),
        None => start..end,
    }
}

/// The number of the line a byte stands on, from 0.
fn line_of(text: &str, at: usize) -> usize {
    text.as_bytes()[..at].iter().filter(|byte| **byte == b'\n').count()
}

fn line_start(text: &str, at: usize) -> usize {
    text[..at].rfind('\n').map_or(0, |before| before + 1)
}

/// The lines a diagnostic shows, with tabs and invisible signs made visible and long lines cut.
struct Excerpt {
    text: String,
    /// Where the excerpt begins in the whole text.
    from: usize,
    /// For every byte of the whole text from `from` on, its place in the excerpt.
    places: Vec<usize>,
}

impl Excerpt {
    fn new(whole: &str, shown: Range<usize>, spans: &[Range<usize>]) -> Self {
        let from = line_start(whole, shown.start);
        let to = whole[shown.end..].find('\n').map_or(whole.len(), |length| shown.end + length);
        let mut excerpt = Excerpt { text: String::new(), from, places: Vec::with_capacity(to - from + 1) };
        let mut at = from;
        for line in whole[from..to].split_inclusive('\n') {
            excerpt.push_line(line, at, spans);
            at += line.len();
        }
        excerpt.places.push(excerpt.text.len());
        excerpt
    }

    fn push_line(&mut self, line: &str, at: usize, spans: &[Range<usize>]) {
        let body = line.trim_end_matches(['\n', '\r']);
        let long = body.chars().count() > WIDEST_LINE;
        // The window of a long line begins a little before the first place marked on it.
        let mark = spans.iter().filter(|span| span.start >= at && span.start <= at + body.len()).map(|span| span.start);
        let mark = mark.min().unwrap_or(at) - at;
        let first = if long { back(body, mark, LEAD) } else { 0 };
        let last = if long { forth(body, first, WIDEST_LINE) } else { body.len() };
        let mut cut_shown = false;
        for (offset, character) in line.char_indices() {
            self.places.resize(self.places.len() + character.len_utf8(), self.text.len());
            if offset >= body.len() {
                if character == '\n' {
                    self.text.push('\n');
                }
            } else if offset < first || offset >= last {
                if !cut_shown || offset == last {
                    self.text.push_str("...");
                    cut_shown = true;
                }
            } else {
                self.push_visible(character);
            }
        }
    }

    fn push_visible(&mut self, character: char) {
        match character {
            '\t' => self.text.push_str("  "),
            _ if character.is_control()
                || matches!(character, '\u{200b}'..='\u{200f}' | '\u{2028}'..='\u{202e}' | '\u{2066}'..='\u{2069}' | '\u{feff}') =>
            {
                self.text.push('\u{fffd}');
            }
            _ => self.text.push(character),
        }
    }

    fn is_verbatim(&self, whole: &str) -> bool {
        whole[self.from..].starts_with(self.text.as_str())
    }

    fn span(&self, span: &Range<usize>) -> Range<usize> {
        let place = |at: usize| self.places.get(at - self.from).copied().unwrap_or(self.text.len());
        let (start, end) = (place(span.start), place(span.end));
        start..end.max(start)
    }
}

/// The byte `count` characters before `at`.
fn back(line: &str, at: usize, count: usize) -> usize {
    line[..at].char_indices().rev().take(count).last().map_or(at, |(place, _)| place)
}

/// The byte `count` characters after `at`.
fn forth(line: &str, at: usize, count: usize) -> usize {
    line[at..].char_indices().nth(count).map_or(line.len(), |(offset, _)| at + offset)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_place_is_underlined_and_help_is_given() {
        let text = "digits 40\n1/(E(g) - H\n";
        let diagnostic = Diagnostic::new(Span::new(21, 21), "the `(` is never closed")
            .with_label("`)` is missing here")
            .with_related(Span::new(12, 13), "opened here")
            .with_help("put `)` where the bracket ends");
        let drawn = render("a.ketwork", text, &diagnostic, false);
        let wanted = "\
error: the `(` is never closed
 --> a.ketwork:2:12
  |
2 | 1/(E(g) - H
  |   -        ^ `)` is missing here
  |   |
  |   opened here
  |
  = help: put `)` where the bracket ends";
        assert_eq!(drawn, wanted);
        assert!(render("a", text, &diagnostic, true).contains("\u{1b}["));
    }

    #[test]
    fn any_span_can_be_drawn() {
        let long = format!("{}⟨g| D |g⟩{}", "x + ".repeat(500), " + y".repeat(500));
        for text in ["", "a", "a\n", "\n\n", "ω\tω\r\nb\u{0}\u{202e}c", "1\n2\n3\n4\n5\n6\n7\n8\n9\n", long.as_str()]
        {
            for start in (0..text.len() + 3).step_by(1 + text.len() / 40) {
                for length in [0, 1, 2, 7, 1000, usize::MAX - start] {
                    let span = Span::new(start, start + length);
                    let diagnostic = Diagnostic::new(span, "m").with_label("l").with_related(Span::new(3, 1), "r");
                    let drawn = render("name", text, &diagnostic, false);
                    assert!(drawn.starts_with("error: m\n"), "{drawn}");
                    assert!(drawn.lines().all(|line| line.chars().count() < WIDEST_LINE + 60), "{drawn}");
                    assert!(!drawn.contains(['\u{0}', '\u{202e}', '\t']), "{drawn}");
                }
            }
        }
    }

    #[test]
    fn a_far_related_place_becomes_a_note() {
        let text = format!("({}x", "\n".repeat(50));
        let diagnostic =
            Diagnostic::warning(Span::new(51, 52), "m").with_related(Span::new(0, 1), "opened here").with_note("n");
        let drawn = render("f", &text, &diagnostic, false);
        assert!(drawn.starts_with("warning: m\n") && drawn.contains("note: opened here, on line 1"), "{drawn}");
    }
}
