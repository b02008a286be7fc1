//! A session file: its lines told apart, its entries read, and every byte kept so that it can be written back.

use serde::Serialize;

use super::diagnostic::Diagnostic;
use super::extent::{Extent, begins_anew, is_record, split_comment};
use super::fault::Fault;
use super::parser::parse_entry;
use super::spelling::is_refused;
use super::tree::{Entry, Span};

/// The first line of every session file of this version.
pub const HEADER: &str = "ketwork session 1";
/// The longest session file that should be read, in bytes; callers refuse longer ones before they read them.
pub const LONGEST_FILE: usize = 64 << 20;
/// What every header begins with, whatever the version.
const HEADER_STEM: &str = "ketwork session";
/// What a line of provenance begins with.
pub const PROVENANCE: &str = "#@ ";

/// A session file as it is written.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct SessionText {
    pub items: Vec<Item>,
    /// What is wrong with the file apart from its entries: header, stray records, control characters in prose.
    pub problems: Vec<Diagnostic>,
}

/// A piece of a session file. The pieces follow one another without gaps.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub enum Item {
    /// `ketwork session 1`
    Header(Line),
    /// `#@ …` directly below the header
    Provenance(Line),
    /// A line that is only a comment
    Prose(Line),
    Blank(Line),
    Entry(Box<EntryText>),
    /// A record below no entry; kept, and reported in `problems`
    Stray(Line),
}

/// A line that is kept as it is.
#[derive(Clone, Debug, PartialEq, Eq, Serialize)]
pub struct Line {
    /// The whole line without its line end.
    pub text: String,
    /// `\n`, `\r\n`, or nothing at the end of the file.
    pub line_end: String,
    /// Where the text stands in the file.
    pub span: Span,
}

impl Line {
    /// Makes a line that is not yet in a file.
    pub fn new(text: impl Into<String>) -> Self {
        Line { text: text.into(), line_end: "\n".to_owned(), span: Span::default() }
    }
}

/// An entry as it is written, with what is recorded below it.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct EntryText {
    /// Blanks before the entry.
    pub indent: String,
    /// The entry itself, from its first to its last sign; line ends and comments inside it included.
    pub text: String,
    /// Blanks and a comment behind the entry on its last line.
    pub trailing: String,
    pub line_end: String,
    /// Where `text` stands in the file.
    pub span: Span,
    /// The tree; its spans, and those of the diagnostics, are bytes of `text`.
    pub parsed: Result<Entry, Vec<Diagnostic>>,
    pub records: Vec<RecordLine>,
}

impl EntryText {
    /// Makes the text of an entry that is not yet in a file.
    ///
    /// The text is taken without blanks around it; a comment behind its last line becomes the trailing one.
    pub fn new(text: &str) -> Self {
        let lead = text.len() - text.trim_start().len();
        read_entry("", text[lead..].trim_end(), 0, "\n")
    }

    /// The comment behind the entry, without its `#` and the blanks around.
    pub fn comment(&self) -> Option<&str> {
        self.trailing.trim_start().strip_prefix('#').map(str::trim)
    }

    /// Puts records in place of those there are; each is the text of one line, beginning with `=`, `~` or `:`.
    pub fn set_records<I: IntoIterator<Item = S>, S: AsRef<str>>(&mut self, records: I) {
        let line_end = if self.line_end.is_empty() { "\n".to_owned() } else { self.line_end.clone() };
        let new = records.into_iter().map(|text| RecordLine {
            indent: "  ".to_owned(),
            text: text.as_ref().to_owned(),
            trailing: String::new(),
            line_end: line_end.clone(),
            span: Span::default(),
        });
        self.records = new.collect();
        if !self.records.is_empty() {
            self.line_end = line_end;
        }
    }
}

/// A line of a record, as `= 9/2` below its entry.
#[derive(Clone, Debug, PartialEq, Eq, Serialize)]
pub struct RecordLine {
    pub indent: String,
    /// From `=`, `~` or `:` to the last sign.
    pub text: String,
    /// Blanks at the end of the line.
    pub trailing: String,
    pub line_end: String,
    /// Where `text` stands in the file.
    pub span: Span,
}

impl SessionText {
    /// A session with nothing but its header.
    pub fn new() -> Self {
        parse_session(&format!("{HEADER}\n"))
    }

    /// Writes the file: the same bytes it was read from, but for what was changed since.
    pub fn to_text(&self) -> String {
        let mut out = String::new();
        for item in &self.items {
            match item {
                Item::Header(line)
                | Item::Provenance(line)
                | Item::Prose(line)
                | Item::Blank(line)
                | Item::Stray(line) => {
                    out.push_str(&line.text);
                    out.push_str(&line.line_end);
                }
                Item::Entry(entry) => {
                    for part in [&entry.indent, &entry.text, &entry.trailing, &entry.line_end] {
                        out.push_str(part);
                    }
                    for record in &entry.records {
                        for part in [&record.indent, &record.text, &record.trailing, &record.line_end] {
                            out.push_str(part);
                        }
                    }
                }
            }
        }
        out
    }

    pub fn entries(&self) -> impl Iterator<Item = &EntryText> {
        self.items.iter().filter_map(|item| match item {
            Item::Entry(entry) => Some(entry.as_ref()),
            _ => None,
        })
    }

    /// Everything that is wrong with the file, in the order of the text, with spans in the file.
    pub fn diagnostics(&self) -> Vec<Diagnostic> {
        let mut all = self.problems.clone();
        for entry in self.entries() {
            if let Err(found) = &entry.parsed {
                all.extend(found.iter().cloned().map(|diagnostic| diagnostic.shifted(entry.span.start)));
            }
        }
        all.sort_by_key(|diagnostic| diagnostic.span.start);
        all
    }
}

impl Default for SessionText {
    fn default() -> Self {
        SessionText::new()
    }
}

/// Reads a session file. An error in one entry does not hinder the next.
///
/// *Cost*: proportional to the length of the text.
pub fn parse_session(text: &str) -> SessionText {
    let mut reader = Reader { session: SessionText { items: Vec::new(), problems: Vec::new() }, in_head: true };
    let mut at = 0;
    if let Some((line, line_end)) = line_at(text, 0) {
        at = reader.header(line, line_end);
    } else {
        reader.session.problems.push(Fault::MissingHeader.diagnostic(Span::new(0, 0)));
    }
    while let Some((line, line_end)) = line_at(text, at) {
        let inner = line.trim_start();
        if is_record(line) {
            reader.record(at, line, line_end);
            at += line.len() + line_end.len();
        } else if inner.is_empty() || inner.starts_with('#') {
            reader.kept_line(at, line, line_end);
            at += line.len() + line_end.len();
        } else {
            let (entry, line_end) = entry_at(text, at);
            reader.in_head = false;
            reader.entry(at, entry, line_end);
            at += entry.len() + line_end.len();
        }
    }
    reader.session
}

/// The line that begins at a place, and its line end; nothing at the end of the text.
fn line_at(text: &str, at: usize) -> Option<(&str, &str)> {
    let rest = text.get(at..).filter(|rest| !rest.is_empty())?;
    let whole = &rest[..rest.find('\n').map_or(rest.len(), |end| end + 1)];
    let line = whole.trim_end_matches(['\n', '\r']);
    Some((line, &whole[line.len()..]))
}

/// The lines of the entry that begins at a place, and the line end behind them.
fn entry_at(text: &str, first: usize) -> (&str, &str) {
    let mut extent = Extent::default();
    let (mut at, mut entry, mut behind) = (first, "", "");
    while let Some((line, line_end)) = line_at(text, at) {
        if at > first && (!extent.goes_on() || begins_anew(line)) {
            break;
        }
        extent.take(line);
        // Blank lines and comments belong to the entry only when more of it follows.
        if at == first || !split_comment(line).0.trim().is_empty() {
            (entry, behind) = (&text[first..at + line.len()], line_end);
        }
        at += line.len() + line_end.len();
    }
    (entry, behind)
}

struct Reader {
    session: SessionText,
    /// Nothing but the header and provenance has been seen.
    in_head: bool,
}

impl Reader {
    /// Reads the first line; gives the place to go on from.
    fn header(&mut self, line: &str, line_end: &str) -> usize {
        let stated = line.trim_start_matches('\u{feff}').trim_end();
        let span = Span::new(0, line.trim_end().len());
        if let Some(version) = stated.strip_prefix(HEADER_STEM) {
            if stated != HEADER {
                self.problem(span, Fault::WrongVersion(version.trim().to_owned()));
            }
            self.session.items.push(Item::Header(kept(0, line, line_end)));
            return line.len() + line_end.len();
        }
        self.problem(span, Fault::MissingHeader);
        0
    }

    fn problem(&mut self, span: Span, fault: Fault) {
        self.session.problems.push(fault.diagnostic(span));
    }

    fn kept_line(&mut self, at: usize, line: &str, line_end: &str) {
        self.check_characters(at, line);
        let piece = kept(at, line, line_end);
        let item = if line.trim().is_empty() {
            Item::Blank(piece)
        } else if self.in_head && line.starts_with(PROVENANCE) {
            self.session.items.push(Item::Provenance(piece));
            return;
        } else {
            if line.starts_with(PROVENANCE) {
                self.problem(piece.span, Fault::ProvenanceTooLate);
            }
            Item::Prose(piece)
        };
        self.in_head = false;
        self.session.items.push(item);
    }

    fn record(&mut self, at: usize, line: &str, line_end: &str) {
        self.check_characters(at, line);
        let indent = &line[..line.len() - line.trim_start().len()];
        let text = line.trim();
        let span = Span::new(at + indent.len(), at + indent.len() + text.len());
        if let Some(Item::Entry(entry)) = self.session.items.last_mut() {
            entry.records.push(RecordLine {
                indent: indent.to_owned(),
                text: text.to_owned(),
                trailing: line[indent.len() + text.len()..].to_owned(),
                line_end: line_end.to_owned(),
                span,
            });
            return;
        }
        self.in_head = false;
        self.problem(span, Fault::RecordWithoutEntry);
        self.session.items.push(Item::Stray(kept(at, line, line_end)));
    }

    fn entry(&mut self, at: usize, entry: &str, line_end: &str) {
        let indent = &entry[..entry.len() - entry.trim_start().len()];
        self.session.items.push(Item::Entry(Box::new(read_entry(indent, &entry[indent.len()..], at, line_end))));
    }

    fn check_characters(&mut self, at: usize, line: &str) {
        if let Some((place, character)) = line.char_indices().find(|(_, character)| is_refused(*character)) {
            let span = Span::new(at + place, at + place + character.len_utf8());
            self.problem(span, Fault::ControlCharacter(character));
        }
    }
}

/// Reads the lines of one entry; `at` is where its indentation begins.
fn read_entry(indent: &str, lines_text: &str, at: usize, line_end: &str) -> EntryText {
    let last_start = lines_text.rfind('\n').map_or(0, |before| before + 1);
    let (code, _) = split_comment(&lines_text[last_start..]);
    let text = lines_text[..last_start + code.len()].trim_end();
    let start = at + indent.len();
    EntryText {
        indent: indent.to_owned(),
        text: text.to_owned(),
        trailing: lines_text[text.len()..].to_owned(),
        line_end: line_end.to_owned(),
        span: Span::new(start, start + text.len()),
        parsed: parse_entry(text),
        records: Vec::new(),
    }
}

fn kept(at: usize, line: &str, line_end: &str) -> Line {
    Line { text: line.to_owned(), line_end: line_end.to_owned(), span: Span::new(at, at + line.len()) }
}

#[cfg(test)]
mod tests {
    use super::*;

    const SMALL: &str = "ketwork session 1\n#@ constants CODATA-2022\n# Prose, **kept**\n\ndigits 40\n  state g = h[1s] # ground\n\
        define pol(w) = -<g| D_z (R(w) +   # first\n   R(-w)) D_z |g>\t# both\n-2 <g| D_z Q D_z |g>\n  = 9/2\n\t~ 1  \n";

    #[test]
    fn a_session_is_written_back_to_the_same_bytes() {
        for text in [
            SMALL.to_owned(),
            SMALL.replace('\n', "\r\n"),
            SMALL.trim_end().to_owned(),
            String::new(),
            "\u{feff}ketwork session 1\r\n2 +\n\n\n# c".to_owned(),
            "  = 3\n(((\n\0\n  ~ 4\n# x\n  : 5".to_owned(),
        ] {
            assert_eq!(parse_session(&text).to_text(), text);
        }
    }

    #[test]
    fn entries_records_and_comments_are_told_apart() {
        let session = parse_session(SMALL);
        assert_eq!(session.diagnostics(), []);
        let entries: Vec<&EntryText> = session.entries().collect();
        assert_eq!(entries.len(), 4);
        assert_eq!(entries[1].text, "state g = h[1s]");
        assert_eq!(entries[1].comment(), Some("ground"));
        assert_eq!(entries[2].comment(), Some("both"));
        assert!(entries[2].text.ends_with("R(-w)) D_z |g>"));
        let records: Vec<&str> = entries[3].records.iter().map(|record| record.text.as_str()).collect();
        assert_eq!(records, ["= 9/2", "~ 1"]);
        for entry in entries {
            assert_eq!(&SMALL[entry.span.start..entry.span.end], entry.text);
            assert!(entry.parsed.is_ok());
            assert!(entry.records.iter().all(|record| SMALL[record.span.start..record.span.end] == record.text));
        }
    }

    #[test]
    fn one_bad_entry_does_not_hinder_the_next() {
        let session = parse_session("ketwork session 1\n1/(E(g) - H\ndefine x = \nstate g = 1s\n2 + 2\n  = 4\n");
        assert_eq!(session.entries().filter(|entry| entry.parsed.is_ok()).count(), 1);
        assert_eq!(session.diagnostics().len(), 3);
    }

    #[test]
    fn header_and_stray_records_are_reported() {
        let count = |text: &str| parse_session(text).problems.len();
        assert_eq!(count("ketwork session 1\n"), 0);
        assert_eq!(count("ketwork session 2\n2\n"), 1);
        assert_eq!(count("2 + 2\n"), 1);
        assert_eq!(count("ketwork session 1\n# prose\n  = 4\n"), 1);
        assert_eq!(count("ketwork session 1\n2\n#@ late\n"), 1);
        assert_eq!(count("ketwork session 1\n# bell \u{7}\n"), 1);
    }

    #[test]
    fn records_are_replaced() {
        let mut entry = EntryText::new("  2 + 2  # four ");
        assert_eq!((entry.text.as_str(), entry.comment()), ("2 + 2", Some("four")));
        entry.set_records(["= 4"]);
        let session = SessionText { items: vec![Item::Entry(Box::new(entry))], problems: Vec::new() };
        assert_eq!(session.to_text(), "2 + 2  # four\n  = 4\n");
    }
}
