//! Arithmetic modulo primes of 62 bits.

use rug::Integer;
use rug::integer::{IntegerExt64, IsPrime};

/// Where the search for primes begins.
const TOP: u64 = 1 << 62;

/// A prime p below 2^62 with p = 1 modulo 4, and its arithmetic.
///
/// The methods take and return residues from 0 to p - 1.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Prime {
    p: u64,
    /// -1/p modulo 2^64.
    minus_inverse: u64,
    /// 2^128 modulo p.
    radix_squared: u64,
}

impl Prime {
    /// Returns the primes p = 1 modulo 4 below 2^62, from the largest down.
    pub fn descending() -> impl Iterator<Item = Self> {
        (0..)
            .map(|k| TOP - 3 - 4 * k)
            .take_while(|&p| p > TOP / 2)
            .filter(|&p| Integer::from(p).is_probably_prime(30) != IsPrime::No)
            .map(Self::new)
    }

    fn new(p: u64) -> Self {
        // Newton's iteration for the inverse modulo 2^64 doubles the bits that hold.
        let mut inverse = p;
        for _ in 0..6 {
            inverse = inverse.wrapping_mul(2u64.wrapping_sub(p.wrapping_mul(inverse)));
        }
        let radix = (u128::from(u64::MAX) + 1) % u128::from(p);
        Self { p, minus_inverse: inverse.wrapping_neg(), radix_squared: (radix * radix % u128::from(p)) as u64 }
    }

    /// Returns p.
    pub fn value(&self) -> u64 {
        self.p
    }

    /// Returns the residue of an integer.
    pub fn from_i64(&self, value: i64) -> u64 {
        i128::from(value).rem_euclid(i128::from(self.p)) as u64
    }

    /// Returns the residue of an integer of any length.
    pub fn from_integer(&self, value: &Integer) -> u64 {
        value.mod_u64(self.p)
    }

    /// Returns a + b.
    pub fn add(&self, a: u64, b: u64) -> u64 {
        let sum = a + b;
        if sum >= self.p { sum - self.p } else { sum }
    }

    /// Returns a - b.
    pub fn subtract(&self, a: u64, b: u64) -> u64 {
        if a >= b { a - b } else { a + self.p - b }
    }

    /// Returns -a.
    pub fn negate(&self, a: u64) -> u64 {
        if a == 0 { 0 } else { self.p - a }
    }

    /// Returns a b.
    pub fn multiply(&self, a: u64, b: u64) -> u64 {
        (u128::from(a) * u128::from(b) % u128::from(self.p)) as u64
    }

    /// Returns a to a power.
    pub fn power(&self, a: u64, mut exponent: u64) -> u64 {
        let (mut base, mut result) = (a % self.p, 1);
        while exponent > 0 {
            if exponent & 1 == 1 {
                result = self.multiply(result, base);
            }
            base = self.multiply(base, base);
            exponent >>= 1;
        }
        result
    }

    /// Returns 1/a; `None` for zero.
    pub fn inverse(&self, a: u64) -> Option<u64> {
        let residue = a % self.p;
        (residue != 0).then(|| self.power(residue, self.p - 2))
    }

    /// Returns the smaller square root of a; `None` where there is none.
    ///
    /// *Source*: the algorithm of Tonelli and Shanks, as in H. Cohen, A Course in Computational Algebraic Number
    /// Theory, 1.5.1.
    pub fn sqrt(&self, a: u64) -> Option<u64> {
        let a = a % self.p;
        if a == 0 {
            return Some(0);
        }
        if self.power(a, (self.p - 1) / 2) != 1 {
            return None;
        }
        let twos = (self.p - 1).trailing_zeros();
        let odd = (self.p - 1) >> twos;
        let other = (2..self.p).find(|&n| self.power(n, (self.p - 1) / 2) == self.p - 1)?;
        let mut generator = self.power(other, odd);
        let mut root = self.power(a, odd.div_ceil(2));
        let mut rest = self.power(a, odd);
        let mut order = twos;
        while rest != 1 {
            let mut steps = 0;
            let mut square = rest;
            while square != 1 {
                square = self.multiply(square, square);
                steps += 1;
            }
            let mut factor = generator;
            for _ in 0..order - steps - 1 {
                factor = self.multiply(factor, factor);
            }
            generator = self.multiply(factor, factor);
            root = self.multiply(root, factor);
            rest = self.multiply(rest, generator);
            order = steps;
        }
        Some(root.min(self.p - root))
    }

    /// Returns a 2^64 modulo p: the form in which [`Prime::product`] multiplies.
    pub(super) fn enter(&self, a: u64) -> u64 {
        self.product(a % self.p, self.radix_squared)
    }

    /// Returns a b / 2^64 modulo p. *Source*: P. L. Montgomery, Math. Comp. 44 (1985) 519.
    #[inline]
    pub(super) fn product(&self, a: u64, b: u64) -> u64 {
        let product = u128::from(a) * u128::from(b);
        let multiple = (product as u64).wrapping_mul(self.minus_inverse);
        // Both terms are below 2^126, so the sum fits.
        let reduced = ((product + u128::from(multiple) * u128::from(self.p)) >> 64) as u64;
        if reduced >= self.p { reduced - self.p } else { reduced }
    }

    /// Returns the inverse of a number in the form of [`Prime::enter`], in the same form; the number is not zero.
    pub(super) fn inverse_entered(&self, a: u64) -> u64 {
        let (mut base, mut result, mut exponent) = (a, self.enter(1), self.p - 2);
        while exponent > 0 {
            if exponent & 1 == 1 {
                result = self.product(result, base);
            }
            base = self.product(base, base);
            exponent >>= 1;
        }
        result
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn primes_are_one_modulo_four() {
        for prime in Prime::descending().take(20) {
            assert_eq!(prime.value() % 4, 1);
            let i = prime.sqrt(prime.from_i64(-1)).expect("-1 is a square");
            assert_eq!(prime.multiply(i, i), prime.value() - 1);
        }
    }

    #[test]
    fn both_forms_multiply_alike() {
        let prime = Prime::descending().next().expect("a prime");
        let mut a = 0x1234_5678_9ABC_DEF0 % prime.value();
        for _ in 0..1000 {
            let b = prime.multiply(a, a ^ 0x5555);
            let entered = prime.product(prime.enter(a), prime.enter((a ^ 0x5555) % prime.value()));
            assert_eq!(prime.product(entered, 1), b);
            assert_eq!(prime.multiply(a, prime.inverse(a).expect("not zero")), 1);
            a = prime.add(b, 3);
        }
    }

    #[test]
    fn integers_of_any_length_reduce() {
        let prime = Prime::descending().nth(2).expect("a prime");
        let long = Integer::from(-12345) * Integer::from(prime.value()).pow(5u32) - 17;
        assert_eq!(prime.from_integer(&long), prime.from_i64(-17));
    }

    use rug::ops::Pow;
}
