//! Integrals of exact functions with the functions of a Laguerre basis, also for another exponential.

use super::function::RadialFunction;
use super::laurent::Laurent;
use super::vector::Vector;
use crate::num::Surd;
use crate::systems::Number;
use rug::{Float, Integer, Rational, ops::Pow};
use std::cmp::Ordering;

/// The functions r^power e^(-k r) L_m^order(2 k r).
#[derive(Clone, PartialEq, Debug)]
pub(super) struct LaguerreBasis {
    pub(super) k: Rational,
    pub(super) power: i64,
    pub(super) order: u32,
}

/// The integrals of an exact function with the first `count` functions of a basis; without the delta function it may hold.
///
/// *Range*: every product must have powers of r from zero on; `None` where one has a lower power.
/// *Accuracy*: relative to the largest of the integrals, to about `bits` bits.
/// *Cost*: count times the number of powers for each exponential.
/// *Source*: derived here, from the generating function of the Laguerre polynomials: the integral of r^a e^(-(k+kappa) r) L_m^b(2kr) is the
/// coefficient of t^m in a! K^(-a-1) (1-t)^(a-b) (1 - rho t)^(-a-1), with K = kappa + k and rho = (kappa-k)/(kappa+k).
pub(super) fn moments(u: &RadialFunction, basis: &LaguerreBasis, count: usize, bits: u32) -> Option<Vector> {
    let mut out = Vector::real(vec![Float::new(bits); count]);
    for (envelope, polynomial) in u.terms() {
        let found = one_exponential(polynomial, &envelope.kappa, basis, count, bits)?;
        let unit = Surd::of_unit(envelope.unit.clone(), Rational::from(1), Rational::new());
        let unit = Number::Exact(unit).to_complex(bits).into_real_imag().0;
        let found: Vec<Float> = found.iter().map(|f| Float::with_val(bits, f * &unit)).collect();
        let part = if envelope.imaginary {
            Vector { re: vec![Float::new(bits); count], im: Some(found) }
        } else {
            Vector::real(found)
        };
        out = out.plus(&part);
    }
    Some(out)
}

fn one_exponential(
    polynomial: &Laurent,
    kappa: &Rational,
    basis: &LaguerreBasis,
    count: usize,
    bits: u32,
) -> Option<Vec<Float>> {
    let lowest = u32::try_from(polynomial.lowest() + basis.power).ok()?;
    let highest = u32::try_from(polynomial.highest() + basis.power).ok()?;
    let total = Rational::from(kappa + &basis.k);
    let rho = Rational::from(kappa - &basis.k) / &total;
    let numerator = numerator(polynomial, basis.power, &total, &rho);
    let guard = guard_bits(kappa, &basis.k, highest) + lowest.saturating_sub(basis.order);
    let work = bits + guard;
    let mut series = vec![Float::new(work); count];
    for (slot, c) in series.iter_mut().zip(&numerator) {
        *slot = Float::with_val(work, c);
    }
    for _ in basis.order..lowest {
        for m in (1..count).rev() {
            let (left, right) = series.split_at_mut(m);
            right[0] -= &left[m - 1];
        }
    }
    for _ in lowest..basis.order {
        for m in 1..count {
            let (left, right) = series.split_at_mut(m);
            right[0] += &left[m - 1];
        }
    }
    if rho.cmp0() != Ordering::Equal {
        let rho = Float::with_val(work, &rho);
        for _ in 0..=highest {
            for m in 1..count {
                let (left, right) = series.split_at_mut(m);
                right[0] += &left[m - 1] * &rho;
            }
        }
    }
    Some(series.iter().map(|f| Float::with_val(bits, f)).collect())
}

/// sum over a of c_a a! K^(-a-1) (1-t)^(a-lowest) (1 - rho t)^(highest-a), by powers of t, exactly.
fn numerator(polynomial: &Laurent, shift: i64, total: &Rational, rho: &Rational) -> Vec<Rational> {
    // Horner in (1-t)/(1 - rho t), homogeneous: S <- S (1-t) + c (1 - rho t)^step
    let mut sum: Vec<Rational> = vec![Rational::new()];
    let mut homogeneous: Vec<Rational> = vec![Rational::from(1)];
    let times = |x: &[Rational], factor: &Rational| {
        let mut y = x.to_vec();
        y.push(Rational::new());
        for (slot, c) in y.iter_mut().skip(1).zip(x) {
            *slot -= Rational::from(c * factor);
        }
        y
    };
    let one = Rational::from(1);
    for (step, (j, c)) in polynomial.iter().rev().enumerate() {
        if step > 0 {
            sum = times(&sum, &one);
            homogeneous = times(&homogeneous, rho);
        }
        let a = u32::try_from(j + shift).unwrap_or(0);
        let weight = Rational::from(c * Integer::from(Integer::factorial(a))) / Rational::from(total.pow(a + 1));
        for (slot, h) in sum.iter_mut().zip(&homogeneous) {
            *slot += Rational::from(h * &weight);
        }
    }
    sum
}

/// Bits that the division by (1 - rho t)^(highest+1) may cost: (1+|rho|)/(1-|rho|) is the ratio of the two exponentials.
fn guard_bits(kappa: &Rational, k: &Rational, highest: u32) -> u32 {
    let ratio = Rational::from(kappa / k);
    let doublings = (ratio.numer().significant_bits()).abs_diff(ratio.denom().significant_bits()) + 1;
    if ratio == 1 { 0 } else { (highest + 1) * doublings + 32 }
}

/// The integral of an exact function with a sum over basis functions; conjugate-linear in the exact function.
pub(super) fn integral(u: &RadialFunction, basis: &LaguerreBasis, x: &Vector, bits: u32) -> Option<rug::Complex> {
    let f = moments(u, basis, x.re.len(), bits)?;
    Some(f.inner(x, bits))
}

#[cfg(test)]
mod tests {
    use super::super::bound::bound_state;
    use super::*;

    const BITS: u32 = 256;

    /// L_m^order(2 k r) r^power as an exact function times e^(-k r).
    fn basis_function(basis: &LaguerreBasis, m: u32) -> RadialFunction {
        let mut coefficients = Vec::new();
        for i in 0..=m {
            let binomial = Integer::from(Integer::binomial_u(m + basis.order, m - i));
            let x = Rational::from(&basis.k * -2).pow(i);
            coefficients.push(x * binomial / Integer::from(Integer::factorial(i)));
        }
        RadialFunction::new(&basis.k, &crate::num::Surd::one(), &Laurent::new(basis.power, coefficients))
    }

    #[test]
    fn moments_are_the_integrals() {
        for (n, l, k, power, order) in [
            (1, 0, (1, 1), 1, 1),
            (3, 1, (1, 1), 2, 3),
            (3, 1, (1, 3), 2, 3),
            (5, 0, (1, 2), 1, 4),
            (4, 2, (1, 1), -1, 5),
            (20, 3, (1, 1), 4, 7),
        ] {
            let basis = LaguerreBasis { k: Rational::from(k), power, order };
            let u = bound_state(n, l);
            let found = moments(&u, &basis, 12, BITS).expect("convergent");
            let largest = found.re.iter().fold(Float::new(BITS), |a, b| a.max(&Float::with_val(BITS, b.abs_ref())));
            for m in 0..12 {
                let exact = u.inner(&basis_function(&basis, m)).expect("convergent");
                let exact = crate::systems::Number::Exact(exact).to_complex(BITS);
                let difference = Float::with_val(BITS, exact.real() - &found.re[m as usize]).abs();
                assert!(difference <= Float::with_val(BITS, &largest >> (BITS - 16)), "{n} {l} {k:?} {m}");
            }
        }
    }

    #[test]
    fn singular_products_are_refused() {
        let basis = LaguerreBasis { k: Rational::from(1), power: -2, order: 1 };
        assert!(moments(&bound_state(1, 0), &basis, 4, BITS).is_none());
    }

    #[test]
    fn integral_pairs_with_coefficients() {
        let basis = LaguerreBasis { k: Rational::from(1), power: 1, order: 1 };
        let x: Vec<Float> = [1, 2, 3].iter().map(|&c| Float::with_val(BITS, c)).collect();
        let u = bound_state(2, 0);
        let mut function = RadialFunction::default();
        for m in 0..3 {
            function.add_scaled(&crate::num::Surd::from(i64::from(m) + 1), &basis_function(&basis, m));
        }
        let exact = crate::systems::Number::Exact(u.inner(&function).expect("convergent")).to_complex(BITS);
        let found = integral(&u, &basis, &Vector::real(x), BITS).expect("convergent");
        assert!((exact - found).abs().real() < &Float::with_val(BITS, 1e-70));
    }
}
