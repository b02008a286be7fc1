//! 6j and 9j symbols, exactly.

use super::binomials::four_product_sum;
use super::factorials::PrimePowers;
use super::half_integer::{AngularError, HalfInteger};
use super::wigner::triangle;
use crate::num::Surd;
use rug::Integer;

/// Longest 9j sum done exactly, in terms of the three sums inside.
const LONGEST_NINEJ: u64 = 2_000_000;

/// The 6j symbol {j1 j2 j3; j4 j5 j6}.
///
/// Zero where a triangle (1 2 3), (1 5 6), (4 2 6) or (4 5 3) does not close.
/// Errors: an angular momentum that is negative or too large, a triangle whose sum is not whole.
/// Cost: a sum of at most 2 j + 1 products of four binomials.
/// Source: Racah (Edmonds, eq. 6.3.7), rewritten here in binomials.
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
    let racah = RacahSum::of(j.map(HalfInteger::twice));
    if racah.sum == 0 {
        return Ok(Surd::zero());
    }
    let mut square = PrimePowers::up_to(racah.largest + 1);
    for triad in triads {
        times_triangle(&mut square, triad.map(HalfInteger::twice), 1);
    }
    racah.times_prefactor(&mut square, 2);
    Ok(square.square_root_times(racah.sum))
}

/// The sum in a 6j symbol with its triangles closed, up to the triangle coefficients.
struct RacahSum {
    sum: Integer,
    /// (largest + 1)! / prod (bounds)! multiplies the sum.
    largest: i32,
    bounds: [i32; 3],
}

impl RacahSum {
    /// From the doubled angular momenta.
    fn of([j1, j2, j3, j4, j5, j6]: [i32; 6]) -> Self {
        let mut lower = [(j1 + j2 + j3) / 2, (j1 + j5 + j6) / 2, (j4 + j2 + j6) / 2, (j4 + j5 + j3) / 2];
        let upper = [(j1 + j2 + j4 + j5) / 2, (j2 + j3 + j5 + j6) / 2, (j3 + j1 + j6 + j4) / 2];
        lower.sort_unstable_by(|a, b| b.cmp(a));
        let bounds = [upper[0] - lower[1], upper[1] - lower[2], upper[2] - lower[3]];
        RacahSum { sum: four_product_sum(&lower, &upper), largest: lower[0], bounds }
    }

    fn times_prefactor(&self, powers: &mut PrimePowers, power: i32) {
        powers.times_factorial(self.largest + 1, power);
        for bound in self.bounds {
            powers.times_factorial(bound, -power);
        }
    }
}

/// Multiplies by a power of Delta^2 = (a+b-c)! (a-b+c)! (-a+b+c)! / (a+b+c+1)! of doubled angular momenta.
fn times_triangle(powers: &mut PrimePowers, [a, b, c]: [i32; 3], power: i32) {
    for k in [(a + b - c) / 2, (a - b + c) / 2, (-a + b + c) / 2] {
        powers.times_factorial(k, power);
    }
    powers.times_factorial((a + b + c) / 2 + 1, -power);
}

/// The 9j symbol, rows one after the other.
///
/// Zero where a row or a column does not close a triangle.
/// Errors: as for [`sixj`]; `TooLong` for angular momenta beyond some seven hundred.
/// Cost: a sum of at most 2 j + 1 products of three 6j sums; roots are taken once.
/// Source: Edmonds, eq. 6.4.3.
pub fn ninej(j: [[HalfInteger; 3]; 3]) -> Result<Surd, AngularError> {
    let mut closes = true;
    let columns: [[HalfInteger; 3]; 3] = std::array::from_fn(|i| j.map(|row| row[i]));
    for [a, b, c] in j.into_iter().chain(columns) {
        closes &= triangle(a, b, c)?;
    }
    if !closes {
        return Ok(Surd::zero());
    }
    let [[a, b, c], [d, e, f], [g, h, i]] = j.map(|row| row.map(HalfInteger::twice));
    let pairs = [(a, i), (d, h), (b, f)];
    let first = pairs.iter().map(|(x, y)| (x - y).abs()).max().unwrap_or(0);
    let last = pairs.iter().map(|(x, y)| x + y).min().unwrap_or(-1);
    let longest = j.iter().flatten().map(|x| x.twice()).max().unwrap_or(0);
    let terms = u64::try_from((last - first) / 2 + 1).unwrap_or(0) * u64::try_from(longest + 1).unwrap_or(0);
    if terms > LONGEST_NINEJ {
        return Err(AngularError::TooLong { terms, limit: LONGEST_NINEJ });
    }
    // x is at most the sum of two of the nine
    let largest = 2 * longest + 1;
    // every triangle with x occurs in two of the three 6j symbols, so only the other six are under the root
    let mut summands: Vec<(PrimePowers, Integer)> = Vec::new();
    for x in (first..=last).step_by(2) {
        let symbols = [[a, b, c, f, i, x], [d, e, f, b, x, h], [g, h, i, x, a, d]].map(RacahSum::of);
        let mut product = Integer::from(if x % 2 == 0 { x + 1 } else { -(x + 1) });
        let mut powers = PrimePowers::up_to(largest);
        for symbol in &symbols {
            product *= &symbol.sum;
            symbol.times_prefactor(&mut powers, 1);
        }
        if product == 0 {
            continue;
        }
        for (y, z) in pairs {
            times_triangle(&mut powers, [y, z, x], 1);
        }
        summands.push((powers, product));
    }
    let Some((first_powers, _)) = summands.first() else { return Ok(Surd::zero()) };
    let mut common = first_powers.clone();
    for (powers, _) in &summands {
        common.lower_to(powers);
    }
    let mut sum = Integer::new();
    for (powers, product) in &summands {
        sum += powers.whole_quotient(&common) * product;
    }
    if sum == 0 {
        return Ok(Surd::zero());
    }
    let mut square = PrimePowers::up_to(largest);
    for triad in [[a, b, c], [d, e, f], [g, h, i], [a, d, g], [b, e, h], [c, f, i]] {
        times_triangle(&mut square, triad, 1);
    }
    square.times(&common, 2);
    Ok(square.square_root_times(sum))
}

#[cfg(test)]
mod tests {
    use super::*;
    use rug::Rational;

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
