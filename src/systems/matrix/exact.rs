//! The exact backend: kets are sparse vectors of exact numbers.

use super::component::shifted_rows;
use super::elimination::solve;
use super::entries::ExactKet;
use super::vectors::{add_multiple, inner, orthogonal, projection};
use super::{MatrixSystem, WHOLE};
use crate::num::{Effort, Surd};
use crate::systems::{Backend, BlockKet, FunctionOfH, Number, Obstacle, RadialOperator, Resolvent, Sector, State};
use std::sync::Arc;

/// Exact kets of a matrix system.
pub struct ExactBackend {
    pub system: MatrixSystem,
    pub effort: Effort,
}

fn open(ket: &BlockKet) -> Result<&ExactKet, Obstacle> {
    ket.downcast_ref().ok_or(Obstacle::Inexact)
}

fn exact(number: &Number) -> Result<&Surd, Obstacle> {
    match number {
        Number::Exact(value) => Ok(value),
        Number::Approx(_) => Err(Obstacle::Inexact),
    }
}

impl ExactBackend {
    /// Solves (z - H) x = b inside one component, for b orthogonal to `left_out` states at z; x may have any part along these.
    fn solve_in(
        &self,
        component: usize,
        z: &Surd,
        source: &ExactKet,
        left_out: usize,
        solution: &mut ExactKet,
    ) -> Result<(), Obstacle> {
        let part = &self.system.components[component];
        let singular = || -> Obstacle {
            match self.system.level_at(z, &self.effort) {
                Ok(Some(level)) => Obstacle::Singular { level: format!("{} (energy {z})", level.name()) },
                Ok(None) => Obstacle::Inexact,
                Err(obstacle) => obstacle,
            }
        };
        if let [only] = part.members.as_slice() {
            let difference = z - &self.system.hamiltonian().entry(*only, *only);
            return match (difference.is_zero(), source.get(only)) {
                (false, Some(b)) => {
                    let inverse = difference.inverse().ok_or(Obstacle::Inexact)?;
                    solution.insert(*only, b * &inverse);
                    Ok(())
                }
                (true, Some(_)) if left_out == 0 => Err(singular()),
                _ => Ok(()),
            };
        }
        let rows =
            shifted_rows(self.system.hamiltonian(), part, z, |row| source.get(&row).cloned().unwrap_or_default());
        let solutions = solve(rows, &self.effort)?.ok_or(Obstacle::Inexact)?;
        if solutions.null_space.len() > left_out {
            return Err(singular());
        }
        let particular = solutions.particular.ok_or(Obstacle::Inexact)?;
        solution.extend(part.members.iter().copied().zip(particular).filter(|(_, x)| !x.is_zero()));
        Ok(())
    }
}

impl Backend for ExactBackend {
    fn state(&self, state: &State) -> Result<Vec<(Sector, BlockKet)>, Obstacle> {
        let place = self.system.place(&state.numbers);
        let level = self.system.level(place, &self.effort)?;
        let states = level.states.as_ref().ok_or(Obstacle::Inexact)?;
        let ket = states.get(place - level.first).cloned().ok_or(Obstacle::Inexact)?;
        Ok(vec![(WHOLE, Arc::new(ket))])
    }

    fn apply(&self, operator: &RadialOperator, _: Sector, _: Sector, ket: &BlockKet) -> Result<BlockKet, Obstacle> {
        self.effort.check()?;
        Ok(Arc::new(self.system.matrix(operator).apply(open(ket)?)))
    }

    fn resolve(&self, resolvent: &Resolvent, _: Sector, ket: &BlockKet) -> Result<BlockKet, Obstacle> {
        let z = exact(&resolvent.z)?;
        let mut omitted: Vec<ExactKet> = Vec::new();
        // Number of states at z that are left out, by component.
        let mut omitted_at_z = vec![0; self.system.components.len()];
        for level in self.system.omitted_levels(&resolvent.omitted, &self.effort)? {
            for part in &level.parts {
                omitted.extend(part.span.as_ref().ok_or(Obstacle::Inexact)?.iter().cloned());
                if level.energy.as_ref() == Some(z) {
                    omitted_at_z[part.component] += part.places.len();
                }
            }
        }
        let basis = orthogonal(&omitted).ok_or(Obstacle::Inexact)?;
        let project = |vector: &ExactKet| {
            let mut rest = vector.clone();
            add_multiple(&mut rest, &Surd::from(-1), &projection(&basis, vector));
            rest
        };
        let source = project(open(ket)?);
        let mut touched: Vec<usize> = source.keys().map(|k| self.system.owner[*k]).collect();
        touched.sort_unstable();
        touched.dedup();
        let mut solution = ExactKet::new();
        for component in touched {
            self.effort.check()?;
            self.solve_in(component, z, &source, omitted_at_z[component], &mut solution)?;
        }
        Ok(Arc::new(project(&solution)))
    }

    fn function(&self, _: &FunctionOfH, _: Sector, _: &BlockKet) -> Result<BlockKet, Obstacle> {
        Err(Obstacle::Inexact)
    }

    fn combine(&self, _: Sector, terms: &[(Number, BlockKet)]) -> Result<BlockKet, Obstacle> {
        let mut sum = ExactKet::new();
        for (factor, ket) in terms {
            let factor = exact(factor)?;
            if !factor.is_zero() {
                add_multiple(&mut sum, factor, open(ket)?);
            }
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
