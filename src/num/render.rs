//! Numbers as text: only digits that are certain, and what the text is worth.
//!
//! A digit is *certified* when both ends of the ball, rounded to that place, give the same text: no number in the ball has another. Where the true
//! value lies within the ball's radius of a rounding boundary (it may sit exactly on one, as 0.125 does for two digits), no precision certifies the
//! number of digits asked for; then one digit more is printed, which is certain.
//!
//! Both parts of a complex number are rounded at the same decimal place, fixed by the larger part, and carry the same power of ten:
//! `1.23e-15 + 0.04e-15 i`. A part that rounds to nothing there is written `0.00`: it is rounded, not claimed to be zero. A part that is exactly zero
//! is left out.

use super::ball::Ball;
use super::complex_ball::ComplexBall;
use super::decimal::{Decimal, bits_for_digits};
use super::error::NumberError;
use super::scalar::Scalar;
use super::uncertain::{SMALLEST_PLAIN_POWER, concise_text};
use rug::float::Round;
use rug::{Float, Integer};
use std::cmp::Ordering;

/// A number as text.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Rendered {
    pub text: String,
    pub kind: RenderedKind,
}

/// What the text of a number claims.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum RenderedKind {
    /// The number itself.
    Exact,
    /// A rounded number of this many certain significant digits. With none, the text is `1.5(4)`: the number lies within the bracket.
    Approx { digits_held: u32 },
    /// The magnitude is at most 10^-power and may be zero: `0 below 1e-40`.
    BelowZero { power: i64 },
}

/// How far two numbers agree.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Agreement {
    /// They are proved to be the same number.
    Equal,
    /// Their difference is less than 10^-digits of the larger.
    Digits(u32),
    /// One is positive, the other negative.
    SignsDiffer,
    /// Both may be zero; neither exceeds 10^-power.
    BothBelow { power: i64 },
}

/// Writes a number to `digits` significant digits, or to as many as are certain. Exact numbers are written exactly.
pub fn render(value: &Scalar, digits: u32) -> Rendered {
    match value {
        Scalar::Exact(exact) => Rendered { text: exact.to_string(), kind: RenderedKind::Exact },
        Scalar::Approx(ball) if ball.is_exact_zero() => Rendered { text: "0".to_string(), kind: RenderedKind::Exact },
        Scalar::Approx(ball) => render_ball(ball, digits.max(1)),
    }
}

/// Writes a number as a decimal to `digits` significant digits, an exact one too.
///
/// Errors: as the conversion of an exact number to a ball.
pub fn render_decimal(value: &Scalar, digits: u32) -> Result<Rendered, NumberError> {
    let guarded = bits_for_digits(digits.saturating_add(20));
    Ok(render(&Scalar::Approx(value.to_ball(guarded)?), digits))
}

/// Tells whether a wider working precision is needed to print `digits` certain digits. A number that may be zero always needs more.
pub fn needs_more(value: &Scalar, digits: u32) -> bool {
    match value {
        Scalar::Exact(_) => false,
        Scalar::Approx(ball) if ball.is_exact_zero() => false,
        Scalar::Approx(ball) => {
            let parts = Parts::of(ball);
            parts.contain_zero() || parts.certified(digits.max(1)).is_none()
        }
    }
}

/// Counts the digits in which two numbers agree.
///
/// Accuracy: a count is never too large; it is limited by the radii of the two balls.
pub fn digits_in_common(left: &Scalar, right: &Scalar) -> Agreement {
    let exact_bits = |other: &Scalar| match other {
        Scalar::Approx(ball) => ball.bits().saturating_add(64),
        Scalar::Exact(_) => 128,
    };
    let agreement = || -> Result<Agreement, NumberError> {
        let difference = left.sub(right, exact_bits(left).max(exact_bits(right)))?;
        if difference.is_zero() {
            return Ok(Agreement::Equal);
        }
        let (a, b) = (left.to_ball(exact_bits(right))?, right.to_ball(exact_bits(left))?);
        if let (true, true, Some(s), Some(t)) = (a.is_real(), b.is_real(), a.re.sign(), b.re.sign())
            && s != t
            && s != Ordering::Equal
            && t != Ordering::Equal
        {
            return Ok(Agreement::SignsDiffer);
        }
        if a.contains_zero() && b.contains_zero() {
            return Ok(Agreement::BothBelow {
                power: power_above(larger_of(&a.magnitude_above(), &b.magnitude_above())),
            });
        }
        let difference = difference.to_ball(64)?.magnitude_above();
        let (a, b) = (a.magnitude_below(), b.magnitude_below());
        let ratio = Float::with_val_round(32, larger_of(&a, &b) / &difference, Round::Down).0;
        let digits = Float::with_val_round(32, ratio.log10_ref(), Round::Down).0.to_f64().floor();
        Ok(Agreement::Digits(if digits > 0.0 { digits as u32 } else { 0 }))
    };
    // A difference out of the range of exponents has no digit in common.
    agreement().unwrap_or(Agreement::Digits(0))
}

fn larger_of<'a>(a: &'a Float, b: &'a Float) -> &'a Float {
    if a > b { a } else { b }
}

/// The largest N with `bound` <= 10^-N.
fn power_above(bound: &Float) -> i64 {
    // log10 is rounded up, so that the power claimed is never too large; at the edge it may be one too small.
    let power = Float::with_val_round(64, bound.log10_ref(), Round::Up).0.ceil();
    power.to_integer().and_then(|n| n.to_i64()).map_or(0, |n| -n)
}

/// The parts that are printed: those that are not exactly zero.
struct Parts<'a> {
    larger: &'a Ball,
    smaller: Option<&'a Ball>,
    larger_is_imaginary: bool,
}

/// The parts rounded to a common place, in the order of [`Parts`].
struct RoundedParts {
    larger: Decimal,
    smaller: Option<Decimal>,
    digits: u32,
}

impl<'a> Parts<'a> {
    fn of(ball: &'a ComplexBall) -> Self {
        let (re, im) = (&ball.re, &ball.im);
        if im.is_exact_zero() {
            Parts { larger: re, smaller: None, larger_is_imaginary: false }
        } else if re.is_exact_zero() {
            Parts { larger: im, smaller: None, larger_is_imaginary: true }
        } else if re.mid().cmp_abs(im.mid()) == Some(Ordering::Less) {
            Parts { larger: im, smaller: Some(re), larger_is_imaginary: true }
        } else {
            Parts { larger: re, smaller: Some(im), larger_is_imaginary: false }
        }
    }

    fn contain_zero(&self) -> bool {
        self.larger.contains_zero() && self.smaller.is_none_or(Ball::contains_zero)
    }

    /// The parts to `digits` digits, or to one more where a part lies at a rounding boundary.
    fn certified(&self, digits: u32) -> Option<RoundedParts> {
        self.certified_exactly(digits).or_else(|| self.certified_exactly(digits.saturating_add(1)))
    }

    fn certified_exactly(&self, digits: u32) -> Option<RoundedParts> {
        if self.larger.contains_zero() || digits > self.most_digits() {
            return None;
        }
        let larger = same_at_both_ends(self.larger, |end| Decimal::of_float(end, digits))?;
        let smaller = match self.smaller {
            Some(part) => Some(same_at_both_ends(part, |end| Decimal::of_float_at(end, larger.place))?),
            None => None,
        };
        Some(RoundedParts { larger, smaller, digits })
    }

    /// More digits than this are not certain.
    fn most_digits(&self) -> u32 {
        let wider = match self.smaller {
            Some(smaller) if smaller.rad() > self.larger.rad() => smaller.rad(),
            _ => self.larger.rad(),
        };
        let (Some(size), Some(spread)) = (self.larger.mid().get_exp(), wider.get_exp()) else { return u32::MAX };
        let bits = i64::from(size) - i64::from(spread);
        (bits.max(0) as f64 * std::f64::consts::LOG10_2) as u32 + 2
    }

    /// Real part first, then the imaginary one with its `i`.
    fn join(&self, larger: String, smaller: Option<String>) -> String {
        match (smaller, self.larger_is_imaginary) {
            (None, false) => larger,
            (None, true) => format!("{larger} i"),
            (Some(smaller), false) => sum_text(&larger, &smaller),
            (Some(smaller), true) => sum_text(&smaller, &larger),
        }
    }
}

fn sum_text(re: &str, im: &str) -> String {
    match im.strip_prefix('-') {
        Some(size) => format!("{re} - {size} i"),
        None => format!("{re} + {im} i"),
    }
}

fn same_at_both_ends(ball: &Ball, round: impl Fn(&Float) -> Option<Decimal>) -> Option<Decimal> {
    if ball.is_exact() {
        return round(ball.mid());
    }
    let (low, high) = ball.ends();
    let (low, high) = (round(&low)?, round(&high)?);
    (low == high).then_some(low)
}

fn render_ball(ball: &ComplexBall, digits: u32) -> Rendered {
    let parts = Parts::of(ball);
    if parts.contain_zero() {
        let power = power_above(&ball.magnitude_above());
        return Rendered { text: format!("0 below 1e{}", -power), kind: RenderedKind::BelowZero { power } };
    }
    let rounded = parts
        .certified(digits)
        .or_else(|| (1..digits.min(parts.most_digits())).rev().find_map(|n| parts.certified_exactly(n)));
    match rounded {
        Some(rounded) => {
            let write = common_notation(&rounded.larger, rounded.digits);
            Rendered {
                text: parts.join(write(&rounded.larger), rounded.smaller.as_ref().map(&write)),
                kind: RenderedKind::Approx { digits_held: rounded.digits },
            }
        }
        None => Rendered { text: bounded_text(&parts), kind: RenderedKind::Approx { digits_held: 0 } },
    }
}

/// Plain where the leading power of ten is from -6 to below the number of digits, otherwise with a power of ten.
fn common_notation(larger: &Decimal, digits: u32) -> impl Fn(&Decimal) -> String {
    let power = larger.place + i64::from(digits) - 1;
    move |part| {
        if (SMALLEST_PLAIN_POWER..i64::from(digits)).contains(&power) { part.plain() } else { part.scientific(power) }
    }
}

/// A number of which no digit is certain, with a bracket that bounds it: both parts at the place of the larger radius.
fn bounded_text(parts: &Parts) -> String {
    let radius = parts.smaller.map_or(parts.larger.rad(), |smaller| larger_of(parts.larger.rad(), smaller.rad()));
    // Without a radius every digit would have been certain.
    let spread = Decimal::of_float(radius, 1).unwrap_or(Decimal { units: Integer::new(), place: 0 });
    // Rounding the bound and the value may each lose up to half a unit.
    let spread = Decimal { units: spread.units + 1, place: spread.place };
    let write = |part: &Ball| {
        let value = Decimal::of_float_at(part.mid(), spread.place)
            .unwrap_or(Decimal { units: Integer::new(), place: spread.place });
        concise_text(&value, &spread)
    };
    parts.join(write(parts.larger), parts.smaller.map(write))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::num::{Function, Surd};
    use rug::Rational;

    fn float(text: &str, bits: u32) -> Float {
        Float::with_val(bits, Float::parse(text).expect(text))
    }

    /// A ball from texts, its midpoint to 400 bits.
    fn ball(mid: &str, rad: &str) -> Ball {
        Ball::with_radius(float(mid, 400), float(rad, 32)).expect("finite")
    }

    fn real(mid: &str, rad: &str) -> Scalar {
        Scalar::from(ball(mid, rad))
    }

    fn complex(re: (&str, &str), im: (&str, &str)) -> Scalar {
        Scalar::Approx(ComplexBall::new(ball(re.0, re.1), ball(im.0, im.1)))
    }

    fn check(value: &Scalar, digits: u32, text: &str, digits_held: u32) {
        let expected = Rendered { text: text.to_string(), kind: RenderedKind::Approx { digits_held } };
        assert_eq!(render(value, digits), expected);
        assert_eq!(needs_more(value, digits), digits_held < digits);
    }

    #[test]
    fn real_numbers() {
        check(&real("3.14159265358979", "1e-14"), 6, "3.14159", 6);
        check(&real("3.14159265358979", "1e-3"), 6, "3.14", 3);
        check(&real("-0.000001234567", "1e-15"), 4, "-0.000001235", 4);
        check(&real("1.234567e-15", "1e-30"), 4, "1.235e-15", 4);
        check(&real("123456.7", "1e-9"), 6, "123457", 6);
        check(&real("123456.7", "1e-9"), 5, "1.2346e5", 5);
        check(&real("123456.7", "300"), 6, "1.2e5", 2);
        check(&real("99999.96", "1e-9"), 6, "100000", 6);
        check(&real("-7.4e1000000", "1e999000"), 3, "-7.40e1000000", 3);
        check(&real("7", "1e-20"), 1, "7", 1);
    }

    #[test]
    fn a_number_at_a_rounding_boundary_shows_one_digit_more() {
        check(&real("0.125", "1e-50"), 2, "0.125", 3);
        check(&real("99.5", "1e-50"), 2, "99.5", 3);
        check(&complex(("12.5", "1e-50"), ("1", "1e-50")), 2, "12.5 + 1.0 i", 3);
    }

    #[test]
    fn numbers_without_a_certain_digit_are_bounded() {
        check(&real("1.5", "0.4"), 5, "1.5(5)", 0);
        check(&complex(("1.5", "0.4"), ("3", "0")), 5, "1.5(5) + 3.0(5) i", 0);
        check(&complex(("0.001", "1e-20"), ("0.2", "1.5")), 5, "0(3) + 0(3) i", 0);
    }

    #[test]
    fn numbers_that_may_be_zero() {
        for (value, text, power) in [
            (real("1e-50", "9e-43"), "0 below 1e-42", 42),
            (real("0", "1.01e3"), "0 below 1e4", -4),
            (real("0", "0.99"), "0 below 1e0", 0),
            (complex(("0", "8e-11"), ("0", "8e-11")), "0 below 1e-9", 9),
        ] {
            assert_eq!(render(&value, 10), Rendered { text: text.into(), kind: RenderedKind::BelowZero { power } });
            assert!(needs_more(&value, 10));
        }
        assert_eq!(render(&real("0", "0"), 10), Rendered { text: "0".into(), kind: RenderedKind::Exact });
    }

    #[test]
    fn complex_numbers_share_the_decimal_place() {
        check(&complex(("1.23456", "1e-20"), ("4.56789", "1e-20")), 3, "1.23 + 4.57 i", 3);
        check(&complex(("1.23456", "1e-20"), ("-456.789", "1e-20")), 4, "1.2 - 456.8 i", 4);
        check(&complex(("1.23456e-15", "1e-30"), ("4.1e-17", "1e-30")), 3, "1.23e-15 + 0.04e-15 i", 3);
        check(&complex(("0", "1e-20"), ("4.56789", "1e-20")), 3, "0.00 + 4.57 i", 3);
        check(&complex(("0", "0"), ("-4.56789", "1e-20")), 3, "-4.57 i", 3);
        check(&complex(("1.5", "1e-20"), ("2.6", "1e-3")), 8, "1.50 + 2.60 i", 3);
        check(&complex(("9.996", "1e-20"), ("9.994", "1e-20")), 3, "10.0 + 10.0 i", 3);
    }

    #[test]
    fn exact_numbers_are_written_exactly() {
        let value = Scalar::from(Rational::from((9, 2)));
        assert_eq!(render(&value, 3), Rendered { text: "9/2".into(), kind: RenderedKind::Exact });
        assert!(!needs_more(&value, 1_000_000));
        assert_eq!(render_decimal(&value, 3).map(|r| r.text), Ok("4.50".to_string()));
        assert_eq!(
            render_decimal(&Scalar::from(Rational::from((-1, 3))), 4).map(|r| r.text),
            Ok("-0.3333".to_string())
        );
    }

    #[test]
    fn counting_common_digits() {
        let third = Scalar::from(Rational::from((1, 3)));
        let root = Scalar::Exact(Surd::sqrt_of(&Rational::from(2)).expect("small"));
        let squared = root.apply(Function::Exp, 200).and_then(|x| x.apply(Function::Ln, 200)).expect("defined");
        assert_eq!(digits_in_common(&third, &third), Agreement::Equal);
        assert_eq!(digits_in_common(&third, &third.neg()), Agreement::SignsDiffer);
        assert_eq!(digits_in_common(&third, &real("0.333332", "1e-30")), Agreement::Digits(5));
        assert_eq!(digits_in_common(&third, &root), Agreement::Digits(0));
        assert_eq!(digits_in_common(&real("1", "1e-20"), &real("1", "1e-30")), Agreement::Digits(19));
        assert_eq!(digits_in_common(&real("0", "1.1e-21"), &real("0", "9e-31")), Agreement::BothBelow { power: 20 });
        assert!(matches!(digits_in_common(&root, &squared), Agreement::Digits(57..=61)));
        assert_eq!(digits_in_common(&Scalar::i(), &Scalar::i().neg()), Agreement::Digits(0));
    }
}
