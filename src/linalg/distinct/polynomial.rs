//! Polynomials modulo a prime, coefficients from the constant up in the entered form of the prime.

use super::field::Prime;
use crate::num::{Effort, Interrupted};

/// Returns the derivative.
pub(super) fn derivative(polynomial: &[u64], prime: &Prime) -> Vec<u64> {
    let scaled = |(k, c): (usize, &u64)| prime.product(*c, prime.enter(k as u64));
    trimmed(polynomial.iter().enumerate().skip(1).map(scaled).collect())
}

/// Returns a greatest common divisor, not made monic; empty if both are zero.
pub(super) fn gcd(a: Vec<u64>, b: Vec<u64>, prime: &Prime, effort: &Effort) -> Result<Vec<u64>, Interrupted> {
    let (mut a, mut b) = (trimmed(a), trimmed(b));
    while let Some(&leading) = b.last() {
        effort.check()?;
        let inverse = prime.inverse_entered(leading);
        while a.len() >= b.len() {
            let shift = a.len() - b.len();
            let factor = a.last().map_or(0, |top| prime.product(*top, inverse));
            for (x, c) in a[shift..].iter_mut().zip(&b) {
                *x = prime.subtract(*x, prime.product(factor, *c));
            }
            a = trimmed(a);
        }
        std::mem::swap(&mut a, &mut b);
    }
    Ok(a)
}

/// Drops leading zeros.
fn trimmed(mut polynomial: Vec<u64>) -> Vec<u64> {
    while polynomial.last() == Some(&0) {
        polynomial.pop();
    }
    polynomial
}
