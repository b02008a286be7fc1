//! 6j and 9j symbols, exactly.

use super::factorials::FactorialProduct;
use super::half_integer::{AngularError, HalfInteger};
use super::wigner::triangle;
use crate::num::Surd;
use rug::{Integer, Rational};

/// Longest 9j sum done exactly, in terms of the three sums inside.
const LONGEST_NINEJ: u64 = 100_000;

/// The 6j symbol {j1 j2 j3; j4 j5 j6}.
///
/// Zero where a triangle (1 2 3), (1 5 6), (4 2 6) or (4 5 3) does not close.
/// Errors: a negative angular momentum, a triangle whose sum is not whole.
/// Source: Racah (Edmonds, eq. 6.3.7).
pub fn sixj(j: [HalfInteger; 6]) -> Result<Surd, AngularError> {
    let [j1, j2, j3, j4, j5, j6] = j;
    let triads = [[j1, j2, j3], [j1, j5, j6], [j4, j2, j6], [j4, j5, j3]];
    let mut closes = true;
    for [a, b, c] in triads {
        closes &= triangle(a, b, c)?;
    }
    if !closes {
        return Ok(Surd::zero());
    }
    let half_sum = |parts: &[HalfInteger]| parts.iter().map(|p| p.twice()).sum::<i32>() / 2;
    let lower = triads.map(|t| half_sum(&t));
    let upper = [half_sum(&[j1, j2, j4, j5]), half_sum(&[j2, j3, j5, j6]), half_sum(&[j3, j1, j6, j4])];
    let sum = alternating_sum(&lower, &upper);
    let mut square = FactorialProduct::new();
    for [a, b, c] in triads.map(|t| t.map(HalfInteger::twice)) {
        for k in [(a + b - c) / 2, (a - b + c) / 2, (-a + b + c) / 2] {
            square.times(k, 1);
        }
        square.times((a + b + c) / 2 + 1, -1);
    }
    Ok(square.square_root().scaled(&sum))
}

/// sum over t of (-1)^t (t+1)! / (prod (t - lower)! prod (upper - t)!).
fn alternating_sum(lower: &[i32; 4], upper: &[i32; 3]) -> Rational {
    let first = lower.iter().copied().max().unwrap_or(0);
    let last = upper.iter().copied().min().unwrap_or(-1);
    let factorial = |k: i32| Integer::from(Integer::factorial(u32::try_from(k).unwrap_or(0)));
    // Relative to the first term every term is a rational; a common denominator grows with the sum instead.
    let mut leading = Rational::from(factorial(first + 1));
    for k in lower.iter().map(|l| first - l).chain(upper.iter().map(|u| u - first)) {
        leading /= factorial(k);
    }
    if first % 2 != 0 {
        leading = -leading;
    }
    // Horner from the last term: 1 - ratio(first) (1 - ratio(first + 1) (1 - ...))
    let (mut numer, mut denom) = (Integer::from(1), Integer::from(1));
    for t in (first..last).rev() {
        let mut up = Integer::from(t + 2);
        for u in upper {
            up *= u - t;
        }
        let mut down = Integer::from(1);
        for l in lower {
            down *= t + 1 - l;
        }
        // 1 - (up/down) (numer/denom)
        denom *= down;
        numer = &denom - up * numer;
    }
    leading * Rational::from((numer, denom))
}

/// The 9j symbol, rows one after the other.
///
/// Zero where a row or a column does not close a triangle.
/// Errors: as for [`sixj`]; `TooLong` for angular momenta beyond some two hundred.
/// Source: Edmonds, eq. 6.4.3.
pub fn ninej(j: [[HalfInteger; 3]; 3]) -> Result<Surd, AngularError> {
    let [[a, b, c], [d, e, f], [g, h, i]] = j;
    let mut closes = true;
    for [x, y, z] in [[a, b, c], [d, e, f], [g, h, i], [a, d, g], [b, e, h], [c, f, i]] {
        closes &= triangle(x, y, z)?;
    }
    if !closes {
        return Ok(Surd::zero());
    }
    let bounds = |x: HalfInteger, y: HalfInteger| ((x.twice() - y.twice()).abs(), x.twice() + y.twice());
    let pairs = [bounds(a, i), bounds(d, h), bounds(b, f)];
    let first = pairs.iter().map(|p| p.0).max().unwrap_or(0);
    let last = pairs.iter().map(|p| p.1).min().unwrap_or(-1);
    let longest = j.iter().flatten().map(|x| x.twice()).max().unwrap_or(0);
    let terms = u64::try_from((last - first) / 2 + 1).unwrap_or(0) * u64::try_from(longest + 1).unwrap_or(0);
    if terms > LONGEST_NINEJ {
        return Err(AngularError::TooLong { terms, limit: LONGEST_NINEJ });
    }
    let mut sum = Surd::zero();
    for twice in (first..=last).step_by(2) {
        let x = HalfInteger::from_twice(twice);
        let product = &(&sixj([a, b, c, f, i, x])? * &sixj([d, e, f, b, x, h])?) * &sixj([g, h, i, x, a, d])?;
        let weight = if twice % 2 == 0 { twice + 1 } else { -(twice + 1) };
        sum += &product.scaled(&Rational::from(weight));
    }
    Ok(sum)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn six(twice: [i32; 6]) -> Surd {
        sixj(twice.map(HalfInteger::from_twice)).expect("valid arguments")
    }

    fn nine(whole: [[i32; 3]; 3]) -> String {
        ninej(whole.map(|row| row.map(HalfInteger::whole))).expect("valid arguments").to_string()
    }

    #[test]
    fn tabulated_six() {
        // Standard tables; the last two computed independently for this project with exact arithmetic.
        for (twice, text) in [
            ([2, 2, 2, 2, 2, 2], "1/6"),
            ([4, 4, 4, 4, 4, 4], "-3/70"),
            ([1, 2, 3, 2, 1, 2], "-1/6"),
            ([4, 4, 2, 2, 2, 2], "-1/10 sqrt(5)"),
            ([16, 16, 16, 16, 16, 16], "-12219/965770"),
            ([40, 40, 40, 40, 40, 40], "-33188637458619/6598917336119836"),
        ] {
            assert_eq!(six(twice).to_string(), text, "{twice:?}");
        }
        assert!(six([2, 2, 8, 2, 2, 2]).is_zero());
        assert!(sixj([1, 2, 2, 2, 2, 2].map(HalfInteger::from_twice)).is_err());
    }

    #[test]
    fn tabulated_nine() {
        // Computed independently for this project with exact arithmetic.
        assert_eq!(nine([[1, 1, 1], [1, 1, 1], [1, 1, 0]]), "1/18");
        assert_eq!(nine([[1, 1, 2], [1, 1, 2], [2, 2, 4]]), "1/25");
        assert_eq!(nine([[2, 2, 2], [2, 2, 2], [2, 2, 2]]), "41/2450");
        assert_eq!(nine([[1, 2, 3], [4, 5, 6], [3, 6, 9]]), "1/6370 sqrt(15)");
    }

    /// sum over x of (2x+1)(2y+1) {a b x; c d y} {a b x; c d y'} = delta(y, y').
    #[test]
    fn six_is_orthogonal() {
        let (a, b, c, d) = (3, 2, 5, 4);
        for y in [1, 3, 5, 7] {
            for z in [1, 3, 5, 7] {
                let mut sum = Surd::zero();
                for x in [1, 3, 5] {
                    let product = &six([a, b, x, c, d, y]) * &six([a, b, x, c, d, z]);
                    sum += &product.scaled(&Rational::from((x + 1) * (y + 1)));
                }
                let allowed = !six([a, b, 3, c, d, y]).is_zero()
                    || !six([a, b, 1, c, d, y]).is_zero()
                    || !six([a, b, 5, c, d, y]).is_zero();
                assert_eq!(sum, Surd::from(i64::from(y == z && allowed)), "{y} {z}");
            }
        }
    }
}
