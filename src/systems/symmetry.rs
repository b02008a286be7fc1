//! What the angular algebra knows of a system: its blocks, its states as angular vectors, its operators as tensors.

use super::{Atom, State, SystemError};
use crate::angular::chain;
use crate::angular::selection::BlockRules;

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
}
