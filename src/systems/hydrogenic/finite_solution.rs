//! Solutions of (z - H) u = f that are finite sums of powers times exponentials.

use super::bound::bound_state;
use super::function::RadialFunction;
use super::laurent::Laurent;
use crate::num::{Effort, Interrupted};
use rug::Rational;
use std::cmp::Ordering;

/// Solves (z - H) u = f in block l, where a finite solution exists; `None` where it does not.
///
/// A multiple of a bound state of energy z may be missing from the solution: the caller fixes it.
/// Range: z < 0. The solution is the one that is regular at the nucleus (in s waves: that has the 1/r its delta function asks for).
/// Cost: proportional to the number of powers.
/// Source: derived here, from
/// (z - H) r^j e^(-k r) = (1/2) [(j-l-1)(j+l) r^(j-2) + 2 (1 - k j) r^(j-1) + (k^2 + 2z) r^j] e^(-k r).
pub(super) fn finite_solution(
    z: &Rational,
    l: u32,
    source: &RadialFunction,
    effort: &Effort,
) -> Result<Option<RadialFunction>, Interrupted> {
    let mut solution = RadialFunction::default();
    for (envelope, polynomial) in source.terms() {
        effort.check()?;
        let found = match PowerRecursion::new(z, l, &envelope.kappa).solve(polynomial) {
            Some(found) => found,
            None => return Ok(None),
        };
        solution.add_term(envelope.clone(), &Rational::from(1), &found);
    }
    // -(1/2) p^2 (u_0 r^0) holds the delta function -u_0/2
    if l == 0 && solution.expansion_coefficient(0) != source.contact().scaled(&Rational::from(-2)) {
        return Ok(None);
    }
    Ok(Some(solution))
}

/// The two- or three-term recursion for one exponential.
struct PowerRecursion<'a> {
    l: i64,
    kappa: &'a Rational,
    /// kappa^2 + 2z; zero where the exponential is that of the energy.
    same_power: Rational,
}

impl<'a> PowerRecursion<'a> {
    fn new(z: &Rational, l: u32, kappa: &'a Rational) -> Self {
        let same_power = Rational::from(kappa.square_ref()) + Rational::from(z * 2);
        PowerRecursion { l: i64::from(l), kappa, same_power }
    }

    /// What r^(m+2) leaves in r^m.
    fn two_below(&self, m: i64) -> Rational {
        Rational::from(((m + 1 - self.l) * (m + 2 + self.l), 2))
    }

    /// What r^(m+1) leaves in r^m.
    fn one_below(&self, m: i64) -> Rational {
        Rational::from(1) - Rational::from(self.kappa * (m + 1))
    }

    fn solve(&self, source: &Laurent) -> Option<Laurent> {
        if self.same_power.cmp0() == Ordering::Equal {
            self.solve_on_shell(source)
        } else {
            self.solve_off_shell(source)
        }
    }

    /// Lowest power a solution may have: above the irregular r^-l; in s waves r^0 belongs to a delta function.
    fn lowest(&self) -> i64 {
        if self.l == 0 { 0 } else { 1 - self.l }
    }

    fn solve_off_shell(&self, source: &Laurent) -> Option<Laurent> {
        let mut descent = Descent::new(source.highest());
        for m in (self.lowest()..=source.highest()).rev() {
            let rest = self.rest(source, m, &descent) - self.one_below(m) * descent.above(m + 1);
            descent.push(m, rest * 2 / &self.same_power);
        }
        let first = source.lowest().min(self.lowest() - 2);
        for m in first..self.lowest() {
            let rest = self.rest(source, m, &descent) - self.one_below(m) * descent.above(m + 1);
            if rest.cmp0() != Ordering::Equal {
                return None;
            }
        }
        Some(descent.polynomial())
    }

    fn solve_on_shell(&self, source: &Laurent) -> Option<Laurent> {
        let mut descent = self.descend(source, Descent::new(source.highest() + 1))?;
        // below the irregular power nothing may be left
        if source.lowest() < -self.l - 1 {
            return None;
        }
        let irregular = descent.above(-self.l).clone();
        if self.l > 0 && irregular.cmp0() != Ordering::Equal {
            // for l >= n there is a finite solution of the homogeneous equation, r^n down to r^-l: it can take the irregular part away
            let n = self.level()?;
            if n > self.l {
                return None;
            }
            let mut top = Descent::new(n);
            top.push(n, Rational::from(1));
            let homogeneous = self.descend(&Laurent::default(), top)?;
            let factor = -irregular / homogeneous.above(-self.l);
            let mut sum = descent.polynomial();
            sum.add_scaled(&factor, &homogeneous.polynomial());
            return Some(sum);
        }
        descent.trim_below(self.lowest());
        Some(descent.polynomial())
    }

    /// The whole number 1/kappa, if it is one.
    fn level(&self) -> Option<i64> {
        let n = Rational::from(self.kappa.recip_ref());
        if *n.denom() == 1 { n.numer().to_i64() } else { None }
    }

    /// Fixes the powers from the top down to r^-l.
    fn descend(&self, source: &Laurent, mut descent: Descent) -> Option<Descent> {
        for m in (-self.l - 1..descent.next()).rev() {
            let rest = self.rest(source, m, &descent);
            let factor = self.one_below(m);
            if factor.cmp0() == Ordering::Equal {
                if rest.cmp0() != Ordering::Equal {
                    return None;
                }
                descent.push(m + 1, Rational::new());
            } else {
                descent.push(m + 1, rest / factor);
            }
        }
        Some(descent)
    }

    fn rest(&self, source: &Laurent, m: i64, descent: &Descent) -> Rational {
        let mut rest = source.coefficient(m).cloned().unwrap_or_default();
        rest -= self.two_below(m) * descent.above(m + 2);
        rest
    }
}

/// Coefficients found from the top power downwards.
struct Descent {
    top: i64,
    falling: Vec<Rational>,
    zero: Rational,
}

impl Descent {
    fn new(top: i64) -> Self {
        Descent { top, falling: Vec::new(), zero: Rational::new() }
    }

    /// The power that is found next.
    fn next(&self) -> i64 {
        self.top - super::laurent::to_power(self.falling.len())
    }

    fn push(&mut self, power: i64, c: Rational) {
        debug_assert_eq!(power, self.next());
        self.falling.push(c);
    }

    fn above(&self, power: i64) -> &Rational {
        usize::try_from(self.top - power).ok().and_then(|i| self.falling.get(i)).unwrap_or(&self.zero)
    }

    fn trim_below(&mut self, lowest: i64) {
        self.falling.truncate(usize::try_from(self.top - lowest + 1).unwrap_or(0));
    }

    fn polynomial(&self) -> Laurent {
        Laurent::new(self.next() + 1, self.falling.iter().rev().cloned().collect())
    }
}

/// f - sum over n of |n l><n l|f>.
pub(super) fn project_out(
    f: &RadialFunction,
    l: u32,
    levels: &[u32],
) -> Result<RadialFunction, super::function::Unintegrable> {
    let mut out = f.clone();
    for &n in levels {
        let state = bound_state(n, l);
        out.add_scaled(&-&state.inner(f)?, &state);
    }
    Ok(out)
}

#[cfg(test)]
mod tests {
    use super::super::action::{hamiltonian, power};
    use super::super::bound::energy;
    use super::*;
    use crate::num::Surd;

    /// Checks (z - H) u = f for the solution found.
    fn check(z: &Rational, l: u32, f: &RadialFunction) -> Option<RadialFunction> {
        let u = finite_solution(z, l, f, &Effort::new()).expect("not interrupted")?;
        let mut residual = u.scaled(z);
        residual.add_scaled(&Surd::from(-1), &hamiltonian(&u, l).expect("regular"));
        assert_eq!(&residual, f);
        Some(u)
    }

    #[test]
    fn dipole_sources_have_finite_solutions() {
        for n in 1..5_u32 {
            for l in 0..n {
                for lp in [l.wrapping_sub(1), l + 1] {
                    if lp == u32::MAX {
                        continue;
                    }
                    let source = power(&bound_state(n, l), 1, false).expect("regular");
                    let levels: Vec<u32> = if lp < n { vec![n] } else { vec![] };
                    let source = project_out(&source, lp, &levels).expect("convergent");
                    let u = check(&energy(n), lp, &source).expect("finite");
                    let u = project_out(&u, lp, &levels).expect("convergent");
                    assert_eq!(u.inner(&bound_state(n, lp)), Ok(Surd::zero()));
                }
            }
        }
    }

    #[test]
    fn a_bound_state_solves_at_any_energy() {
        let z = Rational::from((-2, 7));
        let state = bound_state(4, 1);
        let u = check(&z, 1, &state).expect("finite");
        assert_eq!(u, state.scaled(&(z - energy(4)).recip()));
    }

    #[test]
    fn logarithmic_solutions_are_refused() {
        // r^-3 and r^-2 inside the same block lead to logarithms
        for s in [-3, -2] {
            let source = power(&bound_state(2, 1), s, true).expect("a function");
            let source = project_out(&source, 1, &[2]).expect("convergent");
            assert!(check(&energy(2), 1, &source).is_none());
        }
    }

    #[test]
    fn whatever_h_makes_is_undone() {
        // a function less regular than the bound states, but without the irregular part
        let odd =
            RadialFunction::new(&Rational::from((1, 2)), &Surd::one(), &Laurent::new(0, vec![Rational::from(1); 4]));
        for z in [energy(2), Rational::from((-1, 5))] {
            let mut f = odd.scaled(&z);
            f.add_scaled(&Surd::from(-1), &hamiltonian(&odd, 3).expect("a function"));
            let u = check(&z, 3, &f).expect("finite");
            assert_eq!(u, odd);
        }
    }
}
