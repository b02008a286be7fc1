//! Walks a chain of operators over the kets of one backend.
//!
//! Operators act on kets from the right and, by their adjoints, on bras from the left; the two meet where both ends still have a form the
//! backend can hold. Expressions are never multiplied out: a sum of operators costs one application of each of its terms.

use super::environment::Environment;
use super::evaluator::Evaluator;
use super::problem::{Failure, Trouble};
use crate::num::Scalar;
use crate::systems::{
    Atom, Backend, BlockKet, FunctionKind, FunctionOfH, Number, Obstacle, Omitted, Resolvent, Sector, State, System,
};
use crate::theory::terms::*;
use std::collections::{BTreeMap, HashMap};
use std::sync::Arc;

type Walked<T> = Result<T, Failure>;

/// A ket over all sectors it has a part in, with the text that identifies it inside one evaluation.
#[derive(Clone)]
pub struct SectorKet {
    key: Arc<str>,
    parts: Arc<BTreeMap<Sector, BlockKet>>,
}

/// Kets that were computed already, by their text; one table for each backend.
pub type Kept = HashMap<String, SectorKet>;

/// A factor of a chain with the values of its variables.
#[derive(Clone)]
struct Factor {
    operator: OperatorTerm,
    environment: Environment,
}

impl Factor {
    fn key(&self) -> String {
        format!("{}{{{}}}", self.operator.text, self.environment.fingerprint())
    }

    fn holds_function_of_h(&self) -> bool {
        crate::theory::resolve::has_function_of_h(&self.operator)
    }
}

/// A chain taken apart: the product of its numbers, and its operators in the order written.
struct Flat {
    coefficient: Scalar,
    factors: Vec<Factor>,
}

/// Evaluates chains on one backend.
pub struct Walker<'w, 's> {
    pub evaluator: &'w mut Evaluator<'s>,
    pub system: Arc<dyn System>,
    pub backend: Arc<dyn Backend>,
    /// Working precision of numbers that are not exact; `None` on the exact backend.
    pub bits: Option<u32>,
    pub kept: Kept,
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
            _ => match self.act(factor, ket) {
                Ok(ket) => self.overlap(bra, &ket, place),
                Err(failure) if failure.is_inexact() => {
                    let bra = self.act_adjoint(factor, bra)?;
                    self.overlap(&bra, ket, place)
                }
                Err(failure) => Err(failure),
            },
        }
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
    fn act(&mut self, factor: &Factor, ket: &SectorKet) -> Walked<SectorKet> {
        self.evaluator.effort.check().map_err(|stop| Failure::new(factor.operator.place, stop))?;
        let key = format!("{}>{}", factor.key(), ket.key);
        if let Some(known) = self.kept.get(&key) {
            return Ok(known.clone());
        }
        let parts = self.act_anew(factor, ket)?;
        let result = SectorKet { key: key.as_str().into(), parts: Arc::new(parts) };
        self.kept.insert(key, result.clone());
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
            OperatorNode::Resolvent(linear) => {
                let (scale, resolvent) = self.resolvent(linear, factor)?;
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
            OperatorNode::Scalar(_) | OperatorNode::Product(_) | OperatorNode::Power(..) | OperatorNode::Call(_) => {
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
                function.constant = function.constant.conj();
                function.slope = function.slope.conj();
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
            OperatorNode::Scalar(_) | OperatorNode::Product(_) | OperatorNode::Power(..) | OperatorNode::Call(_) => {
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
        self.kept.insert(key, result.clone());
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

    fn scaled(&self, ket: &SectorKet, scale: &Number, place: Place) -> Walked<BTreeMap<Sector, BlockKet>> {
        let parts = ket.parts.iter().map(|(sector, part)| (*sector, vec![(scale.clone(), part.clone())])).collect();
        self.collect(parts, place)
    }

    /// Adds up what came into each sector and leaves out sectors where nothing is left.
    fn collect(
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

    /// A ket term as parts over sectors.
    fn ket(&mut self, term: &KetTerm, environment: &Environment) -> Walked<SectorKet> {
        match &*term.node {
            KetNode::State(state) => {
                let state = self.evaluator.state(state, environment)?;
                self.eigenstate(&state, term.place)
            }
            KetNode::Applied(operator, inner) => {
                let flat = self.flatten(operator, environment)?;
                let mut image = self.ket(inner, environment)?;
                for factor in flat.factors.iter().rev() {
                    image = self.act(factor, &image)?;
                }
                self.rescaled(image, &flat.coefficient, term.place)
            }
            KetNode::Sum(terms) => {
                let mut sum: BTreeMap<Sector, Vec<(Number, BlockKet)>> = BTreeMap::new();
                let one = Number::Exact(crate::num::Surd::one());
                for inner in terms {
                    for (sector, part) in self.ket(inner, environment)?.parts.iter() {
                        sum.entry(*sector).or_default().push((one.clone(), part.clone()));
                    }
                }
                let key = format!("({}){{{}}}", term.text, environment.fingerprint());
                Ok(SectorKet { key: key.into(), parts: Arc::new(self.collect(sum, term.place)?) })
            }
            KetNode::Scaled(scalar, inner) => {
                let coefficient = self.evaluator.scalar(scalar, environment, self.scalar_bits())?;
                let image = self.ket(inner, environment)?;
                self.rescaled(image, &coefficient, term.place)
            }
            KetNode::Call(call) => match &call.definition.body {
                Meaning::Ket(body) => {
                    let inside = self.evaluator.enter(call, environment, self.scalar_bits())?;
                    self.ket(body, &inside)
                }
                _ => Err(Failure::new(term.place, Obstacle::Inexact)),
            },
        }
    }

    fn eigenstate(&mut self, state: &State, place: Place) -> Walked<SectorKet> {
        let key = format!("|{}>", state.label);
        if let Some(known) = self.kept.get(&key) {
            return Ok(known.clone());
        }
        let parts = self.backend.state(state).map_err(|obstacle| Failure::new(place, obstacle))?;
        let result = SectorKet { key: key.as_str().into(), parts: Arc::new(parts.into_iter().collect()) };
        self.kept.insert(key, result.clone());
        Ok(result)
    }

    fn rescaled(&mut self, ket: SectorKet, coefficient: &Scalar, place: Place) -> Walked<SectorKet> {
        if matches!(coefficient, Scalar::Exact(c) if c.is_one()) {
            return Ok(ket);
        }
        let number = self.number(coefficient, place)?;
        let key = format!("{coefficient:?}*{}", ket.key);
        Ok(SectorKet { key: key.into(), parts: Arc::new(self.scaled(&ket, &number, place)?) })
    }

    /// Takes products, powers and named operators apart and gathers their numbers.
    fn flatten(&mut self, operator: &OperatorTerm, environment: &Environment) -> Walked<Flat> {
        let mut flat = Flat { coefficient: Scalar::one(), factors: Vec::new() };
        self.flatten_into(operator, environment, &mut flat)?;
        Ok(flat)
    }

    fn flatten_into(&mut self, operator: &OperatorTerm, environment: &Environment, flat: &mut Flat) -> Walked<()> {
        match &*operator.node {
            OperatorNode::Scalar(scalar) => {
                let value = self.evaluator.scalar(scalar, environment, self.scalar_bits())?;
                flat.coefficient = flat
                    .coefficient
                    .mul(&value, self.scalar_bits())
                    .map_err(|error| Failure::new(operator.place, error))?;
            }
            OperatorNode::Product(factors) => {
                for factor in factors {
                    self.flatten_into(factor, environment, flat)?;
                }
            }
            OperatorNode::Power(inner, power) => {
                for _ in 0..*power {
                    self.flatten_into(inner, environment, flat)?;
                }
            }
            OperatorNode::Call(call) => {
                if let Meaning::Operator(body) = &call.definition.body {
                    let inside = self.evaluator.enter(call, environment, self.scalar_bits())?;
                    self.flatten_into(body, &inside, flat)?;
                }
            }
            OperatorNode::Atom(term) => {
                let factor = Factor { operator: operator.clone(), environment: environment.clone() };
                let atom = self.named_atom(term, &factor)?;
                let known = self.system.knows(&atom).map_err(|trouble| Failure::new(operator.place, trouble))?;
                if known {
                    flat.factors.push(factor);
                    return Ok(());
                }
                if !(1..=1000).contains(&atom.power) {
                    return Err(Failure::new(
                        operator.place,
                        Trouble::Refused {
                            message: format!("`{}` has no power {} here", atom.name, atom.power),
                            help: "of a general operator only whole powers from 1 to 1000 are products; `r` has negative ones".into(),
                        },
                    ));
                }
                let single = AtomTerm { power: 1, ..term.clone() };
                let text = format!("{} to its power", operator.text);
                let single = Term::new(OperatorNode::Atom(single), operator.place, text);
                let factor = Factor { operator: single, environment: environment.clone() };
                flat.factors.extend(std::iter::repeat_n(factor, atom.power as usize));
            }
            _ => flat.factors.push(Factor { operator: operator.clone(), environment: environment.clone() }),
        }
        Ok(())
    }

    /// The atom with its arguments as numbers and its Cartesian index as a component.
    fn named_atom(&mut self, term: &AtomTerm, factor: &Factor) -> Walked<Atom> {
        let place = factor.operator.place;
        let mut arguments = Vec::with_capacity(term.arguments.len());
        for argument in &term.arguments {
            let value = self.evaluator.exact_scalar(argument, &factor.environment)?;
            let Some(rational) = value.as_rational() else {
                return Err(Failure::new(
                    place,
                    Trouble::Refused {
                        message: format!(
                            "`{}` takes whole numbers in its parentheses, and {value} is given",
                            term.name
                        ),
                        help: "write for instance `C(2)_0`".into(),
                    },
                ));
            };
            arguments.push(rational.into_owned());
        }
        let component = term.component.as_ref().map(|index| match factor.environment.index(index) {
            Some(component) => component.to_string(),
            None => index.clone(),
        });
        Ok(Atom { name: term.name.clone(), component, arguments, power: term.power })
    }

    /// Like `named_atom`, for an atom the system has already accepted.
    fn atom(&mut self, term: &AtomTerm, factor: &Factor) -> Walked<Atom> {
        self.named_atom(term, factor)
    }

    /// Precision for numbers inside the chain: a little more than the kets have.
    fn scalar_bits(&self) -> u32 {
        self.bits.map_or(self.evaluator.exact_bits, |bits| bits + 32)
    }

    /// A number as the backend takes it.
    fn number(&mut self, scalar: &Scalar, place: Place) -> Walked<Number> {
        match (scalar, self.bits) {
            (Scalar::Exact(surd), _) => Ok(Number::Exact(surd.clone())),
            (Scalar::Approx(_), None) => Err(Failure::new(place, Obstacle::Inexact)),
            (Scalar::Approx(ball), Some(bits)) => Ok(Number::Approx(self.evaluator.nudged(ball, bits))),
        }
    }

    /// 1/(a + b H) = scale (z - H)^-1 with z = -a/b and scale = -1/b.
    fn resolvent(&mut self, linear: &LinearInH, factor: &Factor) -> Walked<(Number, Resolvent)> {
        let place = factor.operator.place;
        let bits = self.scalar_bits();
        let constant = self.evaluator.scalar(&linear.constant, &factor.environment, bits)?;
        let slope = self.evaluator.scalar(&linear.slope, &factor.environment, bits)?;
        let scale = Scalar::one().div(&slope, bits).map_err(|error| Failure::new(place, error))?.neg();
        let z = constant.mul(&scale, bits).map_err(|error| Failure::new(place, error))?;
        let resolvent =
            Resolvent { z: self.number(&z, place)?, omitted: self.omitted(&linear.omitted, &factor.environment)? };
        Ok((self.number(&scale, place)?, resolvent))
    }

    fn function_of_h(&mut self, function: ScalarFunction, linear: &LinearInH, factor: &Factor) -> Walked<FunctionOfH> {
        let place = factor.operator.place;
        let bits = self.scalar_bits();
        let constant = self.evaluator.scalar(&linear.constant, &factor.environment, bits)?;
        let slope = self.evaluator.scalar(&linear.slope, &factor.environment, bits)?;
        let kind = match function {
            ScalarFunction::Sqrt => FunctionKind::Sqrt,
            ScalarFunction::Exp => FunctionKind::Exp,
            _ => FunctionKind::Ln,
        };
        Ok(FunctionOfH {
            kind,
            constant: self.number(&constant, place)?,
            slope: self.number(&slope, place)?,
            omitted: self.omitted(&linear.omitted, &factor.environment)?,
        })
    }

    fn omitted(&mut self, terms: &[OmittedTerm], environment: &Environment) -> Walked<Vec<Omitted>> {
        terms
            .iter()
            .map(|term| match term {
                OmittedTerm::LevelOf(state) => Ok(Omitted::LevelOf(self.evaluator.state(state, environment)?)),
                OmittedTerm::Manifold(manifold) => {
                    Ok(Omitted::Manifold(self.evaluator.manifold(manifold, environment)?))
                }
            })
            .collect()
    }
}

/// Where the two sides of a numeric chain meet: half of the functions of H on each side, so that solves are shared and the error of each side
/// multiplies that of the other.
fn middle(factors: &[Factor]) -> usize {
    let solves: Vec<usize> = (0..factors.len()).filter(|&k| factors[k].holds_function_of_h()).collect();
    let left = solves.len() / 2;
    let start = if left == 0 { 0 } else { solves[left - 1] + 1 };
    let end = solves.get(left).copied().unwrap_or(factors.len());
    if start < end { start } else { start.min(factors.len() - 1) }
}

fn hamiltonian() -> Atom {
    Atom { name: "H".into(), component: None, arguments: Vec::new(), power: 1 }
}
