//! Exact linear systems inside one connected component of H.
//!
//! Without square roots the elimination is free of fractions, over the integers or the Gaussian integers; with square roots it is that of the
//! textbook over sums of roots.

use super::fraction_free::{GaussianInteger, Reduced, reduce};
use crate::num::{Effort, Interrupted, Surd};
use rug::{Integer, Rational};

/// Largest component without square roots in its entries that is solved exactly; beyond, the numbers grow too long.
pub const LARGEST_RATIONAL: usize = 60;

/// Largest component with square roots in its entries that is solved exactly.
pub const LARGEST_WITH_ROOTS: usize = 12;

/// Most terms a number may reach during elimination with square roots.
const TERM_LIMIT: usize = 32;

/// The solutions of a linear system: one of them, if there is one, and a basis of those of the homogeneous system.
#[derive(Clone, Debug, PartialEq)]
pub struct Solutions {
    pub particular: Option<Vec<Surd>>,
    pub null_space: Vec<Vec<Surd>>,
}

/// Solves A x = b by Gauss-Jordan elimination; `None` when the system is too large for that or a number outgrows the limits.
///
/// *Shapes*: `rows` are those of A with b as a last column. *Cost*: about n^3 exact operations.
/// *Errors*: stopped.
pub fn solve(rows: Vec<Vec<Surd>>, effort: &Effort) -> Result<Option<Solutions>, Interrupted> {
    let entries = || rows.iter().flatten();
    if entries().all(|entry| entry.as_rational().is_some()) {
        if rows.len() > LARGEST_RATIONAL {
            return Ok(None);
        }
        let integers = rows.iter().map(|row| whole(row).into_iter().map(|(re, _)| re).collect()).collect();
        return Ok(reduce(integers, effort)?.map(|reduced| {
            read_off(&reduced, |above: &Integer, below: &Integer| {
                Surd::from(Rational::from((above.clone(), below.clone())))
            })
        }));
    }
    if entries().all(|entry| !entry.has_pi() && entry.terms().all(|(unit, _)| unit.radicand == 1)) {
        if rows.len() > LARGEST_RATIONAL {
            return Ok(None);
        }
        let gaussian = |row: &Vec<Surd>| whole(row).into_iter().map(|(re, im)| GaussianInteger { re, im }).collect();
        let integers = rows.iter().map(gaussian).collect();
        return Ok(reduce(integers, effort)?.map(|reduced| read_off(&reduced, GaussianInteger::quotient)));
    }
    if rows.len() > LARGEST_WITH_ROOTS {
        return Ok(None);
    }
    solve_with_roots(rows, effort)
}

/// Real and imaginary parts of a row of Gaussian rationals over its common denominator.
fn whole(row: &[Surd]) -> Vec<(Integer, Integer)> {
    let parts: Vec<(Rational, Rational)> = row
        .iter()
        .map(|entry| entry.terms().next().map_or_else(Default::default, |(_, c)| (c.re.clone(), c.im.clone())))
        .collect();
    let mut denominator = Integer::from(1);
    for (re, im) in &parts {
        denominator.lcm_mut(re.denom());
        denominator.lcm_mut(im.denom());
    }
    let scaled = |q: Rational| (q * &denominator).into_numer_denom().0;
    parts.into_iter().map(|(re, im)| (scaled(re), scaled(im))).collect()
}

/// Reads the solutions off a reduced system.
fn read_off<T>(reduced: &Reduced<T>, quotient: impl Fn(&T, &T) -> Surd) -> Solutions {
    let (rows, pivots) = (&reduced.rows, &reduced.pivots);
    let n = rows.len();
    let consistent = reduced.zero_beyond_rank(n);
    let particular = consistent.then(|| {
        let mut x = vec![Surd::zero(); n];
        for (row, column) in pivots.iter().enumerate() {
            x[*column] = quotient(&rows[row][n], &rows[row][*column]);
        }
        x
    });
    let null_space = (0..n)
        .filter(|column| !pivots.contains(column))
        .map(|free| {
            let mut x = vec![Surd::zero(); n];
            x[free] = Surd::one();
            for (row, column) in pivots.iter().enumerate() {
                x[*column] = -&quotient(&rows[row][free], &rows[row][*column]);
            }
            x
        })
        .collect();
    Solutions { particular, null_space }
}

fn solve_with_roots(mut rows: Vec<Vec<Surd>>, effort: &Effort) -> Result<Option<Solutions>, Interrupted> {
    let n = rows.len();
    let mut pivots: Vec<usize> = Vec::new();
    for column in 0..n {
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
            effort.check()?;
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
    let zero = rows.iter().map(|row| row.iter().map(Surd::is_zero).collect()).collect();
    Ok(Some(read_off(&Reduced { rows, pivots, zero }, |above, _| above.clone())))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn root(n: i64) -> Surd {
        Surd::sqrt_of(&Rational::from(n)).expect("small radicand")
    }

    fn q(n: i64, d: i64) -> Surd {
        Surd::from(Rational::from((n, d)))
    }

    fn product(rows: &[Vec<Surd>], x: &[Surd]) -> Vec<Surd> {
        rows.iter().map(|row| row.iter().zip(x).fold(Surd::zero(), |sum, (a, x)| &sum + &(a * x))).collect()
    }

    /// Whatever the field, the answer solves the system, and the homogeneous solutions solve that.
    fn check(rows: Vec<Vec<Surd>>, free: usize, solvable: bool) {
        let n = rows.len();
        let right: Vec<Surd> = rows.iter().map(|row| row[n].clone()).collect();
        let solutions = solve(rows.clone(), &Effort::new()).expect("not stopped").expect("small");
        assert_eq!(solutions.null_space.len(), free);
        for vector in &solutions.null_space {
            assert!(product(&rows, vector).iter().all(Surd::is_zero));
            assert!(vector.iter().any(|x| !x.is_zero()));
        }
        assert_eq!(solutions.particular.is_some(), solvable);
        if let Some(x) = solutions.particular {
            assert_eq!(product(&rows, &x), right);
        }
    }

    #[test]
    fn rational_systems() {
        check(vec![vec![q(0, 1), q(2, 3), q(1, 1)], vec![q(1, 2), q(5, 1), q(-1, 7)]], 0, true);
        check(vec![vec![q(1, 1), q(2, 1), q(3, 1)], vec![q(2, 1), q(4, 1), q(6, 1)]], 1, true);
        check(vec![vec![q(1, 1), q(2, 1), q(3, 1)], vec![q(2, 1), q(4, 1), q(5, 1)]], 1, false);
        check(vec![vec![q(0, 1), q(0, 1), q(0, 1)], vec![q(0, 1), q(0, 1), q(0, 1)]], 2, true);
    }

    #[test]
    fn complex_systems() {
        let i = Surd::i();
        check(vec![vec![q(1, 1), i.clone(), q(1, 3)], vec![-&i, q(3, 1), i.clone()]], 0, true);
        check(vec![vec![q(1, 1), i.clone(), i.clone()], vec![-&i, q(1, 1), q(1, 1)]], 1, true);
    }

    #[test]
    fn systems_with_roots() {
        check(vec![vec![q(1, 1), root(2), root(3)], vec![root(2), q(3, 1), q(1, 1)]], 0, true);
        check(vec![vec![q(1, 1), root(2), q(1, 1)], vec![root(2), q(2, 1), root(2)]], 1, true);
    }

    #[test]
    fn dense_systems_of_the_largest_size() {
        // A Hilbert matrix, whose fractions grow long, with a right-hand side that makes the solution all ones.
        let n = 25;
        let entry = |i: usize, j: usize| Rational::from((1, (i + j + 1) as u64));
        let rows = (0..n).map(|i| {
            let sum = (0..n).map(|j| entry(i, j)).fold(Rational::new(), |a, b| a + b);
            (0..n).map(|j| entry(i, j)).chain([sum]).map(Surd::from).collect()
        });
        let solutions = solve(rows.collect(), &Effort::new()).expect("not stopped").expect("small");
        assert_eq!(solutions.particular, Some(vec![Surd::one(); n]));
    }

    #[test]
    fn a_stopped_elimination_ends() {
        let effort = Effort::new();
        effort.stop();
        let rows = vec![vec![q(1, 1), q(2, 1), q(3, 1)], vec![q(2, 1), q(3, 1), q(6, 1)]];
        assert_eq!(solve(rows, &effort), Err(Interrupted));
    }
}
