//! Radial chains: what is left of a path when its angular factor is taken out.

use crate::angular::chain::Resolvent;
use crate::angular::half_integer::HalfInteger;
use crate::angular::tensor::{Element, IDENTITY, Sign};
use crate::angular::term::{Level, Term};
use std::fmt;

/// The order in which the two sides of a reduced element are written.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub enum Orientation {
    /// `<bra||O||ket>` as the chain has it.
    AsWritten,
    /// The smaller term on the left where tau of the operator is known, so that <S||D||P> <P||D||S> becomes -<S||D||P>^2.
    SmallerTermFirst,
}

/// The radial function at the end of a chain.
#[derive(Clone, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub struct Endpoint {
    pub name: String,
    pub term: Term,
}

/// An intermediate block of a radial chain; J only where something in the chain depends on it.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub struct Block {
    pub term: Term,
    pub j: Option<HalfInteger>,
}

/// Everything the radial part of one bracket depends on.
#[derive(Clone, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub struct RadialChain {
    pub orientation: Orientation,
    pub bra: Endpoint,
    pub elements: Vec<Element>,
    pub blocks: Vec<Block>,
    pub gaps: Vec<Vec<Resolvent>>,
    pub ket: Endpoint,
}

impl RadialChain {
    /// The terms from bra to ket, one more than elements.
    pub fn terms(&self) -> Vec<Term> {
        let inside = self.blocks.iter().map(|block| block.term);
        std::iter::once(self.bra.term).chain(inside).chain(std::iter::once(self.ket.term)).collect()
    }

    /// The sign with which the radial element of an operator turns round, where it is written with its smaller term first and that is not the
    /// order of the chain.
    fn turned(&self, element: &Element, sides: &[Term]) -> Option<Sign> {
        let turns = self.orientation == Orientation::SmallerTermFirst && sides[0] > sides[1];
        if turns { element.reversal(sides[0], sides[1]) } else { None }
    }

    /// The sign that the orientation costs the whole chain.
    pub(super) fn orientation_sign(&self) -> Sign {
        let terms = self.terms();
        let signs =
            self.elements.iter().zip(terms.windows(2)).filter_map(|(element, sides)| self.turned(element, sides));
        signs.fold(Sign::Plus, Sign::times)
    }

    /// The chain read from the right, and the sign it is equal to this one with; `None` where tau of an operator is not known.
    ///
    /// Range: real radial elements, which is what a known tau says; any z, since a real H makes resolvents symmetric.
    pub fn reversed(&self) -> Option<(RadialChain, Sign)> {
        let terms = self.terms();
        let mut sign = Sign::Plus;
        for (element, sides) in self.elements.iter().zip(terms.windows(2)) {
            let turned = element.reversal(sides[0], sides[1])?;
            let already = self.orientation == Orientation::SmallerTermFirst && sides[0] != sides[1];
            if !already {
                sign = sign.times(turned);
            }
        }
        let mut chain = self.clone();
        chain.elements.reverse();
        chain.blocks.reverse();
        chain.gaps.reverse();
        std::mem::swap(&mut chain.bra, &mut chain.ket);
        Some((chain, sign))
    }
}

/// The radial part of a product of brackets.
#[derive(Clone, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub struct ChainKey {
    /// The scalar factor without a number.
    pub symbol: String,
    /// Ascending.
    pub brackets: Vec<RadialChain>,
}

/// Writes `^3P`, or `^3P_1` where J matters.
impl fmt::Display for Block {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self.j {
            Some(j) => write!(f, "{}", Level::new(self.term, j)),
            None => write!(f, "{}", self.term),
        }
    }
}

/// Writes the reduced elements from left to right with the resolvents between them, each in the orientation its factor is for:
/// `<g||D||^3P> R <g||D||^3P>` with the smaller term first.
impl fmt::Display for RadialChain {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if self.elements.is_empty() {
            return write!(f, "<{}|{}>", self.bra.name, self.ket.name);
        }
        let mut sides = vec![self.bra.name.clone()];
        sides.extend(self.blocks.iter().map(Block::to_string));
        sides.push(self.ket.name.clone());
        let terms = self.terms();
        let mut parts: Vec<String> = Vec::new();
        for (i, element) in self.elements.iter().enumerate() {
            if i > 0 {
                parts.extend(self.gaps[i - 1].iter().map(|resolvent| resolvent.label.clone()));
            }
            // L, S and J leave the radial function as it is
            if element.name == IDENTITY {
                if sides[i] != sides[i + 1] {
                    parts.push(format!("<{}|{}>", sides[i], sides[i + 1]));
                }
                continue;
            }
            let turned = self.turned(element, &terms[i..i + 2]).is_some();
            let (left, right) = if turned { (i + 1, i) } else { (i, i + 1) };
            parts.push(format!("<{}||{}||{}>", sides[left], element.name, sides[right]));
        }
        if parts.is_empty() {
            return write!(f, "<{}|{}>", self.bra.name, self.ket.name);
        }
        write!(f, "{}", parts.join(" "))
    }
}

impl fmt::Display for ChainKey {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let mut parts: Vec<String> = self.brackets.iter().map(RadialChain::to_string).collect();
        if !self.symbol.is_empty() {
            parts.insert(0, self.symbol.clone());
        }
        write!(f, "{}", parts.join(" * "))
    }
}
