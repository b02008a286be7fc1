//! Decimal numbers as they are spelt: reading, rounding to a decimal place, writing.

use rug::float::Round;
use rug::ops::Pow;
use rug::{Float, Integer, Rational};
use std::cmp::Ordering;

/// Most digits of a number in the text of a session.
pub const MOST_DIGITS: usize = 100_000;

/// Largest power of ten after `e` in the text of a session.
pub const LARGEST_EXPONENT: i64 = 100_000;

/// Why a text is not read as a decimal number.
#[derive(Clone, PartialEq, Eq, Debug, thiserror::Error)]
pub enum DecimalError {
    #[error("`{text}` is not a decimal number; a number such as 12, 0.10 or 1.5e-3 is wanted")]
    NotANumber { text: String },
    #[error("a number of {digits} digits is too long; at most {MOST_DIGITS} are read")]
    TooManyDigits { digits: usize },
    #[error("the power of ten {exponent} is too large; at most {LARGEST_EXPONENT} is read")]
    ExponentTooLarge { exponent: String },
}

/// A number `units` x 10^`place`, as it is spelt: `0.10` is 10 units of the second decimal place.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Decimal {
    pub units: Integer,
    pub place: i64,
}

/// Reads `12`, `0.10`, `1.5e-3` or the same with a sign, exactly.
///
/// Errors: [`DecimalError`]; at most 100,000 digits and powers of ten up to 100,000 are read.
pub fn parse_decimal(text: &str) -> Result<Rational, DecimalError> {
    Ok(Decimal::parse(text)?.to_rational())
}

/// Working bits that hold this many decimal digits.
pub fn bits_for_digits(digits: u32) -> u32 {
    // log2(10) = 3.3219..., from above
    (u64::from(digits) * 33_220 / 10_000 + 1).min(u64::from(u32::MAX)) as u32
}

impl Decimal {
    /// Reads a decimal and keeps how many places it was given to.
    ///
    /// Errors: as [`parse_decimal`].
    pub fn parse(text: &str) -> Result<Self, DecimalError> {
        let refuse = || DecimalError::NotANumber { text: text.chars().take(40).collect() };
        let (mantissa, exponent) = match text.split_once(['e', 'E']) {
            Some((mantissa, exponent)) => (mantissa, Some(exponent)),
            None => (text, None),
        };
        let (negative, unsigned) = split_sign(mantissa);
        let (whole, fraction) = unsigned.split_once('.').map_or((unsigned, None), |(w, f)| (w, Some(f)));
        if !is_digits(whole) || fraction.is_some_and(|digits| !is_digits(digits)) {
            return Err(refuse());
        }
        let fraction = fraction.unwrap_or("");
        let digits = whole.len() + fraction.len();
        if digits > MOST_DIGITS {
            return Err(DecimalError::TooManyDigits { digits });
        }
        let power = match exponent {
            Some(exponent) => parse_exponent(exponent).ok_or_else(refuse)??,
            None => 0,
        };
        let mut units = Integer::from_str_radix(&[whole, fraction].concat(), 10).map_err(|_| refuse())?;
        if negative {
            units = -units;
        }
        // at most 100,000 digits
        let places = fraction.len() as i64;
        Ok(Decimal { units, place: power - places })
    }

    /// The nearest multiple of 10^`place`; of two the even one.
    pub fn nearest(value: &Rational, place: i64) -> Self {
        let scaled = value / power_of_ten(place);
        let (fraction, floor) = scaled.fract_floor(Integer::new());
        let up = match fraction.cmp(&Rational::from((1, 2))) {
            Ordering::Less => false,
            Ordering::Greater => true,
            Ordering::Equal => floor.is_odd(),
        };
        Decimal { units: if up { floor + 1 } else { floor }, place }
    }

    /// The nearest number of `digits` significant digits; `None` for zero and what is not finite.
    pub(crate) fn of_float(value: &Float, digits: u32) -> Option<Self> {
        let (negative, text, exponent) =
            value.to_sign_string_exp_round(10, Some(digits.max(1) as usize), Round::Nearest);
        let units = Integer::from_str_radix(&text, 10).ok()?;
        Some(Decimal {
            units: if negative { -units } else { units },
            place: i64::from(exponent?) - i64::from(digits.max(1)),
        })
    }

    /// The nearest multiple of 10^`place`, for a number whose digits down to that place are few enough to be written.
    ///
    /// Errors: `None` for what is not finite, or would have more than 2^31 digits.
    pub(crate) fn of_float_at(value: &Float, place: i64) -> Option<Self> {
        if value.is_zero() {
            return Some(Decimal { units: Integer::new(), place });
        }
        // value = 0.d... x 10^exponent
        let (negative, first, exponent) = value.to_sign_string_exp_round(10, Some(1), Round::Zero);
        let digits = i64::from(exponent?) - place;
        match digits.cmp(&0) {
            Ordering::Less => Some(Decimal { units: Integer::new(), place }),
            Ordering::Equal => {
                let unit = i32::from(first.as_str() >= "5");
                Some(Decimal { units: Integer::from(if negative { -unit } else { unit }), place })
            }
            Ordering::Greater => {
                let mut rounded = Self::of_float(value, u32::try_from(digits).ok()?)?;
                // Rounding up to a further digit moved the place by one.
                while rounded.place > place {
                    rounded.units *= 10;
                    rounded.place -= 1;
                }
                Some(rounded)
            }
        }
    }

    pub fn to_rational(&self) -> Rational {
        power_of_ten(self.place) * &self.units
    }

    /// The power of ten of the leading digit; `None` for zero.
    pub fn leading_power(&self) -> Option<i64> {
        if self.units.cmp0() == Ordering::Equal {
            return None;
        }
        let digits = Integer::from(self.units.abs_ref()).to_string().len();
        Some(self.place + digits as i64 - 1)
    }

    /// Without a power of ten, down to the place of the units: `0.10`, `1200`.
    pub fn plain(&self) -> String {
        let digits = Integer::from(self.units.abs_ref()).to_string();
        let sign = if self.units.cmp0() == Ordering::Less { "-" } else { "" };
        match usize::try_from(self.place.unsigned_abs()) {
            Ok(zeros) if self.place >= 0 => {
                format!("{sign}{digits}{}", "0".repeat(if digits == "0" { 0 } else { zeros }))
            }
            Ok(places) => {
                // A format width would end at 65,535.
                let padded = format!("{}{digits}", "0".repeat((places + 1).saturating_sub(digits.len())));
                let (whole, fraction) = padded.split_at(padded.len() - places);
                format!("{sign}{whole}.{fraction}")
            }
            Err(_) => self.scientific(self.place),
        }
    }

    /// With a power of ten: `1.50e-12`.
    pub fn scientific(&self, power: i64) -> String {
        let mantissa = Decimal { units: self.units.clone(), place: self.place - power };
        format!("{}e{power}", mantissa.plain())
    }
}

/// 10^power as a rational; the powers of texts and printed numbers are at most a few hundred thousand.
pub(crate) fn power_of_ten(power: i64) -> Rational {
    let size = Integer::from(10).pow(u32::try_from(power.unsigned_abs()).unwrap_or(u32::MAX));
    if power < 0 { Rational::from((1, size)) } else { Rational::from(size) }
}

/// The power of ten of the leading digit of a rational that is not zero: floor(log10 |q|).
pub(crate) fn leading_power(q: &Rational) -> Option<i64> {
    if q.cmp0() == Ordering::Equal {
        return None;
    }
    let size = Rational::from(q.abs_ref());
    let bits = f64::from(size.numer().significant_bits()) - f64::from(size.denom().significant_bits());
    // The estimate is off by less than one power of ten; the comparisons put it right.
    let mut power = (bits * std::f64::consts::LOG10_2).floor() as i64;
    while power_of_ten(power) > size {
        power -= 1;
    }
    while power_of_ten(power + 1) <= size {
        power += 1;
    }
    Some(power)
}

fn split_sign(text: &str) -> (bool, &str) {
    match text.strip_prefix('-') {
        Some(rest) => (true, rest),
        None => (false, text.strip_prefix('+').unwrap_or(text)),
    }
}

fn is_digits(text: &str) -> bool {
    !text.is_empty() && text.bytes().all(|b| b.is_ascii_digit())
}

/// The power after `e`; `None` when it is no whole number.
fn parse_exponent(text: &str) -> Option<Result<i64, DecimalError>> {
    let (negative, digits) = split_sign(text);
    if !is_digits(digits) {
        return None;
    }
    let significant = digits.trim_start_matches('0');
    let size = if significant.len() > 7 { i64::MAX } else { significant.parse().unwrap_or(0) };
    if size > LARGEST_EXPONENT {
        return Some(Err(DecimalError::ExponentTooLarge { exponent: text.chars().take(40).collect() }));
    }
    Some(Ok(if negative { -size } else { size }))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn read(text: &str) -> Rational {
        parse_decimal(text).expect(text)
    }

    #[test]
    fn decimals_are_exact() {
        assert_eq!(read("12"), 12);
        assert_eq!(read("0.10"), Rational::from((1, 10)));
        assert_eq!(read("1.5e-3"), Rational::from((3, 2000)));
        assert_eq!(read("-2.50E+2"), -250);
        assert_eq!(Decimal::parse("0.10"), Ok(Decimal { units: Integer::from(10), place: -2 }));
    }

    #[test]
    fn texts_that_are_not_decimals() {
        for text in [
            "", ".", "1.", ".5", "1e", "1e+", "1.2.3", "1e2.5", "0x10", "1_000", "--1", "١٢", "inf", "nan", "1 2", "e5",
        ] {
            assert_eq!(parse_decimal(text), Err(DecimalError::NotANumber { text: text.to_string() }), "{text}");
        }
    }

    #[test]
    fn long_texts_are_refused() {
        assert_eq!(parse_decimal(&"1".repeat(100_001)), Err(DecimalError::TooManyDigits { digits: 100_001 }));
        assert!(parse_decimal(&"1".repeat(100_000)).is_ok());
        assert!(parse_decimal("1e-100000").is_ok());
        for exponent in ["100001", "-99999999999999999999999"] {
            let error = parse_decimal(&format!("1e{exponent}"));
            assert_eq!(error, Err(DecimalError::ExponentTooLarge { exponent: exponent.to_string() }));
        }
    }

    #[test]
    fn plain_and_scientific() {
        let number = |units: i64, place| Decimal { units: Integer::from(units), place };
        assert_eq!(number(10, -2).plain(), "0.10");
        assert_eq!(number(-12, 2).plain(), "-1200");
        assert_eq!(number(0, -3).plain(), "0.000");
        assert_eq!(number(5, -100_000).plain().len(), 100_002);
        assert_eq!(number(-150, -14).scientific(-12), "-1.50e-12");
        assert_eq!(number(999, 0).leading_power(), Some(2));
    }

    #[test]
    fn rounding_of_rationals_and_floats() {
        assert_eq!(Decimal::nearest(&Rational::from((-5, 2)), 0).units, -2);
        assert_eq!(Decimal::nearest(&Rational::from((26, 10)), 0).units, 3);
        let float = Float::with_val(64, 999.96);
        assert_eq!(Decimal::of_float(&float, 4).map(|d| d.plain()), Some("1000".to_string()));
        assert_eq!(Decimal::of_float_at(&float, -1).map(|d| d.plain()), Some("1000.0".to_string()));
        assert_eq!(Decimal::of_float_at(&float, 3).map(|d| d.units), Some(Integer::from(1)));
        assert_eq!(Decimal::of_float_at(&float, 4).map(|d| d.units), Some(Integer::new()));
    }

    #[test]
    fn leading_powers_at_the_edges() {
        for power in [-40, -7, -1, 0, 1, 6, 33] {
            let q = power_of_ten(power);
            assert_eq!(leading_power(&q), Some(power));
            assert_eq!(leading_power(&-(q * Rational::from((999_999, 1_000_000)))), Some(power - 1));
        }
        assert_eq!(leading_power(&Rational::new()), None);
    }
}
