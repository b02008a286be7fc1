//! First-order changes: what an expression gains when H becomes H + lambda V.
//!
//! The rules are closed, so that higher orders are changes of changes:
//! dE_a = <a|V|a>; d|a> = G'_a V|a> with G'_a = Q/(E_a - H), for normalised states; for a fraction f = Q/(c + s H), from which the states b are
//! left out, df = -f (dc + s V) f - sum over b of (|b><b| V G_b f + f G_b V |b><b|), G_b = Q/(E_b - H). H itself gains V.

use super::expand::{Arguments, Expanded, Expander, Strings};
use super::pieces::{FunctionPiece, NamedState, NormalBracket, Piece};
use super::{NormalSum, NormalTerm, SymbolMeaning, Symbols};
use crate::angular::tensor::Sign;
use crate::num::Surd;
use crate::theory::problem::{Fault, Problem};
use crate::theory::terms::*;
use rug::Rational;

/// What only a system knows of its states.
pub trait Degeneracy {
    /// All states of the level of a state, itself included.
    fn level_of(&mut self, state: &NamedState) -> Expanded<Vec<NamedState>>;

    /// All states of a manifold.
    fn members_of(&mut self, manifold: &ManifoldTerm) -> Expanded<Vec<NamedState>>;
}

/// Nothing is known of states but their names: every level has one state.
pub struct Unknown;

impl Degeneracy for Unknown {
    fn level_of(&mut self, state: &NamedState) -> Expanded<Vec<NamedState>> {
        Ok(vec![state.clone()])
    }

    fn members_of(&mut self, manifold: &ManifoldTerm) -> Expanded<Vec<NamedState>> {
        let fault = Fault::Other {
            message: format!("the states of {} are not known here", manifold.label.text),
            help: "vary expressions of a system with numbers".into(),
        };
        Err(Problem::new(manifold.place, fault))
    }
}

/// Takes changes under a perturbation.
pub struct Derivation<'d, 'e> {
    expander: &'d mut Expander<'e>,
    perturbation: Strings,
    place: Place,
}

impl<'d, 'e> Derivation<'d, 'e> {
    /// Changes under H -> H + lambda V.
    ///
    /// Errors: an operator that cannot be multiplied out.
    pub(super) fn new(
        expander: &'d mut Expander<'e>,
        perturbation: &OperatorTerm,
        arguments: &Arguments,
    ) -> Expanded<Self> {
        let mut held = Strings::new();
        for (term, pieces) in expander.operator(perturbation, arguments)? {
            held.push((expander.held(term), pieces));
        }
        Ok(Derivation { expander, perturbation: held, place: perturbation.place })
    }

    /// The change of a sum, to first order.
    ///
    /// Errors: functions of H other than fractions, and roots, which have no rule here; too many terms.
    /// Source: derived here from the spectral form of f(H); the rules for states and reduced resolvents are the standard ones with unit
    /// normalisation (compare Messiah, Quantum Mechanics, chapter 16).
    pub fn change(&mut self, sum: &NormalSum) -> Expanded<NormalSum> {
        let mut total = NormalSum::default();
        for term in &sum.terms {
            total.terms.extend(self.change_of_product(term)?.terms);
            self.expander.check(total.terms.len(), self.place)?;
        }
        Ok(total.joined())
    }

    fn change_of_product(&mut self, term: &NormalTerm) -> Expanded<NormalSum> {
        let mut total = NormalSum::default();
        for (symbol, power) in term.symbols.factors() {
            let inner = self.change_of_symbol(symbol)?;
            if inner.terms.is_empty() {
                continue;
            }
            let one_less = Symbols::of(symbol).inverse();
            let rest = NormalTerm {
                coefficient: term.coefficient.scaled(&Rational::from(power)),
                symbols: term.symbols.times(&one_less),
                brackets: term.brackets.clone(),
            };
            let changed = self.expander.product(&NormalSum { terms: vec![rest] }, &inner, self.place)?;
            total.terms.extend(changed.terms);
        }
        for (position, bracket) in term.brackets.iter().enumerate() {
            let mut others = term.clone();
            others.brackets.remove(position);
            let inner = self.change_of_bracket(bracket)?;
            let changed = self.expander.product(&NormalSum { terms: vec![others] }, &inner, self.place)?;
            total.terms.extend(changed.terms);
        }
        Ok(total)
    }

    fn change_of_symbol(&mut self, symbol: &str) -> Expanded<NormalSum> {
        let Some(meaning) = self.expander.meaning(symbol).cloned() else { return Ok(NormalSum::default()) };
        match meaning {
            SymbolMeaning::Given(term, _) => match &*term.node {
                ScalarNode::Root { .. } => self.expander.refuse(
                    term.place,
                    "a root moves with H, and that change has no formula here".into(),
                    "vary the expression whose root it is: the root moves by minus its change over its slope",
                ),
                _ => Ok(NormalSum::default()),
            },
            SymbolMeaning::Energy(state) => {
                let (bra, ket) = (Piece::Bra(state.clone()), Piece::Ket(state));
                Ok(NormalSum { terms: self.with_perturbation(&[bra], &[ket], &Surd::one())? }.joined())
            }
            SymbolMeaning::Held(_) => Ok(NormalSum::default()),
            SymbolMeaning::Sum(inner) => self.change(&inner),
            SymbolMeaning::Function(function, inner) => self.change_of_function(function, &inner),
            SymbolMeaning::Power(base, exponent) => {
                if !self.change(&exponent)?.terms.is_empty() {
                    return self.expander.refuse(
                        self.place,
                        "an exponent that changes with H has no rule here".into(),
                        "write the power as exp(b ln(a))",
                    );
                }
                // d b^e = e b^(e-1) db
                let whole = NormalSum::symbol(symbol);
                let inverse = self.expander.inverse(&base, self.place)?;
                let slope = self.expander.product(&whole, &inverse, self.place)?;
                let slope = self.expander.product(&slope, &exponent, self.place)?;
                let inner = self.change(&base)?;
                self.expander.product(&slope, &inner, self.place)
            }
        }
    }

    fn change_of_function(&mut self, function: ScalarFunction, inner: &NormalSum) -> Expanded<NormalSum> {
        let change = self.change(inner)?;
        if change.terms.is_empty() {
            return Ok(change);
        }
        let slope = match function {
            ScalarFunction::Exp => self.expander.function(ScalarFunction::Exp, inner),
            ScalarFunction::Ln => self.expander.inverse(inner, self.place)?,
            ScalarFunction::Sqrt => {
                let root = self.expander.function(ScalarFunction::Sqrt, inner);
                self.expander.inverse(&root, self.place)?.scaled(&Surd::from(Rational::from((1, 2))))
            }
            ScalarFunction::Sin => self.expander.function(ScalarFunction::Cos, inner),
            ScalarFunction::Cos => self.expander.function(ScalarFunction::Sin, inner).scaled(&Surd::from(-1)),
            ScalarFunction::Abs | ScalarFunction::Conj | ScalarFunction::Re | ScalarFunction::Im => {
                return self.expander.refuse(
                    self.place,
                    "abs, re and im of something that changes with H have no rule here".into(),
                    "vary what stands inside, then take the part",
                );
            }
        };
        self.expander.product(&slope, &change, self.place)
    }

    /// Left pieces, V, right pieces, for every term of V, as brackets.
    fn with_perturbation(&mut self, left: &[Piece], right: &[Piece], factor: &Surd) -> Expanded<Vec<NormalTerm>> {
        let mut terms = Vec::with_capacity(self.perturbation.len());
        for (number, pieces) in self.perturbation.clone() {
            let all = left.iter().chain(&pieces).chain(right).cloned().collect();
            let closed = self.expander.closed(all, self.place)?;
            let number = NormalSum { terms: vec![number] }.scaled(factor);
            terms.extend(self.expander.product(&number, &closed, self.place)?.terms);
        }
        Ok(terms)
    }

    fn reduced(&mut self, state: &NamedState, omitted: Vec<OmittedTerm>) -> Piece {
        let energy = self.expander.energy(state);
        let piece = FunctionPiece::written(None, energy, Sign::Minus, omitted);
        Piece::Function(self.expander.named_function(piece))
    }

    fn change_of_bracket(&mut self, bracket: &NormalBracket) -> Expanded<NormalSum> {
        let minus = Surd::from(-1);
        let all: Vec<Piece> = std::iter::once(Piece::Bra(bracket.bra.clone()))
            .chain(bracket.pieces.iter().cloned())
            .chain(std::iter::once(Piece::Ket(bracket.ket.clone())))
            .collect();
        let mut total = NormalSum::default();
        for (position, piece) in all.iter().enumerate() {
            let (left, right) = (&all[..position], &all[position + 1..]);
            match piece {
                Piece::Bra(state) => {
                    let resolvent = self.reduced(state, vec![OmittedTerm::LevelOf(state.term.clone())]);
                    let after: Vec<Piece> = std::iter::once(resolvent).chain(right.iter().cloned()).collect();
                    total.terms.extend(self.with_perturbation(std::slice::from_ref(piece), &after, &Surd::one())?);
                }
                Piece::Ket(state) => {
                    let resolvent = self.reduced(state, vec![OmittedTerm::LevelOf(state.term.clone())]);
                    let before: Vec<Piece> = left.iter().cloned().chain(std::iter::once(resolvent)).collect();
                    total.terms.extend(self.with_perturbation(&before, std::slice::from_ref(piece), &Surd::one())?);
                }
                Piece::Hamiltonian => total.terms.extend(self.with_perturbation(left, right, &Surd::one())?),
                Piece::Function(function) => {
                    let changed = self.change_of_fraction(function, left, right, &minus)?;
                    total.terms.extend(changed.terms);
                }
                Piece::Atom(_) | Piece::Tensor(_) | Piece::Named(_) => {}
            }
        }
        Ok(total.joined())
    }

    fn change_of_fraction(
        &mut self,
        function: &FunctionPiece,
        left: &[Piece],
        right: &[Piece],
        minus: &Surd,
    ) -> Expanded<NormalSum> {
        if function.function.is_some() {
            return self.expander.refuse(
                self.place,
                format!("the change of {} has no rule here: it is no fraction", function.label),
                "vary fractions of H",
            );
        }
        let piece = Piece::Function(function.clone());
        let before: Vec<Piece> = left.iter().cloned().chain(std::iter::once(piece.clone())).collect();
        let after: Vec<Piece> = std::iter::once(piece.clone()).chain(right.iter().cloned()).collect();
        // -f s V f
        let sign = if function.slope == Sign::Plus { minus.clone() } else { Surd::one() };
        let mut total = NormalSum { terms: self.with_perturbation(&before, &after, &sign)? };
        // -f dc f
        let constant = self.change(&function.constant)?;
        let twice = before.iter().chain(&after).cloned().collect();
        let squared = self.expander.closed(twice, self.place)?;
        total.terms.extend(self.expander.product(&constant, &squared, self.place)?.scaled(minus).terms);
        // -sum over b of (|b><b| V G_b f + f G_b V |b><b|)
        for state in self.left_out(&function.omitted)? {
            let resolvent = self.reduced(&state, function.omitted.clone());
            let (ket, bra) = (Piece::Ket(state.clone()), Piece::Bra(state));
            let outer: Vec<Piece> = left.iter().cloned().chain([ket.clone(), bra.clone()]).collect();
            let inner: Vec<Piece> = std::iter::once(resolvent.clone()).chain(after.iter().cloned()).collect();
            total.terms.extend(self.with_perturbation(&outer, &inner, minus)?);
            let inner: Vec<Piece> = before.iter().cloned().chain(std::iter::once(resolvent)).collect();
            let outer: Vec<Piece> = [ket, bra].into_iter().chain(right.iter().cloned()).collect();
            total.terms.extend(self.with_perturbation(&inner, &outer, minus)?);
        }
        Ok(total)
    }

    /// The states that a function of H leaves out.
    fn left_out(&mut self, omitted: &[OmittedTerm]) -> Expanded<Vec<NamedState>> {
        let mut states: Vec<NamedState> = Vec::new();
        for group in omitted {
            let found = match group {
                OmittedTerm::LevelOf(state) => {
                    let named = self.expander.named_state(state)?;
                    self.expander.degeneracy.level_of(&named)?
                }
                OmittedTerm::Manifold(manifold) => self.expander.degeneracy.members_of(manifold)?,
            };
            for state in found {
                if !states.contains(&state) {
                    states.push(state);
                }
            }
        }
        Ok(states)
    }
}

/// Two states of one level and what couples them.
pub struct Coupled {
    pub left: NamedState,
    pub right: NamedState,
    /// Of first order in the perturbation, or of second by way of other levels.
    pub order: u32,
    pub element: NormalSum,
}

/// Whether a perturbation holds parts that change with H themselves: H, functions of H, projectors on eigenstates.
pub(super) fn moves_with_h(strings: &Strings) -> bool {
    let moves =
        |piece: &Piece| matches!(piece, Piece::Hamiltonian | Piece::Function(_) | Piece::Bra(_) | Piece::Ket(_));
    strings.iter().flat_map(|(_, pieces)| pieces).any(moves)
}

impl Expander<'_> {
    /// A product in front of a perturbation, with all that changes with H held as it is: H + lambda (V - <g|V|g>) shifts by one number.
    fn held(&mut self, term: NormalTerm) -> NormalTerm {
        let letters =
            term.symbols.factors().all(|(symbol, _)| matches!(self.meaning(symbol), Some(SymbolMeaning::Given(..))));
        if term.brackets.is_empty() && letters {
            return term;
        }
        let number = NormalSum { terms: vec![NormalTerm { coefficient: Surd::one(), ..term.clone() }] };
        let symbol = self.symbol(format!("({number})"), SymbolMeaning::Held(number));
        let symbols = symbol.terms.into_iter().next().map_or_else(Symbols::one, |term| term.symbols);
        NormalTerm { coefficient: term.coefficient, symbols, brackets: Vec::new() }
    }

    /// The elements of a perturbation inside the levels that an expression rests on, up to second order where `twice` says so.
    ///
    /// All of them have to vanish for the rules of variation to hold state by state.
    pub fn couplings(&mut self, sum: &NormalSum, perturbation: &OperatorTerm, twice: bool) -> Expanded<Vec<Coupled>> {
        let strings = self.operator(perturbation, &Arguments::new())?;
        let mut states: Vec<NamedState> = Vec::new();
        let add = |states: &mut Vec<NamedState>, state: &NamedState| {
            if !states.contains(state) {
                states.push(state.clone());
            }
        };
        for term in &sum.terms {
            for (symbol, _) in term.symbols.factors() {
                if let Some(SymbolMeaning::Energy(state)) = self.meaning(symbol) {
                    let state = state.clone();
                    add(&mut states, &state);
                }
            }
            for bracket in &term.brackets {
                add(&mut states, &bracket.bra);
                add(&mut states, &bracket.ket);
            }
        }
        let mut found = Vec::new();
        for state in states {
            let level = self.degeneracy.level_of(&state)?;
            for other in level.into_iter().filter(|other| *other != state) {
                self.check(0, perturbation.place)?;
                let (bra, ket) = (Piece::Bra(other.clone()), Piece::Ket(state.clone()));
                let mut chains = vec![(1, Vec::new())];
                if twice {
                    let energy = self.energy(&state);
                    let omitted = vec![OmittedTerm::LevelOf(state.term.clone())];
                    let reduced = FunctionPiece::written(None, energy, Sign::Minus, omitted);
                    chains.push((2, vec![Piece::Function(self.named_function(reduced))]));
                }
                for (order, between) in chains {
                    let mut element = NormalSum::default();
                    for (number, pieces) in &strings {
                        let rights: &Strings =
                            if order == 1 { &vec![(NormalTerm::number(Surd::one()), Vec::new())] } else { &strings };
                        for (second, after) in rights {
                            let all = std::iter::once(&bra).chain(pieces).chain(&between).chain(after).chain([&ket]);
                            let closed = self.closed(all.cloned().collect(), perturbation.place)?;
                            let factor = NormalSum { terms: vec![number.times(second)] };
                            element.terms.extend(self.product(&factor, &closed, perturbation.place)?.terms);
                        }
                    }
                    let element = element.joined();
                    if !element.terms.is_empty() {
                        found.push(Coupled { left: other.clone(), right: state.clone(), order, element });
                    }
                }
            }
        }
        Ok(found)
    }
}
