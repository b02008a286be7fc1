//! Arithmetic of the scalars at the border between sums and systems.

use super::Number;
use crate::num::{ComplexBall, Surd};
use rug::Complex;

impl Number {
    pub fn zero() -> Self {
        Number::Exact(Surd::zero())
    }

    /// The number rounded to `bits` bits.
    pub fn to_complex(&self, bits: u32) -> Complex {
        match self {
            Number::Exact(surd) => match ComplexBall::from_surd(surd, bits) {
                Ok(ball) => ball.midpoint(bits),
                // Beyond the range of exponents: no result with this number in it can hold, and NaN makes sure none does.
                Err(_) => Complex::with_val(bits, (rug::float::Special::Nan, rug::float::Special::Nan)),
            },
            Number::Approx(value) => Complex::with_val(bits, value),
        }
    }

    /// The sum; exact if both are.
    pub fn plus(&self, other: &Number, bits: u32) -> Number {
        match (self, other) {
            (Number::Exact(a), Number::Exact(b)) => Number::Exact(a + b),
            _ => Number::Approx(self.to_complex(bits) + other.to_complex(bits)),
        }
    }

    /// The product; exact if both are.
    pub fn times(&self, other: &Number, bits: u32) -> Number {
        match (self, other) {
            (Number::Exact(a), Number::Exact(b)) => Number::Exact(a * b),
            _ => Number::Approx(self.to_complex(bits) * other.to_complex(bits)),
        }
    }

    pub fn negated(&self) -> Number {
        match self {
            Number::Exact(a) => Number::Exact(-a),
            Number::Approx(a) => Number::Approx(Complex::with_val(a.prec(), -a)),
        }
    }

    /// One over the number; `None` for zero.
    pub fn inverse(&self, bits: u32) -> Option<Number> {
        match self {
            Number::Exact(a) => a.inverse().map(Number::Exact),
            Number::Approx(a) if a.is_zero() => None,
            Number::Approx(a) => Some(Number::Approx(Complex::with_val(bits, a.recip_ref()))),
        }
    }

    pub fn conj(&self) -> Number {
        match self {
            Number::Exact(a) => Number::Exact(a.conj()),
            Number::Approx(a) => Number::Approx(a.clone().conj()),
        }
    }

    /// Tells whether the number is exactly zero.
    pub fn is_zero(&self) -> bool {
        match self {
            Number::Exact(a) => a.is_zero(),
            Number::Approx(_) => false,
        }
    }
}
