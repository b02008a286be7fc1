//! All paths of one bracket of pure tensor components, with their factors.

use super::PathError;
use super::coefficients::{Amplitudes, Coefficients};
use super::columns::Columns;
use crate::angular::chain::State;
use crate::angular::selection::BlockRules;
use crate::angular::tensor::Tensor;
use crate::angular::term::Level;
use crate::num::{Effort, Surd};
use std::collections::{BTreeMap, BTreeSet};

/// An operator of the bracket: its tensor and the spherical components it stands for.
pub(super) struct Step<'a> {
    pub(super) tensor: &'a Tensor,
    pub(super) weights: Vec<(i32, Surd)>,
}

/// The factors of a path by column.
pub(super) type Paths = BTreeMap<Vec<Level>, Vec<Surd>>;

pub(super) struct Walk<'a> {
    pub(super) rules: &'a BlockRules,
    pub(super) columns: &'a Columns,
    pub(super) coefficients: &'a mut Coefficients,
    pub(super) effort: &'a Effort,
    /// The most factors, paths times columns, that may be found.
    pub(super) limit: usize,
    /// How many more times an operator may be followed from one level to another.
    pub(super) links: usize,
}

/// A partial path, from the ket up to a place of the chain.
struct Partial {
    /// Operators that are still to come, on the left.
    place: usize,
    level: Level,
    /// From right to left, without the ends.
    inside: Vec<Level>,
    reduced: Surd,
    amplitudes: Vec<Amplitudes>,
}

impl Walk<'_> {
    /// Finds the intermediate levels of every path from ket to bra, and the sum of factors for every column.
    ///
    /// Cost: the number of paths times columns times components; levels from which the bra cannot be reached are never entered.
    pub(super) fn run(&mut self, bra: &State, steps: &[Step], ket: &State) -> Result<Paths, PathError> {
        let bras = self.ends(bra)?;
        let reachable = self.reachable(bras.keys().copied().collect(), steps)?;
        let mut stack = Vec::new();
        for (level, amplitudes) in self.ends(ket)? {
            if reachable[steps.len()].contains(&level) {
                stack.push(Partial { place: steps.len(), level, inside: Vec::new(), reduced: Surd::one(), amplitudes });
            }
        }
        let mut paths = Paths::new();
        while let Some(partial) = stack.pop() {
            self.effort.check()?;
            match partial.place.checked_sub(1) {
                None => self.finish(partial, &bras, &mut paths)?,
                Some(place) => self.extend(partial, &steps[place], &reachable[place], &mut stack)?,
            }
        }
        Ok(paths)
    }

    /// The amplitudes of an end of the bracket by level, for every column.
    fn ends(&self, state: &State) -> Result<BTreeMap<Level, Vec<Amplitudes>>, PathError> {
        let count = self.columns.len();
        let mut ends = BTreeMap::new();
        for column in 0..count {
            for (level, m, amplitude) in self.columns.amplitudes(state, column)? {
                let amplitudes = ends.entry(level).or_insert_with(|| vec![Amplitudes::new(); count]);
                amplitudes[column].insert(m, amplitude);
            }
        }
        Ok(ends)
    }

    /// The levels at every place of the chain that operators join with the bra, from left to right; the last place is the ket's.
    fn reachable(&mut self, bra: BTreeSet<Level>, steps: &[Step]) -> Result<Vec<BTreeSet<Level>>, PathError> {
        let mut places = vec![bra];
        for (i, step) in steps.iter().enumerate() {
            let mut next = BTreeSet::new();
            for level in &places[i] {
                self.effort.check()?;
                let neighbours = self.rules.neighbours(step.tensor, *level, i + 1 < steps.len());
                self.count_links(neighbours.len())?;
                next.extend(neighbours);
            }
            places.push(next);
        }
        Ok(places)
    }

    fn count_links(&mut self, links: usize) -> Result<(), PathError> {
        self.links = self.links.checked_sub(links).ok_or(PathError::TooMany { limit: self.limit })?;
        Ok(())
    }

    fn extend(
        &mut self,
        partial: Partial,
        step: &Step,
        reachable: &BTreeSet<Level>,
        stack: &mut Vec<Partial>,
    ) -> Result<(), PathError> {
        let place = partial.place - 1;
        let mut neighbours = self.rules.neighbours(step.tensor, partial.level, place > 0);
        neighbours.retain(|level| reachable.contains(level));
        self.count_links(neighbours.len())?;
        for level in neighbours {
            let reduced = &partial.reduced * &self.coefficients.reduced(step.tensor, level, partial.level)?;
            let mut amplitudes = Vec::with_capacity(partial.amplitudes.len());
            for from in &partial.amplitudes {
                let to = self.coefficients.carry(step.tensor.total, &step.weights, level.j, partial.level.j, from)?;
                amplitudes.push(to);
            }
            let mut inside = partial.inside.clone();
            if place > 0 {
                inside.push(level);
            }
            stack.push(Partial { place, level, inside, reduced, amplitudes });
        }
        Ok(())
    }

    fn finish(
        &mut self,
        mut partial: Partial,
        bras: &BTreeMap<Level, Vec<Amplitudes>>,
        paths: &mut Paths,
    ) -> Result<(), PathError> {
        let Some(bra) = bras.get(&partial.level) else { return Ok(()) };
        partial.inside.reverse();
        let count = self.columns.len();
        if paths.len().saturating_mul(count) > self.limit {
            return Err(PathError::TooMany { limit: self.limit });
        }
        let factors = paths.entry(partial.inside).or_insert_with(|| vec![Surd::zero(); count]);
        for (column, factor) in factors.iter_mut().enumerate() {
            for (m, amplitude) in &partial.amplitudes[column] {
                if let Some(left) = bra[column].get(m) {
                    *factor += &(&(&left.conj() * amplitude) * &partial.reduced);
                }
            }
        }
        Ok(())
    }
}
