//! Wigner 3j symbols and Clebsch-Gordan coefficients, exactly.

use super::binomials::three_product_sum;
use super::factorials::PrimePowers;
use super::half_integer::{AngularError, HalfInteger};
use crate::num::Surd;
use rug::Rational;

/// Whether three doubled angular momenta close a triangle; `Err` when their sum is not whole.
pub(crate) fn triangle(a: HalfInteger, b: HalfInteger, c: HalfInteger) -> Result<bool, AngularError> {
    let (ta, tb, tc) = (a.as_momentum()?, b.as_momentum()?, c.as_momentum()?);
    if (ta + tb + tc) % 2 != 0 {
        return Err(AngularError::Sum { a, b, c });
    }
    Ok(tc <= ta + tb && ta <= tb + tc && tb <= tc + ta)
}

fn projection(j: HalfInteger, m: HalfInteger) -> Result<bool, AngularError> {
    let twice = j.as_momentum()?;
    if (twice - m.twice()) % 2 != 0 {
        return Err(AngularError::Projection { j, m });
    }
    Ok(m.twice().abs() <= twice)
}

/// The 3j symbol (j1 j2 j3; m1 m2 m3).
///
/// Zero where a selection rule forbids it: no triangle, |m| > j, or m1 + m2 + m3 not zero.
/// Errors: an angular momentum that is negative or too large, j and m that differ by a half, a sum of the three that is not whole.
/// Cost: a sum of at most 2 j + 1 products of three binomials.
/// Source: Racah's single sum (Edmonds, Angular Momentum in Quantum Mechanics, eq. 3.6.11), rewritten here in binomials.
pub fn threej(
    j1: HalfInteger,
    j2: HalfInteger,
    j3: HalfInteger,
    m1: HalfInteger,
    m2: HalfInteger,
    m3: HalfInteger,
) -> Result<Surd, AngularError> {
    let closes = triangle(j1, j2, j3)?;
    let inside = projection(j1, m1)? & projection(j2, m2)? & projection(j3, m3)?;
    if !closes || !inside || m1.twice() + m2.twice() + m3.twice() != 0 {
        return Ok(Surd::zero());
    }
    let [t1, t2, t3] = [j1.twice(), j2.twice(), j3.twice()];
    let (a, b, c) = ((t1 + t2 - t3) / 2, (t1 - t2 + t3) / 2, (-t1 + t2 + t3) / 2);
    let minus = |j: HalfInteger, m: HalfInteger| (j.twice() - m.twice()) / 2;
    let plus = |j: HalfInteger, m: HalfInteger| (j.twice() + m.twice()) / 2;
    let sum = three_product_sum(a, b, c, minus(j1, m1), plus(j2, m2));
    if sum == 0 {
        return Ok(Surd::zero());
    }
    let largest = (t1 + t2 + t3) / 2 + 1;
    let mut square = PrimePowers::up_to(largest);
    for (j, m) in [(j1, m1), (j2, m2), (j3, m3)] {
        square.times_factorial(minus(j, m), 1);
        square.times_factorial(plus(j, m), 1);
    }
    for k in [largest, a, b, c] {
        square.times_factorial(k, -1);
    }
    let odd = (t1 - t2 - m3.twice()) / 2 % 2 != 0;
    Ok(square.square_root_times(if odd { -sum } else { sum }))
}

/// The Clebsch-Gordan coefficient <j1 m1 j2 m2|J M>.
///
/// Zero and errors as for [`threej`].
/// Source: Edmonds, eq. 3.7.3 (his phase: Condon and Shortley).
pub fn clebsch_gordan(
    j1: HalfInteger,
    m1: HalfInteger,
    j2: HalfInteger,
    m2: HalfInteger,
    j: HalfInteger,
    m: HalfInteger,
) -> Result<Surd, AngularError> {
    let symbol = threej(j1, j2, j, m1, m2, HalfInteger::from_twice(-m.twice()))?;
    if symbol.is_zero() {
        return Ok(symbol);
    }
    let odd = (j1.twice() - j2.twice() + m.twice()) / 2 % 2 != 0;
    let root = Surd::sqrt_of(&Rational::from(j.twice() + 1)).unwrap_or_default();
    let value = &symbol * &root;
    Ok(if odd { -&value } else { value })
}

#[cfg(test)]
mod tests {
    use super::*;
    use HalfInteger as H;

    fn symbol(twice: [i32; 6]) -> Surd {
        let [a, b, c, d, e, f] = twice.map(H::from_twice);
        threej(a, b, c, d, e, f).expect("valid arguments")
    }

    #[test]
    fn tabulated_values() {
        // Standard tables (Edmonds; Varshalovich, Moskalev, Khersonskii).
        for (twice, text) in [
            ([2, 2, 0, 0, 0, 0], "-1/3 sqrt(3)"),
            ([2, 2, 4, 0, 0, 0], "1/15 sqrt(30)"),
            ([4, 4, 4, 0, 0, 0], "-1/35 sqrt(70)"),
            ([6, 4, 2, 0, 0, 0], "-1/35 sqrt(105)"),
            ([3, 2, 1, 1, -2, 1], "1/6 sqrt(3)"),
            ([3, 3, 4, 3, -1, -2], "-1/10 sqrt(10)"),
            ([12, 8, 4, 0, 0, 0], "1/143 sqrt(715)"),
        ] {
            assert_eq!(symbol(twice).to_string(), text, "{twice:?}");
        }
    }

    #[test]
    fn large_symbol_agrees_to_forty_digits() {
        // (100 100 100; 0 0 0) = 0.006032391313465684006650805520554418231889 (computed independently for this project, exact arithmetic)
        let value = symbol([200, 200, 200, 0, 0, 0]);
        let (unit, c) = value.terms().next().expect("not zero");
        let root = &unit.radicand;
        let float = rug::Float::with_val(300, root).sqrt() * rug::Float::with_val(300, &c.re);
        let known = rug::Float::with_val(
            300,
            rug::Float::parse("0.006032391313465684006650805520554418231889").expect("digits"),
        );
        assert!((float - known).abs() < 1e-42);
    }

    #[test]
    fn selection_rules_give_zero() {
        assert!(symbol([2, 2, 6, 0, 0, 0]).is_zero());
        assert!(symbol([2, 2, 2, 0, 0, 0]).is_zero());
        assert!(symbol([2, 2, 4, 2, 2, 0]).is_zero());
        assert!(symbol([2, 2, 4, 4, -4, 0]).is_zero());
    }

    #[test]
    fn arguments_that_make_no_sense_are_errors() {
        let h = H::from_twice;
        assert!(matches!(threej(h(1), h(2), h(2), h(1), h(0), h(-1)), Err(AngularError::Sum { .. })));
        assert!(matches!(threej(h(-2), h(2), h(2), h(0), h(0), h(0)), Err(AngularError::Negative { .. })));
        assert!(matches!(threej(h(2), h(2), h(2), h(1), h(0), h(-1)), Err(AngularError::Projection { .. })));
        assert!(matches!(threej(h(20_000), h(2), h(2), h(0), h(0), h(0)), Err(AngularError::TooLarge { .. })));
    }

    /// sum over m1 of (2 j3 + 1) 3j(j1 j2 j3; m1 m2 m3) 3j(j1 j2 j3'; m1 m2 m3) = delta(j3, j3').
    #[test]
    fn orthogonality() {
        for t1 in 0..7_i32 {
            for t2 in 0..7_i32 {
                for t3 in ((t1 - t2).abs()..=t1 + t2).step_by(2) {
                    for t3b in ((t1 - t2).abs()..=t1 + t2).step_by(2) {
                        let tm3 = t3.min(t3b) % 2;
                        let mut sum = Surd::zero();
                        for tm1 in (-t1..=t1).step_by(2) {
                            let tm2 = -tm1 - tm3;
                            sum += &(&symbol([t1, t2, t3, tm1, tm2, tm3]) * &symbol([t1, t2, t3b, tm1, tm2, tm3]));
                        }
                        let sum = sum.scaled(&Rational::from(t3 + 1));
                        assert_eq!(sum, Surd::from(i64::from(t3 == t3b)), "{t1} {t2} {t3} {t3b}");
                    }
                }
            }
        }
    }

    #[test]
    fn columns_may_be_swapped() {
        for (j, m) in
            [([4, 6, 4], [2, -4, 2]), ([3, 5, 6], [1, -3, 2]), ([9, 7, 10], [5, 1, -6]), ([40, 31, 29], [2, 3, -5])]
        {
            let straight = symbol([j[0], j[1], j[2], m[0], m[1], m[2]]);
            let swapped = symbol([j[1], j[0], j[2], m[1], m[0], m[2]]);
            let turned = symbol([j[1], j[2], j[0], m[1], m[2], m[0]]);
            let reflected = symbol([j[0], j[1], j[2], -m[0], -m[1], -m[2]]);
            let odd = (j[0] + j[1] + j[2]) / 2 % 2 != 0;
            let expected = if odd { -&straight } else { straight.clone() };
            assert_eq!(turned, straight);
            assert_eq!(swapped, expected);
            assert_eq!(reflected, expected);
        }
    }

    #[test]
    fn clebsch_gordan_of_two_halves() {
        let h = H::from_twice;
        let cg = |m1, m2, j, m| clebsch_gordan(h(1), h(m1), h(1), h(m2), h(j), h(m)).expect("valid").to_string();
        assert_eq!(cg(1, 1, 2, 2), "1");
        assert_eq!(cg(1, -1, 0, 0), "1/2 sqrt(2)");
        assert_eq!(cg(-1, 1, 0, 0), "-1/2 sqrt(2)");
        assert_eq!(cg(1, -1, 2, 0), "1/2 sqrt(2)");
    }
}
