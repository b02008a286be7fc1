//! States named by a label alone.

use crate::angular::chain::{self, AngularVector};
use crate::angular::{Coupling, Electrons, HalfInteger, Label, Level, Parity, Projections, Term};
use crate::systems::{Manifold, State, StateLabel, SystemError};
use rug::Rational;

/// Reads a label with its options.
///
/// Errors: the rule it breaks; an option that is not M, ML or MS.
pub fn read(label: &StateLabel, electrons: Electrons) -> Result<Label, SystemError> {
    let mut projections = Projections::default();
    for (name, value) in &label.options {
        let slot = match name.as_str() {
            "M" | "m" => &mut projections.m,
            "ML" => &mut projections.ml,
            "MS" => &mut projections.ms,
            other => {
                return Err(SystemError::Refused {
                    message: format!("`{other}` is not a quantum number of a state here"),
                    help: "write M for a state of one J, as in [2^3P_1, M=0], or ML and MS".into(),
                });
            }
        };
        *slot = Some(half_integer(name, value)?);
    }
    Label::parse(&label.text, projections, electrons)
        .map_err(|error| SystemError::Refused { message: error.to_string(), help: error.help() })
}

fn half_integer(name: &str, value: &Rational) -> Result<HalfInteger, SystemError> {
    HalfInteger::from_rational(value).map_err(|_| SystemError::Refused {
        message: format!("{name} = {value} is neither whole nor half an odd number"),
        help: format!("{name} runs in steps of 1, as -1, 0, 1 or -1/2, 1/2"),
    })
}

/// The label with its options as text: `2^3P_1, M=0`.
fn shown(label: &StateLabel) -> String {
    label.options.iter().fold(label.text.clone(), |text, (name, value)| format!("{text}, {name}={value}"))
}

/// A state of one J, or a product state.
///
/// Errors: as [`read`]; a term of several J without J or ML and MS.
pub(super) fn state(label: &StateLabel, electrons: Electrons) -> Result<State, SystemError> {
    let read = read(label, electrons)?;
    if read.coupling == Coupling::Term && only_momentum(read.term).is_none() {
        let term = read.term;
        let momenta: Vec<String> = term.momenta().map(|j| j.to_string()).collect();
        return Err(SystemError::Refused {
            message: format!("{} names a whole term, with J = {}", label.text, momenta.join(", ")),
            help: format!(
                "write J, as in {}_{}, or ML and MS; `manifold` names the whole term",
                label.text,
                momenta.last().map_or("1", String::as_str)
            ),
        });
    }
    Ok(State { label: shown(label), numbers: numbers(&read) })
}

/// All states of a term or of one of its levels.
pub(super) fn manifold(label: &StateLabel, electrons: Electrons) -> Result<Manifold, SystemError> {
    let read = read(label, electrons)?;
    if !matches!(read.coupling, Coupling::Term | Coupling::Level { .. }) {
        return Err(SystemError::Refused {
            message: "a manifold holds every M".into(),
            help: format!("write the label alone, [{}]", label.text),
        });
    }
    Ok(Manifold { label: label.text.clone(), numbers: numbers(&read) })
}

fn only_momentum(term: Term) -> Option<HalfInteger> {
    let mut momenta = term.momenta();
    let first = momenta.next()?;
    momenta.next().is_none().then_some(first)
}

/// n (or -1), L, 2S, parity; then which angular vector, and its doubled quantum numbers.
fn numbers(label: &Label) -> Vec<i64> {
    let term = label.term;
    let odd = i64::from(term.parity == Parity::Odd);
    let mut numbers = vec![label.n.map_or(-1, i64::from), i64::from(term.l), i64::from(term.s.twice()), odd];
    let vector = match label.coupling {
        Coupling::Term => only_momentum(term).map(|j| vec![LEVEL, j.twice()]),
        Coupling::Level { j } => Some(vec![LEVEL, j.twice()]),
        Coupling::State { j, m } => Some(vec![STATE, j.twice(), m.twice()]),
        Coupling::Product { ml, ms } => Some(vec![PRODUCT, ml.twice(), ms.twice()]),
    };
    numbers.extend(vector.unwrap_or_default().into_iter().map(i64::from));
    numbers
}

/// Marks of angular vectors.
const LEVEL: i32 = 0;
const STATE: i32 = 1;
const PRODUCT: i32 = 2;

/// Whether two states have n, L, S and parity in common.
pub(super) fn same_term(a: &State, b: &State) -> bool {
    a.numbers.get(..4) == b.numbers.get(..4)
}

/// n, the term, and what is said of the angular vector.
fn read_numbers(numbers: &[i64]) -> Option<(i32, Term, Vec<i32>)> {
    let numbers: Vec<i32> = numbers.iter().map(|n| i32::try_from(*n).ok()).collect::<Option<_>>()?;
    let [n, l, s, odd, ref vector @ ..] = numbers[..] else { return None };
    let parity = if odd == 0 { Parity::Even } else { Parity::Odd };
    Some((n, Term::new(u32::try_from(l).ok()?, HalfInteger::from_twice(s), parity), vector.to_vec()))
}

/// The levels of a manifold: the one it names, or all of its term.
pub(super) fn levels(manifold: &Manifold) -> Vec<Level> {
    match read_numbers(&manifold.numbers) {
        Some((_, term, vector)) => match vector[..] {
            [LEVEL, j] => vec![Level::new(term, HalfInteger::from_twice(j))],
            _ => term.momenta().map(|j| Level::new(term, j)).collect(),
        },
        None => Vec::new(),
    }
}

/// Tells whether a state belongs to a manifold.
pub(super) fn holds(manifold: &Manifold, state: &State) -> bool {
    if manifold.numbers.get(..4) != state.numbers.get(..4) {
        return false;
    }
    match (manifold.numbers.get(4..), state.numbers.get(4..)) {
        // one level, and a state of its J
        (Some(&[_, j]), Some(&[kind, own, ..])) => kind != i64::from(PRODUCT) && j == own,
        _ => true,
    }
}

/// A state as the end of a bracket.
pub(super) fn end(state: &State, electrons: Electrons) -> Result<chain::State, SystemError> {
    let foreign = || SystemError::Refused {
        message: format!("{} is not a state of this system", state.label),
        help: "take states of this system".into(),
    };
    let half = HalfInteger::from_twice;
    let (n, term, vector) = read_numbers(&state.numbers).ok_or_else(foreign)?;
    let vector = match vector[..] {
        [LEVEL, j] => AngularVector::Coupled { j: half(j), m: None },
        [STATE, j, m] => AngularVector::Coupled { j: half(j), m: Some(half(m)) },
        [PRODUCT, ml, ms] => AngularVector::Product { ml: half(ml), ms: half(ms) },
        _ => return Err(foreign()),
    };
    Ok(chain::State { name: radial_name(n, term, electrons), term, vector })
}

/// The label without J, which the radial function does not depend on: `2p`, `2^3P`.
fn radial_name(n: i32, term: Term, electrons: Electrons) -> String {
    let n = if n > 0 { n.to_string() } else { String::new() };
    match term.letter() {
        Some(letter) if electrons.count == Some(1) => format!("{n}{}", letter.to_ascii_lowercase()),
        _ => format!("{n}{term}"),
    }
}
