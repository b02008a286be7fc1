//! Signs, magnitudes, roots and powers of exact numbers that are exact numbers again.

use super::complex_ball::ComplexBall;
use super::error::{DigitCount, NumberError, Question};
use super::surd::Surd;
use rug::{Float, Integer, Rational};
use std::cmp::Ordering;

/// Largest exact power that is computed, and largest magnitude of a power of an exact number, in bits.
const LARGEST_POWER_BITS: f64 = 1e6;

/// Precision at which signs are first looked at; it is raised as far as cancellation asks.
const SIGN_BITS: u32 = 64;

/// The sign of a real exact number.
///
/// Errors: `NotOrdered` with an imaginary part; `Undecided` when its terms cancel to more than 2^24 bits.
pub(crate) fn sign(value: &Surd) -> Result<Ordering, NumberError> {
    if value.is_zero() {
        return Ok(Ordering::Equal);
    }
    if !value.is_real() {
        return Err(NumberError::NotOrdered);
    }
    if let Some(q) = value.as_rational() {
        return Ok(q.cmp0());
    }
    ComplexBall::from_surd(value, SIGN_BITS)?.re.sign().ok_or(NumberError::Undecided { question: Question::Sign })
}

/// The magnitude, where it is an exact number.
pub(crate) fn magnitude(value: &Surd) -> Result<Option<Surd>, NumberError> {
    if value.is_real() {
        return Ok(Some(if sign(value)? == Ordering::Less { -value } else { value.clone() }));
    }
    let (re, im) = (value.re(), value.im());
    square_root(&(&(&re * &re) + &(&im * &im)))
}

/// The principal square root, where it is an exact number: of rationals, and of a + w with rational a, w^2 and sqrt(a^2 - w^2).
///
/// Source: derived here: sqrt(a + w) = sqrt((a + d)/2) +- sqrt((a - d)/2) with d^2 = a^2 - w^2, for w = b i and for w = b sqrt(n).
pub(crate) fn square_root(value: &Surd) -> Result<Option<Surd>, NumberError> {
    if value.as_rational().is_some() {
        return Ok(value.sqrt());
    }
    if value.is_real() && sign(value)? == Ordering::Less {
        return Ok(square_root(&-value)?.map(|root| &root * &Surd::i()));
    }
    Ok(nested_square_root(value))
}

fn nested_square_root(value: &Surd) -> Option<Surd> {
    if value.term_count() > 2 || value.has_pi() {
        return None;
    }
    let rational_part =
        value.terms().find(|(unit, _)| unit.radicand == 1).map(|(_, c)| c.re.clone()).unwrap_or_default();
    let rest = value - &Surd::from(rational_part.clone());
    let rest_square = (&rest * &rest).as_rational()?.into_owned();
    let difference = Surd::sqrt_of(&(Rational::from(rational_part.square_ref()) - rest_square))?;
    let d = difference.as_rational()?.into_owned();
    let larger = Surd::sqrt_of(&(Rational::from(&rational_part + &d) / 2))?;
    let smaller = Surd::sqrt_of(&(Rational::from(&rational_part - &d) / 2))?;
    // The larger root is real and positive, so it fixes the branch; the square fixes the sign of the other.
    [&larger + &smaller, &larger - &smaller].into_iter().find(|root| &(root * root) == value)
}

/// The principal power with a rational exponent, where it is an exact number that is short enough for `product` and `inverse`.
///
/// An integer power whose fraction would have more than a million bits is not exact: `None`.
///
/// Errors: `TooLarge` when its magnitude would have more than a million bits before or after the point; `DivisionByZero` for a negative power of
/// zero.
pub(crate) fn rational_power(
    base: &Surd,
    exponent: &Rational,
    product: &dyn Fn(&Surd, &Surd) -> Option<Surd>,
    inverse: &dyn Fn(&Surd) -> Option<Surd>,
) -> Result<Option<Surd>, NumberError> {
    let root = if exponent.is_integer() {
        Some(base.clone())
    } else if *exponent.denom() == 2 {
        square_root(base)?
    } else {
        perfect_root(base, exponent.denom())
    };
    match root {
        Some(root) => integer_power(&root, exponent.numer(), product, inverse),
        None => Ok(None),
    }
}

/// The positive root of a positive rational whose numerator and denominator are perfect powers.
fn perfect_root(base: &Surd, degree: &Integer) -> Option<Surd> {
    let q = base.as_rational()?;
    if q.cmp0() != Ordering::Greater {
        return None;
    }
    let degree = degree.to_u32()?;
    let root_of = |n: &Integer| {
        let (root, rest) = n.clone().root_rem(Integer::new(), degree);
        (rest.cmp0() == Ordering::Equal).then_some(root)
    };
    Some(Surd::from(Rational::from((root_of(q.numer())?, root_of(q.denom())?))))
}

fn integer_power(
    base: &Surd,
    exponent: &Integer,
    product: &dyn Fn(&Surd, &Surd) -> Option<Surd>,
    inverse: &dyn Fn(&Surd) -> Option<Surd>,
) -> Result<Option<Surd>, NumberError> {
    if base.is_zero() {
        return match exponent.cmp0() {
            Ordering::Less => Err(NumberError::DivisionByZero),
            Ordering::Equal => Ok(Some(Surd::one())),
            Ordering::Greater => Ok(Some(Surd::zero())),
        };
    }
    if let Some(quarter_turns) = quarter_turns_of(base) {
        let turns = (quarter_turns * exponent.mod_u(4)) % 4;
        return Ok(Some([Surd::one(), Surd::i(), Surd::from(-1), -&Surd::i()][turns as usize].clone()));
    }
    let times = exponent.to_f64().abs();
    let magnitude_bits = times * magnitude_in_bits(base)?.abs();
    if magnitude_bits > LARGEST_POWER_BITS {
        return Err(NumberError::TooLarge { decimal_digits: digits_of_bits(magnitude_bits) });
    }
    if times > 1.0 && times * growth_in_bits(base) > LARGEST_POWER_BITS {
        return Ok(None);
    }
    let Some(start) = (if exponent.cmp0() == Ordering::Less { inverse(base) } else { Some(base.clone()) }) else {
        return Ok(None);
    };
    let Some(mut left) = Integer::from(exponent.abs_ref()).to_u64() else { return Ok(None) };
    let (mut result, mut square) = (Surd::one(), start);
    while left > 0 {
        if left & 1 == 1 {
            match product(&result, &square) {
                Some(next) => result = next,
                None => return Ok(None),
            }
        }
        left >>= 1;
        if left > 0 {
            match product(&square, &square) {
                Some(next) => square = next,
                None => return Ok(None),
            }
        }
    }
    Ok(Some(result))
}

/// How many quarter turns 1, i, -1 and -i are; `None` for other numbers.
fn quarter_turns_of(base: &Surd) -> Option<u32> {
    [Surd::one(), Surd::i(), Surd::from(-1), -&Surd::i()].iter().position(|unit| unit == base).map(|turns| turns as u32)
}

/// The binary logarithm of the magnitude.
fn magnitude_in_bits(base: &Surd) -> Result<f64, NumberError> {
    let magnitude = ComplexBall::from_surd(base, SIGN_BITS)?.abs()?;
    Ok(Float::with_val(SIGN_BITS, magnitude.mid().log2_ref()).to_f64())
}

/// By how many bits numerator or denominator grow with each further power, at most; no more than a few bits are wasted.
fn growth_in_bits(base: &Surd) -> f64 {
    if f64::from(base.bits()) > LARGEST_POWER_BITS {
        return LARGEST_POWER_BITS;
    }
    let mut denominator = Integer::from(1);
    let mut size = Float::new(SIGN_BITS);
    for (unit, c) in base.terms() {
        denominator.lcm_mut(c.re.denom());
        denominator.lcm_mut(c.im.denom());
        let (re, im) = (Float::with_val(SIGN_BITS, &c.re), Float::with_val(SIGN_BITS, &c.im));
        size += re.hypot(&im) * Float::with_val(SIGN_BITS, &unit.radicand).sqrt();
    }
    let denominator_bits = Float::with_val(SIGN_BITS, &denominator).log2().to_f64();
    let numerator_bits = size.log2().to_f64() + denominator_bits;
    numerator_bits.max(denominator_bits)
}

fn digits_of_bits(bits: f64) -> DigitCount {
    let digits = bits * std::f64::consts::LOG10_2;
    if digits < 1e18 {
        DigitCount::About(digits.ceil() as u64)
    } else {
        DigitCount::MoreThan(1_000_000_000_000_000_000)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::num::scalar::Scalar;

    fn rational(n: i64, d: i64) -> Surd {
        Surd::from(Rational::from((n, d)))
    }

    fn power(base: &str, exponent: Scalar) -> Result<Scalar, NumberError> {
        let base = Scalar::from(base.parse::<Rational>().expect("test number"));
        base.pow(&exponent, 128)
    }

    #[test]
    fn roots_of_perfect_squares_under_a_root() {
        let three_plus_two_root_two = &rational(3, 1) + &Surd::sqrt_of(&Rational::from(8)).expect("small");
        let expected = &Surd::one() + &Surd::sqrt_of(&Rational::from(2)).expect("small");
        assert_eq!(square_root(&three_plus_two_root_two), Ok(Some(expected.clone())));
        assert_eq!(square_root(&-&three_plus_two_root_two), Ok(Some(&expected * &Surd::i())));
        // principal root of 3 - 4 i is 2 - i
        let z = Surd::gaussian(Rational::from(3), Rational::from(-4));
        assert_eq!(square_root(&z), Ok(Some(Surd::gaussian(Rational::from(2), Rational::from(-1)))));
        // of -3 - 4 i it is 1 - 2 i
        let z = Surd::gaussian(Rational::from(-3), Rational::from(-4));
        assert_eq!(square_root(&z), Ok(Some(Surd::gaussian(Rational::from(1), Rational::from(-2)))));
        assert_eq!(square_root(&(&Surd::one() + &Surd::sqrt_of(&Rational::from(2)).expect("small"))), Ok(None));
    }

    #[test]
    fn sign_survives_cancellation() {
        let root = Surd::sqrt_of(&Rational::from(2)).expect("small");
        let tiny = (&root - &Surd::one()).pow(700).expect("short");
        assert_eq!(sign(&tiny), Ok(Ordering::Greater));
        assert_eq!(sign(&(&tiny - &tiny)), Ok(Ordering::Equal));
        assert_eq!(magnitude(&-&tiny), Ok(Some(tiny)));
    }

    #[test]
    fn powers_that_are_exact() {
        assert_eq!(power("8", Scalar::from(Rational::from((2, 3)))), Ok(Scalar::from(4)));
        assert_eq!(power("9/4", Scalar::from(Rational::from((-3, 2)))), Ok(Scalar::from(Rational::from((8, 27)))));
        assert_eq!(power("-1", Scalar::from(Rational::from((1, 2)))), Ok(Scalar::i()));
        let far = Scalar::from(Rational::from(Integer::from(Integer::u_pow_u(10, 40))));
        assert_eq!(power("-1", far.clone()), Ok(Scalar::one()));
        assert_eq!(power("0", far), Ok(Scalar::zero()));
        assert_eq!(power("0", Scalar::zero()), Ok(Scalar::one()));
        assert_eq!(power("0", Scalar::from(-1)), Err(NumberError::DivisionByZero));
    }

    #[test]
    fn powers_that_are_too_long_say_how_long() {
        // 10^12 log10(2) = 301029995663.98
        let digits = DigitCount::About(301_029_995_664);
        assert_eq!(power("2", Scalar::from(1_000_000_000_000)), Err(NumberError::TooLarge { decimal_digits: digits }));
        assert_eq!(
            power("1/2", Scalar::from(1_000_000_000_000)),
            Err(NumberError::TooLarge { decimal_digits: digits })
        );
        let error = power("10", Scalar::from(10_000_000_000)).expect_err("too long");
        assert_eq!(error.to_string(), "the number would have about 10000000000 digits, more than can be worked with");
        let far = Scalar::from(Rational::from(Integer::from(Integer::u_pow_u(10, 100_000))));
        let error = power("3", far).expect_err("too long");
        assert_eq!(error.to_string(), "the number would have more than 10^18 digits, more than can be worked with");
    }

    #[test]
    fn a_long_fraction_of_moderate_size_becomes_a_ball() {
        let Ok(Scalar::Approx(ball)) = power("1000001/1000000", Scalar::from(1_000_000)) else { panic!("a ball") };
        // (1 + 1/n)^n = e (1 - 1/(2 n) + 11/(24 n^2) - ...)
        let expected = std::f64::consts::E * (1.0 - 0.5e-6);
        assert!((ball.re.mid().to_f64() - expected).abs() < 1e-11);
    }
}
