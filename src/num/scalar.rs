//! The number a session computes with: exact as long as it can be, a complex ball from there on.
//!
//! Every operation takes the working precision at which an exact number becomes a ball; it is not used while the result stays exact. An exact
//! result that would be too long (more than 64 square roots, more than 4 million bits) becomes a ball too. Powers alone refuse to do so silently:
//! see [`Scalar::pow`].

use super::ball::Ball;
use super::complex_ball::ComplexBall;
use super::error::{NumberError, Question};
use super::exact_roots;
use super::surd::Surd;
use rug::{Integer, Rational};
use std::cmp::Ordering;

/// Largest number of square roots an exact number may carry.
const LARGEST_TERM_COUNT: usize = 64;

/// Largest numerator or denominator of an exact number, in bits.
const LARGEST_EXACT_BITS: u64 = 4_000_000;

/// Largest size of a product or sum of exact numbers: number of terms multiplied or added times bits in each.
const LARGEST_PRODUCT: u64 = 1 << 26;

/// An exact number, or a ball that contains the number.
#[derive(Clone, PartialEq, Debug)]
pub enum Scalar {
    Exact(Surd),
    Approx(ComplexBall),
}

/// The elementary functions of one number.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Function {
    Sqrt,
    Exp,
    Ln,
    Sin,
    Cos,
    Abs,
    Conj,
    Re,
    Im,
}

impl Scalar {
    pub fn zero() -> Self {
        Scalar::Exact(Surd::zero())
    }

    pub fn one() -> Self {
        Scalar::Exact(Surd::one())
    }

    /// The imaginary unit.
    pub fn i() -> Self {
        Scalar::Exact(Surd::i())
    }

    /// The ratio of the circumference of a circle to its diameter.
    pub fn pi(bits: u32) -> Result<Self, NumberError> {
        Ok(Scalar::Approx(ComplexBall::real(Ball::pi(bits)?)))
    }

    /// The exact number, where this is one.
    pub fn as_exact(&self) -> Option<&Surd> {
        match self {
            Scalar::Exact(value) => Some(value),
            Scalar::Approx(_) => None,
        }
    }

    /// The rational this number is, if it is exact and one.
    pub fn as_rational(&self) -> Option<Rational> {
        self.as_exact()?.as_rational().map(|q| q.into_owned())
    }

    /// The whole number this number is, if it is exact and one.
    pub fn as_integer(&self) -> Option<Integer> {
        let q = self.as_rational()?;
        q.is_integer().then(|| q.into_numer_denom().0)
    }

    pub fn is_exact(&self) -> bool {
        matches!(self, Scalar::Exact(_))
    }

    /// Tells whether this number is proved to be zero.
    pub fn is_zero(&self) -> bool {
        match self {
            Scalar::Exact(value) => value.is_zero(),
            Scalar::Approx(ball) => ball.is_exact_zero(),
        }
    }

    /// Tells whether this number may be zero.
    pub fn may_be_zero(&self) -> bool {
        match self {
            Scalar::Exact(value) => value.is_zero(),
            Scalar::Approx(ball) => ball.contains_zero(),
        }
    }

    /// Tells whether the imaginary part is proved to be zero.
    pub fn is_real(&self) -> bool {
        match self {
            Scalar::Exact(value) => value.is_real(),
            Scalar::Approx(ball) => ball.is_real(),
        }
    }

    /// A ball around this number: an exact one to `bits` relative bits, an approximate one as it is.
    pub fn to_ball(&self, bits: u32) -> Result<ComplexBall, NumberError> {
        match self {
            Scalar::Exact(value) => ComplexBall::from_surd(value, bits),
            Scalar::Approx(ball) => Ok(ball.clone()),
        }
    }

    /// The sign of a real number; that of an exact one is always decided.
    ///
    /// Errors: `NotOrdered` with an imaginary part; `Undecided` for a ball that contains zero.
    pub fn sign(&self) -> Result<Ordering, NumberError> {
        if !self.is_real() {
            return Err(NumberError::NotOrdered);
        }
        match self {
            Scalar::Exact(value) => exact_roots::sign(value),
            Scalar::Approx(ball) => ball.re.sign().ok_or(NumberError::Undecided { question: Question::Sign }),
        }
    }

    /// How this real number compares with another.
    ///
    /// Errors: as [`Scalar::sign`] of the difference.
    pub fn compare(&self, other: &Self, bits: u32) -> Result<Ordering, NumberError> {
        self.sub(other, bits)?.sign()
    }

    pub fn add(&self, other: &Self, bits: u32) -> Result<Self, NumberError> {
        if let (Scalar::Exact(a), Scalar::Exact(b)) = (self, other)
            && let Some(sum) = short_sum(a, b)
        {
            return Ok(Scalar::Exact(sum));
        }
        Ok(Scalar::Approx(self.to_ball(bits)?.add(&other.to_ball(bits)?)?))
    }

    pub fn sub(&self, other: &Self, bits: u32) -> Result<Self, NumberError> {
        self.add(&other.neg(), bits)
    }

    pub fn neg(&self) -> Self {
        match self {
            Scalar::Exact(value) => Scalar::Exact(-value),
            Scalar::Approx(ball) => Scalar::Approx(ball.neg()),
        }
    }

    /// The product; exactly zero if one factor is.
    pub fn mul(&self, other: &Self, bits: u32) -> Result<Self, NumberError> {
        if self.is_zero() || other.is_zero() {
            return Ok(Self::zero());
        }
        if let (Scalar::Exact(a), Scalar::Exact(b)) = (self, other)
            && let Some(product) = short_product(a, b)
        {
            return Ok(Scalar::Exact(product));
        }
        Ok(Scalar::Approx(self.to_ball(bits)?.mul(&other.to_ball(bits)?)?))
    }

    /// The quotient.
    ///
    /// Errors: `DivisionByZero`; `Undecided` when the divisor's ball contains zero.
    pub fn div(&self, other: &Self, bits: u32) -> Result<Self, NumberError> {
        if other.is_zero() {
            return Err(NumberError::DivisionByZero);
        }
        if let (Scalar::Exact(a), Scalar::Exact(b)) = (self, other)
            && let Some(inverse) = short_inverse(b)
            && let Some(quotient) = short_product(a, &inverse)
        {
            return Ok(Scalar::Exact(quotient));
        }
        let divisor = other.to_ball(bits)?;
        if self.is_zero() && !divisor.contains_zero() {
            return Ok(Self::zero());
        }
        Ok(Scalar::Approx(self.to_ball(bits)?.div(&divisor)?))
    }

    /// The principal power. Exact numbers stay exact under integer powers, half-integer powers with an exact root, and fractional powers of perfect
    /// powers (`8^(2/3)` is 4); everything else is exp(w ln z). The zeroth power of anything is 1.
    ///
    /// Errors: `TooLarge` when an exact integer power would have more than a million bits, found without computing it; `DivisionByZero` for a
    /// negative power of zero; `Undecided` when a ball touches zero or the cut along the negative real axis.
    pub fn pow(&self, exponent: &Self, bits: u32) -> Result<Self, NumberError> {
        if exponent.is_zero() {
            return Ok(Self::one());
        }
        if self.is_zero() {
            return match exponent.re().sign() {
                Ok(Ordering::Greater) => Ok(Self::zero()),
                Ok(_) => Err(NumberError::DivisionByZero),
                Err(error) => Err(error),
            };
        }
        if let Some(q) = exponent.as_rational() {
            if let Scalar::Exact(base) = self
                && let Some(power) = exact_roots::rational_power(base, &q, &short_product, &short_inverse)?
            {
                return Ok(Scalar::Exact(power));
            }
            if let Some(whole) = q.numer().to_i64() {
                let base = self.to_ball(bits)?;
                if q.is_integer() {
                    return Ok(Scalar::Approx(base.powi(whole)?));
                }
                if *q.denom() == 2 {
                    return Ok(Scalar::Approx(base.sqrt()?.powi(whole)?));
                }
            }
        }
        let base = self.to_ball(bits)?;
        if base.contains_zero() {
            return Err(NumberError::Undecided { question: Question::BaseIsZero });
        }
        Ok(Scalar::Approx(base.pow(&exponent.to_ball(bits)?)?))
    }

    pub fn conj(&self) -> Self {
        match self {
            Scalar::Exact(value) => Scalar::Exact(value.conj()),
            Scalar::Approx(ball) => Scalar::Approx(ball.conj()),
        }
    }

    /// The real part.
    pub fn re(&self) -> Self {
        match self {
            Scalar::Exact(value) => Scalar::Exact(value.re()),
            Scalar::Approx(ball) => Scalar::Approx(ComplexBall::real(ball.re.clone())),
        }
    }

    /// The imaginary part.
    pub fn im(&self) -> Self {
        match self {
            Scalar::Exact(value) => Scalar::Exact(value.im()),
            Scalar::Approx(ball) if ball.is_real() => Self::zero(),
            Scalar::Approx(ball) => Scalar::Approx(ComplexBall::real(ball.im.clone())),
        }
    }

    /// The magnitude: exact for real exact numbers, and for complex ones whose magnitude is a sum of square roots.
    pub fn abs(&self, bits: u32) -> Result<Self, NumberError> {
        match self {
            Scalar::Exact(value) => match exact_roots::magnitude(value)? {
                Some(magnitude) => Ok(Scalar::Exact(magnitude)),
                None => Ok(Scalar::Approx(ComplexBall::real(self.to_ball(bits)?.abs()?))),
            },
            Scalar::Approx(ball) => Ok(Scalar::Approx(ComplexBall::real(ball.abs()?))),
        }
    }

    /// The principal value of an elementary function; exact for an exact argument where that is a sum of square roots.
    ///
    /// Errors: `LogarithmOfZero`; `Undecided` when a ball touches zero or the cut of a root or logarithm; `TooLarge`.
    pub fn apply(&self, function: Function, bits: u32) -> Result<Self, NumberError> {
        match function {
            Function::Conj => return Ok(self.conj()),
            Function::Re => return Ok(self.re()),
            Function::Im => return Ok(self.im()),
            Function::Abs => return self.abs(bits),
            Function::Sqrt | Function::Exp | Function::Ln | Function::Sin | Function::Cos => {}
        }
        if let Scalar::Exact(value) = self {
            let exact = match function {
                Function::Sqrt => exact_roots::square_root(value)?,
                Function::Exp | Function::Cos if value.is_zero() => Some(Surd::one()),
                Function::Sin if value.is_zero() => Some(Surd::zero()),
                Function::Ln if value.is_one() => Some(Surd::zero()),
                Function::Ln if value.is_zero() => return Err(NumberError::LogarithmOfZero),
                _ => None,
            };
            if let Some(exact) = exact {
                return Ok(Scalar::Exact(exact));
            }
        }
        let ball = self.to_ball(bits)?;
        Ok(Scalar::Approx(match function {
            Function::Sqrt => ball.sqrt()?,
            Function::Exp => ball.exp()?,
            Function::Ln => ball.ln()?,
            Function::Sin => ball.sin()?,
            Function::Cos => ball.cos()?,
            Function::Abs | Function::Conj | Function::Re | Function::Im => ball,
        }))
    }
}

impl From<Surd> for Scalar {
    fn from(value: Surd) -> Self {
        Scalar::Exact(value)
    }
}

impl From<Rational> for Scalar {
    fn from(value: Rational) -> Self {
        Scalar::Exact(Surd::from(value))
    }
}

impl From<i64> for Scalar {
    fn from(value: i64) -> Self {
        Scalar::Exact(Surd::from(value))
    }
}

impl From<ComplexBall> for Scalar {
    fn from(value: ComplexBall) -> Self {
        Scalar::Approx(value)
    }
}

impl From<Ball> for Scalar {
    fn from(value: Ball) -> Self {
        Scalar::Approx(ComplexBall::real(value))
    }
}

/// The number itself unless it is too long to go on exactly.
fn short_enough(value: Surd) -> Option<Surd> {
    (value.term_count() <= LARGEST_TERM_COUNT && u64::from(value.bits()) <= LARGEST_EXACT_BITS).then_some(value)
}

/// The sum unless it is, or would be on the way, too long.
fn short_sum(a: &Surd, b: &Surd) -> Option<Surd> {
    let bits = u64::from(a.bits()) + u64::from(b.bits());
    let sums = (a.term_count() + b.term_count()) as u64;
    if sums.saturating_mul(bits) > LARGEST_PRODUCT {
        return None;
    }
    short_enough(a + b)
}

/// The product unless it is, or would be on the way, too long.
fn short_product(a: &Surd, b: &Surd) -> Option<Surd> {
    let bits = u64::from(a.bits()) + u64::from(b.bits());
    let products = (a.term_count() * b.term_count()) as u64;
    if bits > LARGEST_EXACT_BITS || products.saturating_mul(bits) > LARGEST_PRODUCT {
        return None;
    }
    short_enough(a * b)
}

/// One over the number unless it is zero or the inverse too long.
fn short_inverse(value: &Surd) -> Option<Surd> {
    // Each square root under the others can square the length of the norm.
    let growth = (value.term_count() as u64).saturating_pow(2);
    if u64::from(value.bits()).saturating_mul(growth) > LARGEST_EXACT_BITS {
        return None;
    }
    short_enough(value.inverse()?)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn root(n: i64) -> Scalar {
        Scalar::from(n).apply(Function::Sqrt, 64).expect("defined")
    }

    #[test]
    fn exact_functions_of_exact_numbers() {
        for (argument, function, expected) in [
            (Scalar::zero(), Function::Exp, Scalar::one()),
            (Scalar::zero(), Function::Sin, Scalar::zero()),
            (Scalar::zero(), Function::Cos, Scalar::one()),
            (Scalar::one(), Function::Ln, Scalar::zero()),
            (Scalar::from(Rational::from((9, 4))), Function::Sqrt, Scalar::from(Rational::from((3, 2)))),
            (Scalar::from(-4), Function::Sqrt, Scalar::from(2).mul(&Scalar::i(), 64).expect("exact")),
            (Scalar::from(-3), Function::Abs, Scalar::from(3)),
            (Scalar::from(Surd::gaussian(Rational::from(3), Rational::from(4))), Function::Abs, Scalar::from(5)),
            (Scalar::from(Surd::gaussian(Rational::from(1), Rational::from(1))), Function::Abs, root(2)),
            (root(2).sub(&root(3), 64).expect("exact"), Function::Abs, root(3).sub(&root(2), 64).expect("exact")),
            (Scalar::i(), Function::Re, Scalar::zero()),
            (Scalar::i(), Function::Im, Scalar::one()),
            (Scalar::i(), Function::Conj, Scalar::i().neg()),
        ] {
            assert_eq!(argument.apply(function, 64), Ok(expected), "{function:?} of {argument:?}");
        }
        assert_eq!(Scalar::zero().apply(Function::Ln, 64), Err(NumberError::LogarithmOfZero));
        assert!(!Scalar::one().apply(Function::Exp, 64).expect("defined").is_exact());
    }

    #[test]
    fn quotients_of_sums_of_roots_are_exact() {
        let x = root(2).add(&root(3), 64).expect("exact");
        let inverse = Scalar::one().div(&x, 64).expect("nonzero");
        assert_eq!(inverse, root(3).sub(&root(2), 64).expect("exact"));
        assert_eq!(x.div(&Scalar::zero(), 64), Err(NumberError::DivisionByZero));
        assert_eq!(x.sub(&x, 64).expect("exact"), Scalar::zero());
    }

    #[test]
    fn numbers_too_long_to_stay_exact_become_balls() {
        let mut sum = Scalar::zero();
        let mut primes = Vec::new();
        for n in 2..400i64 {
            if primes.iter().all(|p| n % p != 0) {
                primes.push(n);
                sum = sum.add(&root(n), 64).expect("finite");
            }
        }
        assert_eq!(primes.len(), 78);
        let Scalar::Approx(ball) = &sum else { panic!("78 roots are too many") };
        let reference: f64 = primes.iter().map(|p| (*p as f64).sqrt()).sum();
        assert!((ball.re.mid().to_f64() - reference).abs() < 1e-9 && ball.is_real());
        let long = Scalar::from(Rational::from(Integer::from(1) << 2_100_000u32));
        assert!(long.is_exact() && !long.mul(&long, 64).expect("finite").is_exact());
        assert!(long.mul(&Scalar::zero(), 64).expect("finite").is_zero());
    }

    #[test]
    fn powers_of_balls() {
        let pi = Scalar::pi(128).expect("finite");
        assert_eq!(pi.pow(&Scalar::zero(), 128), Ok(Scalar::one()));
        let square = pi.pow(&Scalar::from(2), 128).expect("finite");
        let back = square.pow(&Scalar::from(Rational::from((1, 2))), 128).expect("positive");
        let difference = back.sub(&pi, 128).expect("finite");
        assert!(difference.may_be_zero() && !difference.is_zero() && difference.is_real());
        assert!(matches!(pi.pow(&Scalar::from(1_000_000_000_000), 128), Err(NumberError::TooLarge { .. })));
        let around_zero = difference.pow(&Scalar::from(Rational::from((1, 3))), 128);
        assert_eq!(around_zero, Err(NumberError::Undecided { question: Question::BaseIsZero }));
        assert_eq!(Scalar::zero().pow(&pi, 128), Ok(Scalar::zero()));
        assert_eq!(Scalar::zero().pow(&pi.neg(), 128), Err(NumberError::DivisionByZero));
        // i^i = exp(-pi/2)
        let power = Scalar::i().pow(&Scalar::i(), 128).expect("defined");
        let expected = pi.div(&Scalar::from(-2), 128).and_then(|x| x.apply(Function::Exp, 128)).expect("finite");
        assert!(power.is_real() || power.im().may_be_zero());
        assert!(power.re().sub(&expected, 128).expect("finite").may_be_zero());
    }

    #[test]
    fn order_of_real_numbers() {
        assert_eq!(root(2).compare(&Scalar::from(Rational::from((7, 5))), 64), Ok(Ordering::Greater));
        assert_eq!(Scalar::i().sign(), Err(NumberError::NotOrdered));
        let pi = Scalar::pi(64).expect("finite");
        assert_eq!(pi.compare(&pi, 64), Err(NumberError::Undecided { question: Question::Sign }));
    }
}
