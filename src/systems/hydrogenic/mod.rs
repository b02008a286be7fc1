//! One electron in a Coulomb field. Not there yet: no value of the type exists.

use super::*;

pub enum Hydrogenic {}

impl Hydrogenic {
    pub fn new(_: Rational, _: Option<Rational>) -> Result<Self, SystemError> {
        Err(SystemError::NotYet("hydrogenic".into()))
    }
}

impl System for Hydrogenic {
    fn kind(&self) -> &'static str {
        match *self {}
    }
    fn state(&self, _: &StateLabel, _: &Effort) -> Result<State, SystemError> {
        match *self {}
    }
    fn manifold(&self, _: &StateLabel, _: &Effort) -> Result<Manifold, SystemError> {
        match *self {}
    }
    fn energy(&self, _: &State, _: u32, _: &Effort) -> Result<Number, Obstacle> {
        match *self {}
    }
    fn degenerate(&self, _: &State, _: &State) -> bool {
        match *self {}
    }
    fn knows(&self, _: &Atom) -> Result<bool, SystemError> {
        match *self {}
    }
    fn couple(&self, _: &Atom, _: Sector) -> Vec<Coupling> {
        match *self {}
    }
    fn adjoint(&self, _: &Atom) -> (i32, Atom) {
        match *self {}
    }
    fn selection_rule(&self, _: &Atom) -> String {
        match *self {}
    }
    fn exact(&self, _: &Effort) -> Option<Arc<dyn Backend>> {
        match *self {}
    }
    fn numeric(&self, _: Level, _: &State, _: &Effort) -> Result<Arc<dyn Backend>, Obstacle> {
        match *self {}
    }
    fn basis_range(&self) -> Option<(usize, usize)> {
        match *self {}
    }
    fn data_bits(&self) -> u32 {
        match *self {}
    }
}
