//! The residual of an approximate solution, at a precision above that of the solution.

use rug::Float;

use super::error::LinalgError;
use super::factor::Balanced;
use super::vectors::{float_at, shift};
use crate::num::Effort;

/// Returns `b - A x` for a balanced matrix at the given precision.
///
/// *Accuracy*: each component within about order * 2^-precision of the largest |a_ij x_j| and |b_i|.
/// *Cost*: order^2 multiply-adds of that precision.
pub(super) fn residual(
    a: Balanced,
    x: &[Float],
    b: &[Float],
    precision: u32,
    effort: &Effort,
) -> Result<Vec<Float>, LinalgError> {
    // The factors of the columns go to x, those of the rows to the sum: the matrix is read as it stands.
    let mut unscaled: Vec<Float> = x.to_vec();
    for (x, c) in unscaled.iter_mut().zip(&a.scale.columns) {
        shift(x, *c);
    }
    (0..a.order())
        .map(|i| {
            effort.check()?;
            let mut sum = Float::new(precision);
            for (j, x) in unscaled.iter().enumerate() {
                sum -= a.source.entry(i, j) * x;
            }
            shift(&mut sum, a.scale.rows[i]);
            sum += float_at(&b[i], precision.max(b[i].prec()));
            Ok(sum)
        })
        .collect()
}
