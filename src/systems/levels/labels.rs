//! From the label in a session to levels of the table: by their names, and by term and J.

use super::table::{Shape, twice_j_of};
use crate::angular::{Coupling, Electrons, HalfInteger, Label, LabelError, Projections};
use crate::lang::diagnostic::did_you_mean;
use crate::systems::{Manifold, Sector, State, StateLabel, SystemError};
use rug::Rational;

/// Most names listed in a message.
const MOST_LISTED: usize = 8;

fn refused(message: String, help: impl Into<String>) -> SystemError {
    SystemError::Refused { message, help: help.into() }
}

/// A doubled half-integer as it is written.
pub fn half(twice: i32) -> HalfInteger {
    HalfInteger::from_twice(twice)
}

/// The spectroscopic label a name is; `None` for any other word.
///
/// Without a multiplicity a label begins with n and has one electron: `4p_3/2`; with one it has any number: `5^3P_1`.
/// Errors: a label that breaks a rule.
pub fn spectroscopic(name: &str) -> Result<Option<Label>, LabelError> {
    let numbered = name.starts_with(|c: char| c.is_ascii_digit());
    let electrons = match name.contains('^') {
        true => Electrons::ANY,
        false if numbered => Electrons::ONE,
        false => return Ok(None),
    };
    match Label::parse(name, Projections::default(), electrons) {
        Ok(label) => Ok(Some(label)),
        Err(LabelError::Unreadable { .. } | LabelError::NoLetter { .. } | LabelError::Letter { .. }) => Ok(None),
        Err(error) => Err(error),
    }
}

/// The J a label says, also where its term has only one.
pub fn momentum_of(label: &Label) -> Option<HalfInteger> {
    match label.coupling {
        Coupling::Level { j } => Some(j),
        _ => {
            let mut momenta = label.term.momenta();
            let first = momenta.next();
            if momenta.next().is_some() { None } else { first }
        }
    }
}

/// The index of the level of a state made here.
pub fn level_of(state: &State) -> Option<usize> {
    usize::try_from(*state.numbers.first()?).ok()
}

/// Twice the M of a state made here; `None` where it is left open.
pub fn twice_m_of(state: &State) -> Option<i32> {
    i32::try_from(*state.numbers.get(1)?).ok()
}

/// A level with its M, or without.
pub fn named_state(shape: &Shape, level: usize, twice_m: Option<i32>) -> State {
    let entry = &shape.levels[level];
    let index = i64::try_from(level).unwrap_or(0);
    match twice_m {
        Some(0) if entry.twice_j() == 0 => State { label: entry.name.clone(), numbers: vec![index, 0] },
        Some(twice_m) => {
            State { label: format!("{}, M={}", entry.name, half(twice_m)), numbers: vec![index, i64::from(twice_m)] }
        }
        None => State { label: entry.name.clone(), numbers: vec![index] },
    }
}

/// The states of a level, one for every M.
pub fn states_of(shape: &Shape, level: usize) -> Vec<State> {
    let Some(entry) = shape.levels.get(level) else { return Vec::new() };
    let twice_j = entry.twice_j();
    (-twice_j..=twice_j).step_by(2).map(|twice_m| named_state(shape, level, Some(twice_m))).collect()
}

/// The state a label names; without M it is the level with every M.
pub fn state(shape: &Shape, label: &StateLabel) -> Result<State, SystemError> {
    let (mut j, mut m) = (None, None);
    for (name, value) in &label.options {
        let slot = match name.as_str() {
            "J" => &mut j,
            "M" => &mut m,
            "m" => {
                return Err(refused(
                    "the magnetic quantum number of J is M, with a capital letter".into(),
                    format!("write [{}, M={value}]", label.text.trim()),
                ));
            }
            _ => {
                return Err(refused(
                    format!("a level of a table has no quantum number {name}"),
                    "a state is a level and its M, as [4s_1/2, M=1/2]",
                ));
            }
        };
        if slot.replace(half_integer(name, value)?).is_some() {
            return Err(refused(format!("this label gives {name} twice"), format!("give {name} once")));
        }
    }
    let found: Vec<usize> = find(shape, label.text.trim(), j)?;
    let &[level] = found.as_slice() else {
        let names = listed(found.iter().map(|at| shape.levels[*at].name.as_str()));
        let first = found.first().map_or("", |at| shape.levels[*at].name.as_str());
        return Err(refused(
            format!("{} is a term of {} levels: {names}", label.text.trim(), found.len()),
            format!("name one of them, as [{first}]; all of them together are a manifold"),
        ));
    };
    let twice_j = shape.levels[level].twice_j();
    let twice_m = match m {
        Some(m) if (m.twice() - twice_j) % 2 != 0 || m.twice().abs() > twice_j => {
            let (name, j) = (&shape.levels[level].name, half(twice_j));
            return Err(refused(
                format!("M={m} does not exist in {name}: J = {j}, so M runs from -{j} to {j} in steps of 1"),
                format!("write [{name}, M={j}] or another M between"),
            ));
        }
        Some(m) => Some(m.twice()),
        None if twice_j == 0 => Some(0),
        None => None,
    };
    Ok(named_state(shape, level, twice_m))
}

/// The levels a label names: one by its name, or all of its term.
pub fn manifold(shape: &Shape, label: &StateLabel) -> Result<Manifold, SystemError> {
    let mut j = None;
    for (name, value) in &label.options {
        match name.as_str() {
            "J" if j.is_none() => j = Some(half_integer(name, value)?),
            "M" => {
                return Err(refused(
                    format!("a manifold holds all M; this one names M={value}"),
                    "leave M out, or declare a state",
                ));
            }
            _ => {
                return Err(refused(
                    format!("a manifold of a level table has no {name} to give"),
                    "write the name of a level, or of a term as [4p]",
                ));
            }
        }
    }
    let levels = find(shape, label.text.trim(), j)?;
    let numbers = levels.into_iter().filter_map(|level| i64::try_from(level).ok()).collect();
    Ok(Manifold { label: label.text.trim().to_string(), numbers })
}

/// The states in a sector that have the energy of a state.
pub fn level_in(shape: &Shape, state: &State, sector: Sector) -> Vec<State> {
    let Some(level) = level_of(state) else { return Vec::new() };
    if sector.twice_m.abs() > twice_j_of(sector.block) {
        return Vec::new();
    }
    let here = |other: &usize| shape.levels[*other].block == sector.block && shape.degenerate(level, *other);
    (0..shape.levels.len()).filter(here).map(|other| named_state(shape, other, Some(sector.twice_m))).collect()
}

fn half_integer(name: &str, value: &Rational) -> Result<HalfInteger, SystemError> {
    HalfInteger::from_rational(value)
        .map_err(|error| refused(format!("{name}={value} is not possible: {error}"), "write 0, 1/2, 1, 3/2, …"))
}

/// The levels of a name, or of a term and perhaps a J; never none.
fn find(shape: &Shape, text: &str, j: Option<HalfInteger>) -> Result<Vec<usize>, SystemError> {
    let has_j = |level: &usize| j.is_none_or(|j| shape.levels[*level].twice_j() == j.twice());
    let named = shape.levels.iter().position(|level| level.name == text);
    // a name such as 4p beside a 4p_3/2 is one level, and so is its term
    let found: Vec<usize> = match named {
        Some(level) => vec![level],
        None => {
            let label = spectroscopic(text).map_err(|error| refused(error.to_string(), error.help()))?;
            let same = |level: &usize| {
                let entry = &shape.levels[*level];
                let (Some(wanted), Some(own)) = (&label, &entry.label) else { return false };
                let momentum = match wanted.coupling {
                    Coupling::Level { j } => j.twice() == entry.twice_j(),
                    _ => true,
                };
                wanted.n == own.n && wanted.term == own.term && momentum
            };
            (0..shape.levels.len()).filter(same).collect()
        }
    };
    if found.is_empty() {
        let names = shape.levels.iter().map(|level| level.name.as_str());
        let help = match did_you_mean(text, names.clone()) {
            Some(near) => format!("did you mean {near}?"),
            None => format!("the levels are {}", listed(names)),
        };
        return Err(refused(format!("the table has no level {}", shown(text)), help));
    }
    let kept: Vec<usize> = found.iter().copied().filter(has_j).collect();
    match (kept.is_empty(), j) {
        (true, Some(j)) => {
            let names = listed(found.iter().map(|at| shape.levels[*at].name.as_str()));
            Err(refused(format!("no level of {} has J = {j}", shown(text)), format!("its levels are {names}")))
        }
        _ => Ok(kept),
    }
}

fn listed<'n>(names: impl Iterator<Item = &'n str>) -> String {
    let mut names: Vec<&str> = names.take(MOST_LISTED + 1).collect();
    let more = names.len() > MOST_LISTED;
    names.truncate(MOST_LISTED);
    let list = names.join(", ");
    if more { format!("{list}, …") } else { list }
}

/// A text as it is quoted in a message: not too long.
pub fn shown(text: &str) -> String {
    if text.chars().count() <= 40 { text.to_string() } else { text.chars().take(40).chain(['…']).collect() }
}
