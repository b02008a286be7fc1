//! What the angular algebra knows of a system: its blocks, its states as angular vectors, its operators as tensors.

use super::{Atom, Manifold, State, SystemError};
use crate::angular::selection::BlockRules;
use crate::angular::{Level, chain};
use rug::Rational;

/// A system whose states have angular momenta.
pub trait Symmetry: Send + Sync {
    /// The intermediate blocks the system has.
    fn rules(&self) -> BlockRules;

    /// A state as the end of a bracket; its name tells radial functions apart (`2p`), its M is left open where the label leaves it open.
    fn end(&self, state: &State) -> Result<chain::State, SystemError>;

    /// An operator as a sum of components of tensors. The name of each element tells the radial operators apart.
    ///
    /// Errors: as [`super::System::knows`].
    fn tensors(&self, atom: &Atom) -> Result<chain::Operator, SystemError>;

    /// The levels whose states make up a manifold.
    fn levels(&self, manifold: &Manifold) -> Vec<Level>;

    /// The levels that were moved away from where the Hamiltonian of the system has them.
    fn shifts(&self) -> Vec<LevelShift> {
        Vec::new()
    }
}

/// A level that was moved.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct LevelShift {
    /// Levels with one radial function have one family, as `2^3P`.
    pub family: String,
    pub level: Level,
    /// In hartree.
    pub by: Rational,
}
