//! What stands in front of parentheses: functions of numbers and of H, energies, roots and sums, definitions, operators with arguments.

use super::names::Binding;
use super::problem::{Fault, Kind};
use super::resolve::{Resolved, Resolver};
use super::terms::*;
use crate::lang::tree::{Argument, Expr, ExprKind, Name, Span};

/// Highest order of a variation.
const HIGHEST_ORDER: u32 = 60;

impl Resolver<'_> {
    /// A function call: functions of numbers and of H, energies, defined names, operators with arguments.
    pub(super) fn call(
        &mut self,
        name: &Name,
        arguments: &[Argument],
        subscript: Option<&str>,
        span: Span,
    ) -> Resolved<Meaning> {
        if let Some(Binding::Definition(definition)) = self.names.bound.get(&name.text) {
            let definition = definition.clone();
            let plain = self.positional(&name.text, arguments, span)?;
            return self.call_definition(definition, &plain, span);
        }
        if let Some(part) = LevelPart::named(&name.text) {
            let argument = self.only_argument(name, arguments, span)?;
            let inner = self.scalar(&argument)?;
            return Ok(Meaning::Scalar(self.term(ScalarNode::LevelPart(part, inner), span)));
        }
        if let Some(function) = function_named(&name.text) {
            let argument = self.only_argument(name, arguments, span)?;
            return match self.resolve(&argument)? {
                Meaning::Scalar(inner) => {
                    self.check_function(function, &name.text, &inner)?;
                    Ok(Meaning::Scalar(self.term(ScalarNode::Function(function, inner), span)))
                }
                Meaning::Operator(inner) => self.function_of_h(function, &inner, span),
                other => self.fault(argument.span, Fault::WrongKind { wanted: Kind::Number, got: other.kind() }),
            };
        }
        match name.text.as_str() {
            "E" => self.energy(arguments, span),
            "tensor" => self.tensor(arguments, subscript, span),
            "coupled" => self.coupled(arguments, subscript, span),
            "vary" => self.vary(arguments, span),
            "photon" | "wavelength" => {
                let argument = self.only_argument(name, arguments, span)?;
                self.photon_or_wavelength(name, &argument, span)
            }
            "zero" | "sum" => self.bound_variable(name, arguments, span),
            symbol if WignerSymbol::named(symbol).is_some_and(|_| !self.names.later.contains_key(symbol)) => {
                let plain = self.positional(symbol, arguments, span)?;
                let Some(symbol) = WignerSymbol::named(symbol) else { return self.unknown(symbol, name.span) };
                let (count, wanted) = symbol.arguments();
                if plain.len() != count {
                    return self.fault(
                        span,
                        Fault::ArgumentCount {
                            name: name.text.clone(),
                            wanted: wanted.into(),
                            got: format!("{} are", plain.len()),
                        },
                    );
                }
                let terms = plain.iter().map(|a| self.plain(a, "in the symbol")).collect::<Resolved<Vec<_>>>()?;
                Ok(Meaning::Scalar(self.term(ScalarNode::Wigner(symbol, terms), span)))
            }
            "delta" if self.names.operators.contains("delta") => {
                let plain = self.positional(&name.text, arguments, span)?;
                match plain.as_slice() {
                    [Expr { kind: ExprKind::Name(of), .. }] => {
                        Ok(self.atom(&format!("delta({of})"), subscript, Vec::new(), span))
                    }
                    _ => self.fault(
                        span,
                        Fault::ArgumentForm { name: "delta".into(), wanted: "a coordinate: `delta(r)`".into() },
                    ),
                }
            }
            other if self.names.later.contains_key(other) => self.unknown(other, span),
            other if self.names.operators.contains(other) => {
                let plain = self.positional(other, arguments, span)?;
                let terms = plain.iter().map(|a| self.scalar(a)).collect::<Resolved<Vec<_>>>()?;
                Ok(self.atom(other, subscript, terms, span))
            }
            other => {
                if self.variables.iter().any(|v| v == other) {
                    return self.fault(
                        name.span,
                        Fault::Other {
                            message: format!("`{other}` is a number here, and is written like a function"),
                            help: format!("put a blank or `*` between: `{other} (…)`"),
                        },
                    );
                }
                self.unknown(other, name.span)
            }
        }
    }

    fn only_argument(&self, name: &Name, arguments: &[Argument], span: Span) -> Resolved<Expr> {
        let [argument] = self.positional(&name.text, arguments, span)?.try_into().or_else(|list: Vec<Expr>| {
            self.fault(
                span,
                Fault::ArgumentCount {
                    name: name.text.clone(),
                    wanted: "one argument".into(),
                    got: format!("{} are", list.len()),
                },
            )
        })?;
        Ok(argument)
    }

    /// The arguments as plain expressions; other forms are refused.
    pub(super) fn positional(&self, name: &str, arguments: &[Argument], span: Span) -> Resolved<Vec<Expr>> {
        arguments
            .iter()
            .map(|argument| match argument {
                Argument::Positional(expr) => Ok(expr.clone()),
                _ => self.fault(
                    span,
                    Fault::ArgumentForm { name: name.into(), wanted: "plain expressions between commas".into() },
                ),
            })
            .collect()
    }

    fn energy(&mut self, arguments: &[Argument], span: Span) -> Resolved<Meaning> {
        let state = match arguments {
            [Argument::Positional(Expr { kind: ExprKind::Name(name), span: name_span })] => {
                match self.names.bound.get(name) {
                    Some(Binding::State(state)) => state.clone(),
                    Some(other) => {
                        return self.fault(
                            *name_span,
                            Fault::WrongBinding {
                                name: name.clone(),
                                got: other.describe(),
                                wanted: "an eigenstate (`state g = h[1s]`)".into(),
                            },
                        );
                    }
                    None => return self.unknown(name, *name_span),
                }
            }
            [Argument::Positional(Expr { kind: ExprKind::Labelled { system, label }, .. })] => {
                self.state(system, label)?
            }
            _ => {
                return self.fault(
                    span,
                    Fault::ArgumentForm { name: "E".into(), wanted: "one state: `E(g)` or `E(h[1s])`".into() },
                );
            }
        };
        Ok(Meaning::Scalar(self.term(ScalarNode::Energy(state), span)))
    }

    /// `vary(f, V)` and `vary(f, V, n)`.
    fn vary(&mut self, arguments: &[Argument], span: Span) -> Resolved<Meaning> {
        let plain = self.positional("vary", arguments, span)?;
        let (body, perturbation, order) = match plain.as_slice() {
            [body, perturbation] => (body, perturbation, None),
            [body, perturbation, order] => (body, perturbation, Some(order)),
            other => {
                let wanted = "an expression, a perturbation and, if not 1, the order: `vary(E(g), D_z, 2)`".into();
                let got = if other.len() == 1 { "one is".into() } else { format!("{} are", other.len()) };
                return self.fault(span, Fault::ArgumentCount { name: "vary".into(), wanted, got });
            }
        };
        let body = self.scalar(body)?;
        let perturbation = match self.resolve(perturbation)? {
            Meaning::Operator(term) => term,
            Meaning::Scalar(term) => self.identity_multiple(term),
            other => {
                return self.fault(perturbation.span, Fault::WrongKind { wanted: Kind::Operator, got: other.kind() });
            }
        };
        let order = match order {
            None => 1,
            Some(order) => match &order.kind {
                ExprKind::Number(text) => text.parse().ok().filter(|n| *n <= HIGHEST_ORDER),
                _ => None,
            }
            .map_or_else(
                || {
                    let message = format!("the order of a variation is a whole number from 0 to {HIGHEST_ORDER}");
                    self.fault(
                        order.span,
                        Fault::Other { message, help: "write it as a number: `vary(E(g), V, 3)`".into() },
                    )
                },
                Ok,
            )?,
        };
        Ok(Meaning::Scalar(self.term(ScalarNode::Vary(Variation { body, perturbation, order }), span)))
    }

    /// `zero(w in a .. b, f)` and `sum(n in a .. b, f)`.
    fn bound_variable(&mut self, name: &Name, arguments: &[Argument], span: Span) -> Resolved<Meaning> {
        let [Argument::Range { variable, from, to }, Argument::Positional(body)] = arguments else {
            let example =
                if name.text == "zero" { "zero(w in 0.40 .. 0.44, pol(w))" } else { "sum(n in 1 .. 20, f(n))" };
            return self.fault(
                span,
                Fault::ArgumentForm {
                    name: name.text.clone(),
                    wanted: format!("a variable with its range, then an expression: `{example}`"),
                },
            );
        };
        let (from, to) = (self.scalar(from)?, self.scalar(to)?);
        let known = self.check_range(&from, &to)?.of_variable();
        if name.text == "sum" {
            self.check_plain(&from, "in the range of a sum")?;
            self.check_plain(&to, "in the range of a sum")?;
        }
        self.variables.push(variable.text.clone());
        self.variable_dimensions.push((variable.text.clone(), known));
        let body = self.scalar(body);
        self.variables.pop();
        self.variable_dimensions.pop();
        let (variable, body) = (variable.text.clone(), body?);
        let node = if name.text == "zero" {
            ScalarNode::Root { variable, from, to, body }
        } else {
            ScalarNode::Series { variable, from, to, body }
        };
        Ok(Meaning::Scalar(self.term(node, span)))
    }
}
