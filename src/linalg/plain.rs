//! Elimination on multi-precision floats with partial pivoting: the reference, and the way for very long numbers.

use rug::{Assign, Float};

use super::error::LinalgError;
use super::factor::{Balanced, Factorisation, Failure};
use crate::num::Effort;

/// P A = L U with L of unit diagonal, both in one square of rows.
pub(super) struct PlainLu {
    rows: Vec<Vec<Float>>,
    permutation: Vec<usize>,
    precision: u32,
}

impl PlainLu {
    /// Factorises with partial pivoting at the given precision.
    ///
    /// *Cost*: order^3/3 multiply-adds of that precision.
    pub fn new(a: Balanced, precision: u32, effort: &Effort) -> Result<Self, Failure> {
        let order = a.order();
        let mut rows: Vec<Vec<Float>> =
            (0..order).map(|i| (0..order).map(|j| a.rounded(i, j, precision)).collect()).collect();
        let mut permutation: Vec<usize> = (0..order).collect();
        let mut product = Float::new(precision);
        for k in 0..order {
            let pivot = (k..order)
                .max_by(|&i, &j| rows[i][k].cmp_abs(&rows[j][k]).unwrap_or(std::cmp::Ordering::Equal))
                .filter(|&i| !rows[i][k].is_zero())
                .ok_or(Failure::NoPivot)?;
            rows.swap(k, pivot);
            permutation.swap(k, pivot);
            let (above, below) = rows.split_at_mut(k + 1);
            let top = &above[k];
            for row in below {
                effort.check()?;
                row[k] /= &top[k];
                let (left, right) = row.split_at_mut(k + 1);
                let factor = &left[k];
                if factor.is_zero() {
                    continue;
                }
                for (x, t) in right.iter_mut().zip(&top[k + 1..]) {
                    product.assign(factor * t);
                    *x -= &product;
                }
            }
        }
        Ok(Self { rows, permutation, precision })
    }
}

impl Factorisation for PlainLu {
    fn solve(&self, rhs: &[Float], effort: &Effort) -> Result<Vec<Float>, LinalgError> {
        let order = self.rows.len();
        let mut x: Vec<Float> = self.permutation.iter().map(|&p| Float::with_val(self.precision, &rhs[p])).collect();
        for i in 0..order {
            effort.check()?;
            let (known, rest) = x.split_at_mut(i);
            for (l, y) in self.rows[i].iter().zip(known.iter()) {
                rest[0] -= l * y;
            }
        }
        for i in (0..order).rev() {
            effort.check()?;
            let (rest, known) = x.split_at_mut(i + 1);
            for (u, y) in self.rows[i][i + 1..].iter().zip(known.iter()) {
                rest[i] -= u * y;
            }
            rest[i] /= &self.rows[i][i];
        }
        Ok(x)
    }
}
