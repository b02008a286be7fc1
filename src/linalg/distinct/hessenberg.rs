//! The characteristic polynomial of a matrix modulo a prime.

use super::field::Prime;
use crate::num::{Effort, Interrupted};

/// Brings a matrix, by rows in the entered form of the prime, to Hessenberg form by similarity.
pub(super) fn reduce(matrix: &mut [u64], order: usize, prime: &Prime, effort: &Effort) -> Result<(), Interrupted> {
    for k in 0..order.saturating_sub(2) {
        effort.check()?;
        let Some(pivot) = (k + 1..order).find(|&i| matrix[i * order + k] != 0) else { continue };
        if pivot != k + 1 {
            for j in 0..order {
                matrix.swap(pivot * order + j, (k + 1) * order + j);
            }
            for row in matrix.chunks_mut(order) {
                row.swap(pivot, k + 1);
            }
        }
        let inverse = prime.inverse_entered(matrix[(k + 1) * order + k]);
        // Row i less m times row k+1, then column k+1 plus m times column i, for all rows below at once.
        let mut multipliers = vec![0; order];
        for i in k + 2..order {
            let m = prime.product(matrix[i * order + k], inverse);
            multipliers[i] = m;
            if m == 0 {
                continue;
            }
            let (above, below) = matrix.split_at_mut(i * order);
            let source = &above[(k + 1) * order + k..(k + 2) * order];
            for (x, s) in below[k..order].iter_mut().zip(source) {
                *x = prime.subtract(*x, prime.product(m, *s));
            }
        }
        for row in matrix.chunks_mut(order) {
            let mut sum = row[k + 1];
            for (m, x) in multipliers[k + 2..].iter().zip(&row[k + 2..]) {
                sum = prime.add(sum, prime.product(*m, *x));
            }
            row[k + 1] = sum;
        }
    }
    Ok(())
}

/// Returns the coefficients of the monic characteristic polynomial of a Hessenberg matrix, from the constant up, in
/// the entered form.
pub(super) fn characteristic(h: &[u64], order: usize, prime: &Prime, effort: &Effort) -> Result<Vec<u64>, Interrupted> {
    // p_0 = 1, p_{k+1} = (x - h_kk) p_k - sum_{i<k} h_ik (h_{i+1,i} ... h_{k,k-1}) p_i
    let mut polynomials = vec![vec![prime.enter(1)]];
    for k in 0..order {
        effort.check()?;
        let last = &polynomials[k];
        let mut next = vec![0; k + 2];
        next[1..].copy_from_slice(last);
        subtract_multiple(&mut next, h[k * order + k], last, prime);
        let mut chain = prime.enter(1);
        for i in (0..k).rev() {
            chain = prime.product(chain, h[(i + 1) * order + i]);
            if chain == 0 {
                break;
            }
            subtract_multiple(&mut next, prime.product(chain, h[i * order + k]), &polynomials[i], prime);
        }
        polynomials.push(next);
    }
    Ok(polynomials.pop().unwrap_or_default())
}

/// Takes a multiple of a polynomial away from a longer one.
fn subtract_multiple(from: &mut [u64], factor: u64, polynomial: &[u64], prime: &Prime) {
    if factor == 0 {
        return;
    }
    for (x, c) in from.iter_mut().zip(polynomial) {
        *x = prime.subtract(*x, prime.product(factor, *c));
    }
}
