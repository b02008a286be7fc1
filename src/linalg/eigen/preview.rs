//! A look at the spectrum in machine numbers.

use nalgebra::{DMatrix, SymmetricEigen};
use rug::Float;

use crate::linalg::hermitian::HermitianMatrix;

/// Eigenvalues this near to each other, relative to the largest, are not told apart by machine numbers.
const RESOLUTION: f64 = 1.0 / (1u64 << 40) as f64;

/// Sweeps of the machine-number eigenvalue routine; it needs a few for each eigenvalue.
const SWEEPS_EACH: usize = 60;

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
/// *Range*: any exponents: the matrix is scaled by a power of two. *Accuracy*: about order * 2^-52 of the largest
/// eigenvalue: small eigenvalues of a matrix with a wide spread are lost. *Cost*: about order^3 (8 order^3 if complex)
/// machine operations.
pub fn spectrum_preview(h: &HermitianMatrix) -> Option<Preview> {
    let order = h.order();
    let exponent = i32::try_from(h.exponent().unwrap_or(0)).ok()?;
    let scaled = |x: &Float| Float::with_val(53, x >> exponent).to_f64();
    let matrix = match h.im() {
        None => h.re().map(|x| scaled(&x)),
        Some(im) => DMatrix::from_fn(2 * order, 2 * order, |i, j| {
            let entry = (i % order, j % order);
            match (i < order, j < order) {
                (true, true) | (false, false) => scaled(&h.re()[entry]),
                (false, true) => scaled(&im[entry]),
                (true, false) => -scaled(&im[entry]),
            }
        }),
    };
    let sweeps = SWEEPS_EACH * matrix.nrows().max(1);
    let mut values: Vec<f64> = if matrix.is_empty() {
        Vec::new()
    } else {
        SymmetricEigen::try_new(matrix, f64::EPSILON, sweeps)?.eigenvalues.iter().copied().collect()
    };
    if values.iter().any(|x| !x.is_finite()) {
        return None;
    }
    values.sort_by(f64::total_cmp);
    if !h.is_real() {
        // The real matrix of twice the order has every eigenvalue twice.
        values = values.chunks(2).map(|pair| pair.iter().sum::<f64>() / pair.len() as f64).collect();
    }
    Some(Preview { values, exponent })
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
