//! Symmetric tridiagonal systems, alone or bordered by a few dense rows, over floats, complex floats and exact
//! rationals.
//!
//! A factorisation costs O(n) operations and is kept for any number of right-hand sides. Complex matrices are
//! symmetric, not Hermitian: they come as `z S - H` with real S and H.

mod bordered;
mod factor;
mod scalar;
mod small;

pub use bordered::{Bordered, BorderedSolution};
pub use factor::{Factored, Inertia};
pub use scalar::Scalar;

use super::error::LinalgError;

/// A symmetric tridiagonal matrix.
#[derive(Clone, Debug, PartialEq)]
pub struct Tridiagonal<T> {
    diagonal: Vec<T>,
    off: Vec<T>,
}

impl<T: Scalar> Tridiagonal<T> {
    /// Makes a matrix from its diagonal and the entries beside it.
    ///
    /// *Errors*: `off` is not one shorter than `diagonal`.
    pub fn new(diagonal: Vec<T>, off: Vec<T>) -> Result<Self, LinalgError> {
        if off.len() + 1 != diagonal.len().max(1) {
            return Err(LinalgError::WrongLength { found: off.len(), expected: diagonal.len() });
        }
        Ok(Self { diagonal, off })
    }

    /// Returns the number of rows.
    pub fn order(&self) -> usize {
        self.diagonal.len()
    }

    /// Returns the entries on the diagonal.
    pub fn diagonal(&self) -> &[T] {
        &self.diagonal
    }

    /// Returns the entries beside the diagonal.
    pub fn off(&self) -> &[T] {
        &self.off
    }

    /// Returns `T x`.
    pub fn apply(&self, x: &[T]) -> Vec<T> {
        (0..self.order().min(x.len()))
            .map(|i| {
                let mut sum = self.diagonal[i].times(&x[i]);
                if i > 0 {
                    sum.add(&self.off[i - 1].times(&x[i - 1]));
                }
                if i + 1 < x.len() && i + 1 < self.order() {
                    sum.add(&self.off[i].times(&x[i + 1]));
                }
                sum
            })
            .collect()
    }
}
