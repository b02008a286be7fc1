//! Numbers: exact sums of square roots, real and complex balls at any precision, how many digits hold, uncertainties, units and constants.
//!
//! Nothing here knows of spans, systems or sessions. What this folder promises:
//!
//! - A [`Surd`] is exact. It is zero only if the number is.
//! - A [`Ball`] or [`ComplexBall`] contains the number it stands for, whatever was done to it; no infinity and nothing undefined leaves an operation.
//! - A [`Scalar`] is exact as long as it can be; [`Scalar::is_zero`] is a proof.
//! - [`fn@render`] prints no digit that another number in the ball would not have.

pub mod ball;
mod ball_functions;
pub mod complex_ball;
pub mod decimal;
pub mod effort;
pub mod error;
mod exact_roots;
pub mod render;
pub mod scalar;
pub mod surd;
pub mod uncertain;
pub mod units;

pub use ball::Ball;
pub use complex_ball::ComplexBall;
pub use decimal::{Decimal, DecimalError, bits_for_digits, parse_decimal};
pub use effort::{Effort, Interrupted};
pub use error::{DigitCount, NumberError, Question};
pub use render::{Agreement, Rendered, RenderedKind, digits_in_common, needs_more, render, render_decimal};
pub use scalar::{Function, Scalar};
pub use surd::{Surd, Unit};
pub use uncertain::{Measured, combine, concise, concise_float, parse_measured, parse_uncertain};
