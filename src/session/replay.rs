//! Recomputes a session and compares with its record.

use super::notebook::Session;
use super::outcome::{Outcome, Report};
use super::scope::Scope;
use crate::lang::parser::parse_expression;
use crate::num::{Effort, decimal};
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
/// off by one.
fn compared_line(old: &str, new: &str) -> Result<Option<u32>, Option<u32>> {
    let (old, new) = (normal(old), normal(new));
    let both = (old.strip_prefix("~ ").and_then(parts), new.strip_prefix("~ ").and_then(parts));
    let (Some(a), Some(b)) = both else {
        return if old == new { Ok(None) } else { Err(digits_of_different_forms(&old, &new)) };
    };
    if a.len() != b.len() || a.iter().zip(&b).any(|(x, y)| x.unit != y.unit) {
        return Err(Some(0));
    }
    let mut held = u32::MAX;
    for (x, y) in a.iter().zip(&b) {
        // A record of fewer digits is checked to those.
        let place = x.place.clone().max(y.place.clone());
        let distance = Rational::from(&x.value - &y.value).abs();
        let common = common_digits(&x.value, &distance);
        // A record of more digits than are computed claims more than was checked.
        if distance > place || x.place < y.place {
            return Err(Some(common));
        }
        held = held.min(x.digits.min(y.digits));
    }
    Ok(Some(held))
}

/// Digits two real values have in common when at least one of them is exact; `None` where a record is not one number.
fn digits_of_different_forms(old: &str, new: &str) -> Option<u32> {
    let (old, new) = (real_value(old)?, real_value(new)?);
    Some(common_digits(&old, &Rational::from(&old - &new).abs()))
}

/// The number a record line states, to more digits than are compared.
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

/// A decimal of a record: its value, one unit of its last digit, its number of significant digits, and the word behind it (`i`).
struct Part {
    value: Rational,
    place: Rational,
    digits: u32,
    unit: String,
}

/// The parts of `1.23 + 4.56 i`; `None` for anything that is not made of decimals.
fn parts(text: &str) -> Option<Vec<Part>> {
    let mut parts: Vec<Part> = Vec::new();
    let mut sign = 1;
    for word in text.split(' ') {
        match word {
            "+" => sign = 1,
            "-" => sign = -1,
            "i" => parts.last_mut()?.unit = "i".into(),
            number => {
                let value = decimal::parse_decimal(number.strip_prefix('-').unwrap_or(number)).ok()?;
                let negative = number.starts_with('-') != (sign < 0);
                let (mantissa, exponent) = number.split_once('e').unwrap_or((number, "0"));
                let decimals = mantissa.split_once('.').map_or(0, |(_, fraction)| fraction.len());
                let exponent = exponent.parse::<i64>().ok()? - i64::try_from(decimals).ok()?;
                let place = decimal::parse_decimal(&format!("1e{exponent}")).ok()?;
                let digits = mantissa.chars().filter(char::is_ascii_digit).skip_while(|c| *c == '0').count();
                parts.push(Part {
                    value: if negative { -value } else { value },
                    place,
                    digits: u32::try_from(digits).ok()?,
                    unit: String::new(),
                });
            }
        }
    }
    Some(parts)
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
