//! Spherical components of vectors, and the reduced elements of the spherical tensors C^k.

use super::half_integer::HalfInteger;
use super::wigner::threej;
use crate::num::Surd;
use rug::Rational;

/// A spherical component of a vector with the coefficient it enters with.
#[derive(Clone, PartialEq, Debug)]
pub struct SphericalWeight {
    pub q: i32,
    pub weight: Surd,
}

/// A Cartesian component of a vector in spherical components; `None` for another axis.
///
/// T_x = (T_-1 - T_+1)/sqrt 2, T_y = i (T_-1 + T_+1)/sqrt 2, T_z = T_0, from T_+-1 = -+(T_x +- i T_y)/sqrt 2.
pub fn cartesian_components(axis: &str) -> Option<Vec<SphericalWeight>> {
    let half = Surd::sqrt_of(&Rational::from((1, 2)))?;
    let imaginary = &half * &Surd::i();
    match axis {
        "x" => Some(vec![SphericalWeight { q: 1, weight: -&half }, SphericalWeight { q: -1, weight: half }]),
        "y" => Some(vec![
            SphericalWeight { q: 1, weight: imaginary.clone() },
            SphericalWeight { q: -1, weight: imaginary },
        ]),
        "z" => Some(vec![SphericalWeight { q: 0, weight: Surd::one() }]),
        _ => None,
    }
}

/// <l||C^k||l'> = (-1)^l sqrt((2l+1)(2l'+1)) (l k l'; 0 0 0), where C^k_q = sqrt(4 pi/(2k+1)) Y_kq.
///
/// Source: Edmonds, eq. 5.4.5 with 4.6.3.
pub fn reduced_c(l: u32, k: u32, lp: u32) -> Surd {
    let momentum = |x: u32| HalfInteger::whole(i32::try_from(x).unwrap_or(i32::MAX / 4));
    let zero = HalfInteger::whole(0);
    let Ok(symbol) = threej(momentum(l), momentum(k), momentum(lp), zero, zero, zero) else {
        return Surd::zero();
    };
    let root = Surd::sqrt_of(&(Rational::from(2 * u64::from(l) + 1) * (2 * u64::from(lp) + 1))).unwrap_or_default();
    let value = &symbol * &root;
    if l % 2 == 1 { -&value } else { value }
}

/// <l m|C^k_q|l' m'> with m = m' + q.
pub fn c_element(l: u32, k: u32, q: i32, lp: u32, mp: i32) -> Surd {
    let reduced = reduced_c(l, k, lp);
    let whole = HalfInteger::whole;
    let momentum = |x: u32| whole(i32::try_from(x).unwrap_or(i32::MAX / 4));
    let m = mp + q;
    if reduced.is_zero() || m.unsigned_abs() > l {
        return Surd::zero();
    }
    let Ok(symbol) = threej(momentum(l), momentum(k), momentum(lp), whole(-m), whole(q), whole(mp)) else {
        return Surd::zero();
    };
    let value = &reduced * &symbol;
    if (i64::from(l) - i64::from(m)) % 2 != 0 { -&value } else { value }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// cos(theta) raises l by one with ((l+1)^2 - m^2)/((2l+1)(2l+3)) as the square of its element.
    #[test]
    fn cosine_element() {
        for l in 0..6_u32 {
            for m in -5..=5_i32 {
                let element = c_element(l + 1, 1, 0, l, m);
                if m.unsigned_abs() > l {
                    continue;
                }
                let (li, mi) = (i64::from(l), i64::from(m));
                let square = Rational::from(((li + 1) * (li + 1) - mi * mi, (2 * li + 1) * (2 * li + 3)));
                assert_eq!(Surd::from(square), &element * &element);
                assert!(element.terms().all(|(_, c)| c.re > 0));
            }
        }
    }

    /// sum over l'' q of |<l m|C^k_q|l' m'>|^2 = 1: C^k . C^k is one.
    #[test]
    fn closure() {
        for k in 0..4_u32 {
            for lp in 0..4_u32 {
                let mut sum = Surd::zero();
                for l in 0..=lp + k {
                    let reach = i32::try_from(k).expect("small");
                    for q in -reach..=reach {
                        let element = c_element(l, k, q, lp, 0);
                        sum += &(&element * &element);
                    }
                }
                assert!(sum.is_one(), "{k} {lp}");
            }
        }
    }

    #[test]
    fn cartesian_components_are_a_rotation() {
        let x = cartesian_components("x").expect("axis");
        let y = cartesian_components("y").expect("axis");
        // conj(x) . y = 0, |x|^2 = 1
        let dot = |a: &[SphericalWeight], b: &[SphericalWeight]| {
            let mut sum = Surd::zero();
            for (p, r) in a.iter().zip(b) {
                sum += &(&p.weight.conj() * &r.weight);
            }
            sum
        };
        assert!(dot(&x, &y).is_zero());
        assert!(dot(&x, &x).is_one());
        assert!(cartesian_components("w").is_none());
    }
}
