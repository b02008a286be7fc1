//! Numbers: exact sums of square roots, real and complex balls at any precision, how many digits hold, uncertainties.
//!
//! Nothing here knows of spans, systems or sessions.

pub mod ball;
mod ball_functions;
pub mod complex_ball;
pub mod effort;
pub mod error;
mod exact_roots;
pub mod scalar;
pub mod surd;

pub use ball::Ball;
pub use complex_ball::ComplexBall;
pub use effort::{Effort, Interrupted};
pub use error::{DigitCount, NumberError, Question};
pub use scalar::{Function, Scalar};
pub use surd::Surd;
