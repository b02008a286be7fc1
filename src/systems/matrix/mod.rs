//! Plain matrices: a finite Hilbert space given by a Hermitian H and operators with exact entries.
//!
//! States are counted from 0 by rising energy, each level as often as it has states; `states` tells which states a degenerate level has.
//! H is taken apart into its connected components (`component`). Whatever can be exact is: energies and states (`guess`, `levels`), resolvents
//! (`exact`). The rest is numbers at any precision (`numeric`).

mod component;
mod elimination;
mod entries;
mod exact;
mod factored;
mod fault;
mod fraction_free;
mod function;
mod guess;
mod levels;
mod market;
mod modular;
mod numeric;
mod refined;
mod rough;
mod states;
mod vectors;

#[cfg(test)]
mod tests;

pub use entries::{ExactMatrix, LARGEST_DIMENSION};
pub use fault::MatrixFault;

use super::{
    Atom, Backend, Block, Coupling, Level, Manifold, Number, Obstacle, Omitted, RadialOperator, Sector, State,
    StateLabel, System, SystemError,
};
use crate::linalg::{HermitianMatrix, LinalgError};
use crate::num::{Effort, Surd};
use component::Component;
use guess::ExactEnergy;
use levels::EnergyLevel;
use rough::RoughSpectrum;
use rug::{Complex, Float};
use std::collections::{BTreeMap, BTreeSet};
use std::sync::{Arc, Mutex, PoisonError};

/// Entries longer than this are not all seen by the first numeric attempt.
const ENTRY_BITS_LIMIT: u32 = 4096;

/// Precisions whose kets are kept at a time.
const KEPT_PRECISIONS: usize = 3;

/// Times the precision is raised for the digits of an energy.
const RAISES: usize = 6;

/// The only sector of a matrix.
const WHOLE: Sector = Sector { block: Block::Whole, twice_m: 0 };

/// A finite Hilbert space. Clones share what was computed.
#[derive(Clone)]
pub struct MatrixSystem(Arc<Inner>);

/// What a matrix system holds; kept together so that backends share it.
pub struct Inner {
    /// H first.
    operators: Vec<(String, ExactMatrix)>,
    components: Vec<Component>,
    /// The component of each basis state.
    owner: Vec<usize>,
    entry_bits: u32,
    rough: Mutex<Option<Arc<RoughSpectrum>>>,
    /// Levels by their first state.
    levels: Mutex<BTreeMap<usize, Arc<EnergyLevel>>>,
    /// Proved energies of a component by their first place and the place behind the last.
    proved: Mutex<BTreeMap<(usize, usize, usize), ExactEnergy>>,
    /// All eigenvalues of a component at a precision.
    windows: Mutex<BTreeMap<(usize, u32), guess::Windows>>,
    /// Numbers of distinct eigenvalues in sets of components.
    distinct: Mutex<BTreeMap<BTreeSet<usize>, usize>>,
    work: Mutex<Vec<Arc<numeric::Work>>>,
    clusters: refined::Clusters,
    solvers: factored::Solvers,
}

impl std::ops::Deref for MatrixSystem {
    type Target = Inner;
    fn deref(&self) -> &Inner {
        &self.0
    }
}

impl MatrixSystem {
    /// A system from its named matrices, one of which is `H`.
    ///
    /// Errors: no H, a name given twice, or matrices of different order.
    pub fn new(mut operators: Vec<(String, ExactMatrix)>) -> Result<Self, MatrixFault> {
        let mut names = BTreeSet::new();
        if let Some((name, _)) = operators.iter().find(|(name, _)| !names.insert(name.as_str())) {
            return Err(MatrixFault::GivenTwice { name: name.clone() });
        }
        let at = operators.iter().position(|(name, _)| name == "H").ok_or(MatrixFault::NoHamiltonian)?;
        operators[..=at].rotate_right(1);
        let order = operators[0].1.order();
        if let Some((name, matrix)) = operators.iter().find(|(_, matrix)| matrix.order() != order) {
            return Err(MatrixFault::DifferentOrder { name: name.clone(), found: matrix.order(), order });
        }
        let components = component::components(&operators[0].1);
        let mut owner = vec![0; order];
        for (k, component) in components.iter().enumerate() {
            for member in &component.members {
                owner[*member] = k;
            }
        }
        let entry_bits = operators.iter().map(|(_, matrix)| matrix.bits()).max().unwrap_or(0).min(ENTRY_BITS_LIMIT);
        Ok(MatrixSystem(Arc::new(Inner {
            operators,
            components,
            owner,
            entry_bits,
            rough: Mutex::default(),
            levels: Mutex::default(),
            proved: Mutex::default(),
            windows: Mutex::default(),
            distinct: Mutex::default(),
            work: Mutex::default(),
            clusters: refined::Clusters::default(),
            solvers: factored::Solvers::default(),
        })))
    }

    fn hamiltonian(&self) -> &ExactMatrix {
        &self.operators[0].1
    }

    fn order(&self) -> usize {
        self.owner.len()
    }

    /// H inside a component with entries of `bits` bits.
    fn hermitian(&self, component: usize, bits: u32) -> Result<HermitianMatrix, Obstacle> {
        component::hermitian(self.hamiltonian(), &self.components[component], bits)
    }

    /// An exponent e with every eigenvalue of a component below 2^e in absolute value.
    fn size_exponent(&self, component: usize) -> i64 {
        self.components[component].size_exponent(self.hamiltonian())
    }

    /// A bound of the error of eigenvalues of a component found to `bits` bits of the largest.
    fn error_at(&self, component: usize, bits: u32) -> Float {
        let exponent = self.size_exponent(component) - i64::from(bits);
        Float::with_val(64, 1) << i32::try_from(exponent).unwrap_or(i32::MAX / 2)
    }

    fn rough(&self, effort: &Effort) -> Result<Arc<RoughSpectrum>, Obstacle> {
        let mut known = self.rough.lock().unwrap_or_else(PoisonError::into_inner);
        if let Some(rough) = &*known {
            return Ok(rough.clone());
        }
        let rough = Arc::new(RoughSpectrum::new(self, effort)?);
        *known = Some(rough.clone());
        Ok(rough)
    }

    fn matrix(&self, operator: &RadialOperator) -> &ExactMatrix {
        let index = usize::try_from(operator.index).unwrap_or(0).min(self.operators.len() - 1);
        &self.operators[index].1
    }

    fn place(&self, numbers: &[i64]) -> usize {
        numbers.first().and_then(|n| usize::try_from(*n).ok()).unwrap_or(0).min(self.order() - 1)
    }

    /// The levels to leave out, each once, in rising order.
    fn omitted_levels(&self, omitted: &[Omitted], effort: &Effort) -> Result<Vec<Arc<EnergyLevel>>, Obstacle> {
        let mut levels = BTreeMap::new();
        for item in omitted {
            let numbers = match item {
                Omitted::LevelOf(state) => &state.numbers,
                Omitted::Manifold(manifold) => &manifold.numbers,
            };
            let level = self.level(self.place(numbers), effort)?;
            levels.insert(level.first, level);
        }
        Ok(levels.into_values().collect())
    }

    fn whole_label(&self, label: &StateLabel) -> Result<usize, SystemError> {
        let last = self.order() - 1;
        let refuse = |message: String| {
            let help = match last {
                0 => "the only state is number 0, as in `m[0]`".into(),
                _ => format!("write a whole number from 0 (the lowest) to {last}, as in `m[0]`"),
            };
            Err(SystemError::Refused { message, help })
        };
        if let Some((name, _)) = label.options.first() {
            return refuse(format!("a state of a matrix has no quantum number `{name}`"));
        }
        let text = label.text.trim();
        if text.is_empty() || !text.bytes().all(|b| b.is_ascii_digit()) {
            return refuse(format!("`{text}` is not the number of a state"));
        }
        match text.parse::<usize>() {
            Ok(index) if index <= last => Ok(index),
            _ => refuse(format!("there is no state {text}: the matrix has {} states", last + 1)),
        }
    }
}

/// Turns a failed linear-algebra step into an obstacle: what more precision may cure is undecided.
fn obstacle(error: LinalgError) -> Obstacle {
    match error {
        LinalgError::Interrupted(stop) => Obstacle::Interrupted(stop),
        LinalgError::Singular { .. }
        | LinalgError::NoPivot { .. }
        | LinalgError::IllConditioned { .. }
        | LinalgError::EigenvaluesUnsettled { .. } => Obstacle::Undecided,
        LinalgError::TooFewPrimes { .. } => Obstacle::Refused {
            message: "whether two energies of H are equal is not decided: too many different square roots stand in its entries".into(),
            help: "scale the basis vectors so that fewer square roots are left".into(),
        },
        other => Obstacle::Refused { message: other.to_string(), help: String::new() },
    }
}

/// An obstacle on the way to a state, told of the declaration.
fn refused(obstacle: Obstacle) -> SystemError {
    match obstacle {
        Obstacle::Interrupted(stop) => SystemError::Interrupted(stop),
        Obstacle::Refused { message, help } => SystemError::Refused { message, help },
        other => SystemError::Refused { message: other.to_string(), help: String::new() },
    }
}

impl System for MatrixSystem {
    fn kind(&self) -> &'static str {
        "matrix"
    }

    fn state(&self, label: &StateLabel, _: &Effort) -> Result<State, SystemError> {
        let index = self.whole_label(label)?;
        Ok(State { label: index.to_string(), numbers: vec![i64::try_from(index).unwrap_or(0)] })
    }

    fn manifold(&self, label: &StateLabel, effort: &Effort) -> Result<Manifold, SystemError> {
        let index = self.whole_label(label)?;
        let level = self.level(index, effort).map_err(refused)?;
        let number = i64::try_from(level.first).unwrap_or(0);
        Ok(Manifold { label: index.to_string(), numbers: vec![number] })
    }

    fn energy(&self, state: &State, bits: u32, effort: &Effort) -> Result<Number, Obstacle> {
        let level = self.level(self.place(&state.numbers), effort)?;
        if let Some(energy) = &level.energy {
            return Ok(Number::Exact(energy.clone()));
        }
        // Digits are relative to the energy, eigenvalues come relative to the norm of H.
        let size = level.parts.iter().map(|part| self.size_exponent(part.component)).max().unwrap_or(0);
        let mut work = bits.max(self.entry_bits) + 64;
        for _ in 0..RAISES {
            let value = self.numeric_energy(&level, work, effort)?;
            if let Some(exponent) = value.get_exp()
                && i64::from(work) - (size - i64::from(exponent)) >= i64::from(bits)
            {
                return Ok(Number::Approx(Complex::with_val(work, (value, 0))));
            }
            work = work.saturating_mul(2);
        }
        Err(Obstacle::Undecided)
    }

    fn degenerate(&self, a: &State, b: &State) -> bool {
        let effort = Effort::new();
        match self.level(self.place(&a.numbers), &effort) {
            Ok(level) => level.places().contains(&self.place(&b.numbers)),
            Err(_) => false,
        }
    }

    fn level_in(&self, state: &State, _: Sector, effort: &Effort) -> Result<Vec<State>, Obstacle> {
        let places = self.level(self.place(&state.numbers), effort)?.places();
        let named = |place: usize| State { label: place.to_string(), numbers: vec![i64::try_from(place).unwrap_or(0)] };
        Ok(places.map(named).collect())
    }

    fn level(&self, state: &State, effort: &Effort) -> Result<Vec<State>, Obstacle> {
        self.level_in(state, Sector { block: Block::Whole, twice_m: 0 }, effort)
    }

    fn states_of(&self, manifold: &Manifold, effort: &Effort) -> Result<Vec<State>, Obstacle> {
        let first = State { label: manifold.label.clone(), numbers: manifold.numbers.clone() };
        self.level_in(&first, Sector { block: Block::Whole, twice_m: 0 }, effort)
    }

    fn knows(&self, atom: &Atom) -> Result<bool, SystemError> {
        if !self.operators.iter().any(|(name, _)| *name == atom.name) {
            let known = self.operators.iter().map(|(name, _)| name.clone()).collect();
            return Err(SystemError::UnknownOperator { name: atom.name.clone(), known });
        }
        if atom.component.is_some() || !atom.arguments.is_empty() {
            return Err(SystemError::Refused {
                message: format!("the matrix `{}` has neither components nor arguments", atom.name),
                help: format!("write `{}` alone", atom.name),
            });
        }
        Ok(atom.power == 1)
    }

    fn couple(&self, atom: &Atom, from: Sector) -> Vec<Coupling> {
        let index = self.operators.iter().position(|(name, _)| *name == atom.name);
        index
            .and_then(|index| i64::try_from(index).ok())
            .map(|index| Coupling { to: from, factor: Surd::one(), radial: RadialOperator { kind: "matrix", index } })
            .into_iter()
            .collect()
    }

    fn adjoint(&self, atom: &Atom) -> (i32, Atom) {
        (1, atom.clone())
    }

    /// A matrix has none: its zeros are arithmetic.
    fn selection_rule(&self, _: &Atom) -> String {
        String::new()
    }

    fn exact(&self, effort: &Effort) -> Option<Arc<dyn Backend>> {
        Some(Arc::new(exact::ExactBackend { system: self.clone(), effort: effort.clone() }))
    }

    fn numeric(&self, level: Level, _: &State, effort: &Effort) -> Result<Arc<dyn Backend>, Obstacle> {
        let mut kept = self.work.lock().unwrap_or_else(PoisonError::into_inner);
        let work = match kept.iter().position(|work| work.bits == level.bits) {
            Some(at) => kept.remove(at),
            None => Arc::new(numeric::Work::new(level.bits)),
        };
        if kept.len() >= KEPT_PRECISIONS {
            kept.remove(0);
        }
        kept.push(work.clone());
        Ok(Arc::new(numeric::NumericBackend { system: self.clone(), work, effort: effort.clone() }))
    }

    fn basis_range(&self) -> Option<(usize, usize)> {
        None
    }

    fn data_bits(&self) -> u32 {
        2 * self.entry_bits
    }
}
