//! A system with some of its levels moved: fine-structure splittings, measured energies.
//!
//! H + sum over levels of d P, where P projects on the states of the level. The eigenstates stay what they are; their energies and every
//! function of H change. Where the base has no numbers, the shifts are for `paths` alone.

mod backend;

use super::{
    Atom, Backend, Coupling, Level, LevelShift, Manifold, Number, Obstacle, RadialOperator, Sector, State, StateLabel,
    Symmetry, System, SystemError,
};
use crate::angular::chain;
use crate::angular::selection::BlockRules;
use crate::num::{Effort, Surd};
use backend::ShiftedBackend;
use rug::Rational;
use std::sync::Arc;

/// The radial part of H, which the backend here takes apart itself.
const HAMILTONIAN: &str = "shifted H";

/// A level with its shift.
#[derive(Clone, Debug)]
pub struct Shift {
    pub manifold: Manifold,
    /// In hartree.
    pub by: Rational,
    /// Standard uncertainty of `by`; zero for none.
    pub sigma: Rational,
}

/// A system with levels moved.
#[derive(Clone)]
pub struct Shifted {
    base: Arc<dyn System>,
    shifts: Arc<Vec<Shift>>,
}

impl Shifted {
    /// Moves levels of a system by label; energies in hartree with their standard uncertainties.
    ///
    /// Errors: labels the base does not know; levels that overlap.
    pub fn new(
        base: Arc<dyn System>,
        levels: Vec<(StateLabel, Rational, Rational)>,
        effort: &Effort,
    ) -> Result<Self, SystemError> {
        let mut shifts: Vec<Shift> = Vec::with_capacity(levels.len());
        for (label, by, sigma) in levels {
            let manifold = base.manifold(&label, effort)?;
            if let Some(other) = shifts.iter().find(|other| overlap(&*base, &other.manifold, &manifold)) {
                return Err(SystemError::Refused {
                    message: format!("{} and {} have states in common", other.manifold.label, manifold.label),
                    help: "give every level one shift".into(),
                });
            }
            shifts.push(Shift { manifold, by, sigma });
        }
        Ok(Shifted { base, shifts: Arc::new(shifts) })
    }

    /// How far a state is moved.
    fn shift_of(&self, state: &State) -> Rational {
        let own = self.shifts.iter().find(|shift| self.base.holds(&shift.manifold, state));
        own.map(|shift| shift.by.clone()).unwrap_or_default()
    }

    /// The states of the moved levels in a sector.
    fn moved_in(&self, sector: Sector) -> Vec<State> {
        self.shifts.iter().flat_map(|shift| self.base.members(&shift.manifold, sector)).collect()
    }
}

/// Whether two manifolds of a system share a level; told by the levels and the family they belong to.
fn overlap(base: &dyn System, a: &Manifold, b: &Manifold) -> bool {
    let Some(symmetry) = base.symmetry() else { return a.numbers == b.numbers };
    let (first, second) = (symmetry.levels(a), symmetry.levels(b));
    family(&a.label) == family(&b.label) && first.iter().any(|level| second.contains(level))
}

/// The label without J: levels with one radial function.
fn family(label: &str) -> &str {
    label.split('_').next().unwrap_or(label)
}

/// The sum of a number and a rational.
fn plus(number: &Number, by: &Rational, bits: u32) -> Number {
    number.plus(&Number::Exact(Surd::from(by.clone())), bits)
}

impl System for Shifted {
    fn kind(&self) -> &'static str {
        "shifted"
    }

    /// Errors: as the base; a state of several J of which some are moved, since it is no eigenstate.
    fn state(&self, label: &StateLabel, effort: &Effort) -> Result<State, SystemError> {
        let state = self.base.state(label, effort)?;
        let Some(symmetry) = self.base.symmetry() else { return Ok(state) };
        let end = symmetry.end(&state)?;
        if matches!(end.vector, chain::AngularVector::Product { .. }) {
            let own = family(&label.text);
            let split = self.shifts.iter().find(|shift| {
                family(&shift.manifold.label) == own
                    && !self.base.holds(&shift.manifold, &state)
                    && symmetry.levels(&shift.manifold).iter().any(|level| level.term == end.term)
            });
            if let Some(split) = split {
                return Err(SystemError::Refused {
                    message: format!("{} is no eigenstate, since {} is moved", state.label, split.manifold.label),
                    help: "name a state of one J, as [2^3P_1, M=0]".into(),
                });
            }
        }
        Ok(state)
    }

    fn manifold(&self, label: &StateLabel, effort: &Effort) -> Result<Manifold, SystemError> {
        self.base.manifold(label, effort)
    }

    fn energy(&self, state: &State, bits: u32, effort: &Effort) -> Result<Number, Obstacle> {
        Ok(plus(&self.base.energy(state, bits, effort)?, &self.shift_of(state), bits))
    }

    fn degenerate(&self, a: &State, b: &State) -> bool {
        self.base.degenerate(a, b) && self.shift_of(a) == self.shift_of(b)
    }

    fn level_in(&self, state: &State, sector: Sector, effort: &Effort) -> Result<Vec<State>, Obstacle> {
        let mut states = self.base.level_in(state, sector, effort)?;
        states.retain(|other| self.degenerate(state, other));
        Ok(states)
    }

    fn knows(&self, atom: &Atom) -> Result<bool, SystemError> {
        self.base.knows(atom)
    }

    fn couple(&self, atom: &Atom, from: Sector) -> Vec<Coupling> {
        if atom.name == "H" {
            let radial = RadialOperator { kind: HAMILTONIAN, index: 0 };
            return vec![Coupling { to: from, factor: Surd::one(), radial }];
        }
        self.base.couple(atom, from)
    }

    fn adjoint(&self, atom: &Atom) -> (i32, Atom) {
        self.base.adjoint(atom)
    }

    fn selection_rule(&self, atom: &Atom) -> String {
        self.base.selection_rule(atom)
    }

    fn exact(&self, effort: &Effort) -> Option<Arc<dyn Backend>> {
        let base = self.base.exact(effort)?;
        Some(Arc::new(ShiftedBackend { system: self.clone(), base, bits: None, effort: effort.clone() }))
    }

    fn numeric(&self, level: Level, anchor: &State, effort: &Effort) -> Result<Arc<dyn Backend>, Obstacle> {
        let base = self.base.numeric(level, anchor, effort)?;
        Ok(Arc::new(ShiftedBackend { system: self.clone(), base, bits: Some(level.bits), effort: effort.clone() }))
    }

    fn parameters(&self) -> Vec<(&'static str, Rational)> {
        self.base.parameters()
    }

    fn basis_range(&self) -> Option<(usize, usize)> {
        self.base.basis_range()
    }

    fn data_bits(&self) -> u32 {
        self.base.data_bits()
    }

    fn members(&self, manifold: &Manifold, sector: Sector) -> Vec<State> {
        self.base.members(manifold, sector)
    }

    fn holds(&self, manifold: &Manifold, state: &State) -> bool {
        self.base.holds(manifold, state)
    }

    fn symmetry(&self) -> Option<&dyn Symmetry> {
        self.base.symmetry().is_some().then_some(self as &dyn Symmetry)
    }

    /// The data of the base, then the shifts.
    fn data(&self) -> Vec<Rational> {
        let mut data = self.base.data();
        data.extend(self.shifts.iter().map(|shift| shift.sigma.clone()));
        data
    }

    fn moved(&self, datum: usize, by: &Rational) -> Result<Arc<dyn System>, SystemError> {
        let count = self.base.data().len();
        let Some(own) = datum.checked_sub(count) else {
            return Ok(Arc::new(Shifted { base: self.base.moved(datum, by)?, shifts: self.shifts.clone() }));
        };
        let mut shifts = (*self.shifts).clone();
        if let Some(shift) = shifts.get_mut(own) {
            shift.by += by;
        }
        Ok(Arc::new(Shifted { base: self.base.clone(), shifts: Arc::new(shifts) }))
    }
}

/// Symmetry is that of the base. Every method but `shifts` is asked of systems that have one.
impl Symmetry for Shifted {
    fn rules(&self) -> BlockRules {
        self.base.symmetry().map_or(BlockRules::of(crate::angular::Electrons::ANY), Symmetry::rules)
    }

    fn end(&self, state: &State) -> Result<chain::State, SystemError> {
        self.base.symmetry().ok_or_else(no_symmetry)?.end(state)
    }

    fn tensors(&self, atom: &Atom) -> Result<chain::Operator, SystemError> {
        self.base.symmetry().ok_or_else(no_symmetry)?.tensors(atom)
    }

    fn levels(&self, manifold: &Manifold) -> Vec<crate::angular::Level> {
        self.base.symmetry().map(|symmetry| symmetry.levels(manifold)).unwrap_or_default()
    }

    fn shifts(&self) -> Vec<LevelShift> {
        let Some(symmetry) = self.base.symmetry() else { return Vec::new() };
        let mut out = symmetry.shifts();
        for shift in self.shifts.iter() {
            for level in symmetry.levels(&shift.manifold) {
                let family = family(&shift.manifold.label).to_string();
                out.push(LevelShift { family, level, by: shift.by.clone() });
            }
        }
        out
    }
}

fn no_symmetry() -> SystemError {
    SystemError::Refused { message: "the system has no angular momenta".into(), help: String::new() }
}
