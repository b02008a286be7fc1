//! Evaluates scalar terms at a working precision.

use super::environment::Environment;
use super::problem::{Failure, Trouble};
use super::settled::Settled;
use super::walker::Kept;
use crate::angular::HalfInteger;
use crate::angular::chain::AngularVector;
use crate::num::{Ball, ComplexBall, Effort, NumberError, Scalar, Surd};
use crate::systems::{Level, Manifold, State, StateLabel, System};
use crate::theory::normal::Conjugated;
use crate::theory::terms::*;
use rug::{Complex, Float, Integer, Rational};
use std::collections::{BTreeMap, BTreeSet, HashMap};
use std::sync::Arc;

pub(super) type Evaluated<T> = Result<T, Failure>;

/// Nested definitions and sums deeper than this are refused rather than risking the stack.
const CALL_DEPTH: usize = 200;

/// Longest numerator or denominator of a partial sum that is kept exact, in bits: beyond, every further term would cost more than all before.
const LONGEST_EXACT_SUM: u32 = 20_000;

/// The systems of a session by name.
pub type Systems = BTreeMap<String, Arc<dyn System>>;

/// Evaluates the terms of one entry.
pub struct Evaluator<'s> {
    pub(super) systems: &'s Systems,
    pub(super) effort: Effort,
    /// Precision at which numbers inside exact chains are tried.
    pub(super) exact_bits: u32,
    /// Exact partial sums longer than this go on as balls; `digits exact` lifts it.
    pub(super) longest_sum: u32,
    /// One measured source is moved by this much; used for gradients.
    pub(super) shift: Option<(Source, Rational)>,
    /// The system a moved datum belongs to, with the datum moved.
    moved_system: Option<(String, Arc<dyn System>)>,
    /// Inexact numbers inside chains are moved to the edge of their radius, all up or alternating; used to see what they do to the value.
    pub(super) nudge: Option<Nudge>,
    pub(super) nudged_numbers: usize,
    pub(super) imprecise_numbers: bool,
    /// Selection rules met, for the reason of an exact zero.
    rules: BTreeSet<String>,
    /// Pairs of states of one level that an operator couples in first order.
    couplings: BTreeMap<String, BTreeSet<String>>,
    /// Why a value cannot be had to more digits.
    pub(super) limit: Option<String>,
    pub(super) kept: HashMap<(String, String, Option<Level>), Kept>,
    /// Brackets whose exact evaluation is known not to work.
    pub(super) never_exact: BTreeSet<String>,
    /// Values of brackets at a precision.
    pub(super) known: HashMap<(String, u32), Scalar>,
    /// What variations have been derived to, by their text.
    pub(super) derived: HashMap<String, (ScalarTerm, Conjugated)>,
    /// Costly values that hold whatever source is moved.
    pub(super) settled: Settled,
    depth: usize,
}

#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(super) enum Nudge {
    Up,
    Alternating,
}

impl<'s> Evaluator<'s> {
    pub fn new(systems: &'s Systems, effort: Effort) -> Self {
        Evaluator {
            systems,
            effort,
            exact_bits: 128,
            longest_sum: LONGEST_EXACT_SUM,
            shift: None,
            moved_system: None,
            nudge: None,
            nudged_numbers: 0,
            imprecise_numbers: false,
            rules: BTreeSet::new(),
            couplings: BTreeMap::new(),
            limit: None,
            kept: HashMap::new(),
            never_exact: BTreeSet::new(),
            known: HashMap::new(),
            settled: Settled::new(),
            derived: HashMap::new(),
            depth: 0,
        }
    }

    pub(super) fn note_rule(&mut self, rule: String) {
        if !rule.is_empty() && self.rules.len() < 8 {
            self.rules.insert(rule);
        }
    }

    /// The selection rules met so far, and forgets them.
    pub fn take_rules(&mut self) -> Vec<String> {
        std::mem::take(&mut self.rules).into_iter().collect()
    }

    pub(super) fn note_coupling(&mut self, left_out: &str, other: &str) {
        self.couplings.entry(left_out.to_string()).or_default().insert(other.to_string());
    }

    /// The first-order couplings met so far in words, and forgets them.
    pub(super) fn take_couplings(&mut self) -> Vec<String> {
        let couplings = std::mem::take(&mut self.couplings);
        let told = couplings.into_iter().map(|(left_out, others)| {
            let more = if others.len() > 4 { ", …" } else { "" };
            let others: Vec<String> = others.into_iter().take(4).collect();
            format!(
                "the level of the state {left_out} is coupled in first order: an operator leads to {}{more} of the same energy, which the prime leaves \
                 out; perturbation theory of one state of a level needs states that diagonalise the perturbation",
                others.join("; ")
            )
        });
        told.collect()
    }

    /// Why more digits are not to be had, if that came up.
    pub fn limit(&self) -> Option<&str> {
        self.limit.as_deref()
    }

    /// Forgets every computed ket and value that may rest on a moved source.
    pub(super) fn forget(&mut self) {
        self.kept.clear();
        self.known.clear();
        self.never_exact.clear();
    }

    pub(super) fn system(&self, name: &str, place: Place) -> Evaluated<Arc<dyn System>> {
        if let Some((moved, system)) = &self.moved_system
            && moved == name
        {
            return Ok(system.clone());
        }
        self.systems.get(name).cloned().ok_or_else(|| {
            Failure::new(
                place,
                Trouble::Refused { message: format!("the system `{name}` is not there"), help: String::new() },
            )
        })
    }

    /// Moves one source by `delta`, and forgets what was computed before.
    pub(super) fn move_source(&mut self, source: &Source, delta: Rational, place: Place) -> Evaluated<()> {
        self.forget();
        if let Source::Datum { system: name, index } = source {
            let system = self.system(name, place)?;
            let moved = system.moved(*index, &delta).map_err(|error| Failure::new(place, error))?;
            self.moved_system = Some((name.clone(), moved));
        }
        self.shift = Some((source.clone(), delta));
        Ok(())
    }

    /// Puts the moved source back.
    pub(super) fn put_back(&mut self) {
        self.forget();
        self.shift = None;
        self.moved_system = None;
    }

    /// The value of a term, exact or as a ball from work at `bits` bits.
    pub fn scalar(&mut self, term: &ScalarTerm, environment: &Environment, bits: u32) -> Evaluated<Scalar> {
        self.depth += 1;
        let result = if self.depth > CALL_DEPTH {
            Err(Failure::new(
                term.place,
                Trouble::Refused {
                    message: format!("definitions are nested deeper than {CALL_DEPTH}"),
                    help: "bring intermediate results into entries of their own".into(),
                },
            ))
        } else {
            self.effort
                .check()
                .map_err(|stop| Failure::new(term.place, stop))
                .and_then(|()| self.settled(term, environment, bits))
        };
        self.depth -= 1;
        result
    }

    pub(super) fn scalar_node(&mut self, term: &ScalarTerm, environment: &Environment, bits: u32) -> Evaluated<Scalar> {
        let place = term.place;
        let at = |error: NumberError| Failure::new(place, error);
        match &*term.node {
            ScalarNode::Exact(value) => Ok(Scalar::Exact(value.clone())),
            ScalarNode::Measured { source, value, .. } => {
                let moved = match &self.shift {
                    Some((moved, delta)) if moved == source => Rational::from(value + delta),
                    _ => value.clone(),
                };
                Ok(Scalar::Exact(Surd::from(moved)))
            }
            ScalarNode::Pi => Ok(Scalar::Exact(Surd::pi_to(1))),
            ScalarNode::Variable(name) => environment.variable(name).cloned().ok_or_else(|| {
                let message = format!("`{name}` has no value here");
                Failure::new(place, Trouble::Refused { message, help: String::new() })
            }),
            ScalarNode::Sum(terms) => {
                let mut sum = Scalar::zero();
                for inner in terms {
                    let value = self.scalar(inner, environment, bits)?;
                    sum = sum.add(&value, bits).map_err(at)?;
                }
                Ok(sum)
            }
            ScalarNode::Product(factors) => {
                let mut product = Scalar::one();
                for inner in factors {
                    let value = self.scalar(inner, environment, bits)?;
                    product = product.mul(&value, bits).map_err(at)?;
                }
                Ok(product)
            }
            ScalarNode::Quantity { value, .. } => self.scalar(value, environment, bits),
            ScalarNode::Negated(inner) => Ok(self.scalar(inner, environment, bits)?.neg()),
            ScalarNode::Quotient(a, b) => {
                let a = self.scalar(a, environment, bits)?;
                let divisor = self.scalar(b, environment, bits)?;
                a.div(&divisor, bits).map_err(|error| Failure::new(b.place, error))
            }
            ScalarNode::Power(a, b) => {
                let a = self.scalar(a, environment, bits)?;
                let b = self.scalar(b, environment, bits)?;
                a.pow(&b, bits).map_err(at)
            }
            ScalarNode::Function(function, inner) => {
                let value = self.scalar(inner, environment, bits)?;
                value.apply(*function, bits).map_err(at)
            }
            ScalarNode::Energy(state) => {
                let system = self.system(&state.system, state.place)?;
                let state = self.state(state, environment)?;
                let energy =
                    system.energy(&state, bits + 16, &self.effort).map_err(|obstacle| Failure::new(place, obstacle))?;
                number_to_scalar(energy, bits).map_err(at)
            }
            ScalarNode::Bracket(bracket) => self.bracket(term, bracket, environment, bits),
            ScalarNode::Call(call) => match &call.definition.body {
                Meaning::Scalar(body) => {
                    let inside = self.enter(call, environment, bits)?;
                    self.scalar(body, &inside, bits)
                }
                _ => Err(Failure::new(
                    place,
                    Trouble::Refused { message: "a number is needed here".into(), help: String::new() },
                )),
            },
            ScalarNode::Root { variable, from, to, body } => {
                self.root(variable, from, to, body, environment, bits, place)
            }
            ScalarNode::Series { variable, from, to, body } => {
                let first = self.whole(from, environment, variable)?;
                let last = self.whole(to, environment, variable)?;
                let mut sum = Scalar::zero();
                let mut n = first;
                while n <= last {
                    self.effort.check().map_err(|stop| Failure::new(place, stop))?;
                    let inside = environment.with(variable, Scalar::Exact(Surd::from(Rational::from(n.clone()))));
                    let value = self.scalar(body, &inside, bits)?;
                    sum = sum.add(&value, bits).map_err(at)?;
                    if matches!(&sum, Scalar::Exact(exact) if exact.bits() > self.longest_sum) {
                        sum = Scalar::Approx(sum.to_ball(bits).map_err(at)?);
                    }
                    n += 1;
                }
                Ok(sum)
            }
            ScalarNode::Vary(variation) => self.vary(term, variation, environment, bits),
            ScalarNode::LevelPart(part, inner) => self.level_part(*part, inner, environment, bits, place),
            ScalarNode::Wigner(symbol, arguments) => self.wigner(*symbol, arguments, environment, place),
        }
    }

    /// A 3j, 6j or 9j symbol; exact.
    fn wigner(
        &mut self,
        symbol: WignerSymbol,
        arguments: &[ScalarTerm],
        environment: &Environment,
        place: Place,
    ) -> Evaluated<Scalar> {
        let refused = |place, message: String| {
            Failure::new(place, Trouble::Refused { message, help: "write 0, 1/2, 1, 3/2, …".into() })
        };
        let mut j = Vec::with_capacity(arguments.len());
        for argument in arguments {
            let value = self.exact_scalar(argument, environment)?;
            let Some(rational) = value.as_rational() else {
                return Err(refused(argument.place, format!("{value} is not a half-integer")));
            };
            j.push(HalfInteger::from_rational(&rational).map_err(|error| refused(argument.place, error.to_string()))?);
        }
        let Some(value) = symbol.value(&j) else {
            return Err(refused(place, format!("the symbol takes {}", symbol.arguments().1)));
        };
        value.map(Scalar::Exact).map_err(|error| refused(place, error.to_string()))
    }

    /// The value of a term that has to be exact (arguments of operators, limits of sums).
    pub(super) fn exact_scalar(&mut self, term: &ScalarTerm, environment: &Environment) -> Evaluated<Surd> {
        match self.scalar(term, environment, self.exact_bits)? {
            Scalar::Exact(value) => Ok(value),
            Scalar::Approx(_) => Err(Failure::new(
                term.place,
                Trouble::Refused {
                    message: "an exact number is needed here, and this one is approximate".into(),
                    help: "write a whole number or a fraction".into(),
                },
            )),
        }
    }

    fn whole(&mut self, term: &ScalarTerm, environment: &Environment, variable: &str) -> Evaluated<Integer> {
        let value = self.exact_scalar(term, environment)?;
        match value.as_rational() {
            Some(q) if q.is_integer() => Ok(q.numer().clone()),
            _ => Err(Failure::new(
                term.place,
                Trouble::NotWhole { variable: variable.to_string(), what: value.to_string() },
            )),
        }
    }

    /// The environment inside a called definition: its parameters with the values of the arguments.
    pub(super) fn enter(&mut self, call: &Call, environment: &Environment, bits: u32) -> Evaluated<Environment> {
        let mut variables = Vec::with_capacity(call.arguments.len());
        for (name, argument) in call.definition.parameters.iter().zip(&call.arguments) {
            variables.push((name.clone(), self.scalar(argument, environment, bits)?));
        }
        Ok(environment.for_call(variables))
    }

    /// The state a term names.
    pub fn state(&mut self, term: &StateTerm, environment: &Environment) -> Evaluated<State> {
        let system = self.system(&term.system, term.place)?;
        let mut label = self.label(&term.label, environment, term.place)?;
        let state = system.state(&label, &self.effort).map_err(|error| Failure::new(term.place, error))?;
        let Some(projection) = environment.projection() else { return Ok(state) };
        if open_momentum(&*system, &state).is_none() {
            return Ok(state);
        }
        label.options.push(("M".into(), Rational::from((projection.twice(), 2))));
        system.state(&label, &self.effort).map_err(|error| Failure::new(term.place, error))
    }

    /// The manifold a term names.
    pub fn manifold(&mut self, term: &ManifoldTerm, environment: &Environment) -> Evaluated<Manifold> {
        let system = self.system(&term.system, term.place)?;
        let label = self.label(&term.label, environment, term.place)?;
        system.manifold(&label, &self.effort).map_err(|error| Failure::new(term.place, error))
    }

    fn label(&mut self, label: &LabelTerm, environment: &Environment, place: Place) -> Evaluated<StateLabel> {
        let mut text = String::new();
        for piece in &label.parts {
            match piece {
                LabelPiece::Text(part) => text.push_str(part),
                LabelPiece::Computed(term) => {
                    let value = self.whole(term, environment, "the number in braces")?;
                    text.push_str(&value.to_string());
                }
            }
        }
        let mut options = Vec::with_capacity(label.options.len());
        for (name, term) in &label.options {
            let value = self.exact_scalar(term, environment)?;
            let Some(rational) = value.as_rational() else {
                let message = format!("{name} = {value} is not a quantum number");
                return Err(Failure::new(
                    place,
                    Trouble::Refused { message, help: "quantum numbers are whole or half-integer".into() },
                ));
            };
            options.push((name.clone(), rational.into_owned()));
        }
        Ok(StateLabel { text, options })
    }

    /// The midpoint of a ball, moved to its edge when the influence of inexact numbers is being measured.
    pub(super) fn nudged(&mut self, ball: &ComplexBall, bits: u32) -> Complex {
        let mut value = ball.midpoint(bits);
        let radius = ball.radius();
        let size = Float::with_val(32, Complex::with_val(32, &value).abs().real());
        if radius > size * (Float::with_val(32, 1) >> (bits - bits / 8)) {
            self.imprecise_numbers = true;
            match self.nudge {
                None => {}
                Some(Nudge::Up) => value += &radius,
                Some(Nudge::Alternating) if self.nudged_numbers.is_multiple_of(2) => value += &radius,
                Some(Nudge::Alternating) => value -= &radius,
            }
            self.nudged_numbers += 1;
        }
        value
    }
}

/// J of a state whose M is left open; `None` where it is not.
pub(super) fn open_momentum(system: &dyn System, state: &State) -> Option<HalfInteger> {
    match system.symmetry()?.end(state).ok()?.vector {
        AngularVector::Coupled { j, m: None } if j.twice() > 0 => Some(j),
        _ => None,
    }
}

/// A number from a system as a scalar; approximate ones are taken to hold to `bits` bits.
pub(super) fn number_to_scalar(number: crate::systems::Number, bits: u32) -> Result<Scalar, NumberError> {
    match number {
        crate::systems::Number::Exact(value) => Ok(Scalar::Exact(value)),
        crate::systems::Number::Approx(value) => {
            let radius = Float::with_val(32, Complex::with_val(32, &value).abs().real()) >> bits;
            ball(value, radius).map(Scalar::Approx)
        }
    }
}

/// A ball around a numeric value; real values keep an imaginary part that is exactly zero.
pub(super) fn ball(value: Complex, radius: Float) -> Result<ComplexBall, NumberError> {
    if value.imag().is_zero() {
        Ok(ComplexBall::real(Ball::with_radius(value.into_real_imag().0, radius)?))
    } else {
        ComplexBall::from_complex(value, radius)
    }
}
