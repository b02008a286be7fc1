//! The list of entries and what is done with it.

use super::diagnose::report_of;
use super::evaluate::{Done, Evaluation, Wrong};
use super::files::DataFiles;
use super::outcome::{Outcome, Report};
use super::scope::{Effect, Scope};
use crate::lang::diagnostic::Diagnostic;
use crate::lang::file::{EntryText, Item as TextItem, Line, RecordLine, SessionText, parse_session};
use crate::lang::tree::{Entry, EntryKind, Name, Span};
use crate::num::Effort;
use crate::sums::Trouble;
use std::collections::BTreeSet;
use std::sync::Arc;

/// A notebook: entries with their prose, records and results.
pub struct Session {
    items: Vec<Item>,
    files: Arc<dyn DataFiles>,
    effort: Effort,
    next_identity: u64,
}

enum Item {
    /// Header, provenance, a comment-only line or a blank one, as written.
    Other(TextItem),
    Entry(Box<EntryState>),
}

struct EntryState {
    /// Stays the same when entries above come and go; places in terms refer to it.
    identity: u64,
    written: EntryText,
    outcome: Option<Outcome>,
    effect: Option<Effect>,
    words: BTreeSet<String>,
}

/// An entry as others may see it.
pub struct EntryView<'s> {
    pub number: usize,
    pub text: &'s str,
    pub outcome: Option<&'s Outcome>,
    /// Record lines found in the file.
    pub recorded: Vec<&'s str>,
    /// Comment and blank lines between the entry before and this one.
    pub prose_before: Vec<&'s str>,
    /// The comment behind the entry, without its `#`.
    pub comment: Option<&'s str>,
    /// Where the text stands in the file it was read from.
    pub span: Span,
}

/// What came of adding or changing an entry.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Entered {
    pub number: usize,
    pub revised: bool,
    /// Entries that were evaluated, in order.
    pub evaluated: Vec<usize>,
}

/// Why an entry cannot be dropped or changed.
#[derive(Clone, PartialEq, Eq, Debug, thiserror::Error)]
pub enum Refusal {
    #[error("there is no entry {number}; the session has {count}")]
    NoEntry { number: usize, count: usize },
    #[error("entry {number} binds `{name}`, which {} {} still {}", if .used_by.len() == 1 { "entry" } else { "entries" }, list(.used_by), if .used_by.len() == 1 { "uses" } else { "use" })]
    Used { number: usize, name: String, used_by: Vec<usize> },
}

fn list(numbers: &[usize]) -> String {
    numbers.iter().map(usize::to_string).collect::<Vec<_>>().join(", ")
}

impl EntryState {
    fn new(identity: u64, written: EntryText) -> Self {
        let words = match &written.parsed {
            Ok(entry) => words_of(&entry.to_string()),
            Err(_) => BTreeSet::new(),
        };
        EntryState { identity, written, outcome: None, effect: None, words }
    }

    fn binds(&self) -> Option<&Name> {
        self.written.parsed.as_ref().ok().and_then(bound_name)
    }

    /// Puts what the entry has done, or failed to do, into the scope of the entries below.
    fn take_part(&self, number: usize, scope: &mut Scope) {
        match (&self.effect, self.binds()) {
            (Some(effect), _) => scope.apply(number, effect),
            (None, Some(name)) => scope.apply_failure(number, &name.text),
            (None, None) => {}
        }
    }

    fn forget(&mut self) {
        self.outcome = None;
        self.effect = None;
    }
}

/// The name an entry binds.
fn bound_name(entry: &Entry) -> Option<&Name> {
    match &entry.kind {
        EntryKind::System { name, .. }
        | EntryKind::State { name, .. }
        | EntryKind::Manifold { name, .. }
        | EntryKind::Definition { name, .. } => Some(name),
        _ => None,
    }
}

/// Every word of a text that could be a name.
fn words_of(text: &str) -> BTreeSet<String> {
    text.split(|c: char| !(c.is_alphanumeric() || c == '_'))
        .filter(|word| word.starts_with(|c: char| c.is_alphabetic()))
        .map(String::from)
        .collect()
}

impl Session {
    /// An empty session.
    pub fn new(files: Arc<dyn DataFiles>) -> Self {
        let items = SessionText::new().items.into_iter().map(Item::Other).collect();
        Session { items, files, effort: Effort::new(), next_identity: 0 }
    }

    /// Reads a session file; nothing is evaluated.
    ///
    /// Errors: faults of the file as a whole (its first line). Entries that do not parse become entries that fail.
    pub fn open(text: &str, files: Arc<dyn DataFiles>) -> Result<Self, Vec<Diagnostic>> {
        let parsed = parse_session(text);
        if !parsed.problems.is_empty() {
            return Err(parsed.problems);
        }
        let mut session = Session { items: Vec::new(), ..Session::new(files) };
        for item in parsed.items {
            session.push(item);
        }
        Ok(session)
    }

    fn push(&mut self, item: TextItem) {
        let item = match item {
            TextItem::Entry(written) => {
                self.next_identity += 1;
                Item::Entry(Box::new(EntryState::new(self.next_identity, *written)))
            }
            other => Item::Other(other),
        };
        self.items.push(item);
    }

    /// The switch that ends a running evaluation.
    pub fn effort(&self) -> Effort {
        self.effort.clone()
    }

    fn entries(&self) -> impl Iterator<Item = &EntryState> {
        self.items.iter().filter_map(|item| match item {
            Item::Entry(entry) => Some(entry.as_ref()),
            Item::Other(_) => None,
        })
    }

    fn entry_mut(&mut self, number: usize) -> Option<&mut EntryState> {
        self.items
            .iter_mut()
            .filter_map(|item| match item {
                Item::Entry(entry) => Some(entry.as_mut()),
                Item::Other(_) => None,
            })
            .nth(number.checked_sub(1)?)
    }

    /// Number of entries.
    pub fn len(&self) -> usize {
        self.entries().count()
    }

    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// The entry with this number, counted from 1.
    pub fn entry(&self, number: usize) -> Option<EntryView<'_>> {
        let mut prose = Vec::new();
        let mut count = 0;
        for item in &self.items {
            match item {
                Item::Other(other) => prose.extend(prose_of(other)),
                Item::Entry(entry) => {
                    count += 1;
                    if count == number {
                        return Some(EntryView {
                            number,
                            text: &entry.written.text,
                            outcome: entry.outcome.as_ref(),
                            recorded: entry.written.records.iter().map(|record| record.text.as_str()).collect(),
                            prose_before: prose,
                            comment: entry.written.comment(),
                            span: entry.written.span,
                        });
                    }
                    prose.clear();
                }
            }
        }
        None
    }

    /// Comment and blank lines behind the last entry.
    pub fn prose_after(&self) -> Vec<&str> {
        let last = self.items.iter().rposition(|item| matches!(item, Item::Entry(_))).map_or(0, |at| at + 1);
        self.items[last..]
            .iter()
            .filter_map(|item| match item {
                Item::Other(other) => prose_of(other),
                Item::Entry(_) => None,
            })
            .collect()
    }

    /// The names bound so far, for completion.
    pub fn names(&self) -> Vec<String> {
        self.entries().filter_map(|entry| entry.binds().map(|name| name.text.clone())).collect()
    }

    fn number_of(&self, identity: u64) -> usize {
        self.entries().position(|entry| entry.identity == identity).map_or(0, |at| at + 1)
    }

    /// What the entry with this number sees.
    fn scope_before(&self, number: usize) -> Scope {
        let mut scope = Scope::new();
        for (position, entry) in self.entries().take(number - 1).enumerate() {
            entry.take_part(position + 1, &mut scope);
        }
        scope
    }

    /// Evaluates every entry that has no result yet, in order, and calls `watch` after each.
    ///
    /// An entry that is stopped ends the round; the entries below it stay without result.
    pub fn evaluate(&mut self, watch: &mut dyn FnMut(&Session, usize)) {
        let mut scope = Scope::new();
        for number in 1..=self.len() {
            let pending = matches!(self.entry(number).map(|e| e.outcome.cloned()), Some(None | Some(Outcome::Stopped)));
            if pending {
                let stopped = self.evaluate_entry(number, &scope);
                watch(self, number);
                if stopped {
                    return;
                }
            }
            if let Some(entry) = self.entries().nth(number - 1) {
                entry.take_part(number, &mut scope);
            }
        }
    }

    /// Evaluates one entry; tells whether it was stopped.
    fn evaluate_entry(&mut self, number: usize, scope: &Scope) -> bool {
        let Some(entry) = self.entries().nth(number - 1) else { return false };
        let (outcome, effect) = match &entry.written.parsed {
            Err(diagnostics) => {
                let reports = diagnostics
                    .iter()
                    .map(|diagnostic| Report { entry_number: number, diagnostic: diagnostic.clone(), unmet: false })
                    .collect();
                (Outcome::Failed(reports), None)
            }
            Ok(tree) => match self.clash(tree, scope) {
                Some(diagnostic) => {
                    (Outcome::Failed(vec![Report { entry_number: number, diagnostic, unmet: false }]), None)
                }
                None => {
                    let evaluation = Evaluation {
                        scope,
                        source: &entry.written.text,
                        entry: entry.identity,
                        effort: &self.effort,
                        files: &*self.files,
                    };
                    match evaluation.run(tree) {
                        Ok(Done::Declared(effect, told)) => (Outcome::Declared { told }, Some(effect)),
                        Ok(Done::Answered(answer)) => (Outcome::Result(answer), None),
                        Err(wrong) => (self.failed(number, wrong), None),
                    }
                }
            },
        };
        let stopped = outcome == Outcome::Stopped;
        if let Some(entry) = self.entry_mut(number) {
            entry.outcome = Some(outcome);
            entry.effect = effect;
        }
        stopped
    }

    /// A name bound twice, or a word of the language taken as a name.
    fn clash(&self, tree: &Entry, scope: &Scope) -> Option<Diagnostic> {
        use crate::theory::Fault;
        let name = bound_name(tree)?;
        let fault = match scope.bound_by.get(&name.text) {
            Some(number) => Fault::BoundTwice { name: name.text.clone(), entry: *number },
            None if super::words::reserved(&name.text) => Fault::Reserved { name: name.text.clone() },
            None => return None,
        };
        Some(super::diagnose::diagnostic_of_fault(name.span, &fault))
    }

    fn failed(&self, number: usize, wrong: Wrong) -> Outcome {
        let stopped = match &wrong {
            Wrong::Evaluation(failure) => failure.is_interrupted(),
            Wrong::Meaning(problem) => problem.fault == crate::theory::Fault::Interrupted,
        };
        if stopped {
            return Outcome::Stopped;
        }
        let unmet = matches!(&wrong, Wrong::Evaluation(failure) if matches!(failure.trouble, Trouble::Unmet(_)));
        let (place, mut diagnostic) = report_of(&wrong);
        let at = self.number_of(place.entry);
        let (at, elsewhere) = if at == 0 || at == number { (number, false) } else { (at, true) };
        if elsewhere {
            diagnostic = diagnostic.with_note(format!("this came up when entry {number} was evaluated"));
        }
        if at == number && place.entry != self.entries().nth(number - 1).map_or(0, |e| e.identity) {
            diagnostic.span = Span::default();
        }
        Outcome::Failed(vec![Report { entry_number: at, diagnostic, unmet }])
    }

    /// Adds an entry at the end, or revises the one that binds the same name, and evaluates what depends on it.
    ///
    /// Errors: the text does not parse; the session is unchanged.
    pub fn enter(&mut self, text: &str) -> Result<Entered, Vec<Diagnostic>> {
        let written = EntryText::new(text);
        let tree = written.parsed.as_ref().map_err(Clone::clone)?;
        let earlier = bound_name(tree)
            .and_then(|name| self.entries().position(|entry| entry.binds().is_some_and(|n| n.text == name.text)));
        if let Some(position) = earlier {
            return Ok(self.put(position + 1, written));
        }
        self.end_last_line();
        self.push(TextItem::Entry(Box::new(written)));
        let number = self.len();
        Ok(Entered { number, revised: false, evaluated: self.evaluate_from(number) })
    }

    /// A file may lack its last line end; what is added below needs it.
    fn end_last_line(&mut self) {
        let line_end = match self.items.last_mut() {
            Some(Item::Entry(entry)) => match entry.written.records.last_mut() {
                Some(RecordLine { line_end, .. }) => line_end,
                None => &mut entry.written.line_end,
            },
            Some(Item::Other(other)) => match line_of_mut(other) {
                Some(line) => &mut line.line_end,
                None => return,
            },
            None => return,
        };
        if line_end.is_empty() {
            line_end.push('\n');
        }
    }

    /// Adds a comment line.
    pub fn add_prose(&mut self, line: &str) {
        self.end_last_line();
        let line = Line { text: line.to_string(), line_end: "\n".into(), span: Span::default() };
        self.items.push(Item::Other(TextItem::Prose(line)));
    }

    /// Replaces the text of an entry and evaluates what depends on it.
    ///
    /// Errors: no such entry, or the text does not parse; the session is unchanged.
    pub fn revise(&mut self, number: usize, text: &str) -> Result<Entered, Vec<Diagnostic>> {
        let written = EntryText::new(text);
        let tree = written.parsed.as_ref().map_err(Clone::clone)?;
        if number == 0 || number > self.len() {
            let refusal = Refusal::NoEntry { number, count: self.len() };
            return Err(vec![Diagnostic::new(tree.span, refusal.to_string())]);
        }
        Ok(self.put(number, written))
    }

    fn put(&mut self, number: usize, mut written: EntryText) -> Entered {
        let mut changed = BTreeSet::new();
        let mut settings = false;
        self.next_identity += 1;
        let identity = self.next_identity;
        if let Some(entry) = self.entry_mut(number) {
            changed.extend(entry.binds().map(|name| name.text.clone()));
            settings |= is_setting(&entry.written.parsed);
            written.indent = std::mem::take(&mut entry.written.indent);
            written.line_end = std::mem::take(&mut entry.written.line_end);
            if written.comment().is_none() {
                written.trailing = std::mem::take(&mut entry.written.trailing);
            }
            *entry = EntryState::new(identity, written);
            changed.extend(entry.binds().map(|name| name.text.clone()));
            settings |= is_setting(&entry.written.parsed);
        }
        self.forget_dependents(number, changed, settings);
        Entered { number, revised: true, evaluated: self.evaluate_from(number) }
    }

    /// Takes the results of all entries below that depend on the changed names, directly or not.
    fn forget_dependents(&mut self, number: usize, mut changed: BTreeSet<String>, settings: bool) {
        for below in number + 1..=self.len() {
            let Some(entry) = self.entry_mut(below) else { continue };
            let failed = matches!(entry.outcome, Some(Outcome::Failed(_)));
            if settings || failed || entry.words.iter().any(|word| touches(word, &changed)) {
                entry.forget();
                changed.extend(entry.binds().map(|name| name.text.clone()));
            }
        }
    }

    fn evaluate_from(&mut self, number: usize) -> Vec<usize> {
        let mut scope = self.scope_before(number);
        let mut evaluated = Vec::new();
        for at in number..=self.len() {
            let pending = self.entries().nth(at - 1).is_some_and(|entry| entry.outcome.is_none());
            if pending {
                evaluated.push(at);
                if self.evaluate_entry(at, &scope) {
                    break;
                }
            }
            if let Some(entry) = self.entries().nth(at - 1) {
                entry.take_part(at, &mut scope);
            }
        }
        evaluated
    }

    /// Takes an entry out.
    ///
    /// Errors: there is none of this number, or others use the name it binds.
    pub fn drop_entry(&mut self, number: usize) -> Result<Entered, Refusal> {
        let count = self.len();
        let Some(entry) = number.checked_sub(1).and_then(|at| self.entries().nth(at)) else {
            return Err(Refusal::NoEntry { number, count });
        };
        let settings = is_setting(&entry.written.parsed);
        if let Some(name) = entry.binds() {
            let changed = BTreeSet::from([name.text.clone()]);
            let used_by: Vec<usize> = self
                .entries()
                .enumerate()
                .skip(number)
                .filter(|(_, other)| other.words.iter().any(|word| touches(word, &changed)))
                .map(|(position, _)| position + 1)
                .collect();
            if !used_by.is_empty() {
                return Err(Refusal::Used { number, name: name.text.clone(), used_by });
            }
        }
        let mut seen = 0;
        self.items.retain(|item| match item {
            Item::Other(_) => true,
            Item::Entry(_) => {
                seen += 1;
                seen != number
            }
        });
        // Messages of failed entries speak of entries by number, and the numbers have moved.
        self.forget_dependents(number - 1, BTreeSet::new(), settings);
        let evaluated = if number <= self.len() { self.evaluate_from(number) } else { Vec::new() };
        Ok(Entered { number, revised: false, evaluated })
    }

    /// The saved form: header, provenance, and every entry with its prose and record.
    pub fn to_text(&self, provenance: &[String]) -> String {
        let mut items = Vec::with_capacity(self.items.len());
        for item in &self.items {
            match item {
                Item::Other(TextItem::Provenance(_)) => {}
                Item::Other(header @ TextItem::Header(_)) => {
                    items.push(header.clone());
                    items.extend(provenance.iter().map(|line| {
                        let text = format!("#@ {line}");
                        TextItem::Provenance(Line { text, line_end: "\n".into(), span: Span::default() })
                    }));
                }
                Item::Other(other) => items.push(other.clone()),
                Item::Entry(entry) => {
                    let mut written = entry.written.clone();
                    match &entry.outcome {
                        // Without a result of its own an entry keeps the record it came with.
                        None | Some(Outcome::Stopped) => {}
                        Some(outcome) => written.set_records(outcome.record()),
                    }
                    items.push(TextItem::Entry(Box::new(written)));
                }
            }
        }
        SessionText { items, problems: Vec::new() }.to_text()
    }
}

/// A comment or blank line as text.
fn prose_of(item: &TextItem) -> Option<&str> {
    match item {
        TextItem::Prose(line) | TextItem::Blank(line) => Some(&line.text),
        _ => None,
    }
}

fn line_of_mut(item: &mut TextItem) -> Option<&mut Line> {
    match item {
        TextItem::Header(line)
        | TextItem::Provenance(line)
        | TextItem::Prose(line)
        | TextItem::Blank(line)
        | TextItem::Stray(line) => Some(line),
        TextItem::Entry(_) => None,
    }
}

fn is_setting(tree: &Result<Entry, Vec<Diagnostic>>) -> bool {
    matches!(tree, Ok(Entry { kind: EntryKind::Digits(_) | EntryKind::Constants(_), .. }))
}

/// Tells whether a word of an entry refers to one of the names; `V_x` refers to `V` as well.
fn touches(word: &str, names: &BTreeSet<String>) -> bool {
    names.contains(word) || word.split_once('_').is_some_and(|(base, _)| names.contains(base))
}
