//! Real dense systems of linear equations: factored once, refined until the wanted bits hold.

use std::sync::{Arc, Mutex, PoisonError};

use nalgebra::{DMatrix, DVector};
use rug::Float;

use super::equilibrate::Equilibration;
use super::error::LinalgError;
use super::factor::{Balanced, Factorisation, Failure};
use super::kernel::{self, Entries};
use super::residual::residual;
use super::source::Source;
use super::vectors::{exponent, shift};
use crate::num::Effort;

/// Bits by which a correction must shrink for refinement to be worth its steps; below that the matrix is factored anew.
const LEAST_CONTRACTION: i64 = 10;

/// Bits kept of the solution beyond those wanted.
const GUARD: u32 = 64;

/// Bits beyond those wanted that entries are taken to have at least.
const KNOWN_GUARD: u32 = 32;

/// Bits by which the rounding of residuals stays below the wanted bits of a solution.
const RESIDUAL_GUARD: u32 = 24;

/// Bits a condition number may cost before the matrix is read in again for longer residuals.
const USUAL_CONDITION: u32 = 60;

/// Steps of refinement before a factorisation is given up.
const STEPS: usize = 40;

/// A solution and what it is worth.
#[derive(Clone, Debug)]
pub struct Solved {
    /// The solution, with some bits beyond those that were wanted.
    pub x: DVector<Float>,
    /// The bits that hold of the solution, relative to its largest component: taken from the last correction, which
    /// was at most 2^-holds of it.
    pub holds: i32,
}

/// A dense real matrix, factored and ready for any number of right-hand sides.
///
/// The entries are taken as exact: the solution is that of the system as given. An entry that is itself rounded at
/// precision p moves the solution by up to `2^(condition_bits - p)` relative to its norm, so give entries at the
/// wanted bits plus [`Solver::condition_bits`] plus some guard. A matrix whose condition number comes near 2^p is
/// refused as singular.
///
/// *Range*: any exponents of rug; strongly graded matrices are balanced by powers of two first. *Accuracy*: norm-wise,
/// relative to the largest component. *Cost*: order^3/6 multiply-adds for a symmetric matrix (order^3/3 if pivots are
/// needed, and for a general one), a few order^2 for each right-hand side.
pub struct Solver {
    source: Source,
    scale: Equilibration,
    symmetric: bool,
    bits: u32,
    known: u32,
    condition_bits: u32,
    /// The matrix in fixed point, long enough for residuals; not there for very long numbers.
    entries: Option<Entries>,
    /// The factorisations made so far, of rising precision; a solve begins with the first whatever was made before, so
    /// that an answer does not depend on what was asked earlier.
    ladder: Mutex<Vec<Arc<Rung>>>,
}

/// One factorisation of the ladder.
struct Rung {
    factors: Box<dyn Factorisation>,
    precision: u32,
    pivoted: bool,
}

impl Solver {
    /// Factors a symmetric matrix, definite or not, for solutions of `bits` bits; it is for the caller to see that it
    /// is symmetric.
    ///
    /// *Errors*: not square, not finite, or singular to the precision of the entries.
    pub fn symmetric(matrix: DMatrix<Float>, bits: u32, effort: &Effort) -> Result<Self, LinalgError> {
        Self::whole(matrix, true, bits, effort)
    }

    /// Factors a general square matrix with partial pivoting for solutions of `bits` bits.
    ///
    /// *Errors*: as for [`Solver::symmetric`].
    pub fn general(matrix: DMatrix<Float>, bits: u32, effort: &Effort) -> Result<Self, LinalgError> {
        Self::whole(matrix, false, bits, effort)
    }

    fn whole(matrix: DMatrix<Float>, symmetric: bool, bits: u32, effort: &Effort) -> Result<Self, LinalgError> {
        if matrix.nrows() != matrix.ncols() {
            return Err(LinalgError::NotSquare { rows: matrix.nrows(), columns: matrix.ncols() });
        }
        let known = matrix.iter().map(Float::prec).max().unwrap_or(0);
        Self::new(Source::Whole(matrix), symmetric, known, bits, effort)
    }

    /// Factors a matrix whose entries are worth `known` bits; fewer than wanted means that they are exact.
    pub(super) fn new(
        source: Source,
        symmetric: bool,
        known: u32,
        bits: u32,
        effort: &Effort,
    ) -> Result<Self, LinalgError> {
        let known = known.max(bits.saturating_add(KNOWN_GUARD));
        if !source.is_finite() {
            return Err(LinalgError::NotFinite);
        }
        let scale = if symmetric { Equilibration::symmetric(&source) } else { Equilibration::general(&source) };
        let scale = scale.ok_or(LinalgError::Singular { known })?;
        let mut solver = Self {
            source,
            scale,
            symmetric,
            bits,
            known,
            condition_bits: 0,
            entries: None,
            ladder: Mutex::new(Vec::new()),
        };
        solver.read_entries(USUAL_CONDITION, effort)?;
        solver.probe(effort)?;
        Ok(solver)
    }

    /// Returns the order of the matrix.
    pub fn order(&self) -> usize {
        self.source.order()
    }

    /// Returns the bits that solutions are made for.
    pub fn bits(&self) -> u32 {
        self.bits
    }

    /// Returns an estimate of the binary logarithm of the condition number of the balanced matrix: the bits that
    /// rounding of the entries, or of a right-hand side, can cost.
    pub fn condition_bits(&self) -> u32 {
        self.condition_bits
    }

    /// Solves for one right-hand side.
    ///
    /// *Accuracy*: the last correction was below 2^-bits of the solution's largest component. *Errors*: a wrong length,
    /// a component that is not finite, or fewer bits than wanted at the highest sensible precision.
    pub fn solve(&self, rhs: &DVector<Float>, effort: &Effort) -> Result<Solved, LinalgError> {
        if rhs.len() != self.order() {
            return Err(LinalgError::WrongLength { found: rhs.len(), expected: self.order() });
        }
        if rhs.iter().any(|x| !x.is_finite()) {
            return Err(LinalgError::NotFinite);
        }
        let mut balanced: Vec<Float> = rhs.iter().cloned().collect();
        for (b, r) in balanced.iter_mut().zip(&self.scale.rows) {
            shift(b, *r);
        }
        let mut x = vec![Float::new(self.solution_precision()); self.order()];
        let mut holds = 0;
        let mut rung = self.rung(0, effort)?;
        let mut level = 0;
        loop {
            match self.refine(&rung, &balanced, &mut x, effort)? {
                Refinement::Settled(settled) => {
                    let mut x = DVector::from_vec(x);
                    for (x, c) in x.iter_mut().zip(&self.scale.columns) {
                        shift(x, *c);
                    }
                    return Ok(Solved { x, holds: settled });
                }
                Refinement::Stalled(stalled) => holds = stalled.max(holds),
            }
            level += 1;
            rung = self.rung(level, effort).map_err(|error| match error {
                LinalgError::Singular { .. } => LinalgError::IllConditioned { wanted: self.bits, holds },
                other => other,
            })?;
        }
    }

    fn balanced(&self) -> Balanced<'_> {
        Balanced { source: &self.source, scale: &self.scale }
    }

    /// Returns the bits a balanced solution is kept with.
    fn solution_precision(&self) -> u32 {
        self.bits.saturating_add(self.scale.column_spread()).saturating_add(GUARD)
    }

    /// Reads the matrix in fixed point, with bits for residuals at a condition number of so many bits.
    fn read_entries(&mut self, condition_bits: u32, effort: &Effort) -> Result<(), LinalgError> {
        let needed = self.residual_bits(condition_bits);
        self.entries = match kernel::limbs_for(needed, self.order()) {
            Some(limbs) if self.entries.as_ref().is_none_or(|entries| entries.limbs() < limbs) => {
                Entries::new(self.balanced(), self.symmetric, limbs, effort)?
            }
            Some(_) => self.entries.take(),
            None => None,
        };
        Ok(())
    }

    /// Returns the bits a residual needs so that its own rounding stays below the wanted bits.
    fn residual_bits(&self, condition_bits: u32) -> u32 {
        let kept = self.bits.saturating_add(self.scale.column_spread()).saturating_add(RESIDUAL_GUARD);
        kept.saturating_add(condition_bits)
    }

    /// Returns the residual of a balanced solution: in fixed point where the entries are long enough.
    fn residual(&self, x: &[Float], rhs: &[Float], bits: u32, effort: &Effort) -> Result<Vec<Float>, LinalgError> {
        match &self.entries {
            Some(entries) if entries.accurate_bits() >= bits => Ok(entries.residual(x, rhs, effort)?),
            _ => residual(self.balanced(), x, rhs, bits, effort),
        }
    }

    /// Finds the first factorisation that makes corrections shrink, trying it on a fixed vector of irregular signs.
    fn probe(&mut self, effort: &Effort) -> Result<(), LinalgError> {
        let mut state = 0x9E37_79B9_7F4A_7C15_u64;
        let signs: Vec<Float> = (0..self.order())
            .map(|_| {
                state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
                Float::with_val(self.bits.max(64), (state >> 32) as i32)
            })
            .collect();
        for level in 0.. {
            let rung = self.rung(level, effort)?;
            let x = rung.factors.solve(&signs, effort)?;
            let r = self.residual(&x, &signs, rung.precision + GUARD, effort)?;
            let correction = rung.factors.solve(&r, effort)?;
            let contraction = match (exponent(&x), exponent(&correction)) {
                (Some(x), Some(correction)) => x - correction,
                _ => i64::from(rung.precision),
            };
            let lost = (i64::from(rung.precision) - contraction).max(0);
            // Without pivots the growth of the elimination may be to blame.
            let singular = lost + 16 > i64::from(self.known);
            if singular && rung.pivoted {
                return Err(LinalgError::Singular { known: self.known });
            }
            if contraction >= LEAST_CONTRACTION && !singular {
                self.condition_bits = u32::try_from(lost).unwrap_or(u32::MAX);
                self.read_entries(self.condition_bits, effort)?;
                self.ladder.get_mut().unwrap_or_else(PoisonError::into_inner).drain(..level);
                return Ok(());
            }
        }
        Ok(())
    }

    /// Returns the factorisation number `level` of the ladder, making it and those before it where they are missing.
    fn rung(&self, level: usize, effort: &Effort) -> Result<Arc<Rung>, LinalgError> {
        let mut ladder = self.ladder.lock().unwrap_or_else(PoisonError::into_inner);
        while ladder.len() <= level {
            let (mut precision, mut pivoted) = match ladder.last() {
                // Two corrections double the bits that hold twice, so the factors need not have all that are wanted.
                None => (self.bits - self.bits / 4, !self.symmetric),
                Some(last) if !last.pivoted => (last.precision, true),
                Some(last) => (last.precision + last.precision.div_ceil(2), true),
            };
            let rung = loop {
                // Beyond the bits of the entries a vanishing pivot is what the entries say.
                if precision / 2 > self.known.max(self.bits) + 64 {
                    return Err(LinalgError::Singular { known: self.known });
                }
                match kernel::factorise(self.balanced(), self.entries.as_ref(), precision, pivoted, effort) {
                    Ok((factors, precision)) => break Rung { factors, precision, pivoted },
                    Err(Failure::Growth) if !pivoted => pivoted = true,
                    Err(Failure::Growth | Failure::NoPivot) => precision += precision.div_ceil(2),
                    Err(Failure::Error(error)) => return Err(error),
                }
            };
            ladder.push(Arc::new(rung));
        }
        Ok(Arc::clone(&ladder[level]))
    }

    /// Corrects a balanced solution until a correction is below the wanted bits or no longer shrinks.
    fn refine(&self, rung: &Rung, rhs: &[Float], x: &mut [Float], effort: &Effort) -> Result<Refinement, LinalgError> {
        let precision = self.residual_bits(self.condition_bits);
        let wanted = i64::from(self.bits) + 1;
        let mut before = i64::MIN;
        for _ in 0..STEPS {
            let r = match exponent(x.iter()) {
                None => rhs.to_vec(),
                Some(_) => self.residual(x, rhs, precision, effort)?,
            };
            let correction = rung.factors.solve(&r, effort)?;
            let fresh = exponent(x.iter()).is_none();
            for (x, d) in x.iter_mut().zip(&correction) {
                *x += d;
            }
            let (size, moved) = (self.size(x), self.size(&correction));
            let shrunk = match (size, moved) {
                (None, _) | (_, None) => i64::from(self.solution_precision()),
                // The first "correction" is the solution itself and tells nothing of its errors.
                (Some(_), Some(_)) if fresh => continue,
                (Some(size), Some(moved)) => size - moved,
            };
            if shrunk >= wanted {
                let holds = (shrunk - 1).min(i64::from(self.bits + RESIDUAL_GUARD / 2));
                return Ok(Refinement::Settled(holds as i32));
            }
            if shrunk < before.saturating_add(LEAST_CONTRACTION / 2) {
                return Ok(Refinement::Stalled(shrunk.max(0) as i32));
            }
            before = shrunk;
        }
        Ok(Refinement::Stalled(before.max(0) as i32))
    }

    /// Returns the exponent of the largest component of a balanced solution in the variables of the caller.
    fn size(&self, x: &[Float]) -> Option<i64> {
        x.iter().zip(&self.scale.columns).filter_map(|(x, c)| x.get_exp().map(|e| i64::from(e) + c)).max()
    }
}

/// What became of a round of refinement, with the bits its last correction left standing.
enum Refinement {
    Settled(i32),
    Stalled(i32),
}
