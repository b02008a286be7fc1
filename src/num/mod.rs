//! Numbers: exact sums of square roots, real and complex balls at any precision, how many digits hold, uncertainties.
//!
//! Nothing here knows of spans, systems or sessions.

pub mod effort;
pub mod surd;

pub use effort::{Effort, Interrupted};
pub use surd::Surd;
