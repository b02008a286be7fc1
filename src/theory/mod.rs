//! What an expression means, with no numbers: names resolved, operator algebra, expansion, formula text.
//!
//! `theory` knows systems and operators by name only; whether an atom has an operator is asked where sums meet systems.

pub mod algebra;
mod calls;
mod checked;
pub mod dimensions;
pub mod free;
pub mod indices;
pub mod names;
pub mod normal;
pub mod problem;
mod quantities;
pub mod resolve;
mod tensors;
pub mod terms;
pub mod unit_words;
pub mod visit;

pub use names::{Binding, Names};
pub use problem::{Fault, Kind, Problem};
pub use resolve::Resolver;
