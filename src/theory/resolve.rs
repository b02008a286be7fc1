//! Resolves a tree into terms: what each name stands for, and whether each part is a number, an operator or a ket.

use super::dimensions::Known;
use super::indices::{count_indices, count_indices_ket};
use super::names::{Binding, Names};
use super::problem::{Fault, Kind, Problem};
use super::terms::*;
use crate::lang::tree::{
    DefinitionKind, Expr, ExprKind, Label, LabelPart, Name, Operation, Span, StateRef, StateRefKind,
};
use crate::num::{Surd, decimal};
use std::sync::Arc;

pub(super) type Resolved<T> = Result<T, Problem>;

/// Resolves the expressions of one entry.
pub struct Resolver<'a> {
    pub(super) names: &'a Names,
    source: &'a str,
    entry: u64,
    pub(super) variables: Vec<String>,
    /// What is known of the dimensions of variables of ranges.
    pub(super) variable_dimensions: Vec<(String, Known)>,
    without: Vec<ManifoldTerm>,
}

impl<'a> Resolver<'a> {
    /// A resolver for the entry with this identity, whose text is `source`.
    pub fn new(names: &'a Names, source: &'a str, entry: u64) -> Self {
        Resolver { names, source, entry, variables: Vec::new(), variable_dimensions: Vec::new(), without: Vec::new() }
    }

    /// The same with variables that need no value.
    #[must_use]
    pub fn with_variables(mut self, variables: Vec<String>) -> Self {
        self.variables = variables;
        self
    }

    pub(super) fn place(&self, span: Span) -> Place {
        Place { entry: self.entry, span }
    }

    pub(super) fn fault<T>(&self, span: Span, fault: Fault) -> Resolved<T> {
        Err(Problem::new(self.place(span), fault))
    }

    fn text(&self, span: Span) -> &'a str {
        self.source.get(span.start..span.end).unwrap_or("")
    }

    /// A node with its place and text; what `without` leaves out belongs to the text, since it changes the meaning.
    pub(super) fn term<N>(&self, node: N, span: Span) -> Term<N> {
        let constants = self.constants_text();
        if self.without.is_empty() && constants.is_empty() {
            return Term::new(node, self.place(span), self.text(span));
        }
        Term::new(node, self.place(span), format!("{}{constants}{}", self.text(span), self.left_out_text()))
    }

    /// The manifolds left out at this point, as text.
    pub(super) fn left_out_text(&self) -> String {
        self.without.iter().map(|m| format!(" without {}{}", m.system, m.label.text)).collect()
    }

    /// Resolves the body of a definition with its parameters in scope and checks that it is what its keyword says.
    pub fn definition(
        &mut self,
        kind: DefinitionKind,
        name: &Name,
        parameters: &[Name],
        body: &Expr,
    ) -> Resolved<Definition> {
        for (position, parameter) in parameters.iter().enumerate() {
            if parameters[..position].iter().any(|earlier| earlier.text == parameter.text) {
                return self.fault(
                    parameter.span,
                    Fault::Other {
                        message: format!("the parameter `{}` stands twice in the list", parameter.text),
                        help: "give every parameter a name of its own".into(),
                    },
                );
            }
        }
        self.variables = parameters.iter().map(|p| p.text.clone()).collect();
        let meaning = self.resolve(body);
        self.variables.clear();
        let body_meaning = match (kind, meaning?) {
            (DefinitionKind::Operator, Meaning::Operator(term)) if matches!(&*term.node, OperatorNode::Tensor(_)) => {
                Meaning::Operator(named_tensor(term, &name.text))
            }
            (DefinitionKind::Define, Meaning::Scalar(term)) => Meaning::Scalar(term),
            (DefinitionKind::Define, other) => {
                return self.fault(body.span, Fault::WrongKind { wanted: Kind::Number, got: other.kind() });
            }
            (DefinitionKind::Operator, Meaning::Operator(term)) => Meaning::Operator(term),
            (DefinitionKind::Operator, Meaning::Scalar(term)) => Meaning::Operator(self.identity_multiple(term)),
            (DefinitionKind::Resolvent, Meaning::Operator(term)) => {
                if !has_function_of_h(&term) {
                    return self.fault(
                        body.span,
                        Fault::Other {
                            message: "a resolvent is a function of H, and there is no fraction with H here".into(),
                            help: "write for instance `1/(E(g) - H)'`; for other operators use `operator`".into(),
                        },
                    );
                }
                Meaning::Operator(term)
            }
            (DefinitionKind::Operator | DefinitionKind::Resolvent, other) => {
                return self.fault(body.span, Fault::WrongKind { wanted: Kind::Operator, got: other.kind() });
            }
            (DefinitionKind::Ket, Meaning::Ket(term)) => Meaning::Ket(term),
            (DefinitionKind::Ket | DefinitionKind::Polarization, other) => {
                return self.fault(body.span, Fault::WrongKind { wanted: Kind::Ket, got: other.kind() });
            }
        };
        Ok(Definition {
            name: name.text.clone(),
            kind,
            parameters: parameters.iter().map(|p| p.text.clone()).collect(),
            known: match &body_meaning {
                Meaning::Scalar(term) => super::dimensions::known(term).of_variable(),
                _ => Known::Free,
            },
            body: body_meaning,
            written: body.clone(),
        })
    }

    /// Resolves an expression that must be a number.
    pub fn scalar(&mut self, expr: &Expr) -> Resolved<ScalarTerm> {
        match self.resolve(expr)? {
            Meaning::Scalar(term) => Ok(term),
            other => self.fault(expr.span, Fault::WrongKind { wanted: Kind::Number, got: other.kind() }),
        }
    }

    /// Resolves an expression that must be a number without a unit.
    pub(super) fn plain(&mut self, expr: &Expr, place: &str) -> Resolved<ScalarTerm> {
        let term = self.scalar(expr)?;
        self.check_plain(&term, place)?;
        Ok(term)
    }

    /// Resolves an expression of any kind.
    pub fn resolve(&mut self, expr: &Expr) -> Resolved<Meaning> {
        match &expr.kind {
            ExprKind::Number(text) => match decimal::parse_decimal(text) {
                Ok(value) => Ok(Meaning::Scalar(self.term(ScalarNode::Exact(Surd::from(value)), expr.span))),
                Err(error) => self.fault(expr.span, Fault::Other { message: error.to_string(), help: String::new() }),
            },
            ExprKind::Measured { value, uncertainty } => {
                match (decimal::parse_decimal(value), decimal::parse_decimal(uncertainty)) {
                    (Ok(value), Ok(sigma)) => {
                        let source = Source::Written(self.place(expr.span));
                        Ok(Meaning::Scalar(self.term(ScalarNode::Measured { source, value, sigma }, expr.span)))
                    }
                    (Err(error), _) | (_, Err(error)) => {
                        self.fault(expr.span, Fault::Other { message: error.to_string(), help: String::new() })
                    }
                }
            }
            ExprKind::Name(name) => self.name(name, expr.span),
            ExprKind::Member { owner, field } => self.member(owner, field, expr.span),
            ExprKind::Text(_) | ExprKind::List(_) => self.fault(
                expr.span,
                Fault::Other {
                    message: "file names and rows of numbers stand only in the declaration of a system".into(),
                    help: "as in `system m = matrix(H = \"h.mtx\")`".into(),
                },
            ),
            ExprKind::Call { name, arguments, subscript } => {
                self.call(name, arguments, subscript.as_deref(), expr.span)
            }
            ExprKind::Labelled { system, label } => self.fault(
                expr.span,
                Fault::Other {
                    message: format!(
                        "`{}[{}]` is a state, where a number or operator is needed",
                        system.text,
                        self.text(label.span).trim_matches(['[', ']'])
                    ),
                    help: "write it in a bra or ket, `|h[1s]>`, or take its energy: `E(h[1s])`".into(),
                },
            ),
            ExprKind::Negate(inner) => {
                let inner = self.resolve(inner)?;
                self.negate(inner, expr.span)
            }
            ExprKind::Binary { operation: Operation::Add | Operation::Subtract, .. } => self.sum(expr),
            ExprKind::Binary { operation: Operation::Power, left, right } => self.power(left, right, expr.span),
            ExprKind::Binary { .. } => self.product(expr),
            ExprKind::Primed(_) => self.fault(expr.span, Fault::MisplacedPrime),
            ExprKind::Without { body, manifold } => {
                let term = match self.names.bound.get(&manifold.text) {
                    Some(Binding::Manifold(term)) => term.clone(),
                    Some(other) => {
                        return self.fault(
                            manifold.span,
                            Fault::WrongBinding {
                                name: manifold.text.clone(),
                                got: other.describe(),
                                wanted: "a manifold (`manifold P = h[2p]`)".into(),
                            },
                        );
                    }
                    None => return self.unknown(&manifold.text, manifold.span),
                };
                self.without.push(term);
                let meaning = self.resolve(body);
                self.without.pop();
                match meaning? {
                    Meaning::Operator(term) if has_function_of_h(&term) => Ok(Meaning::Operator(term)),
                    _ => self.fault(expr.span, Fault::MisplacedWithout { name: manifold.text.clone() }),
                }
            }
            ExprKind::Bracket { bra, chain, ket } => {
                let bra = self.ket(bra)?;
                let operator = match chain {
                    None => None,
                    Some(chain) => match self.resolve(chain)? {
                        Meaning::Operator(term) => Some(term),
                        Meaning::Scalar(term) => Some(self.identity_multiple(term)),
                        other => {
                            return self
                                .fault(chain.span, Fault::WrongKind { wanted: Kind::Operator, got: other.kind() });
                        }
                    },
                };
                let ket = self.ket(ket)?;
                let bracket = self.bracket(bra, operator, ket, expr.span)?;
                Ok(Meaning::Scalar(self.term(ScalarNode::Bracket(bracket), expr.span)))
            }
            ExprKind::Ket(state) => Ok(Meaning::Ket(self.ket(state)?)),
            ExprKind::Bra(state) => Ok(Meaning::Bra(BraTerm {
                bra: self.ket(state)?,
                chain: Vec::new(),
                factor: None,
                place: self.place(expr.span),
                text: self.text(expr.span).into(),
            })),
        }
    }

    pub(super) fn unknown<T>(&self, name: &str, span: Span) -> Resolved<T> {
        if let Some(what) = self.names.later.get(name) {
            return self.fault(span, Fault::NotYet { what: what.clone() });
        }
        if let Some(entry) = self.names.broken.get(name) {
            return self.fault(span, Fault::Broken { name: name.into(), entry: *entry });
        }
        self.fault(span, Fault::UnknownName { name: name.into(), near: self.names.near(name) })
    }

    fn name(&mut self, name: &str, span: Span) -> Resolved<Meaning> {
        if self.variables.iter().any(|variable| variable == name) {
            let variable = self.term(ScalarNode::Variable(name.into()), span);
            let known = self.variable_dimensions.iter().rev().find(|(known, _)| known == name).map(|(_, known)| known);
            return Ok(Meaning::Scalar(match known {
                None | Some(Known::Free | Known::Number) => variable,
                Some(known) => {
                    self.term(ScalarNode::Quantity { known: known.clone(), unit: None, value: variable }, span)
                }
            }));
        }
        match self.names.bound.get(name) {
            Some(Binding::Definition(definition)) => return self.call_definition(definition.clone(), &[], span),
            // States stand in bras and kets; between them `p` is the momentum even where a state has that name.
            Some(_) if self.operator_word(name) => {}
            Some(other) => {
                let wanted = match other {
                    Binding::State(_) => format!("a ket `|{name}>`, a bra `<{name}|` or the energy `E({name})`"),
                    _ => "a number, an operator or a ket".into(),
                };
                return self.fault(span, Fault::WrongBinding { name: name.into(), got: other.describe(), wanted });
            }
            None => {}
        }
        match name {
            "inf" => {
                return self.fault(
                    span,
                    Fault::Other {
                        message: "`inf` is no number to compute with".into(),
                        help: "ranges of `zero` and `sum` are finite; `inf` stands for an infinite nuclear mass: `mass=inf`".into(),
                    },
                );
            }
            "codata" => {
                let message = "`codata` is the set of constants, and one of them is wanted".into();
                let help = "write for instance `codata.alpha`; `help codata` lists them".into();
                return self.fault(span, Fault::Other { message, help });
            }
            "pi" => return Ok(Meaning::Scalar(self.term(ScalarNode::Pi, span))),
            "i" => return Ok(Meaning::Scalar(self.term(ScalarNode::Exact(Surd::i()), span))),
            "H" => return Ok(Meaning::Operator(self.term(OperatorNode::Hamiltonian, span))),
            _ => {}
        }
        if self.names.matrix_operators.contains(name) {
            return Ok(self.atom(name, None, Vec::new(), span));
        }
        let (base, component) = match name.split_once('_') {
            Some((base, component)) if !self.names.operators.contains(name) => (base, Some(component)),
            _ => (name, None),
        };
        if let Some(entry) = component.and_then(|component| self.broken_direction(component)) {
            let name = component.unwrap_or_default().to_string();
            return self.fault(span, Fault::Broken { name, entry });
        }
        if self.operator_word(name) {
            return Ok(self.atom(base, component, Vec::new(), span));
        }
        if let Some(meaning) = component.and_then(|component| self.component_of_tensor(base, component, span)) {
            return meaning;
        }
        if function_named(name).is_some() {
            return self.fault(
                span,
                Fault::ArgumentCount {
                    name: name.into(),
                    wanted: "one argument in parentheses".into(),
                    got: "none is".into(),
                },
            );
        }
        match self.lone_unit(&Expr { kind: ExprKind::Name(name.into()), span }) {
            Some(refusal) => refusal,
            None => self.unknown(name, span),
        }
    }

    /// Tells whether a name, with its component, is an operator of the vocabulary or of a matrix.
    pub(super) fn operator_word(&self, name: &str) -> bool {
        let base = name.split_once('_').map_or(name, |(base, _)| base);
        self.names.matrix_operators.contains(name)
            || self.names.operators.contains(name)
            || self.names.operators.contains(base) && !self.names.later.contains_key(name)
    }

    pub(super) fn atom(&self, name: &str, component: Option<&str>, arguments: Vec<ScalarTerm>, span: Span) -> Meaning {
        let along = component.and_then(|component| self.direction(component));
        let component = component.map(Into::into);
        let atom = AtomTerm { name: name.into(), component, along, arguments, power: 1 };
        Meaning::Operator(self.term(OperatorNode::Atom(atom), span))
    }

    pub(super) fn call_definition(
        &mut self,
        definition: Arc<Definition>,
        arguments: &[Expr],
        span: Span,
    ) -> Resolved<Meaning> {
        if definition.parameters.len() != arguments.len() {
            let wanted = match definition.parameters.as_slice() {
                [] => "no arguments".to_string(),
                list => format!("{} argument(s) ({})", list.len(), list.join(", ")),
            };
            let got = match arguments.len() {
                0 => "none is".to_string(),
                1 => "one is".to_string(),
                n => format!("{n} are"),
            };
            return self.fault(span, Fault::ArgumentCount { name: definition.name.clone(), wanted, got });
        }
        let arguments = arguments.iter().map(|argument| self.scalar(argument)).collect::<Resolved<Vec<_>>>()?;
        let call = Call { definition: definition.clone(), arguments };
        let known = self.check_call(&call, span)?;
        Ok(match definition.kind {
            DefinitionKind::Define => {
                let value = self.term(ScalarNode::Call(call), span);
                Meaning::Scalar(match known {
                    Some(known) => self.term(ScalarNode::Quantity { known, unit: None, value }, span),
                    None => value,
                })
            }
            DefinitionKind::Operator | DefinitionKind::Resolvent => {
                Meaning::Operator(self.term(OperatorNode::Call(call), span))
            }
            // a polarization is bound as such, never as a definition
            DefinitionKind::Ket | DefinitionKind::Polarization => Meaning::Ket(self.term(KetNode::Call(call), span)),
        })
    }

    /// A labelled state of a system bound above.
    pub fn state(&mut self, system: &Name, label: &Label) -> Resolved<StateTerm> {
        self.known_system(system)?;
        let span = system.span.to(label.span);
        Ok(StateTerm { system: system.text.clone(), label: self.label(label)?, place: self.place(span) })
    }

    /// A manifold of a system bound above.
    pub fn manifold(&mut self, system: &Name, label: &Label) -> Resolved<ManifoldTerm> {
        self.known_system(system)?;
        let span = system.span.to(label.span);
        Ok(ManifoldTerm { system: system.text.clone(), label: self.label(label)?, place: self.place(span) })
    }

    fn known_system(&self, system: &Name) -> Resolved<()> {
        match self.names.bound.get(&system.text) {
            Some(Binding::System) => Ok(()),
            Some(other) => self.fault(
                system.span,
                Fault::WrongBinding {
                    name: system.text.clone(),
                    got: other.describe(),
                    wanted: "a system: a label in square brackets belongs to one".into(),
                },
            ),
            None => self.unknown(&system.text, system.span),
        }
    }

    fn label(&mut self, label: &Label) -> Resolved<LabelTerm> {
        let parts = label
            .parts
            .iter()
            .map(|part| match part {
                LabelPart::Text(text) => Ok(LabelPiece::Text(text.clone())),
                LabelPart::Computed(expr) => Ok(LabelPiece::Computed(self.plain(expr, "in a label")?)),
            })
            .collect::<Resolved<Vec<_>>>()?;
        let options = label
            .options
            .iter()
            .map(|(name, value)| Ok((name.text.clone(), self.plain(value, "in a label")?)))
            .collect::<Resolved<Vec<_>>>()?;
        Ok(LabelTerm { parts, options, text: self.text(label.span).into() })
    }

    /// What stands inside a bra or ket.
    fn ket(&mut self, reference: &StateRef) -> Resolved<KetTerm> {
        match &reference.kind {
            StateRefKind::Labelled { system, label } => {
                let state = self.state(system, label)?;
                Ok(self.term(KetNode::State(state), reference.span))
            }
            StateRefKind::Named { name, arguments } => match self.names.bound.get(&name.text) {
                Some(Binding::State(state)) if arguments.is_empty() => {
                    Ok(self.term(KetNode::State(state.clone()), reference.span))
                }
                Some(Binding::Definition(definition)) if definition.kind == DefinitionKind::Ket => {
                    match self.call_definition(definition.clone(), arguments, reference.span)? {
                        Meaning::Ket(term) => Ok(term),
                        other => self.fault(reference.span, Fault::WrongKind { wanted: Kind::Ket, got: other.kind() }),
                    }
                }
                Some(other) => self.fault(
                    name.span,
                    Fault::WrongBinding {
                        name: name.text.clone(),
                        got: other.describe(),
                        wanted: "a state or a ket declared above".into(),
                    },
                ),
                None => self.unknown(&name.text, name.span),
            },
        }
    }

    pub(super) fn bracket(
        &self,
        bra: KetTerm,
        operator: Option<OperatorTerm>,
        ket: KetTerm,
        span: Span,
    ) -> Resolved<Bracket> {
        let (left, right) = (system_of(&bra).unwrap_or(""), system_of(&ket).unwrap_or(""));
        if left != right {
            return self.fault(span, Fault::TwoSystems { bra: left.into(), ket: right.into() });
        }
        let mut count = std::collections::BTreeMap::new();
        count_indices_ket(&bra, &mut count);
        count_indices_ket(&ket, &mut count);
        if let Some(operator) = &operator {
            count_indices(operator, &mut count);
        }
        if let Some((index, count)) = count.iter().find(|(_, count)| **count != 2) {
            return self.fault(span, Fault::IndexCount { index: index.clone(), count: *count });
        }
        Ok(Bracket { system: right.into(), bra, operator, ket, indices: count.into_keys().collect() })
    }

    pub(super) fn identity_multiple(&self, scalar: ScalarTerm) -> OperatorTerm {
        let (place, text) = (scalar.place, scalar.text.clone());
        Term::new(OperatorNode::Scalar(scalar), place, text)
    }

    /// The manifolds that `without` leaves out at this point.
    pub(super) fn left_out(&self) -> Vec<OmittedTerm> {
        self.without.iter().cloned().map(OmittedTerm::Manifold).collect()
    }
}

/// A tensor that carries the name it is defined with.
fn named_tensor(term: OperatorTerm, name: &str) -> OperatorTerm {
    match &*term.node {
        OperatorNode::Tensor(unnamed) => {
            let mut tensor = unnamed.clone();
            tensor.tensor.element.name = name.to_string();
            Term::new(OperatorNode::Tensor(tensor), term.place, term.text)
        }
        _ => term,
    }
}

impl Meaning {
    pub fn kind(&self) -> Kind {
        match self {
            Meaning::Scalar(_) => Kind::Number,
            Meaning::Operator(_) => Kind::Operator,
            Meaning::Ket(_) => Kind::Ket,
            Meaning::Bra(_) => Kind::Bra,
        }
    }
}

/// Tells whether a fraction or function of H stands somewhere in the operator.
pub fn has_function_of_h(operator: &OperatorTerm) -> bool {
    match &*operator.node {
        OperatorNode::Resolvent(_) | OperatorNode::Function(..) => true,
        OperatorNode::Scalar(_)
        | OperatorNode::Atom(_)
        | OperatorNode::Tensor(_)
        | OperatorNode::Hamiltonian
        | OperatorNode::Dyad(..) => false,
        OperatorNode::Sum(terms) | OperatorNode::Product(terms) => terms.iter().any(has_function_of_h),
        OperatorNode::Power(inner, _) | OperatorNode::Adjoint(inner) => has_function_of_h(inner),
        OperatorNode::Call(call) => {
            matches!(&call.definition.body, Meaning::Operator(body) if has_function_of_h(body))
        }
    }
}
