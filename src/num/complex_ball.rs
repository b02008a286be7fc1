//! Complex balls: a real ball for each part.

use super::ball::{Ball, RADIUS_BITS, down, up};
use super::error::{NumberError, Question};
use super::surd::{Surd, Unit};
use rug::{Complex, Float, Rational};
use std::cmp::Ordering;

/// Working precision at which the evaluation of an exact number is given up.
const EVALUATION_BITS: u32 = 1 << 24;

/// All complex numbers whose parts lie in two real balls.
#[derive(Clone, PartialEq, Debug)]
pub struct ComplexBall {
    pub re: Ball,
    pub im: Ball,
}

impl ComplexBall {
    pub fn new(re: Ball, im: Ball) -> Self {
        ComplexBall { re, im }
    }

    pub fn zero(bits: u32) -> Self {
        Self::real(Ball::zero(bits))
    }

    pub fn one(bits: u32) -> Self {
        Self::real(Ball::from_i32(1, bits))
    }

    /// A real number: its imaginary part is the point zero.
    pub fn real(re: Ball) -> Self {
        let im = Ball::zero(re.bits());
        ComplexBall { re, im }
    }

    /// An imaginary number: its real part is the point zero.
    pub fn imaginary(im: Ball) -> Self {
        let re = Ball::zero(im.bits());
        ComplexBall { re, im }
    }

    /// The ball around a rational.
    ///
    /// Errors: `TooLarge` beyond the range of exponents.
    pub fn from_rational(value: &Rational, bits: u32) -> Result<Self, NumberError> {
        Ok(Self::real(Ball::from_rational(value, bits)?))
    }

    /// The ball around an exact number, each part known to about `bits` relative bits whatever cancels between its terms.
    ///
    /// Errors: `TooLarge` beyond the range of exponents; `Undecided` when its terms cancel beyond 2^24 bits.
    pub fn from_surd(value: &Surd, bits: u32) -> Result<Self, NumberError> {
        let part = |take_imaginary: bool| -> Result<Ball, NumberError> {
            let terms: Vec<(&Unit, &Rational)> = value
                .terms()
                .map(|(unit, c)| (unit, if take_imaginary { &c.im } else { &c.re }))
                .filter(|(_, q)| q.cmp0() != Ordering::Equal)
                .collect();
            relative_sum(&terms, bits)
        };
        Ok(ComplexBall { re: part(false)?, im: part(true)? })
    }

    /// The ball around a computed number; `radius` bounds the error of each part.
    ///
    /// Errors: `TooLarge` when a part is not finite.
    pub fn from_complex(value: Complex, radius: Float) -> Result<Self, NumberError> {
        let (re, im) = value.into_real_imag();
        Ok(ComplexBall { re: Ball::with_radius(re, radius.clone())?, im: Ball::with_radius(im, radius)? })
    }

    /// The midpoint, rounded to `bits`.
    pub fn midpoint(&self, bits: u32) -> Complex {
        Complex::with_val(bits.max(2), (self.re.mid(), self.im.mid()))
    }

    /// An upper bound of the distance from the midpoint.
    pub fn radius(&self) -> Float {
        up(self.re.rad().hypot_ref(self.im.rad()))
    }

    /// An upper bound of the magnitude.
    pub fn magnitude_above(&self) -> Float {
        up(self.re.magnitude_above().hypot_ref(&self.im.magnitude_above()))
    }

    /// A lower bound of the magnitude; zero when the ball contains zero.
    pub fn magnitude_below(&self) -> Float {
        down(self.re.magnitude_below().hypot_ref(&self.im.magnitude_below()))
    }

    pub fn bits(&self) -> u32 {
        self.re.bits().max(self.im.bits())
    }

    pub fn is_exact(&self) -> bool {
        self.re.is_exact() && self.im.is_exact()
    }

    pub fn is_exact_zero(&self) -> bool {
        self.re.is_exact_zero() && self.im.is_exact_zero()
    }

    pub fn contains_zero(&self) -> bool {
        self.re.contains_zero() && self.im.contains_zero()
    }

    /// Tells whether the imaginary part is the point zero.
    pub fn is_real(&self) -> bool {
        self.im.is_exact_zero()
    }

    /// The same ball with the midpoint rounded to `bits`.
    pub fn rounded(&self, bits: u32) -> Result<Self, NumberError> {
        Ok(ComplexBall { re: self.re.rounded(bits)?, im: self.im.rounded(bits)? })
    }

    /// The same ball, the radius of each part grown by `more`.
    pub fn widened(&self, more: &Float) -> Result<Self, NumberError> {
        Ok(ComplexBall { re: self.re.widened(more)?, im: self.im.widened(more)? })
    }

    /// Tells whether the two balls have a point in common.
    pub fn overlaps(&self, other: &Self) -> bool {
        self.re.overlaps(&other.re) && self.im.overlaps(&other.im)
    }

    pub fn neg(&self) -> Self {
        ComplexBall { re: self.re.neg(), im: self.im.neg() }
    }

    pub fn conj(&self) -> Self {
        ComplexBall { re: self.re.clone(), im: self.im.neg() }
    }

    pub fn add(&self, other: &Self) -> Result<Self, NumberError> {
        Ok(ComplexBall { re: self.re.add(&other.re)?, im: self.im.add(&other.im)? })
    }

    pub fn sub(&self, other: &Self) -> Result<Self, NumberError> {
        Ok(ComplexBall { re: self.re.sub(&other.re)?, im: self.im.sub(&other.im)? })
    }

    pub fn mul(&self, other: &Self) -> Result<Self, NumberError> {
        Ok(ComplexBall {
            re: self.re.mul(&other.re)?.sub(&self.im.mul(&other.im)?)?,
            im: self.re.mul(&other.im)?.add(&self.im.mul(&other.re)?)?,
        })
    }

    /// The quotient x / y.
    ///
    /// Accuracy: radius (r_x + |x / y| r_y) / d with d the least distance of the divisor's ball from zero.
    /// Errors: `DivisionByZero` for the point zero, `Undecided` when the divisor's ball contains zero.
    pub fn div(&self, other: &Self) -> Result<Self, NumberError> {
        if other.is_exact_zero() {
            return Err(NumberError::DivisionByZero);
        }
        if other.contains_zero() {
            return Err(NumberError::Undecided { question: Question::DivisorIsZero });
        }
        if other.is_real() {
            return Ok(ComplexBall { re: self.re.div(&other.re)?, im: self.im.div(&other.re)? });
        }
        if other.re.is_exact_zero() {
            return Ok(ComplexBall { re: self.im.div(&other.im)?, im: self.re.div(&other.im)?.neg() });
        }
        // Twice through the length of the divisor rather than once through its square, which could leave the range of exponents.
        let (numerator, divisor) = (self.without_radius()?, other.without_radius()?);
        let length = divisor.re.hypot(&divisor.im)?;
        let direction = ComplexBall { re: divisor.re.div(&length)?, im: divisor.im.div(&length)?.neg() };
        let product = numerator.mul(&direction)?;
        let quotient = ComplexBall { re: product.re.div(&length)?, im: product.im.div(&length)? };
        let through_divisor = up(&quotient.magnitude_above() * &other.radius());
        let moved = up(&self.radius() + &through_divisor);
        quotient.widened(&up(&moved / &other.magnitude_below()))
    }

    /// The midpoint alone.
    fn without_radius(&self) -> Result<Self, NumberError> {
        Ok(ComplexBall { re: Ball::from_float(self.re.mid().clone())?, im: Ball::from_float(self.im.mid().clone())? })
    }

    /// The magnitude.
    pub fn abs(&self) -> Result<Ball, NumberError> {
        if self.is_real() { Ok(self.re.abs()) } else { self.re.hypot(&self.im) }
    }

    /// The exponential.
    pub fn exp(&self) -> Result<Self, NumberError> {
        let length = self.re.exp()?;
        if self.is_real() {
            return Ok(Self::real(length));
        }
        let (sine, cosine) = self.im.sin_cos()?;
        Ok(ComplexBall { re: length.mul(&cosine)?, im: length.mul(&sine)? })
    }

    /// The principal logarithm, imaginary part in (-pi, pi]; an exactly real negative number has imaginary part pi.
    ///
    /// Accuracy: radius |r| / d with d the least distance of the ball from zero.
    /// Errors: `LogarithmOfZero`; `Undecided` when the ball touches zero or the negative real axis without lying in it.
    pub fn ln(&self) -> Result<Self, NumberError> {
        if self.is_exact_zero() {
            return Err(NumberError::LogarithmOfZero);
        }
        if self.contains_zero() {
            return Err(NumberError::Undecided { question: Question::LogarithmOfZero });
        }
        let im = self.im.atan2(&self.re)?;
        let re = if self.is_real() {
            self.re.abs().ln()?
        } else {
            let length = self.without_radius()?.abs()?;
            length.ln()?.widened(&up(&self.radius() / &self.magnitude_below()))?
        };
        Ok(ComplexBall { re, im })
    }

    /// The principal square root, real part not negative; of an exactly real negative number the root on the positive imaginary axis.
    ///
    /// Accuracy: radius |r| / (2 sqrt(d)) with d the least distance of the ball from zero.
    /// Errors: `Undecided` when the ball touches zero or the negative real axis without lying in it.
    pub fn sqrt(&self) -> Result<Self, NumberError> {
        if self.is_real() {
            return match self.re.sign() {
                Some(Ordering::Less) => Ok(Self::imaginary(self.re.neg().sqrt()?)),
                Some(_) => Ok(Self::real(self.re.sqrt()?)),
                None => Err(NumberError::Undecided { question: Question::SideOfCut }),
            };
        }
        if self.im.contains_zero() && !self.re.is_positive() {
            return Err(NumberError::Undecided { question: Question::SideOfCut });
        }
        let slope = down(&down(self.magnitude_below().sqrt_ref()) * 2u32);
        let moved = up(&self.radius() / &slope);
        let (re, im) = Complex::with_val(self.bits(), self.midpoint(self.bits()).sqrt_ref()).into_real_imag();
        Ok(ComplexBall {
            re: Ball::enclose((re, Ordering::Greater), moved.clone())?,
            im: Ball::enclose((im, Ordering::Greater), moved)?,
        })
    }

    /// The principal power exp(w ln z) with z = `self`.
    ///
    /// Errors: as `ln` and `exp`; the power of a zero is the caller's case.
    pub fn pow(&self, exponent: &Self) -> Result<Self, NumberError> {
        exponent.mul(&self.ln()?)?.exp()
    }

    /// Integer power by repeated squaring.
    ///
    /// Errors: as division, for negative exponents.
    pub fn powi(&self, exponent: i64) -> Result<Self, NumberError> {
        if self.is_real() {
            return Ok(Self::real(self.re.powi(exponent)?));
        }
        let mut result = Self::one(self.bits());
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
        if exponent < 0 { Self::one(self.bits()).div(&result) } else { Ok(result) }
    }

    /// The sine: sin x cosh y + i cos x sinh y.
    pub fn sin(&self) -> Result<Self, NumberError> {
        let (sine, cosine) = self.re.sin_cos()?;
        if self.is_real() {
            return Ok(Self::real(sine));
        }
        let (hyperbolic_sine, hyperbolic_cosine) = self.im.sinh_cosh()?;
        Ok(ComplexBall { re: sine.mul(&hyperbolic_cosine)?, im: cosine.mul(&hyperbolic_sine)? })
    }

    /// The cosine: cos x cosh y - i sin x sinh y.
    pub fn cos(&self) -> Result<Self, NumberError> {
        let (sine, cosine) = self.re.sin_cos()?;
        if self.is_real() {
            return Ok(Self::real(cosine));
        }
        let (hyperbolic_sine, hyperbolic_cosine) = self.im.sinh_cosh()?;
        Ok(ComplexBall { re: cosine.mul(&hyperbolic_cosine)?, im: sine.mul(&hyperbolic_sine)?.neg() })
    }
}

/// The sum of q sqrt(n) over terms that do not add up to zero, to about `bits` relative bits.
///
/// The precision is raised until what is left after cancellation is known well enough; it ends because the sum is not zero.
fn relative_sum(terms: &[(&Unit, &Rational)], bits: u32) -> Result<Ball, NumberError> {
    if terms.is_empty() {
        return Ok(Ball::zero(bits));
    }
    let mut working = bits.saturating_add(RADIUS_BITS);
    loop {
        let mut sum = Ball::zero(working);
        for (unit, q) in terms {
            let mut term = Ball::from_rational(q, working)?;
            if unit.radicand != 1 {
                term = term.mul(&Ball::from_integer(&unit.radicand, working)?.sqrt()?)?;
            }
            if unit.pi_power != 0 {
                term = term.mul(&Ball::pi(working)?.powi(i64::from(unit.pi_power))?)?;
            }
            sum = sum.add(&term)?;
        }
        let wanted = match sum.mid().get_exp() {
            Some(exponent) => up(Float::i_exp(1, exponent.saturating_sub_unsigned(bits))),
            None => Float::new(RADIUS_BITS),
        };
        if *sum.rad() <= wanted {
            return sum.rounded(bits);
        }
        if working >= EVALUATION_BITS {
            return Err(NumberError::Undecided { question: Question::Sign });
        }
        working = working.saturating_mul(2).min(EVALUATION_BITS);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn ball(re: (f64, f64), im: (f64, f64)) -> ComplexBall {
        let part = |(mid, rad)| Ball::with_radius(Float::with_val(64, mid), Float::with_val(32, rad)).expect("finite");
        ComplexBall::new(part(re), part(im))
    }

    #[test]
    fn the_cut_belongs_to_its_upper_side() {
        let minus_two = ball((-2.0, 0.0), (0.0, 0.0));
        assert!(minus_two.ln().expect("defined").im.overlaps(&Ball::pi(64).expect("finite")));
        let root = minus_two.sqrt().expect("defined");
        assert!(root.re.is_exact_zero() && root.im.is_positive());
        let below = ball((-2.0, 0.0), (-1e-9, 1e-10));
        assert!(below.ln().expect("defined").im.is_negative() && below.sqrt().expect("defined").im.is_negative());
        let touching = ball((-2.0, 0.0), (0.0, 1e-10));
        let undecided = Err(NumberError::Undecided { question: Question::SideOfCut });
        assert_eq!(touching.ln(), undecided);
        assert_eq!(touching.sqrt(), undecided);
        assert_eq!(touching.pow(&touching), undecided);
    }

    #[test]
    fn reals_stay_real_and_imaginaries_divide_to_reals() {
        let (x, y) = (ball((3.0, 1e-9), (0.0, 0.0)), ball((0.0, 0.0), (2.0, 1e-9)));
        for result in
            [x.exp(), x.ln(), x.sqrt(), x.sin(), x.cos(), x.pow(&x), x.powi(-3), y.div(&y), y.mul(&y), x.div(&x)]
        {
            assert!(result.expect("defined").is_real());
        }
    }

    #[test]
    fn exact_numbers_keep_their_bits_through_cancellation() {
        let root = Surd::sqrt_of(&Rational::from(2)).expect("small");
        let tiny = (&root - &Surd::one()).pow(300).expect("short");
        let value = ComplexBall::from_surd(&tiny, 100).expect("nonzero");
        let relative = Float::with_val(64, value.re.rad() / value.re.mid());
        assert!(relative > 0 && relative < Float::with_val(64, Float::i_exp(1, -98)));
        assert!(value.is_real());
    }

    #[test]
    fn computed_numbers_come_in_with_their_error() {
        let radius = Float::with_val(53, 0.5);
        let value = ComplexBall::from_complex(Complex::with_val(64, (3, 4)), radius.clone()).expect("finite");
        assert_eq!(value.midpoint(20), Complex::with_val(64, (3, 4)));
        assert!(value.radius() >= 0.5f64.hypot(0.5) && value.radius() < 0.7072);
        assert!(value.magnitude_below() <= 4.3012 && value.magnitude_above() >= 5.7);
        assert!(ComplexBall::from_complex(Complex::with_val(64, (f64::NAN, 0)), radius).is_err());
    }
}
