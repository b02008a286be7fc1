//! What is known of the dimension of a number, and what may be added, compared and put into functions.
//!
//! Numbers are numbers of atomic units. Of a number with a unit the dimension is definite; of a bracket it is whatever the bracket is, which is
//! not looked into. Only what is definite is ever refused.

use super::problem::Fault;
use super::resolve::{Resolved, Resolver};
use super::terms::*;
use crate::lang::tree::Span;
use crate::num::units::{ConstantSet, Dimension};
use rug::Rational;

/// What is known of the dimension of a number.
#[derive(Clone, PartialEq, Eq, PartialOrd, Ord, Debug, Default)]
pub enum Known {
    /// Made of plain numbers alone, as `2 pi`.
    Number,
    /// A number of atomic units of something: a bracket, a variable, a product with one.
    #[default]
    Free,
    /// A number of atomic units of a known quantity, beside which plain numbers may stand: `E(g) + 0.1`.
    Atomic(Dimension),
    /// It comes from units.
    Definite(Dimension),
}

impl Known {
    /// Definite, but for ratios, which are plain numbers.
    pub fn definite(dimension: Dimension) -> Self {
        if dimension.is_none() { Known::Number } else { Known::Definite(dimension) }
    }

    /// Of a product.
    pub fn times(&self, other: &Self) -> Self {
        match (self, other) {
            (Known::Number, known) | (known, Known::Number) => known.clone(),
            (Known::Definite(a), Known::Definite(b)) => Known::definite(a.times(b)),
            _ => Known::Free,
        }
    }

    pub fn inverse(&self) -> Self {
        match self {
            Known::Number => Known::Number,
            Known::Definite(dimension) => Known::Definite(dimension.inverse()),
            Known::Free | Known::Atomic(_) => Known::Free,
        }
    }

    /// Of a power with this exponent, where it is written as a number.
    pub(super) fn power(&self, exponent: Option<&Rational>) -> Self {
        match (self, exponent) {
            (Known::Number, _) => Known::Number,
            (Known::Definite(dimension), Some(exponent)) => Known::definite(dimension.power(exponent)),
            _ => Known::Free,
        }
    }

    /// Of a function of the number.
    pub(super) fn under(self, function: ScalarFunction) -> Self {
        match (function, self) {
            (_, Known::Number) => Known::Number,
            (ScalarFunction::Sqrt, Known::Definite(dimension)) => {
                Known::Definite(dimension.power(&Rational::from((1, 2))))
            }
            (ScalarFunction::Abs | ScalarFunction::Re | ScalarFunction::Im | ScalarFunction::Conj, same) => same,
            _ => Known::Free,
        }
    }

    /// The dimension a sum of the two has, or both where they exclude each other.
    pub(super) fn joined<'k>(&'k self, other: &'k Self) -> Result<Self, (&'k Self, &'k Self)> {
        match (self, other) {
            (Known::Definite(a), Known::Definite(b) | Known::Atomic(b)) | (Known::Atomic(b), Known::Definite(a)) => {
                if a == b { Ok(Known::Definite(a.clone())) } else { Err((self, other)) }
            }
            (Known::Definite(_), Known::Number) | (Known::Number, Known::Definite(_)) => Err((self, other)),
            (Known::Definite(a), Known::Free) | (Known::Free, Known::Definite(a)) => Ok(Known::Definite(a.clone())),
            (Known::Atomic(a), Known::Atomic(b)) if a == b => Ok(self.clone()),
            (Known::Atomic(a), Known::Number) | (Known::Number, Known::Atomic(a)) => Ok(Known::Atomic(a.clone())),
            (Known::Number, Known::Number) => Ok(Known::Number),
            _ => Ok(Known::Free),
        }
    }

    fn words(&self) -> String {
        match self {
            Known::Number | Known::Free => "a plain number".into(),
            Known::Atomic(dimension) | Known::Definite(dimension) => dimension.words(),
        }
    }

    fn dimension(&self) -> Option<&Dimension> {
        match self {
            Known::Number | Known::Free => None,
            Known::Atomic(dimension) | Known::Definite(dimension) => Some(dimension),
        }
    }
}

/// How to make the one of the other, where there is an accepted way.
fn way_between(a: &Known, b: &Known) -> String {
    let is = |known: &Known, dimension: Dimension| known.dimension() == Some(&dimension);
    let either = |dimension: Dimension| is(a, dimension.clone()) || is(b, dimension);
    if either(Dimension::energy()) && either(Dimension::length()) {
        return "a vacuum wavelength becomes a photon energy by `photon(413.09 nm)`, an energy a wavelength by `wavelength(E)`".into();
    }
    if either(Dimension::energy()) && either(Dimension::inverse_length()) {
        return "`1 cm^-1` is a wavenumber and stands for an energy; `1/cm` is an inverse length".into();
    }
    let inverse_time = Dimension::new([0, 0, -1, 0]);
    if either(Dimension::energy()) && either(inverse_time) {
        return "frequencies that stand for energies are written in Hz (h f) or in rad/s (hbar omega)".into();
    }
    if either(Dimension::new([0, 3, 0, 0])) && either(Dimension::new([-1, 0, 4, 2])) {
        return "a polarizability over `4 pi codata.epsilon_0` is a polarizability volume".into();
    }
    if *a == Known::Number || *b == Known::Number {
        let known = if *a == Known::Number { b } else { a };
        let unit = known.dimension().map(Dimension::atomic_unit).unwrap_or_default();
        return format!("give the plain number a unit; in atomic units: `0.1 {unit}`");
    }
    "quantities of the same kind are added and compared".into()
}

/// What is wrong with two numbers of different dimension.
pub(super) fn mismatch(first: &Known, second: &Known, action: &str) -> Fault {
    Fault::Other {
        message: format!("{} is {action} {}", second.words(), first.words()),
        help: way_between(first, second),
    }
}

/// What is known of the dimension of a term.
pub fn known(term: &ScalarTerm) -> Known {
    match &*term.node {
        ScalarNode::Exact(_) | ScalarNode::Measured { .. } | ScalarNode::Pi | ScalarNode::Wigner(..) => Known::Number,
        ScalarNode::Variable(_) | ScalarNode::Bracket(_) | ScalarNode::Vary(_) => Known::Free,
        ScalarNode::Quantity { known, .. } => known.clone(),
        ScalarNode::Energy(_) => Known::Atomic(Dimension::energy()),
        ScalarNode::Call(call) => call.definition.known.clone(),
        ScalarNode::Negated(inner) | ScalarNode::LevelPart(_, inner) => known(inner),
        ScalarNode::Sum(terms) => {
            // Whether they fit is checked where the sum is resolved.
            let mut sum: Option<Known> = None;
            for term in terms.iter().filter(|term| !is_zero(term)) {
                let next = known(term);
                sum = Some(match sum {
                    None => next,
                    Some(sum) => sum.joined(&next).unwrap_or(Known::Free),
                });
            }
            sum.unwrap_or(Known::Number)
        }
        ScalarNode::Product(factors) => {
            factors.iter().fold(Known::Number, |product, factor| product.times(&known(factor)))
        }
        ScalarNode::Quotient(a, b) => known(a).times(&known(b).inverse()),
        ScalarNode::Power(base, exponent) => match known(exponent) {
            Known::Number => known(base).power(exact_power(exponent).as_ref()),
            _ => Known::Free,
        },
        ScalarNode::Function(function, inner) => known(inner).under(*function),
        ScalarNode::Root { from, to, .. } => known(from).joined(&known(to)).unwrap_or(Known::Free).of_variable(),
        ScalarNode::Series { body, .. } => known(body),
    }
}

impl Known {
    /// What is known of a variable in a range: no plain number in particular.
    pub(super) fn of_variable(self) -> Self {
        match self {
            Known::Number => Known::Free,
            other => other,
        }
    }
}

/// The rational that a term is as it is written.
pub(super) fn exact_power(term: &ScalarTerm) -> Option<Rational> {
    match &*term.node {
        ScalarNode::Exact(value) => value.as_rational().map(|q| q.into_owned()),
        ScalarNode::Negated(inner) => exact_power(inner).map(|q| -q),
        ScalarNode::Product(factors) => {
            factors.iter().try_fold(Rational::from(1), |product, factor| Some(product * exact_power(factor)?))
        }
        ScalarNode::Quotient(a, b) => {
            let divisor = exact_power(b).filter(|q| *q != 0)?;
            Some(exact_power(a)? / divisor)
        }
        _ => None,
    }
}

/// A quantity with a unit where a plain number is needed.
pub(super) fn not_plain(dimension: &Dimension, place: &str) -> Fault {
    Fault::Other {
        message: format!("{} stands {place}, where a plain number is needed", dimension.words()),
        help: format!("divide it by a unit: `(…)/(1 {})`", dimension.atomic_unit()),
    }
}

/// Zero is zero in any unit.
pub(super) fn is_zero(term: &ScalarTerm) -> bool {
    matches!(&*term.node, ScalarNode::Exact(value) if value.is_zero())
}

impl Resolver<'_> {
    /// Refuses a sum of numbers of different definite dimensions.
    pub(super) fn check_sum(&self, terms: &[&ScalarTerm], with_hamiltonian: bool) -> Resolved<()> {
        let mut sum = with_hamiltonian.then(|| Known::Atomic(Dimension::energy()));
        for term in terms.iter().filter(|term| !is_zero(term)) {
            let next = known(term);
            sum = Some(match &sum {
                None => next,
                Some(sum) => match sum.joined(&next) {
                    Ok(joined) => joined,
                    Err((first, second)) => return self.fault(term.place.span, mismatch(first, second, "added to")),
                },
            });
        }
        Ok(())
    }

    /// Refuses two sides of a comparison of different definite dimensions; what is known of both together.
    pub fn check_compared(&self, left: &ScalarTerm, right: &ScalarTerm) -> Resolved<Known> {
        match known(left).joined(&known(right)) {
            _ if is_zero(right) => Ok(known(left)),
            _ if is_zero(left) => Ok(known(right)),
            Ok(joined) => Ok(joined),
            Err((first, second)) => self.fault(right.place.span, mismatch(first, second, "compared with")),
        }
    }

    /// The common dimension of the ends of a range.
    pub(super) fn check_range(&self, from: &ScalarTerm, to: &ScalarTerm) -> Resolved<Known> {
        match known(from).joined(&known(to)) {
            _ if is_zero(from) => Ok(known(to)),
            _ if is_zero(to) => Ok(known(from)),
            Ok(joined) => Ok(joined),
            Err((first, second)) => {
                self.fault(to.place.span, mismatch(first, second, "the end of a range that begins at"))
            }
        }
    }

    /// Refuses a quantity with a unit where a plain number is needed.
    pub(super) fn check_plain(&self, term: &ScalarTerm, place: &str) -> Resolved<()> {
        let Known::Definite(dimension) = known(term) else { return Ok(()) };
        self.fault(term.place.span, not_plain(&dimension, place))
    }

    /// Refuses quantities with units in functions of plain numbers, and in exponents.
    pub(super) fn check_function(&self, function: ScalarFunction, name: &str, argument: &ScalarTerm) -> Resolved<()> {
        match function {
            ScalarFunction::Exp | ScalarFunction::Ln | ScalarFunction::Sin | ScalarFunction::Cos => {
                self.check_plain(argument, &format!("in `{name}`"))
            }
            _ => Ok(()),
        }
    }

    pub(super) fn check_power(&self, base: &ScalarTerm, exponent: &ScalarTerm) -> Resolved<()> {
        self.check_plain(exponent, "in an exponent")?;
        if let Known::Definite(dimension) = known(base)
            && exact_power(exponent).is_none()
        {
            let message = format!("{} is raised to a power that is not written as a number", dimension.words());
            let help = "write the exponent as a whole number or fraction, as in `x^2`, `x^(1/2)`".into();
            return self.fault(exponent.place.span, Fault::Other { message, help });
        }
        Ok(())
    }

    /// Refuses arguments of a definition that do not fit into it; what is known of its value beyond what the definition says.
    pub(super) fn check_call(&self, call: &Call, span: Span) -> Resolved<Option<Known>> {
        let arguments: Vec<Known> = call.arguments.iter().map(known).collect();
        match super::checked::call(call, &arguments) {
            Ok(known) => Ok(Some(known).filter(|known| *known != call.definition.known)),
            Err(Fault::Other { message, help }) => {
                let message = format!("inside `{}`, with these arguments, {message}", call.definition.name);
                self.fault(span, Fault::Other { message, help })
            }
            Err(fault) => self.fault(span, fault),
        }
    }

    /// Constants of another set than the usual one are part of the meaning of a text.
    pub(super) fn constants_text(&self) -> String {
        let set = self.names.constants;
        if set == ConstantSet::default() { String::new() } else { format!("{CONSTANTS_MARK}{}", set.name()) }
    }
}

/// Stands in the text of a term before the name of the constants that are part of its meaning.
const CONSTANTS_MARK: char = '\u{1}';

/// The text of a term as it was written, without the constants that are part of its meaning.
pub(super) fn as_written(text: &str) -> &str {
    text.split(CONSTANTS_MARK).next().unwrap_or(text)
}

/// The text of a term without the constants that are part of the meaning of any of its parts.
pub(super) fn without_constants(text: &str) -> String {
    let mut pieces = text.split(CONSTANTS_MARK);
    let first = pieces.next().unwrap_or_default().to_string();
    let is_name = |c: char| c.is_ascii_alphanumeric() || c == '-';
    pieces.fold(first, |shown, piece| shown + piece.trim_start_matches(is_name))
}

/// The text of a term with the constants that are part of its meaning told.
pub(super) fn with_constants(text: &str) -> String {
    text.replace(CONSTANTS_MARK, " with ")
}
