//! Level tables: the energies and reduced elements a person has, measured or computed, with their uncertainties.
//!
//! H is diagonal in the levels of the file, so sums over states run over these levels and no others, and an element the file does not give is zero.
//! Every number of the file that has an uncertainty is a datum of the system: what comes out carries it.

mod backend;
mod fault;
mod labels;
mod numbers;
mod operators;
mod reader;
mod rows;
mod symmetry;
mod table;
mod units;

pub use fault::{Defect, MOST_FAULTS, TableFault};

use super::symmetry::Symmetry;
use super::{
    Atom, Backend, Coupling, Level, Manifold, Number, Obstacle, Sector, State, StateLabel, System, SystemError,
};
use crate::num::units::ConstantSet;
use crate::num::{Effort, Surd};
use backend::LevelBackend;
use rug::Rational;
use std::collections::HashMap;
use std::sync::{Arc, Mutex, PoisonError};
use table::Table;

/// Most answers kept of where operators lead.
const KEPT_COUPLINGS: usize = 10_000;

/// Where operators lead from sectors, as far as it was asked.
type Couplings = Mutex<HashMap<(Atom, Sector), Vec<Coupling>>>;

/// A system given by a table of levels and reduced elements.
#[derive(Clone)]
pub struct LevelSystem {
    table: Arc<Table>,
    couplings: Arc<Couplings>,
}

impl LevelSystem {
    /// The system of a file's text.
    ///
    /// Units: as the file says; atomic units inside, by the Rydberg constant of the set.
    /// Errors: every defect of the text, by line and column, up to [`MOST_FAULTS`].
    pub fn read(text: &str, constants: ConstantSet) -> Result<Self, Vec<TableFault>> {
        rows::table(text, constants).map(|table| LevelSystem { table: Arc::new(table), couplings: Arc::default() })
    }

    /// The names of the operators: those of the file in its order, and the total J.
    pub fn operators(&self) -> Vec<String> {
        let tensors = self.table.shape.operators.iter().map(|operator| operator.name.clone());
        tensors.chain(["J".to_string()]).collect()
    }

    fn index_of(&self, state: &State) -> Result<usize, Obstacle> {
        labels::level_of(state).filter(|level| *level < self.table.shape.levels.len()).ok_or(Obstacle::Inexact)
    }
}

impl System for LevelSystem {
    fn kind(&self) -> &'static str {
        "levels"
    }

    fn state(&self, label: &StateLabel, _: &Effort) -> Result<State, SystemError> {
        labels::state(&self.table.shape, label)
    }

    fn manifold(&self, label: &StateLabel, _: &Effort) -> Result<Manifold, SystemError> {
        labels::manifold(&self.table.shape, label)
    }

    fn energy(&self, state: &State, _: u32, _: &Effort) -> Result<Number, Obstacle> {
        Ok(Number::Exact(Surd::from(self.table.energy(self.index_of(state)?).clone())))
    }

    fn degenerate(&self, a: &State, b: &State) -> bool {
        match (labels::level_of(a), labels::level_of(b)) {
            (Some(a), Some(b)) => self.table.shape.degenerate(a, b),
            _ => false,
        }
    }

    fn level_in(&self, state: &State, sector: Sector, _: &Effort) -> Result<Vec<State>, Obstacle> {
        Ok(labels::level_in(&self.table.shape, state, sector))
    }

    fn level(&self, state: &State, effort: &Effort) -> Result<Vec<State>, Obstacle> {
        let level = self.index_of(state)?;
        let shape = &self.table.shape;
        let mut states = Vec::new();
        for other in (0..shape.levels.len()).filter(|other| shape.degenerate(level, *other)) {
            effort.check()?;
            states.extend(labels::states_of(shape, other));
        }
        Ok(states)
    }

    fn states_of(&self, manifold: &Manifold, effort: &Effort) -> Result<Vec<State>, Obstacle> {
        effort.check()?;
        let levels = manifold.numbers.iter().filter_map(|index| usize::try_from(*index).ok());
        Ok(levels.flat_map(|level| labels::states_of(&self.table.shape, level)).collect())
    }

    fn members(&self, manifold: &Manifold, sector: Sector) -> Vec<State> {
        let shape = &self.table.shape;
        let levels = manifold.numbers.iter().filter_map(|index| usize::try_from(*index).ok());
        let here = levels.filter(|level| shape.levels.get(*level).is_some_and(|entry| entry.block == sector.block));
        here.map(|level| labels::named_state(shape, level, Some(sector.twice_m))).collect()
    }

    fn holds(&self, manifold: &Manifold, state: &State) -> bool {
        state.numbers.first().is_some_and(|level| manifold.numbers.contains(level))
    }

    fn knows(&self, atom: &Atom) -> Result<bool, SystemError> {
        operators::read(&self.table.shape, atom).map(|operator| operator.is_some())
    }

    fn couple(&self, atom: &Atom, from: Sector) -> Vec<Coupling> {
        let mut couplings = self.couplings.lock().unwrap_or_else(PoisonError::into_inner);
        if let Some(known) = couplings.get(&(atom.clone(), from)) {
            return known.clone();
        }
        let found = match operators::read(&self.table.shape, atom) {
            Ok(Some(operator)) => operators::couple(&self.table.shape, &operator, from),
            _ => Vec::new(),
        };
        if couplings.len() < KEPT_COUPLINGS {
            couplings.insert((atom.clone(), from), found.clone());
        }
        found
    }

    fn adjoint(&self, atom: &Atom) -> (i32, Atom) {
        operators::adjoint(atom)
    }

    fn selection_rule(&self, atom: &Atom) -> String {
        operators::selection_rule(&self.table.shape, atom)
    }

    fn exact(&self, effort: &Effort) -> Option<Arc<dyn Backend>> {
        Some(Arc::new(LevelBackend { table: self.table.clone(), bits: None, effort: effort.clone() }))
    }

    fn numeric(&self, level: Level, _: &State, effort: &Effort) -> Result<Arc<dyn Backend>, Obstacle> {
        Ok(Arc::new(LevelBackend { table: self.table.clone(), bits: Some(level.bits), effort: effort.clone() }))
    }

    fn basis_range(&self) -> Option<(usize, usize)> {
        None
    }

    fn data_bits(&self) -> u32 {
        0
    }

    fn symmetry(&self) -> Option<&dyn Symmetry> {
        Some(self)
    }

    fn data(&self) -> Vec<Rational> {
        self.table.uncertainties()
    }

    fn moved(&self, datum: usize, by: &Rational) -> Result<Arc<dyn System>, SystemError> {
        // the angular part is the same, so what is known of the couplings stays
        let table = Arc::new(self.table.moved(datum, by)?);
        Ok(Arc::new(LevelSystem { table, couplings: self.couplings.clone() }))
    }
}
