//! Plain matrices. Not there yet: no value of the type exists.

use super::*;

pub enum MatrixSystem {}
pub enum ExactMatrix {}

fn not_yet<T>() -> Result<T, SystemError> {
    Err(SystemError::NotYet("matrix".into()))
}

impl ExactMatrix {
    pub fn from_matrix_market(_: &str) -> Result<Self, SystemError> {
        not_yet()
    }
    pub fn from_rows(_: Vec<Vec<Surd>>) -> Result<Self, SystemError> {
        not_yet()
    }
    pub fn from_diagonals(_: Vec<Vec<Surd>>) -> Result<Self, SystemError> {
        not_yet()
    }
}

impl MatrixSystem {
    pub fn new(_: Vec<(String, ExactMatrix)>) -> Result<Self, SystemError> {
        not_yet()
    }
}

impl System for MatrixSystem {
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
