//! Dimensions through definitions: what a definition becomes when quantities with units are put in for its parameters.
//!
//! A definition is resolved before its arguments are known; `pol(413 nm)` is wrong only because of what stands in `pol`, or in what that calls.

use super::dimensions::{Known, exact_power, is_zero, known, mismatch, not_plain};
use super::problem::Fault;
use super::terms::*;
use crate::num::units::Dimension;
use std::collections::BTreeMap;
use std::sync::Arc;

/// What is known of the parameters of a definition.
type Parameters = BTreeMap<String, Known>;

/// What is known of the value of a definition with these arguments.
///
/// Errors: what does not fit inside.
/// Cost: every definition is entered once for every combination of what is known of its arguments.
pub(super) fn call(call: &Call, arguments: &[Known]) -> Result<Known, Fault> {
    Check::default().call(call, arguments.to_vec())
}

#[derive(Default)]
struct Check {
    entered: BTreeMap<(usize, Vec<Known>), Known>,
}

impl Check {
    fn call(&mut self, call: &Call, arguments: Vec<Known>) -> Result<Known, Fault> {
        let definition = &call.definition;
        if !arguments.iter().any(|known| matches!(known, Known::Definite(_))) {
            return Ok(definition.known.clone());
        }
        let key = (Arc::as_ptr(definition) as usize, arguments.clone());
        if let Some(known) = self.entered.get(&key) {
            return Ok(known.clone());
        }
        let parameters = definition.parameters.iter().cloned().zip(arguments).collect();
        let known = match &definition.body {
            Meaning::Scalar(body) => self.scalar(body, &parameters)?.of_variable(),
            Meaning::Operator(body) => self.operator(body, &parameters).map(|()| Known::Free)?,
            Meaning::Ket(body) => self.ket(body, &parameters).map(|()| Known::Free)?,
            Meaning::Bra(_) => Known::Free,
        };
        self.entered.insert(key, known.clone());
        Ok(known)
    }

    fn scalar(&mut self, term: &ScalarTerm, parameters: &Parameters) -> Result<Known, Fault> {
        match &*term.node {
            ScalarNode::Variable(name) => Ok(parameters.get(name).cloned().unwrap_or_default().of_variable()),
            ScalarNode::Sum(terms) => {
                let mut sum: Option<Known> = None;
                for term in terms.iter().filter(|term| !is_zero(term)) {
                    let next = self.scalar(term, parameters)?;
                    sum = Some(added(sum.as_ref(), &next)?);
                }
                Ok(sum.unwrap_or(Known::Number))
            }
            ScalarNode::Product(factors) => {
                let mut product = Known::Number;
                for factor in factors {
                    product = product.times(&self.scalar(factor, parameters)?);
                }
                Ok(product)
            }
            ScalarNode::Quotient(a, b) => {
                let (a, b) = (self.scalar(a, parameters)?, self.scalar(b, parameters)?);
                Ok(a.times(&b.inverse()))
            }
            ScalarNode::Power(base, exponent) => {
                let base = self.scalar(base, parameters)?;
                self.plain(exponent, parameters, "in an exponent")?;
                Ok(base.power(exact_power(exponent).as_ref()))
            }
            ScalarNode::Function(function, inner) => {
                let inner = match function {
                    ScalarFunction::Exp | ScalarFunction::Ln | ScalarFunction::Sin | ScalarFunction::Cos => {
                        self.plain(inner, parameters, "in a function")?
                    }
                    _ => self.scalar(inner, parameters)?,
                };
                Ok(inner.under(*function))
            }
            ScalarNode::Negated(inner) | ScalarNode::LevelPart(_, inner) => self.scalar(inner, parameters),
            ScalarNode::Quantity { known, value, .. } => self.scalar(value, parameters).map(|_| known.clone()),
            ScalarNode::Bracket(bracket) => {
                self.ket(&bracket.bra, parameters)?;
                self.ket(&bracket.ket, parameters)?;
                bracket.operator.iter().try_for_each(|operator| self.operator(operator, parameters))?;
                Ok(Known::Free)
            }
            ScalarNode::Vary(variation) => {
                self.operator(&variation.perturbation, parameters)?;
                self.scalar(&variation.body, parameters).map(|_| Known::Free)
            }
            ScalarNode::Call(inner) => self.inner_call(inner, parameters),
            ScalarNode::Root { variable, from, to, body } => {
                let from = self.scalar(from, parameters)?;
                let known = added(Some(&from), &self.scalar(to, parameters)?)?.of_variable();
                self.scalar(body, &with(parameters, variable, known.clone()))?;
                Ok(known)
            }
            ScalarNode::Series { variable, from, to, body } => {
                self.plain(from, parameters, "in the range of a sum")?;
                self.plain(to, parameters, "in the range of a sum")?;
                self.scalar(body, &with(parameters, variable, Known::Free))
            }
            ScalarNode::Wigner(_, list) => {
                list.iter().try_for_each(|inner| self.plain(inner, parameters, "in the symbol").map(|_| ()))?;
                Ok(Known::Number)
            }
            ScalarNode::Exact(_) | ScalarNode::Measured { .. } | ScalarNode::Pi | ScalarNode::Energy(_) => {
                Ok(known(term))
            }
        }
    }

    fn plain(&mut self, term: &ScalarTerm, parameters: &Parameters, place: &str) -> Result<Known, Fault> {
        match self.scalar(term, parameters)? {
            Known::Definite(dimension) => Err(not_plain(&dimension, place)),
            known => Ok(known),
        }
    }

    fn inner_call(&mut self, call: &Call, parameters: &Parameters) -> Result<Known, Fault> {
        let arguments =
            call.arguments.iter().map(|argument| self.scalar(argument, parameters)).collect::<Result<Vec<_>, _>>()?;
        self.call(call, arguments)
    }

    fn operator(&mut self, term: &OperatorTerm, parameters: &Parameters) -> Result<(), Fault> {
        match &*term.node {
            OperatorNode::Scalar(scalar) => self.scalar(scalar, parameters).map(|_| ()),
            OperatorNode::Atom(atom) => atom
                .arguments
                .iter()
                .try_for_each(|argument| self.plain(argument, parameters, "in an operator").map(|_| ())),
            OperatorNode::Hamiltonian | OperatorNode::Tensor(_) => Ok(()),
            OperatorNode::Sum(list) | OperatorNode::Product(list) => {
                list.iter().try_for_each(|inner| self.operator(inner, parameters))
            }
            OperatorNode::Power(inner, _) | OperatorNode::Adjoint(inner) => self.operator(inner, parameters),
            OperatorNode::Dyad(ket, bra) => {
                self.ket(ket, parameters)?;
                self.ket(bra, parameters)
            }
            OperatorNode::Resolvent(linear) | OperatorNode::Function(_, linear) => {
                let constant = self.scalar(&linear.constant, parameters)?;
                // Where H has a factor, the constant is what that makes it.
                if matches!(exact_power(&linear.slope), Some(slope) if slope != 0) {
                    added(Some(&Known::Atomic(Dimension::energy())), &constant)?;
                }
                Ok(())
            }
            OperatorNode::Call(call) => self.inner_call(call, parameters).map(|_| ()),
        }
    }

    fn ket(&mut self, term: &KetTerm, parameters: &Parameters) -> Result<(), Fault> {
        match &*term.node {
            KetNode::State(_) => Ok(()),
            KetNode::Applied(operator, inner) => {
                self.operator(operator, parameters)?;
                self.ket(inner, parameters)
            }
            KetNode::Sum(list) => list.iter().try_for_each(|inner| self.ket(inner, parameters)),
            KetNode::Scaled(scalar, inner) => {
                self.scalar(scalar, parameters)?;
                self.ket(inner, parameters)
            }
            KetNode::Call(call) => self.inner_call(call, parameters).map(|_| ()),
        }
    }
}

fn with(parameters: &Parameters, variable: &str, known: Known) -> Parameters {
    let mut inside = parameters.clone();
    inside.insert(variable.to_string(), known);
    inside
}

fn added(sum: Option<&Known>, next: &Known) -> Result<Known, Fault> {
    match sum {
        None => Ok(next.clone()),
        Some(sum) => sum.joined(next).map_err(|(first, second)| mismatch(first, second, "added to")),
    }
}
