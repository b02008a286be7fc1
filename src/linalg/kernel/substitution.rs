//! Triangular systems in fixed point, with an exponent common to the whole vector.

use rug::Float;

use super::limbs::{LIMIT, Limbs, Overflow, Sum, difference, fraction_bits, product, read, within, write};
use crate::linalg::vectors::{exponent, shift};
use crate::num::{Effort, Interrupted};

/// Bits by which a vector is moved down at a time when a component outgrows its range.
const STEP: i64 = 20;

/// Components stay below 2^ROOM, some bits less than what sums can hold.
const ROOM: u32 = 6;

/// The reciprocal of a pivot: `mantissa 2^exponent`.
#[derive(Clone, Copy, Debug)]
pub(super) struct Reciprocal<const L: usize> {
    mantissa: Limbs<L>,
    exponent: i64,
}

impl<const L: usize> Reciprocal<L> {
    /// Takes the reciprocal of a pivot; `None` for zero.
    pub fn of(pivot: &Float) -> Option<Self> {
        let mut reciprocal = Float::with_val(fraction_bits(L) + 64, pivot.recip_ref());
        let exponent = i64::from(reciprocal.get_exp()?);
        shift(&mut reciprocal, -exponent);
        let mut mantissa = [0; L];
        write(&mut mantissa, &reciprocal, 0, &mut Vec::new()).ok()?;
        Some(Self { mantissa, exponent })
    }

    /// Returns a number divided by the pivot.
    #[inline]
    pub fn times(&self, value: &Limbs<L>) -> Result<Limbs<L>, Overflow> {
        product(value, &self.mantissa, self.exponent)
    }

    /// Returns a number divided by the pivot and by `2^down`, with the least multiple of STEP that leaves it below
    /// 2^ROOM.
    fn times_within(&self, value: &Limbs<L>) -> (Limbs<L>, i64) {
        let mut down = 0;
        loop {
            match product(value, &self.mantissa, self.exponent - down) {
                Ok(quotient) if within(&quotient, ROOM) => return (quotient, down),
                _ => down += STEP,
            }
        }
    }
}

/// A vector of fixed-point numbers times `2^exponent`.
#[derive(Clone, Debug)]
pub(super) struct BlockVector<const L: usize> {
    pub components: Vec<Limbs<L>>,
    pub exponent: i64,
}

impl<const L: usize> BlockVector<L> {
    /// Reads floats, with the largest component just below 1.
    pub fn new<'a>(values: impl Iterator<Item = &'a Float> + Clone) -> Self {
        let exponent = exponent(values.clone()).unwrap_or(0);
        let mut scratch = Vec::new();
        let components = values
            .map(|value| {
                let mut limbs = [0; L];
                // Below 1 after scaling, so always in range.
                let _in_range = write(&mut limbs, value, -exponent, &mut scratch);
                limbs
            })
            .collect();
        Self { components, exponent }
    }

    pub fn to_floats(&self) -> Vec<Float> {
        self.components.iter().map(|c| read(c, self.exponent, fraction_bits(L))).collect()
    }

    /// Solves a triangular system whose row i has the coefficients `row(i)` before the diagonal, from the first row
    /// down.
    ///
    /// *Accuracy*: norm-wise backward stable: a unit in the last place of the largest component.
    pub fn solve_down<'a>(
        &self,
        row: impl Fn(usize) -> &'a [Limbs<L>],
        pivots: Option<&[Reciprocal<L>]>,
        effort: &Effort,
    ) -> Result<Self, Interrupted> {
        let mut out = Self { components: Vec::with_capacity(self.components.len()), exponent: self.exponent };
        for i in 0..self.components.len() {
            effort.check()?;
            let rest = loop {
                match self.rest(i, out.exponent, row(i), &out.components) {
                    Ok(rest) => break rest,
                    Err(Overflow) => out.move_down(0, STEP),
                }
            };
            let (next, down) = pivots.map_or((rest, 0), |pivots| pivots[i].times_within(&rest));
            out.move_down(0, down);
            out.components.push(next);
        }
        Ok(out)
    }

    /// Solves a triangular system whose row i has the coefficients `row(i)` after the diagonal, from the last row up.
    pub fn solve_up<'a>(
        &self,
        row: impl Fn(usize) -> &'a [Limbs<L>],
        pivots: &[Reciprocal<L>],
        effort: &Effort,
    ) -> Result<Self, Interrupted> {
        let mut out = Self { components: vec![[0; L]; self.components.len()], exponent: self.exponent };
        for i in (0..self.components.len()).rev() {
            effort.check()?;
            let rest = loop {
                match self.rest(i, out.exponent, row(i), &out.components[i + 1..]) {
                    Ok(rest) => break rest,
                    Err(Overflow) => out.move_down(i + 1, STEP),
                }
            };
            let (next, down) = pivots[i].times_within(&rest);
            out.move_down(i + 1, down);
            out.components[i] = next;
        }
        Ok(out)
    }

    /// Returns what row i leaves of its right-hand side, in units of `2^exponent`.
    #[inline]
    fn rest(&self, i: usize, exponent: i64, row: &[Limbs<L>], known: &[Limbs<L>]) -> Result<Limbs<L>, Overflow> {
        let rhs = if exponent == self.exponent {
            self.components[i]
        } else {
            product(&self.components[i], &one(), self.exponent - exponent)?
        };
        let rest = difference(&rhs, &Sum::of_products(row, known).rounded()?);
        if within(&rest, LIMIT) { Ok(rest) } else { Err(Overflow) }
    }

    /// Moves the components from a place on down by so many bits.
    fn move_down(&mut self, from: usize, bits: i64) {
        if bits == 0 {
            return;
        }
        for component in &mut self.components[from..] {
            // Smaller than before, so in range.
            *component = product(component, &one(), -bits).unwrap_or(*component);
        }
        self.exponent += bits;
    }
}

/// Returns the number 1.
fn one<const L: usize>() -> Limbs<L> {
    let mut one = [0; L];
    one[L - 1] = 1 << (super::limbs::RADIX - super::limbs::HEAD);
    one
}
