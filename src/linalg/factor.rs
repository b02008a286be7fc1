//! What a factorisation of a balanced matrix must offer, and the matrix it is made from.

use rug::Float;

use super::equilibrate::Equilibration;
use super::error::LinalgError;
use super::source::Source;
use super::vectors::shift;
use crate::num::Effort;

/// A matrix with its powers of two for rows and columns; the balanced entries are formed on the fly.
#[derive(Clone, Copy)]
pub(super) struct Balanced<'a> {
    pub source: &'a Source,
    pub scale: &'a Equilibration,
}

impl Balanced<'_> {
    pub fn order(&self) -> usize {
        self.source.order()
    }

    /// Returns an entry as it stands and the exponent of the power of two that balances it.
    pub fn entry(&self, row: usize, column: usize) -> (&Float, i64) {
        (self.source.entry(row, column), self.scale.rows[row] + self.scale.columns[column])
    }

    /// Returns a balanced entry rounded to a precision.
    pub fn rounded(&self, row: usize, column: usize, precision: u32) -> Float {
        let (entry, exponent) = self.entry(row, column);
        let mut value = Float::with_val(precision, entry);
        shift(&mut value, exponent);
        value
    }
}

/// A factorised balanced matrix, ready for right-hand sides.
pub(super) trait Factorisation: Send + Sync {
    /// Returns an approximate solution, its components at about the precision of the factorisation.
    ///
    /// *Accuracy*: the solution of a system whose matrix differs, in norm, by about 2^-precision times the growth of
    /// the elimination; it is for the caller to refine.
    fn solve(&self, rhs: &[Float], effort: &Effort) -> Result<Vec<Float>, LinalgError>;
}

/// Why a factorisation was not made.
pub(super) enum Failure {
    /// Entries grew too much, or a pivot vanished, in an elimination without pivots.
    Growth,
    /// No pivot was left: singular at this precision.
    NoPivot,
    /// Something the caller must hear of.
    Error(LinalgError),
}

impl<E: Into<LinalgError>> From<E> for Failure {
    fn from(error: E) -> Self {
        Self::Error(error.into())
    }
}
