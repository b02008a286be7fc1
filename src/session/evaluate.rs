//! Evaluates one entry in its scope.

use super::declare::Declaration;
use super::files::DataFiles;
use super::outcome::{Answer, AnswerKind};
use super::scope::{Effect, Scope};
use crate::lang::tree::{DefinitionKind, DigitsWanted, Entry, EntryKind, Expr, InspectVerb, Span};
use crate::num::render::{RenderedKind, render};
use crate::num::units::Unit;
use crate::num::{Effort, Scalar, uncertain};
use crate::sums::AngularSum;
use crate::sums::{Environment, Failure, Trouble, Value, Wanted};
use crate::systems::LevelShift;
use crate::theory::free::free_variables;
use crate::theory::terms::{Place, ScalarNode, ScalarTerm, Term};
use crate::theory::{Binding, Fault, Problem, Resolver};
use std::sync::Arc;

/// Most digits that may be asked for.
pub const LARGEST_DIGITS: u32 = 20_000;

/// Exact values longer than this are written as decimals, unless `digits exact` stands above.
const LONGEST_EXACT_TEXT: usize = 1000;

/// Why an entry failed.
#[derive(Debug)]
pub(super) enum Wrong {
    Meaning(Box<Problem>),
    Evaluation(Box<Failure>),
}

impl From<Problem> for Wrong {
    fn from(problem: Problem) -> Self {
        Wrong::Meaning(Box::new(problem))
    }
}

impl From<Failure> for Wrong {
    fn from(failure: Failure) -> Self {
        Wrong::Evaluation(Box::new(failure))
    }
}

/// What an entry did.
pub(super) enum Done {
    Declared(Effect, Vec<String>),
    Answered(Answer),
}

/// One entry being evaluated.
pub(super) struct Evaluation<'e> {
    pub scope: &'e Scope,
    pub source: &'e str,
    pub entry: u64,
    pub effort: &'e Effort,
    pub files: &'e dyn DataFiles,
}

impl Evaluation<'_> {
    pub(super) fn resolver(&self) -> Resolver<'_> {
        Resolver::new(&self.scope.names, self.source, self.entry)
    }

    pub(super) fn fault<T>(&self, span: Span, fault: Fault) -> Result<T, Wrong> {
        Err(Problem::new(Place { entry: self.entry, span }, fault).into())
    }

    fn not_yet<T>(&self, span: Span, what: &str) -> Result<T, Wrong> {
        self.fault(span, Fault::NotYet { what: what.into() })
    }

    pub fn run(&self, entry: &Entry) -> Result<Done, Wrong> {
        match &entry.kind {
            EntryKind::Digits(DigitsWanted::Exact) => Ok(Done::Declared(Effect::Digits(Wanted::Exact), Vec::new())),
            EntryKind::Digits(DigitsWanted::Count(expr)) => self.digits(expr),
            EntryKind::Constants(name) => self.constants(name),
            EntryKind::System { name, kind, arguments } => {
                let declaration = Declaration {
                    scope: self.scope,
                    source: self.source,
                    entry: self.entry,
                    effort: self.effort,
                    files: self.files,
                };
                let (effect, told) = declaration.system(name, kind, arguments)?;
                Ok(Done::Declared(effect, told))
            }
            EntryKind::State { name, system, label } => {
                let term = self.resolver().state(system, label)?;
                self.scope.evaluator(self.effort).state(&term, &Environment::default())?;
                Ok(Done::Declared(Effect::Bind(name.text.clone(), Binding::State(term)), Vec::new()))
            }
            EntryKind::Manifold { name, system, label } => {
                let term = self.resolver().manifold(system, label)?;
                self.scope.evaluator(self.effort).manifold(&term, &Environment::default())?;
                Ok(Done::Declared(Effect::Bind(name.text.clone(), Binding::Manifold(term)), Vec::new()))
            }
            EntryKind::Definition { kind: DefinitionKind::Polarization, name, parameters, body } => {
                if let Some(first) = parameters.first() {
                    let message = "a polarization has no parameters".into();
                    return self.fault(first.span, Fault::Other { message, help: "leave out the parentheses".into() });
                }
                let binding = Binding::Polarization(self.resolver().polarization(name, body)?);
                Ok(Done::Declared(Effect::Bind(name.text.clone(), binding), Vec::new()))
            }
            EntryKind::Definition { kind, name, parameters, body } => {
                let definition = self.resolver().definition(*kind, name, parameters, body)?;
                let binding = Binding::Definition(Arc::new(definition));
                Ok(Done::Declared(Effect::Bind(name.text.clone(), binding), Vec::new()))
            }
            EntryKind::Evaluate { expression, unit } => self.evaluate(expression, unit.as_ref()),
            EntryKind::Inspect { verb: InspectVerb::Formula, expression } => {
                let free = free_variables(expression, &self.scope.names);
                let term = self.resolver().with_variables(free).scalar(expression)?;
                let mut expander = self.scope.evaluator(self.effort).expander(self.effort).keeping_names();
                expander.name_functions(&self.scope.names)?;
                let text = expander.expand(&term)?.to_string();
                Ok(Done::Answered(Answer {
                    lines: vec![format!(": {text}")],
                    kind: AnswerKind::Formula,
                    value: Some(text),
                    digits: None,
                    unit: None,
                    decimal: None,
                    verdict: "formula".into(),
                    notes: Vec::new(),
                    remarks: Vec::new(),
                }))
            }
            EntryKind::Paths { expression, beside } => self.paths(expression, beside.as_ref()),
            EntryKind::Inspect { verb, .. } => {
                let what = match verb {
                    InspectVerb::Crosscheck => "`crosscheck`, the second way of evaluating",
                    _ => "`contributions`, the largest terms of a sum",
                };
                self.not_yet(entry.span, what)
            }
            EntryKind::Compare { left, right } => self.compare(left, right),
            EntryKind::Expect { left, right } => self.expect(left, right),
            EntryKind::Sweep { .. } => self.not_yet(entry.span, "`sweep`, tables over a range"),
            EntryKind::Converge { .. } => self.not_yet(entry.span, "`converge`, limits of growing bases"),
            EntryKind::Budget { .. } => self.not_yet(entry.span, "`budget`, labelled contributions"),
        }
    }

    /// `paths A` and `paths A with B`.
    fn paths(&self, expression: &Expr, beside: Option<&Expr>) -> Result<Done, Wrong> {
        let place = Place { entry: self.entry, span: expression.span };
        let Some((angular, shifts)) = self.angular_sum(expression)? else {
            return Ok(Done::Answered(super::paths::nothing_left()));
        };
        let mut analysis = super::paths::analysis(&angular, &shifts, place, self.effort)?;
        if let Some(beside) = beside
            && let Some((other, _)) = self.angular_sum(beside)?
        {
            let other = super::paths::analysis(&other, &shifts, place, self.effort)?;
            let name = self.source.get(beside.span.start..beside.span.end).unwrap_or("the other sum");
            analysis = analysis.compared_with(name, &other);
        }
        Ok(Done::Answered(super::paths::answer(&angular, &shifts, &analysis)))
    }

    /// The chains of an expression and the moved levels of its system; `None` where its terms cancel.
    fn angular_sum(&self, expression: &Expr) -> Result<Option<(AngularSum, Vec<LevelShift>)>, Wrong> {
        let place = Place { entry: self.entry, span: expression.span };
        let free = free_variables(expression, &self.scope.names);
        let term = self.resolver().with_variables(free).scalar(expression)?;
        let mut evaluator = self.scope.evaluator(self.effort);
        let mut expander = evaluator.expander(self.effort);
        expander.name_functions(&self.scope.names)?;
        let normal = expander.expand(&term)?;
        if normal.terms.is_empty() {
            return Ok(None);
        }
        let angular = evaluator.angular_sum(&normal, place)?;
        let shifts = evaluator.level_shifts(&normal, place)?;
        Ok(Some((angular, shifts)))
    }

    fn digits(&self, expr: &Expr) -> Result<Done, Wrong> {
        let refuse = |got: &str| {
            self.fault(
                expr.span,
                Fault::Other {
                    message: format!(
                        "the number of digits is a whole number from 1 to {LARGEST_DIGITS}, and this is {got}"
                    ),
                    help: "write for instance `digits 40`, or `digits exact`".into(),
                },
            )
        };
        let term = self.resolver().scalar(expr)?;
        let value = match self.scope.evaluator(self.effort).scalar(&term, &Environment::default(), 128) {
            Ok(Scalar::Exact(value)) => value,
            Ok(Scalar::Approx(_)) => return refuse("not a whole number"),
            Err(failure) => return Err(failure.into()),
        };
        let count = value
            .as_rational()
            .filter(|q| q.is_integer())
            .and_then(|q| q.numer().to_u32())
            .filter(|count| (1..=LARGEST_DIGITS).contains(count));
        match count {
            Some(count) => Ok(Done::Declared(Effect::Digits(Wanted::Digits(count)), Vec::new())),
            None => refuse(&shortened(&value.to_string())),
        }
    }

    /// Digits of approximate results in force.
    pub(super) fn digits_wanted(&self) -> u32 {
        match self.scope.wanted {
            Wanted::Exact => super::scope::DEFAULT_DIGITS,
            Wanted::Digits(digits) => digits,
        }
    }

    pub(super) fn answer(&self, value: &Value) -> Answer {
        if let Some(sigma) = value.sigma() {
            let text = concise(&value.scalar, &sigma);
            return Answer {
                lines: vec![format!("~ {text}")],
                kind: AnswerKind::Uncertain,
                value: Some(text),
                digits: None,
                unit: None,
                decimal: None,
                verdict: "uncertain".into(),
                notes: value.limit.iter().cloned().collect(),
                remarks: Vec::new(),
            };
        }
        let asked = self.digits_wanted();
        let mut rendered = render(&value.scalar, asked);
        let mut notes = Vec::new();
        if self.scope.wanted != Wanted::Exact
            && rendered.text.len() > LONGEST_EXACT_TEXT
            && let Ok(ball) = value.scalar.to_ball(crate::sums::bits_for(asked) + 64)
        {
            notes.push(format!("the exact value has {} characters; `digits exact` writes it", rendered.text.len()));
            rendered = render(&Scalar::Approx(ball), asked);
        }
        let (line, kind, digits, verdict) = match rendered.kind {
            RenderedKind::Exact => {
                let zero = matches!(&value.scalar, Scalar::Exact(x) if x.is_zero());
                if zero && !value.rules.is_empty() {
                    (format!("= 0 exactly: {}", value.rules.join("; ")), AnswerKind::Zero, None, "zero, proved")
                } else {
                    (format!("= {}", rendered.text), AnswerKind::Exact, None, "exact")
                }
            }
            RenderedKind::Approx { digits_held } if digits_held >= asked => {
                (format!("~ {}", rendered.text), AnswerKind::Approximate, Some(asked), "digits hold")
            }
            RenderedKind::Approx { digits_held } => {
                notes.push(format!("{digits_held} of the {asked} digits asked hold{}", because(value)));
                (format!("~ {}", rendered.text), AnswerKind::Approximate, Some(digits_held), "fewer digits than asked")
            }
            RenderedKind::BelowZero { .. } => {
                notes.push(format!("the value cannot be told from zero{}", because(value)));
                (format!("~ {}, not proved", rendered.text), AnswerKind::Zero, None, "zero, not proved")
            }
        };
        Answer {
            lines: vec![line],
            kind,
            value: Some(rendered.text),
            digits,
            unit: None,
            decimal: if kind == AnswerKind::Exact { self.in_decimals(&value.scalar) } else { None },
            verdict: verdict.into(),
            notes,
            remarks: Vec::new(),
        }
    }

    /// An exact number with roots or pi in it as a decimal, to be said beside it.
    fn in_decimals(&self, scalar: &Scalar) -> Option<String> {
        let Scalar::Exact(exact) = scalar else { return None };
        let digits = self.digits_wanted();
        let ball = (!exact.is_gaussian()).then(|| scalar.to_ball(crate::sums::bits_for(digits) + 64).ok())??;
        Some(render(&Scalar::Approx(ball), digits).text)
    }

    /// The value of a term to the digits in force.
    pub(super) fn value(&self, term: &ScalarTerm) -> Result<Value, Wrong> {
        Ok(self.scope.evaluator(self.effort).value(term, self.scope.wanted)?)
    }

    fn compare(&self, left: &Expr, right: &Expr) -> Result<Done, Wrong> {
        let (left, right, unit) = self.sides(left, right)?;
        let (a, b) = (self.value(&left)?, self.value(&right)?);
        let unit = unit.as_ref().map(Unit::text);
        let mut answer = super::compare::comparison(&a, &b, self.digits_wanted(), unit);
        answer.notes.extend(a.limit.iter().chain(&b.limit).cloned());
        if let (Some(_), _) | (_, Some(_)) = (a.sigma(), b.sigma()) {
            let difference = self.value(&difference(left, right))?;
            super::compare::add_distance(&mut answer, &difference, unit);
        }
        Ok(Done::Answered(answer))
    }

    fn expect(&self, left: &Expr, right: &Expr) -> Result<Done, Wrong> {
        let (a, b, unit) = self.sides(left, right)?;
        let (a, b) = (self.value(&a)?, self.value(&b)?);
        match super::compare::expectation(&a, &b, right, self.digits_wanted(), unit.as_ref().map(Unit::text)) {
            Ok(answer) => Ok(Done::Answered(answer)),
            Err(message) => {
                let span = left.span.to(right.span);
                let place = Place { entry: self.entry, span };
                Err(Wrong::from(Failure { place, trouble: Trouble::Unmet(message) }))
            }
        }
    }
}

/// left - right as one term, so that a source in both counts once.
fn difference(left: ScalarTerm, right: ScalarTerm) -> ScalarTerm {
    let place = left.place;
    let text = format!("({}) - ({})", left.text, right.text);
    let minus = Term::new(ScalarNode::Negated(right), place, format!("-({text})"));
    Term::new(ScalarNode::Sum(vec![left, minus]), place, text)
}

/// A real value with its standard uncertainty in the concise form.
pub(super) fn concise(scalar: &Scalar, sigma: &rug::Float) -> String {
    match scalar.to_ball(256) {
        Ok(ball) => uncertain::concise_float(ball.re.mid(), sigma),
        Err(_) => render(scalar, 10).text,
    }
}

fn because(value: &Value) -> String {
    value.limit.as_ref().map_or_else(String::new, |limit| format!(": {limit}"))
}

/// A number too long to repeat in a message.
fn shortened(text: &str) -> String {
    if text.chars().count() <= 40 {
        return text.to_string();
    }
    let head: String = text.chars().take(20).collect();
    format!("{head}… ({} digits)", text.len())
}
