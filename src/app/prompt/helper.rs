//! What the line editor asks while a person types: completion, one-line help, colours, and whether the entry goes on.

use super::completion::{offer, word_at};
use super::layout::shown_continuations;
use crate::lang::extent::is_incomplete;
use crate::lang::vocabulary::{Status, WordKind, vocabulary};
use crate::report::paint::Paint;
use rustyline::completion::Completer;
use rustyline::highlight::{CmdKind, Highlighter};
use rustyline::hint::{Hint, Hinter};
use rustyline::line_buffer::LineBuffer;
use rustyline::validate::{ValidationContext, ValidationResult, Validator};
use rustyline::{Changeset, Context, Helper};
use std::borrow::Cow;

/// Longest one-line help shown behind the cursor, in characters.
const LONGEST_HINT: usize = 90;

/// Answers the line editor.
pub struct EntryHelper {
    pub paint: Paint,
    /// The names the session has bound.
    pub names: Vec<String>,
    /// The prompt's width: entries that go on are aligned below their first line.
    pub prompt_width: usize,
}

impl Helper for EntryHelper {}

impl Completer for EntryHelper {
    type Candidate = String;

    fn complete(&self, line: &str, cursor: usize, _: &Context<'_>) -> rustyline::Result<(usize, Vec<String>)> {
        let offer = offer(line, cursor, &self.names);
        Ok((offer.start, offer.candidates))
    }

    fn update(&self, line: &mut LineBuffer, start: usize, elected: &str, changes: &mut Changeset) {
        // Inside a word the part behind the cursor goes too.
        let (_, end) = word_at(line.as_str(), line.pos());
        let end = if line.as_str()[..end].len() > start { end } else { line.pos() };
        line.replace(start..end, elected, changes);
    }
}

/// The one-line help of the word that has just been typed; nothing to take over into the line.
pub struct WordHelp(String);

impl Hint for WordHelp {
    fn display(&self) -> &str {
        &self.0
    }

    fn completion(&self) -> Option<&str> {
        None
    }
}

impl Hinter for EntryHelper {
    type Hint = WordHelp;

    fn hint(&self, line: &str, cursor: usize, _: &Context<'_>) -> Option<WordHelp> {
        if cursor < line.len() || line.contains('\n') {
            return None;
        }
        let typed = line.trim_end();
        // The word keeps its help while the blank behind it is typed.
        if line.len() > typed.len() + 1 || typed.trim_start().starts_with('#') {
            return None;
        }
        let (start, _) = word_at(typed, typed.len());
        let word = &typed[start..];
        if self.names.iter().any(|name| name == word) {
            return None;
        }
        let found = vocabulary().find(word).filter(|found| found.kind != WordKind::Topic)?;
        let later = if found.status == Status::Here { "" } else { "not available yet: " };
        let text: String = format!("  {later}{}", found.brief).chars().take(LONGEST_HINT).collect();
        Some(WordHelp(text))
    }
}

impl Validator for EntryHelper {
    fn validate(&self, context: &mut ValidationContext) -> rustyline::Result<ValidationResult> {
        let goes_on = is_incomplete(context.input());
        Ok(if goes_on { ValidationResult::Incomplete } else { ValidationResult::Valid(None) })
    }
}

impl Highlighter for EntryHelper {
    fn highlight<'l>(&self, line: &'l str, _: usize) -> Cow<'l, str> {
        if !self.paint.is_on() {
            return Cow::Borrowed(line);
        }
        let coloured = coloured(line, &self.names, self.paint);
        Cow::Owned(shown_continuations(&coloured, self.prompt_width, self.paint))
    }

    fn highlight_hint<'h>(&self, hint: &'h str) -> Cow<'h, str> {
        Cow::Owned(self.paint.faint(hint))
    }

    fn highlight_char(&self, _: &str, _: usize, kind: CmdKind) -> bool {
        // Everything may change its colour when a letter is added; moving the cursor changes nothing.
        self.paint.is_on() && kind != CmdKind::MoveCursor
    }
}

/// The line with its words coloured; nothing but colour codes is added.
fn coloured(line: &str, names: &[String], paint: Paint) -> String {
    let mut out = String::with_capacity(line.len() * 2);
    let mut rest = line;
    let mut at_beginning = true;
    while let Some(character) = rest.chars().next() {
        let is_word = |c: char| c.is_alphanumeric() || c == '_';
        let length = if character == '#' {
            rest.find('\n').unwrap_or(rest.len())
        } else if is_word(character) {
            rest.find(|c: char| !is_word(c)).unwrap_or(rest.len())
        } else {
            character.len_utf8()
        };
        let (piece, behind) = rest.split_at(length);
        rest = behind;
        if character == '#' {
            out.push_str(&paint.faint(piece));
        } else if is_word(character) {
            out.push_str(&coloured_word(piece, at_beginning, names, paint));
            at_beginning = false;
        } else {
            out.push_str(piece);
            at_beginning &= character.is_whitespace();
        }
    }
    out
}

fn coloured_word(word: &str, at_beginning: bool, names: &[String], paint: Paint) -> String {
    if names.iter().any(|name| name == word) {
        return paint.good(word);
    }
    match vocabulary().find(word).map(|found| found.kind) {
        Some(WordKind::Entry | WordKind::Command) if at_beginning => paint.entry_word(word),
        Some(WordKind::Entry | WordKind::Command | WordKind::Topic) | None => word.to_string(),
        Some(_) => paint.word(word),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn colours_change_no_letter() {
        let names = ["pol".to_string()];
        for line in ["define pol(w) = <g| D_z |g>  # why", "ω\n      pol", "", "###", "2 pol hydrogenic"] {
            assert_eq!(coloured(line, &names, Paint::PLAIN), line);
        }
    }
}
