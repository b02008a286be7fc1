//! Arbitrary-precision linear algebra behind one door: dense and tridiagonal systems, eigenpairs, certified counts.
//!
//! * [`solve`]: real dense systems, factored once, answers with the number of bits that hold.
//! * [`shifted`]: `(z - H) x = b` for Hermitian H and real or complex z, whole or in the complement of given vectors.
//! * [`tridiagonal`]: symmetric tridiagonal systems, bordered by dense rows where wanted, over floats, complex floats
//!   and exact rationals.
//! * [`eigen`]: a preview of the spectrum in machine numbers, eigenvalues and eigenvectors to any precision.
//! * [`distinct`]: the number of distinct eigenvalues of an exact matrix, certified modulo large primes.
//!
//! Containers are nalgebra's `DMatrix` and `DVector` over `rug::Float`; the kernels stay inside.

pub mod distinct;
pub mod eigen;
mod equilibrate;
pub mod error;
mod factor;
pub mod hermitian;
mod kernel;
mod plain;
mod residual;
pub mod shifted;
pub mod solve;
mod source;
pub mod threads;
pub mod tridiagonal;
mod vectors;

#[cfg(test)]
mod tests;

pub use error::LinalgError;
pub use hermitian::HermitianMatrix;
pub use shifted::ShiftedSolver;
pub use solve::{Solved, Solver};
