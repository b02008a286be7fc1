//! What is left of a cancellation when the levels of a term are moved apart.

use super::classes::{ChainPath, Class};
use crate::angular::paths::ChainKey;
use crate::angular::tensor::Sign;
use crate::angular::term::{Level, Term};
use crate::num::Surd;
use rug::{Integer, Rational};
use std::collections::{BTreeMap, BTreeSet};
use std::fmt;

/// Highest order in the splittings that is looked at.
const HIGHEST_ORDER: usize = 3;

/// A homogeneous polynomial in the energy shifts of levels.
#[derive(Clone, PartialEq, Eq, Debug, Default)]
pub struct Form {
    /// The coefficient of every product of shifts, the levels ascending.
    pub monomials: BTreeMap<Vec<Level>, Surd>,
}

/// The place of a resolvent in a radial chain.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Debug)]
pub struct Place {
    pub bracket: usize,
    pub gap: usize,
    /// Among the resolvents of the gap.
    pub resolvent: usize,
}

/// A polynomial in the shifts with the chain it multiplies: every resolvent named in `raised` stands there once more, squared for once.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Raised {
    pub raised: Vec<Place>,
    pub form: Form,
}

/// The leading term of a chain whose factors cancel, in powers of the splittings.
///
/// Every G(z - H) is expanded, G -> G + G d G + …, where d shifts all states of a level alike.
/// Range: the shifts must not be in the perturbation too; otherwise the same effect is counted twice.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Residual {
    pub order: usize,
    pub forms: Vec<Raised>,
}

impl Residual {
    /// The form itself where it is the same for every resolvent that is raised.
    pub fn common_form(&self) -> Option<&Form> {
        let first = &self.forms.first()?.form;
        self.forms.iter().all(|raised| raised.form == *first).then_some(first)
    }
}

/// The lowest order in the splittings at which a sum of paths with the given factors does not vanish.
pub(super) fn residual(
    key: &ChainKey,
    class: &Class,
    factors: &[Surd],
    split: Option<&BTreeSet<Term>>,
) -> Option<Residual> {
    let mut places = Vec::new();
    for (bracket, chain) in key.brackets.iter().enumerate() {
        for (gap, block) in chain.blocks.iter().enumerate() {
            if block.j.is_none() && split.is_none_or(|terms| terms.contains(&block.term)) {
                places.extend((0..chain.gaps[gap].len()).map(|resolvent| Place { bracket, gap, resolvent }));
            }
        }
    }
    (1..=HIGHEST_ORDER).find_map(|order| {
        let all: Vec<Raised> = multisets(&places, order)
            .into_iter()
            .map(|raised| Raised { form: form(key, &class.paths, factors, &raised), raised })
            .collect();
        // a symmetric chain is the same whether a resolvent is raised or its mirror image
        let mut merged: BTreeMap<Vec<Place>, Form> = BTreeMap::new();
        for Raised { raised, form } in &all {
            merged.entry(standard(key, class, raised)).or_default().add(form);
        }
        let stays = |raised: &Raised| {
            !raised.form.is_zero() && !merged.get(&standard(key, class, &raised.raised)).is_none_or(Form::is_zero)
        };
        let forms: Vec<Raised> = all.iter().filter(|raised| stays(raised)).cloned().collect();
        (!forms.is_empty()).then_some(Residual { order, forms })
    })
}

fn form(key: &ChainKey, paths: &[ChainPath], factors: &[Surd], raised: &[Place]) -> Form {
    let mut sign = Sign::Plus;
    for place in raised {
        sign = sign.times(key.brackets[place.bracket].gaps[place.gap][place.resolvent].sign);
    }
    let mut form = Form::default();
    for (path, factor) in paths.iter().zip(factors) {
        let mut levels: Vec<Level> = raised.iter().map(|place| path.levels[place.bracket][place.gap]).collect();
        levels.sort();
        let slot = form.monomials.entry(levels).or_default();
        match sign {
            Sign::Plus => *slot += factor,
            Sign::Minus => *slot -= factor,
        }
    }
    form.monomials.retain(|_, coefficient| !coefficient.is_zero());
    form
}

/// Places of resolvents with those in symmetric brackets turned to the smaller of their two readings.
fn standard(key: &ChainKey, class: &Class, raised: &[Place]) -> Vec<Place> {
    let mut out = Vec::with_capacity(raised.len());
    for (bracket, symmetric) in class.symmetric.iter().enumerate() {
        let own: Vec<Place> = raised.iter().copied().filter(|place| place.bracket == bracket).collect();
        let gaps = key.brackets[bracket].gaps.len();
        let mut turned: Vec<Place> = own.iter().map(|place| Place { gap: gaps - 1 - place.gap, ..*place }).collect();
        turned.sort();
        out.extend(if *symmetric { own.min(turned) } else { own });
    }
    out
}

/// All ways to choose so many places, repetition allowed.
fn multisets(places: &[Place], size: usize) -> Vec<Vec<Place>> {
    let mut out = vec![Vec::new()];
    for _ in 0..size {
        let mut longer = Vec::new();
        for chosen in &out {
            let last = chosen.last().copied();
            for place in places.iter().filter(|place| last.is_none_or(|last| **place >= last)) {
                let mut next: Vec<Place> = chosen.clone();
                next.push(*place);
                longer.push(next);
            }
        }
        out = longer;
    }
    out
}

impl Form {
    pub fn is_zero(&self) -> bool {
        self.monomials.is_empty()
    }

    fn add(&mut self, other: &Form) {
        for (levels, coefficient) in &other.monomials {
            *self.monomials.entry(levels.clone()).or_default() += coefficient;
        }
        self.monomials.retain(|_, coefficient| !coefficient.is_zero());
    }

    /// The levels whose shifts stand in it, ascending.
    pub fn levels(&self) -> BTreeSet<Level> {
        self.monomials.keys().flatten().copied().collect()
    }

    /// The value for given shifts; `Err` names a level whose shift is missing.
    pub fn value(&self, shifts: &BTreeMap<Level, Rational>) -> Result<Surd, Level> {
        let mut sum = Surd::zero();
        for (levels, coefficient) in &self.monomials {
            let mut product = Rational::from(1);
            for level in levels {
                product *= shifts.get(level).ok_or(*level)?;
            }
            sum += &coefficient.scaled(&product);
        }
        Ok(sum)
    }

    /// The common factor and the coprime whole numbers it leaves, that of the highest levels positive; `None` where ratios are not rational.
    fn common_factor(&self) -> Option<(Surd, BTreeMap<&[Level], Integer>)> {
        let top = self.monomials.values().next_back()?;
        let inverse = top.inverse()?;
        let mut ratios = BTreeMap::new();
        for (levels, coefficient) in &self.monomials {
            ratios.insert(levels.as_slice(), (coefficient * &inverse).as_rational()?.into_owned());
        }
        let (mut denominator, mut numerator) = (Integer::from(1), Integer::new());
        for ratio in ratios.values() {
            denominator.lcm_mut(ratio.denom());
        }
        for ratio in ratios.values() {
            numerator.gcd_mut(&Rational::from(ratio * &denominator).numer().clone());
        }
        let common = Rational::from((numerator, denominator));
        let whole = ratios.into_iter().map(|(levels, ratio)| (levels, (ratio / &common).numer().clone())).collect();
        Some((top.scaled(&common), whole))
    }
}

/// Writes `2/9 (d[^3P_2] - d[^3P_0])`, higher levels first.
impl fmt::Display for Form {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if self.is_zero() {
            return write!(f, "0");
        }
        let monomial = |levels: &[Level]| levels.iter().map(|l| format!("d[{l}]")).collect::<Vec<_>>().join(" ");
        let Some((factor, whole)) = self.common_factor() else {
            let terms = self.monomials.iter().rev().map(|(levels, c)| format!("({c}) {}", monomial(levels)));
            return write!(f, "{}", terms.collect::<Vec<_>>().join(" + "));
        };
        let mut text = String::new();
        for (levels, number) in whole.iter().rev() {
            let negative = *number < 0;
            text += match (text.is_empty(), negative) {
                (true, false) => "",
                (true, true) => "-",
                (false, false) => " + ",
                (false, true) => " - ",
            };
            let size = Integer::from(number.abs_ref());
            if size != 1 {
                text += &format!("{size} ");
            }
            text += &monomial(levels);
        }
        match (factor.is_one(), whole.len() > 1) {
            (true, _) => write!(f, "{text}"),
            (false, true) => write!(f, "{factor} ({text})"),
            (false, false) => write!(f, "{factor} {text}"),
        }
    }
}
