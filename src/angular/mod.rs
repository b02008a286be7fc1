//! Exact angular algebra: half-integers, Wigner symbols, terms, tensor operators, and the decomposition of chains over their blocks.
//!
//! Phases are those of Condon and Shortley; a reduced element is defined by
//! `<J M|T^K_Q|J' M'> = (-1)^(J-M) (J K J'; -M Q M') <J||T^K||J'>`, with no further factor. States are |(L S) J M>, L first.

mod binomials;
pub mod chain;
pub mod elements;
mod factorials;
pub mod half_integer;
pub mod label;
pub mod paths;
pub mod polarizability;
pub mod polarization;
pub mod recoupling;
pub mod selection;
pub mod spherical;
pub mod tensor;
pub mod term;
pub mod verdict;
pub mod wigner;

pub use half_integer::{AngularError, HalfInteger};
pub use label::{Coupling, Electrons, Label, LabelError, Projections};
pub use recoupling::{ninej, sixj};
pub use spherical::{SphericalWeight, cartesian_components, reduced_c};
pub use term::{Level, Parity, Term};
pub use wigner::{clebsch_gordan, threej};
