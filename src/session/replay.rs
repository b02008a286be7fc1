//! Recomputes a session and compares with its record.

use super::notebook::Session;
use super::outcome::{Outcome, Report};
use super::scope::Scope;
use crate::lang::parser::parse_expression;
use crate::num::{Effort, decimal, parse_uncertain};
use crate::sums::{Environment, bits_for};
use crate::theory::Resolver;
use rug::{Float, Rational};

/// What became of one entry.
#[derive(Clone, PartialEq, Debug)]
pub struct ReplayEntry {
    pub number: usize,
    pub text: String,
    pub recorded: Vec<String>,
    pub recomputed: Vec<String>,
    pub verdict: ReplayVerdict,
    pub reports: Vec<Report>,
}

#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum ReplayVerdict {
    /// The record holds; with the digits that were compared, where it is approximate.
    Agrees {
        digits: Option<u32>,
    },
    Differs {
        digits_in_common: Option<u32>,
    },
    /// The entry has a result and the file records none.
    NotRecorded,
    /// A declaration or setting.
    NothingToCompare,
    Failed,
    Stopped,
}

/// What became of all of them.
#[derive(Clone, PartialEq, Debug, Default)]
pub struct ReplayReport {
    pub entries: Vec<ReplayEntry>,
    pub agree: usize,
    pub differ: usize,
    pub failed: usize,
    pub not_recorded: usize,
    pub stopped: bool,
}

impl Session {
    /// Evaluates everything and compares with the record.
    pub fn replay(&mut self, watch: &mut dyn FnMut(&ReplayEntry)) -> ReplayReport {
        let mut report = ReplayReport::default();
        self.evaluate(&mut |session, number| {
            let Some(view) = session.entry(number) else { return };
            let (recomputed, reports, failed) = match view.outcome {
                Some(Outcome::Result(answer)) => (answer.lines.clone(), Vec::new(), None),
                Some(Outcome::Failed(reports)) => {
                    // An expectation that is not met is a disagreement; it was evaluated.
                    let unmet = !reports.is_empty() && reports.iter().all(|report| report.unmet);
                    let verdict =
                        if unmet { ReplayVerdict::Differs { digits_in_common: None } } else { ReplayVerdict::Failed };
                    let told =
                        reports.iter().filter(|report| report.unmet).map(|report| report.diagnostic.message.clone());
                    (told.collect(), reports.clone(), Some(verdict))
                }
                Some(Outcome::Stopped) | None => (Vec::new(), Vec::new(), Some(ReplayVerdict::Stopped)),
                Some(Outcome::Declared { .. }) => (Vec::new(), Vec::new(), None),
            };
            let verdict = failed.unwrap_or_else(|| compared(&view.recorded, &recomputed));
            match verdict {
                ReplayVerdict::Agrees { .. } => report.agree += 1,
                ReplayVerdict::Differs { .. } => report.differ += 1,
                ReplayVerdict::NotRecorded => report.not_recorded += 1,
                ReplayVerdict::Failed => report.failed += 1,
                ReplayVerdict::Stopped => report.stopped = true,
                ReplayVerdict::NothingToCompare => {}
            }
            let entry = ReplayEntry {
                number,
                text: view.text.to_string(),
                recorded: view.recorded.iter().map(|line| (*line).to_string()).collect(),
                recomputed,
                verdict,
                reports,
            };
            watch(&entry);
            report.entries.push(entry);
        });
        report
    }
}

fn compared(recorded: &[&str], recomputed: &[String]) -> ReplayVerdict {
    match (recorded.is_empty(), recomputed.is_empty()) {
        (true, true) => return ReplayVerdict::NothingToCompare,
        (true, false) => return ReplayVerdict::NotRecorded,
        _ => {}
    }
    if recorded.len() != recomputed.len() {
        return ReplayVerdict::Differs { digits_in_common: None };
    }
    let mut digits: Option<u32> = None;
    for (old, new) in recorded.iter().zip(recomputed) {
        match compared_line(old, new) {
            Ok(Some(held)) => digits = Some(digits.map_or(held, |least| least.min(held))),
            Ok(None) => {}
            Err(common) => return ReplayVerdict::Differs { digits_in_common: common },
        }
    }
    ReplayVerdict::Agrees { digits }
}

/// Compares one record line against exactly what it claims: an exact value to the letter, an approximate one to its own last digit, which may be
/// off by one, as may that of an uncertainty.
fn compared_line(old: &str, new: &str) -> Result<Option<u32>, Option<u32>> {
    let (old, new) = (normal(old), normal(new));
    let both = (old.strip_prefix("~ ").and_then(number), new.strip_prefix("~ ").and_then(number));
    let (Some(a), Some(b)) = both else {
        return if old == new { Ok(None) } else { Err(digits_of_different_forms(&old, &new)) };
    };
    if a.unit != b.unit {
        return Err(digits_of_different_forms(&old, &new).or(Some(0)));
    }
    let (a, b) = (a.parts, b.parts);
    if a.len() != b.len() || a.iter().zip(&b).any(|(x, y)| x.imaginary != y.imaginary) {
        return Err(Some(0));
    }
    let mut held = u32::MAX;
    for (x, y) in a.iter().zip(&b) {
        // A record of fewer digits is checked to those.
        let place = x.place.clone().max(y.place.clone());
        let distance = Rational::from(&x.value - &y.value).abs();
        let common = common_digits(&x.value, &distance);
        let spreads_agree = match (&x.spread, &y.spread) {
            (None, None) => true,
            (Some(p), Some(q)) => x.place == y.place && Rational::from(p - q).abs() <= place,
            _ => false,
        };
        // A record of more digits than are computed claims more than was checked.
        if distance > place || x.place < y.place || !spreads_agree {
            return Err(Some(common));
        }
        held = held.min(x.digits.min(y.digits));
    }
    Ok(Some(held))
}

/// Digits two real values have in common when they are not written in the same form or unit; `None` where a record is not one number.
fn digits_of_different_forms(old: &str, new: &str) -> Option<u32> {
    let (old, new) = (real_value(old)?, real_value(new)?);
    Some(common_digits(&old, &Rational::from(&old - &new).abs()))
}

/// The number a record line states, in atomic units, to more digits than are compared.
fn real_value(line: &str) -> Option<Rational> {
    const BITS: u32 = 512;
    let text = line.strip_prefix("= ").or_else(|| line.strip_prefix("~ "))?;
    let expression = parse_expression(text).ok()?;
    let scope = Scope::new();
    let term = Resolver::new(&scope.names, text, 0).scalar(&expression).ok()?;
    let value = scope.evaluator(&Effort::new()).scalar(&term, &Environment::default(), BITS).ok()?;
    let ball = value.to_ball(BITS).ok().filter(|ball| ball.is_real())?;
    ball.re.mid().to_rational()
}

/// The record with its blanks made single.
fn normal(line: &str) -> String {
    line.split_whitespace().collect::<Vec<_>>().join(" ")
}

/// The number of a record with the unit behind it.
struct Recorded {
    parts: Vec<Part>,
    unit: String,
}

/// A decimal of a record: its value, its uncertainty where it has one, one unit of its last digit, its number of significant digits, and whether
/// an `i` stands behind it.
struct Part {
    value: Rational,
    spread: Option<Rational>,
    place: Rational,
    digits: u32,
    imaginary: bool,
}

/// The number at the front of `1.23(4) MHz`, `(1.23 + 4.56 i) eV`; `None` for anything else.
fn number(text: &str) -> Option<Recorded> {
    if let Some((number, unit)) = text.strip_prefix('(').and_then(|rest| rest.split_once(')')) {
        return Some(Recorded { parts: parts(number)?, unit: unit.trim().into() });
    }
    let is_number = |word: &str| {
        matches!(word, "+" | "-" | "i") || word.trim_start_matches('-').starts_with(|c: char| c.is_ascii_digit())
    };
    let words: Vec<&str> = text.split(' ').collect();
    let count = words.iter().take_while(|word| is_number(word)).count();
    let unit = words[count..].join(" ");
    if unit.starts_with("below ") {
        return None;
    }
    Some(Recorded { parts: parts(&words[..count].join(" "))?, unit })
}

/// The parts of `1.23 + 4.56 i`; `None` for anything that is not made of decimals.
fn parts(text: &str) -> Option<Vec<Part>> {
    let mut parts: Vec<Part> = Vec::new();
    let mut sign = 1;
    for word in text.split(' ') {
        match word {
            "+" => sign = 1,
            "-" => sign = -1,
            "i" => parts.last_mut()?.imaginary = true,
            number => {
                let negative = number.starts_with('-') != (sign < 0);
                let part = part(number.strip_prefix('-').unwrap_or(number))?;
                parts.push(if negative { Part { value: -part.value, ..part } } else { part });
            }
        }
    }
    Some(parts)
}

/// One decimal without a sign: `4.784`, `1.5(2)e-3`.
fn part(number: &str) -> Option<Part> {
    let (mantissa, exponent) = number.split_once('e').unwrap_or((number, "0"));
    let bare = mantissa.split('(').next()?;
    let decimals = bare.split_once('.').map_or(0, |(_, fraction)| fraction.len());
    let exponent = exponent.parse::<i64>().ok()? - i64::try_from(decimals).ok()?;
    let place = decimal::parse_decimal(&format!("1e{exponent}")).ok()?;
    let digits = bare.chars().filter(char::is_ascii_digit).skip_while(|c| *c == '0').count();
    let (value, spread) = if mantissa.contains('(') {
        let measured = parse_uncertain(number).ok()?;
        (measured.value, Some(measured.uncertainty))
    } else {
        (decimal::parse_decimal(number).ok()?, None)
    };
    Some(Part { value, spread, place, digits: u32::try_from(digits).ok()?, imaginary: false })
}

/// Digits in which two numbers a relative distance apart agree.
fn common_digits(value: &Rational, distance: &Rational) -> u32 {
    if *distance == 0 || *value == 0 {
        return 0;
    }
    let ratio = Float::with_val(64, Rational::from(distance / value)).abs();
    let digits = -ratio.log10().to_f64();
    if digits > 0.0 { digits.min(f64::from(bits_for(100_000))) as u32 } else { 0 }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn verdict(old: &str, new: &str) -> ReplayVerdict {
        compared(&[old], &[new.to_string()])
    }

    #[test]
    fn a_record_is_compared_to_its_own_last_digit() {
        assert_eq!(verdict("~ 4.784", "~ 4.784300343"), ReplayVerdict::Agrees { digits: Some(4) });
        assert_eq!(verdict("~ 4.785", "~ 4.784300343"), ReplayVerdict::Agrees { digits: Some(4) });
        assert_eq!(verdict("~ 4.786", "~ 4.784300343"), ReplayVerdict::Differs { digits_in_common: Some(3) });
        assert_eq!(verdict("~ 1.5 - 2.5 i", "~ 1.5 + 2.5 i"), ReplayVerdict::Differs { digits_in_common: Some(0) });
    }

    #[test]
    fn a_record_of_more_digits_than_are_computed_is_not_confirmed() {
        assert_eq!(verdict("~ 2.718281828999", "~ 2.71828183"), ReplayVerdict::Differs { digits_in_common: Some(9) });
    }

    #[test]
    fn units_and_uncertainties_are_compared() {
        assert_eq!(verdict("~ 725736252(9) MHz", "~ 725736253(9) MHz"), ReplayVerdict::Agrees { digits: Some(9) });
        assert_eq!(
            verdict("~ 725736252(9) MHz", "~ 725736312(9) MHz"),
            ReplayVerdict::Differs { digits_in_common: Some(7) }
        );
        assert_eq!(
            verdict("~ 725736252(9) MHz", "~ 725736252(14) MHz"),
            ReplayVerdict::Differs { digits_in_common: Some(0) }
        );
        assert_eq!(verdict("~ 0.5 GHz", "~ 500.1 MHz"), ReplayVerdict::Differs { digits_in_common: Some(3) });
        assert_eq!(verdict("= 3 GHz", "~ 2999.9(2) MHz"), ReplayVerdict::Differs { digits_in_common: Some(4) });
        assert_eq!(verdict("~ (1.5 + 2.5 i) eV", "~ (1.5 + 2.5 i) eV"), ReplayVerdict::Agrees { digits: Some(2) });
        assert_eq!(
            verdict("~ 0 below 1e-40 MHz, not proved", "~ 0 below 1e-40 MHz, not proved"),
            ReplayVerdict::Agrees { digits: None }
        );
        assert_eq!(verdict("~ 4.5 a0^3", "~ 4.5 cm^3"), ReplayVerdict::Differs { digits_in_common: Some(0) });
    }

    #[test]
    fn exact_records_agree_to_the_letter() {
        assert_eq!(verdict("= 9/2", "= 9/2"), ReplayVerdict::Agrees { digits: None });
        assert_eq!(verdict("= 1/3", "~ 0.3334"), ReplayVerdict::Differs { digits_in_common: Some(3) });
        assert_eq!(verdict("~ 3.14159", "= pi"), ReplayVerdict::Differs { digits_in_common: Some(6) });
        assert_eq!(verdict("= 9/2", "= holds"), ReplayVerdict::Differs { digits_in_common: None });
        assert_eq!(
            verdict("~ 0 below 1e-40, not proved", "~ 0 below 1e-40, not proved"),
            ReplayVerdict::Agrees { digits: None }
        );
    }
}
