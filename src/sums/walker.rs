//! Walks a chain of operators over the kets of one backend.
//!
//! Operators act on kets from the right and, by their adjoints, on bras from the left; the two meet where both ends still have a form the
//! backend can hold. Expressions are never multiplied out: a sum of operators costs one application of each of its terms.

use super::environment::Environment;
use super::evaluator::Evaluator;
use super::factors::{Factor, Flat, middle};
use super::problem::Failure;
use crate::num::Scalar;
use crate::systems::{Atom, Backend, BlockKet, Number, Obstacle, Omitted, Resolvent, Sector, State, System};
use crate::theory::terms::*;
use std::collections::{BTreeMap, HashMap};
use std::sync::Arc;

pub(super) type Walked<T> = Result<T, Failure>;

/// A ket over all sectors it has a part in, with the text that identifies it inside one evaluation.
#[derive(Clone)]
pub struct SectorKet {
    pub(super) key: Arc<str>,
    pub(super) parts: Arc<BTreeMap<Sector, BlockKet>>,
}

/// Kets that were computed already, by their text; one table for each backend.
pub type Kept = HashMap<String, SectorKet>;

/// Most kets kept for one backend; a ket of the largest matrix has some hundred kilobytes.
const MOST_KEPT: usize = 400;

/// Evaluates chains on one backend.
pub struct Walker<'w, 's> {
    pub evaluator: &'w mut Evaluator<'s>,
    pub system: Arc<dyn System>,
    pub backend: Arc<dyn Backend>,
    /// Working precision of numbers that are not exact; `None` on the exact backend.
    pub bits: Option<u32>,
    pub kept: Kept,
    /// The eigenstate a bracket ends in, for the note on degenerate levels.
    pub outer: Option<State>,
}

impl Walker<'_, '_> {
    /// <bra| operator |ket>; `None` when no path leads from the ket to the bra.
    pub fn bracket(&mut self, bracket: &Bracket, environment: &Environment) -> Walked<Option<Number>> {
        let flat = match &bracket.operator {
            None => Flat { coefficient: Scalar::one(), factors: Vec::new() },
            Some(operator) => self.flatten(operator, environment)?,
        };
        let bra = self.ket(&bracket.bra, environment)?;
        let ket = self.ket(&bracket.ket, environment)?;
        self.outer = match &*bracket.ket.node {
            KetNode::State(state) => Some(self.evaluator.state(state, environment)?),
            _ => None,
        };
        let place = bracket.operator.as_ref().map_or(bracket.ket.place, |operator| operator.place);
        self.scaled_sandwich(&bra, &flat, &ket, place)
    }

    fn scaled_sandwich(
        &mut self,
        bra: &SectorKet,
        flat: &Flat,
        ket: &SectorKet,
        place: Place,
    ) -> Walked<Option<Number>> {
        if matches!(&flat.coefficient, Scalar::Exact(c) if c.is_zero()) {
            return Ok(Some(Number::zero()));
        }
        let Some(mut value) = self.sandwich(bra, &flat.factors, ket, place)? else {
            self.note_rules(&flat.factors)?;
            return Ok(None);
        };
        if let Number::Approx(complex) = &mut value
            && bra.key == ket.key
            && self.is_self_adjoint(&flat.factors)?
        {
            // The rounding noise of an imaginary part that is zero by Hermiticity.
            *complex.mut_imag() = rug::Float::new(complex.prec().1);
        }
        let coefficient = self.number(&flat.coefficient, place)?;
        Ok(Some(coefficient.times(&value, self.bits.unwrap_or(64))))
    }

    /// Notes the selection rules of the operators of a chain that has no path from its ket to its bra.
    fn note_rules(&mut self, factors: &[Factor]) -> Walked<()> {
        for factor in factors {
            if let OperatorNode::Atom(atom) = &*factor.operator.node {
                let atom = self.atom(atom, factor)?;
                let rule = self.system.selection_rule(&atom);
                self.evaluator.note_rule(rule);
            }
        }
        Ok(())
    }

    /// Notes where a ket has a part in other states of the level that a prime leaves out: an operator couples the level in first order, and
    /// perturbation theory for one state of it holds only if its states diagonalise the operator.
    fn note_coupling(&mut self, resolvent: &Resolvent, ket: &SectorKet, place: Place) -> Walked<()> {
        let at = |obstacle| Failure::new(place, obstacle);
        let Some(outer) = self.outer.clone() else { return Ok(()) };
        for omitted in &resolvent.omitted {
            let Omitted::LevelOf(left_out) = omitted else { continue };
            if !self.system.degenerate(&outer, left_out) {
                continue;
            }
            // a state may have parts in several sectors: its amplitude is the sum over all of them
            let mut others: Vec<State> = Vec::new();
            for sector in ket.parts.keys() {
                for state in self.system.level_in(&outer, *sector, &self.evaluator.effort).map_err(at)? {
                    if state != outer && !others.contains(&state) {
                        others.push(state);
                    }
                }
            }
            for state in others {
                let other = match self.eigenstate(&state, place) {
                    Ok(ket) => ket,
                    Err(failure) if failure.is_inexact() => continue,
                    Err(failure) => return Err(failure),
                };
                let coupled = match (self.overlap(&other, ket, place)?, self.bits) {
                    (Some(Number::Exact(value)), _) => !value.is_zero(),
                    (Some(Number::Approx(value)), Some(bits)) => {
                        let size = rug::Complex::with_val(32, value).abs().into_real_imag().0;
                        size > rug::Float::with_val(32, 1) >> (bits / 2)
                    }
                    (Some(Number::Approx(_)), None) | (None, _) => false,
                };
                if coupled {
                    self.evaluator.note_coupling(&outer.label, &state.label);
                }
            }
        }
        Ok(())
    }

    /// Tells whether a chain is its own adjoint because it reads the same from both ends.
    fn is_self_adjoint(&mut self, factors: &[Factor]) -> Walked<bool> {
        let keys: Vec<String> = factors.iter().map(Factor::key).collect();
        if !keys.iter().eq(keys.iter().rev()) {
            return Ok(false);
        }
        for factor in factors {
            let hermitian = match &*factor.operator.node {
                OperatorNode::Atom(atom) => {
                    let atom = self.atom(atom, factor)?;
                    self.system.adjoint(&atom) == (1, atom)
                }
                OperatorNode::Hamiltonian => true,
                OperatorNode::Resolvent(linear) => {
                    let z = self.resolvent(linear, factor)?.1.z;
                    match z {
                        Number::Exact(z) => z.is_real(),
                        Number::Approx(z) => z.imag().is_zero(),
                    }
                }
                OperatorNode::Sum(terms) => self.is_self_adjoint_sum(terms, &factor.environment)?,
                _ => false,
            };
            if !hermitian {
                return Ok(false);
            }
        }
        Ok(true)
    }

    /// Tells whether each term of a sum is a real multiple of a chain that is its own adjoint.
    fn is_self_adjoint_sum(&mut self, terms: &[OperatorTerm], environment: &Environment) -> Walked<bool> {
        for term in terms {
            let flat = self.flatten(term, environment)?;
            if !flat.coefficient.is_real() || !self.is_self_adjoint(&flat.factors)? {
                return Ok(false);
            }
        }
        Ok(true)
    }

    /// <bra| factors |ket>, the two sides walked towards each other.
    fn sandwich(
        &mut self,
        bra: &SectorKet,
        factors: &[Factor],
        ket: &SectorKet,
        place: Place,
    ) -> Walked<Option<Number>> {
        if factors.is_empty() {
            return self.overlap(bra, ket, place);
        }
        let (mut bra, mut ket) = (bra.clone(), ket.clone());
        let meeting = match self.bits {
            Some(_) => middle(factors),
            None => {
                let mut right = factors.len();
                while right > 0 {
                    match self.act(&factors[right - 1], &ket) {
                        Ok(next) => ket = next,
                        Err(failure) if failure.is_inexact() => break,
                        Err(failure) => return Err(failure),
                    }
                    right -= 1;
                }
                if right == 0 {
                    return self.overlap(&bra, &ket, place);
                }
                right - 1
            }
        };
        if self.bits.is_some() {
            for factor in factors[meeting + 1..].iter().rev() {
                ket = self.act(factor, &ket)?;
            }
        }
        for factor in &factors[..meeting] {
            bra = self.act_adjoint(factor, &bra)?;
        }
        self.single(&bra, &factors[meeting], &ket)
    }

    /// <bra| X |ket> for one factor.
    fn single(&mut self, bra: &SectorKet, factor: &Factor, ket: &SectorKet) -> Walked<Option<Number>> {
        let place = factor.operator.place;
        match &*factor.operator.node {
            OperatorNode::Atom(atom) => {
                let atom = self.atom(atom, factor)?;
                self.atom_element(bra, &atom, ket, place)
            }
            OperatorNode::Hamiltonian => self.atom_element(bra, &hamiltonian(), ket, place),
            OperatorNode::Sum(terms) => {
                let mut total = None;
                for term in terms {
                    let flat = self.flatten(term, &factor.environment)?;
                    if let Some(value) = self.scaled_sandwich(bra, &flat, ket, term.place)? {
                        total = Some(self.plus(total, value));
                    }
                }
                Ok(total)
            }
            OperatorNode::Dyad(left, right) => {
                let left = self.ket(left, &factor.environment)?;
                let right = self.ket(right, &factor.environment)?;
                let (Some(a), Some(b)) = (self.overlap(bra, &left, place)?, self.overlap(&right, ket, place)?) else {
                    return Ok(None);
                };
                Ok(Some(a.times(&b, self.bits.unwrap_or(64))))
            }
            node => match self.act(factor, ket) {
                Ok(ket) => self.overlap(bra, &ket, place),
                Err(failure) if failure.is_inexact() => match (self.act_adjoint(factor, bra), node) {
                    (Ok(bra), _) => self.overlap(&bra, ket, place),
                    (Err(failure), OperatorNode::Resolvent(linear)) if failure.is_inexact() => {
                        self.through(bra, factor, linear, ket)
                    }
                    (Err(failure), _) => Err(failure),
                },
                Err(failure) => Err(failure),
            },
        }
    }

    /// <bra| (a + b H)^-1 |ket> where the resolvent can act on neither side alone.
    fn through(
        &mut self,
        bra: &SectorKet,
        factor: &Factor,
        linear: &LinearInH,
        ket: &SectorKet,
    ) -> Walked<Option<Number>> {
        let place = factor.operator.place;
        let (scale, resolvent) = self.resolvent(linear, factor)?;
        let mut total = None;
        for (sector, part) in ket.parts.iter() {
            if let Some(left) = bra.parts.get(sector) {
                let value = self.backend.through(&resolvent, *sector, left, part);
                let value = value.map_err(|obstacle| Failure::new(place, obstacle))?;
                total = Some(self.plus(total, value.times(&scale, self.bits.unwrap_or(64))));
            }
        }
        Ok(total)
    }

    fn atom_element(&mut self, bra: &SectorKet, atom: &Atom, ket: &SectorKet, place: Place) -> Walked<Option<Number>> {
        let mut total = None;
        for (from, part) in ket.parts.iter() {
            for coupling in self.system.couple(atom, *from) {
                let Some(left) = bra.parts.get(&coupling.to) else { continue };
                let value = self
                    .backend
                    .element(&coupling.radial, *from, coupling.to, left, part)
                    .map_err(|obstacle| Failure::new(place, obstacle))?;
                let value = Number::Exact(coupling.factor).times(&value, self.bits.unwrap_or(64));
                total = Some(self.plus(total, value));
            }
        }
        Ok(total)
    }

    fn overlap(&mut self, bra: &SectorKet, ket: &SectorKet, place: Place) -> Walked<Option<Number>> {
        let mut total = None;
        for (sector, part) in ket.parts.iter() {
            if let Some(left) = bra.parts.get(sector) {
                let value =
                    self.backend.overlap(*sector, left, part).map_err(|obstacle| Failure::new(place, obstacle))?;
                total = Some(self.plus(total, value));
            }
        }
        Ok(total)
    }

    fn plus(&self, total: Option<Number>, value: Number) -> Number {
        match total {
            None => value,
            Some(total) => total.plus(&value, self.bits.unwrap_or(64)),
        }
    }

    /// A factor on a ket.
    pub(super) fn act(&mut self, factor: &Factor, ket: &SectorKet) -> Walked<SectorKet> {
        self.evaluator.effort.check().map_err(|stop| Failure::new(factor.operator.place, stop))?;
        let key = format!("{}>{}", factor.key(), ket.key);
        if let Some(known) = self.kept.get(&key) {
            return Ok(known.clone());
        }
        let parts = self.act_anew(factor, ket)?;
        let result = SectorKet { key: key.as_str().into(), parts: Arc::new(parts) };
        self.keep(key, &result);
        Ok(result)
    }

    fn act_anew(&mut self, factor: &Factor, ket: &SectorKet) -> Walked<BTreeMap<Sector, BlockKet>> {
        let place = factor.operator.place;
        match &*factor.operator.node {
            OperatorNode::Atom(atom) => {
                let atom = self.atom(atom, factor)?;
                self.act_atom(&atom, &Number::Exact(crate::num::Surd::one()), ket, place)
            }
            OperatorNode::Hamiltonian => {
                self.act_atom(&hamiltonian(), &Number::Exact(crate::num::Surd::one()), ket, place)
            }
            OperatorNode::Sum(terms) => {
                let mut sum: BTreeMap<Sector, Vec<(Number, BlockKet)>> = BTreeMap::new();
                for term in terms {
                    let flat = self.flatten(term, &factor.environment)?;
                    let coefficient = self.number(&flat.coefficient, term.place)?;
                    if coefficient.is_zero() {
                        continue;
                    }
                    let mut image = ket.clone();
                    for inner in flat.factors.iter().rev() {
                        image = self.act(inner, &image)?;
                    }
                    for (sector, part) in image.parts.iter() {
                        sum.entry(*sector).or_default().push((coefficient.clone(), part.clone()));
                    }
                }
                self.collect(sum, place)
            }
            OperatorNode::Adjoint(inner) => {
                let image = self.act_adjoint(&factor.of(inner), ket)?;
                Ok((*image.parts).clone())
            }
            OperatorNode::Resolvent(linear) => {
                let (scale, resolvent) = self.resolvent(linear, factor)?;
                self.note_coupling(&resolvent, ket, place)?;
                self.each_sector(ket, &scale, place, |backend, sector, part| backend.resolve(&resolvent, sector, part))
            }
            OperatorNode::Function(function, linear) => {
                let function = self.function_of_h(*function, linear, factor)?;
                let one = Number::Exact(crate::num::Surd::one());
                self.each_sector(ket, &one, place, |backend, sector, part| backend.function(&function, sector, part))
            }
            OperatorNode::Dyad(left, right) => {
                let right = self.ket(right, &factor.environment)?;
                let Some(amplitude) = self.overlap(&right, ket, place)? else { return Ok(BTreeMap::new()) };
                let left = self.ket(left, &factor.environment)?;
                self.scaled(&left, &amplitude, place)
            }
            // Flattening has taken these apart.
            OperatorNode::Scalar(_)
            | OperatorNode::Product(_)
            | OperatorNode::Power(..)
            | OperatorNode::Tensor(_)
            | OperatorNode::Call(_) => {
                let flat = self.flatten(&factor.operator, &factor.environment)?;
                let mut image = ket.clone();
                for inner in flat.factors.iter().rev() {
                    image = self.act(inner, &image)?;
                }
                let coefficient = self.number(&flat.coefficient, place)?;
                self.scaled(&image, &coefficient, place)
            }
        }
    }

    /// Keeps a ket for the rest of the evaluation; a long sum or search does not pile them up.
    pub(super) fn keep(&mut self, key: String, ket: &SectorKet) {
        if self.kept.len() >= MOST_KEPT {
            self.kept.clear();
        }
        self.kept.insert(key, ket.clone());
    }

    /// The adjoint of a factor on a ket, for bras.
    fn act_adjoint(&mut self, factor: &Factor, ket: &SectorKet) -> Walked<SectorKet> {
        self.evaluator.effort.check().map_err(|stop| Failure::new(factor.operator.place, stop))?;
        let place = factor.operator.place;
        let own_adjoint = format!("{}>{}", factor.key(), ket.key);
        let key = format!("{}†>{}", factor.key(), ket.key);
        if let Some(known) = self.kept.get(&key) {
            return Ok(known.clone());
        }
        let parts = match &*factor.operator.node {
            OperatorNode::Atom(atom) => {
                let atom = self.atom(atom, factor)?;
                let (sign, adjoint) = self.system.adjoint(&atom);
                if sign == 1 && adjoint == atom {
                    return self.act(factor, ket);
                }
                let sign = Number::Exact(crate::num::Surd::from(i64::from(sign)));
                self.act_atom(&adjoint, &sign, ket, place)?
            }
            OperatorNode::Hamiltonian => return self.act(factor, ket),
            OperatorNode::Adjoint(inner) => return self.act(&factor.of(inner), ket),
            OperatorNode::Sum(terms) => {
                let mut sum: BTreeMap<Sector, Vec<(Number, BlockKet)>> = BTreeMap::new();
                for term in terms {
                    let flat = self.flatten(term, &factor.environment)?;
                    let coefficient = self.number(&flat.coefficient, term.place)?.conj();
                    if coefficient.is_zero() {
                        continue;
                    }
                    let mut image = ket.clone();
                    for inner in &flat.factors {
                        image = self.act_adjoint(inner, &image)?;
                    }
                    for (sector, part) in image.parts.iter() {
                        sum.entry(*sector).or_default().push((coefficient.clone(), part.clone()));
                    }
                }
                self.collect(sum, place)?
            }
            OperatorNode::Resolvent(linear) => {
                let (scale, resolvent) = self.resolvent(linear, factor)?;
                let conjugate = Resolvent { z: resolvent.z.conj(), ..resolvent.clone() };
                if conjugate == resolvent && scale.conj() == scale {
                    // A real energy: the ket from the other side is the same, and perhaps known already.
                    let image = self.act(factor, ket)?;
                    debug_assert_eq!(&*image.key, own_adjoint.as_str());
                    return Ok(image);
                }
                self.each_sector(ket, &scale.conj(), place, |backend, sector, part| {
                    backend.resolve(&conjugate, sector, part)
                })?
            }
            OperatorNode::Function(function, linear) => {
                let mut function = self.function_of_h(*function, linear, factor)?;
                function.adjoint = true;
                let one = Number::Exact(crate::num::Surd::one());
                self.each_sector(ket, &one, place, |backend, sector, part| backend.function(&function, sector, part))?
            }
            OperatorNode::Dyad(left, right) => {
                let left = self.ket(left, &factor.environment)?;
                match self.overlap(&left, ket, place)? {
                    None => BTreeMap::new(),
                    Some(amplitude) => {
                        let right = self.ket(right, &factor.environment)?;
                        self.scaled(&right, &amplitude, place)?
                    }
                }
            }
            OperatorNode::Scalar(_)
            | OperatorNode::Product(_)
            | OperatorNode::Power(..)
            | OperatorNode::Tensor(_)
            | OperatorNode::Call(_) => {
                let flat = self.flatten(&factor.operator, &factor.environment)?;
                let mut image = ket.clone();
                for inner in &flat.factors {
                    image = self.act_adjoint(inner, &image)?;
                }
                let coefficient = self.number(&flat.coefficient, place)?.conj();
                self.scaled(&image, &coefficient, place)?
            }
        };
        let result = SectorKet { key: key.as_str().into(), parts: Arc::new(parts) };
        self.keep(key, &result);
        Ok(result)
    }

    fn act_atom(
        &mut self,
        atom: &Atom,
        scale: &Number,
        ket: &SectorKet,
        place: Place,
    ) -> Walked<BTreeMap<Sector, BlockKet>> {
        let mut sum: BTreeMap<Sector, Vec<(Number, BlockKet)>> = BTreeMap::new();
        for (from, part) in ket.parts.iter() {
            for coupling in self.system.couple(atom, *from) {
                let image = self
                    .backend
                    .apply(&coupling.radial, *from, coupling.to, part)
                    .map_err(|obstacle| Failure::new(place, obstacle))?;
                let factor = scale.times(&Number::Exact(coupling.factor), self.bits.unwrap_or(64));
                sum.entry(coupling.to).or_default().push((factor, image));
            }
        }
        self.collect(sum, place)
    }

    fn each_sector(
        &mut self,
        ket: &SectorKet,
        scale: &Number,
        place: Place,
        act: impl Fn(&dyn Backend, Sector, &BlockKet) -> Result<BlockKet, Obstacle>,
    ) -> Walked<BTreeMap<Sector, BlockKet>> {
        let mut parts = BTreeMap::new();
        for (sector, part) in ket.parts.iter() {
            let image = act(&*self.backend, *sector, part).map_err(|obstacle| Failure::new(place, obstacle))?;
            parts.insert(*sector, vec![(scale.clone(), image)]);
        }
        self.collect(parts, place)
    }

    pub(super) fn scaled(&self, ket: &SectorKet, scale: &Number, place: Place) -> Walked<BTreeMap<Sector, BlockKet>> {
        let parts = ket.parts.iter().map(|(sector, part)| (*sector, vec![(scale.clone(), part.clone())])).collect();
        self.collect(parts, place)
    }

    /// Adds up what came into each sector and leaves out sectors where nothing is left.
    pub(super) fn collect(
        &self,
        sum: BTreeMap<Sector, Vec<(Number, BlockKet)>>,
        place: Place,
    ) -> Walked<BTreeMap<Sector, BlockKet>> {
        let mut parts = BTreeMap::new();
        for (sector, terms) in sum {
            let part = match terms.as_slice() {
                [(Number::Exact(one), only)] if one.is_one() => only.clone(),
                _ => self.backend.combine(sector, &terms).map_err(|obstacle| Failure::new(place, obstacle))?,
            };
            if !self.backend.vanishes(&part) {
                parts.insert(sector, part);
            }
        }
        Ok(parts)
    }
}

fn hamiltonian() -> Atom {
    Atom { name: "H".into(), component: None, arguments: Vec::new(), power: 1 }
}
