//! The number of distinct eigenvalues of an exact Hermitian matrix, certified through its characteristic polynomial
//! modulo primes.

mod field;
mod hessenberg;
mod nullity;
mod polynomial;

pub use field::Prime;
pub use nullity::nullity;

use super::error::LinalgError;
use crate::num::Effort;

/// Primes that must give a count.
const WANTED: usize = 3;

/// Primes that are looked at before the search is given up; with k independent radicals one in 2^k suits.
const TRIED: usize = 20_000;

/// Counts the distinct eigenvalues of a Hermitian matrix of exact entries.
///
/// `entries_mod_p` gives the entries by rows in the field of p elements, `None` if a denominator is divisible by p or
/// a square root is missing there ([`Prime::sqrt`]); square roots of products must be the products of the same roots,
/// so that the entries are images under one homomorphism. -1 is a square modulo every prime offered, so that i has an
/// image.
///
/// *Accuracy*: eigenvalues that differ stay different modulo p for all but the finitely many primes that divide the
/// differences; equal ones are never told apart. The count of a prime is therefore never above the truth. For entries
/// of b bits at most about order^2 b/62 of some 2^56 primes give less, and only if all three primes tried do is the
/// largest of their counts too small. The count is certain when it equals an upper bound known otherwise, such as the
/// number of clusters an enclosure of the spectrum shows. *Errors*: too few primes suit the entries, or a list of
/// entries of a wrong length. *Cost*: about 3 order^3 word products each prime. *Source*: derived here; the
/// characteristic polynomial from a Hessenberg form is in H. Cohen, A Course in Computational Algebraic Number Theory,
/// algorithm 2.2.9.
pub fn distinct_eigenvalues(
    order: usize,
    entries_mod_p: &dyn Fn(&Prime) -> Option<Vec<u64>>,
    effort: &Effort,
) -> Result<usize, LinalgError> {
    let mut counts = Vec::with_capacity(WANTED);
    for prime in Prime::descending().take(TRIED) {
        effort.check()?;
        let Some(entries) = entries_mod_p(&prime) else { continue };
        if entries.len() != order * order {
            return Err(LinalgError::WrongLength { found: entries.len(), expected: order * order });
        }
        let mut matrix: Vec<u64> = entries.into_iter().map(|x| prime.enter(x)).collect();
        hessenberg::reduce(&mut matrix, order, &prime, effort)?;
        let characteristic = hessenberg::characteristic(&matrix, order, &prime, effort)?;
        let derivative = polynomial::derivative(&characteristic, &prime);
        let common = polynomial::gcd(characteristic, derivative, &prime, effort)?;
        counts.push(order - common.len().saturating_sub(1));
        if counts.len() == WANTED {
            return Ok(counts.into_iter().max().unwrap_or(0));
        }
    }
    Err(LinalgError::TooFewPrimes { found: counts.len(), wanted: WANTED })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn count(order: usize, entry: impl Fn(&Prime, usize, usize) -> Option<u64>) -> usize {
        let entries = |p: &Prime| (0..order * order).map(|k| entry(p, k / order, k % order)).collect();
        distinct_eigenvalues(order, &entries, &Effort::new()).expect("primes suit")
    }

    #[test]
    fn repeated_eigenvalues_count_once() {
        // All ones: 0 (five times) and 6.
        assert_eq!(count(6, |_, _, _| Some(1)), 2);
        assert_eq!(count(5, |p, i, j| Some(if i == j { p.from_i64(-7) } else { 0 })), 1);
        assert_eq!(count(5, |_, i, j| Some(if i == j { i as u64 } else { 0 })), 5);
        assert_eq!(count(0, |_, _, _| Some(1)), 0);
    }

    #[test]
    fn square_roots_and_i_have_images() {
        // [[0, sqrt 2 - i], [sqrt 2 + i, 0]] has the eigenvalues +-sqrt 3; beside sqrt 3 on the diagonal two are
        // distinct.
        let entry = |p: &Prime, i: usize, j: usize| {
            let (two, three, imaginary) = (p.sqrt(2)?, p.sqrt(3)?, p.sqrt(p.from_i64(-1))?);
            Some(match (i, j) {
                (0, 1) => p.add(two, p.negate(imaginary)),
                (1, 0) => p.add(two, imaginary),
                (2, 2) => three,
                _ => 0,
            })
        };
        // The root of 3 is either sign, and both are eigenvalues.
        assert_eq!(count(3, entry), 2);
    }

    #[test]
    fn denominators_divide() {
        // diag(1/3, 2/6, 1/2)
        let entry = |p: &Prime, i: usize, j: usize| {
            let (num, den) = [(1, 3), (2, 6), (1, 2)][i];
            if i == j { Some(p.multiply(num, p.inverse(den)?)) } else { Some(0) }
        };
        assert_eq!(count(3, entry), 2);
    }

    #[test]
    fn tensor_sum_of_a_dense_matrix() {
        // A = u u^T + diag has 4 distinct eigenvalues, A (x) 1 has each of them 3 times.
        let entry = |p: &Prime, i: usize, j: usize| {
            let (a, b) = (i / 3, j / 3);
            if i % 3 != j % 3 {
                return Some(0);
            }
            let product = p.from_i64(((a + 1) * (b + 1)) as i64);
            Some(if a == b { p.add(product, p.from_i64((a * a) as i64)) } else { product })
        };
        assert_eq!(count(12, entry), 4);
    }

    #[test]
    fn entries_without_primes_are_an_error() {
        let result = distinct_eigenvalues(2, &|_| None, &Effort::new());
        assert_eq!(result, Err(LinalgError::TooFewPrimes { found: 0, wanted: WANTED }));
    }
}
