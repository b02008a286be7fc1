//! What operators do to exact radial functions, delta functions at the nucleus included.

use super::function::{RadialFunction, Unintegrable};
use crate::num::Surd;
use rug::Rational;

/// Why an operator gives no function that can be held exactly.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(super) enum NoFunction {
    /// The result is more singular at the nucleus than a delta function; taken from the other side the product may exist.
    Distribution,
    /// A delta function of something that is not finite at the nucleus.
    NotFinite,
}

/// r^s u, from one block into another or the same.
pub(super) fn power(u: &RadialFunction, s: i64, same_block: bool) -> Result<RadialFunction, NoFunction> {
    let mut out = u.map(|_, p| p.times_power(s));
    if !u.contact().is_zero() {
        match s {
            0 if same_block => out.add_contact(u.contact()),
            // a delta function times something that is zero at the nucleus, or has no s wave there
            0.. => {}
            _ => return Err(NoFunction::Distribution),
        }
    }
    Ok(out)
}

/// The radial part of the gradient, from block l to block lp = l + 1 or l - 1: u' - (l+1) u/r or u' + l u/r.
///
/// Source: gradient formula (Edmonds, eq. 5.7.1) for u = r R.
pub(super) fn gradient(u: &RadialFunction, l: u32, lp: u32) -> Result<RadialFunction, NoFunction> {
    // integration by parts against a regular function r^(lp+1) leaves nothing at the nucleus
    if !u.contact().is_zero() || u.leading_power(-i64::from(lp) - 1) < -i64::from(lp) {
        return Err(NoFunction::Distribution);
    }
    let c = gradient_term(l, lp);
    Ok(u.map(|e, p| p.map_powers(|j| [(-1, Rational::from(j + c)), (0, Rational::from(-&e.kappa))])))
}

/// The factor of u/r in the radial gradient.
pub(super) fn gradient_term(l: u32, lp: u32) -> i64 {
    if lp > l { -i64::from(l) - 1 } else { i64::from(l) }
}

/// p^2 u = -u'' + l(l+1) u/r^2, with the delta function that p^2 (1/r) holds.
pub(super) fn p_squared(u: &RadialFunction, l: u32) -> Result<RadialFunction, NoFunction> {
    let l = i64::from(l);
    let irregular = if l == 0 { -1 } else { -l };
    if !u.contact().is_zero() || u.leading_power(irregular) <= irregular {
        return Err(NoFunction::Distribution);
    }
    let mut out = u.map(|e, p| {
        p.map_powers(|j| {
            [
                (-2, Rational::from(-(j - l - 1) * (j + l))),
                (-1, Rational::from(2 * j) * &e.kappa),
                (0, -Rational::from(e.kappa.square_ref())),
            ]
        })
    });
    if l == 0 {
        out.add_contact(&u.expansion_coefficient(0));
    }
    Ok(out)
}

/// H u = (p^2/2 - 1/r) u.
pub(super) fn hamiltonian(u: &RadialFunction, l: u32) -> Result<RadialFunction, NoFunction> {
    let mut out = p_squared(u, l)?.scaled(&Rational::from((1, 2)));
    out.add_scaled(&Surd::from(-1), &power(u, -1, true)?);
    Ok(out)
}

/// pi delta(r) u; times 4, <v| gives the product of the coefficients of r in v and u.
pub(super) fn delta_times_pi(u: &RadialFunction) -> Result<RadialFunction, NoFunction> {
    match u.value_at_nucleus() {
        Ok(value) => Ok(RadialFunction::contact_of(value.scaled(&Rational::from((1, 4))))),
        Err(Unintegrable::Contact | Unintegrable::Diverges { .. } | Unintegrable::Logarithms) => {
            Err(NoFunction::NotFinite)
        }
    }
}

#[cfg(test)]
mod tests {
    use super::super::bound::{bound_state, energy};
    use super::*;

    #[test]
    fn bound_states_are_eigenstates() {
        for (n, l) in [(1, 0), (2, 0), (2, 1), (3, 1), (7, 3), (20, 0)] {
            let u = bound_state(n, l);
            assert_eq!(hamiltonian(&u, l), Ok(u.scaled(&energy(n))), "{n} {l}");
        }
    }

    #[test]
    fn p_squared_is_two_gradients() {
        let u = bound_state(5, 2);
        for lp in [1, 3] {
            let there = gradient(&u, 2, lp).expect("regular");
            let back = gradient(&there, lp, 2).expect("regular");
            assert_eq!(Ok(back), p_squared(&u, 2).map(|v| v.scaled(&Rational::from(-1))));
        }
    }

    #[test]
    fn fourth_power_of_p_has_a_delta_function_in_s_states() {
        // <1s|p^4|1s> = 5, as <p^2|p^2> and with the delta function written out
        let u = bound_state(1, 0);
        let once = p_squared(&u, 0).expect("regular");
        let twice = p_squared(&once, 0).expect("1/r");
        assert!(!twice.contact().is_zero());
        assert_eq!(once.inner(&once), Ok(Surd::from(5)));
        assert_eq!(u.inner(&twice), Ok(Surd::from(5)));
        assert_eq!(p_squared(&twice, 0), Err(NoFunction::Distribution));
    }

    #[test]
    fn density_at_the_nucleus() {
        // |psi_ns(0)|^2 = 1/(pi n^3)
        for n in 1..6 {
            let u = bound_state(n, 0);
            let value = delta_times_pi(&u).map(|v| u.inner(&v));
            assert_eq!(value, Ok(Ok(Surd::from(Rational::from((1, u64::from(n).pow(3)))))));
        }
    }
}
