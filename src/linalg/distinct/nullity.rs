//! The dimension of the null space of an exact matrix, through its images modulo primes.

use super::field::Prime;
use super::{TRIED, WANTED};
use crate::linalg::error::LinalgError;
use crate::num::{Effort, Interrupted};

/// Counts the independent null vectors of a square matrix of exact entries.
///
/// `entries_mod_p` is as for [`super::distinct_eigenvalues`].
///
/// *Accuracy*: vectors that are independent stay so modulo p for all but finitely many primes, so the count of a prime is never below the
/// truth: zero is certain. The smallest count of three primes of 62 bits is above the truth with a probability of about order 2^-180 for
/// a matrix that does not know the primes.
/// *Errors*: too few primes suit the entries, or a list of entries of a wrong length. *Cost*: about order^3/3 word operations each prime.
/// *Source*: derived here.
pub fn nullity(
    order: usize,
    entries_mod_p: &dyn Fn(&Prime) -> Option<Vec<u64>>,
    effort: &Effort,
) -> Result<usize, LinalgError> {
    let (mut least, mut found) = (order, 0);
    for prime in Prime::descending().take(TRIED) {
        effort.check()?;
        let Some(entries) = entries_mod_p(&prime) else { continue };
        if entries.len() != order * order {
            return Err(LinalgError::WrongLength { found: entries.len(), expected: order * order });
        }
        let matrix = entries.into_iter().map(|x| prime.enter(x)).collect();
        least = least.min(order - rank(matrix, order, &prime, effort)?);
        found += 1;
        if least == 0 || found == WANTED {
            return Ok(least);
        }
    }
    Err(LinalgError::TooFewPrimes { found, wanted: WANTED })
}

/// The rank of a matrix given by rows in the entered form.
fn rank(mut matrix: Vec<u64>, order: usize, prime: &Prime, effort: &Effort) -> Result<usize, Interrupted> {
    let mut rank = 0;
    for column in 0..order {
        effort.check()?;
        let Some(pivot) = (rank..order).find(|&row| matrix[row * order + column] != 0) else { continue };
        for k in column..order {
            matrix.swap(pivot * order + k, rank * order + k);
        }
        let inverse = prime.inverse_entered(matrix[rank * order + column]);
        let (above, below) = matrix.split_at_mut((rank + 1) * order);
        let source = &above[rank * order + column..];
        for row in below.chunks_mut(order) {
            if row[column] == 0 {
                continue;
            }
            let factor = prime.product(row[column], inverse);
            for (x, s) in row[column..].iter_mut().zip(source) {
                *x = prime.subtract(*x, prime.product(factor, *s));
            }
        }
        rank += 1;
    }
    Ok(rank)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn count(order: usize, entry: impl Fn(&Prime, usize, usize) -> u64) -> usize {
        let entries = |p: &Prime| Some((0..order * order).map(|k| entry(p, k / order, k % order)).collect());
        nullity(order, &entries, &Effort::new()).expect("primes suit")
    }

    #[test]
    fn null_vectors_are_counted() {
        assert_eq!(count(6, |_, _, _| 1), 5);
        assert_eq!(count(4, |_, i, j| u64::from(i == j)), 0);
        assert_eq!(count(3, |_, _, _| 0), 3);
        assert_eq!(count(0, |_, _, _| 0), 0);
        // The rows i j + i + j + 1 = (i + 1)(j + 1) are multiples of one, plus a unit in the first place.
        assert_eq!(count(5, |_, i, j| ((i + 1) * (j + 1)) as u64 + u64::from(i == 0 && j == 0)), 3);
    }

    #[test]
    fn a_zero_pivot_is_exchanged() {
        assert_eq!(count(3, |_, i, j| u64::from(i + j == 2)), 0);
        assert_eq!(count(3, |p, i, j| if i == 0 { 0 } else { p.from_i64(j as i64 - 2 * i as i64) }), 1);
    }
}
