//! Laws that hold for every input: chains against spectral sums and finite differences, and no printed digit that is wrong.
//!
//! Every case is a small session; a failing one is printed ready to paste. `KETWORK_CASES` scales the number of cases.

// Matrices are written with their indices, as on paper.
#![allow(clippy::needless_range_loop)]

mod formula;
mod honesty;
mod matrices;
mod notebook;
mod random;
mod vary;
