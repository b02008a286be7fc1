//! Arbitrary-precision linear algebra behind one door: tridiagonal and dense systems, eigenpairs. Kernels stay inside.
