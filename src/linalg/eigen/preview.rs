//! A look at the spectrum in machine numbers.

use std::sync::mpsc::{RecvTimeoutError, channel};
use std::thread;
use std::time::Duration;

use nalgebra::DMatrix;
use rug::Float;

use crate::linalg::hermitian::HermitianMatrix;
use crate::num::{Effort, Interrupted};

/// Eigenvalues this near to each other, relative to the largest, are not told apart by machine numbers.
const RESOLUTION: f64 = 1.0 / (1u64 << 40) as f64;

/// How often a running routine is asked whether it is still wanted.
const PATIENCE: Duration = Duration::from_millis(20);

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
/// operations of nalgebra's routine.
pub fn spectrum_preview(h: &HermitianMatrix, effort: &Effort) -> Result<Option<Preview>, Interrupted> {
    let order = h.order();
    let Ok(exponent) = i32::try_from(h.exponent().unwrap_or(0)) else { return Ok(None) };
    let scaled = |x: &Float| Float::with_val(53, x >> exponent).to_f64();
    let matrix = match h.im() {
        None => h.re().map(|x| scaled(&x)),
        // [[X, -Y], [Y, X]]
        Some(im) => DMatrix::from_fn(2 * order, 2 * order, |i, j| {
            let entry = (i % order, j % order);
            match (i < order, j < order) {
                (true, true) | (false, false) => scaled(&h.re()[entry]),
                (false, true) => scaled(&im[entry]),
                (true, false) => -scaled(&im[entry]),
            }
        }),
    };
    let Some(mut values) = eigenvalues(matrix, effort)? else { return Ok(None) };
    if !h.is_real() {
        // The real matrix of twice the order has every eigenvalue twice.
        values = values.chunks(2).map(|pair| pair.iter().sum::<f64>() / pair.len() as f64).collect();
    }
    Ok(Some(Preview { values, exponent }))
}

/// The eigenvalues in rising order; `None` if the routine did not settle.
///
/// The library's routine cannot be stopped from outside, so it runs on a thread of its own; when it is no longer wanted it is left to end by itself.
fn eigenvalues(matrix: DMatrix<f64>, effort: &Effort) -> Result<Option<Vec<f64>>, Interrupted> {
    effort.check()?;
    if matrix.is_empty() {
        return Ok(Some(Vec::new()));
    }
    if matrix.iter().any(|x| !x.is_finite()) {
        return Ok(None);
    }
    let (send, receive) = channel();
    let routine = move || {
        let values: Vec<f64> = matrix.symmetric_eigenvalues().iter().copied().collect();
        // Nobody may be waiting any more.
        let _ = send.send(values);
    };
    if thread::Builder::new().spawn(routine).is_err() {
        return Ok(None);
    }
    loop {
        effort.check()?;
        match receive.recv_timeout(PATIENCE) {
            Ok(mut values) => {
                values.sort_by(f64::total_cmp);
                return Ok(values.iter().all(|x| x.is_finite()).then_some(values));
            }
            Err(RecvTimeoutError::Timeout) => {}
            Err(RecvTimeoutError::Disconnected) => return Ok(None),
        }
    }
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
