//! Radial chains that are equal to their own reverse, merged into one.

use crate::angular::half_integer::HalfInteger;
use crate::angular::paths::{ChainKey, Decomposition, RadialChain, sort_brackets};
use crate::angular::tensor::Sign;
use crate::angular::term::{Level, Term};
use crate::num::Surd;
use std::collections::{BTreeMap, BTreeSet};

/// One path of a radial chain.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct ChainPath {
    /// Which product of the sum it comes from.
    pub product: usize,
    /// Whether a bracket was turned round to make the chain the same as the others.
    pub reversed: bool,
    /// By bracket, from left to right.
    pub levels: Vec<Vec<Level>>,
    /// By column, for the chain as it is written in the key.
    pub factors: Vec<Surd>,
}

impl ChainPath {
    pub(super) fn is_live(&self) -> bool {
        self.factors.iter().any(|factor| !factor.is_zero())
    }
}

/// All paths of one radial chain.
pub(super) struct Class {
    pub(super) paths: Vec<ChainPath>,
    /// Whether reversal turns the chain into minus itself, so that it is zero.
    pub(super) odd: bool,
    /// By bracket, whether it is equal to its own reverse.
    pub(super) symmetric: Vec<bool>,
}

impl Class {
    /// Whether the factors cancel for every choice of levels by themselves, so that no two energies have to be equal.
    ///
    /// `mirrored`: the two readings of a symmetric bracket count as one choice.
    pub(super) fn cancels_level_by_level(&self, key: &ChainKey, mirrored: bool) -> bool {
        let mut sums: BTreeMap<Vec<Vec<Option<Level>>>, Vec<Surd>> = BTreeMap::new();
        for path in &self.paths {
            let mut choice = Vec::with_capacity(path.levels.len());
            for ((own, chain), symmetric) in path.levels.iter().zip(&key.brackets).zip(&self.symmetric) {
                // where operators touch, no energy is involved
                let told: Vec<Option<Level>> =
                    own.iter().zip(&chain.gaps).map(|(level, gap)| (!gap.is_empty()).then_some(*level)).collect();
                let mut turned = told.clone();
                turned.reverse();
                choice.push(if mirrored && *symmetric { told.min(turned) } else { told });
            }
            let slot = sums.entry(choice).or_default();
            slot.resize(path.factors.len(), Surd::zero());
            for (sum, factor) in slot.iter_mut().zip(&path.factors) {
                *sum += factor;
            }
        }
        sums.values().flatten().all(Surd::is_zero)
    }
}

/// Groups contributions by radial chain; a chain and its reverse are one where tau of every operator is known.
pub(super) fn classes(decomposition: &Decomposition) -> BTreeMap<ChainKey, Class> {
    let mut classes: BTreeMap<ChainKey, Class> = BTreeMap::new();
    for contribution in &decomposition.contributions {
        let mut key = contribution.key.clone();
        let mut levels = contribution.levels.clone();
        let (mut sign, mut reversed, mut odd) = (Sign::Plus, false, false);
        for (chain, own) in key.brackets.iter_mut().zip(&mut levels) {
            let Some((turned, turned_sign)) = chain.reversed() else { continue };
            if turned < *chain {
                *chain = turned;
                own.reverse();
                sign = sign.times(turned_sign);
                reversed = true;
            } else if turned == *chain && turned_sign == Sign::Minus {
                odd = true;
            }
        }
        sort_brackets(&mut key, &mut levels);
        let negative = sign == Sign::Minus;
        let factors = contribution.factors.iter().map(|f| if negative { -f } else { f.clone() }).collect();
        let class = classes.entry(key).or_insert_with_key(|key| {
            let even = |chain: &RadialChain| chain.reversed() == Some((chain.clone(), Sign::Plus));
            Class { paths: Vec::new(), odd, symmetric: key.brackets.iter().map(even).collect() }
        });
        class.paths.push(ChainPath { product: contribution.product, reversed, levels, factors });
    }
    classes
}

/// The levels that have one energy in every resolvent where the factors of a chain are added: terms with several J, and their J.
pub(super) fn assumed_equal(key: &ChainKey, class: &Class) -> BTreeMap<Term, BTreeSet<HalfInteger>> {
    let mut out: BTreeMap<Term, BTreeSet<HalfInteger>> = BTreeMap::new();
    if class.odd || class.cancels_level_by_level(key, true) {
        return out;
    }
    for (place, chain) in key.brackets.iter().enumerate() {
        for (gap, block) in chain.blocks.iter().enumerate() {
            if block.j.is_some() || chain.gaps[gap].is_empty() {
                continue;
            }
            let momenta: BTreeSet<HalfInteger> =
                class.paths.iter().filter(|path| path.is_live()).map(|path| path.levels[place][gap].j).collect();
            if momenta.len() > 1 {
                out.entry(block.term).or_default().extend(momenta);
            }
        }
    }
    out
}
