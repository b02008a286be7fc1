//! Values of brackets: exactly where the system can, otherwise from two levels of accuracy whose difference says what holds.

use super::environment::Environment;
use super::evaluator::{Evaluated, Evaluator, Nudge, ball};
use super::problem::Failure;
use super::walker::Walker;
use crate::num::Scalar;
use crate::systems::{Backend, Level, Number, Obstacle, State, System};
use crate::theory::terms::*;
use rug::{Complex, Float};
use std::sync::Arc;

/// Bits by which the working precision grows from level to level.
const STEP_BITS: u32 = 64;

/// Levels tried on a system of fixed size before the value is handed back with the digits it has.
const FIXED_SIZE_LEVELS: u32 = 4;

/// Most values of brackets kept during one evaluation.
const MOST_KNOWN: usize = 10_000;

/// Two successive differences with a ratio above this mean slow, algebraic convergence with the basis size.
const SLOW_RATIO: f64 = 1.0 / 64.0;

/// A bracket that is computed with numbers, and the state its kets start from.
#[derive(Clone, Copy)]
struct Numeric<'n> {
    system: &'n Arc<dyn System>,
    anchor: &'n State,
    bracket: &'n Bracket,
    environment: &'n Environment,
    place: Place,
}

impl Evaluator<'_> {
    /// The value of a bracket, summed over its Cartesian indices.
    pub(super) fn bracket(
        &mut self,
        term: &ScalarTerm,
        bracket: &Bracket,
        environment: &Environment,
        bits: u32,
    ) -> Evaluated<Scalar> {
        let Some((index, rest)) = bracket.indices.split_first() else {
            return self.single_bracket(term, bracket, environment, bits);
        };
        let inner = Bracket { indices: rest.to_vec(), ..bracket.clone() };
        let mut sum = Scalar::zero();
        for component in ['x', 'y', 'z'] {
            let value = self.bracket(term, &inner, &environment.with_index(index, component), bits)?;
            sum = sum.add(&value, bits).map_err(|error| Failure::new(term.place, error))?;
        }
        Ok(sum)
    }

    fn single_bracket(
        &mut self,
        term: &ScalarTerm,
        bracket: &Bracket,
        environment: &Environment,
        bits: u32,
    ) -> Evaluated<Scalar> {
        let identity = format!("{}:{}{{{}}}", bracket.system, term.text, environment.fingerprint());
        if let Some(known) = self.known.get(&(identity.clone(), bits)) {
            return Ok(known.clone());
        }
        let value = self.fresh_bracket(&identity, bracket, environment, bits, term.place)?;
        if self.known.len() >= MOST_KNOWN {
            self.known.clear();
            self.never_exact.clear();
        }
        self.known.insert((identity, bits), value.clone());
        Ok(value)
    }

    fn fresh_bracket(
        &mut self,
        identity: &str,
        bracket: &Bracket,
        environment: &Environment,
        bits: u32,
        place: Place,
    ) -> Evaluated<Scalar> {
        let system = self.system(&bracket.system, place)?;
        if !self.never_exact.contains(identity) {
            if let Some(backend) = system.exact(&self.effort) {
                match self.walk(&system, backend, None, "", bracket, environment) {
                    Ok(None) => return Ok(Scalar::zero()),
                    Ok(Some(Number::Exact(value))) => return Ok(Scalar::Exact(value)),
                    Ok(Some(Number::Approx(_))) => {}
                    Err(failure) if failure.is_inexact() => {}
                    Err(failure) => return Err(failure),
                }
            }
            self.never_exact.insert(identity.to_string());
        }
        let Some(anchor) = anchor(&bracket.ket).or_else(|| anchor(&bracket.bra)) else {
            return Err(Failure::new(place, Obstacle::Inexact));
        };
        let anchor = self.state(&anchor, environment)?;
        self.by_levels(&Numeric { system: &system, anchor: &anchor, bracket, environment, place }, bits)
    }

    fn walk(
        &mut self,
        system: &Arc<dyn System>,
        backend: Arc<dyn Backend>,
        level: Option<Level>,
        anchor: &str,
        bracket: &Bracket,
        environment: &Environment,
    ) -> Evaluated<Option<Number>> {
        let key = (bracket.system.clone(), anchor.to_string(), level);
        let kept = self.kept.remove(&key).unwrap_or_default();
        let mut walker =
            Walker { evaluator: self, system: system.clone(), backend, bits: level.map(|l| l.bits), kept, outer: None };
        let result = walker.bracket(bracket, environment);
        let kept = std::mem::take(&mut walker.kept);
        // Nudged kets belong to no value.
        if self.nudge.is_none() {
            self.kept.insert(key, kept);
        }
        result
    }

    /// One numeric value: at one level, with the inexact numbers inside at their midpoints.
    fn at_level(&mut self, numeric: &Numeric<'_>, level: Level) -> Evaluated<Option<Number>> {
        let Numeric { system, anchor, bracket, environment, place } = *numeric;
        let backend = system.numeric(level, anchor, &self.effort).map_err(|obstacle| Failure::new(place, obstacle))?;
        self.walk(system, backend, Some(level), &anchor.label, bracket, environment)
    }

    /// Raises the level until two successive values agree to `bits` bits, or the ceiling of the basis is reached.
    fn by_levels(&mut self, numeric: &Numeric<'_>, bits: u32) -> Evaluated<Scalar> {
        let Numeric { system, place, .. } = *numeric;
        let range = system.basis_range();
        let (first, largest) = range.unwrap_or((0, 0));
        // A function more is worth about six bits well below threshold; a first level of this size is seldom wasted.
        let basis = first.max(usize::try_from(bits / 6).unwrap_or(first)).min(largest);
        let mut level = Level { bits: bits.max(system.data_bits()) + STEP_BITS, basis };
        let mut previous: Option<Complex> = None;
        let mut previous_step: Option<Float> = None;
        let mut steps = 0;
        loop {
            self.effort.check().map_err(|stop| Failure::new(place, stop))?;
            self.imprecise_numbers = false;
            let value = match self.at_level(numeric, level) {
                Ok(None) => return Ok(Scalar::zero()),
                Ok(Some(Number::Exact(value))) => return Ok(Scalar::Exact(value)),
                Ok(Some(Number::Approx(value))) => Some(value),
                Err(failure) if failure.is_undecided() && steps < 2 * FIXED_SIZE_LEVELS => None,
                Err(failure) => return Err(failure),
            };
            steps += 1;
            if let Some(value) = value {
                if let Some(earlier) = previous {
                    let step = magnitude(&(Complex::with_val(level.bits, &value) - earlier));
                    let ratio = previous_step
                        .as_ref()
                        .filter(|s| !s.is_zero())
                        .map(|s| Float::with_val(32, &step / s).to_f64());
                    let slow = range.is_some() && ratio.is_some_and(|ratio| ratio > SLOW_RATIO);
                    let radius = if slow { slow_radius(&step, ratio.unwrap_or(1.0)) } else { step.clone() };
                    let size = magnitude(&value);
                    // A zero has no size of its own to measure digits by.
                    let wanted = if size.is_zero() { Float::with_val(32, 1) >> bits } else { size >> bits };
                    let exhausted = match range {
                        Some(_) => level.basis >= largest,
                        None => steps >= FIXED_SIZE_LEVELS,
                    };
                    if radius <= wanted || exhausted {
                        if exhausted && range.is_some() && radius > wanted {
                            self.limit =
                                Some(format!("the basis of {largest} functions a block does not carry more digits"));
                        }
                        // Two levels may agree to the last bit; that is no proof of exactness, least of all of a zero.
                        let radius = radius.max(&(wanted >> 8u32)) + self.influence(numeric, level, &value)?;
                        return ball(value, radius).map(Scalar::Approx).map_err(|error| Failure::new(place, error));
                    }
                    previous_step = Some(step);
                }
                previous = Some(value);
            } else if range.is_some() && level.basis >= largest {
                return Err(Failure::new(place, Obstacle::Undecided));
            }
            level = Level { bits: level.bits + STEP_BITS, basis: (level.basis * 2).min(largest) };
        }
    }

    /// How far the value moves when the inexact numbers inside the chain go to the edge of their radius.
    fn influence(&mut self, numeric: &Numeric<'_>, level: Level, value: &Complex) -> Evaluated<Float> {
        let mut largest = Float::with_val(32, 0);
        if !self.imprecise_numbers || self.nudge.is_some() {
            return Ok(largest);
        }
        for nudge in [Nudge::Up, Nudge::Alternating] {
            self.nudge = Some(nudge);
            self.nudged_numbers = 0;
            let moved = self.at_level(numeric, level);
            self.nudge = None;
            if let Some(Number::Approx(moved)) = moved? {
                let distance = magnitude(&(Complex::with_val(level.bits, value) - moved));
                largest = largest.max(&distance);
            }
        }
        Ok(largest * 2u32)
    }
}

/// The error left after a step of algebraic convergence by doubling the basis: the geometric tail of the steps, doubled for safety.
fn slow_radius(step: &Float, ratio: f64) -> Float {
    let factor = if ratio < 0.9 { 2.0 * (ratio / (1.0 - ratio)).max(0.5) } else { 20.0 };
    Float::with_val(32, step * factor)
}

fn magnitude(value: &Complex) -> Float {
    Float::with_val(32, Complex::with_val(32, value).abs().real())
}

/// The eigenstate a ket is built on.
fn anchor(ket: &KetTerm) -> Option<StateTerm> {
    match &*ket.node {
        KetNode::State(state) => Some(state.clone()),
        KetNode::Applied(_, inner) | KetNode::Scaled(_, inner) => anchor(inner),
        KetNode::Sum(terms) => terms.first().and_then(anchor),
        KetNode::Call(call) => match &call.definition.body {
            Meaning::Ket(body) => anchor(body),
            _ => None,
        },
    }
}
