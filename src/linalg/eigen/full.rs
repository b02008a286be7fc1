//! All eigenvalues and eigenvectors of a Hermitian matrix.

use rug::{Complex, Float};

use super::tridiagonalise::Reduced;
use crate::linalg::error::LinalgError;
use crate::linalg::hermitian::HermitianMatrix;
use crate::linalg::vectors::{add_multiple, divide, inner, norm};
use crate::num::Effort;

/// Eigenvalues in rising order with orthonormal eigenvectors.
#[derive(Clone, Debug)]
pub struct Eigenpairs {
    pub values: Vec<Float>,
    pub vectors: Vec<Vec<Complex>>,
}

/// Finds all eigenvalues and eigenvectors, to `bits` bits of the norm of H.
///
/// *Accuracy*: eigenvalues within about 2^-bits of the largest; an eigenvector within 2^-bits of the largest
/// eigenvalue over the distance to the next one; the vectors of a degenerate level are orthonormal and span it.
/// *Errors*: the iteration did not settle. *Cost*: about 5 order^3 multiply-adds if real, 40 order^3 if complex, by a
/// real matrix of twice the order.
pub fn all_eigenpairs(h: &HermitianMatrix, bits: u32, effort: &Effort) -> Result<Eigenpairs, LinalgError> {
    let order = h.order();
    let precision = bits + 2 * usize::BITS.saturating_sub(order.leading_zeros()) + 16;
    let at = |x: &Float| Float::with_val(precision, x);
    let lower: Vec<Vec<Float>> = match h.im() {
        None => (0..order).map(|i| (0..=i).map(|j| at(&h.re()[(i, j)])).collect()).collect(),
        Some(im) => (0..2 * order)
            .map(|i| {
                let entry = |j: usize| match (i < order, j < order) {
                    (true, _) => at(&h.re()[(i, j)]),
                    (false, true) => at(&im[(i - order, j)]),
                    (false, false) => at(&h.re()[(i - order, j - order)]),
                };
                (0..=i).map(entry).collect()
            })
            .collect(),
    };
    let mut reduced = Reduced::new(lower, precision, effort)?;
    reduced.diagonalise(effort)?;
    let mut pairs: Vec<(Float, Vec<Float>)> = reduced.diagonal.into_iter().zip(reduced.vectors).collect();
    pairs.sort_by(|a, b| a.0.total_cmp(&b.0));
    if h.is_real() {
        let (values, vectors) = pairs.into_iter().unzip::<_, _, Vec<_>, Vec<_>>();
        let complex = |v: Vec<Float>| v.into_iter().map(|x| Complex::with_val(precision, x)).collect();
        return Ok(Eigenpairs { values, vectors: vectors.into_iter().map(complex).collect() });
    }
    from_doubled(pairs, order, precision)
}

/// Picks an orthonormal half of the complex vectors u + i v that the doubled real matrix has.
///
/// Each level of H appears with twice its multiplicity, and its real vectors (u, v) give complex ones that span it
/// twice over. Taking each vector that is not yet spanned gives a basis; nearby levels do no harm since the vectors of
/// different levels are orthogonal already.
fn from_doubled(pairs: Vec<(Float, Vec<Float>)>, order: usize, precision: u32) -> Result<Eigenpairs, LinalgError> {
    let mut values: Vec<Float> = Vec::with_capacity(order);
    let mut vectors: Vec<Vec<Complex>> = Vec::with_capacity(order);
    for (value, vector) in pairs {
        let (u, v) = vector.split_at(order);
        let mut w: Vec<Complex> = u.iter().zip(v).map(|(u, v)| Complex::with_val(precision, (u, v))).collect();
        for _ in 0..2 {
            for known in &vectors {
                let component = -inner(known, &w, precision);
                add_multiple(&mut w, &component, known);
            }
        }
        let length = norm(&w, precision);
        // Of 2m vectors spanning m dimensions twice over the parts not spanned yet have squares that sum to what is
        // left.
        if length > 0.25 / (order as f64).sqrt() && vectors.len() < order {
            divide(&mut w, &length);
            values.push(value);
            vectors.push(w);
        }
    }
    if vectors.len() < order {
        return Err(LinalgError::EigenvaluesUnsettled { wanted: precision, holds: 0 });
    }
    Ok(Eigenpairs { values, vectors })
}
