//! What can be wrong with a declared matrix, as data, with its words.

use super::entries::LARGEST_DIMENSION;

/// What is wrong with a declared matrix; rows and columns are counted from 1.
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
    #[error("row {row}, column {row} is not real: the matrix is not Hermitian")]
    ComplexDiagonal { row: usize },
    #[error("line {line}: {message}")]
    File { line: usize, message: String },
    #[error("the matrix of H is missing")]
    NoHamiltonian,
    #[error("`{name}` is given twice")]
    GivenTwice { name: String },
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
            MatrixFault::ComplexDiagonal { .. } => "the diagonal of a Hermitian matrix is real".into(),
            MatrixFault::File { .. } => "mend the file at this line".into(),
            MatrixFault::NoHamiltonian => "write `matrix(H = …)`, and the operators behind it".into(),
            MatrixFault::GivenTwice { .. } => "give each matrix one name of its own".into(),
            MatrixFault::DifferentOrder { .. } => "all matrices of a system act on the same states".into(),
        }
    }
}
