//! Factorisations of z - H inside one component, kept as long as memory lasts, and the verdict on energies at or near a level.

use super::levels::EnergyLevel;
use super::modular::states_at;
use super::numeric::NumericBackend;
use super::obstacle;
use crate::linalg::{LinalgError, ShiftedSolver};
use crate::num::Surd;
use crate::systems::{Number, Obstacle};
use rug::{Complex, Float};
use std::sync::{Arc, Mutex, PoisonError};

/// Memory that kept factorisations may take together, in bytes.
const MEMORY: u64 = 1 << 30;

/// Bits by which the entries exceed those wanted of a solution; more are taken where the system loses more.
const ENTRY_GUARD: u32 = 128;

/// Most bits that nearness to a level may cost.
const MOST_LOST: u32 = 20_000;

/// Bits at which an approximate energy that agrees with that of a level is taken to be the level's.
const TAKEN_AS_EQUAL: u32 = 512;

/// What a factorisation belongs to.
#[derive(Clone, PartialEq, Eq, Debug)]
struct Key {
    component: usize,
    z: String,
    omitted: Vec<usize>,
    bits: u32,
}

/// Kept factorisations, the one used last at the end.
#[derive(Default)]
pub struct Solvers {
    kept: Mutex<Vec<(Key, Arc<ShiftedSolver>, u64)>>,
}

impl Solvers {
    fn find(&self, key: &Key) -> Option<Arc<ShiftedSolver>> {
        let mut kept = self.kept.lock().unwrap_or_else(PoisonError::into_inner);
        let at = kept.iter().position(|(known, _, _)| known == key)?;
        let found = kept.remove(at);
        let solver = found.1.clone();
        kept.push(found);
        Some(solver)
    }

    fn keep(&self, key: Key, solver: Arc<ShiftedSolver>, bytes: u64) {
        let mut kept = self.kept.lock().unwrap_or_else(PoisonError::into_inner);
        kept.retain(|(known, _, _)| *known != key);
        kept.push((key, solver, bytes));
        while kept.len() > 1 && kept.iter().map(|(_, _, bytes)| bytes).sum::<u64>() > MEMORY {
            kept.remove(0);
        }
    }
}

impl NumericBackend {
    /// Solves Q (z - H) Q x = Q b inside one component, for vectors that count its members only.
    pub(super) fn solve_in(
        &self,
        component: usize,
        z: &Number,
        omitted: &[Arc<EnergyLevel>],
        right: &[Complex],
    ) -> Result<Vec<Complex>, Obstacle> {
        let order = self.system.components[component].order();
        let left_out: usize = omitted.iter().flat_map(|level| parts(level, component)).count();
        if left_out == order {
            return Ok(vec![Complex::new(self.precision()); order]);
        }
        if let [only] = right {
            let quotient = Complex::with_val(self.bits + 64, only / self.difference(component, z, omitted)?);
            return Ok(vec![Complex::with_val(self.precision(), quotient)]);
        }
        let solved = self.solver(component, z, omitted)?.solve(right, &self.effort).map_err(obstacle)?;
        Ok(solved.ket.iter().map(|x| Complex::with_val(self.precision(), x)).collect())
    }

    /// z - H in a component of one state.
    fn difference(&self, component: usize, z: &Number, omitted: &[Arc<EnergyLevel>]) -> Result<Complex, Obstacle> {
        let [only] = self.system.components[component].members.as_slice() else { return Err(Obstacle::Undecided) };
        let entry = self.system.hamiltonian().entry(*only, *only);
        match z {
            Number::Exact(z) => {
                let difference = z - &entry;
                if difference.is_zero() {
                    return Err(self.singular(component, &Number::Exact(entry), None));
                }
                Ok(Number::Exact(difference).to_complex(self.bits + 64))
            }
            Number::Approx(value) => {
                self.refuse_singular(component, z, omitted)?;
                Ok(Complex::with_val(self.bits + 64, value - Number::Exact(entry).to_complex(self.bits + 64)))
            }
        }
    }

    fn solver(
        &self,
        component: usize,
        z: &Number,
        omitted: &[Arc<EnergyLevel>],
    ) -> Result<Arc<ShiftedSolver>, Obstacle> {
        let text = match z {
            Number::Exact(z) => z.to_string(),
            Number::Approx(z) => format!("{z:?}"),
        };
        let key =
            Key { component, z: text, omitted: omitted.iter().map(|level| level.first).collect(), bits: self.bits };
        if let Some(known) = self.system.solvers.find(&key) {
            return Ok(known);
        }
        let solver = Arc::new(self.factored(component, z, omitted)?);
        let order = self.system.components[component].order() as u64;
        let doubled = if self.system.components[component].is_real && z_is_real(z) { 1 } else { 2 };
        // The matrix, its fixed-point form and the factors, each number with what its allocation takes.
        let bytes = 3 * (order * doubled).pow(2) * (u64::from(self.bits) / 8 + 64);
        self.system.solvers.keep(key, solver.clone(), bytes);
        Ok(solver)
    }

    /// Factors z - H with entries long enough that their rounding does not show in the bits wanted.
    fn factored(&self, component: usize, z: &Number, omitted: &[Arc<EnergyLevel>]) -> Result<ShiftedSolver, Obstacle> {
        let left_out = self.left_out(component, omitted)?;
        let mut entry_bits = self.bits + ENTRY_GUARD;
        let mut looked = false;
        loop {
            let h = self.system.hermitian(component, entry_bits)?;
            let value = z.to_complex(entry_bits);
            let imaginary = (!value.imag().is_zero()).then(|| value.imag());
            let needed = match ShiftedSolver::new(&h, (value.real(), imaginary), &left_out, self.bits, &self.effort) {
                Ok(solver) => {
                    let needed = self.bits.saturating_add(solver.condition_bits()).saturating_add(64);
                    if needed <= entry_bits {
                        return Ok(solver);
                    }
                    needed
                }
                Err(LinalgError::Singular { .. } | LinalgError::NoPivot { .. }) => entry_bits.saturating_mul(2),
                Err(other) => return Err(obstacle(other)),
            };
            if !looked && imaginary.is_none() {
                self.refuse_singular(component, z, omitted)?;
            }
            looked = true;
            if needed > self.bits.saturating_add(MOST_LOST) {
                return Err(Obstacle::Undecided);
            }
            entry_bits = needed;
        }
    }

    /// The states of omitted levels in a component, as vectors that count its members only.
    fn left_out(&self, component: usize, omitted: &[Arc<EnergyLevel>]) -> Result<Vec<Vec<Complex>>, Obstacle> {
        let members = &self.system.components[component].members;
        let mut vectors = Vec::new();
        for level in omitted.iter().filter(|level| parts(level, component).next().is_some()) {
            for ket in self.states(level)?.iter() {
                let local: Vec<Complex> = members.iter().map(|k| ket[*k].clone()).collect();
                if local.iter().any(|x| !x.is_zero()) {
                    vectors.push(local);
                }
            }
        }
        Ok(vectors)
    }

    /// Refuses a real energy that is that of a level which is not left out, or cannot be told from it.
    ///
    /// An exact energy is an eigenvalue or it is not, and that is decided. An approximate one (from `E(g)`, say) is undecided as long as more
    /// digits may tell it from the level; with many digits in common it is taken to be the level's.
    pub(super) fn refuse_singular(
        &self,
        component: usize,
        z: &Number,
        omitted: &[Arc<EnergyLevel>],
    ) -> Result<(), Obstacle> {
        let system = &self.system;
        if let Number::Exact(exact) = z {
            let count = states_at(system.hamiltonian(), &system.components[component], exact, &self.effort)?;
            let mut left = count;
            for level in omitted {
                let here: usize = parts(level, component).count();
                if count > 0 && here > 0 && self.is_level_at(level, exact)? {
                    left = left.saturating_sub(here);
                }
            }
            return if left == 0 { Ok(()) } else { Err(self.singular(component, z, None)) };
        }
        let value = z.to_complex(self.bits + 64).into_real_imag().0;
        let error = system.error_at(component, self.bits.saturating_sub(self.bits / 8));
        for level in self.levels_near(component, &value)? {
            if omitted.iter().any(|out| out.first == level.first) {
                continue;
            }
            let energy = system.numeric_energy(&level, self.bits + 16, &self.effort)?;
            if Float::with_val(64, &energy - &value).abs() > error {
                continue;
            }
            if self.bits < TAKEN_AS_EQUAL {
                return Err(Obstacle::Undecided);
            }
            let digits = (f64::from(self.bits - self.bits / 8) * std::f64::consts::LOG10_2) as u32;
            return Err(self.singular(component, z, Some(digits)));
        }
        Ok(())
    }

    /// Whether a level has an exact energy that some level of the component has.
    fn is_level_at(&self, level: &EnergyLevel, z: &Surd) -> Result<bool, Obstacle> {
        if let Some(energy) = &level.energy {
            return Ok(energy == z);
        }
        let energy = self.system.numeric_energy(level, self.bits, &self.effort)?;
        let value = Number::Exact(z.clone()).to_complex(self.bits + 64).into_real_imag().0;
        let size = level.parts.iter().map(|part| self.system.error_at(part.component, self.bits - self.bits / 8));
        Ok(size.into_iter().any(|error| Float::with_val(64, &energy - &value).abs() <= error))
    }

    /// The levels of a component that machine numbers cannot tell from an energy.
    fn levels_near(&self, component: usize, energy: &Float) -> Result<Vec<Arc<EnergyLevel>>, Obstacle> {
        let rough = self.system.rough(&self.effort)?;
        let slack = self.system.error_at(component, 40);
        let mut levels: Vec<Arc<EnergyLevel>> = Vec::new();
        for place in rough.places.iter().filter(|place| place.component == component) {
            if Float::with_val(64, &place.low - energy) <= slack && Float::with_val(64, energy - &place.high) <= slack {
                let level = self.system.level_in_component(component, place.local, &self.effort)?;
                if levels.last().is_none_or(|last| last.first != level.first) {
                    levels.push(level);
                }
            }
        }
        Ok(levels)
    }

    /// The energy of a resolvent is that of a level of the component (as far as so many digits tell).
    fn singular(&self, component: usize, z: &Number, digits: Option<u32>) -> Obstacle {
        let value = z.to_complex(self.bits + 64).into_real_imag().0;
        let level = match self.levels_near(component, &value) {
            Ok(levels) => levels.into_iter().min_by_key(|level| {
                let energy = self.system.numeric_energy(level, self.bits, &self.effort);
                let distance = energy.map(|energy| Float::with_val(64, energy - &value).get_exp().unwrap_or(i32::MIN));
                distance.unwrap_or(i32::MAX)
            }),
            Err(obstacle) => return obstacle,
        };
        let name = level.map_or("one of the states".into(), |level| level.name());
        let energy = match z {
            Number::Exact(z) => z.to_string(),
            Number::Approx(_) => shortened(&value),
        };
        Obstacle::Singular {
            level: match digits {
                None => format!("{name} (energy {energy})"),
                Some(digits) => format!("{name} (energy {energy}, the same in all {digits} digits looked at)"),
            },
        }
    }
}

/// The places of a level inside a component.
fn parts(level: &EnergyLevel, component: usize) -> impl Iterator<Item = usize> + '_ {
    level.parts.iter().filter(move |part| part.component == component).flat_map(|part| part.places.clone())
}

fn z_is_real(z: &Number) -> bool {
    match z {
        Number::Exact(z) => z.is_real(),
        Number::Approx(z) => z.imag().is_zero(),
    }
}

/// A number with seven digits, for messages.
pub fn shortened(value: &Float) -> String {
    let number = value.to_f64();
    if number == 0.0 || (1e-3..1e6).contains(&number.abs()) { format!("{number:.6}") } else { format!("{number:.6e}") }
}
