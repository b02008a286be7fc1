//! Verdicts in words, and sums spelt out.

use super::{ChainPath, ChainReport, Verdict, Where};
use crate::angular::half_integer::HalfInteger;
use crate::angular::paths::ChainKey;
use crate::angular::term::{Level, Term};
use crate::num::Surd;
use std::collections::BTreeSet;

impl ChainReport {
    /// The sum of the factors with every term: `0 = -2/9 (J=0) + 2/9 (J=2)`.
    pub fn spelled(&self, place: Where, columns: &super::Columns) -> Option<String> {
        let column = match place {
            Where::AsWritten => Some(0),
            Where::Projection(m) => Some(columns.projections().iter().position(|p| *p == m)?),
            Where::Average => None,
        };
        let pick = |factors: &[Surd]| match column {
            Some(column) => factors.get(column).cloned(),
            None => columns.average(factors),
        };
        let products: BTreeSet<usize> = self.paths.iter().map(|path| path.product).collect();
        // paths that differ only in what the label does not say are added first
        let mut terms: Vec<(String, Surd)> = Vec::new();
        for path in &self.paths {
            let factor = pick(&path.factors)?;
            let label = path.label(&self.key, products.len() > 1);
            match terms.iter_mut().find(|(known, _)| *known == label) {
                Some((_, sum)) => *sum += &factor,
                None => terms.push((label, factor)),
            }
        }
        let mut text = format!("{} =", pick(&self.sums)?);
        let mut empty = true;
        for (label, factor) in terms.iter().filter(|(_, factor)| !factor.is_zero()) {
            let shown = factor.to_string();
            let simple = factor.term_count() == 1 && !shown.contains(" + ") && !shown[1..].contains(" - ");
            match (empty, simple, shown.strip_prefix('-')) {
                (true, true, _) => text += &format!(" {shown}"),
                (true, false, _) => text += &format!(" ({shown})"),
                (false, true, Some(size)) => text += &format!(" - {size}"),
                (false, true, None) => text += &format!(" + {shown}"),
                (false, false, _) => text += &format!(" + ({shown})"),
            }
            if !label.is_empty() {
                text += &format!(" ({label})");
            }
            empty = false;
        }
        if empty {
            text += " no term";
        }
        Some(text)
    }

    /// The assumption under which factors were added, as `^3P_0, ^3P_1, ^3P_2 have one energy`; empty for none.
    pub fn assumption(&self) -> String {
        let sentence = |(term, momenta): (&Term, &BTreeSet<HalfInteger>)| {
            let levels: Vec<String> = momenta.iter().map(|j| Level::new(*term, *j).to_string()).collect();
            format!("{} have one energy", levels.join(", "))
        };
        self.equal_levels.iter().map(sentence).collect::<Vec<_>>().join("; ")
    }
}

impl ChainPath {
    /// `J=0`, or `J=1,0,1` where it changes on the way; with the product it comes from where there are several.
    ///
    /// The J of a place where operators touch is not told: no energy belongs to it.
    pub fn label(&self, key: &ChainKey, with_product: bool) -> String {
        let mut parts = Vec::new();
        if with_product {
            parts.push(format!("term {}", self.product + 1));
        }
        for (levels, chain) in self.levels.iter().zip(&key.brackets) {
            let told = levels.iter().zip(&chain.gaps).filter(|(_, gap)| !gap.is_empty());
            let momenta: Vec<String> = told.map(|(level, _)| level.j.to_string()).collect();
            let Some(first) = momenta.first() else { continue };
            let same = momenta.iter().all(|j| j == first);
            parts.push(format!("J={}", if same { first.clone() } else { momenta.join(",") }));
        }
        parts.join(", ")
    }
}

fn listed(projections: &[HalfInteger]) -> String {
    projections.iter().map(HalfInteger::to_string).collect::<Vec<_>>().join(", ")
}

fn terms(products: &[usize]) -> String {
    products.iter().map(|p| (p + 1).to_string()).collect::<Vec<_>>().join(", ")
}

fn rank_names(ranks: &[u32]) -> String {
    let name = |rank: &u32| match rank {
        0 => "scalar".to_string(),
        1 => "vector".to_string(),
        2 => "tensor".to_string(),
        other => format!("rank {other}"),
    };
    ranks.iter().map(name).collect::<Vec<_>>().join(" and ")
}

impl Verdict {
    /// The verdict as a sentence without its numbers.
    pub fn sentence(&self) -> String {
        match self {
            Verdict::NoPath { rule } => format!("no path: {}", rule.words()),
            Verdict::CancelsExactly => "cancels exactly".into(),
            Verdict::CancelsBetweenTerms { products } => format!("cancels between the terms {}", terms(products)),
            Verdict::VanishesByHermiticity { itself: true, .. } => {
                "vanishes: the chain is minus its own reverse".into()
            }
            Verdict::VanishesByHermiticity { products, .. } if products.len() > 1 => {
                format!(
                    "vanishes by hermiticity, between the terms {}: each chain cancels its reverse",
                    terms(products)
                )
            }
            Verdict::VanishesByHermiticity { .. } => "vanishes by hermiticity: each chain cancels its reverse".into(),
            Verdict::CancelsMAverageOnly { also, ranks } => {
                let left = match ranks.len() {
                    0 => String::new(),
                    1 => format!("; the {} part is left", rank_names(ranks)),
                    _ => format!("; the {} parts are left", rank_names(ranks)),
                };
                let also = if also.is_empty() { String::new() } else { format!(" and for M = {}", listed(also)) };
                format!("cancels in the average over M{also}, not for every M{left}")
            }
            Verdict::CancelsForTheseM { projections } => format!("cancels only for M = {}", listed(projections)),
            Verdict::ProportionalTo { which, factor } => {
                format!("{factor} times the same chain in {which}: a zero of {which} stays where it is")
            }
            Verdict::Survives { factors } => match factors.first() {
                Some(first) if factors.iter().all(|factor| factor == first) => {
                    format!("survives with the factor {first}")
                }
                _ => "survives".into(),
            },
        }
    }
}
