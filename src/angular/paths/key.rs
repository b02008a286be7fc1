//! Radial chains: what is left of a path when its angular factor is taken out.

use crate::angular::chain::Resolvent;
use crate::angular::half_integer::HalfInteger;
use crate::angular::tensor::{Element, Sign};
use crate::angular::term::Term;
use std::fmt;

/// The order in which the two sides of a reduced element are written.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
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

    /// The chain read from the right, and the sign it is equal to this one with; `None` where tau of an operator is not known.
    ///
    /// Range: real radial elements, which is what a known tau says; any z, since a real H makes resolvents symmetric.
    pub fn reversed(&self, orientation: Orientation) -> Option<(RadialChain, Sign)> {
        let terms = self.terms();
        let mut sign = Sign::Plus;
        for (element, sides) in self.elements.iter().zip(terms.windows(2)) {
            let turned = element.reversal(sides[0], sides[1])?;
            let already = orientation == Orientation::SmallerTermFirst && sides[0] != sides[1];
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

/// The sign that writing every element of known tau with its smaller term first costs.
pub(super) fn orientation_sign(elements: &[Element], terms: &[Term]) -> Sign {
    let mut sign = Sign::Plus;
    for (element, sides) in elements.iter().zip(terms.windows(2)) {
        if sides[0] > sides[1] {
            sign = sign.times(element.reversal(sides[0], sides[1]).unwrap_or(Sign::Plus));
        }
    }
    sign
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
            Some(j) => write!(f, "{}_{j}", self.term),
            None => write!(f, "{}", self.term),
        }
    }
}

/// Writes the reduced elements from left to right with the resolvents between them: `<g||D||^3P> R <^3P||D||g>`.
impl fmt::Display for RadialChain {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if self.elements.is_empty() {
            return write!(f, "<{}|{}>", self.bra.name, self.ket.name);
        }
        let mut sides = vec![self.bra.name.clone()];
        sides.extend(self.blocks.iter().map(Block::to_string));
        sides.push(self.ket.name.clone());
        for (i, element) in self.elements.iter().enumerate() {
            if i > 0 {
                write!(f, " ")?;
                for resolvent in &self.gaps[i - 1] {
                    write!(f, "{} ", resolvent.label)?;
                }
            }
            write!(f, "<{}||{}||{}>", sides[i], element.name, sides[i + 1])?;
        }
        Ok(())
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
