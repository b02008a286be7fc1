//! What becomes of every radial chain of a sum: whether its exact factors cancel, why, under which assumption, and what is left.
//!
//! What this folder promises:
//!
//! - Zero means proved: a sum of exact factors that is zero, a chain equal to minus its reverse, or no path at all.
//! - A chain is merged with its reverse only where tau of every operator in it is known.
//! - Every zero comes with the levels that had to have one energy for it, and with what is left when they have not.

mod classes;
mod ranks;
mod residual;
mod words;

pub use classes::ChainPath;
pub use ranks::{RankPart, rank_parts};
pub use residual::{Form, Place, Raised, Residual};

use super::chain::{AngularVector, Bracket, ChainSum, Product};
use super::half_integer::HalfInteger;
use super::paths::{Broken, ChainKey, Columns, Decomposition, PathError, Setting, blocked, decompose};
use super::polarization::Component;
use super::selection::SelectionRule;
use super::term::Term;
use crate::num::{Effort, Surd};
use classes::{Class, assumed_equal, classes};
use residual::residual;
use std::collections::{BTreeMap, BTreeSet};

/// What becomes of one radial chain.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum Verdict {
    /// Every factor is zero by itself.
    NoPath { rule: SelectionRule },
    /// The factors of the chain add up to zero within every product of the sum, for every M.
    CancelsExactly,
    /// The factors add up to zero for every M, but only with those of other products.
    CancelsBetweenTerms { products: Vec<usize> },
    /// The chain is equal to its reverse, or to minus its reverse, and that makes it cancel for every M.
    VanishesByHermiticity {
        /// Whether the chain is minus its own reverse, so that it is zero whatever its factor.
        itself: bool,
        products: Vec<usize>,
    },
    /// The average over M is zero, and not every M by itself.
    CancelsMAverageOnly { also: Vec<HalfInteger>, ranks: Vec<u32> },
    /// Zero for these M only.
    CancelsForTheseM { projections: Vec<HalfInteger> },
    /// Every chain has the same multiple of its factor in another sum, so that a zero of that sum does not move.
    ProportionalTo { which: String, factor: Surd },
    /// Nothing cancels; the factors by column.
    Survives { factors: Vec<Surd> },
}

/// To which states a zero belongs.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Where {
    AsWritten,
    Projection(HalfInteger),
    Average,
}

/// One radial chain with everything known of it.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct ChainReport {
    pub key: ChainKey,
    pub paths: Vec<ChainPath>,
    /// The sum of the factors by column.
    pub sums: Vec<Surd>,
    /// The average over M, where every M is looked at.
    pub average: Option<Surd>,
    /// The parts of each tensor rank in the dependence on M, those that are not zero.
    pub ranks: Vec<RankPart>,
    pub verdict: Verdict,
    /// Terms whose levels of these J were given one energy.
    pub equal_levels: BTreeMap<Term, BTreeSet<HalfInteger>>,
    /// What the zeros leave when those levels are moved apart.
    pub residuals: Vec<(Where, Residual)>,
}

/// A product of the sum that has no path.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Closed {
    pub product: usize,
    /// Which bracket of it is closed.
    pub bracket: usize,
    pub broken: Vec<Broken>,
}

/// All radial chains of a sum.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Analysis {
    pub columns: Columns,
    pub chains: Vec<ChainReport>,
    pub closed: Vec<Closed>,
}

/// What a whole sum is by its angular factors alone.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Whole {
    /// Nothing in the sum has a path.
    NoPath,
    /// Zero for every state looked at.
    Zero,
    /// Zero for the M that was written, not for all.
    ZeroForAskedM,
    /// Zero in the average over M, not for all.
    ZeroOnAverage,
    NotZero,
}

/// Decomposes a sum and says what becomes of every radial chain.
///
/// `split` names the terms whose levels may be moved apart in the residuals; all where it is `None`.
pub fn analyse(
    sum: &ChainSum,
    setting: &Setting,
    split: Option<&BTreeSet<Term>>,
    effort: &Effort,
) -> Result<Analysis, PathError> {
    let decomposition = decompose(sum, setting, effort)?;
    let mut closed = Vec::new();
    for (index, product) in sum.products.iter().enumerate() {
        effort.check()?;
        if decomposition.contributions.iter().all(|c| c.product != index) {
            closed.push(closed_bracket(index, product, setting, effort)?);
        }
    }
    Ok(Analysis { closed, ..analyse_paths(sum, &decomposition, split) })
}

fn closed_bracket(index: usize, product: &Product, setting: &Setting, effort: &Effort) -> Result<Closed, PathError> {
    for (bracket, own) in product.brackets.iter().enumerate() {
        let broken = blocked(own, &setting.rules, effort)?;
        if !broken.is_empty() {
            return Ok(Closed { product: index, bracket, broken });
        }
    }
    Ok(Closed { product: index, bracket: 0, broken: Vec::new() })
}

fn analyse_paths(sum: &ChainSum, decomposition: &Decomposition, split: Option<&BTreeSet<Term>>) -> Analysis {
    let columns = decomposition.columns.clone();
    let mut chains = Vec::new();
    for (key, class) in classes(decomposition) {
        let sums = column_sums(class.paths.iter(), columns.len());
        let ranks = rank_parts(&columns, &sums);
        let verdict = verdict(sum, &columns, &key, &class, &sums, &ranks);
        let equal_levels = assumed_equal(&key, &class);
        let mut residuals = Vec::new();
        if class.paths.iter().any(ChainPath::is_live) && !class.odd {
            for (place, factors) in zeros(&columns, &class, &sums) {
                residuals.extend(residual(&key, &class, &factors, split).map(|r| (place, r)));
            }
        }
        let average = columns.average(&sums);
        chains.push(ChainReport { key, paths: class.paths, sums, average, ranks, verdict, equal_levels, residuals });
    }
    Analysis { columns, chains, closed: Vec::new() }
}

fn column_sums<'a>(paths: impl Iterator<Item = &'a ChainPath>, columns: usize) -> Vec<Surd> {
    let mut sums = vec![Surd::zero(); columns];
    for path in paths {
        for (sum, factor) in sums.iter_mut().zip(&path.factors) {
            *sum += factor;
        }
    }
    sums
}

/// The places where the sum is zero though single paths are not, with the factors of the paths there.
fn zeros(columns: &Columns, class: &Class, sums: &[Surd]) -> Vec<(Where, Vec<Surd>)> {
    let mut out = Vec::new();
    let projections = columns.projections();
    for (column, sum) in sums.iter().enumerate() {
        let factors: Vec<Surd> = class.paths.iter().map(|path| path.factors[column].clone()).collect();
        if sum.is_zero() && factors.iter().any(|factor| !factor.is_zero()) {
            out.push((projections.get(column).map_or(Where::AsWritten, |m| Where::Projection(*m)), factors));
        }
    }
    if columns.average(sums).is_some_and(|average| average.is_zero()) {
        let factors = class.paths.iter().map(|path| columns.average(&path.factors).unwrap_or_default()).collect();
        out.push((Where::Average, factors));
    }
    out
}

fn verdict(
    sum: &ChainSum,
    columns: &Columns,
    key: &ChainKey,
    class: &Class,
    sums: &[Surd],
    ranks: &[RankPart],
) -> Verdict {
    let all_zero = |sums: &[Surd]| sums.iter().all(Surd::is_zero);
    let live: BTreeSet<usize> = class.paths.iter().filter(|path| path.is_live()).map(|path| path.product).collect();
    if live.is_empty() {
        let products: BTreeSet<usize> = class.paths.iter().map(|path| path.product).collect();
        let fits = products.iter().any(|i| projections_fit(&sum.products[*i], columns));
        return Verdict::NoPath { rule: if fits { SelectionRule::SymbolVanishes } else { SelectionRule::Projection } };
    }
    let part = |product: Option<usize>, reversed: Option<bool>| {
        let chosen = class
            .paths
            .iter()
            .filter(|path| product.is_none_or(|p| p == path.product) && reversed.is_none_or(|r| r == path.reversed));
        all_zero(&column_sums(chosen, columns.len()))
    };
    if all_zero(sums) {
        if class.cancels_level_by_level(key, true) && !class.cancels_level_by_level(key, false) {
            return Verdict::VanishesByHermiticity { itself: false, products: live.into_iter().collect() };
        }
        let orientations = [false, true];
        if live.iter().all(|p| orientations.iter().all(|r| part(Some(*p), Some(*r)))) {
            return Verdict::CancelsExactly;
        }
        let unbalanced: Vec<usize> = live.iter().copied().filter(|p| !part(Some(*p), None)).collect();
        if orientations.iter().all(|r| part(None, Some(*r))) {
            return Verdict::CancelsBetweenTerms { products: unbalanced };
        }
        return Verdict::VanishesByHermiticity { itself: false, products: unbalanced };
    }
    if class.odd {
        return Verdict::VanishesByHermiticity { itself: true, products: Vec::new() };
    }
    let zero_at: Vec<HalfInteger> =
        columns.projections().into_iter().zip(sums).filter(|(_, sum)| sum.is_zero()).map(|(m, _)| m).collect();
    if columns.average(sums).is_some_and(|average| average.is_zero()) {
        let ranks = ranks.iter().map(|part| part.rank).collect();
        return Verdict::CancelsMAverageOnly { also: zero_at, ranks };
    }
    if !zero_at.is_empty() {
        return Verdict::CancelsForTheseM { projections: zero_at };
    }
    Verdict::Survives { factors: sums.to_vec() }
}

/// Whether the components of every bracket can add up to the difference of M of its ends.
fn projections_fit(product: &Product, columns: &Columns) -> bool {
    product.brackets.iter().all(|bracket| {
        let (Some(left), Some(right)) =
            (end_projections(bracket, columns, true), end_projections(bracket, columns, false))
        else {
            return true;
        };
        let mut reached: BTreeSet<i32> = BTreeSet::from([0]);
        for operator in &bracket.operators {
            let steps: BTreeSet<i32> = operator.parts.iter().flat_map(|part| shifts(&part.component)).collect();
            reached = reached.iter().flat_map(|m| steps.iter().map(move |step| m + step)).collect();
        }
        left.iter().zip(&right).any(|(bra, ket)| reached.iter().any(|q| bra - ket == 2 * q))
    })
}

fn shifts(component: &Component) -> Vec<i32> {
    match component {
        Component::Spherical(q) => vec![*q],
        Component::Along(direction) => direction.weights().into_iter().map(|(q, _)| q).collect(),
        Component::Index(_) | Component::Light | Component::LightConjugate => vec![-1, 0, 1],
    }
}

fn end_projections(bracket: &Bracket, columns: &Columns, left: bool) -> Option<Vec<i32>> {
    let state = if left { &bracket.bra } else { &bracket.ket };
    match (state.vector, columns) {
        (AngularVector::Product { ml, ms }, _) => Some(vec![ml.twice() + ms.twice(); columns.len()]),
        (AngularVector::Coupled { m: Some(m), .. }, Columns::AsWritten) => Some(vec![m.twice()]),
        (AngularVector::Coupled { m: Some(m), .. }, Columns::EveryM { asked: None, .. }) => {
            Some(vec![m.twice(); columns.len()])
        }
        (_, Columns::EveryM { .. }) => Some(columns.projections().into_iter().map(HalfInteger::twice).collect()),
        (AngularVector::Coupled { m: None, .. }, Columns::AsWritten) => None,
    }
}

impl Analysis {
    /// What the sum is as a whole, whatever the radial parts.
    pub fn whole(&self) -> Whole {
        let vanishes = |chain: &ChainReport| {
            matches!(chain.verdict, Verdict::VanishesByHermiticity { .. }) || chain.sums.iter().all(Surd::is_zero)
        };
        let all = |zero: &dyn Fn(&ChainReport) -> bool| self.chains.iter().all(|chain| vanishes(chain) || zero(chain));
        if self.chains.iter().all(|chain| matches!(chain.verdict, Verdict::NoPath { .. })) {
            return Whole::NoPath;
        }
        if all(&|_| false) {
            return Whole::Zero;
        }
        if self.columns.asked().is_some_and(|column| all(&|chain| chain.sums[column].is_zero())) {
            return Whole::ZeroForAskedM;
        }
        if all(&|chain| chain.average.as_ref().is_some_and(Surd::is_zero)) {
            Whole::ZeroOnAverage
        } else {
            Whole::NotZero
        }
    }

    /// By column, the one factor with which every radial chain of this sum is a multiple of the same chain in another; `None` where there is none.
    ///
    /// A chain whose factor vanishes in both is no obstacle; a sum without any chain is proportional to nothing.
    pub fn proportional_to(&self, other: &Analysis) -> Vec<Option<Surd>> {
        if self.columns.len() != other.columns.len() {
            return vec![None; self.columns.len()];
        }
        let zero = Surd::zero();
        let by_key = |analysis: &Analysis| -> BTreeMap<ChainKey, Vec<Surd>> {
            let live = analysis.chains.iter().filter(|chain| !chain.is_odd());
            live.map(|chain| (chain.key.clone(), chain.sums.clone())).collect()
        };
        let (own, theirs) = (by_key(self), by_key(other));
        let keys: BTreeSet<&ChainKey> = own.keys().chain(theirs.keys()).collect();
        let factor_of = |column: usize| {
            let mut common: Option<Surd> = None;
            for key in &keys {
                let value =
                    |map: &BTreeMap<ChainKey, Vec<Surd>>| map.get(*key).map_or(zero.clone(), |s| s[column].clone());
                let (a, b) = (value(&own), value(&theirs));
                if a.is_zero() && b.is_zero() {
                    continue;
                }
                let ratio = &a * &b.inverse()?;
                if ratio.is_zero() || common.as_ref().is_some_and(|common| *common != ratio) {
                    return None;
                }
                common = Some(ratio);
            }
            common
        };
        (0..self.columns.len()).map(factor_of).collect()
    }

    /// Turns the verdict of every chain that survives into a proportionality, where the sum is proportional to another for every state.
    #[must_use]
    pub fn compared_with(mut self, which: &str, other: &Analysis) -> Self {
        let factors = self.proportional_to(other);
        let Some(Some(factor)) = factors.first() else { return self };
        if factors.iter().any(|other| other.as_ref() != Some(factor)) {
            return self;
        }
        for chain in &mut self.chains {
            if matches!(chain.verdict, Verdict::Survives { .. }) {
                chain.verdict = Verdict::ProportionalTo { which: which.to_string(), factor: factor.clone() };
            }
        }
        self
    }
}

impl ChainReport {
    fn is_odd(&self) -> bool {
        matches!(self.verdict, Verdict::VanishesByHermiticity { itself: true, .. })
    }
}
