//! From a sum of products of brackets to radial chains with exact factors.

use super::PathError;
use super::coefficients::Coefficients;
use super::columns::Columns;
use super::key::{Block, ChainKey, Endpoint, Orientation, RadialChain};
use super::walk::{Step, Walk};
use crate::angular::chain::{AngularVector, Bracket, ChainSum, Part, Product, State};
use crate::angular::polarization::{Component, ComponentError, IndexValue};
use crate::angular::selection::BlockRules;
use crate::angular::tensor::Sign;
use crate::angular::term::Level;
use crate::num::{Effort, Surd};
use std::collections::BTreeMap;

/// Longest chain.
const LONGEST: usize = 40;

/// Most factors, paths times columns.
const MOST_FACTORS: usize = 100_000;

/// Most steps from one level to another in one bracket.
const MOST_LINKS: usize = 1_000_000;

/// Most choices of the parts of operators, and of the values of summed indices.
const MOST_CHOICES: usize = 100_000;

/// What a decomposition takes for granted.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Setting {
    pub rules: BlockRules,
    pub orientation: Orientation,
}

impl Setting {
    pub fn new(rules: BlockRules) -> Self {
        Setting { rules, orientation: Orientation::SmallerTermFirst }
    }
}

/// One path: the intermediate levels of every bracket, the radial chain it belongs to, and its factors.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Contribution {
    /// Which product of the sum it comes from.
    pub product: usize,
    pub key: ChainKey,
    /// By bracket, in the order of the key, from left to right.
    pub levels: Vec<Vec<Level>>,
    /// By column.
    pub factors: Vec<Surd>,
}

/// All paths of a sum of chains.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Decomposition {
    pub columns: Columns,
    /// Ascending by product, key and levels.
    pub contributions: Vec<Contribution>,
}

/// Sum of factors by what they belong to.
type Sums = BTreeMap<(ChainKey, Vec<Vec<Level>>), Vec<Surd>>;

/// Some brackets of a product: their radial chains, levels, and the product of factors by column.
type Joined = (ChainKey, Vec<Vec<Level>>, Vec<Surd>);

/// Decomposes a sum of chains over its intermediate blocks.
///
/// A path whose triangles and parities close is kept even where its factor is zero.
/// Errors: states or components that do not exist; more paths than anyone reads.
/// Source: the Wigner-Eckart theorem link by link, in the conventions of [`crate::angular::tensor`].
pub fn decompose(sum: &ChainSum, setting: &Setting, effort: &Effort) -> Result<Decomposition, PathError> {
    for state in sum.states() {
        check_state(state)?;
    }
    let columns = Columns::of(sum)?;
    let mut work = Work { setting, columns: &columns, coefficients: Coefficients::default(), effort };
    let mut contributions = Vec::new();
    for (index, product) in sum.products.iter().enumerate() {
        check_count(contributions.len().saturating_mul(columns.len()), MOST_FACTORS)?;
        for ((key, levels), factors) in work.product(product)? {
            contributions.push(Contribution { product: index, key, levels, factors });
        }
    }
    Ok(Decomposition { columns, contributions })
}

fn check_state(state: &State) -> Result<(), PathError> {
    let outside = |m: i32, j: i32| (m - j) % 2 != 0 || m.abs() > j;
    let projection = || PathError::Projection { name: state.name.clone() };
    match state.vector {
        AngularVector::Coupled { j, m } => {
            if !state.term.has_momentum(j) {
                return Err(PathError::NoSuchLevel { name: state.name.clone(), term: state.term, j });
            }
            if m.is_some_and(|m| outside(m.twice(), j.twice())) {
                return Err(projection());
            }
        }
        AngularVector::Product { ml, ms } => {
            if outside(ml.twice(), state.term.twice_l()) || outside(ms.twice(), state.term.s.twice()) {
                return Err(projection());
            }
        }
    }
    Ok(())
}

struct Work<'a> {
    setting: &'a Setting,
    columns: &'a Columns,
    coefficients: Coefficients,
    effort: &'a Effort,
}

impl Work<'_> {
    fn product(&mut self, product: &Product) -> Result<Sums, PathError> {
        for bracket in &product.brackets {
            check_shape(bracket)?;
        }
        let mut sums = Sums::new();
        let places: Vec<&Vec<Part>> =
            product.brackets.iter().flat_map(|bracket| &bracket.operators).map(|operator| &operator.parts).collect();
        let mut choice = vec![0_usize; places.len()];
        if places.iter().any(|parts| parts.is_empty()) {
            return Ok(sums);
        }
        check_count(places.iter().map(|parts| parts.len()).fold(1, usize::saturating_mul), MOST_CHOICES)?;
        loop {
            self.effort.check()?;
            let parts: Vec<&Part> = places.iter().zip(&choice).map(|(parts, i)| &parts[*i]).collect();
            self.pure_product(product, &parts, &mut sums)?;
            if !advance(&mut choice, |place| places[place].len()) {
                return Ok(sums);
            }
        }
    }

    /// One choice of a part at every operator.
    fn pure_product(&mut self, product: &Product, parts: &[&Part], sums: &mut Sums) -> Result<(), PathError> {
        let mut coefficient = product.coefficient.clone();
        for part in parts {
            coefficient = &coefficient * &part.coefficient;
        }
        let indices = summed_indices(parts)?;
        let mut choice = vec![0_usize; indices.len()];
        check_count(indices.iter().fold(1, |count: usize, _| count.saturating_mul(3)), MOST_CHOICES)?;
        loop {
            let mut values: BTreeMap<&str, IndexValue> = BTreeMap::new();
            for (index, value) in indices.iter().zip(&choice) {
                values.insert(index, IndexValue { q: i32::try_from(*value).unwrap_or(0) - 1 });
            }
            let steps = steps(parts, &values)?;
            let mut rest = &steps[..];
            let start = ChainKey { symbol: product.symbol.clone(), brackets: Vec::new() };
            let mut joined = vec![(start, Vec::new(), vec![coefficient.clone(); self.columns.len()])];
            for bracket in &product.brackets {
                let (own, others) = rest.split_at(bracket.operators.len());
                rest = others;
                joined = self.join(joined, bracket, own)?;
            }
            for (mut key, mut levels, factors) in joined {
                sort_brackets(&mut key, &mut levels);
                let columns = self.columns.len();
                let slot = sums.entry((key, levels)).or_insert_with(|| vec![Surd::zero(); columns]);
                for (sum, factor) in slot.iter_mut().zip(&factors) {
                    *sum += factor;
                }
            }
            check_count(sums.len().saturating_mul(self.columns.len()), MOST_FACTORS)?;
            if !advance(&mut choice, |_| 3) {
                return Ok(());
            }
        }
    }

    /// Multiplies partial products with every path of one more bracket.
    fn join(&mut self, partial: Vec<Joined>, bracket: &Bracket, steps: &[Step]) -> Result<Vec<Joined>, PathError> {
        let mut walk = Walk {
            rules: &self.setting.rules,
            columns: self.columns,
            coefficients: &mut self.coefficients,
            effort: self.effort,
            limit: MOST_FACTORS,
            links: MOST_LINKS,
        };
        let paths = walk.run(&bracket.bra, steps, &bracket.ket)?;
        let all = partial.len().saturating_mul(paths.len());
        check_count(all.saturating_mul(self.columns.len()), MOST_FACTORS)?;
        let mut out = Vec::with_capacity(all);
        for (levels, factors) in &paths {
            let chain = radial_chain(bracket, steps, levels, self.setting.orientation);
            let sign = chain.orientation_sign();
            for (key, before, coefficients) in &partial {
                let mut key = key.clone();
                key.brackets.push(chain.clone());
                let mut all_levels = before.clone();
                all_levels.push(levels.clone());
                let products = coefficients.iter().zip(factors).map(|(a, b)| {
                    let product = a * b;
                    if sign == Sign::Minus { -&product } else { product }
                });
                out.push((key, all_levels, products.collect()));
            }
        }
        Ok(out)
    }
}

fn check_shape(bracket: &Bracket) -> Result<(), PathError> {
    let (operators, gaps) = (bracket.operators.len(), bracket.gaps.len());
    if operators > LONGEST {
        return Err(PathError::TooLong { limit: LONGEST });
    }
    if gaps != operators.saturating_sub(1) {
        return Err(PathError::Gaps { operators, gaps });
    }
    Ok(())
}

fn check_count(count: usize, limit: usize) -> Result<(), PathError> {
    if count > limit { Err(PathError::TooMany { limit }) } else { Ok(()) }
}

/// Moves a mixed-radix counter on; false when it has run through.
fn advance(choice: &mut [usize], radix: impl Fn(usize) -> usize) -> bool {
    for (place, digit) in choice.iter_mut().enumerate() {
        *digit += 1;
        if *digit < radix(place) {
            return true;
        }
        *digit = 0;
    }
    false
}

fn summed_indices<'a>(parts: &[&'a Part]) -> Result<Vec<&'a str>, PathError> {
    let mut counts: BTreeMap<&str, usize> = BTreeMap::new();
    for part in parts {
        if let Component::Index(index) = &part.component {
            *counts.entry(index).or_default() += 1;
        }
    }
    if let Some((index, count)) = counts.iter().find(|(_, count)| **count != 2) {
        return Err(ComponentError::IndexCount { index: (*index).to_string(), count: *count }.into());
    }
    Ok(counts.into_keys().collect())
}

fn steps<'a>(parts: &[&'a Part], values: &BTreeMap<&str, IndexValue>) -> Result<Vec<Step<'a>>, PathError> {
    let mut seen: Vec<&str> = Vec::new();
    let mut steps = Vec::with_capacity(parts.len());
    for part in parts {
        let first = match &part.component {
            Component::Index(index) => {
                let first = !seen.contains(&index.as_str());
                seen.push(index);
                first
            }
            _ => true,
        };
        let weights = part.component.weights(&part.tensor, values, first)?;
        steps.push(Step { tensor: &part.tensor, weights });
    }
    Ok(steps)
}

fn radial_chain(bracket: &Bracket, steps: &[Step], levels: &[Level], orientation: Orientation) -> RadialChain {
    let mut gaps = bracket.gaps.clone();
    let mut blocks = Vec::with_capacity(levels.len());
    for (i, level) in levels.iter().enumerate() {
        // functions of one H in one block commute
        gaps[i].sort();
        let beside = [&steps[i], &steps[i + 1]];
        let by_j = gaps[i].iter().any(|r| r.depends_on_j) || beside.iter().any(|s| s.tensor.element.depends_on_j);
        blocks.push(Block { term: level.term, j: by_j.then_some(level.j) });
    }
    let end = |state: &State| Endpoint { name: state.name.clone(), term: state.term };
    RadialChain {
        orientation,
        bra: end(&bracket.bra),
        elements: steps.iter().map(|step| step.tensor.element.radial()).collect(),
        blocks,
        gaps,
        ket: end(&bracket.ket),
    }
}

/// Brings the brackets into ascending order, with their levels.
pub(crate) fn sort_brackets(key: &mut ChainKey, levels: &mut [Vec<Level>]) {
    let mut pairs: Vec<(RadialChain, Vec<Level>)> =
        std::mem::take(&mut key.brackets).into_iter().zip(levels.iter_mut().map(std::mem::take)).collect();
    pairs.sort();
    for (slot, (chain, own)) in levels.iter_mut().zip(pairs) {
        key.brackets.push(chain);
        *slot = own;
    }
}
