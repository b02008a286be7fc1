//! Numbers as they stand in a level table: `12985.185724(3)`, `4.106 +- 0.004`, `1/2`.

use super::fault::Defect;
use super::labels::shown;
use super::table::Datum;
use crate::angular::HalfInteger;
use crate::num::decimal::{DecimalError, parse_decimal};
use crate::num::uncertain::parse_uncertain;
use rug::Rational;

/// Longest numerator or denominator of a number of a table, in bits: far beyond any measurement, and short enough to compute with.
const LONGEST_NUMBER: u32 = 4096;

/// Largest J of a table.
pub const LARGEST_TWICE_J: i32 = 200;

/// A number with or without an uncertainty.
pub fn datum(text: &str) -> Result<Datum, Defect> {
    let plain = text.replace('\u{2212}', "-");
    let not_a_number = || Defect::Number { text: shown(text) };
    let bare = plain.trim_start_matches(['+', '-']).to_ascii_lowercase();
    if ["nan", "inf", "infinity"].contains(&bare.as_str()) {
        return Err(Defect::NotFinite { text: shown(text) });
    }
    let spread = plain.split_once("+-").or_else(|| plain.split_once('±')).or_else(|| plain.split_once('('));
    if spread.is_some_and(|(_, sigma)| sigma.trim_start().starts_with('-')) {
        return Err(Defect::NegativeUncertainty { text: shown(text) });
    }
    let read = match spread {
        Some(_) => parse_uncertain(&plain).map(|read| Datum { value: read.value, sigma: read.uncertainty }),
        None => parse_decimal(&plain).map(|value| Datum { value, sigma: Rational::new() }),
    };
    let read = read.map_err(|error| match error {
        DecimalError::NotANumber { .. } => not_a_number(),
        DecimalError::TooManyDigits { .. } | DecimalError::ExponentTooLarge { .. } => Defect::LongNumber,
    })?;
    let long =
        |number: &Rational| number.numer().significant_bits().max(number.denom().significant_bits()) > LONGEST_NUMBER;
    if long(&read.value) || long(&read.sigma) { Err(Defect::LongNumber) } else { Ok(read) }
}

/// Twice a J: `3/2`, `2`, `1.5`.
pub fn twice_momentum(text: &str) -> Result<i32, Defect> {
    let wrong = || Defect::Momentum { text: shown(text) };
    let value = match text.split_once('/') {
        Some((above, below)) if below.trim() == "2" => parse_decimal(above.trim()).map_err(|_| wrong())? / 2,
        Some(_) => return Err(wrong()),
        None => parse_decimal(text).map_err(|_| wrong())?,
    };
    match HalfInteger::from_rational(&value) {
        Ok(j) if (0..=LARGEST_TWICE_J).contains(&j.twice()) => Ok(j.twice()),
        _ => Err(wrong()),
    }
}

/// The rank of an operator.
pub fn rank(text: &str) -> Result<u32, Defect> {
    let wrong = || Defect::RankNumber { text: shown(text) };
    let plain = !text.is_empty() && text.bytes().all(|b| b.is_ascii_digit());
    text.parse().ok().filter(|rank| plain && *rank <= crate::angular::tensor::LARGEST_RANK).ok_or_else(wrong)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_with_and_without_uncertainty() {
        let read = datum("12985.185724(3)").expect("a number");
        assert_eq!(read.sigma, Rational::from((3, 1_000_000)));
        assert_eq!(datum("\u{2212}1.5e-3 ± 2e-4").expect("a number").value, Rational::from((-3, 2000)));
        assert_eq!(datum("-NaN"), Err(Defect::NotFinite { text: "-NaN".into() }));
        assert_eq!(datum("5(-2)"), Err(Defect::NegativeUncertainty { text: "5(-2)".into() }));
        assert_eq!(datum("5 +- -2"), Err(Defect::NegativeUncertainty { text: "5 +- -2".into() }));
        assert_eq!(datum("1e5000"), Err(Defect::LongNumber));
        assert_eq!(datum("1,5"), Err(Defect::Number { text: "1,5".into() }));
    }

    #[test]
    fn momenta() {
        assert_eq!(twice_momentum("3/2"), Ok(3));
        assert_eq!(twice_momentum("1.5"), Ok(3));
        assert_eq!(twice_momentum("2"), Ok(4));
        for text in ["1/3", "-1/2", "0.3", "x", "1e9", "101"] {
            assert!(twice_momentum(text).is_err(), "{text}");
        }
    }
}
