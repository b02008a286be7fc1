//! Products and quotients of factorials as exponents of primes, so that their square roots need no factoring.

use crate::num::Surd;
use rug::{Integer, Rational, ops::Pow};

/// A product of factorials to integer powers.
#[derive(Clone, Debug, Default)]
pub(crate) struct FactorialProduct {
    /// Exponent with which k! enters, at index k.
    powers: Vec<i64>,
}

impl FactorialProduct {
    pub(crate) fn new() -> Self {
        Self::default()
    }

    /// Multiplies by (k!)^power.
    pub(crate) fn times(&mut self, k: i32, power: i64) {
        let index = usize::try_from(k).unwrap_or(0);
        if self.powers.len() <= index {
            self.powers.resize(index + 1, 0);
        }
        self.powers[index] += power;
    }

    /// The square root of the product.
    ///
    /// Source: derived here: k! holds the integer m for every m <= k, so m enters with the sum of the powers of all k >= m.
    pub(crate) fn square_root(&self) -> Surd {
        let (mut up, mut down, mut free) = (Integer::from(1), Integer::from(1), Integer::from(1));
        for (prime, exponent) in self.prime_exponents() {
            let half = exponent.div_euclid(2);
            let power = Integer::from(prime).pow(u32::try_from(half.unsigned_abs()).unwrap_or(u32::MAX));
            if half >= 0 {
                up *= power;
            } else {
                down *= power;
            }
            if exponent.rem_euclid(2) == 1 {
                free *= prime;
            }
        }
        let root = Surd::sqrt_of(&Rational::from(free)).unwrap_or_default();
        root.scaled(&Rational::from((up, down)))
    }

    fn prime_exponents(&self) -> Vec<(u32, i64)> {
        let largest = self.powers.len().saturating_sub(1);
        // exponent with which the integer m enters
        let mut of_integer = vec![0_i64; largest + 2];
        for m in (2..=largest).rev() {
            of_integer[m] = of_integer[m + 1] + self.powers[m];
        }
        let mut composite = vec![false; largest + 1];
        let mut out = Vec::new();
        for p in 2..=largest {
            if composite[p] {
                continue;
            }
            let mut exponent = 0;
            for multiple in (p..=largest).step_by(p) {
                composite[multiple] = multiple != p || composite[multiple];
                let mut left = multiple;
                while left % p == 0 {
                    exponent += of_integer[multiple];
                    left /= p;
                }
            }
            if exponent != 0 {
                out.push((u32::try_from(p).unwrap_or(u32::MAX), exponent));
            }
        }
        out
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn roots_of_factorials() {
        let mut product = FactorialProduct::new();
        product.times(6, 1);
        product.times(4, -1);
        // 6!/4! = 30
        assert_eq!(product.square_root().to_string(), "sqrt(30)");
        product.times(3, 1);
        product.times(2, -3);
        // 30 * 6 / 8 = 45/2
        assert_eq!(product.square_root().to_string(), "3/2 sqrt(10)");
    }

    #[test]
    fn empty_product_is_one() {
        assert!(FactorialProduct::new().square_root().is_one());
    }
}
