//! Plain matrices: a finite Hilbert space given by a Hermitian H and operators with exact entries.
//!
//! States are counted from 0 by rising eigenvalue, each as often as it is degenerate.

mod elimination;
mod entries;
mod exact;
mod levels;
mod market;
mod numeric;

pub use entries::{ExactMatrix, LARGEST_DIMENSION};

use super::{
    Atom, Backend, Coupling, Level, Manifold, Number, Obstacle, Omitted, RadialOperator, Sector, State, StateLabel,
    System, SystemError,
};
use crate::linalg::HermitianMatrix;
use crate::linalg::eigen::spectrum_preview;
use crate::num::{Effort, Surd};
use levels::LevelOfMatrix;
use rug::{Complex, Float};
use std::sync::{Arc, Mutex, PoisonError};

/// Entries longer than this are not all seen by the first numeric attempt.
const ENTRY_BITS_LIMIT: u32 = 4096;

/// Precisions whose kets and factorisations are kept at a time.
const KEPT_PRECISIONS: usize = 4;

/// What is wrong with a declared matrix.
#[derive(Clone, PartialEq, Eq, Debug, thiserror::Error)]
pub enum MatrixFault {
    #[error("the matrix has no rows")]
    Empty,
    #[error("the matrix has {order} rows; the largest has {LARGEST_DIMENSION}")]
    TooLarge { order: usize },
    #[error("row {row} has {found} entries, where the matrix has {order} rows")]
    RowLength { row: usize, found: usize, order: usize },
    #[error("diagonal {diagonal} (0 is the main one) has {found} entries, too many beside a main diagonal of {order}")]
    DiagonalLength { diagonal: usize, found: usize, order: usize },
    #[error(
        "row {row}, column {column} is not the complex conjugate of row {column}, column {row}: the matrix is not Hermitian"
    )]
    NotHermitian { row: usize, column: usize },
    #[error("line {line}: {message}")]
    File { line: usize, message: String },
    #[error("the matrix of H is missing")]
    NoHamiltonian,
    #[error("H has {order} rows and `{name}` has {found}")]
    DifferentOrder { name: String, found: usize, order: usize },
}

impl MatrixFault {
    /// What to write instead.
    pub fn help(&self) -> String {
        match self {
            MatrixFault::Empty => "write rows, as in `[[1, 2], [2, 3]]`".into(),
            MatrixFault::TooLarge { .. } => "keep the states that matter".into(),
            MatrixFault::RowLength { .. } => "every row has as many entries as there are rows".into(),
            MatrixFault::DiagonalLength { .. } => "each diagonal beside the main one is shorter by one".into(),
            MatrixFault::NotHermitian { .. } => {
                "operators of observables are Hermitian: mend one of the two entries".into()
            }
            MatrixFault::File { .. } => "mend the file at this line".into(),
            MatrixFault::NoHamiltonian => "write `matrix(H = …)`, and the operators behind it".into(),
            MatrixFault::DifferentOrder { .. } => "all matrices of a system act on the same states".into(),
        }
    }
}

/// A finite Hilbert space.
#[derive(Clone)]
pub struct MatrixSystem(Arc<Inner>);

/// What a matrix system holds; kept together so that backends share it.
pub struct Inner {
    /// H first.
    operators: Vec<(String, ExactMatrix)>,
    components: Vec<Vec<usize>>,
    entry_bits: u32,
    levels: Mutex<Vec<LevelOfMatrix>>,
    distinct: Mutex<Option<usize>>,
    work: Mutex<Vec<Arc<numeric::Work>>>,
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
    /// Errors: no H, or matrices of different order.
    pub fn new(mut operators: Vec<(String, ExactMatrix)>) -> Result<Self, MatrixFault> {
        let at = operators.iter().position(|(name, _)| name == "H").ok_or(MatrixFault::NoHamiltonian)?;
        operators.swap(0, at);
        let order = operators[0].1.order();
        if let Some((name, matrix)) = operators.iter().find(|(_, matrix)| matrix.order() != order) {
            return Err(MatrixFault::DifferentOrder { name: name.clone(), found: matrix.order(), order });
        }
        let components = operators[0].1.components();
        let entry_bits = operators.iter().map(|(_, matrix)| matrix.bits()).max().unwrap_or(0).min(ENTRY_BITS_LIMIT);
        Ok(MatrixSystem(Arc::new(Inner {
            operators,
            components,
            entry_bits,
            levels: Mutex::default(),
            distinct: Mutex::default(),
            work: Mutex::default(),
        })))
    }

    fn hamiltonian(&self) -> &ExactMatrix {
        &self.operators[0].1
    }

    fn order(&self) -> usize {
        self.hamiltonian().order()
    }

    fn matrix(&self, operator: &RadialOperator) -> &ExactMatrix {
        let index = usize::try_from(operator.index).unwrap_or(0).min(self.operators.len() - 1);
        &self.operators[index].1
    }

    fn index(&self, state: &State) -> usize {
        state.numbers.first().and_then(|n| usize::try_from(*n).ok()).unwrap_or(0).min(self.order() - 1)
    }

    /// First states of the levels to leave out, each once.
    fn omitted_levels(&self, omitted: &[Omitted], effort: &Effort) -> Result<Vec<usize>, Obstacle> {
        let mut firsts = Vec::new();
        for item in omitted {
            let numbers = match item {
                Omitted::LevelOf(state) => &state.numbers,
                Omitted::Manifold(manifold) => &manifold.numbers,
            };
            let index = numbers.first().and_then(|n| usize::try_from(*n).ok()).unwrap_or(0).min(self.order() - 1);
            let first = self.level(index, effort)?.first;
            if !firsts.contains(&first) {
                firsts.push(first);
            }
        }
        Ok(firsts)
    }

    /// The level at an exact energy in words.
    fn level_at(&self, energy: &Surd, effort: &Effort) -> String {
        for index in 0..self.order() {
            match self.level(index, effort) {
                Ok(level) if level.exact.as_ref().is_some_and(|exact| exact.energy == *energy) => {
                    return format!("state {index} (energy {energy})");
                }
                Ok(_) => {}
                Err(_) => break,
            }
        }
        format!("a state with energy {energy}")
    }

    /// The state whose energy is nearest, in words.
    fn nearest_level(&self, h: &HermitianMatrix, z: &Float) -> String {
        let Some(preview) = spectrum_preview(h) else { return "one of the states".into() };
        let nearest =
            (0..self.order()).filter_map(|index| preview.value(index).map(|value| (index, value))).min_by(|a, b| {
                let (da, db) = (Float::with_val(64, &a.1 - z).abs(), Float::with_val(64, &b.1 - z).abs());
                da.total_cmp(&db)
            });
        nearest.map_or("one of the states".into(), |(index, value)| {
            format!("state {index} (energy {:.6})", value.to_f64())
        })
    }

    fn whole_label(&self, label: &StateLabel) -> Result<usize, SystemError> {
        let last = self.order() - 1;
        let refuse = |message: String| {
            Err(SystemError::Refused {
                message,
                help: format!("write a whole number from 0 (the lowest) to {last}, as in `m[0]`"),
            })
        };
        if let Some((name, _)) = label.options.first() {
            return refuse(format!("a state of a matrix has no quantum number `{name}`"));
        }
        match label.text.parse::<usize>() {
            Ok(index) if index <= last => Ok(index),
            Ok(index) => refuse(format!("there is no state {index}: the matrix has {} states", last + 1)),
            Err(_) => refuse(format!("`{}` is not the number of a state", label.text)),
        }
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
        let index = self.index(state);
        let level = self.level(index, effort)?;
        if let Some(exact) = &level.exact {
            return Ok(Number::Exact(exact.energy.clone()));
        }
        // Digits are relative to the energy, eigenvalues come relative to the norm of H.
        let mut work = bits.max(self.entry_bits) + 64;
        for _ in 0..6 {
            let (values, _) = self.numeric_states(&level, work, effort)?;
            let value = values.into_iter().nth(index - level.first).ok_or(Obstacle::Undecided)?;
            let norm =
                self.hermitian(64)?.exponent().unwrap_or(0) + i64::from(usize::BITS - self.order().leading_zeros());
            let lost = norm - value.get_exp().map_or(-i64::from(work), i64::from);
            if i64::from(work) - lost >= i64::from(bits) {
                return Ok(Number::Approx(Complex::with_val(work, (value, 0))));
            }
            work = work.saturating_mul(2);
        }
        Err(Obstacle::Undecided)
    }

    fn degenerate(&self, a: &State, b: &State) -> bool {
        let effort = Effort::new();
        match (self.level(self.index(a), &effort), self.level(self.index(b), &effort)) {
            (Ok(a), Ok(b)) => a.first == b.first,
            _ => false,
        }
    }

    fn knows(&self, atom: &Atom) -> Result<bool, SystemError> {
        let known = || self.operators.iter().map(|(name, _)| name.clone()).collect();
        if !self.operators.iter().any(|(name, _)| *name == atom.name) {
            return Err(SystemError::UnknownOperator { name: atom.name.clone(), known: known() });
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

    fn selection_rule(&self, atom: &Atom) -> String {
        format!("{} has no element here", atom.name)
    }

    fn exact(&self, effort: &Effort) -> Option<Arc<dyn Backend>> {
        Some(Arc::new(exact::ExactBackend { system: self.clone(), effort: effort.clone() }))
    }

    fn numeric(&self, level: Level, _: &State, effort: &Effort) -> Result<Arc<dyn Backend>, Obstacle> {
        let mut kept = self.work.lock().unwrap_or_else(PoisonError::into_inner);
        let work = match kept.iter().find(|work| work.bits == level.bits) {
            Some(known) => known.clone(),
            None => {
                let work = Arc::new(numeric::Work::new(self, level.bits)?);
                if kept.len() >= KEPT_PRECISIONS {
                    kept.remove(0);
                }
                kept.push(work.clone());
                work
            }
        };
        Ok(Arc::new(numeric::NumericBackend { system: self.clone(), work, effort: effort.clone() }))
    }

    fn basis_range(&self) -> Option<(usize, usize)> {
        None
    }

    fn data_bits(&self) -> u32 {
        2 * self.entry_bits
    }
}
