//! Exact elimination over the rationals, the reference of the floating kernels.

use nalgebra::DMatrix;
use rug::{Float, Rational};

/// Solves a square system exactly; `None` if it is singular.
pub(super) fn solve(a: &[Vec<Rational>], b: &[Rational]) -> Option<Vec<Rational>> {
    let order = b.len();
    let mut rows: Vec<Vec<Rational>> =
        a.iter().zip(b).map(|(row, b)| row.iter().chain(std::iter::once(b)).cloned().collect()).collect();
    for k in 0..order {
        let pivot = (k..order).find(|&i| rows[i][k] != 0)?;
        rows.swap(k, pivot);
        let inverse = rows[k][k].clone().recip();
        for x in &mut rows[k] {
            *x *= &inverse;
        }
        let top = rows[k].clone();
        for (i, row) in rows.iter_mut().enumerate() {
            if i != k && row[k] != 0 {
                let factor = row[k].clone();
                for (x, t) in row.iter_mut().zip(&top) {
                    *x -= Rational::from(&factor * t);
                }
            }
        }
    }
    Some(rows.into_iter().filter_map(|mut row| row.pop()).collect())
}

/// Returns the exact values of the entries of a matrix of floats, by rows.
pub(super) fn rows(a: &DMatrix<Float>) -> Vec<Vec<Rational>> {
    (0..a.nrows()).map(|i| (0..a.ncols()).map(|j| a[(i, j)].to_rational().expect("finite")).collect()).collect()
}
