//! The numbers a tridiagonal system can be made of.

use std::fmt::Debug;

use rug::{Complex, Float, Rational};

/// A field element that knows its own precision: exact rationals, floats, complex floats.
pub trait Scalar: Clone + PartialEq + Debug {
    /// Whether the arithmetic has no rounding.
    const EXACT: bool;

    /// Returns a whole number at the precision of `self`.
    fn whole(&self, value: i32) -> Self;

    /// Returns the bits of the number, `None` for an exact one.
    fn bits(&self) -> Option<u32>;

    /// Tells whether the number is zero.
    fn is_zero(&self) -> bool;

    /// Returns e with the absolute value between 2^(e-2) and 2^(e+1); `None` for zero.
    fn size(&self) -> Option<i64>;

    /// Tells whether a real number is below zero; no meaning for complex ones.
    fn is_negative(&self) -> bool;

    /// Adds another number.
    fn add(&mut self, other: &Self);

    /// Takes the product of two numbers away.
    fn subtract_product(&mut self, a: &Self, b: &Self);

    /// Returns a product.
    fn times(&self, other: &Self) -> Self;

    /// Returns a quotient; the divisor is not zero.
    fn over(&self, divisor: &Self) -> Self;
}

impl Scalar for Rational {
    const EXACT: bool = true;

    fn bits(&self) -> Option<u32> {
        None
    }

    fn whole(&self, value: i32) -> Self {
        Self::from(value)
    }

    fn is_zero(&self) -> bool {
        *self == 0
    }

    fn size(&self) -> Option<i64> {
        (*self != 0).then(|| i64::from(self.numer().significant_bits()) - i64::from(self.denom().significant_bits()))
    }

    fn is_negative(&self) -> bool {
        *self < 0
    }

    fn add(&mut self, other: &Self) {
        *self += other;
    }

    fn subtract_product(&mut self, a: &Self, b: &Self) {
        *self -= Self::from(a * b);
    }

    fn times(&self, other: &Self) -> Self {
        Self::from(self * other)
    }

    fn over(&self, divisor: &Self) -> Self {
        Self::from(self / divisor)
    }
}

impl Scalar for Float {
    const EXACT: bool = false;

    fn bits(&self) -> Option<u32> {
        Some(self.prec())
    }

    fn whole(&self, value: i32) -> Self {
        Self::with_val(self.prec(), value)
    }

    fn is_zero(&self) -> bool {
        Float::is_zero(self)
    }

    fn size(&self) -> Option<i64> {
        self.get_exp().map(i64::from)
    }

    fn is_negative(&self) -> bool {
        self.is_sign_negative() && !Float::is_zero(self)
    }

    fn add(&mut self, other: &Self) {
        *self += other;
    }

    fn subtract_product(&mut self, a: &Self, b: &Self) {
        *self -= a * b;
    }

    fn times(&self, other: &Self) -> Self {
        Self::with_val(self.prec(), self * other)
    }

    fn over(&self, divisor: &Self) -> Self {
        Self::with_val(self.prec(), self / divisor)
    }
}

impl Scalar for Complex {
    const EXACT: bool = false;

    fn bits(&self) -> Option<u32> {
        let (re, im) = self.prec();
        Some(re.min(im))
    }

    fn whole(&self, value: i32) -> Self {
        Self::with_val(self.prec(), value)
    }

    fn is_zero(&self) -> bool {
        self.real().is_zero() && self.imag().is_zero()
    }

    fn size(&self) -> Option<i64> {
        self.real().get_exp().max(self.imag().get_exp()).map(i64::from)
    }

    fn is_negative(&self) -> bool {
        false
    }

    fn add(&mut self, other: &Self) {
        *self += other;
    }

    fn subtract_product(&mut self, a: &Self, b: &Self) {
        *self -= a * b;
    }

    fn times(&self, other: &Self) -> Self {
        Self::with_val(self.prec(), self * other)
    }

    fn over(&self, divisor: &Self) -> Self {
        Self::with_val(self.prec(), self / divisor)
    }
}
