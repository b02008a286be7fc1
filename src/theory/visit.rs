//! Visits every number inside a term, through definitions, chains and labels.

use super::terms::*;
use std::collections::HashSet;
use std::sync::Arc;

/// Calls `visit` on the term and every scalar term below it; a definition is entered once.
pub fn scalars(term: &ScalarTerm, visit: &mut dyn FnMut(&ScalarTerm)) {
    let mut walk = Walk { visit, entered: HashSet::new() };
    walk.scalar(term);
}

struct Walk<'v> {
    visit: &'v mut dyn FnMut(&ScalarTerm),
    entered: HashSet<*const Definition>,
}

impl Walk<'_> {
    fn scalar(&mut self, term: &ScalarTerm) {
        (self.visit)(term);
        match &*term.node {
            ScalarNode::Exact(_) | ScalarNode::Measured { .. } | ScalarNode::Pi | ScalarNode::Variable(_) => {}
            ScalarNode::Sum(list) | ScalarNode::Product(list) | ScalarNode::Wigner(_, list) => {
                list.iter().for_each(|inner| self.scalar(inner));
            }
            ScalarNode::Negated(inner) | ScalarNode::Function(_, inner) => self.scalar(inner),
            ScalarNode::Quotient(a, b) | ScalarNode::Power(a, b) => {
                self.scalar(a);
                self.scalar(b);
            }
            ScalarNode::Energy(state) => self.label(&state.label),
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
        match &*term.node {
            OperatorNode::Scalar(scalar) => self.scalar(scalar),
            OperatorNode::Atom(atom) => atom.arguments.iter().for_each(|argument| self.scalar(argument)),
            OperatorNode::Hamiltonian | OperatorNode::Tensor(_) => {}
            OperatorNode::Sum(list) | OperatorNode::Product(list) => list.iter().for_each(|inner| self.operator(inner)),
            OperatorNode::Power(inner, _) => self.operator(inner),
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
            KetNode::State(state) => self.label(&state.label),
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
