//! Typed, pasted or piped lines, gathered into what is done one after the other.

use super::command;
use crate::lang::extent::{Extent, begins_anew, is_record};
use crate::lang::file::{HEADER, PROVENANCE};

/// Most bytes of one piece of input; the parser's own limit is lower, and it says so better.
const LONGEST: usize = 4 << 20;

/// A piece of input.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum Unit {
    /// A command of the prompt.
    Command(String),
    Entry(String),
    /// A comment line.
    Prose(String),
    /// More than anyone means to type; it has been thrown away.
    TooLong,
}

/// Gathers lines.
#[derive(Default)]
pub struct Gather {
    text: String,
    extent: Extent,
}

impl Gather {
    /// Takes one line in; gives what it has completed, in order.
    pub fn line(&mut self, line: &str) -> Vec<Unit> {
        let mut units = Vec::new();
        if !self.text.is_empty() && begins_anew(line) {
            units.extend(self.rest());
        }
        if self.text.is_empty() {
            if let Some(unit) = at_once(line) {
                units.extend(unit);
                return units;
            }
        } else {
            self.text.push('\n');
        }
        self.text.push_str(line);
        self.extent.take(line);
        if line.trim().is_empty() || !self.extent.goes_on() {
            units.extend(self.rest());
        } else if self.text.len() > LONGEST {
            *self = Gather::default();
            units.push(Unit::TooLong);
        }
        units
    }

    /// The end of the input: what has been begun is all there is of it.
    pub fn rest(&mut self) -> Option<Unit> {
        let Gather { text, .. } = std::mem::take(self);
        let text = text.trim();
        (!text.is_empty()).then(|| Unit::Entry(text.to_string()))
    }

    /// Takes in a whole text.
    pub fn all(text: &str) -> Vec<Unit> {
        let mut gather = Gather::default();
        let mut units: Vec<Unit> = text.lines().flat_map(|line| gather.line(line)).collect();
        units.extend(gather.rest());
        units
    }
}

/// Lines that are complete by themselves; `None` for the beginning of an entry. Header, provenance and records come with pasted sessions, and are
/// passed over: the program writes its own.
fn at_once(line: &str) -> Option<Option<Unit>> {
    let trimmed = line.trim();
    if trimmed.is_empty() || trimmed == HEADER || line.starts_with(PROVENANCE) || is_record(line) {
        Some(None)
    } else if trimmed.starts_with('#') {
        Some(Some(Unit::Prose(trimmed.to_string())))
    } else if command::is_command(trimmed) {
        Some(Some(Unit::Command(trimmed.to_string())))
    } else {
        None
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn entry(text: &str) -> Unit {
        Unit::Entry(text.into())
    }

    #[test]
    fn a_pasted_session_falls_into_its_pieces() {
        let text =
            "ketwork session 1\n#@ recorded by x\n# prose\n\ndigits 40\ndefine a = (1 +\n  2)\na\n  = 3\nlist\n2 +";
        let wanted = [
            Unit::Prose("# prose".into()),
            entry("digits 40"),
            entry("define a = (1 +\n  2)"),
            entry("a"),
            Unit::Command("list".into()),
            entry("2 +"),
        ];
        assert_eq!(Gather::all(text), wanted);
    }

    #[test]
    fn an_empty_line_ends_an_entry_that_lacks_something() {
        assert_eq!(Gather::all("(1 + 2\n\n3"), [entry("(1 + 2"), entry("3")]);
        assert_eq!(Gather::all("(1 + 2\ndefine x = 3"), [entry("(1 + 2"), entry("define x = 3")]);
    }

    #[test]
    fn endless_entries_are_given_up() {
        let mut gather = Gather::default();
        let line = "(".repeat(1 << 20);
        let units: Vec<Unit> = (0..6).flat_map(|_| gather.line(&line)).collect();
        assert_eq!(units, [Unit::TooLong]);
    }
}
