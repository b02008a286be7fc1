//! `formula`: an expression expanded in the session's own notation.
//!
//! Definitions are put in, products are multiplied out, numbers are gathered in front, and like terms are merged. The result reads back as an
//! expression with the same value.

use super::names::Binding;
use super::problem::{Fault, Kind, Problem};
use super::resolve::Resolver;
use super::unit_words::{grouped, number_of_quantity};
use crate::lang::tree::{
    Argument, DefinitionKind, Expr, ExprKind, LabelPart, Name, Operation, Span, StateRef, StateRefKind,
};
use crate::num::decimal;
use rug::Rational;
use std::collections::BTreeMap;

/// Largest number of terms an expansion may have.
const TERM_LIMIT: usize = 10_000;

/// Most parts of an expression with all definitions put in.
const PART_LIMIT: usize = 100_000;

/// Deepest nesting of definitions put into each other.
const DEPTH_LIMIT: usize = 100;

/// A product: a rational number in front of factors in their order.
#[derive(Clone)]
struct Monomial {
    number: Rational,
    /// Numbers: letters, brackets, functions; they commute.
    scalars: Vec<Expr>,
    /// Operators, in order.
    operators: Vec<Expr>,
}

/// The expansion of a scalar expression, as text.
///
/// Errors: what the expression itself has wrong, or an expansion of more than 10,000 terms.
pub fn expanded(resolver: &mut Resolver<'_>, expression: &Expr) -> Result<String, Problem> {
    resolver.scalar(expression)?;
    let mut expansion = Expansion { resolver, depth: 0, parts: 0, at: expression.span };
    let inlined = expansion.inline(expression, &BTreeMap::new())?;
    let terms = expansion.multiply_out(&inlined)?;
    let merged = merge(terms);
    Ok(written(merged))
}

struct Expansion<'x, 'r> {
    resolver: &'x mut Resolver<'r>,
    depth: usize,
    /// Parts put in so far.
    parts: usize,
    at: Span,
}

type Arguments = BTreeMap<String, Expr>;

fn expr(kind: ExprKind) -> Expr {
    Expr { kind, span: Span::default() }
}

fn binary(operation: Operation, left: Expr, right: Expr) -> Expr {
    expr(ExprKind::Binary { operation, left: Box::new(left), right: Box::new(right) })
}

impl Expansion<'_, '_> {
    fn refuse<T>(&self, message: String, help: &str) -> Result<T, Problem> {
        let fault = Fault::Other { message, help: help.into() };
        Err(Problem::new(self.resolver.place(self.at), fault))
    }

    /// Puts the bodies of definitions in place of their names.
    fn inline(&mut self, e: &Expr, arguments: &Arguments) -> Result<Expr, Problem> {
        self.parts += 1;
        if self.parts > PART_LIMIT {
            return self.refuse(
                format!("written out, the expression has more than {PART_LIMIT} parts"),
                "expand a part of it, or evaluate it as it stands",
            );
        }
        let inner = |this: &mut Self, part: &Expr| this.inline(part, arguments);
        Ok(match &e.kind {
            ExprKind::Name(name) => match (arguments.get(name), self.resolver.names.bound.get(name)) {
                (Some(argument), _) => argument.clone(),
                (None, Some(Binding::Definition(definition))) if definition.kind != DefinitionKind::Ket => {
                    let definition = definition.clone();
                    self.enter(&definition.written, &Arguments::new())?
                }
                _ => expr(e.kind.clone()),
            },
            ExprKind::Call { name, arguments: given, subscript } => {
                let bound = self.with_bound_variables(given, arguments);
                let arguments = &bound;
                let mut put = Vec::with_capacity(given.len());
                for argument in given {
                    put.push(self.inline_argument(argument, arguments)?);
                }
                match self.resolver.names.bound.get(&name.text) {
                    Some(Binding::Definition(definition)) => {
                        let definition = definition.clone();
                        let values = put.iter().filter_map(|argument| match argument {
                            Argument::Positional(value) => Some(value.clone()),
                            _ => None,
                        });
                        let inside = definition.parameters.iter().cloned().zip(values).collect();
                        self.enter(&definition.written, &inside)?
                    }
                    _ => expr(ExprKind::Call { name: name.clone(), arguments: put, subscript: subscript.clone() }),
                }
            }
            ExprKind::Negate(part) => expr(ExprKind::Negate(Box::new(inner(self, part)?))),
            ExprKind::Primed(part) => expr(ExprKind::Primed(Box::new(inner(self, part)?))),
            ExprKind::Without { body, manifold } => {
                expr(ExprKind::Without { body: Box::new(inner(self, body)?), manifold: manifold.clone() })
            }
            ExprKind::Binary { operation, left, right } => {
                let (left, right) = (inner(self, left)?, inner(self, right)?);
                binary(*operation, left, right)
            }
            ExprKind::Bracket { bra, chain, ket } => {
                let chain = chain.as_deref().map(|chain| inner(self, chain)).transpose()?;
                let (opened, left) = self.open_ket(bra, arguments)?;
                // A chain reads the same from the other end only if its factors are Hermitian; otherwise the bra keeps its name.
                let (bra, left) = match left {
                    Some(operators) if !is_plainly_hermitian(&operators) => {
                        (self.with_arguments(bra, arguments)?, None)
                    }
                    left => (opened, left),
                };
                let (ket, right) = self.open_ket(ket, arguments)?;
                // <u| with |u> = X|g> is <g|X^+: only chains of Hermitian factors can be turned round in this notation.
                let left = left.map(|operators| reversed(&operators));
                let parts: Vec<Expr> = [left, chain, right].into_iter().flatten().collect();
                let chain = parts.into_iter().reduce(|a, b| binary(Operation::Juxtapose, a, b));
                expr(ExprKind::Bracket { bra, chain: chain.map(Box::new), ket })
            }
            _ => expr(e.kind.clone()),
        })
    }

    /// The arguments with variables of a range standing for themselves; a variable that an argument mentions gets another name.
    fn with_bound_variables(&self, given: &[Argument], arguments: &Arguments) -> Arguments {
        let mut bound = arguments.clone();
        for argument in given {
            let Argument::Range { variable, .. } = argument else { continue };
            let taken = |name: &str| {
                arguments.values().any(|value| {
                    value.to_string().split(|c: char| !(c.is_alphanumeric() || c == '_')).any(|word| word == name)
                })
            };
            let mut name = variable.text.clone();
            while taken(&name) {
                name.push('1');
            }
            bound.insert(variable.text.clone(), expr(ExprKind::Name(name)));
        }
        bound
    }

    fn inline_argument(&mut self, argument: &Argument, arguments: &Arguments) -> Result<Argument, Problem> {
        Ok(match argument {
            Argument::Positional(value) => Argument::Positional(self.inline(value, arguments)?),
            Argument::Named { name, value } => {
                Argument::Named { name: name.clone(), value: self.inline(value, arguments)? }
            }
            Argument::Range { variable, from, to } => Argument::Range {
                variable: match arguments.get(&variable.text).map(|renamed| &renamed.kind) {
                    Some(ExprKind::Name(renamed)) => Name { text: renamed.clone(), span: variable.span },
                    _ => variable.clone(),
                },
                from: self.inline(from, arguments)?,
                to: self.inline(to, arguments)?,
            },
            Argument::At { variable, point } => {
                Argument::At { variable: variable.clone(), point: self.inline(point, arguments)? }
            }
            Argument::Level { .. } => argument.clone(),
        })
    }

    fn enter(&mut self, body: &Expr, arguments: &Arguments) -> Result<Expr, Problem> {
        self.depth += 1;
        if self.depth > DEPTH_LIMIT {
            return self.refuse(format!("definitions are nested deeper than {DEPTH_LIMIT}"), "expand a part of it");
        }
        let result = self.inline(body, arguments);
        self.depth -= 1;
        result
    }

    /// A bra or ket as an eigenstate and the operators in front of it.
    fn open_ket(&mut self, reference: &StateRef, arguments: &Arguments) -> Result<(StateRef, Option<Expr>), Problem> {
        let StateRefKind::Named { name, arguments: given } = &reference.kind else {
            return Ok((self.filled(reference, arguments), None));
        };
        let Some(Binding::Definition(definition)) = self.resolver.names.bound.get(&name.text) else {
            return Ok((reference.clone(), None));
        };
        let definition = definition.clone();
        let mut inside = Arguments::new();
        for (parameter, value) in definition.parameters.iter().zip(given) {
            let value = self.inline(value, arguments)?;
            inside.insert(parameter.clone(), value);
        }
        let body = self.enter(&definition.written, &inside)?;
        let mut factors = Vec::new();
        if !split_ket(&body, &mut factors) {
            return self.refuse(
                format!("the ket `{}` is a sum, and `formula` opens kets that are one product", name.text),
                "write the bracket with the operators of the ket in it",
            );
        }
        match factors.pop() {
            Some(Expr { kind: ExprKind::Ket(state), .. }) => {
                let (state, deeper) = self.open_ket(&state, &inside)?;
                let chain = factors.into_iter().chain(deeper).reduce(|a, b| binary(Operation::Juxtapose, a, b));
                Ok((state, chain))
            }
            _ => Ok((reference.clone(), None)),
        }
    }

    /// A named ket with its arguments put in.
    fn with_arguments(&mut self, reference: &StateRef, arguments: &Arguments) -> Result<StateRef, Problem> {
        let mut filled = reference.clone();
        if let StateRefKind::Named { arguments: given, .. } = &mut filled.kind {
            for value in given {
                *value = self.inline(value, arguments)?;
            }
        }
        Ok(filled)
    }

    /// A labelled state with the arguments put into the holes of its label.
    fn filled(&self, reference: &StateRef, arguments: &Arguments) -> StateRef {
        let mut filled = reference.clone();
        if let StateRefKind::Labelled { label, .. } = &mut filled.kind {
            for part in &mut label.parts {
                if let LabelPart::Computed(Expr { kind: ExprKind::Name(name), .. }) = part
                    && let Some(value) = arguments.get(name)
                {
                    *part = LabelPart::Computed(value.clone());
                }
            }
        }
        filled
    }

    fn is_operator(&mut self, e: &Expr) -> bool {
        // Inlined trees hold no text of the entry; only the kind is asked for.
        matches!(self.resolver.resolve(e).map(|meaning| meaning.kind()), Ok(Kind::Operator))
    }

    fn checked(&self, terms: Vec<Monomial>) -> Result<Vec<Monomial>, Problem> {
        if terms.len() > TERM_LIMIT {
            return self.refuse(
                format!("the expansion has more than {TERM_LIMIT} terms"),
                "expand a part of it, or evaluate it as it stands: evaluation does not multiply out",
            );
        }
        Ok(terms)
    }

    fn multiply_out(&mut self, e: &Expr) -> Result<Vec<Monomial>, Problem> {
        if number_of_quantity(e).is_some() {
            return Ok(vec![self.single(e.clone())]);
        }
        let e = &grouped(e);
        match &e.kind {
            ExprKind::Number(text) => {
                let number = decimal::parse_decimal(text).unwrap_or_default();
                Ok(vec![Monomial { number, scalars: Vec::new(), operators: Vec::new() }])
            }
            ExprKind::Negate(inner) => {
                let mut terms = self.multiply_out(inner)?;
                terms.iter_mut().for_each(|term| term.number *= -1);
                Ok(terms)
            }
            ExprKind::Binary { operation: operation @ (Operation::Add | Operation::Subtract), left, right } => {
                let mut terms = self.multiply_out(left)?;
                let mut others = self.multiply_out(right)?;
                if *operation == Operation::Subtract {
                    others.iter_mut().for_each(|term| term.number *= -1);
                }
                terms.append(&mut others);
                self.checked(terms)
            }
            ExprKind::Binary { operation: Operation::Multiply | Operation::Juxtapose, left, right } => {
                let (left, right) = (self.multiply_out(left)?, self.multiply_out(right)?);
                self.product(&left, &right)
            }
            ExprKind::Binary { operation: Operation::Divide, left, right } => {
                let numerator = self.multiply_out(left)?;
                let fraction = binary(Operation::Divide, number(1), (**right).clone());
                if self.is_operator(&fraction) {
                    let inverse = self.single(fraction);
                    return self.product(&numerator, &[inverse]);
                }
                let denominator = self.multiply_out(right).unwrap_or_default();
                let inverse = match denominator.as_slice() {
                    [only] if only.number != 0 && only.operators.is_empty() => {
                        let scalars = only.scalars.iter().map(|s| binary(Operation::Divide, number(1), s.clone()));
                        Monomial {
                            number: Rational::from(only.number.recip_ref()),
                            scalars: scalars.collect(),
                            operators: Vec::new(),
                        }
                    }
                    _ => self.single(fraction),
                };
                self.product(&numerator, &[inverse])
            }
            ExprKind::Binary { operation: Operation::Power, left, right } => {
                let exponent = match &right.kind {
                    ExprKind::Number(text) => text.parse::<usize>().ok().filter(|n| (1..=TERM_LIMIT).contains(n)),
                    _ => None,
                };
                let base = match (&left.kind, exponent) {
                    (_, None) | (ExprKind::Name(_) | ExprKind::Call { .. }, _) => None,
                    _ => Some(self.multiply_out(left)?),
                };
                match (base, exponent) {
                    (Some(base), Some(exponent)) if base.len() > 1 || exponent <= 8 => {
                        let mut power = base.clone();
                        for _ in 1..exponent {
                            power = self.product(&power, &base)?;
                        }
                        Ok(power)
                    }
                    _ => Ok(vec![self.single(expr(e.kind.clone()))]),
                }
            }
            ExprKind::Bracket { bra, chain: Some(chain), ket } => {
                let mut terms = self.multiply_out(chain)?;
                for term in &mut terms {
                    let chain = std::mem::take(&mut term.operators)
                        .into_iter()
                        .reduce(|a, b| binary(Operation::Juxtapose, a, b))
                        .map(Box::new);
                    let bracket = expr(ExprKind::Bracket { bra: bra.clone(), chain, ket: ket.clone() });
                    term.scalars.push(bracket);
                }
                Ok(terms)
            }
            _ => Ok(vec![self.single(expr(e.kind.clone()))]),
        }
    }

    fn single(&mut self, factor: Expr) -> Monomial {
        let mut term = Monomial { number: Rational::from(1), scalars: Vec::new(), operators: Vec::new() };
        if self.is_operator(&factor) {
            term.operators.push(factor)
        } else {
            term.scalars.push(factor)
        }
        term
    }

    fn product(&self, left: &[Monomial], right: &[Monomial]) -> Result<Vec<Monomial>, Problem> {
        if left.len().saturating_mul(right.len()) > TERM_LIMIT {
            return self.checked(vec![
                Monomial { number: Rational::new(), scalars: Vec::new(), operators: Vec::new() };
                TERM_LIMIT + 1
            ]);
        }
        let mut terms = Vec::with_capacity(left.len() * right.len());
        for a in left {
            for b in right {
                terms.push(Monomial {
                    number: Rational::from(&a.number * &b.number),
                    scalars: a.scalars.iter().chain(&b.scalars).cloned().collect(),
                    operators: a.operators.iter().chain(&b.operators).cloned().collect(),
                });
            }
        }
        Ok(terms)
    }
}

fn number(value: u32) -> Expr {
    expr(ExprKind::Number(value.to_string()))
}

/// The factors of a product that ends in a ket; `false` when it is not one product.
fn split_ket(e: &Expr, factors: &mut Vec<Expr>) -> bool {
    match &e.kind {
        ExprKind::Binary { operation: Operation::Juxtapose | Operation::Multiply, left, right } => {
            split_ket(left, factors) && split_ket(right, factors)
        }
        ExprKind::Binary { operation: Operation::Add | Operation::Subtract, left, right } => {
            // A sum of operators is one factor; a sum of kets is not.
            if holds_ket(left) || holds_ket(right) {
                return false;
            }
            factors.push(e.clone());
            true
        }
        ExprKind::Negate(inner) if holds_ket(inner) => {
            factors.push(expr(ExprKind::Negate(Box::new(number(1)))));
            split_ket(inner, factors)
        }
        _ => {
            factors.push(e.clone());
            true
        }
    }
}

fn holds_ket(e: &Expr) -> bool {
    match &e.kind {
        ExprKind::Ket(_) => true,
        ExprKind::Negate(inner) => holds_ket(inner),
        ExprKind::Binary { left, right, .. } => holds_ket(left) || holds_ket(right),
        _ => false,
    }
}

/// Tells whether an expression is its own adjoint factor by factor, as far as that is seen from its words alone.
fn is_plainly_hermitian(e: &Expr) -> bool {
    match &e.kind {
        ExprKind::Number(_) => true,
        ExprKind::Name(name) => name != "i" && !name.contains("_+") && !name.contains("_-"),
        ExprKind::Call { name, arguments, subscript } => {
            !subscript.as_ref().is_some_and(|q| q.starts_with(['+', '-']))
                && (name.text == "E"
                    || arguments
                        .iter()
                        .all(|a| matches!(a, Argument::Positional(value) if is_plainly_hermitian(value))))
                && name.text != "sqrt"
                && name.text != "ln"
        }
        ExprKind::Negate(inner) | ExprKind::Primed(inner) => is_plainly_hermitian(inner),
        ExprKind::Without { body, .. } => is_plainly_hermitian(body),
        ExprKind::Binary { left, right, .. } => is_plainly_hermitian(left) && is_plainly_hermitian(right),
        ExprKind::Bracket { bra, chain, ket } => {
            bra.to_string() == ket.to_string()
                && chain.as_ref().is_none_or(|chain| is_plainly_hermitian(chain) && is_single(chain))
        }
        _ => false,
    }
}

/// Whether a chain is one operator, so that its mean value is real when it is Hermitian.
fn is_single(e: &Expr) -> bool {
    matches!(e.kind, ExprKind::Name(_) | ExprKind::Call { .. })
        || matches!(&e.kind, ExprKind::Binary { operation: Operation::Power, left, .. } if is_single(left))
}

/// A chain read from the other end.
fn reversed(e: &Expr) -> Expr {
    match &e.kind {
        ExprKind::Binary { operation: operation @ (Operation::Juxtapose | Operation::Multiply), left, right } => {
            binary(*operation, reversed(right), reversed(left))
        }
        ExprKind::Binary { operation: operation @ (Operation::Add | Operation::Subtract), left, right } => {
            binary(*operation, reversed(left), reversed(right))
        }
        ExprKind::Negate(inner) => expr(ExprKind::Negate(Box::new(reversed(inner)))),
        _ => e.clone(),
    }
}

/// Adds up terms with the same factors; the order is that of their text.
fn merge(terms: Vec<Monomial>) -> Vec<(Rational, Vec<Expr>)> {
    let mut merged: BTreeMap<Vec<String>, (Rational, Vec<Expr>)> = BTreeMap::new();
    for term in terms {
        let mut factors: Vec<(String, Expr)> =
            term.scalars.into_iter().chain(term.operators).map(|factor| (factor.to_string(), factor)).collect();
        factors.sort_by(|a, b| a.0.cmp(&b.0));
        let (key, factors): (Vec<String>, Vec<Expr>) = factors.into_iter().unzip();
        let slot = merged.entry(key).or_insert_with(|| (Rational::new(), factors));
        slot.0 += term.number;
    }
    merged.into_values().filter(|(number, _)| *number != 0).collect()
}

fn written(terms: Vec<(Rational, Vec<Expr>)>) -> String {
    if terms.is_empty() {
        return "0".into();
    }
    let mut text = String::new();
    for (position, (coefficient, factors)) in terms.into_iter().enumerate() {
        let negative = coefficient < 0;
        let size = coefficient.abs();
        let sign = match (position, negative) {
            (0, false) => "",
            (0, true) => "-",
            (_, false) => " + ",
            (_, true) => " - ",
        };
        text.push_str(sign);
        // Printed as one product, so that the printer sets the parentheses that reading back needs.
        let front =
            (size != 1 || factors.is_empty()).then(|| expr(ExprKind::Number(size.numer().to_string()))).map(|n| {
                if *size.denom() == 1 {
                    n
                } else {
                    binary(Operation::Divide, n, expr(ExprKind::Number(size.denom().to_string())))
                }
            });
        let product = front.into_iter().chain(factors).reduce(|a, b| binary(Operation::Juxtapose, a, b));
        if let Some(product) = product {
            text.push_str(&product.to_string());
        }
    }
    text
}
