//! Eigenvalues and eigenvectors of Hermitian matrices: a look in machine numbers, some to any precision, or all of
//! them.

mod cluster;
mod full;
mod preview;
mod tridiagonalise;

pub use cluster::{EigenCluster, refine_cluster, refine_cluster_near};
pub use full::{Eigenpairs, all_eigenpairs};
pub use preview::{Preview, spectrum_preview};
