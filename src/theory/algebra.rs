//! Sums, products, quotients and powers of resolved expressions: what may stand next to what.

use super::dimensions::{Known, known};
use super::problem::{Fault, Kind, Problem};
use super::resolve::{Resolved, Resolver};
use super::terms::*;
use crate::lang::tree::{Expr, ExprKind, Operation, Span};
use crate::num::Surd;

impl Resolver<'_> {
    /// A chain of additions and subtractions, taken apart from the left without recursion.
    pub(super) fn sum(&mut self, expr: &Expr) -> Resolved<Meaning> {
        let mut operands = Vec::new();
        let mut rest = expr;
        while let ExprKind::Binary { operation: operation @ (Operation::Add | Operation::Subtract), left, right } =
            &rest.kind
        {
            operands.push((*operation, right.as_ref()));
            rest = left;
        }
        operands.push((Operation::Add, rest));
        operands.reverse();
        let mut terms = Vec::with_capacity(operands.len());
        for (operation, operand) in operands {
            let meaning = self.resolve(operand)?;
            terms.push(match operation {
                Operation::Subtract => self.negate(meaning, operand.span)?,
                _ => meaning,
            });
        }
        self.add(terms, expr.span)
    }

    fn add(&mut self, terms: Vec<Meaning>, span: Span) -> Resolved<Meaning> {
        let first = terms.iter().map(Meaning::kind).find(|kind| *kind != Kind::Number).unwrap_or(Kind::Number);
        if let Some(other) = terms
            .iter()
            .map(Meaning::kind)
            .find(|kind| *kind != first && !(*kind == Kind::Number && first == Kind::Operator) || *kind == Kind::Bra)
        {
            return self.fault(span, Fault::CannotCombine { left: first, right: other, action: "added" });
        }
        Ok(match first {
            Kind::Number => {
                let scalars = terms.into_iter().filter_map(|t| match t {
                    Meaning::Scalar(s) => Some(s),
                    _ => None,
                });
                let scalars: Vec<ScalarTerm> = scalars.collect();
                self.check_sum(&scalars.iter().collect::<Vec<_>>(), false)?;
                Meaning::Scalar(self.term(ScalarNode::Sum(scalars), span))
            }
            Kind::Ket => {
                let kets = terms.into_iter().filter_map(|t| match t {
                    Meaning::Ket(k) => Some(k),
                    _ => None,
                });
                let kets: Vec<KetTerm> = kets.collect();
                let systems: Vec<&str> = kets.iter().filter_map(system_of).collect();
                if let Some(other) = systems.iter().find(|s| **s != systems[0]) {
                    return self.fault(
                        span,
                        Fault::Other {
                            message: format!("kets of two systems, {} and {other}, are added", systems[0]),
                            help: "take all of them from one system".into(),
                        },
                    );
                }
                Meaning::Ket(self.term(KetNode::Sum(kets), span))
            }
            _ => {
                let operators = terms.into_iter().filter_map(|t| match t {
                    Meaning::Operator(o) => Some(o),
                    Meaning::Scalar(s) => Some(self.identity_multiple(s)),
                    _ => None,
                });
                let operators: Vec<OperatorTerm> = operators.collect();
                let numbers = operators.iter().filter_map(|o| match &*o.node {
                    OperatorNode::Scalar(number) => Some(number),
                    _ => None,
                });
                let with_hamiltonian = operators.iter().any(is_hamiltonian);
                self.check_sum(&numbers.collect::<Vec<_>>(), with_hamiltonian)?;
                Meaning::Operator(self.term(OperatorNode::Sum(operators), span))
            }
        })
    }

    pub(super) fn negate(&mut self, meaning: Meaning, span: Span) -> Resolved<Meaning> {
        Ok(match meaning {
            Meaning::Scalar(inner) => {
                let text = format!("-({})", inner.text);
                Meaning::Scalar(Term::new(ScalarNode::Negated(inner), self.place(span), text))
            }
            Meaning::Operator(inner) => {
                let minus = self.identity_multiple(self.minus_one(span));
                let text = format!("-({})", inner.text);
                Meaning::Operator(Term::new(OperatorNode::Product(vec![minus, inner]), self.place(span), text))
            }
            Meaning::Ket(inner) => {
                let text = format!("-({})", inner.text);
                Meaning::Ket(Term::new(KetNode::Scaled(self.minus_one(span), inner), self.place(span), text))
            }
            Meaning::Bra(bra) => {
                let minus = Meaning::Scalar(self.minus_one(span));
                self.multiply(minus, Meaning::Bra(bra), span)?
            }
        })
    }

    fn number(&self, value: i64, span: Span) -> ScalarTerm {
        Term::new(ScalarNode::Exact(Surd::from(value)), self.place(span), value.to_string())
    }

    fn minus_one(&self, span: Span) -> ScalarTerm {
        self.number(-1, span)
    }

    /// A chain of products and quotients, left to right, taken apart without recursion.
    pub(super) fn product(&mut self, expr: &Expr) -> Resolved<Meaning> {
        let mut factors = Vec::new();
        let mut rest = expr;
        while let ExprKind::Binary {
            operation: operation @ (Operation::Multiply | Operation::Juxtapose | Operation::Divide),
            left,
            right,
        } = &rest.kind
        {
            factors.push((*operation, right.as_ref()));
            rest = left;
        }
        factors.reverse();
        let (mut product, mut next) = match self.number_with_unit(rest, &factors)? {
            Some(found) => found,
            None => (self.resolve(rest)?, 0),
        };
        while let Some((operation, factor)) = factors.get(next) {
            let span = Span::new(expr.span.start, factor.span.end);
            if let Some((value, count)) = self.value_in_units(&product, &factors[next..], span)? {
                (product, next) = (value, next + count);
                continue;
            }
            let number = match operation {
                Operation::Divide => None,
                _ => self.number_with_unit(factor, &factors[next + 1..])?,
            };
            let (factor, count) = match (operation, number) {
                (_, Some((number, count))) => (number, count),
                (Operation::Divide, None) => (self.inverse(factor, 1)?, 0),
                (_, None) => match self.resolve(factor) {
                    Err(problem) => {
                        let before = if next == 0 { rest } else { factors[next - 1].1 };
                        return Err(self.unit_meant(before, factor).unwrap_or(problem));
                    }
                    Ok(meaning) => (meaning, 0),
                },
            };
            product = self.multiply(product, factor, span)?;
            next += 1 + count;
        }
        Ok(product)
    }

    /// Behind a number an unknown name is a misspelt unit, where one is close.
    fn unit_meant(&self, before: &Expr, factor: &Expr) -> Option<Problem> {
        let (ExprKind::Number(_) | ExprKind::Measured { .. }, ExprKind::Name(name)) = (&before.kind, &factor.kind)
        else {
            return None;
        };
        let near = crate::num::units::near(name).filter(|_| !self.names.bound.contains_key(name))?;
        let fault = Fault::UnknownName { name: name.clone(), near: Some(near) };
        Some(Problem::new(self.place(factor.span), fault))
    }

    fn multiply(&mut self, left: Meaning, right: Meaning, span: Span) -> Resolved<Meaning> {
        Ok(match (left, right) {
            (Meaning::Scalar(a), Meaning::Scalar(b)) => {
                let factors = match &*a.node {
                    ScalarNode::Product(list) => list.iter().cloned().chain([b]).collect(),
                    _ => vec![a, b],
                };
                Meaning::Scalar(self.joined(ScalarNode::Product, factors, span))
            }
            (Meaning::Scalar(a), Meaning::Operator(b)) => {
                let a = self.identity_multiple(a);
                self.operators(a, b, span)
            }
            (Meaning::Operator(a), Meaning::Scalar(b)) => {
                let b = self.identity_multiple(b);
                self.operators(a, b, span)
            }
            (Meaning::Operator(a), Meaning::Operator(b)) => self.operators(a, b, span),
            (Meaning::Operator(a), Meaning::Ket(b)) => {
                let text = format!("({}) ({})", a.text, b.text);
                Meaning::Ket(Term::new(KetNode::Applied(a, b), self.place(span), text))
            }
            (Meaning::Scalar(a), Meaning::Ket(b)) | (Meaning::Ket(b), Meaning::Scalar(a)) => {
                let text = format!("({}) ({})", a.text, b.text);
                Meaning::Ket(Term::new(KetNode::Scaled(a, b), self.place(span), text))
            }
            (Meaning::Bra(mut bra), Meaning::Operator(operator)) => {
                bra.chain.push(operator);
                Meaning::Bra(bra)
            }
            (Meaning::Bra(mut bra), Meaning::Scalar(factor)) | (Meaning::Scalar(factor), Meaning::Bra(mut bra)) => {
                bra.factor = Some(match bra.factor.take() {
                    None => factor,
                    Some(earlier) => self.joined(ScalarNode::Product, vec![earlier, factor], span),
                });
                Meaning::Bra(bra)
            }
            (Meaning::Bra(bra), Meaning::Ket(ket)) => {
                let operator = match bra.chain.len() {
                    0 => None,
                    1 => bra.chain.first().cloned(),
                    _ => Some(self.joined(OperatorNode::Product, bra.chain, span)),
                };
                let bracket = self.bracket(bra.bra, operator, ket, span)?;
                let bracket = self.term(ScalarNode::Bracket(bracket), span);
                Meaning::Scalar(match bra.factor {
                    None => bracket,
                    Some(factor) => self.joined(ScalarNode::Product, vec![factor, bracket], span),
                })
            }
            (Meaning::Ket(ket), Meaning::Bra(bra)) if bra.chain.is_empty() && bra.factor.is_none() => {
                let text = format!("|{}><{}|", ket.text, bra.bra.text);
                Meaning::Operator(Term::new(OperatorNode::Dyad(ket, bra.bra), self.place(span), text))
            }
            (left, right) => {
                return self.fault(
                    span,
                    Fault::CannotCombine { left: left.kind(), right: right.kind(), action: "multiplied in this order" },
                );
            }
        })
    }

    fn operators(&self, a: OperatorTerm, b: OperatorTerm, span: Span) -> Meaning {
        let factors = match &*a.node {
            OperatorNode::Product(list) => list.iter().cloned().chain([b]).collect(),
            _ => vec![a, b],
        };
        Meaning::Operator(self.joined(OperatorNode::Product, factors, span))
    }

    /// A node made of several terms; its text is theirs, so that it identifies it wherever it was put together.
    fn joined<N, M>(&self, node: impl Fn(Vec<Term<M>>) -> N, parts: Vec<Term<M>>, span: Span) -> Term<N> {
        let text = parts.iter().map(|part| format!("({})", part.text)).collect::<Vec<_>>().join(" ");
        Term::new(node(parts), self.place(span), text)
    }

    /// 1 over an expression, to a power.
    fn inverse(&mut self, denominator: &Expr, power: u32) -> Resolved<Meaning> {
        let span = denominator.span;
        match &denominator.kind {
            ExprKind::Primed(inner) => {
                let meaning = self.resolve(inner)?;
                let Meaning::Operator(operator) = meaning else {
                    return self.fault(span, Fault::MisplacedPrime);
                };
                self.resolvent(&operator, true, power, span)
            }
            ExprKind::Binary { operation: Operation::Power, left, right } => match (whole_number(right), &left.kind) {
                (Some(exponent), ExprKind::Primed(_)) if exponent > 0 => {
                    let power = self.checked_power(power, exponent, span)?;
                    self.inverse(left, power)
                }
                (Some(exponent), _) if exponent > 0 => match self.resolve(left)? {
                    Meaning::Scalar(_) => self.inverse_of_meaning(denominator, power),
                    _ => {
                        let power = self.checked_power(power, exponent, span)?;
                        self.inverse(left, power)
                    }
                },
                _ => self.inverse_of_meaning(denominator, power),
            },
            ExprKind::Binary { operation: Operation::Multiply | Operation::Juxtapose, left, right }
                if !self.ends_in_unit(right) =>
            {
                // 1/(A B) = 1/B 1/A
                let right = self.inverse(right, power)?;
                let left = self.inverse(left, power)?;
                self.multiply(right, left, span)
            }
            _ => self.inverse_of_meaning(denominator, power),
        }
    }

    fn checked_power(&self, power: u32, exponent: i64, span: Span) -> Resolved<u32> {
        u32::try_from(exponent)
            .ok()
            .and_then(|exponent| power.checked_mul(exponent))
            .filter(|power| *power <= OPERATOR_POWER_LIMIT)
            .map_or_else(|| self.fault(span, power_limit()), Ok)
    }

    fn inverse_of_meaning(&mut self, denominator: &Expr, power: u32) -> Resolved<Meaning> {
        let span = denominator.span;
        match self.resolve(denominator)? {
            Meaning::Scalar(scalar) => {
                let text = format!("1/({})^{power}", scalar.text);
                let mut inverse = Term::new(ScalarNode::Quotient(self.number(1, span), scalar), self.place(span), text);
                if power > 1 {
                    let text = inverse.text.clone();
                    let exponent = self.number(i64::from(power), span);
                    inverse = Term::new(ScalarNode::Power(inverse, exponent), self.place(span), text);
                }
                Ok(Meaning::Scalar(inverse))
            }
            Meaning::Operator(operator) => match &*operator.node {
                OperatorNode::Atom(atom) => {
                    let inverse = AtomTerm { power: -atom.power.saturating_mul(i64::from(power)), ..atom.clone() };
                    let text = format!("1/({})^{power}", operator.text);
                    Ok(Meaning::Operator(Term::new(OperatorNode::Atom(inverse), self.place(span), text)))
                }
                _ => self.resolvent(&operator, false, power, span),
            },
            other => {
                self.fault(span, Fault::CannotCombine { left: Kind::Number, right: other.kind(), action: "divided" })
            }
        }
    }

    /// The resolvent whose denominator is this operator.
    fn resolvent(&mut self, operator: &OperatorTerm, primed: bool, power: u32, span: Span) -> Resolved<Meaning> {
        let linear = self.linear_part(operator, primed, span)?;
        let text = format!("1/({}){}{}", operator.text, if primed { "'" } else { "" }, self.left_out_text());
        let resolvent = Term::new(OperatorNode::Resolvent(linear), self.place(span), text.clone());
        Ok(Meaning::Operator(if power == 1 {
            resolvent
        } else {
            Term::new(OperatorNode::Power(resolvent, power), self.place(span), format!("{text}^{power}"))
        }))
    }

    fn linear_part(&mut self, operator: &OperatorTerm, primed: bool, span: Span) -> Resolved<LinearInH> {
        let Some((constant, slope)) = self.linear(operator) else {
            return self.fault(span, Fault::DenominatorNotLinear);
        };
        let Some(slope) = slope else { return self.fault(span, Fault::DivisionByOperator) };
        let constant = constant.unwrap_or_else(|| self.number(0, span));
        let mut omitted = self.left_out();
        if primed {
            let mut energies: Vec<&StateTerm> = Vec::new();
            energies_in(&constant, &mut energies);
            let mut different: Vec<&StateTerm> = Vec::new();
            for state in energies {
                if !different.iter().any(|d| d.system == state.system && d.label.text == state.label.text) {
                    different.push(state);
                }
            }
            let [state] = different.as_slice() else {
                return self.fault(span, Fault::PrimeWithoutEnergy { found: different.len() });
            };
            omitted.push(OmittedTerm::LevelOf((*state).clone()));
        }
        Ok(LinearInH { constant, slope, omitted })
    }

    /// f(a + b H)
    pub(super) fn function_of_h(
        &mut self,
        function: ScalarFunction,
        operator: &OperatorTerm,
        span: Span,
    ) -> Resolved<Meaning> {
        if !matches!(function, ScalarFunction::Ln | ScalarFunction::Sqrt | ScalarFunction::Exp) {
            return self.fault(
                span,
                Fault::Other {
                    message: "this function is not taken of operators".into(),
                    help: "functions of H are fractions, powers, ln, sqrt and exp".into(),
                },
            );
        }
        let linear = self.linear_part(operator, false, span)?;
        Ok(Meaning::Operator(self.term(OperatorNode::Function(function, linear), span)))
    }

    /// Splits an operator into constant + slope H, if it is of that form.
    fn linear(&self, operator: &OperatorTerm) -> Option<(Option<ScalarTerm>, Option<ScalarTerm>)> {
        let span = operator.place.span;
        match &*operator.node {
            OperatorNode::Scalar(scalar) => Some((Some(scalar.clone()), None)),
            OperatorNode::Hamiltonian => Some((None, Some(self.number(1, span)))),
            OperatorNode::Sum(terms) => {
                let (mut constants, mut slopes) = (Vec::new(), Vec::new());
                for term in terms {
                    let (constant, slope) = self.linear(term)?;
                    constants.extend(constant);
                    slopes.extend(slope);
                }
                let join = |list: Vec<ScalarTerm>| match list.len() {
                    0 => None,
                    1 => list.into_iter().next(),
                    _ => {
                        let text = list.iter().map(|t| format!("({})", t.text)).collect::<Vec<_>>().join(" + ");
                        Some(Term::new(ScalarNode::Sum(list), self.place(span), text))
                    }
                };
                Some((join(constants), join(slopes)))
            }
            OperatorNode::Product(factors) => {
                let mut scale: Vec<ScalarTerm> = Vec::new();
                let mut found = None;
                for factor in factors {
                    match (self.linear(factor)?, &found) {
                        ((Some(constant), None), _) => scale.push(constant),
                        (pair, None) => found = Some(pair),
                        _ => return None,
                    }
                }
                let scaled = |inner: Option<ScalarTerm>| {
                    inner.map(|inner| {
                        let list: Vec<_> = scale.iter().cloned().chain([inner]).collect();
                        if list.len() == 1 { list[0].clone() } else { self.joined(ScalarNode::Product, list, span) }
                    })
                };
                match found {
                    None => Some((Some(self.joined(ScalarNode::Product, scale, span)), None)),
                    Some((constant, slope)) => Some((scaled(constant), scaled(slope))),
                }
            }
            OperatorNode::Call(call) if call.arguments.is_empty() => match &call.definition.body {
                Meaning::Operator(body) => self.linear(body),
                _ => None,
            },
            _ => None,
        }
    }

    pub(super) fn power(&mut self, base: &Expr, exponent: &Expr, span: Span) -> Resolved<Meaning> {
        if let ExprKind::Primed(_) = base.kind {
            return self.fault(span, Fault::MisplacedPrime);
        }
        match self.resolve(base)? {
            Meaning::Scalar(base) => {
                let exponent = self.scalar(exponent)?;
                self.check_power(&base, &exponent)?;
                Ok(Meaning::Scalar(self.term(ScalarNode::Power(base, exponent), span)))
            }
            Meaning::Operator(operator) => {
                let Some(exponent) = whole_number(exponent) else {
                    return self.fault(span, Fault::OperatorPower);
                };
                match &*operator.node {
                    OperatorNode::Atom(atom) => {
                        let power = atom.power.saturating_mul(exponent);
                        let atom = AtomTerm { power, ..atom.clone() };
                        Ok(Meaning::Operator(self.term(OperatorNode::Atom(atom), span)))
                    }
                    _ if exponent >= 1 && exponent <= i64::from(OPERATOR_POWER_LIMIT) => {
                        let power = u32::try_from(exponent).unwrap_or(OPERATOR_POWER_LIMIT);
                        Ok(Meaning::Operator(self.term(OperatorNode::Power(operator, power), span)))
                    }
                    _ if exponent > i64::from(OPERATOR_POWER_LIMIT) => self.fault(span, power_limit()),
                    _ => self.fault(span, Fault::OperatorPower),
                }
            }
            other => self.fault(
                span,
                Fault::CannotCombine { left: other.kind(), right: Kind::Number, action: "raised to a power" },
            ),
        }
    }
}

/// Longest power of an operator: every unit of it is an application to a ket.
const OPERATOR_POWER_LIMIT: u32 = 1000;

fn power_limit() -> Fault {
    Fault::Other {
        message: format!("an operator is raised to a power above {OPERATOR_POWER_LIMIT}"),
        help: "each power is one more application; chains of this length are not evaluated".into(),
    }
}

/// Whether an operator is H times a plain number, as it stands: definitions are not looked into.
fn is_hamiltonian(operator: &OperatorTerm) -> bool {
    match &*operator.node {
        OperatorNode::Hamiltonian => true,
        OperatorNode::Product(factors) => match factors.as_slice() {
            [scale, rest] => {
                matches!(&*scale.node, OperatorNode::Scalar(number) if known(number) == Known::Number)
                    && is_hamiltonian(rest)
            }
            _ => false,
        },
        _ => false,
    }
}

/// The whole number an exponent is written as, if it is.
pub(super) fn whole_number(expr: &Expr) -> Option<i64> {
    match &expr.kind {
        ExprKind::Number(text) => text.parse().ok(),
        ExprKind::Negate(inner) => whole_number(inner).map(|n: i64| -n),
        _ => None,
    }
}

/// The states whose energies stand in a number, as far as they are written there.
fn energies_in<'t>(term: &'t ScalarTerm, found: &mut Vec<&'t StateTerm>) {
    match &*term.node {
        ScalarNode::Energy(state) => found.push(state),
        ScalarNode::Sum(list) | ScalarNode::Product(list) => list.iter().for_each(|t| energies_in(t, found)),
        ScalarNode::Negated(inner) => energies_in(inner, found),
        ScalarNode::Quotient(a, b) => {
            energies_in(a, found);
            energies_in(b, found);
        }
        ScalarNode::Call(call) => {
            if let Meaning::Scalar(body) = &call.definition.body {
                energies_in(body, found);
            }
        }
        _ => {}
    }
}
