//! Exact linear systems inside one connected component of H.

use crate::num::{Effort, Interrupted, Surd};

/// Largest component with rational entries that is solved exactly; beyond, fractions grow too long.
pub const LARGEST_RATIONAL: usize = 40;

/// Largest component with square roots in its entries that is solved exactly.
pub const LARGEST_WITH_ROOTS: usize = 12;

/// Most terms a number may reach during elimination with square roots.
const TERM_LIMIT: usize = 32;

/// The reduced form of a system: a particular solution, if there is one, and a basis of the solutions of the homogeneous one.
pub struct Solutions {
    pub particular: Option<Vec<Surd>>,
    pub null_space: Vec<Vec<Surd>>,
}

/// Solves A x = b by Gauss-Jordan elimination; `None` when a number outgrows the limits.
///
/// Shapes: `rows` are those of A with b as a last column. Cost: about n^3 exact operations.
pub fn solve(mut rows: Vec<Vec<Surd>>, effort: &Effort) -> Result<Option<Solutions>, Interrupted> {
    let n = rows.len();
    let mut pivots: Vec<usize> = Vec::new();
    for column in 0..n {
        effort.check()?;
        let next = pivots.len();
        // The shortest nonzero entry keeps the fractions short.
        let best = (next..n).filter(|&row| !rows[row][column].is_zero()).min_by_key(|&row| {
            let entry = &rows[row][column];
            (entry.term_count(), entry.bits())
        });
        let Some(best) = best else { continue };
        rows.swap(next, best);
        let Some(inverse) = rows[next][column].inverse() else { return Ok(None) };
        for entry in &mut rows[next][column..] {
            if !entry.is_zero() {
                *entry = &*entry * &inverse;
            }
        }
        let pivot_row = rows[next].clone();
        for (row, entries) in rows.iter_mut().enumerate() {
            if row == next || entries[column].is_zero() {
                continue;
            }
            let factor = entries[column].clone();
            for (entry, above) in entries[column..].iter_mut().zip(&pivot_row[column..]) {
                if !above.is_zero() {
                    *entry -= &(&factor * above);
                    if entry.term_count() > TERM_LIMIT {
                        return Ok(None);
                    }
                }
            }
        }
        pivots.push(column);
    }
    let consistent = rows[pivots.len()..].iter().all(|row| row[n].is_zero());
    let particular = consistent.then(|| {
        let mut x = vec![Surd::zero(); n];
        for (row, column) in pivots.iter().enumerate() {
            x[*column] = rows[row][n].clone();
        }
        x
    });
    let null_space = (0..n)
        .filter(|column| !pivots.contains(column))
        .map(|free| {
            let mut x = vec![Surd::zero(); n];
            x[free] = Surd::one();
            for (row, column) in pivots.iter().enumerate() {
                x[*column] = -&rows[row][free];
            }
            x
        })
        .collect();
    Ok(Some(Solutions { particular, null_space }))
}
