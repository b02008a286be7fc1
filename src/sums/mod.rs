//! Joins theory and systems: evaluates chains by linear solves, roots, sums over labels, and says how many digits hold.
//!
//! A value is exact where the system's exact backend can hold every ket of the chain. Otherwise it is computed at two levels of accuracy (and
//! of basis size), and their difference is the radius of the ball that is handed on; arithmetic with balls keeps what holds.

mod angular;
mod bracket;
mod environment;
mod evaluator;
mod factors;
mod kets;
mod level_part;
mod problem;
mod proof;
mod root;
mod settled;
mod value;
mod vary;
mod walker;

pub use angular::AngularSum;
pub use environment::Environment;
pub use evaluator::{Evaluator, Systems};
pub use problem::{Failure, Trouble};
pub use root::brief;
pub use value::{Value, Wanted, bits_for, measured_sources};
