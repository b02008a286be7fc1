//! Elimination with partial pivoting, P A = L U, in fixed point.

use rug::Float;

use super::entries::Entries;
use super::limbs::{Limbs, Overflow, Sum, compare_sizes, difference, fraction_bits, read, sign};
use super::substitution::{BlockVector, Reciprocal};
use super::team::{part_size, share_out};
use crate::linalg::error::LinalgError;
use crate::linalg::factor::{Factorisation, Failure};
use crate::num::Effort;

/// Columns finished at a time.
const BLOCK: usize = 24;

/// Rows or columns that are worth a thread.
const LINES_EACH_THREAD: usize = 8;

/// L without its unit diagonal and U without its diagonal, both by rows, with the reciprocals of the pivots.
pub(super) struct PivotedLu<const L: usize> {
    lower: Vec<Vec<Limbs<L>>>,
    upper: Vec<Vec<Limbs<L>>>,
    pivots: Vec<Reciprocal<L>>,
    permutation: Vec<usize>,
}

/// A row not finished yet: where it stood, its multipliers so far, and what is left of it in the columns of the block.
struct OpenRow<const L: usize> {
    origin: usize,
    multipliers: Vec<Limbs<L>>,
    rest: Vec<Limbs<L>>,
}

impl<const L: usize> PivotedLu<L> {
    /// Factorises, left-looking, by blocks of columns.
    ///
    /// *Accuracy*: norm-wise backward error of about order units of the last place times the growth of U. *Errors*:
    /// [`Failure::NoPivot`] for a column of zeros, [`Failure::Growth`] if U outgrows its range. *Cost*: order^3/3
    /// multiply-adds.
    pub fn new(entries: &Entries, threads: usize, effort: &Effort) -> Result<Self, Failure> {
        let order = entries.order();
        let mut open: Vec<OpenRow<L>> = (0..order)
            .map(|origin| OpenRow { origin, multipliers: Vec::with_capacity(order), rest: Vec::new() })
            .collect();
        // U by columns, each down to its pivot.
        let mut columns: Vec<Vec<Limbs<L>>> = (0..order).map(|j| Vec::with_capacity(j + 1)).collect();
        let mut pivots = Vec::with_capacity(order);
        for start in (0..order).step_by(BLOCK) {
            let end = (start + BLOCK).min(order);
            let (done, rest) = open.split_at_mut(start);
            let block = &mut columns[start..end];
            shared(block, threads, |offset, columns| {
                for (j, column) in (start + offset..).zip(columns) {
                    effort.check()?;
                    for (k, row) in done.iter().enumerate() {
                        let known = Sum::of_products(&row.multipliers[..k], column).rounded()?;
                        column.push(difference(&entries.top(row.origin, j), &known));
                    }
                }
                Ok(())
            })?;
            let block = &columns[start..end];
            shared(rest, threads, |_, rows| {
                for row in rows {
                    effort.check()?;
                    row.rest.clear();
                    for (j, column) in (start..).zip(block) {
                        let known = Sum::of_products(&row.multipliers, column).rounded()?;
                        row.rest.push(difference(&entries.top(row.origin, j), &known));
                    }
                }
                Ok(())
            })?;
            for (place, column) in columns[start..end].iter_mut().enumerate() {
                effort.check()?;
                pivots.push(finish_column(&mut open[start..], column, place, start)?);
            }
        }
        let lower = open.iter_mut().map(|row| std::mem::take(&mut row.multipliers)).collect();
        let upper = (0..order).map(|i| columns[i + 1..].iter().map(|column| column[i]).collect()).collect();
        Ok(Self { lower, upper, pivots, permutation: open.iter().map(|row| row.origin).collect() })
    }
}

/// Finishes column number `place` of a block that begins at row `start`: eliminates within the block, then exchanges
/// rows for the largest pivot and stores the multipliers.
fn finish_column<const L: usize>(
    rows: &mut [OpenRow<L>],
    column: &mut Vec<Limbs<L>>,
    place: usize,
    start: usize,
) -> Result<Reciprocal<L>, Failure> {
    for (i, row) in rows.iter_mut().enumerate() {
        let count = i.min(place);
        let known = Sum::of_products(&row.multipliers[start..start + count], &column[start..]).rounded()?;
        row.rest[place] = difference(&row.rest[place], &known);
        if i < place {
            column.push(row.rest[place]);
        }
    }
    let largest = (place..rows.len())
        .reduce(|best, i| match compare_sizes(&rows[i].rest[place], &rows[best].rest[place]) {
            std::cmp::Ordering::Greater => i,
            _ => best,
        })
        .filter(|&i| sign(&rows[i].rest[place]) != 0)
        .ok_or(Failure::NoPivot)?;
    rows.swap(place, largest);
    let pivot = rows[place].rest[place];
    column.push(pivot);
    let reciprocal = Reciprocal::of(&read(&pivot, 0, fraction_bits(L))).ok_or(Failure::NoPivot)?;
    for row in &mut rows[place + 1..] {
        let multiplier = reciprocal.times(&row.rest[place])?;
        row.multipliers.push(multiplier);
    }
    Ok(reciprocal)
}

/// Works on parts of a list in several threads; the work is told where its part begins.
fn shared<T: Send>(
    items: &mut [T],
    threads: usize,
    work: impl Fn(usize, &mut [T]) -> Result<(), Failure> + Sync,
) -> Result<(), Failure> {
    let share = part_size(items.len(), threads, LINES_EACH_THREAD);
    let parts = items.chunks_mut(share).enumerate().map(|(k, part)| (k * share, part)).collect();
    share_out(parts, |(first, part)| work(first, part))
}

impl<const L: usize> Factorisation for PivotedLu<L> {
    fn solve(&self, rhs: &[Float], effort: &Effort) -> Result<Vec<Float>, LinalgError> {
        let rhs = BlockVector::<L>::new(self.permutation.iter().map(|&origin| &rhs[origin]));
        let middle = rhs.solve_down(|i| &self.lower[i][..i], None, effort)?;
        Ok(middle.solve_up(|i| &self.upper[i], &self.pivots, effort)?.to_floats())
    }
}

impl From<Overflow> for Failure {
    fn from(_: Overflow) -> Self {
        Self::Growth
    }
}
