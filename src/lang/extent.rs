//! How far an entry reaches: one line, and on while a bracket is open or the line ends in an operator.
//!
//! The same rule splits a file into entries and tells the prompt that more is to come.

use super::lexis::word_text;
use super::spelling::ascii_form;
use super::vocabulary;

#[derive(Clone, Copy, PartialEq)]
enum Open {
    Bracket(char),
    /// A bra waiting for the `>` of its ket; directly behind a ket it may stay alone: `|a><a|`.
    Bra {
        behind_ket: bool,
    },
}

/// Follows an entry line by line.
#[derive(Default)]
pub struct Extent {
    open: Vec<Open>,
    last: Option<char>,
    ends_in_joining_word: bool,
}

impl Extent {
    /// Takes in one line, without its line end.
    pub fn take(&mut self, line: &str) {
        let mut previous = None;
        let (code, _) = split_comment(line);
        let mut quoted = false;
        for character in code.chars() {
            let character = match ascii_form(character) {
                Some(form) => form.chars().next().unwrap_or(character),
                None => character,
            };
            if character == '"' {
                quoted = !quoted;
            } else if !quoted {
                self.sign(character, previous);
            }
            if !character.is_whitespace() {
                previous = Some(character);
            }
        }
        if previous.is_some() {
            self.last = if quoted { Some('"') } else { previous };
            self.ends_in_joining_word = !quoted && last_word(code).is_some_and(vocabulary::is_joining_word);
        }
    }

    fn sign(&mut self, character: char, previous: Option<char>) {
        match character {
            '(' | '[' | '{' => self.open.push(Open::Bracket(character)),
            ')' | ']' | '}' => {
                let partner = match character {
                    ')' => '(',
                    ']' => '[',
                    _ => '{',
                };
                if let Some(at) = self.open.iter().rposition(|open| *open == Open::Bracket(partner)) {
                    self.open.truncate(at);
                }
            }
            '<' => self.open.push(Open::Bra { behind_ket: previous == Some('>') }),
            '>' => {
                if matches!(self.open.last(), Some(Open::Bra { .. })) {
                    self.open.pop();
                }
            }
            _ => {}
        }
    }

    /// Says whether the entry goes on on the next line.
    pub fn goes_on(&self) -> bool {
        let Some(last) = self.last else { return false };
        match self.open.as_slice() {
            [] => {}
            [Open::Bra { behind_ket: true }] if last == '|' => return false,
            _ => return true,
        }
        self.ends_in_joining_word || "+-*/^=,:|".contains(last)
    }
}

/// Says whether a line can never be the continuation of an entry: a record, or the first line of another declaration.
pub fn begins_anew(line: &str) -> bool {
    is_record(line) || word_text(line).is_ok_and(|(_, word)| vocabulary::is_entry_word(word))
}

/// Says whether a line is an indented record: `  = 9/2`, `  ~ 0.5`, `  : …`.
pub fn is_record(line: &str) -> bool {
    let inner = line.trim_start_matches([' ', '\t']);
    inner.len() < line.len() && inner.starts_with(['=', '~', ':'])
}

/// Splits a line into what is read and the comment (`#` on to the end), if any.
pub(super) fn split_comment(line: &str) -> (&str, Option<&str>) {
    let mut quoted = false;
    for (at, character) in line.char_indices() {
        match character {
            '"' | '“' | '”' | '„' => quoted = !quoted,
            '#' if !quoted => return (&line[..at], Some(&line[at..])),
            _ => {}
        }
    }
    (line, None)
}

fn last_word(code: &str) -> Option<&str> {
    let code = code.trim_end();
    let before = code.trim_end_matches(|c: char| c.is_ascii_alphanumeric() || c == '_');
    let word = &code[before.len()..];
    (!word.is_empty() && !before.ends_with(['.', '_'])).then_some(word)
}

/// Lines of a text with their place, without their line ends.
pub(super) fn lines(text: &str) -> impl Iterator<Item = (usize, &str)> {
    let mut start = 0;
    text.split_inclusive('\n').map(move |line| {
        let at = start;
        start += line.len();
        (at, line.trim_end_matches(['\n', '\r']))
    })
}

/// Finds the place where a second entry begins, if the text holds more than one.
pub(super) fn second_entry(text: &str) -> Option<usize> {
    let mut extent = Extent::default();
    let mut begun = false;
    for (at, line) in lines(text) {
        let (code, _) = split_comment(line);
        if code.trim().is_empty() {
            continue;
        }
        if begun && (begins_anew(line) || !extent.goes_on()) {
            return Some(at + (line.len() - line.trim_start().len()));
        }
        extent.take(line);
        begun = true;
    }
    None
}

/// Says whether what has been typed so far is the beginning of an entry that goes on.
///
/// An empty line ends every entry: then what is missing is an error and not an invitation to type on.
pub fn is_incomplete(text: &str) -> bool {
    let mut extent = Extent::default();
    for (_, line) in lines(text) {
        if line.trim().is_empty() && extent.last.is_some() {
            return false;
        }
        extent.take(line);
    }
    extent.goes_on()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn open_brackets_and_operators_ask_for_more() {
        for text in [
            "2 +",
            "f(1,",
            "f(1",
            "<g| D_z",
            "<g|",
            "<g| D_z |",
            "state g =",
            "compare a with",
            "h[1s",
            "⟨g| D_z",
            "2 ·",
            "budget \"x\" in MHz {",
            "1 + # why",
            "<g| V (W - <g|W|g>) R",
            "EXPR in",
            "|a> <a| +",
        ] {
            assert!(is_incomplete(text), "{text}");
        }
        for text in [
            "2 + 3",
            "f(1, 2)",
            "<g|D_z|g>",
            "|a><a|",
            "ket u = D_z |g>",
            "a )",
            "(1 + 2",
            "x # +",
            "",
            "# (",
            "budget \"in",
            "1/(E(g)-H)'",
        ] {
            assert_eq!(is_incomplete(text), text == "(1 + 2", "{text}");
        }
        assert!(!is_incomplete("(1 + 2\n\n"));
    }

    #[test]
    fn a_second_entry_is_found() {
        assert_eq!(second_entry("2\n3"), Some(2));
        assert_eq!(second_entry("(2\n + 3)\n\n# prose\n"), None);
        assert_eq!(second_entry("(2\ndefine x = 3"), Some(3));
        assert_eq!(second_entry("2 +\n  3"), None);
    }
}
