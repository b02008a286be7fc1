//! The exact decomposition of sums of chains over their intermediate blocks.
//!
//! `<g|O1 G O2 … On|g'> = sum over (b1 … b_{n-1}) of c(b1 …) prod <L_iS_i|||O_i|||L_{i+1}S_{i+1}>` with the resolvents of the blocks between,
//! b = (parity, L, S, J). What this folder promises:
//!
//! - Every path the triangles, the parities and the rules of the system leave open is there, with its exact factor, zero or not.
//! - Paths with the same radial part have the same [`ChainKey`]; J is in it only where something is said to depend on J.
//! - Nothing numerical, no language, no system.

mod blocked;
mod coefficients;
mod columns;
mod decompose;
mod key;
mod walk;

pub use blocked::{Broken, blocked};
pub(in crate::angular) use coefficients::{Amplitudes, Coefficients};
pub use columns::Columns;
pub(crate) use decompose::sort_brackets;
pub use decompose::{Contribution, Decomposition, Setting, decompose};
pub use key::{Block, ChainKey, Endpoint, Orientation, RadialChain};

use super::half_integer::AngularError;
use super::polarization::ComponentError;
use crate::num::Interrupted;

/// Why a sum of chains could not be decomposed.
#[derive(Clone, PartialEq, Eq, Debug, thiserror::Error)]
pub enum PathError {
    #[error(transparent)]
    Interrupted(#[from] Interrupted),
    #[error(transparent)]
    Angular(#[from] AngularError),
    #[error(transparent)]
    Component(#[from] ComponentError),
    #[error("M is left open in {} and in {} at once", names[0], names[1])]
    TwoOpenLevels { names: [String; 2] },
    #[error("M of {name} is given in one place and left open in another")]
    PartlyOpen { name: String },
    #[error("a bracket of {operators} operators has {gaps} gaps between them, not one fewer than operators")]
    Gaps { operators: usize, gaps: usize },
    #[error("the term {term} of {name} has no J = {j}")]
    NoSuchLevel { name: String, term: super::term::Term, j: super::half_integer::HalfInteger },
    #[error("the projections of {name} are outside its angular momenta")]
    Projection { name: String },
    #[error("a chain has more than {limit} operators")]
    TooLong { limit: usize },
    #[error("there are more than {limit} factors of paths to find")]
    TooMany { limit: usize },
}

impl PathError {
    /// What to type instead.
    pub fn help(&self) -> Option<&'static str> {
        match self {
            PathError::TwoOpenLevels { .. } => Some("give M of one of the two states"),
            PathError::PartlyOpen { .. } => Some("give M everywhere, or nowhere"),
            PathError::NoSuchLevel { .. } | PathError::Projection { .. } => {
                Some("J runs from |L-S| to L+S and M from -J to J, in steps of 1")
            }
            PathError::TooMany { .. } => Some("leave out blocks or terms that are not needed, or take the sum apart"),
            PathError::Component(ComponentError::OpenPolarization { .. }) => Some("declare a polarization"),
            PathError::Component(ComponentError::IndexCount { .. }) => {
                Some("an index summed over x, y, z stands at two operators, as in D_i R D_i")
            }
            _ => None,
        }
    }
}
