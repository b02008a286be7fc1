//! The matrix of a system of equations as it is kept.

use std::sync::Arc;

use nalgebra::DMatrix;
use rug::Float;

/// A square matrix, by itself or as a real symmetric one with another diagonal, which costs no copy.
#[derive(Clone, Debug)]
pub(super) enum Source {
    Whole(DMatrix<Float>),
    Shifted { matrix: Arc<DMatrix<Float>>, diagonal: Vec<Float> },
}

impl Source {
    /// Returns the number of rows.
    pub fn order(&self) -> usize {
        match self {
            Self::Whole(matrix) => matrix.nrows(),
            Self::Shifted { diagonal, .. } => diagonal.len(),
        }
    }

    /// Returns an entry.
    #[inline]
    pub fn entry(&self, row: usize, column: usize) -> &Float {
        match self {
            Self::Whole(matrix) => &matrix[(row, column)],
            Self::Shifted { diagonal, .. } if row == column => &diagonal[row],
            Self::Shifted { matrix, .. } => &matrix[(row, column)],
        }
    }

    /// Tells whether all entries are finite; the matrix of a shifted one is known to be.
    pub fn is_finite(&self) -> bool {
        match self {
            Self::Whole(matrix) => matrix.iter().all(Float::is_finite),
            Self::Shifted { diagonal, .. } => diagonal.iter().all(Float::is_finite),
        }
    }
}
