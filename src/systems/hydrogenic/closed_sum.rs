//! Exact values of <f| Q (E_n - H)^-1 Q |g> where both functions are singular at the nucleus and no finite solution exists.
//!
//! In Sturmian functions with the exponential of the level the resolvent is diagonal. The integrals of a function with the basis functions
//! are a polynomial of their number b, but for finitely many; so the sum over b ends in a rational function with simple poles at whole
//! numbers, and its tail is a rational number.

use super::bound::bound_state;
use super::function::{RadialFunction, Unintegrable};
use super::laurent::{Laurent, to_power};
use crate::num::{Effort, Interrupted, Surd, Unit};
use rug::{Integer, Rational, ops::Pow};
use std::cmp::Ordering;
use std::collections::BTreeMap;

/// Why a sum has no value here.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(super) enum NoSum {
    Unintegrable(Unintegrable),
    /// The terms of the sum do not fall off fast enough.
    Diverges,
    /// A factor has another exponential than the level, or the sum is not rational.
    NotRational,
    Interrupted(Interrupted),
}

impl From<Unintegrable> for NoSum {
    fn from(reason: Unintegrable) -> Self {
        NoSum::Unintegrable(reason)
    }
}

/// <bra| Q (E_n - H)^-1 Q |ket> in block l, where Q leaves out the state of the level, if the block has one.
///
/// *Errors*: the sum diverges, or it is not a finite combination of rationals.
/// *Cost*: quadratic in the number of powers.
/// *Source*: derived here.
pub(super) fn reduced_sum(
    n: u32,
    l: u32,
    bra: &RadialFunction,
    ket: &RadialFunction,
    effort: &Effort,
) -> Result<Surd, NoSum> {
    let left = Integrals::of(bra, n, l)?;
    let right = Integrals::of(ket, n, l)?;
    let mut value = Surd::zero();
    for (bra_unit, f) in &left {
        for (ket_unit, g) in &right {
            effort.check().map_err(NoSum::Interrupted)?;
            let sum = sum_over_basis(n, l, f, g)?;
            value += &(&bra_unit.conj() * ket_unit).scaled(&sum);
        }
    }
    Ok(value)
}

/// The integrals of a function with the basis functions b = 0, 1, 2, …: a polynomial in b, and what the first ones have besides.
#[derive(Clone, Default)]
struct Integrals {
    polynomial: Vec<Rational>,
    besides: Vec<Rational>,
}

impl Integrals {
    /// Of the parts of a function, each with its unit, the state of the level taken out.
    fn of(u: &RadialFunction, n: u32, l: u32) -> Result<Vec<(Surd, Integrals)>, NoSum> {
        let mut u = u.clone();
        if l < n {
            let state = bound_state(n, l);
            u.add_scaled(&-&state.inner(&u)?, &state);
        }
        let kappa = Rational::from((1, n));
        let mut parts: BTreeMap<(Unit, bool), Integrals> = BTreeMap::new();
        for (envelope, polynomial) in u.terms() {
            if envelope.kappa != kappa {
                return Err(NoSum::NotRational);
            }
            parts.entry((envelope.unit.clone(), envelope.imaginary)).or_default().add_powers(polynomial, &kappa, l)?;
        }
        for (unit, c) in u.contact().terms() {
            for (part, imaginary) in [(&c.re, false), (&c.im, true)] {
                // the coefficient of r in the basis function is b + 1
                parts.entry((unit.clone(), imaginary)).or_default().add_polynomial(&[part.clone(), part.clone()]);
            }
        }
        let unit = |(unit, imaginary): (Unit, bool)| {
            let (re, im) = (Rational::from(!imaginary), Rational::from(imaginary));
            Surd::of_unit(unit, re, im)
        };
        Ok(parts.into_iter().map(|(key, integrals)| (unit(key), integrals)).collect())
    }

    /// r^j gives a! (2k)^(-a-1) times the coefficient of t^b in (1-t)^(a-2l-1), with a = j + l + 1.
    fn add_powers(&mut self, powers: &Laurent, kappa: &Rational, l: u32) -> Result<(), NoSum> {
        let order = 2 * l + 1;
        for (j, c) in powers.iter() {
            let power = j + i64::from(l) + 1;
            let Ok(a) = u32::try_from(power) else {
                if c.cmp0() == Ordering::Equal {
                    continue;
                }
                return Err(Unintegrable::Diverges { power }.into());
            };
            let two_k = Rational::from(kappa * 2);
            let weight = Rational::from(c * Integer::from(Integer::factorial(a))) / Rational::from((&two_k).pow(a + 1));
            if a >= order {
                // (1-t)^(a-order): finitely many
                let exponent = a - order;
                for b in 0..=exponent {
                    let binomial = Integer::from(Integer::binomial_u(exponent, b));
                    let term = Rational::from(&weight * if b % 2 == 0 { binomial } else { -binomial });
                    self.add_besides(usize::try_from(b).unwrap_or(0), &term);
                }
            } else {
                // C(b+s-1, s-1) with s = order - a
                let mut polynomial = vec![weight];
                for i in 1..order - a {
                    polynomial = times_linear(&polynomial, &Rational::from(i), &Rational::from((1, i)));
                }
                self.add_polynomial(&polynomial);
            }
        }
        Ok(())
    }

    fn add_polynomial(&mut self, other: &[Rational]) {
        if self.polynomial.len() < other.len() {
            self.polynomial.resize(other.len(), Rational::new());
        }
        for (slot, c) in self.polynomial.iter_mut().zip(other) {
            *slot += c;
        }
    }

    fn add_besides(&mut self, b: usize, value: &Rational) {
        if self.besides.len() <= b {
            self.besides.resize(b + 1, Rational::new());
        }
        self.besides[b] += value;
    }

    fn at(&self, b: usize) -> Rational {
        let mut value = evaluate(&self.polynomial, &Rational::from(to_power(b)));
        if let Some(more) = self.besides.get(b) {
            value += more;
        }
        value
    }

    /// The degree of the polynomial; `None` where it is zero.
    fn degree(&self) -> Option<usize> {
        self.polynomial.iter().rposition(|c| c.cmp0() != Ordering::Equal)
    }
}

/// (shift + b) factor times a polynomial in b.
fn times_linear(polynomial: &[Rational], shift: &Rational, factor: &Rational) -> Vec<Rational> {
    let mut out = vec![Rational::new(); polynomial.len() + 1];
    for (i, c) in polynomial.iter().enumerate() {
        let c = Rational::from(c * factor);
        out[i] += Rational::from(&c * shift);
        out[i + 1] += c;
    }
    out
}

fn evaluate(polynomial: &[Rational], b: &Rational) -> Rational {
    let mut value = Rational::new();
    for c in polynomial.iter().rev() {
        value *= b;
        value += c;
    }
    value
}

/// sum over b of f_b g_b n (2k)^(2l+2) / ((b+1) … (b+2l+1) (b_0 - b)) without b_0 = n - l - 1.
fn sum_over_basis(n: u32, l: u32, f: &Integrals, g: &Integrals) -> Result<Rational, NoSum> {
    let level = i64::from(n) - i64::from(l) - 1;
    let largest = 2 * i64::from(l) + 1;
    let first = f.besides.len().max(g.besides.len()).max(usize::try_from(level + 1).unwrap_or(0));
    let denominator = |b: i64| {
        let mut product = Integer::from(level - b);
        for p in 1..=largest {
            product *= b + p;
        }
        product
    };
    let mut sum = Rational::new();
    for b in 0..first {
        if to_power(b) != level {
            sum += f.at(b) * g.at(b) / denominator(to_power(b));
        }
    }
    if let (Some(i), Some(j)) = (f.degree(), g.degree()) {
        if to_power(i + j) > largest - 1 {
            return Err(NoSum::Diverges);
        }
        sum += tail(to_power(first), level, largest, f, g)?;
    }
    let unit = Rational::from((2, n)).pow(2 * l + 2);
    Ok(sum * unit * n)
}

/// The sum from b = first on, by partial fractions: a residue c at the pole p contributes -c H(first-p-1), H the harmonic numbers.
fn tail(first: i64, level: i64, largest: i64, f: &Integrals, g: &Integrals) -> Result<Rational, NoSum> {
    let mut poles: Vec<i64> = (1..=largest).map(|p| -p).collect();
    let mut numerator = product(&f.polynomial, &g.polynomial);
    if poles.contains(&level) {
        // a double pole, whose tail has pi^2, unless the numerator takes half of it away
        let (quotient, rest) = without_root(&numerator, level);
        if rest.cmp0() != Ordering::Equal {
            return Err(NoSum::NotRational);
        }
        numerator = quotient;
    } else {
        poles.push(level);
    }
    let mut sum = Rational::new();
    for (i, &pole) in poles.iter().enumerate() {
        // the factor of the level is b_0 - b
        let mut rest = Integer::from(-1);
        for (j, &other) in poles.iter().enumerate() {
            if i != j {
                rest *= pole - other;
            }
        }
        sum -= evaluate(&numerator, &Rational::from(pole)) / rest * harmonic(first - pole - 1);
    }
    Ok(sum)
}

fn product(f: &[Rational], g: &[Rational]) -> Vec<Rational> {
    let mut out = vec![Rational::new(); (f.len() + g.len()).saturating_sub(1)];
    for (i, a) in f.iter().enumerate() {
        for (j, b) in g.iter().enumerate() {
            out[i + j] += Rational::from(a * b);
        }
    }
    out
}

/// Quotient and remainder of a polynomial by b - root.
fn without_root(polynomial: &[Rational], root: i64) -> (Vec<Rational>, Rational) {
    let mut carried = Rational::new();
    let mut falling = Vec::with_capacity(polynomial.len());
    for c in polynomial.iter().rev() {
        carried = carried * root + c;
        falling.push(carried.clone());
    }
    falling.pop();
    falling.reverse();
    (falling, carried)
}

fn harmonic(m: i64) -> Rational {
    let mut sum = Rational::new();
    for i in 1..=m {
        sum += Rational::from((1, i));
    }
    sum
}

#[cfg(test)]
mod tests {
    use super::super::action::power;
    use super::super::finite_solution::{finite_solution, project_out};
    use super::*;

    #[test]
    fn agrees_with_finite_solutions() {
        let effort = Effort::new();
        for (n, l, s, t) in [(2, 1, 1, -3), (3, 1, -1, 1), (3, 0, 2, -2), (4, 2, 1, -4), (3, 2, -1, -1)] {
            let (f, g) = (power(&bound_state(n, l), s, true), power(&bound_state(n, l), t, true));
            let (f, g) = (f.expect("a function"), g.expect("a function"));
            let inside = project_out(&f, l, &[n]).expect("convergent");
            let energy = super::super::bound::energy(n);
            let u = finite_solution(&energy, l, &inside, &effort).expect("not interrupted").expect("finite");
            let u = project_out(&u, l, &[n]).expect("convergent");
            assert_eq!(reduced_sum(n, l, &f, &g, &effort), Ok(u.inner(&g).expect("convergent")), "{n} {l} {s} {t}");
        }
    }

    #[test]
    fn division_by_a_root() {
        // b^2 - b - 2 = (b - 2)(b + 1)
        let polynomial: Vec<Rational> = [-2, -1, 1].iter().map(|&c| Rational::from(c)).collect();
        let (quotient, rest) = without_root(&polynomial, 2);
        assert_eq!((quotient, rest), (vec![Rational::from(1), Rational::from(1)], Rational::new()));
        assert_eq!(without_root(&polynomial, 0).1, -2);
    }

    #[test]
    fn slow_sums_diverge() {
        let contact = RadialFunction::contact_of(Surd::one());
        assert_eq!(reduced_sum(1, 0, &contact, &contact, &Effort::new()), Err(NoSum::Diverges));
    }
}
