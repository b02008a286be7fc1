//! Bound states of the atom with charge and reduced mass one.

use super::function::RadialFunction;
use super::laurent::Laurent;
use crate::num::Surd;
use rug::{Integer, Rational, ops::Pow};
use std::cmp::Ordering;

/// The normalised radial function of n, l.
///
/// u = N r^(l+1) e^(-r/n) L_(n-l-1)^(2l+1)(2r/n), N^2 = (2/n)^(2l+3) (n-l-1)!/(2n (n+l)!); positive at the nucleus.
/// Range: 0 <= l < n; otherwise the zero function.
/// Source: Bethe and Salpeter, Quantum Mechanics of One- and Two-Electron Atoms, section 3, in today's Laguerre polynomials.
pub(super) fn bound_state(n: u32, l: u32) -> RadialFunction {
    if l >= n {
        return RadialFunction::default();
    }
    let m = n - l - 1;
    let x_per_r = Rational::from((2, n));
    // L_m^a(x) = sum over i of (-1)^i C(m+a, m-i) x^i/i!
    let mut c = Rational::from(Integer::from(Integer::binomial_u(n + l, m)));
    let mut coefficients = Vec::new();
    for i in 0..=m {
        coefficients.push(c.clone());
        // C(m+a, m-i-1)/C(m+a, m-i) = (m-i)/(a+i+1)
        c *= &x_per_r;
        c *= Rational::from((i64::from(i) - i64::from(m), (i64::from(i) + 1) * (2 * i64::from(l) + 2 + i64::from(i))));
    }
    let square = Rational::from((&x_per_r).pow(2 * l + 3)) * Integer::from(Integer::factorial(m))
        / (Integer::from(Integer::factorial(n + l)) * 2 * n);
    let norm = Surd::sqrt_of(&square).unwrap_or_default();
    RadialFunction::new(&Rational::from((1, n)), &norm, &Laurent::new(i64::from(l) + 1, coefficients))
}

/// -1/(2 n^2).
pub(super) fn energy(n: u32) -> Rational {
    Rational::from((-1, 2)) / (u64::from(n) * u64::from(n))
}

/// The n of the level at an energy, if there is a level there.
pub(super) fn level_at(z: &Rational) -> Option<u32> {
    if z.cmp0() != Ordering::Less {
        return None;
    }
    let square = Rational::from((-1, 2)) / z;
    if *square.denom() != 1 || !square.numer().is_perfect_square() {
        return None;
    }
    Integer::from(square.numer().sqrt_ref()).to_u32()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn states_are_orthonormal() {
        for (n, np, l) in [(1, 1, 0), (1, 2, 0), (2, 2, 1), (5, 5, 2), (5, 7, 2), (30, 30, 12), (6, 3, 0)] {
            let overlap = bound_state(n, l).inner(&bound_state(np, l));
            assert_eq!(overlap, Ok(Surd::from(i64::from(n == np))), "{n} {np} {l}");
        }
    }

    #[test]
    fn large_states_are_normalised() {
        for (n, l) in [(200, 0), (200, 199), (137, 40)] {
            let u = bound_state(n, l);
            assert_eq!(u.inner(&u), Ok(Surd::one()), "{n} {l}");
        }
    }

    #[test]
    fn levels_are_recognised() {
        assert_eq!(level_at(&energy(7)), Some(7));
        assert_eq!(level_at(&Rational::from((-1, 3))), None);
        assert_eq!(level_at(&Rational::from((1, 2))), None);
        assert_eq!(level_at(&Rational::new()), None);
    }
}
