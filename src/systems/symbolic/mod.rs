//! Terms and tensors without numbers: a system of any number of electrons of which only the symmetry is known.
//!
//! States are named by their labels; there is no backend, so nothing has a value. `paths` works on it, and energies stay letters.

mod operators;
mod states;

use super::{
    Atom, Backend, Coupling, Level, Manifold, Number, Obstacle, Sector, State, StateLabel, Symmetry, System,
    SystemError,
};
use crate::angular::selection::BlockRules;
use crate::angular::{self, Electrons, chain};
use crate::num::Effort;
use std::sync::Arc;

/// A system of which only the symmetry is known.
#[derive(Clone, Debug)]
pub struct Symbolic {
    electrons: Electrons,
}

impl Symbolic {
    /// Electrons with spin; `None` for any number of them.
    ///
    /// Errors: no electron at all, or more than 999.
    pub fn new(count: Option<u32>) -> Result<Self, SystemError> {
        match count {
            Some(count) if count == 0 || count > 999 => Err(SystemError::Refused {
                message: format!("{count} electrons make no terms"),
                help: "write electrons=1, electrons=2 or electrons=n for any number".into(),
            }),
            count => Ok(Symbolic { electrons: Electrons { count, spin: true } }),
        }
    }
}

/// Nothing here has a value.
fn no_numbers() -> Obstacle {
    Obstacle::Refused {
        message: "this system knows symmetries only and has no numbers".into(),
        help: "`paths` in front of the expression shows its exact angular factors and what cancels".into(),
    }
}

impl System for Symbolic {
    fn kind(&self) -> &'static str {
        "symbolic"
    }

    fn state(&self, label: &StateLabel, _: &Effort) -> Result<State, SystemError> {
        states::state(label, self.electrons)
    }

    fn manifold(&self, label: &StateLabel, _: &Effort) -> Result<Manifold, SystemError> {
        states::manifold(label, self.electrons)
    }

    fn energy(&self, _: &State, _: u32, _: &Effort) -> Result<Number, Obstacle> {
        Err(no_numbers())
    }

    fn degenerate(&self, a: &State, b: &State) -> bool {
        states::same_term(a, b)
    }

    fn level_in(&self, _: &State, _: Sector, _: &Effort) -> Result<Vec<State>, Obstacle> {
        Err(no_numbers())
    }

    fn knows(&self, atom: &Atom) -> Result<bool, SystemError> {
        operators::knows(atom, self.electrons)
    }

    fn couple(&self, _: &Atom, _: Sector) -> Vec<Coupling> {
        Vec::new()
    }

    fn adjoint(&self, atom: &Atom) -> (i32, Atom) {
        operators::adjoint(atom)
    }

    fn selection_rule(&self, _: &Atom) -> String {
        String::new()
    }

    fn exact(&self, _: &Effort) -> Option<Arc<dyn Backend>> {
        None
    }

    fn numeric(&self, _: Level, _: &State, _: &Effort) -> Result<Arc<dyn Backend>, Obstacle> {
        Err(no_numbers())
    }

    fn basis_range(&self) -> Option<(usize, usize)> {
        None
    }

    fn data_bits(&self) -> u32 {
        0
    }

    fn holds(&self, manifold: &Manifold, state: &State) -> bool {
        states::holds(manifold, state)
    }

    fn symmetry(&self) -> Option<&dyn Symmetry> {
        Some(self)
    }
}

impl Symmetry for Symbolic {
    fn rules(&self) -> BlockRules {
        BlockRules::of(self.electrons)
    }

    fn end(&self, state: &State) -> Result<chain::State, SystemError> {
        states::end(state, self.electrons)
    }

    fn tensors(&self, atom: &Atom) -> Result<chain::Operator, SystemError> {
        operators::tensors(atom, self.electrons)
    }

    fn levels(&self, manifold: &Manifold) -> Vec<angular::Level> {
        states::levels(manifold)
    }
}
