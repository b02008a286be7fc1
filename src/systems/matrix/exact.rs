//! The exact backend: kets are sparse vectors of exact numbers.

use super::MatrixSystem;
use super::elimination::solve;
use super::levels::{ExactKet, add_multiple, inner, orthogonal, projection};
use crate::num::{Effort, Surd};
use crate::systems::{
    Backend, Block, BlockKet, FunctionOfH, Number, Obstacle, RadialOperator, Resolvent, Sector, State,
};
use std::sync::Arc;

/// Exact kets of a matrix system.
pub struct ExactBackend {
    pub system: MatrixSystem,
    pub effort: Effort,
}

/// The only sector of a matrix.
pub const WHOLE: Sector = Sector { block: Block::Whole, twice_m: 0 };

fn open(ket: &BlockKet) -> Result<&ExactKet, Obstacle> {
    ket.downcast_ref().ok_or(Obstacle::Inexact)
}

fn exact(number: &Number) -> Result<&Surd, Obstacle> {
    match number {
        Number::Exact(value) => Ok(value),
        Number::Approx(_) => Err(Obstacle::Inexact),
    }
}

impl Backend for ExactBackend {
    fn state(&self, state: &State) -> Result<Vec<(Sector, BlockKet)>, Obstacle> {
        let index = self.system.index(state);
        let level = self.system.level(index, &self.effort)?;
        let states = level.exact.and_then(|exact| exact.states).ok_or(Obstacle::Inexact)?;
        let ket = states.get(index - level.first).cloned().ok_or(Obstacle::Inexact)?;
        Ok(vec![(WHOLE, Arc::new(ket))])
    }

    fn apply(&self, operator: &RadialOperator, _: Sector, _: Sector, ket: &BlockKet) -> Result<BlockKet, Obstacle> {
        self.effort.check()?;
        Ok(Arc::new(self.system.matrix(operator).apply(open(ket)?)))
    }

    fn resolve(&self, resolvent: &Resolvent, _: Sector, ket: &BlockKet) -> Result<BlockKet, Obstacle> {
        let z = exact(&resolvent.z)?;
        let mut omitted = Vec::new();
        let mut omitted_at_z = Vec::new();
        for first in self.system.omitted_levels(&resolvent.omitted, &self.effort)? {
            let level = self.system.level(first, &self.effort)?;
            let level = level.exact.ok_or(Obstacle::Inexact)?;
            if level.energy == *z {
                omitted_at_z.extend(level.span.iter().cloned());
            }
            omitted.extend(level.span);
        }
        let basis = orthogonal(&omitted).ok_or(Obstacle::Inexact)?;
        let project = |vector: &ExactKet| {
            let mut rest = vector.clone();
            add_multiple(&mut rest, &Surd::from(-1), &projection(&basis, vector));
            rest
        };
        let source = project(open(ket)?);
        let mut solution = ExactKet::new();
        for component in &self.system.components {
            let left_out = omitted_at_z.iter().filter(|v| v.keys().any(|k| component.binary_search(k).is_ok())).count();
            let right = |row: usize| source.get(&row).cloned().unwrap_or_default();
            if component.iter().all(|row| !source.contains_key(row)) {
                continue;
            }
            let rows = self.system.shifted_rows(component, z, right).ok_or(Obstacle::Inexact)?;
            let solutions = solve(rows, &self.effort)?.ok_or(Obstacle::Inexact)?;
            if solutions.null_space.len() > left_out {
                return Err(Obstacle::Singular { level: self.system.level_at(z, &self.effort) });
            }
            let Some(particular) = solutions.particular else { return Err(Obstacle::Inexact) };
            solution.extend(component.iter().copied().zip(particular).filter(|(_, x)| !x.is_zero()));
        }
        Ok(Arc::new(project(&solution)))
    }

    fn function(&self, _: &FunctionOfH, _: Sector, _: &BlockKet) -> Result<BlockKet, Obstacle> {
        Err(Obstacle::Inexact)
    }

    fn combine(&self, _: Sector, terms: &[(Number, BlockKet)]) -> Result<BlockKet, Obstacle> {
        let mut sum = ExactKet::new();
        for (factor, ket) in terms {
            add_multiple(&mut sum, exact(factor)?, open(ket)?);
        }
        Ok(Arc::new(sum))
    }

    fn overlap(&self, _: Sector, bra: &BlockKet, ket: &BlockKet) -> Result<Number, Obstacle> {
        Ok(Number::Exact(inner(open(bra)?, open(ket)?)))
    }

    fn element(
        &self,
        operator: &RadialOperator,
        from: Sector,
        to: Sector,
        bra: &BlockKet,
        ket: &BlockKet,
    ) -> Result<Number, Obstacle> {
        let image = self.apply(operator, from, to, ket)?;
        self.overlap(to, bra, &image)
    }

    fn vanishes(&self, ket: &BlockKet) -> bool {
        open(ket).is_ok_and(ExactKet::is_empty)
    }
}
