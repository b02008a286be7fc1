//! The value of an expression to the asked digits, with its uncertainty from measured inputs.

use super::environment::Environment;
use super::evaluator::{Evaluated, Evaluator};
use super::problem::{Failure, Trouble};
use crate::num::render::needs_more;
use crate::num::{Ball, Scalar};
use crate::theory::terms::*;
use rug::{Float, Rational};

/// Digits of gradients; an uncertainty is printed with two.
const GRADIENT_DIGITS: u32 = 12;

/// A source is moved by its uncertainty over two to this power, so that the gradient is that of the tangent.
const SHIFT_BITS: u32 = 24;

/// Digits to which a value is had at both ends of a shift.
const WORKING_DIGITS: u32 = GRADIENT_DIGITS + SHIFT_BITS / 2 + 10;

/// How often precision is raised for a value before it is given with the digits it has.
const RAISES: u32 = 4;

/// What was asked of a value.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Wanted {
    Exact,
    Digits(u32),
}

/// A value and what it is worth.
#[derive(Clone, Debug)]
pub struct Value {
    pub scalar: Scalar,
    /// Contributions of the measured sources to the value, one standard uncertainty each, signed.
    pub sources: Vec<(Source, Float)>,
    /// Selection rules behind an exact zero.
    pub rules: Vec<String>,
    /// First-order couplings inside a degenerate level that were left out.
    pub couplings: Vec<String>,
    /// Why there are fewer digits than asked, if so.
    pub limit: Option<String>,
}

impl Value {
    /// The standard uncertainty from all sources, each source once; `None` without sources.
    pub fn sigma(&self) -> Option<Float> {
        if self.sources.is_empty() {
            return None;
        }
        let squares = self.sources.iter().map(|(_, part)| Float::with_val(64, part.square_ref()));
        Some(squares.fold(Float::new(64), |sum, square| sum + square).sqrt())
    }
}

impl Evaluator<'_> {
    /// The value of a term to the wanted digits, or with the digits that hold.
    pub fn value(&mut self, term: &ScalarTerm, wanted: Wanted) -> Evaluated<Value> {
        let digits = match wanted {
            Wanted::Exact => 30,
            Wanted::Digits(digits) => digits,
        };
        if wanted == Wanted::Exact {
            self.longest_sum = u32::MAX;
        }
        self.limit = None;
        self.take_rules();
        self.take_couplings();
        let uncertain = self.uncertain_sources(term)?;
        // What rests on an uncertain number is first had to the digits that its gradients need: often nothing more is.
        let mut scalar = self.certain_to(term, if uncertain.is_empty() { digits } else { WORKING_DIGITS })?;
        let mut rules = self.take_rules();
        let mut couplings = self.take_couplings();
        let mut limit = self.limit.clone();
        // rules that close some chains are no reason where others cancel
        if !rules.is_empty()
            && scalar.is_zero()
            && let Some(reason) = self.cancellation(term)
        {
            rules = vec![reason];
        }
        let mut sources = Vec::new();
        for (source, sigma) in uncertain {
            let gradient = self.gradient(term, &source, &sigma)?;
            if !gradient.is_zero() {
                sources.push((source, gradient));
            }
        }
        if digits > WORKING_DIGITS && !is_blurred(&scalar, &sources) {
            self.limit = None;
            scalar = self.certain_to(term, digits)?;
            limit = self.limit.clone();
            // What is known already is not told again.
            rules.extend(self.take_rules());
            couplings.extend(self.take_couplings());
            rules.dedup();
            couplings.dedup();
        }
        if !sources.is_empty() && !scalar.is_real() {
            return Err(Failure::new(term.place, complex_with_uncertainty()));
        }
        if wanted == Wanted::Exact && (!sources.is_empty() || matches!(scalar, Scalar::Approx(_))) {
            return Err(Failure::new(term.place, Trouble::NotExact));
        }
        Ok(Value { scalar, sources, rules, couplings, limit })
    }

    /// Everything with an uncertainty that a term rests on, with its standard uncertainty, each once.
    fn uncertain_sources(&mut self, term: &ScalarTerm) -> Evaluated<Vec<(Source, Rational)>> {
        let mut found = measured_sources(term);
        for name in systems_of(term) {
            let data = self.system(&name, term.place)?.data();
            found.extend(data.into_iter().enumerate().map(|(index, sigma)| {
                let source = Source::Datum { system: name.clone(), index };
                (source, sigma)
            }));
        }
        found.retain(|(_, sigma)| *sigma != 0);
        Ok(found)
    }

    /// Raises the working precision until `digits` digits are certain.
    fn certain_to(&mut self, term: &ScalarTerm, digits: u32) -> Evaluated<Scalar> {
        let mut bits = bits_for(digits) + 32;
        let mut best: Option<Scalar> = None;
        for _ in 0..RAISES {
            match self.scalar(term, &Environment::default(), bits) {
                Ok(scalar) => {
                    if !needs_more(&scalar, digits) || self.limit.is_some() {
                        return Ok(scalar);
                    }
                    if best.is_none()
                        && scalar.may_be_zero()
                        && let Some(reason) = self.proved_zero(term)
                    {
                        self.note_rule(reason);
                        return Ok(Scalar::zero());
                    }
                    best = Some(scalar);
                }
                Err(failure) if failure.is_undecided() => {}
                Err(failure) => return Err(failure),
            }
            bits += bits / 2 + 64;
        }
        best.ok_or_else(|| {
            Failure::new(
                term.place,
                Trouble::Undecided { digits: (f64::from(bits) * std::f64::consts::LOG10_2) as u32 },
            )
        })
    }

    /// The change of a real value when a source moves by one standard uncertainty, to first order.
    fn gradient(&mut self, term: &ScalarTerm, source: &Source, sigma: &Rational) -> Evaluated<Float> {
        let shift = Rational::from(sigma >> SHIFT_BITS);
        let mut ends = Vec::with_capacity(2);
        for delta in [shift.clone(), Rational::from(-&shift)] {
            self.move_source(source, delta, term.place)?;
            // The difference of the two ends is smaller than they are by the shift.
            let value = self.certain_to(term, WORKING_DIGITS);
            self.put_back();
            ends.push(value?);
        }
        let difference = ends[0].sub(&ends[1], 256).map_err(|error| Failure::new(term.place, error))?;
        let ball = difference.to_ball(256).map_err(|error| Failure::new(term.place, error))?;
        if !ball.is_real() {
            return Err(Failure::new(term.place, complex_with_uncertainty()));
        }
        let real: &Ball = &ball.re;
        if real.contains_zero() && is_negligible(real, &ends[0]) {
            return Ok(Float::new(64));
        }
        Ok(Float::with_val(64, real.mid()) << (SHIFT_BITS - 1))
    }
}

/// Whether a difference that may be zero is so small beside the value that it would be no uncertainty anybody could have.
fn is_negligible(difference: &Ball, value: &Scalar) -> bool {
    const BITS: u32 = 60;
    let change = Float::with_val(64, difference.rad()) << (SHIFT_BITS + BITS);
    value.to_ball(128).is_ok_and(|ball| change < ball.magnitude_below())
}

/// Whether the standard uncertainty is so much larger than the radius of a value that further digits would not be shown.
fn is_blurred(scalar: &Scalar, sources: &[(Source, Float)]) -> bool {
    let largest =
        sources.iter().map(|(_, part)| Float::with_val(64, part.abs_ref())).fold(Float::new(64), |a, b| a.max(&b));
    match scalar {
        Scalar::Exact(_) => true,
        Scalar::Approx(ball) => ball.radius() < largest >> 10,
    }
}

fn complex_with_uncertainty() -> Trouble {
    Trouble::Refused {
        message: "a complex value depends on a number with an uncertainty".into(),
        help: "take the parts one by one: `re(…)`, `im(…)`".into(),
    }
}

/// Bits for a number of decimal digits.
pub fn bits_for(digits: u32) -> u32 {
    (f64::from(digits) * std::f64::consts::LOG2_10).ceil() as u32
}

/// The numbers with an uncertainty that are written in a term or stand for constants in it, each once.
pub fn measured_sources(term: &ScalarTerm) -> Vec<(Source, Rational)> {
    let mut found: Vec<(Source, Rational)> = Vec::new();
    crate::theory::visit::scalars(term, &mut |inner| {
        if let ScalarNode::Measured { source, sigma, .. } = &*inner.node
            && !found.iter().any(|(known, _)| known == source)
        {
            found.push((source.clone(), sigma.clone()));
        }
    });
    found
}

/// The systems whose states and energies a term rests on, each once.
fn systems_of(term: &ScalarTerm) -> Vec<String> {
    let mut found: Vec<String> = Vec::new();
    crate::theory::visit::scalars(term, &mut |inner| {
        let system = match &*inner.node {
            ScalarNode::Energy(state) => &state.system,
            ScalarNode::Bracket(bracket) => &bracket.system,
            _ => return,
        };
        if !found.contains(system) {
            found.push(system.clone());
        }
    });
    found
}
