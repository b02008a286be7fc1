//! The kernels of the dense factorisations, chosen by precision.
//!
//! Up to 16 limbs the numbers are fixed-point without allocation ([`limbs`]); longer ones, and matrices whose
//! elimination leaves the range of fixed point, go through `crate::linalg::plain`. Whatever the number of threads,
//! sums are exact before they are rounded, and the results are the same bits.

mod cholesky;
mod entries;
mod limbs;
mod lu;
mod substitution;
mod team;

pub(super) use entries::Entries;

use super::factor::{Balanced, Factorisation, Failure};
use super::plain::PlainLu;
use super::threads;
use crate::num::Effort;

/// The counts of limbs that kernels are compiled for.
const COUNTS: [usize; 10] = [2, 3, 4, 5, 6, 7, 8, 10, 12, 16];

/// Runs an expression with a constant count of limbs.
macro_rules! with_limbs {
    ($limbs:expr, $L:ident => $body:expr, else $other:expr) => {
        $crate::linalg::kernel::with_limbs!(@ $limbs, $L, $body, $other, 2 3 4 5 6 7 8 10 12 16)
    };
    (@ $limbs:expr, $L:ident, $body:expr, $other:expr, $($count:literal)*) => {
        match $limbs {
            $($count => {
                const $L: usize = $count;
                $body
            })*
            _ => $other,
        }
    };
}
use with_limbs;

/// Returns the count of limbs whose sums of so many products have so many bits right, `None` if there is no kernel so
/// long.
pub(super) fn limbs_for(bits: u32, terms: usize) -> Option<usize> {
    COUNTS.into_iter().find(|&limbs| limbs::accurate_bits(limbs, terms) >= bits)
}

/// Factorises a balanced matrix at about the given precision and returns the precision that was used.
///
/// `entries` are those of the same matrix; they serve if they are long enough. *Errors*: without pivots,
/// [`Failure::Growth`]; with pivots, [`Failure::NoPivot`] for a matrix that is singular at this precision.
pub(super) fn factorise(
    a: Balanced,
    entries: Option<&Entries>,
    precision: u32,
    pivoted: bool,
    effort: &Effort,
) -> Result<(Box<dyn Factorisation>, u32), Failure> {
    let plain = || -> Result<(Box<dyn Factorisation>, u32), Failure> {
        Ok((Box::new(PlainLu::new(a, precision, effort)?), precision))
    };
    let Some(limbs) = limbs_for(precision, 1) else { return plain() };
    let fresh;
    let entries = match entries.filter(|entries| entries.limbs() >= limbs) {
        Some(entries) => entries,
        None => match Entries::new(a, false, limbs, effort)? {
            Some(read) => {
                fresh = read;
                &fresh
            }
            None => return plain(),
        },
    };
    let fixed: Result<Box<dyn Factorisation>, Failure> = with_limbs!(limbs, L => {
        if pivoted {
            lu::PivotedLu::<L>::new(entries, threads::count(), effort).map(|lu| Box::new(lu) as Box<dyn Factorisation>)
        } else {
            cholesky::SignedCholesky::<L>::new(entries, threads::count(), effort)
                .map(|cholesky| Box::new(cholesky) as Box<dyn Factorisation>)
        }
    }, else return plain());
    match fixed {
        Ok(factors) => Ok((factors, limbs::accurate_bits(limbs, 1))),
        // With pivots only contrived matrices grow beyond the range of fixed point.
        Err(Failure::Growth) if pivoted => plain(),
        Err(failure) => Err(failure),
    }
}
