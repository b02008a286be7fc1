//! The normal form of an expression: a sum of products of exact numbers, symbols and brackets.
//!
//! Definitions are put in, brackets are multiplied out into chains of single operators, and like products are joined. What the folder promises:
//! the sum equals the expression for every value of its symbols (which are real); products stand in the order they are first met in.

mod derive;
mod expand;
mod pieces;
mod strings;
mod symbols;
mod written;

pub use derive::{Coupled, Degeneracy};
pub use expand::{Conjugated, Expanded, Expander};
pub use pieces::{FunctionPiece, NamedOperator, NamedState, NormalAtom, NormalBracket, NormalTensor, Piece};
pub use symbols::Symbols;

use crate::angular::tensor::Sign;
use crate::num::Surd;
use crate::theory::terms::{ScalarFunction, ScalarTerm};
use rug::Rational;
use std::collections::HashMap;
use std::fmt;

/// A product: coefficient times symbols times brackets.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct NormalTerm {
    pub coefficient: Surd,
    pub symbols: Symbols,
    pub brackets: Vec<NormalBracket>,
}

/// What a symbol stands for.
#[derive(Clone, Debug)]
pub enum SymbolMeaning {
    /// A number as it is written, with the values of the variables around it.
    Given(ScalarTerm, Vec<(String, NormalSum)>),
    Energy(NamedState),
    /// A number inside a perturbation, which stays what it is when H changes.
    Held(NormalSum),
    /// A sum that stands in a denominator.
    Sum(NormalSum),
    Function(ScalarFunction, NormalSum),
    Power(NormalSum, NormalSum),
}

/// A sum of products.
#[derive(Clone, PartialEq, Eq, Debug, Default)]
pub struct NormalSum {
    pub terms: Vec<NormalTerm>,
}

impl NormalTerm {
    pub(super) fn number(coefficient: Surd) -> Self {
        NormalTerm { coefficient, symbols: Symbols::one(), brackets: Vec::new() }
    }

    pub(super) fn times(&self, other: &NormalTerm) -> Self {
        NormalTerm {
            coefficient: &self.coefficient * &other.coefficient,
            symbols: self.symbols.times(&other.symbols),
            brackets: self.brackets.iter().chain(&other.brackets).cloned().collect(),
        }
    }

    pub(super) fn conj(&self) -> Self {
        let mut coefficient = self.coefficient.conj();
        let mut brackets = Vec::with_capacity(self.brackets.len());
        for bracket in &self.brackets {
            let (sign, turned) = bracket.conj();
            if sign == Sign::Minus {
                coefficient = -&coefficient;
            }
            brackets.push(turned);
        }
        NormalTerm { coefficient, symbols: self.symbols.clone(), brackets }
    }

    /// What tells products apart, whatever their coefficients: brackets commute.
    fn key(&self) -> (Symbols, Vec<String>) {
        let mut brackets: Vec<String> = self.brackets.iter().map(NormalBracket::key).collect();
        brackets.sort();
        (self.symbols.clone(), brackets)
    }
}

impl NormalSum {
    pub(super) fn number(value: Surd) -> Self {
        NormalSum { terms: if value.is_zero() { Vec::new() } else { vec![NormalTerm::number(value)] } }
    }

    pub(super) fn symbol(symbol: impl Into<String>) -> Self {
        let symbols = Symbols::of(symbol);
        NormalSum { terms: vec![NormalTerm { coefficient: Surd::one(), symbols, brackets: Vec::new() }] }
    }

    /// The number the sum is, if no symbol and no bracket is left.
    pub fn as_number(&self) -> Option<Surd> {
        match self.terms.as_slice() {
            [] => Some(Surd::zero()),
            [one] if one.symbols.is_one() && one.brackets.is_empty() => Some(one.coefficient.clone()),
            _ => None,
        }
    }

    /// Joins like products and leaves out those that have cancelled.
    #[must_use]
    pub(super) fn joined(self) -> Self {
        let mut places: HashMap<(Symbols, Vec<String>), usize> = HashMap::new();
        let mut terms: Vec<NormalTerm> = Vec::new();
        for term in self.terms {
            match places.entry(term.key()) {
                std::collections::hash_map::Entry::Occupied(place) => {
                    terms[*place.get()].coefficient += &term.coefficient;
                }
                std::collections::hash_map::Entry::Vacant(place) => {
                    place.insert(terms.len());
                    terms.push(term);
                }
            }
        }
        terms.retain(|term| !term.coefficient.is_zero());
        NormalSum { terms }
    }

    #[must_use]
    pub(super) fn plus(mut self, other: NormalSum) -> Self {
        self.terms.extend(other.terms);
        self.joined()
    }

    #[must_use]
    pub(super) fn scaled(mut self, factor: &Surd) -> Self {
        for term in &mut self.terms {
            term.coefficient = &term.coefficient * factor;
        }
        self.terms.retain(|term| !term.coefficient.is_zero());
        self
    }

    /// The product of two sums; the number of products is for the caller to limit.
    pub(super) fn times(&self, other: &NormalSum) -> Self {
        let terms = self.terms.iter().flat_map(|a| other.terms.iter().map(move |b| a.times(b))).collect();
        NormalSum { terms }.joined()
    }

    /// The inverse of a single product without brackets.
    pub(super) fn inverse(&self) -> Option<Self> {
        let [one] = self.terms.as_slice() else { return None };
        if !one.brackets.is_empty() {
            return None;
        }
        let coefficient = one.coefficient.inverse()?;
        Some(NormalSum {
            terms: vec![NormalTerm { coefficient, symbols: one.symbols.inverse(), brackets: Vec::new() }],
        })
    }

    /// The complex conjugate.
    pub(super) fn conj(&self) -> Self {
        NormalSum { terms: self.terms.iter().map(NormalTerm::conj).collect() }
    }
}

/// Writes a coefficient in front of a product: nothing for 1, a minus for -1, parentheses around a sum.
fn coefficient_text(coefficient: &Surd, alone: bool) -> (bool, String) {
    let negative = coefficient.as_rational().map_or_else(
        || coefficient.term_count() == 1 && coefficient.to_string().starts_with('-'),
        |q| *q < Rational::new(),
    );
    let size = if negative { -coefficient } else { coefficient.clone() };
    let text = match (size.is_one(), alone) {
        (true, false) => String::new(),
        _ if size.term_count() > 1 => format!("({size})"),
        _ => size.to_string(),
    };
    (negative, text)
}

impl fmt::Display for NormalSum {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if self.terms.is_empty() {
            return write!(f, "0");
        }
        for (position, term) in self.terms.iter().enumerate() {
            let alone = term.symbols.is_one() && term.brackets.is_empty();
            let (negative, number) = coefficient_text(&term.coefficient, alone);
            match (position, negative) {
                (0, false) => {}
                (0, true) => write!(f, "-")?,
                (_, false) => write!(f, " + ")?,
                (_, true) => write!(f, " - ")?,
            }
            let mut parts = vec![number, term.symbols.to_string()];
            parts.extend(term.brackets.iter().map(NormalBracket::to_string));
            parts.retain(|part| !part.is_empty());
            write!(f, "{}", parts.join(" "))?;
        }
        Ok(())
    }
}
