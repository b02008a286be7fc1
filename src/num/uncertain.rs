//! Standard uncertainties: the concise form `725736252(9)`, and how the contributions of several sources add up.

use super::decimal::{Decimal, DecimalError, LARGEST_EXPONENT, leading_power, power_of_ten};
use rug::{Float, Integer, Rational};
use std::cmp::Ordering;
use std::collections::BTreeMap;

/// Smallest power of ten of a leading digit that is written without `e`.
pub(crate) const SMALLEST_PLAIN_POWER: i64 = -6;

/// Largest power of ten of a leading digit that is written without `e` beside an uncertainty.
const LARGEST_PLAIN_POWER: i64 = 20;

/// Zeros that may stand for unknown digits before `e` is used: `725736700(260)` has one.
const MOST_PADDING: i64 = 2;

/// A value with its standard uncertainty.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Measured {
    pub value: Rational,
    pub uncertainty: Rational,
}

/// Writes a value with its standard uncertainty in the concise form.
///
/// The uncertainty has one significant digit where that changes it by less than 5 %, otherwise two; the value ends at the same decimal place.
/// Without an uncertainty the value is written exactly.
///
/// Source: common practice after the Guide to the Expression of Uncertainty in Measurement (JCGM 100:2008), 7.2.6: at most two digits.
pub fn concise(value: &Rational, uncertainty: &Rational) -> String {
    concise_shifted(value, uncertainty, 0)
}

/// Writes a floating-point value with its standard uncertainty in the concise form.
pub fn concise_float(value: &Float, uncertainty: &Float) -> String {
    let decimal_size = |x: &Float| Decimal::of_float(x, 1).map(|d| d.place);
    let largest = decimal_size(value).max(decimal_size(uncertainty)).unwrap_or(0);
    // An uncertainty this far below its value has no digit that is ever printed.
    let smallest = largest - LARGEST_EXPONENT;
    // Numbers of ordinary size are taken exactly; the power of ten of others is set aside.
    let shift = if largest.abs() > LARGEST_EXPONENT { largest } else { 0 };
    let rational = |x: &Float| -> Rational {
        let Some(size) = decimal_size(x) else { return Rational::new() };
        if size < smallest {
            return Rational::new();
        }
        if shift == 0 {
            return x.to_rational().unwrap_or_default();
        }
        let digits = u32::try_from(size - smallest).unwrap_or(0).min(x.prec());
        Decimal::of_float(x, digits).map(|d| Decimal { place: d.place - shift, ..d }.to_rational()).unwrap_or_default()
    };
    concise_shifted(&rational(value), &rational(uncertainty), shift)
}

/// The concise form of both numbers times 10^shift.
fn concise_shifted(value: &Rational, uncertainty: &Rational, shift: i64) -> String {
    let Some(spread) = round_uncertainty(uncertainty) else {
        return exact_text(value, shift);
    };
    let value = Decimal::nearest(value, spread.place);
    concise_text(
        &Decimal { units: value.units, place: value.place + shift },
        &Decimal { units: spread.units, place: spread.place + shift },
    )
}

/// The uncertainty to one or two significant digits; `None` for zero.
fn round_uncertainty(uncertainty: &Rational) -> Option<Decimal> {
    let size = Rational::from(uncertainty.abs_ref());
    let power = leading_power(&size)?;
    let one_digit = Decimal::nearest(&size, power);
    let change = Rational::from((one_digit.to_rational() - &size).abs_ref());
    if change * 20 >= size {
        return Some(Decimal::nearest(&size, power - 1));
    }
    // 9.96 becomes 1 of the next place rather than 10
    if one_digit.units == 10 { Some(Decimal { units: Integer::from(1), place: power + 1 }) } else { Some(one_digit) }
}

/// Writes a value and an uncertainty that end at the same decimal place.
pub(crate) fn concise_text(value: &Decimal, spread: &Decimal) -> String {
    let place = value.place;
    let top = value.leading_power().max(spread.leading_power()).unwrap_or(place);
    if top >= SMALLEST_PLAIN_POWER && place <= MOST_PADDING && top <= LARGEST_PLAIN_POWER {
        let bracket = if place > 0 { spread.plain() } else { spread.units.to_string() };
        return format!("{}({bracket})", value.plain());
    }
    let mantissa = Decimal { units: value.units.clone(), place: place - top };
    format!("{}({})e{top}", mantissa.plain(), spread.units)
}

/// An exact number: as a decimal where it is a short one, otherwise as a fraction.
fn exact_text(value: &Rational, shift: i64) -> String {
    if shift != 0 {
        return match leading_power(value) {
            Some(power) => Decimal::nearest(value, power - 17).scientific_from(shift),
            None => "0".to_string(),
        };
    }
    let mut denominator = value.denom().clone();
    let places = denominator.remove_factor_mut(&Integer::from(2)).max(denominator.remove_factor_mut(&Integer::from(5)));
    if denominator == 1 && places <= 40 {
        Decimal::nearest(value, -i64::from(places)).plain()
    } else {
        value.to_string()
    }
}

impl Decimal {
    /// This number times 10^shift, with a power of ten.
    fn scientific_from(self, shift: i64) -> String {
        let power = self.leading_power().unwrap_or(0) + shift;
        Decimal { place: self.place + shift, ..self }.scientific(power)
    }
}

/// Reads a value and its uncertainty, both spelt as decimals: `1.50`, `0.25`.
///
/// Errors: as [`super::decimal::parse_decimal`]; a negative uncertainty is not a number of its kind.
pub fn parse_measured(value: &str, uncertainty: &str) -> Result<Measured, DecimalError> {
    let spread = Decimal::parse(uncertainty)?.to_rational();
    if spread.cmp0() == Ordering::Less {
        return Err(DecimalError::NotANumber { text: uncertainty.chars().take(40).collect() });
    }
    Ok(Measured { value: Decimal::parse(value)?.to_rational(), uncertainty: spread })
}

/// Reads the concise form, `725(3)`, `1.50(25)`, `1.5(2)e-12`, or `725 +- 3`.
///
/// The digits in the bracket count in units of the value's last place; a bracket with a decimal point, `0.2(1.5)`, is taken as it stands.
///
/// Errors: as [`super::decimal::parse_decimal`].
pub fn parse_uncertain(text: &str) -> Result<Measured, DecimalError> {
    let refuse = || DecimalError::NotANumber { text: text.chars().take(40).collect() };
    if let Some((value, uncertainty)) = text.split_once("+-").or_else(|| text.split_once('±')) {
        return parse_measured(value.trim(), uncertainty.trim());
    }
    let (value, rest) = text.split_once('(').ok_or_else(refuse)?;
    let (bracket, exponent) = rest.split_once(')').ok_or_else(refuse)?;
    let plain_value = Decimal::parse(value)?;
    let spread = Decimal::parse(bracket)?;
    if value.contains(['e', 'E']) || bracket.contains(['e', 'E', '-', '+']) {
        return Err(refuse());
    }
    let scale = match exponent {
        "" => Rational::from(1),
        _ if exponent.starts_with(['e', 'E']) => Decimal::parse(&format!("1{exponent}"))?.to_rational(),
        _ => return Err(refuse()),
    };
    let last_place = if bracket.contains('.') { Rational::from(1) } else { power_of_ten(plain_value.place) };
    Ok(Measured { value: plain_value.to_rational() * &scale, uncertainty: spread.to_rational() * last_place * scale })
}

/// The standard uncertainty of a quantity from the changes that one standard uncertainty of each source makes to it.
///
/// Changes that name the same source are fully correlated and added before they are squared; different sources are independent.
///
/// Source: JCGM 100:2008, eqs. (10) and (16).
pub fn combine<Source: Ord>(changes: &[(Source, Float)]) -> Float {
    let bits = changes.iter().map(|(_, change)| change.prec()).max().unwrap_or(64);
    let mut totals: BTreeMap<&Source, Float> = BTreeMap::new();
    for (source, change) in changes {
        *totals.entry(source).or_insert_with(|| Float::new(bits)) += change;
    }
    let mut length = Float::new(bits);
    for total in totals.values() {
        length.hypot_mut(total);
    }
    length
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::num::decimal::parse_decimal;

    fn written(value: &str, uncertainty: &str) -> String {
        concise(&parse_decimal(value).expect(value), &parse_decimal(uncertainty).expect(uncertainty))
    }

    #[test]
    fn concise_forms() {
        for (value, uncertainty, text) in [
            ("725736252", "9", "725736252(9)"),
            ("725736252.4", "9.2", "725736252(9)"),
            ("1.5", "0.25", "1.50(25)"),
            ("1.5e-12", "0.2e-12", "1.5(2)e-12"),
            ("0.2", "1.5", "0.2(15)"),
            ("725736700", "260", "725736700(260)"),
            ("725736704", "264", "725736700(260)"),
            ("0.04", "3", "0(3)"),
            ("-0.04", "0.13", "-0.04(13)"),
            ("12.345", "0.0996", "12.3(1)"),
            ("1.5e30", "2e28", "1.50(2)e30"),
            ("7000", "3000", "7(3)e3"),
            ("0", "1e-9", "0(1)e-9"),
            ("0.000123", "0.000004", "0.000123(4)"),
            ("2.5", "0", "2.5"),
        ] {
            assert_eq!(written(value, uncertainty), text);
        }
        assert_eq!(concise(&Rational::from((1, 3)), &Rational::new()), "1/3");
    }

    #[test]
    fn concise_forms_are_read() {
        for (text, value, uncertainty) in [
            ("725(3)", "725", "3"),
            ("1.50(25)", "1.5", "0.25"),
            ("1.5(2)e-12", "1.5e-12", "2e-13"),
            ("0.2(1.5)", "0.2", "1.5"),
            ("0.2(15)", "0.2", "1.5"),
            ("725736700(260)", "725736700", "260"),
            ("-0.04(13)", "-0.04", "0.13"),
            ("725 +- 3", "725", "3"),
            ("1.5e-3 ± 2e-4", "1.5e-3", "2e-4"),
        ] {
            let expected = parse_measured(value, uncertainty).expect(text);
            assert_eq!(parse_uncertain(text), Ok(expected), "{text}");
        }
        for text in
            ["725", "725(3", "725()", "(3)", "1.5(2)x", "1.5(2)e", "1e3(2)", "1(-2)", "1 +- -2", "1(2)(3)", "1(2e5)"]
        {
            assert!(matches!(parse_uncertain(text), Err(DecimalError::NotANumber { .. })), "{text}");
        }
    }

    #[test]
    fn floats_of_any_size() {
        let value = Float::with_val(128, Float::parse("1.23441e-200000000").expect("float"));
        let spread = Float::with_val(64, Float::parse("6e-200000003").expect("float"));
        assert_eq!(concise_float(&value, &spread), "1.234(6)e-200000000");
        assert_eq!(concise_float(&Float::with_val(64, 1.5), &Float::with_val(32, 0.25)), "1.50(25)");
        assert_eq!(concise_float(&Float::with_val(64, 0), &Float::with_val(32, 0.25)), "0.00(25)");
        assert_eq!(concise_float(&Float::with_val(64, 3), &Float::new(32)), "3");
        assert_eq!(concise_float(&Float::with_val(64, 3), &spread), "3");
    }

    #[test]
    fn the_same_source_counts_once() {
        let change = |x: f64| Float::with_val(64, x);
        // fully correlated and opposite: nothing is left
        assert_eq!(combine(&[("a", change(3.0)), ("a", change(-3.0))]), 0);
        // independent: 3, 4 -> 5; correlated: 3 + 4
        assert_eq!(combine(&[("a", change(3.0)), ("b", change(4.0))]), 5);
        assert_eq!(combine(&[("a", change(3.0)), ("a", change(4.0))]), 7);
        assert_eq!(combine::<&str>(&[]), 0);
    }
}
