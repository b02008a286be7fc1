//! Functions of the Hamiltonian with moved levels.

use super::{HAMILTONIAN, Shifted};
use crate::num::{Effort, Surd};
use crate::systems::{
    Backend, BlockKet, FunctionOfH, Number, Obstacle, Omitted, RadialOperator, Resolvent, Sector, State, System,
};
use std::sync::Arc;

/// A backend of the base with the moved levels taken out of H and put in where they belong.
pub(super) struct ShiftedBackend {
    pub system: Shifted,
    pub base: Arc<dyn Backend>,
    /// `None` for the exact backend.
    pub bits: Option<u32>,
    pub effort: Effort,
}

impl ShiftedBackend {
    fn precision(&self) -> u32 {
        self.bits.unwrap_or(64)
    }

    /// The part of an eigenstate in a sector.
    fn part(&self, state: &State, sector: Sector) -> Result<Option<BlockKet>, Obstacle> {
        Ok(self.base.state(state)?.into_iter().find(|(place, _)| *place == sector).map(|(_, ket)| ket))
    }

    fn is_left_out(&self, state: &State, omitted: &[Omitted]) -> bool {
        omitted.iter().any(|omitted| match omitted {
            Omitted::LevelOf(other) => self.system.degenerate(state, other),
            Omitted::Manifold(manifold) => self.system.base.holds(manifold, state),
        })
    }

    /// The states that are treated one by one in a sector: those of moved levels, and those the base would leave out as well because they are
    /// degenerate there.
    fn singled_out(&self, omitted: &[Omitted], sector: Sector) -> Result<Vec<State>, Obstacle> {
        let mut states = self.system.moved_in(sector);
        for omitted in omitted {
            if let Omitted::LevelOf(state) = omitted {
                for other in self.system.base.level_in(state, sector, &self.effort)? {
                    if !states.contains(&other) {
                        states.push(other);
                    }
                }
            }
        }
        Ok(states)
    }

    /// What the base leaves out: all that is treated one by one.
    fn left_to_base(&self, omitted: &[Omitted]) -> Vec<Omitted> {
        let moved = self.system.shifts.iter().map(|shift| Omitted::Manifold(shift.manifold.clone()));
        omitted.iter().cloned().chain(moved).collect()
    }

    /// |state> <state|ket> times a number.
    fn projected(
        &self,
        state: &State,
        sector: Sector,
        ket: &BlockKet,
        factor: impl FnOnce() -> Result<Number, Obstacle>,
    ) -> Result<Option<(Number, BlockKet)>, Obstacle> {
        let Some(part) = self.part(state, sector)? else { return Ok(None) };
        let overlap = self.base.overlap(sector, &part, ket)?;
        if overlap.is_zero() {
            return Ok(None);
        }
        Ok(Some((overlap.times(&factor()?, self.precision()), part)))
    }
}

impl Backend for ShiftedBackend {
    fn state(&self, state: &State) -> Result<Vec<(Sector, BlockKet)>, Obstacle> {
        self.base.state(state)
    }

    /// H + sum of d |state><state|.
    fn apply(&self, operator: &RadialOperator, from: Sector, to: Sector, ket: &BlockKet) -> Result<BlockKet, Obstacle> {
        if operator.kind != HAMILTONIAN {
            return self.base.apply(operator, from, to, ket);
        }
        let atom = crate::systems::Atom { name: "H".into(), component: None, arguments: Vec::new(), power: 1 };
        let mut terms = Vec::new();
        for coupling in self.system.base.couple(&atom, from) {
            let image = self.base.apply(&coupling.radial, from, coupling.to, ket)?;
            terms.push((Number::Exact(coupling.factor), image));
        }
        for state in self.system.moved_in(from) {
            let by = Number::Exact(Surd::from(self.system.shift_of(&state)));
            terms.extend(self.projected(&state, from, ket, || Ok(by))?);
        }
        self.base.combine(from, &terms)
    }

    fn resolve(&self, resolvent: &Resolvent, sector: Sector, ket: &BlockKet) -> Result<BlockKet, Obstacle> {
        let inside = Resolvent { z: resolvent.z.clone(), omitted: self.left_to_base(&resolvent.omitted) };
        let mut terms = vec![(Number::Exact(Surd::one()), self.base.resolve(&inside, sector, ket)?)];
        for state in self.singled_out(&resolvent.omitted, sector)? {
            if self.is_left_out(&state, &resolvent.omitted) {
                continue;
            }
            let bits = self.precision();
            let fraction = || {
                let energy = self.system.energy(&state, bits + 16, &self.effort)?;
                let difference = resolvent.z.plus(&energy.negated(), bits);
                difference.inverse(bits).ok_or_else(|| Obstacle::Singular { level: state.label.clone() })
            };
            terms.extend(self.projected(&state, sector, ket, fraction)?);
        }
        self.base.combine(sector, &terms)
    }

    fn function(&self, _: &FunctionOfH, _: Sector, _: &BlockKet) -> Result<BlockKet, Obstacle> {
        Err(Obstacle::NotYet("functions of H other than fractions in a system with moved levels".into()))
    }

    fn combine(&self, sector: Sector, terms: &[(Number, BlockKet)]) -> Result<BlockKet, Obstacle> {
        self.base.combine(sector, terms)
    }

    fn overlap(&self, sector: Sector, bra: &BlockKet, ket: &BlockKet) -> Result<Number, Obstacle> {
        self.base.overlap(sector, bra, ket)
    }

    fn element(
        &self,
        operator: &RadialOperator,
        from: Sector,
        to: Sector,
        bra: &BlockKet,
        ket: &BlockKet,
    ) -> Result<Number, Obstacle> {
        if operator.kind == HAMILTONIAN {
            let image = self.apply(operator, from, to, ket)?;
            return self.base.overlap(to, bra, &image);
        }
        self.base.element(operator, from, to, bra, ket)
    }

    fn vanishes(&self, ket: &BlockKet) -> bool {
        self.base.vanishes(ket)
    }
}
