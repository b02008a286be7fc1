//! The levels of a matrix: which states are degenerate, and which energies and states are exact.
//!
//! States are told apart by numbers that differ beyond their errors, and declared degenerate only where they share a proved exact energy or where
//! the count of distinct eigenvalues, certified modulo primes, leaves no other reading.

use super::MatrixSystem;
use super::entries::ExactKet;
use super::guess::{ExactEnergy, Window};
use super::modular::distinct;
use super::refined::on_ladder;
use super::states::{exact_states, numeric_states};
use crate::num::{Effort, Scalar, Surd};
use crate::systems::{Number, Obstacle};
use rug::{Complex, Float};
use std::cmp::Ordering;
use std::collections::BTreeSet;
use std::ops::Range;
use std::sync::{Arc, PoisonError};

/// Bits at which eigenvalues are first told apart.
const FIRST_BITS: u32 = 192;

/// Bits at which the attempt to tell them apart ends.
const LAST_BITS: u32 = 20_000;

/// A level: its place in the spectrum, and what is exact of it.
#[derive(Clone, Debug)]
pub struct EnergyLevel {
    /// The place of its first state, counted from 0.
    pub first: usize,
    /// Number of states.
    pub size: usize,
    /// The energy where it is exact.
    pub energy: Option<Surd>,
    /// Orthonormal states in the order of their labels where they are exact.
    pub states: Option<Vec<ExactKet>>,
    pub parts: Vec<LevelPart>,
    /// Bits at which it stands apart from its neighbours.
    bits: u32,
    /// Bits that the nearness of its neighbours costs its states.
    gap_bits: u32,
}

/// The states of a level inside one component.
#[derive(Clone, Debug)]
pub struct LevelPart {
    pub component: usize,
    /// Their places among the eigenvalues of the component.
    pub places: Range<usize>,
    /// Vectors that span them where these are exact.
    pub span: Option<Vec<ExactKet>>,
}

/// Eigenvalues of one component that numbers cannot tell apart.
#[derive(Clone, Debug)]
struct Item {
    component: usize,
    places: Range<usize>,
    window: Window,
    exact: Option<ExactEnergy>,
}

/// Items whose windows overlap: a level, or several that more bits tell apart.
struct Group {
    items: Vec<Item>,
    low: Float,
    high: Float,
}

impl Group {
    fn size(&self) -> usize {
        self.items.iter().map(|item| item.places.len()).sum()
    }

    /// Whether the group is one level for certain.
    fn is_level(&self) -> bool {
        self.size() == 1 || (self.items.iter().all(|item| item.exact.is_some()) && self.is_consistent())
    }

    /// Whether all exact energies in it are the same.
    fn is_consistent(&self) -> bool {
        let mut energies = self.items.iter().filter_map(|item| item.exact.as_ref()).map(|exact| &exact.energy);
        let first = energies.next();
        energies.all(|energy| Some(energy) == first)
    }
}

impl EnergyLevel {
    /// Its states as a message names them.
    pub fn name(&self) -> String {
        match self.size {
            1 => format!("state {}", self.first),
            size => format!("states {} to {}", self.first, self.first + size - 1),
        }
    }

    pub fn places(&self) -> Range<usize> {
        self.first..self.first + self.size
    }
}

impl MatrixSystem {
    /// The level that holds the state with this place in the spectrum.
    pub(super) fn level(&self, place: usize, effort: &Effort) -> Result<Arc<EnergyLevel>, Obstacle> {
        let known = |system: &Self| {
            let levels = system.levels.lock().unwrap_or_else(PoisonError::into_inner);
            levels.range(..=place).next_back().map(|(_, level)| level.clone()).filter(|l| l.places().contains(&place))
        };
        if let Some(level) = known(self) {
            return Ok(level);
        }
        self.find_level(place, effort)?;
        known(self).ok_or(Obstacle::Undecided)
    }

    /// Finds the level of a place, and those of its cluster that show beside it.
    fn find_level(&self, place: usize, effort: &Effort) -> Result<(), Obstacle> {
        let rough = self.rough(effort)?;
        let cluster = rough.cluster_of(place);
        let all: BTreeSet<usize> = (0..self.components.len()).collect();
        let (mut bits, mut found) = (on_ladder(FIRST_BITS), false);
        for component in rough.places[cluster.clone()].iter().map(|place| place.component).collect::<BTreeSet<_>>() {
            bits = bits.max(on_ladder(self.bits_for_guess(component).unwrap_or(0)));
        }
        loop {
            effort.check()?;
            let groups = self.groups(cluster.clone(), &all, bits, effort)?;
            let mut first = cluster.start;
            let mut asked = cluster.clone();
            for (at, group) in groups.iter().enumerate() {
                let places = first..first + group.size();
                first = places.end;
                let is_asked = places.contains(&place);
                if is_asked {
                    asked = places.clone();
                }
                let is_level = group.is_level()
                    || (is_asked && group.is_consistent() && self.is_certified(group, bits, effort)?);
                if is_level {
                    let below = at.checked_sub(1).map(|k| groups[k].high.clone());
                    let below = below.or_else(|| cluster.start.checked_sub(1).map(|k| rough.places[k].high.clone()));
                    let above = groups.get(at + 1).map(|next| next.low.clone());
                    let above = above.or_else(|| rough.places.get(cluster.end).map(|next| next.low.clone()));
                    let level = self.level_of_group(group, places.start, bits, below, above);
                    let mut levels = self.levels.lock().unwrap_or_else(PoisonError::into_inner);
                    levels.entry(level.first).or_insert_with(|| Arc::new(level));
                    if is_asked {
                        found = true;
                    }
                }
            }
            if found {
                return Ok(());
            }
            if bits >= LAST_BITS {
                let (first, last) = (asked.start, asked.end - 1);
                return Err(Obstacle::Refused {
                    message: format!(
                        "with {bits} bits the states {first} to {last} can neither be told apart nor shown to be degenerate"
                    ),
                    help: "scale the matrix, or give its entries with fewer digits".into(),
                });
            }
            bits *= 2;
        }
    }

    fn level_of_group(
        &self,
        group: &Group,
        first: usize,
        bits: u32,
        below: Option<Float>,
        above: Option<Float>,
    ) -> EnergyLevel {
        let parts: Vec<LevelPart> = group
            .items
            .iter()
            .map(|item| LevelPart {
                component: item.component,
                places: item.places.clone(),
                span: item.exact.as_ref().and_then(|exact| exact.span.clone()),
            })
            .collect();
        let energy = group.items.iter().find_map(|item| item.exact.as_ref()).map(|exact| exact.energy.clone());
        let gap = [below.map(|below| &group.low - below), above.map(|above| above - &group.high)];
        let gap = gap.into_iter().flatten().map(|gap| Float::with_val(64, gap).get_exp().unwrap_or(i32::MIN / 2)).min();
        let size = parts.iter().map(|part| self.size_exponent(part.component)).max();
        let lost = gap.map_or(0, |gap| size.unwrap_or(0) - i64::from(gap));
        EnergyLevel {
            first,
            size: group.size(),
            energy,
            states: self.exact_states_of(&parts),
            parts,
            bits,
            gap_bits: u32::try_from(lost.clamp(0, i64::from(bits) + 64)).unwrap_or(0),
        }
    }

    fn exact_states_of(&self, parts: &[LevelPart]) -> Option<Vec<ExactKet>> {
        let mut states: Vec<(usize, ExactKet)> = Vec::new();
        for part in parts {
            states.extend(exact_states(part.span.as_ref()?, &self.components[part.component])?);
        }
        states.sort_by_key(|(from, _)| *from);
        Some(states.into_iter().map(|(_, state)| state).collect())
    }

    /// The eigenvalues in a cluster that belong to some of the components, grouped by what `bits` bits tell apart, in rising order.
    fn groups(
        &self,
        cluster: Range<usize>,
        components: &BTreeSet<usize>,
        bits: u32,
        effort: &Effort,
    ) -> Result<Vec<Group>, Obstacle> {
        let rough = self.rough(effort)?;
        let mut ranges: Vec<Option<Range<usize>>> = vec![None; self.components.len()];
        for place in rough.places[cluster].iter().filter(|place| components.contains(&place.component)) {
            let range = ranges[place.component].get_or_insert(place.local..place.local);
            *range = range.start.min(place.local)..range.end.max(place.local + 1);
        }
        let mut items = Vec::new();
        for (component, range) in ranges.into_iter().enumerate() {
            if let Some(range) = range {
                self.items(component, range, bits, effort, &mut items)?;
            }
        }
        items.sort_by(|a, b| a.window.low.total_cmp(&b.window.low));
        let mut groups: Vec<Group> = Vec::new();
        for item in items {
            match groups.last_mut() {
                Some(group) if item.window.low <= group.high => {
                    if group.high < item.window.high {
                        group.high = item.window.high.clone();
                    }
                    group.items.push(item);
                }
                _ => groups.push(Group {
                    low: item.window.low.clone(),
                    high: item.window.high.clone(),
                    items: vec![item],
                }),
            }
        }
        let mut split = Vec::with_capacity(groups.len());
        for group in groups {
            split_exact(group, &mut split)?;
        }
        Ok(split)
    }

    /// The eigenvalues of a component with these places at `bits` bits.
    fn items(
        &self,
        component: usize,
        range: Range<usize>,
        bits: u32,
        effort: &Effort,
        items: &mut Vec<Item>,
    ) -> Result<(), Obstacle> {
        let bits = on_ladder(bits);
        let precision = bits + 64;
        if let [only] = self.components[component].members.as_slice() {
            let energy = self.hamiltonian().entry(*only, *only);
            let span = Some(vec![ExactKet::from([(*only, Surd::one())])]);
            let window = exact_window(&energy, precision);
            items.push(Item { component, places: 0..1, window, exact: Some(ExactEnergy { energy, span }) });
            return Ok(());
        }
        let cluster = self.refined(component, range.clone(), bits, 0, effort)?;
        let error = self.error_at(component, bits);
        for level in &cluster.levels {
            let places = cluster.first + level.start..cluster.first + level.end;
            if places.end <= range.start || range.end <= places.start {
                continue;
            }
            let window = Window {
                low: Float::with_val(precision, &cluster.values[level.start] - &error),
                high: Float::with_val(precision, &cluster.values[level.end - 1] + &error),
            };
            let exact = self.known_exact(component, &places, &window, bits, effort)?;
            let window = exact.as_ref().map_or(window, |exact| exact_window(&exact.energy, precision));
            items.push(Item { component, places, window, exact });
        }
        Ok(())
    }

    /// The exact energy of states of a component; a proved one is kept.
    fn known_exact(
        &self,
        component: usize,
        places: &Range<usize>,
        window: &Window,
        bits: u32,
        effort: &Effort,
    ) -> Result<Option<ExactEnergy>, Obstacle> {
        let key = (component, places.start, places.end);
        if let Some(known) = self.proved.lock().unwrap_or_else(PoisonError::into_inner).get(&key) {
            return Ok(Some(known.clone()));
        }
        let found = self.exact_energy(component, window, places.len(), bits, effort)?;
        if let Some(found) = &found {
            self.proved.lock().unwrap_or_else(PoisonError::into_inner).insert(key, found.clone());
        }
        Ok(found)
    }

    /// Tells whether what stays together at `bits` bits in the components of a group is equal: there are as many groups as distinct eigenvalues.
    fn is_certified(&self, group: &Group, bits: u32, effort: &Effort) -> Result<bool, Obstacle> {
        let components: BTreeSet<usize> = group.items.iter().map(|item| item.component).collect();
        let wanted = self.distinct_in(&components, effort)?;
        let rough = self.rough(effort)?;
        let mut found = 0;
        for cluster in &rough.clusters {
            let mut inside = rough.places[cluster.clone()].iter().filter(|place| components.contains(&place.component));
            found += match (inside.next(), inside.next()) {
                (None, _) => 0,
                (Some(_), None) => 1,
                _ => self.groups(cluster.clone(), &components, bits, effort)?.len(),
            };
        }
        Ok(found == wanted)
    }

    /// The certified number of distinct eigenvalues in some components.
    fn distinct_in(&self, components: &BTreeSet<usize>, effort: &Effort) -> Result<usize, Obstacle> {
        if let Some(count) = self.distinct.lock().unwrap_or_else(PoisonError::into_inner).get(components) {
            return Ok(*count);
        }
        let parts: Vec<_> = components.iter().map(|k| &self.components[*k]).collect();
        let count = distinct(self.hamiltonian(), &parts, effort)?;
        self.distinct.lock().unwrap_or_else(PoisonError::into_inner).insert(components.clone(), count);
        Ok(count)
    }

    /// The level that holds an eigenvalue of a component.
    pub(super) fn level_in_component(
        &self,
        component: usize,
        local: usize,
        effort: &Effort,
    ) -> Result<Arc<EnergyLevel>, Obstacle> {
        let rough = self.rough(effort)?;
        let holds = |part: &LevelPart| part.component == component && part.places.contains(&local);
        let at = rough.places.iter().position(|place| place.component == component && place.local == local);
        let cluster = rough.cluster_of(at.unwrap_or(0));
        let mut place = cluster.start;
        while place < cluster.end {
            let level = self.level(place, effort)?;
            if level.parts.iter().any(holds) {
                return Ok(level);
            }
            place = level.places().end;
        }
        Err(Obstacle::Undecided)
    }

    /// The level at an exact energy, if there is one.
    pub(super) fn level_at(&self, energy: &Surd, effort: &Effort) -> Result<Option<Arc<EnergyLevel>>, Obstacle> {
        if !energy.is_real() {
            return Ok(None);
        }
        let rough = self.rough(effort)?;
        let value = Number::Exact(energy.clone()).to_complex(64).into_real_imag().0;
        for place in 0..rough.places.len() {
            let window = &rough.places[place];
            if window.low <= value && value <= window.high {
                let level = self.level_in_component(window.component, window.local, effort)?;
                if level.energy.as_ref() == Some(energy) {
                    return Ok(Some(level));
                }
            }
        }
        Ok(None)
    }

    /// Energies and orthonormal states of a level inside its components at `bits` bits; the states count all basis vectors, in the order of
    /// their labels.
    pub(super) fn numeric_states(
        &self,
        level: &EnergyLevel,
        bits: u32,
        effort: &Effort,
    ) -> Result<Vec<Vec<Complex>>, Obstacle> {
        let precision = bits + 32;
        if let Some(states) = &level.states {
            let numeric = |state: &ExactKet| {
                let mut ket = vec![Complex::new(precision); self.order()];
                for (k, x) in state {
                    ket[*k] = Number::Exact(x.clone()).to_complex(precision);
                }
                ket
            };
            return Ok(states.iter().map(numeric).collect());
        }
        let mut states: Vec<(usize, Vec<Complex>)> = Vec::with_capacity(level.size);
        for part in &level.parts {
            let wanted = (bits + 32).max(level.bits);
            let cluster = self.refined(part.component, part.places.clone(), wanted, level.gap_bits, effort)?;
            let vectors = (part.places.start.checked_sub(cluster.first))
                .and_then(|start| cluster.vectors.get(start..start + part.places.len()))
                .ok_or(Obstacle::Undecided)?;
            let members = &self.components[part.component].members;
            for (from, local) in numeric_states(vectors, wanted) {
                let mut ket = vec![Complex::new(precision); self.order()];
                for (k, x) in members.iter().zip(local) {
                    ket[*k] = Complex::with_val(precision, x);
                }
                states.push((members[from], ket));
            }
        }
        states.sort_by_key(|(from, _)| *from);
        Ok(states.into_iter().map(|(_, ket)| ket).collect())
    }

    /// The energy of a level within 2^-bits of the norm of H.
    pub(super) fn numeric_energy(&self, level: &EnergyLevel, bits: u32, effort: &Effort) -> Result<Float, Obstacle> {
        if let Some(energy) = &level.energy {
            return Ok(Number::Exact(energy.clone()).to_complex(bits + 64).into_real_imag().0);
        }
        let part = level.parts.first().ok_or(Obstacle::Undecided)?;
        let wanted = bits.max(level.bits);
        let cluster = self.refined(part.component, part.places.clone(), wanted, level.gap_bits, effort)?;
        let at = part.places.start.checked_sub(cluster.first).and_then(|at| cluster.values.get(at));
        at.cloned().ok_or(Obstacle::Undecided)
    }
}

/// A window around an exact number, a little wider than its rounding.
fn exact_window(energy: &Surd, bits: u32) -> Window {
    let value = Number::Exact(energy.clone()).to_complex(bits).into_real_imag().0;
    let error = Float::with_val(64, value.abs_ref()) >> (bits - 4);
    Window::around(&value, &error)
}

/// Splits a group with only exact energies into one for each energy.
fn split_exact(group: Group, split: &mut Vec<Group>) -> Result<(), Obstacle> {
    if group.is_consistent() || group.items.iter().any(|item| item.exact.is_none()) {
        split.push(group);
        return Ok(());
    }
    let mut undecided = false;
    let mut items = group.items;
    let energy = |item: &Item| item.exact.as_ref().map(|exact| exact.energy.clone()).unwrap_or_default();
    items.sort_by(|a, b| {
        let order = compare(&energy(a), &energy(b));
        undecided |= order.is_none();
        order.unwrap_or(Ordering::Equal)
    });
    if undecided {
        return Err(Obstacle::Undecided);
    }
    for item in items {
        match split.last_mut() {
            Some(last)
                if last.items.first().is_some_and(|first| first.exact.is_some() && energy(first) == energy(&item)) =>
            {
                last.items.push(item);
            }
            _ => split.push(Group { low: item.window.low.clone(), high: item.window.high.clone(), items: vec![item] }),
        }
    }
    Ok(())
}

/// Exact comparison of two real numbers.
fn compare(a: &Surd, b: &Surd) -> Option<Ordering> {
    if a == b {
        return Some(Ordering::Equal);
    }
    Scalar::Exact(a - b).sign().ok()
}
