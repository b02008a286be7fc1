//! The factors of a chain: products, powers and named operators taken apart, and their numbers evaluated.

use super::environment::Environment;
use super::problem::{Failure, Trouble};
use super::walker::{Walked, Walker};
use crate::num::Scalar;
use crate::systems::{Atom, FunctionKind, FunctionOfH, Number, Obstacle, Omitted, Resolvent};
use crate::theory::terms::*;

/// A factor of a chain with the values of its variables.
#[derive(Clone)]
pub(super) struct Factor {
    pub(super) operator: OperatorTerm,
    pub(super) environment: Environment,
}

impl Factor {
    pub(super) fn key(&self) -> String {
        format!("{}{{{}}}", self.operator.text, self.environment.fingerprint())
    }

    /// Another operator with the same values of variables.
    pub(super) fn of(&self, operator: &OperatorTerm) -> Factor {
        Factor { operator: operator.clone(), environment: self.environment.clone() }
    }

    pub(super) fn holds_function_of_h(&self) -> bool {
        crate::theory::resolve::has_function_of_h(&self.operator)
    }
}

/// A chain taken apart: the product of its numbers, and its operators in the order written.
pub(super) struct Flat {
    pub(super) coefficient: Scalar,
    pub(super) factors: Vec<Factor>,
}

impl Walker<'_, '_> {
    /// Takes products, powers and named operators apart and gathers their numbers.
    pub(super) fn flatten(&mut self, operator: &OperatorTerm, environment: &Environment) -> Walked<Flat> {
        let mut flat = Flat { coefficient: Scalar::one(), factors: Vec::new() };
        self.flatten_into(operator, environment, &mut flat)?;
        Ok(flat)
    }

    fn flatten_into(&mut self, operator: &OperatorTerm, environment: &Environment, flat: &mut Flat) -> Walked<()> {
        match &*operator.node {
            OperatorNode::Scalar(scalar) => {
                let value = self.evaluator.scalar(scalar, environment, self.scalar_bits())?;
                flat.coefficient = flat
                    .coefficient
                    .mul(&value, self.scalar_bits())
                    .map_err(|error| Failure::new(operator.place, error))?;
            }
            OperatorNode::Product(factors) => {
                for factor in factors {
                    self.flatten_into(factor, environment, flat)?;
                }
            }
            OperatorNode::Power(inner, power) => {
                for _ in 0..*power {
                    self.flatten_into(inner, environment, flat)?;
                }
            }
            OperatorNode::Call(call) => {
                if let Meaning::Operator(body) = &call.definition.body {
                    let inside = self.evaluator.enter(call, environment, self.scalar_bits())?;
                    self.flatten_into(body, &inside, flat)?;
                }
            }
            OperatorNode::Tensor(term) => {
                return Err(Failure::new(operator.place, without_numbers(&term.tensor.element.name)));
            }
            OperatorNode::Atom(term) if term.along.is_some() => {
                let sum = self.along(term, operator, environment)?;
                flat.factors.push(Factor { operator: sum, environment: environment.clone() });
            }
            OperatorNode::Atom(term) => {
                let factor = Factor { operator: operator.clone(), environment: environment.clone() };
                let atom = self.named_atom(term, &factor)?;
                let known = self.system.knows(&atom).map_err(|trouble| Failure::new(operator.place, trouble))?;
                if known {
                    flat.factors.push(factor);
                    return Ok(());
                }
                if atom.power == 0 {
                    return Ok(());
                }
                if !(1..=1000).contains(&atom.power) {
                    return Err(Failure::new(
                        operator.place,
                        Trouble::Refused {
                            message: format!("`{}` has no power {} here", atom.name, atom.power),
                            help: "of a general operator only whole powers from 1 to 1000 are products; `r` has negative ones".into(),
                        },
                    ));
                }
                let single = AtomTerm { power: 1, ..term.clone() };
                let text = format!("{} to its power", operator.text);
                let single = Term::new(OperatorNode::Atom(single), operator.place, text);
                let factor = Factor { operator: single, environment: environment.clone() };
                flat.factors.extend(std::iter::repeat_n(factor, atom.power as usize));
            }
            _ => flat.factors.push(Factor { operator: operator.clone(), environment: environment.clone() }),
        }
        Ok(())
    }

    /// A vector along a polarization as the sum of its Cartesian components.
    fn along(&mut self, term: &AtomTerm, operator: &OperatorTerm, environment: &Environment) -> Walked<OperatorTerm> {
        let place = operator.place;
        let open = || {
            let message = format!("the polarization in `{}` is left open here", operator.text);
            let help = "take `scalar_part(…)`, `vector_part(…)` or `tensor_part(…)` of the expression, or declare a polarization and write its name in place of `light`";
            Failure::new(place, Trouble::Refused { message, help: help.into() })
        };
        let direction = match term.along.as_ref() {
            Some(Direction::Fixed(fixed)) => fixed.clone(),
            Some(Direction::Light) => environment.light().ok_or_else(open)?.clone(),
            Some(Direction::LightConjugate) => environment.light().ok_or_else(open)?.conj(),
            None => return Ok(operator.clone()),
        };
        let mut terms = Vec::new();
        for (axis, weight) in ["x", "y", "z"].into_iter().zip(direction.cartesian()) {
            if weight.is_zero() {
                continue;
            }
            let text = format!("{} of {}", axis, operator.text);
            let atom = AtomTerm { component: Some(axis.into()), along: None, ..term.clone() };
            let atom = Term::new(OperatorNode::Atom(atom), place, text.as_str());
            let shown = weight.to_string();
            let weight = Term::new(ScalarNode::Exact(weight.clone()), place, shown.as_str());
            let weight = Term::new(OperatorNode::Scalar(weight), place, shown.as_str());
            terms.push(Term::new(OperatorNode::Product(vec![weight, atom]), place, format!("({shown}) {text}")));
        }
        let text = terms.iter().map(|term| term.text.to_string()).collect::<Vec<_>>().join(" + ");
        Ok(Term::new(OperatorNode::Sum(terms), place, text))
    }

    /// The atom with its arguments as numbers and its Cartesian index as a component.
    fn named_atom(&mut self, term: &AtomTerm, factor: &Factor) -> Walked<Atom> {
        let place = factor.operator.place;
        let mut arguments = Vec::with_capacity(term.arguments.len());
        for argument in &term.arguments {
            let value = self.evaluator.exact_scalar(argument, &factor.environment)?;
            let Some(rational) = value.as_rational() else {
                return Err(Failure::new(
                    place,
                    Trouble::Refused {
                        message: format!(
                            "`{}` takes whole numbers in its parentheses, and {value} is given",
                            term.name
                        ),
                        help: "write for instance `C(2)_0`".into(),
                    },
                ));
            };
            arguments.push(rational.into_owned());
        }
        let component = term.component.as_ref().map(|index| match factor.environment.index(index) {
            Some(component) => component.to_string(),
            None => index.clone(),
        });
        Ok(Atom { name: term.name.clone(), component, arguments, power: term.power })
    }

    /// Like `named_atom`, for an atom the system has already accepted.
    pub(super) fn atom(&mut self, term: &AtomTerm, factor: &Factor) -> Walked<Atom> {
        self.named_atom(term, factor)
    }

    /// Precision for numbers inside the chain: a little more than the kets have.
    pub(super) fn scalar_bits(&self) -> u32 {
        self.bits.map_or(self.evaluator.exact_bits, |bits| bits + 32)
    }

    /// A number as the backend takes it.
    pub(super) fn number(&mut self, scalar: &Scalar, place: Place) -> Walked<Number> {
        match (scalar, self.bits) {
            (Scalar::Exact(surd), _) => Ok(Number::Exact(surd.clone())),
            (Scalar::Approx(_), None) => Err(Failure::new(place, Obstacle::Inexact)),
            (Scalar::Approx(ball), Some(bits)) => Ok(Number::Approx(self.evaluator.nudged(ball, bits))),
        }
    }

    /// 1/(a + b H) = scale (z - H)^-1 with z = -a/b and scale = -1/b.
    pub(super) fn resolvent(&mut self, linear: &LinearInH, factor: &Factor) -> Walked<(Number, Resolvent)> {
        let place = factor.operator.place;
        let bits = self.scalar_bits();
        let constant = self.evaluator.scalar(&linear.constant, &factor.environment, bits)?;
        let slope = self.evaluator.scalar(&linear.slope, &factor.environment, bits)?;
        let scale = Scalar::one().div(&slope, bits).map_err(|error| Failure::new(place, error))?.neg();
        let z = constant.mul(&scale, bits).map_err(|error| Failure::new(place, error))?;
        let resolvent =
            Resolvent { z: self.number(&z, place)?, omitted: self.omitted(&linear.omitted, &factor.environment)? };
        Ok((self.number(&scale, place)?, resolvent))
    }

    pub(super) fn function_of_h(
        &mut self,
        function: ScalarFunction,
        linear: &LinearInH,
        factor: &Factor,
    ) -> Walked<FunctionOfH> {
        let place = factor.operator.place;
        let bits = self.scalar_bits();
        let constant = self.evaluator.scalar(&linear.constant, &factor.environment, bits)?;
        let slope = self.evaluator.scalar(&linear.slope, &factor.environment, bits)?;
        let kind = match function {
            ScalarFunction::Sqrt => FunctionKind::Sqrt,
            ScalarFunction::Exp => FunctionKind::Exp,
            _ => FunctionKind::Ln,
        };
        Ok(FunctionOfH {
            kind,
            constant: self.number(&constant, place)?,
            slope: self.number(&slope, place)?,
            omitted: self.omitted(&linear.omitted, &factor.environment)?,
            adjoint: false,
        })
    }

    fn omitted(&mut self, terms: &[OmittedTerm], environment: &Environment) -> Walked<Vec<Omitted>> {
        terms
            .iter()
            .map(|term| match term {
                OmittedTerm::LevelOf(StateTerm { system, place, .. })
                | OmittedTerm::Manifold(ManifoldTerm { system, place, .. })
                    if !std::sync::Arc::ptr_eq(&self.evaluator.system(system, *place)?, &self.system) =>
                {
                    Err(Failure::new(
                        *place,
                        Trouble::Refused {
                            message: format!(
                                "the states left out belong to `{system}`, and the bracket to another system"
                            ),
                            help: "leave out states of the system whose H stands in the resolvent".into(),
                        },
                    ))
                }
                OmittedTerm::LevelOf(state) => Ok(Omitted::LevelOf(self.evaluator.state(state, environment)?)),
                OmittedTerm::Manifold(manifold) => {
                    Ok(Omitted::Manifold(self.evaluator.manifold(manifold, environment)?))
                }
            })
            .collect()
    }
}

/// Where the two sides of a numeric chain meet: half of the functions of H on each side, so that solves are shared and the error of each side
/// multiplies that of the other.
pub(super) fn middle(factors: &[Factor]) -> usize {
    let solves: Vec<usize> = (0..factors.len()).filter(|&k| factors[k].holds_function_of_h()).collect();
    let left = solves.len() / 2;
    let start = if left == 0 { 0 } else { solves[left - 1] + 1 };
    let end = solves.get(left).copied().unwrap_or(factors.len());
    if start < end { start } else { start.min(factors.len() - 1) }
}

/// An operator known by its ranks has no value.
fn without_numbers(name: &str) -> Trouble {
    let name = if name.is_empty() { "the tensor".to_string() } else { format!("`{name}`") };
    Trouble::Refused {
        message: format!("{name} is known by its ranks alone and has no value"),
        help: "`paths` in front of the expression shows what its angular factors are".into(),
    }
}
