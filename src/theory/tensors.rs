//! Operators known by their ranks, and the directions vector operators are taken along.

use super::names::Binding;
use super::normal::Expander;
use super::problem::{Fault, Kind};
use super::resolve::{Resolved, Resolver};
use super::terms::*;
use crate::angular::polarization::Polarization;
use crate::angular::tensor::{Sign, SpinExchange, Tensor, coupled_components};
use crate::lang::tree::{Argument, Expr, ExprKind, Name, Span};
use crate::num::{Effort, Surd};

/// The component that stands for the light's polarization, and for its conjugate, where both are left open.
const LIGHT: &str = "light";
const CONJUGATE: &str = "_conj";

const TENSOR_FORM: &str = "ranks, as in `tensor(orbital=1, spin=1, total=0)`, and if known `parity=odd`, `adjoint=hermitian`, `spins=antisymmetric`";

/// Whether a word behind `_` is a component whatever names are bound.
fn is_component(name: &str) -> bool {
    matches!(name, "x" | "y" | "z") || super::indices::is_index(name) || name.parse::<i32>().is_ok()
}

impl Resolver<'_> {
    /// The entry that should have declared the polarization a component names, had it not failed.
    pub(super) fn broken_direction(&self, component: &str) -> Option<usize> {
        let name = component.strip_suffix(CONJUGATE).unwrap_or(component);
        if is_component(name) { None } else { self.names.broken.get(name).copied() }
    }

    /// The direction a component names: a polarization declared above, or the light's, or the conjugate of either.
    pub(super) fn direction(&self, component: &str) -> Option<Direction> {
        let (name, conjugate) = match component.strip_suffix(CONJUGATE) {
            Some(name) => (name, true),
            None => (component, false),
        };
        if is_component(name) {
            return None;
        }
        match self.names.bound.get(name) {
            Some(Binding::Polarization(fixed)) if conjugate => Some(Direction::Fixed(fixed.conj())),
            Some(Binding::Polarization(fixed)) => Some(Direction::Fixed(fixed.clone())),
            _ if name == LIGHT && conjugate => Some(Direction::LightConjugate),
            _ if name == LIGHT => Some(Direction::Light),
            _ => None,
        }
    }

    /// `tensor(orbital=1, spin=1, total=0)`, with a component behind it unless it is a scalar.
    pub(super) fn tensor(&self, arguments: &[Argument], subscript: Option<&str>, span: Span) -> Resolved<Meaning> {
        let form = |at: Span| self.fault(at, Fault::ArgumentForm { name: "tensor".into(), wanted: TENSOR_FORM.into() });
        let (mut ranks, mut odd, mut adjoint, mut exchange) = ([None; 3], None, None, None);
        for argument in arguments {
            let Argument::Named { name, value } = argument else { return form(span) };
            let word = match &value.kind {
                ExprKind::Name(word) => word.as_str(),
                _ => "",
            };
            let twice = match (name.text.as_str(), word) {
                ("orbital", _) => ranks[0].replace(self.rank(name, value)?).is_some(),
                ("spin", _) => ranks[1].replace(self.rank(name, value)?).is_some(),
                ("total", _) => ranks[2].replace(self.rank(name, value)?).is_some(),
                ("parity", "even") => odd.replace(false).is_some(),
                ("parity", "odd") => odd.replace(true).is_some(),
                ("adjoint", "hermitian") => adjoint.replace(Sign::Plus).is_some(),
                ("adjoint", "antihermitian") => adjoint.replace(Sign::Minus).is_some(),
                ("spins", "symmetric") => exchange.replace(SpinExchange::Symmetric).is_some(),
                ("spins", "antisymmetric") => exchange.replace(SpinExchange::Antisymmetric).is_some(),
                _ => return form(name.span.to(value.span)),
            };
            if twice {
                let message = format!("`{}` is given twice", name.text);
                return self.fault(name.span, Fault::Other { message, help: "give it once".into() });
            }
        }
        let [Some(orbital), Some(spin), Some(total)] = ranks else { return form(span) };
        let tensor = Tensor::new("", orbital, spin, total)
            .or_else(|error| self.fault(span, Fault::Other { message: error.to_string(), help: error.help() }))?;
        let mut tensor = if odd == Some(true) { tensor.odd() } else { tensor };
        if let Some(sign) = adjoint {
            tensor = tensor.with_adjoint(sign);
        }
        if let Some(exchange) = exchange {
            tensor = tensor.with_exchange(exchange);
        }
        let term = TensorTerm { tensor, component: None, along: None };
        match subscript {
            None => Ok(Meaning::Operator(self.term(OperatorNode::Tensor(term), span))),
            Some(component) => self.tensor_component(&term, component, span),
        }
    }

    fn rank(&self, name: &Name, value: &Expr) -> Resolved<u32> {
        let number = match &value.kind {
            ExprKind::Number(text) => text.parse().ok(),
            _ => None,
        };
        number.map_or_else(
            || {
                let message = format!("the rank `{}` is a small whole number", name.text);
                self.fault(value.span, Fault::Other { message, help: format!("write for instance `{}=1`", name.text) })
            },
            Ok,
        )
    }

    /// A component of an operator known by its ranks: `V_0`, `V_+1`, of a vector also `V_z`, `V_i` and `V_eps`.
    pub(super) fn tensor_component(&self, term: &TensorTerm, component: &str, span: Span) -> Resolved<Meaning> {
        let rank = term.tensor.total;
        let numbered = component.parse::<i32>().is_ok_and(|q| q.unsigned_abs() <= rank);
        let along = if numbered { None } else { self.direction(component) };
        let cartesian = matches!(component, "x" | "y" | "z") || super::indices::is_index(component);
        if !numbered && !(rank == 1 && (along.is_some() || cartesian)) {
            let message = format!("an operator of rank {rank} has no component {component}");
            let help = match rank {
                0 => "a scalar is written without component".to_string(),
                1 => "write _0, _+1, _-1, or _x, _y, _z, or a polarization".to_string(),
                _ => format!("components run from -{rank} to {rank}: _0, _+1, …"),
            };
            return self.fault(span, Fault::Other { message, help });
        }
        let term = TensorTerm { component: Some(component.into()), along, ..term.clone() };
        Ok(Meaning::Operator(self.term(OperatorNode::Tensor(term), span)))
    }

    /// `V_0` where V is defined as a tensor.
    pub(super) fn component_of_tensor(&self, base: &str, component: &str, span: Span) -> Option<Resolved<Meaning>> {
        let Some(Binding::Definition(definition)) = self.names.bound.get(base) else { return None };
        let Meaning::Operator(body) = &definition.body else { return None };
        let OperatorNode::Tensor(term) = &*body.node else { return None };
        (term.component.is_none()).then(|| self.tensor_component(term, component, span))
    }

    /// `coupled(L, S, 2)_0`: the component of [A B]^K of two vectors, each named without component.
    pub(super) fn coupled(&mut self, arguments: &[Argument], subscript: Option<&str>, span: Span) -> Resolved<Meaning> {
        let form = |at: Span| {
            let wanted = "two vectors, the rank they are coupled to, and a component, as in `coupled(L, S, 2)_0`";
            self.fault(at, Fault::ArgumentForm { name: "coupled".into(), wanted: wanted.into() })
        };
        let [
            Argument::Positional(Expr { kind: ExprKind::Name(first), span: at_first }),
            Argument::Positional(Expr { kind: ExprKind::Name(second), span: at_second }),
            Argument::Positional(Expr { kind: ExprKind::Number(rank), span: at_rank }),
        ] = arguments
        else {
            return form(span);
        };
        let (Ok(rank), Some(Ok(q))) = (rank.parse::<u32>(), subscript.map(str::parse::<i32>)) else {
            return form(at_rank.to(span));
        };
        if rank > 2 || q.unsigned_abs() > rank {
            let message = format!("two vectors do not couple to rank {rank} with component {q}");
            let help = "the rank is 0, 1 or 2, the component between -rank and rank";
            return self.fault(span, Fault::Other { message, help: help.into() });
        }
        let parts = coupled_components(1, 1, rank, q)
            .or_else(|error| self.fault(span, Fault::Other { message: error.to_string(), help: error.help() }))?;
        let mut terms = Vec::with_capacity(parts.len());
        for (p, r, coefficient) in parts {
            let left = self.vector_component(first, p, *at_first)?;
            let right = self.vector_component(second, r, *at_second)?;
            let shown = coefficient.to_string();
            let number = Term::new(ScalarNode::Exact(coefficient), self.place(span), shown.as_str());
            let number = self.identity_multiple(number);
            let text = format!("({shown}) {} {}", left.text, right.text);
            terms.push(Term::new(OperatorNode::Product(vec![number, left, right]), self.place(span), text));
        }
        Ok(Meaning::Operator(self.term(OperatorNode::Sum(terms), span)))
    }

    /// The component q of a vector that is named alone.
    fn vector_component(&mut self, vector: &str, q: i32, span: Span) -> Resolved<OperatorTerm> {
        let name = if q == 0 { format!("{vector}_0") } else { format!("{vector}_{q:+}") };
        let meaning = self.resolve(&Expr { kind: ExprKind::Name(name.clone()), span })?;
        match meaning {
            Meaning::Operator(term) => Ok(Term { text: name.into(), ..term }),
            other => self.fault(span, Fault::WrongKind { wanted: Kind::Operator, got: other.kind() }),
        }
    }

    /// The polarization a declaration describes: `linear(0, 0, 1)`, `circular(1)`, `jones(1, i)`.
    pub fn polarization(&mut self, name: &Name, body: &Expr) -> Resolved<Polarization> {
        if is_component(&name.text) || name.text == LIGHT || name.text.ends_with(CONJUGATE) {
            let message = format!("`D_{}` has a meaning of its own", name.text);
            return self
                .fault(name.span, Fault::Other { message, help: "choose another name, as eps or sigma".into() });
        }
        let wanted = "`linear(x, y, z)`, `circular(1)`, `circular(-1)` or `jones(e_x, e_y)`";
        let ExprKind::Call { name, arguments, subscript: None } = &body.kind else {
            return self.fault(body.span, Fault::ArgumentForm { name: "polarization".into(), wanted: wanted.into() });
        };
        let numbers = self.positional(&name.text, arguments, body.span)?;
        let mut values = Vec::with_capacity(numbers.len());
        for number in &numbers {
            values.push(self.exact(number)?);
        }
        let made = match (name.text.as_str(), values.as_slice()) {
            ("linear", [x, y, z]) if values.iter().all(Surd::is_real) => {
                Polarization::new([x.clone(), y.clone(), z.clone()])
            }
            ("linear", [_, _, _]) => {
                return self.fault(
                    body.span,
                    Fault::Other {
                        message: "the direction of linear polarization is real".into(),
                        help: "elliptic light along z is `jones(e_x, e_y)`".into(),
                    },
                );
            }
            ("circular", [helicity]) if helicity.is_one() => Ok(Polarization::sigma_plus()),
            ("circular", [helicity]) if (-helicity).is_one() => Ok(Polarization::sigma_minus()),
            ("jones", [x, y]) => Polarization::jones(x.clone(), y.clone()),
            _ => {
                return self
                    .fault(body.span, Fault::ArgumentForm { name: "polarization".into(), wanted: wanted.into() });
            }
        };
        made.or_else(|error| {
            self.fault(
                body.span,
                Fault::Other {
                    message: error.to_string(),
                    help: "give components whose squares add up to a rational number, as linear(1, 1, 0)".into(),
                },
            )
        })
    }

    /// A number that is exact without any system.
    fn exact(&mut self, expr: &Expr) -> Resolved<Surd> {
        let term = self.scalar(expr)?;
        match Expander::new(&Effort::new()).expand(&term)?.as_number() {
            Some(value) => Ok(value),
            None => self.fault(
                expr.span,
                Fault::Other {
                    message: format!("`{}` is not an exact number", term.text),
                    help: "write whole numbers, fractions, square roots and i".into(),
                },
            ),
        }
    }
}
