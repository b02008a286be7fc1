//! Normal forms as terms that can be evaluated.

use super::expand::Expander;
use super::pieces::{FunctionPiece, NamedState, NormalBracket, Piece, pieces_key};
use super::{NormalSum, NormalTerm, SymbolMeaning};
use crate::angular::tensor::Sign;
use crate::lang::tree::{DefinitionKind, Expr, ExprKind};
use crate::num::Surd;
use crate::theory::dimensions::Known;
use crate::theory::terms::*;
use std::sync::Arc;

impl Expander<'_> {
    /// A normal form as a term with the same value; all of it stands at one place.
    pub fn term(&self, sum: &NormalSum, place: Place) -> ScalarTerm {
        let terms: Vec<ScalarTerm> = sum.terms.iter().map(|term| self.product_term(term, place)).collect();
        let text = sum.to_string();
        match terms.len() {
            0 => Term::new(ScalarNode::Exact(Surd::zero()), place, "0"),
            1 => terms.into_iter().next().unwrap_or_else(|| Term::new(ScalarNode::Exact(Surd::zero()), place, "0")),
            _ => Term::new(ScalarNode::Sum(terms), place, text),
        }
    }

    fn product_term(&self, term: &NormalTerm, place: Place) -> ScalarTerm {
        let shown = term.coefficient.to_string();
        let mut factors = vec![Term::new(ScalarNode::Exact(term.coefficient.clone()), place, shown)];
        for (symbol, power) in term.symbols.factors() {
            let base = self.symbol_term(symbol, place);
            let text = format!("({symbol})^{power}");
            let exponent = Term::new(ScalarNode::Exact(Surd::from(power)), place, power.to_string());
            factors.push(match power {
                1 => base,
                _ => Term::new(ScalarNode::Power(base, exponent), place, text),
            });
        }
        factors.extend(term.brackets.iter().map(|bracket| self.bracket_term(bracket, place)));
        let text = NormalSum { terms: vec![term.clone()] }.to_string();
        Term::new(ScalarNode::Product(factors), place, text)
    }

    fn symbol_term(&self, symbol: &str, place: Place) -> ScalarTerm {
        match self.meaning(symbol) {
            Some(SymbolMeaning::Given(term, arguments)) if arguments.is_empty() => term.clone(),
            Some(SymbolMeaning::Given(term, arguments)) => {
                let values = arguments.iter().map(|(_, value)| self.term(value, place)).collect();
                let definition = Definition {
                    name: symbol.to_string(),
                    kind: DefinitionKind::Define,
                    parameters: arguments.iter().map(|(name, _)| name.clone()).collect(),
                    body: Meaning::Scalar(term.clone()),
                    known: Known::Free,
                    written: Expr { kind: ExprKind::Name(symbol.to_string()), span: place.span },
                };
                let call = Call { definition: Arc::new(definition), arguments: values };
                Term::new(ScalarNode::Call(call), place, symbol)
            }
            Some(SymbolMeaning::Energy(state)) => {
                Term::new(ScalarNode::Energy(state.term.clone()), place, format!("E({})", state.name))
            }
            Some(SymbolMeaning::Sum(sum) | SymbolMeaning::Held(sum)) => self.term(sum, place),
            Some(SymbolMeaning::Function(function, inner)) => {
                Term::new(ScalarNode::Function(*function, self.term(inner, place)), place, symbol)
            }
            Some(SymbolMeaning::Power(base, exponent)) => {
                let node = ScalarNode::Power(self.term(base, place), self.term(exponent, place));
                Term::new(node, place, symbol)
            }
            None => Term::new(ScalarNode::Variable(symbol.to_string()), place, symbol),
        }
    }

    fn state_term(state: &NamedState, place: Place) -> KetTerm {
        Term::new(KetNode::State(state.term.clone()), place, state.name.as_str())
    }

    fn bracket_term(&self, bracket: &NormalBracket, place: Place) -> ScalarTerm {
        let pieces: Vec<OperatorTerm> =
            bracket.pieces.iter().filter_map(|piece| self.piece_term(piece, place)).collect();
        let text = bracket.key();
        let operator = match pieces.len() {
            0 => None,
            1 => pieces.into_iter().next(),
            _ => Some(Term::new(OperatorNode::Product(pieces), place, text.as_str())),
        };
        let mut counts = crate::theory::indices::Counts::new();
        if let Some(operator) = &operator {
            crate::theory::indices::count_indices(operator, &mut counts);
        }
        let bracket = Bracket {
            system: bracket.ket.term.system.clone(),
            bra: Self::state_term(&bracket.bra, place),
            operator,
            ket: Self::state_term(&bracket.ket, place),
            indices: counts.into_keys().collect(),
        };
        Term::new(ScalarNode::Bracket(bracket), place, text)
    }

    /// `None` for bras and kets, at which brackets were taken apart.
    fn piece_term(&self, piece: &Piece, place: Place) -> Option<OperatorTerm> {
        let text = piece.to_string();
        Some(match piece {
            Piece::Bra(_) | Piece::Ket(_) => return None,
            Piece::Hamiltonian => Term::new(OperatorNode::Hamiltonian, place, "H"),
            Piece::Atom(atom) => {
                let arguments = atom.arguments.iter().map(|number| {
                    let shown = number.to_string();
                    Term::new(ScalarNode::Exact(Surd::from(number.clone())), place, shown)
                });
                let node = AtomTerm {
                    name: atom.name.clone(),
                    component: atom.component.clone(),
                    along: atom.along.clone(),
                    arguments: arguments.collect(),
                    power: atom.power,
                };
                Term::new(OperatorNode::Atom(node), place, text)
            }
            Piece::Tensor(tensor) => {
                let plain = Term::new(OperatorNode::Tensor(tensor.term.clone()), place, text.as_str());
                if tensor.adjoint { Term::new(OperatorNode::Adjoint(plain), place, text) } else { plain }
            }
            Piece::Named(named) => {
                let terms = named.expanded.iter().map(|(term, pieces)| {
                    let shown = term.coefficient.to_string();
                    let number = Term::new(ScalarNode::Exact(term.coefficient.clone()), place, shown.as_str());
                    let number = Term::new(OperatorNode::Scalar(number), place, shown.as_str());
                    let mut factors = vec![number];
                    factors.extend(pieces.iter().filter_map(|piece| self.piece_term(piece, place)));
                    let text = format!("({shown}) {}", pieces_key(pieces));
                    Term::new(OperatorNode::Product(factors), place, text)
                });
                Term::new(OperatorNode::Sum(terms.collect()), place, text)
            }
            Piece::Function(function) => self.function_term(function, place),
        })
    }

    fn function_term(&self, function: &FunctionPiece, place: Place) -> OperatorTerm {
        let slope = if function.slope == Sign::Plus { 1 } else { -1 };
        let linear = LinearInH {
            constant: self.term(&function.constant, place),
            slope: Term::new(ScalarNode::Exact(Surd::from(slope)), place, slope.to_string()),
            omitted: function.omitted.clone(),
        };
        let node = match function.function {
            None => OperatorNode::Resolvent(linear),
            Some(kind) => OperatorNode::Function(kind, linear),
        };
        Term::new(node, place, function.key.as_str())
    }
}
