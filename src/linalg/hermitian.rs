//! Hermitian matrices of multi-precision numbers.

use std::sync::Arc;

use nalgebra::DMatrix;
use rug::{Complex, Float};

use super::error::LinalgError;
use super::vectors::exponent;

/// A Hermitian matrix, real symmetric when it has no imaginary part.
#[derive(Clone, Debug)]
pub struct HermitianMatrix {
    re: Arc<DMatrix<Float>>,
    im: Option<DMatrix<Float>>,
}

impl HermitianMatrix {
    /// Makes a Hermitian matrix from its real part and, where there is one, its imaginary part.
    ///
    /// *Errors*: the parts are not square of the same order, an entry is not finite, or two mirror entries are not
    /// conjugate bit by bit (entries rounded alike from conjugate numbers are).
    pub fn new(re: DMatrix<Float>, im: Option<DMatrix<Float>>) -> Result<Self, LinalgError> {
        let order = re.nrows();
        for part in std::iter::once(&re).chain(&im) {
            if part.nrows() != part.ncols() {
                return Err(LinalgError::NotSquare { rows: part.nrows(), columns: part.ncols() });
            }
            if part.nrows() != order {
                return Err(LinalgError::WrongLength { found: part.nrows(), expected: order });
            }
            if part.iter().any(|x| !x.is_finite()) {
                return Err(LinalgError::NotFinite);
            }
        }
        for column in 0..order {
            for row in column..order {
                let mirrored = re[(row, column)] == re[(column, row)]
                    && im.as_ref().is_none_or(|im| im[(row, column)] == *im[(column, row)].as_neg());
                if !mirrored {
                    return Err(LinalgError::NotHermitian { row, column });
                }
            }
        }
        let im = im.filter(|im| im.iter().any(|x| !x.is_zero()));
        Ok(Self { re: Arc::new(re), im })
    }

    /// Returns the number of rows.
    pub fn order(&self) -> usize {
        self.re.nrows()
    }

    /// Tells whether the matrix is real symmetric.
    pub fn is_real(&self) -> bool {
        self.im.is_none()
    }

    /// Returns the real part.
    pub fn re(&self) -> &DMatrix<Float> {
        &self.re
    }

    /// Returns the real part to be shared.
    pub(super) fn shared_re(&self) -> Arc<DMatrix<Float>> {
        Arc::clone(&self.re)
    }

    /// Returns the imaginary part, `None` if it is zero.
    pub fn im(&self) -> Option<&DMatrix<Float>> {
        self.im.as_ref()
    }

    /// Returns the largest precision among the entries, in bits.
    pub fn precision(&self) -> u32 {
        let parts = std::iter::once(self.re()).chain(&self.im);
        parts.flat_map(|part| part.iter()).map(Float::prec).max().unwrap_or(rug::float::prec_min())
    }

    /// Returns e with every real and imaginary part of an entry below 2^e, close to the largest; `None` for the zero
    /// matrix.
    pub fn exponent(&self) -> Option<i64> {
        exponent(std::iter::once(self.re()).chain(&self.im).flat_map(|part| part.iter()))
    }

    /// Returns `H x` at the given precision.
    ///
    /// *Accuracy*: each component within about order * 2^-precision of the sum of |H_ij x_j|. *Cost*: order^2 products.
    pub fn apply(&self, x: &[Complex], precision: u32) -> Vec<Complex> {
        let order = self.order();
        let real_vector = x.iter().all(|c| c.imag().is_zero());
        (0..order)
            .map(|row| {
                let (mut re, mut im) = (Float::new(precision), Float::new(precision));
                for (column, x) in x.iter().enumerate() {
                    // The mirror entry stands beside its neighbours in memory.
                    let h = &self.re[(column, row)];
                    if !h.is_zero() {
                        re += h * x.real();
                        if !real_vector {
                            im += h * x.imag();
                        }
                    }
                    if let Some(h) = self.im.as_ref().map(|im| &im[(column, row)])
                        && !h.is_zero()
                    {
                        re += h * x.imag();
                        im -= h * x.real();
                    }
                }
                Complex::with_val(precision, (re, im))
            })
            .collect()
    }
}
