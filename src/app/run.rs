//! `ketwork run`: evaluates a session and prints it with its record.

use super::batch::{Batch, Told};
use super::console::{OutputEnd, print, tell};
use super::provenance::provenance;
use super::source::SourceText;
use super::status::Status;
use crate::lang::diagnostic::Diagnostic;
use crate::lang::file::{Item, Line, PROVENANCE, SessionText, parse_session};
use crate::lang::tree::Span;
use crate::report::json::{self, Position};
use crate::session::{Outcome, Report, Session};
use std::path::Path;

/// Evaluates the session and prints every entry as soon as it has its result.
pub fn run(batch: &Batch, path: &Path, as_json: bool) -> Status {
    let (source, mut session) = match batch.open(path) {
        Ok(opened) => opened,
        Err(status) => return status,
    };
    let mut printer: Box<dyn Printer> =
        if as_json { Box::new(Objects::new(&source)) } else { Box::new(Entries::new(&source.text)) };
    let mut told = Told::default();
    let mut status = Status::Fine;
    let mut ended: Option<OutputEnd> = None;
    let effort = session.effort();
    let done = batch.worker.run(&effort, || {
        batch.worker.progress.begin("entry 1".into());
        session.evaluate(&mut |session, number| {
            batch.worker.progress.begin(format!("entry {}", number + 1));
            let Some(outcome) = session.entry(number).and_then(|view| view.outcome.cloned()) else { return };
            if ended.is_none()
                && outcome != Outcome::Stopped
                && let Err(end) = print(&printer.entry(session, number, &outcome))
            {
                ended = Some(end);
                session.effort().stop();
            }
            match outcome {
                Outcome::Failed(reports) => {
                    status = status.and(Status::Failed);
                    batch.tell_reports(&mut told, &source, session, &reports);
                }
                Outcome::Stopped if ended.is_none() => {
                    status = status.and(Status::Failed);
                    tell(&format!("stopped at entry {number} of {}; what is printed above is whole", session.len()));
                }
                Outcome::Result(answer) if !as_json => {
                    for note in &answer.notes {
                        let span = Span::new(0, session.entry(number).map_or(0, |entry| entry.text.len()));
                        let diagnostic = Diagnostic::warning(span, note.clone());
                        batch.tell_reports(
                            &mut told,
                            &source,
                            session,
                            &[Report { entry_number: number, diagnostic, unmet: false }],
                        );
                    }
                }
                _ => {}
            }
        });
        if ended.is_none() && effort.check().is_ok() {
            ended = print(&printer.end()).err();
        }
    });
    told.end();
    if let Err(problem) = done {
        tell(&format!("{} {problem}", batch.console.messages.bad("error:")));
        status = status.and(Status::Failed);
    }
    ended.map_or(status, |end| batch.output_ended(&end))
}

/// A way of printing entries.
trait Printer: Send {
    /// The text of one entry; entries come in order.
    fn entry(&mut self, session: &Session, number: usize, outcome: &Outcome) -> String;
    /// What follows the last entry.
    fn end(&mut self) -> String;
}

/// The format of the file: what stands between the entries is printed as it is.
struct Entries {
    items: std::vec::IntoIter<Item>,
    ends_line: bool,
}

impl Entries {
    fn new(text: &str) -> Self {
        Entries { items: parse_session(text).items.into_iter(), ends_line: true }
    }

    fn written(&mut self, items: Vec<Item>) -> String {
        let text = SessionText { items, problems: Vec::new() }.to_text();
        if let Some(last) = text.chars().last() {
            self.ends_line = last == '\n';
        }
        text
    }

    /// Says by whom the record is, in place of what the file said.
    fn header(header: Line) -> Vec<Item> {
        let line_end = if header.line_end.is_empty() { "\n".to_string() } else { header.line_end.clone() };
        let lines = provenance().into_iter().map(|line| {
            Item::Provenance(Line {
                text: format!("{PROVENANCE}{line}"),
                line_end: line_end.clone(),
                span: Span::default(),
            })
        });
        let header = Line { line_end: line_end.clone(), ..header };
        std::iter::once(Item::Header(header)).chain(lines).collect()
    }
}

impl Printer for Entries {
    fn entry(&mut self, _: &Session, _: usize, outcome: &Outcome) -> String {
        let mut items = Vec::new();
        for item in self.items.by_ref() {
            match item {
                Item::Header(header) => items.extend(Self::header(header)),
                Item::Provenance(_) => {}
                Item::Entry(mut entry) => {
                    entry.set_records(outcome.record());
                    items.push(Item::Entry(entry));
                    break;
                }
                other => items.push(other),
            }
        }
        self.written(items)
    }

    fn end(&mut self) -> String {
        let rest: Vec<Item> = self
            .items
            .by_ref()
            .flat_map(|item| match item {
                Item::Header(header) => Self::header(header),
                Item::Provenance(_) => Vec::new(),
                other => vec![other],
            })
            .collect();
        let mut text = self.written(rest);
        if !self.ends_line {
            text.push('\n');
        }
        text
    }
}

/// A JSON object a line.
struct Objects {
    /// Where the lines of the file begin.
    lines: Vec<usize>,
    text: String,
}

impl Objects {
    fn new(source: &SourceText) -> Self {
        let line_ends = source.text.match_indices('\n').map(|(at, _)| at + 1);
        Objects { lines: std::iter::once(0).chain(line_ends).collect(), text: source.text.clone() }
    }

    fn position(&self, at: usize) -> Position {
        let line = self.lines.partition_point(|start| *start <= at);
        let start = self.lines.get(line.saturating_sub(1)).copied().unwrap_or(0);
        let column = self.text.get(start..at).map_or(1, |before| before.chars().count() + 1);
        Position { line, column }
    }
}

impl Printer for Objects {
    fn entry(&mut self, session: &Session, number: usize, _: &Outcome) -> String {
        let Some(view) = session.entry(number) else { return String::new() };
        json::entry(&view, &|entry, at| self.position(session.entry(entry).map_or(0, |view| view.span.start) + at))
    }

    fn end(&mut self) -> String {
        String::new()
    }
}
