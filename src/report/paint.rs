//! What the colours mean; every shown text stays readable without them.

use colored::Colorize;

/// Paints pieces of text, or leaves them as they are.
#[derive(Clone, Copy, PartialEq, Eq, Debug, Default)]
pub struct Paint {
    on: bool,
}

impl Paint {
    pub const PLAIN: Paint = Paint { on: false };

    pub fn new(on: bool) -> Self {
        Paint { on }
    }

    pub fn is_on(self) -> bool {
        self.on
    }

    fn with(self, text: &str, paint: impl Fn(&str) -> colored::ColoredString) -> String {
        if self.on && !text.is_empty() { paint(text).to_string() } else { text.to_string() }
    }

    /// Words that lead a line: headings, entry words.
    pub fn heading(self, text: &str) -> String {
        self.with(text, |t| t.bold())
    }

    /// What is less important than what stands beside it.
    pub fn faint(self, text: &str) -> String {
        self.with(text, |t| t.bright_black())
    }

    /// A result.
    pub fn result(self, text: &str) -> String {
        self.with(text, |t| t.cyan())
    }

    /// What holds.
    pub fn good(self, text: &str) -> String {
        self.with(text, |t| t.green())
    }

    /// What does not hold.
    pub fn bad(self, text: &str) -> String {
        self.with(text, |t| t.red().bold())
    }

    /// What wants attention.
    pub fn warning(self, text: &str) -> String {
        self.with(text, |t| t.yellow())
    }

    /// A word of the vocabulary inside an entry.
    pub fn word(self, text: &str) -> String {
        self.with(text, |t| t.blue())
    }

    /// The first word of an entry.
    pub fn entry_word(self, text: &str) -> String {
        self.with(text, |t| t.magenta().bold())
    }
}
