//! Numbers: exact sums of square roots, real and complex balls at any precision, how many digits hold, uncertainties.
//!
//! Nothing here knows of spans, systems or sessions.

pub mod effort;

pub use effort::{Effort, Interrupted};
