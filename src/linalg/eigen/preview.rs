//! A look at the spectrum in machine numbers.

use rug::Float;

use super::machine::eigenvalues;
use crate::linalg::hermitian::HermitianMatrix;
use crate::num::{Effort, Interrupted};

/// Eigenvalues this near to each other, relative to the largest, are not told apart by machine numbers.
const RESOLUTION: f64 = 1.0 / (1u64 << 40) as f64;

/// Approximate eigenvalues in rising order, as multiples of a power of two.
#[derive(Clone, Debug)]
pub struct Preview {
    /// The eigenvalues divided by 2^exponent, in rising order.
    pub values: Vec<f64>,
    /// The binary exponent common to all.
    pub exponent: i32,
}

/// Finds the spectrum approximately in machine numbers, each eigenvalue as often as its multiplicity; `None` if the
/// machine numbers did not settle.
///
/// *Range*: any exponents: the matrix is scaled by a power of two. *Accuracy*: about order * 2^-52 of the largest eigenvalue:
/// small eigenvalues of a matrix with a wide spread are lost. *Errors*: stopped. *Cost*: about 4/3 order^3 (11 order^3 if complex) machine
/// operations.
pub fn spectrum_preview(h: &HermitianMatrix, effort: &Effort) -> Result<Option<Preview>, Interrupted> {
    let order = h.order();
    let Ok(exponent) = i32::try_from(h.exponent().unwrap_or(0)) else { return Ok(None) };
    let scaled = |x: &Float| Float::with_val(53, x >> exponent).to_f64();
    let lower = match h.im() {
        None => (0..order).map(|i| (0..=i).map(|j| scaled(&h.re()[(i, j)])).collect()).collect(),
        // [[X, -Y], [Y, X]]
        Some(im) => (0..2 * order)
            .map(|i| {
                let entry = |j: usize| match (i < order, j < order) {
                    (true, _) => scaled(&h.re()[(i, j)]),
                    (false, true) => scaled(&im[(i - order, j)]),
                    (false, false) => scaled(&h.re()[(i - order, j - order)]),
                };
                (0..=i).map(entry).collect()
            })
            .collect(),
    };
    let Some(mut values) = eigenvalues(lower, effort)? else { return Ok(None) };
    if !h.is_real() {
        // The real matrix of twice the order has every eigenvalue twice.
        values = values.chunks(2).map(|pair| pair.iter().sum::<f64>() / pair.len() as f64).collect();
    }
    Ok(Some(Preview { values, exponent }))
}

impl Preview {
    /// Returns an eigenvalue with its exponent, at 64 bits.
    pub fn value(&self, index: usize) -> Option<Float> {
        self.values.get(index).map(|v| Float::with_val(64, *v) << self.exponent)
    }

    /// Returns the smallest range of indices that holds `first..=last` and no eigenvalue outside so close to one inside
    /// that machine numbers cannot tell them apart.
    pub fn cluster(&self, first: usize, last: usize) -> std::ops::Range<usize> {
        let largest = self.values.iter().fold(0.0_f64, |m, v| m.max(v.abs()));
        let near = |i: usize| self.values[i + 1] - self.values[i] <= RESOLUTION * largest;
        let (mut start, mut end) = (first, last + 1);
        while start > 0 && near(start - 1) {
            start -= 1;
        }
        while end < self.values.len() && near(end - 1) {
            end += 1;
        }
        start..end
    }
}
