//! The list of entries and what is done with it.

use super::diagnose::report_of;
use super::evaluate::{Done, Evaluation};
use super::files::DataFiles;
use super::outcome::{Outcome, Report};
use super::scope::{Effect, Scope};
use crate::lang::diagnostic::Diagnostic;
use crate::lang::file::{Item as TextItem, parse_session};
use crate::lang::parser::parse_entry;
use crate::lang::tree::{Entry, EntryKind, Name, Span};
use crate::num::Effort;
use std::collections::BTreeSet;
use std::sync::Arc;

/// First line of every session file.
pub const HEADER: &str = "ketwork session 1";

/// A notebook: entries with their prose, records and results.
pub struct Session {
    items: Vec<Item>,
    files: Arc<dyn DataFiles>,
    effort: Effort,
    next_identity: u64,
}

enum Item {
    /// A comment-only line or a blank one, as written.
    Prose(String),
    Entry(Box<EntryState>),
}

struct EntryState {
    /// Stays the same when entries above come and go; places in terms refer to it.
    identity: u64,
    text: String,
    comment: Option<String>,
    tree: Result<Entry, Vec<Diagnostic>>,
    recorded: Vec<String>,
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
    pub recorded: &'s [String],
    /// Comment and blank lines between the entry before and this one.
    pub prose_before: Vec<&'s str>,
    /// The comment behind the entry, with its `#`.
    pub comment: Option<&'s str>,
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
    fn new(identity: u64, text: &str, tree: Result<Entry, Vec<Diagnostic>>) -> Self {
        let words = match &tree {
            Ok(entry) => words_of(&entry.to_string()),
            Err(_) => BTreeSet::new(),
        };
        EntryState {
            identity,
            text: text.to_string(),
            comment: None,
            tree,
            recorded: Vec::new(),
            outcome: None,
            effect: None,
            words,
        }
    }

    fn binds(&self) -> Option<&Name> {
        self.tree.as_ref().ok().and_then(bound_name)
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
        Session { items: Vec::new(), files, effort: Effort::new(), next_identity: 0 }
    }

    /// Reads a session file; nothing is evaluated.
    ///
    /// Errors: faults of the file as a whole (its first line). Entries that do not parse become entries that fail.
    pub fn open(text: &str, files: Arc<dyn DataFiles>) -> Result<Self, Vec<Diagnostic>> {
        let parsed = parse_session(text);
        if !parsed.diagnostics.is_empty() {
            return Err(parsed.diagnostics);
        }
        let mut session = Session::new(files);
        for item in parsed.items {
            match item {
                TextItem::Header(_) | TextItem::Provenance(_) => {}
                TextItem::Prose(line) => session.items.push(Item::Prose(line)),
                TextItem::Blank(_) => session.items.push(Item::Prose(String::new())),
                TextItem::Entry(entry) => {
                    let mut state = EntryState::new(session.next_identity, &entry.text, entry.tree);
                    session.next_identity += 1;
                    state.comment = entry.comment;
                    state.recorded = entry.records.into_iter().map(|record| record.text).collect();
                    session.items.push(Item::Entry(Box::new(state)));
                }
            }
        }
        Ok(session)
    }

    /// The switch that ends a running evaluation.
    pub fn effort(&self) -> Effort {
        self.effort.clone()
    }

    fn entries(&self) -> impl Iterator<Item = &EntryState> {
        self.items.iter().filter_map(|item| match item {
            Item::Entry(entry) => Some(entry.as_ref()),
            Item::Prose(_) => None,
        })
    }

    fn entry_mut(&mut self, number: usize) -> Option<&mut EntryState> {
        self.items
            .iter_mut()
            .filter_map(|item| match item {
                Item::Entry(entry) => Some(entry.as_mut()),
                Item::Prose(_) => None,
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
                Item::Prose(line) => prose.push(line.as_str()),
                Item::Entry(entry) => {
                    count += 1;
                    if count == number {
                        return Some(EntryView {
                            number,
                            text: &entry.text,
                            outcome: entry.outcome.as_ref(),
                            recorded: &entry.recorded,
                            prose_before: prose,
                            comment: entry.comment.as_deref(),
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
                Item::Prose(line) => Some(line.as_str()),
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
            if let Some(effect) = &entry.effect {
                scope.apply(position + 1, effect);
            }
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
            if let Some(effect) = self.entries().nth(number - 1).and_then(|entry| entry.effect.clone()) {
                scope.apply(number, &effect);
            }
        }
    }

    /// Evaluates one entry; tells whether it was stopped.
    fn evaluate_entry(&mut self, number: usize, scope: &Scope) -> bool {
        let Some(entry) = self.entries().nth(number - 1) else { return false };
        let (outcome, effect) = match &entry.tree {
            Err(diagnostics) => {
                let reports = diagnostics
                    .iter()
                    .map(|diagnostic| Report { entry_number: number, diagnostic: diagnostic.clone() })
                    .collect();
                (Outcome::Failed(reports), None)
            }
            Ok(tree) => match self.clash(tree, scope) {
                Some(diagnostic) => (Outcome::Failed(vec![Report { entry_number: number, diagnostic }]), None),
                None => {
                    let evaluation = Evaluation {
                        scope,
                        source: &entry.text,
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

    fn failed(&self, number: usize, wrong: super::evaluate::Wrong) -> Outcome {
        if let super::evaluate::Wrong::Evaluation(failure) = &wrong
            && failure.is_interrupted()
        {
            return Outcome::Stopped;
        }
        let (place, mut diagnostic) = report_of(&wrong);
        let at = self.number_of(place.entry);
        let (at, elsewhere) = if at == 0 || at == number { (number, false) } else { (at, true) };
        if elsewhere {
            diagnostic = diagnostic.with_note(format!("this came up when entry {number} was evaluated"));
        }
        if at == number && place.entry != self.entries().nth(number - 1).map_or(0, |e| e.identity) {
            diagnostic.span = Span::default();
        }
        Outcome::Failed(vec![Report { entry_number: at, diagnostic }])
    }

    /// Adds an entry at the end, or revises the one that binds the same name, and evaluates what depends on it.
    ///
    /// Errors: the text does not parse; the session is unchanged.
    pub fn enter(&mut self, text: &str) -> Result<Entered, Vec<Diagnostic>> {
        let tree = parse_entry(text)?;
        let earlier = bound_name(&tree)
            .and_then(|name| self.entries().position(|entry| entry.binds().is_some_and(|n| n.text == name.text)));
        if let Some(position) = earlier {
            return Ok(self.put(position + 1, text, tree));
        }
        let state = EntryState::new(self.next_identity, text, Ok(tree));
        self.next_identity += 1;
        self.items.push(Item::Entry(Box::new(state)));
        let number = self.len();
        Ok(Entered { number, revised: false, evaluated: self.evaluate_from(number) })
    }

    /// Adds a comment line.
    pub fn add_prose(&mut self, line: &str) {
        self.items.push(Item::Prose(line.to_string()));
    }

    /// Replaces the text of an entry and evaluates what depends on it.
    ///
    /// Errors: no such entry, or the text does not parse; the session is unchanged.
    pub fn revise(&mut self, number: usize, text: &str) -> Result<Entered, Vec<Diagnostic>> {
        let tree = parse_entry(text)?;
        if number == 0 || number > self.len() {
            let refusal = Refusal::NoEntry { number, count: self.len() };
            return Err(vec![Diagnostic::new(tree.span, refusal.to_string())]);
        }
        Ok(self.put(number, text, tree))
    }

    fn put(&mut self, number: usize, text: &str, tree: Entry) -> Entered {
        let mut changed = BTreeSet::new();
        let mut settings = false;
        let identity = self.next_identity;
        self.next_identity += 1;
        if let Some(entry) = self.entry_mut(number) {
            changed.extend(entry.binds().map(|name| name.text.clone()));
            settings |= is_setting(&entry.tree);
            let comment = entry.comment.take();
            *entry = EntryState::new(identity, text, Ok(tree));
            entry.comment = comment;
            changed.extend(entry.binds().map(|name| name.text.clone()));
            settings |= is_setting(&entry.tree);
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
            if let Some(effect) = self.entries().nth(at - 1).and_then(|entry| entry.effect.clone()) {
                scope.apply(at, &effect);
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
        let settings = is_setting(&entry.tree);
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
            Item::Prose(_) => true,
            Item::Entry(_) => {
                seen += 1;
                seen != number
            }
        });
        if settings {
            self.forget_dependents(number - 1, BTreeSet::new(), true);
        }
        let evaluated = if number <= self.len() { self.evaluate_from(number) } else { Vec::new() };
        Ok(Entered { number, revised: false, evaluated })
    }

    /// The saved form: header, provenance, and every entry with its prose and record.
    pub fn to_text(&self, provenance: &[String]) -> String {
        let mut text = format!("{HEADER}\n");
        for line in provenance {
            text.push_str(&format!("#@ {line}\n"));
        }
        for item in &self.items {
            match item {
                Item::Prose(line) => text.push_str(&format!("{line}\n")),
                Item::Entry(entry) => {
                    text.push_str(&entry.text);
                    if let Some(comment) = &entry.comment {
                        text.push_str(&format!("  {comment}"));
                    }
                    text.push('\n');
                    // Without a result of its own an entry keeps the record it came with.
                    let lines = match &entry.outcome {
                        Some(Outcome::Result(answer)) => &answer.lines,
                        None | Some(Outcome::Stopped) => &entry.recorded,
                        _ => continue,
                    };
                    for line in lines {
                        text.push_str(&format!("  {line}\n"));
                    }
                }
            }
        }
        text
    }
}

fn is_setting(tree: &Result<Entry, Vec<Diagnostic>>) -> bool {
    matches!(tree, Ok(Entry { kind: EntryKind::Digits(_) | EntryKind::Constants(_), .. }))
}

/// Tells whether a word of an entry refers to one of the names; `V_x` refers to `V` as well.
fn touches(word: &str, names: &BTreeSet<String>) -> bool {
    names.contains(word) || word.split_once('_').is_some_and(|(base, _)| names.contains(base))
}
