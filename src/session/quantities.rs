//! Results with units: in which unit a result is told, and what is said of the constants behind it.

use super::evaluate::{Done, Evaluation, Wrong};
use super::outcome::Answer;
use super::scope::Effect;
use crate::lang::tree::{Expr, Name};
use crate::num::units::{ConstantSet, Unit};
use crate::num::{Scalar, uncertain};
use crate::sums::{Value, Wanted, bits_for};
use crate::theory::Fault;
use crate::theory::dimensions::{Known, known};
use crate::theory::terms::{ScalarNode, ScalarTerm, Source};
use rug::Rational;

/// Longest exact decimal that is written in a unit, and longest exact number of another form; in atomic units exact numbers are never rounded.
const LONGEST_DECIMAL: usize = 20;
const LONGEST_FRACTION: usize = 12;

impl Evaluation<'_> {
    /// `constants CODATA-2022`
    pub(super) fn constants(&self, name: &Name) -> Result<Done, Wrong> {
        match ConstantSet::named(&name.text) {
            Some(set) => Ok(Done::Declared(Effect::Constants(set), Vec::new())),
            None => {
                let known: Vec<String> =
                    ConstantSet::ALL.iter().map(|set| format!("`constants {}`", set.name())).collect();
                self.fault(
                    name.span,
                    Fault::Other {
                        message: format!("`{}` is not a set of constants", name.text),
                        help: format!("write {}", known.join(" or ")),
                    },
                )
            }
        }
    }

    /// `EXPR` and `EXPR in UNIT`.
    pub(super) fn evaluate(&self, expression: &Expr, unit: Option<&Expr>) -> Result<Done, Wrong> {
        let term = self.resolver().scalar(expression)?;
        let (term, unit) = match unit {
            Some(asked) => {
                let unit = self.resolver().unit(asked)?;
                (self.resolver().in_unit(&term, &unit, asked.span)?, Some(unit))
            }
            None => self.in_unit_to_show(term)?,
        };
        let value = self.value(&term)?;
        let mut answer = match &unit {
            Some(unit) if !unit.is_atomic() || has_other_units(&term) => self.in_decimals_of(&value),
            Some(_) => self.answer(&value),
            None => self.answer(&value),
        };
        if let Some(unit) = unit {
            tell_unit(&mut answer, unit.text());
        }
        answer.notes.extend(value.couplings.iter().cloned());
        answer.remarks.extend(self.constants_behind(&value));
        Ok(Done::Answered(answer))
    }

    /// A term of definite dimension in the unit it is shown in.
    fn in_unit_to_show(&self, term: ScalarTerm) -> Result<(ScalarTerm, Option<Unit>), Wrong> {
        let Known::Definite(dimension) = known(&term) else { return Ok((term, None)) };
        let unit = self.resolver().unit_to_show(&[&term], &dimension);
        Ok((self.resolver().in_unit(&term, &unit, term.place.span)?, Some(unit)))
    }

    /// Both sides of a comparison as numbers of one unit, where units are in play.
    pub(super) fn sides(&self, left: &Expr, right: &Expr) -> Result<(ScalarTerm, ScalarTerm, Option<Unit>), Wrong> {
        let (a, b) = (self.resolver().scalar(left)?, self.resolver().scalar(right)?);
        let Known::Definite(dimension) = self.resolver().check_compared(&a, &b)? else { return Ok((a, b, None)) };
        let unit = self.resolver().unit_to_show(&[&b, &a], &dimension);
        let one = self.resolver().unit_term(&unit, left.span);
        Ok((over(&a, &one), over(&b, &one), Some(unit)))
    }

    /// The answer in a unit that is no atomic unit: an exact decimal where there is a short one, a long fraction rounded.
    fn in_decimals_of(&self, value: &Value) -> Answer {
        let exact = match &value.scalar {
            Scalar::Exact(exact) if self.scope.wanted != Wanted::Exact && value.sources.is_empty() => exact.to_string(),
            _ => return self.answer(value),
        };
        if let Some(decimal) = short_decimal(&value.scalar) {
            let mut answer = self.answer(value);
            if answer.value.as_ref() == Some(&exact) {
                answer.lines.iter_mut().for_each(|line| *line = line.replace(&exact, &decimal));
                answer.value = Some(decimal);
            }
            return answer;
        }
        match value.scalar.to_ball(bits_for(self.digits_wanted()) + 64) {
            Ok(ball) if exact.len() > LONGEST_FRACTION => {
                self.answer(&Value { scalar: Scalar::Approx(ball), ..value.clone() })
            }
            _ => self.answer(value),
        }
    }

    /// The constants an uncertainty comes from, where it comes from nothing else.
    fn constants_behind(&self, value: &Value) -> Option<String> {
        let constants: Option<Vec<&str>> = value
            .sources
            .iter()
            .map(|(source, _)| match source {
                Source::Constant(name) => Some(*name),
                _ => None,
            })
            .collect();
        let constants = constants.filter(|list| !list.is_empty())?;
        Some(format!("the uncertainty is that of the constants: {}", constants.join(", ")))
    }
}

/// Whether units stand in a term that are no atomic units.
fn has_other_units(term: &ScalarTerm) -> bool {
    let mut found = false;
    crate::theory::visit::scalars(term, &mut |inner| {
        found |= matches!(&*inner.node, ScalarNode::Quantity { unit: Some(unit), .. } if !unit.is_atomic());
    });
    found
}

/// A rational as an exact decimal of few digits, where it is one: `29.9792458`, `1.602176634e-19`.
fn short_decimal(scalar: &Scalar) -> Option<String> {
    let text = uncertain::concise(&scalar.as_rational()?, &Rational::new());
    if text.contains('/') {
        return None;
    }
    if text.len() <= LONGEST_DECIMAL {
        return Some(text);
    }
    let (sign, size) = text.strip_prefix('-').map_or(("", text.as_str()), |size| ("-", size));
    let whole = size.find('.').unwrap_or(size.len());
    let all: String = size.chars().filter(char::is_ascii_digit).collect();
    let leading = all.find(|digit| digit != '0')?;
    let digits = all[leading..].trim_end_matches('0');
    if digits.len() > LONGEST_DECIMAL {
        return None;
    }
    let power = i64::try_from(whole).ok()? - i64::try_from(leading).ok()? - 1;
    let (first, rest) = digits.split_at(1);
    let point = if rest.is_empty() { "" } else { "." };
    Some(format!("{sign}{first}{point}{rest}e{power}"))
}

/// A number with its sign of exactness, as an exact decimal where it is a short one.
pub(super) fn marked_decimal(scalar: &Scalar, digits: u32) -> String {
    match short_decimal(scalar) {
        Some(decimal) => format!("= {decimal}"),
        None => super::compare::marked(scalar, digits),
    }
}

/// A term over a unit.
fn over(term: &ScalarTerm, unit: &ScalarTerm) -> ScalarTerm {
    use crate::theory::terms::{ScalarNode, Term};
    let text = format!("({})/({})", term.text, unit.text);
    Term::new(ScalarNode::Quotient(term.clone(), unit.clone()), term.place, text)
}

/// Writes the unit behind a value.
fn tell_unit(answer: &mut Answer, unit: &str) {
    if unit.is_empty() {
        return;
    }
    answer.unit = Some(unit.to_string());
    if let Some(line) = answer.lines.first_mut() {
        *line = with_unit(line, unit);
    }
    if let Some(decimal) = &mut answer.decimal {
        *decimal = format!("{decimal} {unit}");
    }
}

/// A record line with a unit behind its number: `= 9/2`, `~ 725(9)`, `~ 0 below 1e-40, not proved`. A proved zero is one in any unit.
pub(super) fn with_unit(line: &str, unit: &str) -> String {
    let Some((sign, number)) = line.split_once(' ') else { return line.to_string() };
    if let Some(zero) = number.strip_suffix(", not proved") {
        return format!("{sign} {zero} {unit}, not proved");
    }
    if number.contains(':') {
        return line.to_string();
    }
    if number.contains([' ', '*']) {
        return format!("{sign} ({number}) {unit}");
    }
    format!("{sign} {number} {unit}")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn exact_decimals_are_short() {
        for (value, text) in [
            ("29.9792458", Some("29.9792458")),
            ("1.602176634e-19", Some("1.602176634e-19")),
            ("1e400", Some("1e400")),
            ("0.1234567890123456789012345", None),
        ] {
            let value = Scalar::from(crate::num::parse_decimal(value).expect(value));
            assert_eq!(short_decimal(&value).as_deref(), text);
            assert_eq!(short_decimal(&value.neg()), text.map(|text| format!("-{text}")));
        }
        assert_eq!(short_decimal(&Scalar::from(Rational::from((1, 3)))), None);
    }

    #[test]
    fn units_stand_behind_numbers() {
        assert_eq!(with_unit("= 9/2", "hartree"), "= 9/2 hartree");
        assert_eq!(with_unit("~ 725736252(9)", "MHz"), "~ 725736252(9) MHz");
        assert_eq!(with_unit("~ 1.5 + 2.5 i", "eV"), "~ (1.5 + 2.5 i) eV");
        assert_eq!(with_unit("~ 0 below 1e-40, not proved", "MHz"), "~ 0 below 1e-40 MHz, not proved");
        assert_eq!(with_unit("= 0 exactly: D changes l by one", "MHz"), "= 0 exactly: D changes l by one");
    }
}
