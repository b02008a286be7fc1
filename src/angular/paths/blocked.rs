//! Why a bracket has no path: the fewest selection rules that would have to be broken.

use crate::angular::chain::{AngularVector, Bracket, Part, State};
use crate::angular::half_integer::HalfInteger;
use crate::angular::selection::{BlockRules, SelectionRule};
use crate::angular::term::{Level, Parity};
use crate::num::{Effort, Interrupted};
use std::collections::BTreeMap;

/// Most levels the search looks at in one place of a chain.
const MOST_LEVELS: usize = 600;

/// A rule broken by an operator between two levels.
#[derive(Clone, PartialEq, Eq, PartialOrd, Ord, Debug)]
pub struct Broken {
    pub operator: String,
    pub bra: Level,
    pub ket: Level,
    pub rules: Vec<SelectionRule>,
}

/// The rules that close a bracket, found on the way that breaks the fewest; empty when a way is open or the search is too large.
///
/// Only the first part of an operator that is a sum is looked at.
/// Cost: the square of the number of levels within reach, times operators.
pub fn blocked(bracket: &Bracket, rules: &BlockRules, effort: &Effort) -> Result<Vec<Broken>, Interrupted> {
    let parts: Vec<&Part> = bracket.operators.iter().filter_map(|operator| operator.parts.first()).collect();
    let universe = universe(bracket, &parts);
    if universe.len() > MOST_LEVELS {
        return Ok(Vec::new());
    }
    // the best way to every level of the present place: rules broken, and how
    let mut best: BTreeMap<Level, (usize, Vec<Broken>)> =
        levels_of(&bracket.bra).into_iter().map(|level| (level, (0, Vec::new()))).collect();
    for (i, part) in parts.iter().enumerate() {
        let inside = i + 1 < parts.len();
        let targets = if inside { universe.clone() } else { levels_of(&bracket.ket) };
        let mut next: BTreeMap<Level, (usize, Vec<Broken>)> = BTreeMap::new();
        for target in targets {
            effort.check()?;
            for (level, (cost, way)) in &best {
                let broken = rules.broken(&part.tensor, *level, target, inside);
                let cost = cost + broken.len();
                if next.get(&target).is_some_and(|(known, _)| *known <= cost) {
                    continue;
                }
                let mut way = way.clone();
                if !broken.is_empty() {
                    let operator = part.tensor.element.name.clone();
                    way.push(Broken { operator, bra: *level, ket: target, rules: broken });
                }
                next.insert(target, (cost, way));
            }
        }
        best = next;
    }
    Ok(best.into_values().min_by_key(|(cost, _)| *cost).map(|(_, way)| way).unwrap_or_default())
}

fn levels_of(state: &State) -> Vec<Level> {
    match state.vector {
        AngularVector::Coupled { j, .. } => vec![Level::new(state.term, j)],
        AngularVector::Product { .. } => state.term.momenta().map(|j| Level::new(state.term, j)).collect(),
    }
}

/// All levels between the ends that the ranks could reach.
fn universe(bracket: &Bracket, parts: &[&Part]) -> Vec<Level> {
    let whole = |x: u32| i32::try_from(x).unwrap_or(0);
    let orbital = parts.iter().map(|part| whole(part.tensor.element.orbital)).max().unwrap_or(0);
    let spin = parts.iter().map(|part| whole(part.tensor.element.spin)).max().unwrap_or(0);
    let terms = [bracket.bra.term, bracket.ket.term];
    let l = terms.map(|term| term.twice_l() / 2);
    let s = terms.map(|term| term.s.twice());
    let (l_low, l_high) = ((l[0].min(l[1]) - orbital).max(0), l[0].max(l[1]) + orbital);
    let (s_low, s_high) = ((s[0].min(s[1]) - 2 * spin).max(s[0] % 2), s[0].max(s[1]) + 2 * spin);
    let mut levels = Vec::new();
    for l in l_low..=l_high {
        for s in (s_low..=s_high).step_by(2) {
            for parity in [Parity::Even, Parity::Odd] {
                let l = u32::try_from(l).unwrap_or(0);
                let term = bracket.bra.term.other(l, HalfInteger::from_twice(s), parity);
                levels.extend(term.momenta().map(|j| Level::new(term, j)));
                if levels.len() > MOST_LEVELS {
                    return levels;
                }
            }
        }
    }
    levels
}
