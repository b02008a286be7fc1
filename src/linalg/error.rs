//! What can go wrong in a linear system or an eigenvalue problem, as data.

use crate::num::Interrupted;

/// The reasons why a linear system or an eigenvalue problem has no answer.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum LinalgError {
    /// The person stopped the computation.
    #[error(transparent)]
    Interrupted(#[from] Interrupted),

    /// A matrix that must be square is not.
    #[error("the matrix has {rows} rows and {columns} columns; it must be square")]
    NotSquare { rows: usize, columns: usize },

    /// A vector and a matrix, or two matrices, do not fit together.
    #[error("a vector of {found} components meets a matrix of order {expected}")]
    WrongLength { found: usize, expected: usize },

    /// An entry differs from the complex conjugate of its mirror entry; rows and columns are counted from 0.
    #[error("the matrix is not Hermitian: the entries ({row}, {column}) and ({column}, {row}) are not conjugate")]
    NotHermitian { row: usize, column: usize },

    /// An entry is infinite or not a number.
    #[error("an entry is not a finite number")]
    NotFinite,

    /// The matrix has no inverse as far as entries of `known` bits can tell.
    #[error("the system of equations is singular to the {known} bits its entries have")]
    Singular { known: u32 },

    /// Elimination met a row without a pivot; rows are counted from 0.
    #[error("the system of equations is singular: row {row} follows from those before it")]
    NoPivot { row: usize },

    /// The answer does not reach the wanted number of bits at any precision that makes sense for the entries.
    #[error("{wanted} bits were wanted of the solution of an ill-conditioned system, {holds} hold")]
    IllConditioned { wanted: u32, holds: i32 },

    /// Eigenvalues were asked for that the matrix does not have; eigenvalues are counted from 0.
    #[error("eigenvalue number {last} was asked of a matrix of order {order}")]
    NoSuchEigenvalue { last: usize, order: usize },

    /// An iteration for eigenvalues did not settle.
    #[error("the eigenvalues did not settle to {wanted} bits, {holds} hold")]
    EigenvaluesUnsettled { wanted: u32, holds: i32 },

    /// Too few primes suit the entries of a matrix: a denominator or a radical has no image.
    #[error("only {found} of {wanted} primes suit the entries of the matrix")]
    TooFewPrimes { found: usize, wanted: usize },
}
