//! Visits every number inside a term, through definitions, chains and labels.

use super::terms::*;
use std::collections::HashSet;
use std::sync::Arc;

/// What is to be done at the parts of a term.
pub trait Visitor {
    fn scalar(&mut self, _term: &ScalarTerm) {}
    fn operator(&mut self, _term: &OperatorTerm) {}
    fn state(&mut self, _state: &StateTerm) {}
}

/// Visits a term and everything below it; a definition is entered once.
pub fn visit(term: &ScalarTerm, visitor: &mut dyn Visitor) {
    let mut walk = Walk { visitor, entered: HashSet::new() };
    walk.scalar(term);
}

/// Calls `each` on the term and every scalar term below it; a definition is entered once.
pub fn scalars(term: &ScalarTerm, each: &mut dyn FnMut(&ScalarTerm)) {
    struct Scalars<'e>(&'e mut dyn FnMut(&ScalarTerm));
    impl Visitor for Scalars<'_> {
        fn scalar(&mut self, term: &ScalarTerm) {
            (self.0)(term);
        }
    }
    visit(term, &mut Scalars(each));
}

struct Walk<'v> {
    visitor: &'v mut dyn Visitor,
    entered: HashSet<*const Definition>,
}

impl Walk<'_> {
    fn scalar(&mut self, term: &ScalarTerm) {
        self.visitor.scalar(term);
        match &*term.node {
            ScalarNode::Exact(_) | ScalarNode::Measured { .. } | ScalarNode::Pi | ScalarNode::Variable(_) => {}
            ScalarNode::Sum(list) | ScalarNode::Product(list) | ScalarNode::Wigner(_, list) => {
                list.iter().for_each(|inner| self.scalar(inner));
            }
            ScalarNode::Quantity { value: inner, .. } | ScalarNode::Negated(inner) | ScalarNode::Function(_, inner) => {
                self.scalar(inner)
            }
            ScalarNode::Quotient(a, b) | ScalarNode::Power(a, b) => {
                self.scalar(a);
                self.scalar(b);
            }
            ScalarNode::Energy(state) => self.label(&state.label),
            ScalarNode::LevelPart(_, inner) => self.scalar(inner),
            ScalarNode::Vary(variation) => {
                self.scalar(&variation.body);
                self.operator(&variation.perturbation);
            }
            ScalarNode::Bracket(bracket) => {
                self.ket(&bracket.bra);
                self.ket(&bracket.ket);
                if let Some(operator) = &bracket.operator {
                    self.operator(operator);
                }
            }
            ScalarNode::Call(call) => self.call(call),
            ScalarNode::Root { from, to, body, .. } | ScalarNode::Series { from, to, body, .. } => {
                [from, to, body].into_iter().for_each(|inner| self.scalar(inner));
            }
        }
    }

    fn call(&mut self, call: &Call) {
        call.arguments.iter().for_each(|argument| self.scalar(argument));
        if self.entered.insert(Arc::as_ptr(&call.definition)) {
            match &call.definition.body {
                Meaning::Scalar(body) => self.scalar(body),
                Meaning::Operator(body) => self.operator(body),
                Meaning::Ket(body) => self.ket(body),
                Meaning::Bra(_) => {}
            }
        }
    }

    fn operator(&mut self, term: &OperatorTerm) {
        self.visitor.operator(term);
        match &*term.node {
            OperatorNode::Scalar(scalar) => self.scalar(scalar),
            OperatorNode::Atom(atom) => atom.arguments.iter().for_each(|argument| self.scalar(argument)),
            OperatorNode::Hamiltonian | OperatorNode::Tensor(_) => {}
            OperatorNode::Sum(list) | OperatorNode::Product(list) => list.iter().for_each(|inner| self.operator(inner)),
            OperatorNode::Power(inner, _) | OperatorNode::Adjoint(inner) => self.operator(inner),
            OperatorNode::Dyad(ket, bra) => {
                self.ket(ket);
                self.ket(bra);
            }
            OperatorNode::Resolvent(linear) | OperatorNode::Function(_, linear) => {
                self.scalar(&linear.constant);
                self.scalar(&linear.slope);
            }
            OperatorNode::Call(call) => self.call(call),
        }
    }

    fn ket(&mut self, term: &KetTerm) {
        match &*term.node {
            KetNode::State(state) => {
                self.visitor.state(state);
                self.label(&state.label);
            }
            KetNode::Applied(operator, inner) => {
                self.operator(operator);
                self.ket(inner);
            }
            KetNode::Sum(list) => list.iter().for_each(|inner| self.ket(inner)),
            KetNode::Scaled(scalar, inner) => {
                self.scalar(scalar);
                self.ket(inner);
            }
            KetNode::Call(call) => self.call(call),
        }
    }

    fn label(&mut self, label: &LabelTerm) {
        for piece in &label.parts {
            if let LabelPiece::Computed(term) = piece {
                self.scalar(term);
            }
        }
        label.options.iter().for_each(|(_, term)| self.scalar(term));
    }
}
