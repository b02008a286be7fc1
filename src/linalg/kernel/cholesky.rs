//! The signed Cholesky factorisation A = G S G^T in fixed point, S a diagonal of signs, without pivots.

use rug::Float;

use super::entries::Entries;
use super::limbs::{Limbs, Overflow, Sum, difference, fraction_bits, negated, read, sign};
use super::substitution::{BlockVector, Reciprocal};
use super::team::{part_size, share_out};
use crate::linalg::error::LinalgError;
use crate::linalg::factor::{Factorisation, Failure};
use crate::num::Effort;

/// Columns finished at a time; their rows stay in the cache while all rows below pass.
const BLOCK: usize = 32;

/// Rows below a block that are worth a thread.
const ROWS_EACH_THREAD: usize = 40;

/// G by rows and by columns, and the signs.
pub(super) struct SignedCholesky<const L: usize> {
    rows: Vec<Limbs<L>>,
    columns: Vec<Limbs<L>>,
    pivots: Vec<Reciprocal<L>>,
    negative: Vec<bool>,
}

/// Returns where row i of a packed lower triangle begins.
const fn start_of(row: usize) -> usize {
    row * (row + 1) / 2
}

/// A row of a finished block as its products need it: with the signs S, and the pivot.
struct BlockRow<const L: usize> {
    signed: Vec<Limbs<L>>,
    pivot: Reciprocal<L>,
    negative: bool,
}

impl<const L: usize> SignedCholesky<L> {
    /// Factorises, left-looking, by blocks of columns.
    ///
    /// *Accuracy*: norm-wise backward error of about order units of the last place times the growth of G squared.
    /// *Errors*: [`Failure::Growth`] at a pivot that lets G outgrow its range. *Cost*: order^3/6 multiply-adds.
    pub fn new(entries: &Entries, threads: usize, effort: &Effort) -> Result<Self, Failure> {
        let order = entries.order();
        let mut rows = vec![[0; L]; start_of(order)];
        let (mut pivots, mut negative) = (Vec::with_capacity(order), Vec::with_capacity(order));
        for start in (0..order).step_by(BLOCK) {
            let end = (start + BLOCK).min(order);
            let (above, below) = rows.split_at_mut(start_of(end));
            let mut block: Vec<BlockRow<L>> = Vec::with_capacity(end - start);
            for i in start..end {
                effort.check()?;
                let row = &mut above[start_of(i)..start_of(i + 1)];
                let finished = finish_row(entries, i, start, row, &block, &negative)?;
                pivots.push(finished.pivot);
                negative.push(finished.negative);
                block.push(finished);
            }
            let share = part_size(order - end, threads, ROWS_EACH_THREAD);
            let mut parts = Vec::new();
            let mut rest = below;
            for first in (end..order).step_by(share) {
                let last = (first + share).min(order);
                let (part, others) = rest.split_at_mut(start_of(last) - start_of(first));
                parts.push((first..last, part));
                rest = others;
            }
            share_out(parts, |(range, part)| pass_rows(entries, range, start, part, &block, effort))?;
        }
        let mut columns = Vec::with_capacity(rows.len());
        for k in 0..order {
            columns.extend((k + 1..order).map(|i| rows[start_of(i) + k]));
        }
        Ok(Self { rows, columns, pivots, negative })
    }
}

/// Finishes row i of the block that begins at `start`, whose earlier columns are done.
fn finish_row<const L: usize>(
    entries: &Entries,
    i: usize,
    start: usize,
    row: &mut [Limbs<L>],
    block: &[BlockRow<L>],
    negative: &[bool],
) -> Result<BlockRow<L>, Overflow> {
    pass_row(entries, i, start, row, block)?;
    let signed: Vec<Limbs<L>> =
        row[..i].iter().zip(negative).map(|(g, negative)| if *negative { negated(g) } else { *g }).collect();
    let pivot = difference(&entries.top(i, i), &Sum::of_products(&row[..i], &signed).rounded()?);
    let negative = sign(&pivot) < 0;
    let root: Float = read(&pivot, 0, fraction_bits(L) + 64).abs().sqrt();
    let pivot = Reciprocal::of(&root).ok_or(Overflow)?;
    Ok(BlockRow { signed, pivot, negative })
}

/// Finds the entries of row i in the columns of a block.
#[inline]
fn pass_row<const L: usize>(
    entries: &Entries,
    i: usize,
    start: usize,
    row: &mut [Limbs<L>],
    block: &[BlockRow<L>],
) -> Result<(), Overflow> {
    for (j, BlockRow { signed, pivot, negative }) in (start..).zip(block) {
        let rest = difference(&entries.top(i, j), &Sum::of_products(&row[..j], &signed[..j]).rounded()?);
        let entry = pivot.times(&rest)?;
        row[j] = if *negative { negated(&entry) } else { entry };
    }
    Ok(())
}

/// Finds the entries of many rows in the columns of a block.
fn pass_rows<const L: usize>(
    entries: &Entries,
    range: std::ops::Range<usize>,
    start: usize,
    rows: &mut [Limbs<L>],
    block: &[BlockRow<L>],
    effort: &Effort,
) -> Result<(), Failure> {
    let offset = start_of(range.start);
    for i in range {
        effort.check()?;
        pass_row(entries, i, start, &mut rows[start_of(i) - offset..start_of(i + 1) - offset], block)?;
    }
    Ok(())
}

impl<const L: usize> Factorisation for SignedCholesky<L> {
    fn solve(&self, rhs: &[Float], effort: &Effort) -> Result<Vec<Float>, LinalgError> {
        let order = self.pivots.len();
        let rhs = BlockVector::<L>::new(rhs.iter());
        let row = |i: usize| &self.rows[start_of(i)..start_of(i) + i];
        let mut middle = rhs.solve_down(row, Some(&self.pivots), effort)?;
        for (component, negative) in middle.components.iter_mut().zip(&self.negative) {
            if *negative {
                *component = negated(component);
            }
        }
        // Column k, below the diagonal, begins after the columns before it.
        let column = |k: usize| {
            let start = start_of(order - 1) - start_of(order - 1 - k);
            &self.columns[start..start + order - 1 - k]
        };
        Ok(middle.solve_up(column, &self.pivots, effort)?.to_floats())
    }
}
