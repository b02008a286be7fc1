//! Selection rules: which blocks a system has, and which an operator joins.

use super::half_integer::HalfInteger;
use super::label::Electrons;
use super::tensor::{SpinExchange, Tensor};
use super::term::{Level, Parity, Term};
use std::collections::BTreeSet;

/// The rules that close a path.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub enum SelectionRule {
    /// L, k and L' do not close a triangle.
    OrbitalTriangle,
    /// S, s and S' do not close a triangle.
    SpinTriangle,
    /// J, K and J' do not close a triangle.
    TotalTriangle,
    Parity,
    /// The operator's behaviour under exchange of two spins.
    SpinExchange,
    /// The known angular element of the operator vanishes, as that of L between different L.
    KnownElement,
    /// So many electrons do not have this total spin.
    SpinOfElectrons,
    /// One electron has parity (-1)^l; two electrons have no odd S.
    ParityOfElectrons,
    /// The block was left out by the person who asked.
    LeftOut,
    /// The components do not add up to the difference of M.
    Projection,
    /// The triangles close, but a 3j or 9j symbol vanishes by its symmetry.
    SymbolVanishes,
}

impl SelectionRule {
    /// The rule in the words of the field.
    pub fn words(self) -> &'static str {
        match self {
            SelectionRule::OrbitalTriangle => "L, the orbital rank and L' do not form a triangle",
            SelectionRule::SpinTriangle => "S, the spin rank and S' do not form a triangle",
            SelectionRule::TotalTriangle => "J, the total rank and J' do not form a triangle",
            SelectionRule::Parity => "the parities do not match",
            SelectionRule::SpinExchange => "symmetry under exchange of the spins forbids it",
            SelectionRule::KnownElement => "the operator's angular element between these terms is zero",
            SelectionRule::SpinOfElectrons => "so many electrons do not have this spin",
            SelectionRule::ParityOfElectrons => "so few electrons have no such term of this parity",
            SelectionRule::LeftOut => "this block was left out",
            SelectionRule::Projection => "the components do not add up to the change of M",
            SelectionRule::SymbolVanishes => "a 3j or 9j symbol vanishes by its symmetry",
        }
    }
}

/// The blocks a system has, and those the person left in.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct BlockRules {
    pub electrons: Electrons,
    /// Only these spins, where said.
    pub spins: Option<BTreeSet<HalfInteger>>,
    /// Only these terms, where said.
    pub terms: Option<BTreeSet<Term>>,
}

impl BlockRules {
    pub const fn of(electrons: Electrons) -> Self {
        BlockRules { electrons, spins: None, terms: None }
    }

    /// The rule that excludes an intermediate term.
    pub fn forbids(&self, term: Term) -> Option<SelectionRule> {
        if !self.electrons.can_have_spin(term.s) {
            return Some(SelectionRule::SpinOfElectrons);
        }
        let odd_s_of_two = self.electrons.count == Some(2) && term.l == 0 && term.parity == Parity::Odd;
        if odd_s_of_two || (self.electrons.count == Some(1) && !term.is_natural()) {
            return Some(SelectionRule::ParityOfElectrons);
        }
        let spin_in = self.spins.as_ref().is_none_or(|spins| spins.contains(&term.s));
        let term_in = self.terms.as_ref().is_none_or(|terms| terms.contains(&term));
        (!spin_in || !term_in).then_some(SelectionRule::LeftOut)
    }

    /// The levels an operator joins with one, in either direction, ascending; those the system has where they are `inside` a chain.
    pub(crate) fn neighbours(&self, tensor: &Tensor, level: Level, inside: bool) -> Vec<Level> {
        let element = &tensor.element;
        let (l, s, j) = (level.term.twice_l(), level.term.s.twice(), level.j.twice());
        let parity = if element.odd_parity { level.term.parity.flipped() } else { level.term.parity };
        let mut out = Vec::new();
        for other_l in triangle_range(l, element.orbital) {
            for other_s in triangle_range(s, element.spin) {
                let l = u32::try_from(other_l / 2).unwrap_or(0);
                let term = level.term.other(l, HalfInteger::from_twice(other_s), parity);
                let absent = inside && self.forbids(term).is_some();
                if absent || self.operator_forbids(tensor, level.term, term).is_some() {
                    continue;
                }
                let momenta = triangle_range(j, tensor.total).map(HalfInteger::from_twice);
                out.extend(momenta.filter(|j| term.has_momentum(*j)).map(|j| Level::new(term, j)));
            }
        }
        out
    }

    /// The rule beyond triangles and parity by which an operator does not join two terms.
    fn operator_forbids(&self, tensor: &Tensor, a: Term, b: Term) -> Option<SelectionRule> {
        let exchanged = match tensor.element.exchange {
            SpinExchange::Symmetric => a.s != b.s,
            SpinExchange::Antisymmetric => a.s == b.s,
            SpinExchange::Unknown => false,
        };
        if self.electrons.count == Some(2) && exchanged {
            return Some(SelectionRule::SpinExchange);
        }
        tensor.element.known_factor_vanishes(a, b).then_some(SelectionRule::KnownElement)
    }

    /// Every rule broken by an operator on the way from a level to another; the second is checked as an intermediate block where `inside`.
    pub(crate) fn broken(&self, tensor: &Tensor, a: Level, b: Level, inside: bool) -> Vec<SelectionRule> {
        let element = &tensor.element;
        let mut out = Vec::new();
        let mut check = |holds: bool, rule| {
            if !holds {
                out.push(rule);
            }
        };
        let orbital = closes(a.term.twice_l(), element.orbital, b.term.twice_l());
        let spin = closes(a.term.s.twice(), element.spin, b.term.s.twice());
        // without L and S the triangle of J is the only one
        if !a.term.is_momentum_only() {
            check(orbital, SelectionRule::OrbitalTriangle);
            check(spin, SelectionRule::SpinTriangle);
        }
        check(closes(a.j.twice(), tensor.total, b.j.twice()), SelectionRule::TotalTriangle);
        check((a.term.parity != b.term.parity) == element.odd_parity, SelectionRule::Parity);
        // a symbol that vanishes by its triangle is no further rule
        if orbital && spin {
            out.extend(self.operator_forbids(tensor, a.term, b.term));
        }
        if inside {
            out.extend(self.forbids(b.term));
        }
        out
    }
}

fn triangle_range(twice: i32, rank: u32) -> impl Iterator<Item = i32> {
    let rank = 2 * i32::try_from(rank).unwrap_or(0);
    ((twice - rank).abs()..=twice + rank).step_by(2)
}

fn closes(a: i32, rank: u32, b: i32) -> bool {
    let rank = 2 * i32::try_from(rank).unwrap_or(0);
    (a + b) % 2 == 0 && (a - b).abs() <= rank && rank <= a + b
}
