//! Real balls: a midpoint and a radius that is never too small.
//!
//! Every operation returns a ball that contains the result for every point of the operands: the error of the operands is propagated by a bound that
//! holds for wide balls too, and the rounding of the midpoint is added to the radius. A midpoint or radius that is not finite is an error, never a value.

use super::error::{NumberError, Question};
use rug::float::{self, Constant, Round};
use rug::ops::AssignRound;
use rug::{Float, Integer, Rational};
use std::cmp::Ordering;

/// Bits of a radius; it is an upper bound, so few are enough.
pub(crate) const RADIUS_BITS: u32 = 32;

/// All real numbers within `rad` of `mid`.
#[derive(Clone, PartialEq, Debug)]
pub struct Ball {
    mid: Float,
    rad: Float,
}

/// Rounds a bound up to the bits of a radius. Operands are references: an operator that owns one has rounded, to nearest, before this can.
pub(crate) fn up<T>(value: T) -> Float
where
    Float: AssignRound<T, Round = Round, Ordering = Ordering>,
{
    Float::with_val_round(RADIUS_BITS, value, Round::Up).0
}

/// Rounds a bound down to the bits of a radius. Operands are references, as for [`up`].
pub(crate) fn down<T>(value: T) -> Float
where
    Float: AssignRound<T, Round = Round, Ordering = Ordering>,
{
    Float::with_val_round(RADIUS_BITS, value, Round::Down).0
}

/// One unit in the last place of `mid`; the smallest positive number when `mid` is zero by underflow.
fn unit_in_last_place(mid: &Float) -> Float {
    let exponent = match mid.get_exp() {
        Some(exponent) => exponent.saturating_sub_unsigned(mid.prec()),
        None => float::exp_min() - 1,
    };
    up(Float::i_exp(1, exponent))
}

impl Ball {
    /// The ball with this midpoint, the rounding of the midpoint added to the radius.
    ///
    /// Errors: `TooLarge` when either is not finite.
    pub(crate) fn enclose((mid, rounding): (Float, Ordering), mut rad: Float) -> Result<Self, NumberError> {
        if rounding != Ordering::Equal {
            let unit = unit_in_last_place(&mid);
            rad = up(&rad + &unit);
        }
        if mid.is_finite() && rad.is_finite() {
            Ok(Ball { mid, rad })
        } else {
            Err(NumberError::beyond_exponent_range())
        }
    }

    /// The number zero.
    pub fn zero(bits: u32) -> Self {
        Ball { mid: Float::new(bits.max(2)), rad: Float::new(RADIUS_BITS) }
    }

    /// The ball around a rational; of radius zero where the rational fits into `bits`.
    ///
    /// Errors: `TooLarge` beyond the range of exponents.
    pub fn from_rational(value: &Rational, bits: u32) -> Result<Self, NumberError> {
        Self::enclose(Float::with_val_round(bits.max(2), value, Round::Nearest), Float::new(RADIUS_BITS))
    }

    /// The ball around a whole number; of radius zero where it fits into `bits`.
    ///
    /// Errors: `TooLarge` beyond the range of exponents.
    pub fn from_integer(value: &Integer, bits: u32) -> Result<Self, NumberError> {
        Self::enclose(Float::with_val_round(bits.max(2), value, Round::Nearest), Float::new(RADIUS_BITS))
    }

    /// The ball around a small whole number.
    pub fn from_i32(value: i32, bits: u32) -> Self {
        // 32 bits hold every such number exactly
        Ball { mid: Float::with_val(bits.max(32), value), rad: Float::new(RADIUS_BITS) }
    }

    /// The ball of radius zero around a floating-point number, at its own precision.
    ///
    /// Errors: `TooLarge` when it is not finite.
    pub fn from_float(value: Float) -> Result<Self, NumberError> {
        Self::enclose((value, Ordering::Equal), Float::new(RADIUS_BITS))
    }

    /// The ball of this midpoint and radius; the radius is rounded up, its sign does not matter.
    ///
    /// Errors: `TooLarge` when either is not finite.
    pub fn with_radius(mid: Float, radius: Float) -> Result<Self, NumberError> {
        Self::enclose((mid, Ordering::Equal), up(&radius.abs()))
    }

    /// The ratio of the circumference of a circle to its diameter.
    pub fn pi(bits: u32) -> Result<Self, NumberError> {
        Self::enclose(Float::with_val_round(bits.max(2), Constant::Pi, Round::Nearest), Float::new(RADIUS_BITS))
    }

    pub fn mid(&self) -> &Float {
        &self.mid
    }

    pub fn rad(&self) -> &Float {
        &self.rad
    }

    /// Bits of the midpoint.
    pub fn bits(&self) -> u32 {
        self.mid.prec()
    }

    /// The same ball with the midpoint rounded to `bits`.
    ///
    /// Errors: `TooLarge` when rounding leaves the range of exponents.
    pub fn rounded(&self, bits: u32) -> Result<Self, NumberError> {
        Self::enclose(Float::with_val_round(bits.max(2), &self.mid, Round::Nearest), self.rad.clone())
    }

    /// The same ball, its radius grown by `more`.
    ///
    /// Errors: `TooLarge` when the radius is not finite.
    pub fn widened(&self, more: &Float) -> Result<Self, NumberError> {
        let more = up(more.abs_ref());
        Self::enclose((self.mid.clone(), Ordering::Equal), up(&self.rad + &more))
    }

    /// Tells whether the ball is one point.
    pub fn is_exact(&self) -> bool {
        self.rad.is_zero()
    }

    /// Tells whether the ball is the point zero.
    pub fn is_exact_zero(&self) -> bool {
        self.mid.is_zero() && self.rad.is_zero()
    }

    pub fn contains_zero(&self) -> bool {
        self.mid.cmp_abs(&self.rad) != Some(Ordering::Greater)
    }

    pub fn contains_rational(&self, value: &Rational) -> bool {
        // The ends are rounded inwards, so that a point that is said to lie inside does.
        let bits = self.mid.prec().max(RADIUS_BITS) + RADIUS_BITS;
        let low = Float::with_val_round(bits, &self.mid - &self.rad, Round::Up).0;
        let high = Float::with_val_round(bits, &self.mid + &self.rad, Round::Down).0;
        (low <= *value && high >= *value) || self.mid == *value
    }

    /// Tells whether every point is positive.
    pub fn is_positive(&self) -> bool {
        !self.contains_zero() && self.mid.is_sign_positive()
    }

    /// Tells whether every point is negative.
    pub fn is_negative(&self) -> bool {
        !self.contains_zero() && self.mid.is_sign_negative()
    }

    /// The sign that all points share; `None` when the ball contains zero without being zero.
    pub fn sign(&self) -> Option<Ordering> {
        if self.is_exact_zero() {
            Some(Ordering::Equal)
        } else if self.contains_zero() {
            None
        } else {
            self.mid.cmp0()
        }
    }

    /// How this number compares with another; `None` when the balls overlap without being the same point.
    pub fn compare(&self, other: &Self) -> Option<Ordering> {
        self.sub(other).ok()?.sign()
    }

    /// Tells whether the two balls have a point in common.
    pub fn overlaps(&self, other: &Self) -> bool {
        self.sub(other).map_or(true, |difference| difference.contains_zero())
    }

    /// An upper bound of the magnitude, 32 bits.
    pub fn magnitude_above(&self) -> Float {
        up(&up(self.mid.abs_ref()) + &self.rad)
    }

    /// A lower bound of the magnitude, 32 bits; zero when the ball contains zero.
    pub fn magnitude_below(&self) -> Float {
        if self.contains_zero() {
            return Float::new(RADIUS_BITS);
        }
        let bits = self.mid.prec();
        let magnitude = Float::with_val(bits, self.mid.abs_ref());
        down(&magnitude - &self.rad)
    }

    /// The ends of the ball, rounded outwards.
    pub fn ends(&self) -> (Float, Float) {
        let bits = self.mid.prec().max(RADIUS_BITS) + RADIUS_BITS;
        (
            Float::with_val_round(bits, &self.mid - &self.rad, Round::Down).0,
            Float::with_val_round(bits, &self.mid + &self.rad, Round::Up).0,
        )
    }

    pub fn neg(&self) -> Self {
        Ball { mid: Float::with_val(self.bits(), -&self.mid), rad: self.rad.clone() }
    }

    pub fn abs(&self) -> Self {
        Ball { mid: Float::with_val(self.bits(), self.mid.abs_ref()), rad: self.rad.clone() }
    }

    /// The sum, at the larger of the two precisions.
    pub fn add(&self, other: &Self) -> Result<Self, NumberError> {
        let bits = self.bits().max(other.bits());
        Self::enclose(Float::with_val_round(bits, &self.mid + &other.mid, Round::Nearest), up(&self.rad + &other.rad))
    }

    /// The difference, at the larger of the two precisions.
    pub fn sub(&self, other: &Self) -> Result<Self, NumberError> {
        let bits = self.bits().max(other.bits());
        Self::enclose(Float::with_val_round(bits, &self.mid - &other.mid, Round::Nearest), up(&self.rad + &other.rad))
    }

    /// The product, at the larger of the two precisions.
    ///
    /// Accuracy: radius |x| r_y + |y| r_x + r_x r_y.
    pub fn mul(&self, other: &Self) -> Result<Self, NumberError> {
        let bits = self.bits().max(other.bits());
        let rad = if self.is_exact() && other.is_exact() {
            Float::new(RADIUS_BITS)
        } else {
            let through_other = up(&up(self.mid.abs_ref()) * &other.rad);
            let through_self = up(&other.magnitude_above() * &self.rad);
            up(&through_other + &through_self)
        };
        Self::enclose(Float::with_val_round(bits, &self.mid * &other.mid, Round::Nearest), rad)
    }

    /// The quotient, at the larger of the two precisions.
    ///
    /// Accuracy: radius (|x| r_y + |y| r_x) / (|y| (|y| - r_y)).
    /// Errors: `DivisionByZero` for the point zero, `Undecided` when the divisor's ball contains zero.
    pub fn div(&self, other: &Self) -> Result<Self, NumberError> {
        if other.is_exact_zero() {
            return Err(NumberError::DivisionByZero);
        }
        if other.contains_zero() {
            return Err(NumberError::Undecided { question: Question::DivisorIsZero });
        }
        let bits = self.bits().max(other.bits());
        let rad = if self.is_exact() && other.is_exact() {
            Float::new(RADIUS_BITS)
        } else {
            // (|x| r_y / |y| + r_x) / (|y| - r_y): no product that could leave the range of exponents without need
            let ratio = up(&up(self.mid.abs_ref()) / &down(other.mid.abs_ref()));
            let numerator = up(&up(&ratio * &other.rad) + &self.rad);
            up(&numerator / &other.magnitude_below())
        };
        Self::enclose(Float::with_val_round(bits, &self.mid / &other.mid, Round::Nearest), rad)
    }

    /// Half of this number.
    pub fn half(&self) -> Result<Self, NumberError> {
        self.div(&Self::from_i32(2, self.bits()))
    }

    /// Integer power by repeated squaring.
    ///
    /// Errors: as division, for negative exponents.
    pub fn powi(&self, exponent: i64) -> Result<Self, NumberError> {
        let mut result = Self::from_i32(1, self.bits());
        let mut square = self.clone();
        let mut left = exponent.unsigned_abs();
        while left > 0 {
            if left & 1 == 1 {
                result = result.mul(&square)?;
            }
            left >>= 1;
            if left > 0 {
                square = square.mul(&square)?;
            }
        }
        if exponent < 0 { Self::from_i32(1, self.bits()).div(&result) } else { Ok(result) }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn ball(mid: f64, rad: f64) -> Ball {
        Ball::with_radius(Float::with_val(64, mid), Float::with_val(32, rad)).expect("finite")
    }

    #[test]
    fn exact_operations_stay_points() {
        let (a, b) = (ball(1.5, 0.0), ball(-0.25, 0.0));
        for result in [a.add(&b), a.sub(&b), a.mul(&b), a.div(&b), a.powi(7), b.powi(-3), Ok(a.neg())] {
            assert!(result.expect("finite").is_exact());
        }
    }

    #[test]
    fn a_rounded_result_is_one_unit_wide() {
        let third = ball(1.0, 0.0).div(&ball(3.0, 0.0)).expect("nonzero");
        // 1/3 lies in [2^-2, 2^-1): its last place at 64 bits is 2^-65
        assert_eq!(*third.rad(), Float::with_val(32, Float::i_exp(1, -65)));
    }

    #[test]
    fn division_by_what_may_be_zero() {
        let one = ball(1.0, 0.0);
        assert_eq!(one.div(&ball(0.0, 0.0)), Err(NumberError::DivisionByZero));
        assert_eq!(one.div(&ball(1.0, 1.0)), Err(NumberError::Undecided { question: Question::DivisorIsZero }));
        assert_eq!(one.powi(0).map(|x| x.mid().to_f64()), Ok(1.0));
    }

    #[test]
    fn signs_are_certain_or_absent() {
        assert!(ball(1.0, 0.999).is_positive() && !ball(1.0, 1.0).is_positive());
        assert!(ball(-1.0, 0.999).is_negative() && !ball(-1.0, 1.0).is_negative());
        assert_eq!(ball(0.0, 0.0).sign(), Some(Ordering::Equal));
        assert_eq!(ball(0.0, 1e-30).sign(), None);
        assert_eq!(ball(1.0, 0.25).compare(&ball(2.0, 0.25)), Some(Ordering::Less));
        assert_eq!(ball(1.0, 0.5).compare(&ball(2.0, 0.5)), None);
    }

    #[test]
    fn numbers_out_of_range_are_errors() {
        let huge = Ball::from_float(Float::with_val(64, Float::i_exp(1, 1 << 29))).expect("finite");
        assert_eq!(huge.mul(&huge).and_then(|x| x.mul(&huge)), Err(NumberError::beyond_exponent_range()));
        assert_eq!(huge.powi(i64::MAX), Err(NumberError::beyond_exponent_range()));
        assert!(Ball::from_float(Float::with_val(64, rug::float::Special::Nan)).is_err());
        assert!(Ball::with_radius(Float::new(64), Float::with_val(32, rug::float::Special::Infinity)).is_err());
        // towards zero a product is lost, but not claimed to be zero
        let tiny = ball(1.0, 0.0).div(&huge).expect("nonzero");
        let product = tiny.mul(&tiny).and_then(|x| x.mul(&tiny)).expect("contained");
        assert!(product.contains_zero() && !product.is_exact_zero());
    }
}
