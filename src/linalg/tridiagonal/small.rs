//! Elimination with partial pivoting for a few equations over any scalar.

use super::Scalar;
use crate::linalg::error::LinalgError;

/// P A = L U of a small dense matrix given by rows.
#[derive(Clone, Debug)]
pub(super) struct SmallLu<T> {
    rows: Vec<Vec<T>>,
    permutation: Vec<usize>,
}

impl<T: Scalar> SmallLu<T> {
    /// Factorises; `None` stands for a column without a pivot.
    pub fn new(mut rows: Vec<Vec<T>>) -> Option<Self> {
        let order = rows.len();
        let mut permutation: Vec<usize> = (0..order).collect();
        for k in 0..order {
            let pivot = (k..order).filter(|&i| !rows[i][k].is_zero()).max_by_key(|&i| rows[i][k].size())?;
            rows.swap(k, pivot);
            permutation.swap(k, pivot);
            let (above, below) = rows.split_at_mut(k + 1);
            for row in below {
                let factor = row[k].over(&above[k][k]);
                for j in k + 1..order {
                    row[j].subtract_product(&factor, &above[k][j]);
                }
                row[k] = factor;
            }
        }
        Some(Self { rows, permutation })
    }

    /// Solves for one right-hand side.
    pub fn solve(&self, rhs: &[T]) -> Result<Vec<T>, LinalgError> {
        let order = self.rows.len();
        if rhs.len() != order {
            return Err(LinalgError::WrongLength { found: rhs.len(), expected: order });
        }
        let mut x: Vec<T> = self.permutation.iter().map(|&p| rhs[p].clone()).collect();
        for i in 0..order {
            let (known, rest) = x.split_at_mut(i);
            for (l, y) in self.rows[i].iter().zip(known.iter()) {
                rest[0].subtract_product(l, y);
            }
        }
        for i in (0..order).rev() {
            let (rest, known) = x.split_at_mut(i + 1);
            for (u, y) in self.rows[i][i + 1..].iter().zip(known.iter()) {
                rest[i].subtract_product(u, y);
            }
            rest[i] = rest[i].over(&self.rows[i][i]);
        }
        Ok(x)
    }
}
