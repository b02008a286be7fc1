//! A balanced matrix as fixed-point numbers: read once, used by the factorisation and by every residual.

use rug::{Float, Integer};

use super::limbs::{Limbs, Overflow, Sum, accurate_bits, fraction_bits, write};
use super::with_limbs;
use crate::linalg::factor::Balanced;
use crate::linalg::vectors::{exponent, shift};
use crate::num::{Effort, Interrupted};

/// The entries by rows, each of the same count of limbs.
pub(in crate::linalg) struct Entries {
    order: usize,
    limbs: usize,
    data: Vec<i64>,
}

impl Entries {
    /// Reads a balanced matrix; of a symmetric one the upper triangle is read. `None` if an entry is out of range.
    ///
    /// *Accuracy*: entries are cut to a unit of the last place. *Cost*: order^2 limbs of memory, times their count.
    pub fn new(a: Balanced, symmetric: bool, limbs: usize, effort: &Effort) -> Result<Option<Self>, Interrupted> {
        let order = a.order();
        let mut data = vec![0; order * order * limbs];
        let mut scratch = Vec::new();
        for i in 0..order {
            effort.check()?;
            for j in 0..if symmetric { i + 1 } else { order } {
                let (value, exponent) = if symmetric { a.entry(j, i) } else { a.entry(i, j) };
                let place = (i * order + j) * limbs;
                if write(&mut data[place..place + limbs], value, exponent, &mut scratch) == Err(Overflow) {
                    return Ok(None);
                }
            }
        }
        if symmetric {
            for i in 0..order {
                for j in 0..i {
                    let (from, to) = ((i * order + j) * limbs, (j * order + i) * limbs);
                    data.copy_within(from..from + limbs, to);
                }
            }
        }
        Ok(Some(Self { order, limbs, data }))
    }

    pub fn order(&self) -> usize {
        self.order
    }

    pub fn limbs(&self) -> usize {
        self.limbs
    }

    /// Returns the bits of a residual that are right, relative to the largest component of the solution.
    pub fn accurate_bits(&self) -> u32 {
        accurate_bits(self.limbs, self.order)
    }

    /// Returns the upper limbs of an entry, at most as many as there are.
    #[inline]
    pub(super) fn top<const L: usize>(&self, row: usize, column: usize) -> Limbs<L> {
        let end = (row * self.order + column + 1) * self.limbs;
        let mut out = [0; L];
        out.copy_from_slice(&self.data[end - L..end]);
        out
    }

    /// Returns `b - A x`.
    ///
    /// *Accuracy*: each component within 2^-[`Entries::accurate_bits`] of the largest |x_j|, besides the precision of
    /// b.
    pub fn residual(&self, x: &[Float], b: &[Float], effort: &Effort) -> Result<Vec<Float>, Interrupted> {
        with_limbs!(self.limbs, L => self.residual_of::<L>(x, b, effort), else Ok(b.to_vec()))
    }

    fn residual_of<const L: usize>(
        &self,
        x: &[Float],
        b: &[Float],
        effort: &Effort,
    ) -> Result<Vec<Float>, Interrupted> {
        let Some(size) = exponent(x) else { return Ok(b.to_vec()) };
        let mut scratch = Vec::new();
        let mut fixed = vec![[0; L]; self.order];
        for (fixed, x) in fixed.iter_mut().zip(x) {
            // Below 1 after scaling, so always in range.
            let _in_range = write(fixed, x, -size, &mut scratch);
        }
        let (entries, _) = self.data.as_chunks::<L>();
        let mut sum = Integer::new();
        let precision = fraction_bits(L) + 64;
        entries
            .chunks(self.order)
            .zip(b)
            .map(|(row, b)| {
                effort.check()?;
                let unit = Sum::of_products(row, &fixed).read(&mut sum);
                let mut image = Float::with_val(precision, &sum);
                shift(&mut image, unit + size);
                Ok(Float::with_val(precision.max(b.prec()), b - &image))
            })
            .collect()
    }
}
