//! Products and quotients of factorials as exponents of primes, so that their square roots need no factoring.

use super::half_integer::LARGEST_J;
use crate::num::Surd;
use rug::{Integer, Rational};
use std::sync::OnceLock;

/// Factorials up to this number have their exponents in a table.
const TABLE_END: usize = 256;

/// Primes below [`TABLE_END`].
const TABLE_PRIMES: usize = 54;

/// Exponents of the first primes in k!, by k.
type Table = Vec<[i16; TABLE_PRIMES]>;

/// All primes that can occur in a symbol of acceptable size, ascending.
fn primes() -> &'static [u32] {
    static PRIMES: OnceLock<Vec<u32>> = OnceLock::new();
    PRIMES.get_or_init(|| {
        let end = 4 * usize::try_from(LARGEST_J).unwrap_or(0) + 2;
        let mut composite = vec![false; end + 1];
        let mut out = Vec::new();
        for p in 2..=end {
            if !composite[p] {
                out.push(u32::try_from(p).unwrap_or(u32::MAX));
                (p * p..=end).step_by(p).for_each(|multiple| composite[multiple] = true);
            }
        }
        out
    })
}

fn table() -> &'static Table {
    static TABLE: OnceLock<Table> = OnceLock::new();
    TABLE.get_or_init(|| {
        let exponents = |k: usize| {
            let mut row = [0; TABLE_PRIMES];
            for (slot, p) in row.iter_mut().zip(primes()) {
                *slot = i16::try_from(exponent_in_factorial(u32::try_from(k).unwrap_or(0), *p)).unwrap_or(0);
            }
            row
        };
        (0..TABLE_END).map(exponents).collect()
    })
}

/// The exponent of a prime in k!.
///
/// Source: Legendre's formula.
fn exponent_in_factorial(k: u32, p: u32) -> i32 {
    let (mut left, mut sum) = (k, 0);
    while left > 0 {
        left /= p;
        sum += left;
    }
    i32::try_from(sum).unwrap_or(i32::MAX)
}

/// Powers of the first primes, in order.
#[derive(Clone, PartialEq, Eq, Debug, Default)]
pub(crate) struct PrimePowers {
    exponents: Vec<i32>,
}

impl PrimePowers {
    /// Exponents of all primes up to a number.
    pub(crate) fn up_to(largest: i32) -> Self {
        let largest = u32::try_from(largest).unwrap_or(0);
        let count = primes().partition_point(|p| *p <= largest);
        PrimePowers { exponents: vec![0; count] }
    }

    /// Multiplies by (k!)^power; k is at most the number the powers go up to.
    pub(crate) fn times_factorial(&mut self, k: i32, power: i32) {
        let k = u32::try_from(k).unwrap_or(0);
        debug_assert!(
            primes().get(self.exponents.len()).is_none_or(|next| *next > k),
            "{k}! has primes beyond the powers"
        );
        if let (Some(row), true) = (table().get(k as usize), self.exponents.len() <= TABLE_PRIMES) {
            for (exponent, own) in self.exponents.iter_mut().zip(row) {
                *exponent += power * i32::from(*own);
            }
            return;
        }
        for (exponent, p) in self.exponents.iter_mut().zip(primes()) {
            if *p > k {
                break;
            }
            *exponent += power * exponent_in_factorial(k, *p);
        }
    }

    /// Multiplies by another product to a power.
    pub(crate) fn times(&mut self, other: &PrimePowers, power: i32) {
        for (exponent, own) in self.exponents.iter_mut().zip(&other.exponents) {
            *exponent += power * own;
        }
    }

    /// Lowers every exponent to that of another product where it is smaller.
    pub(crate) fn lower_to(&mut self, other: &PrimePowers) {
        for (exponent, own) in self.exponents.iter_mut().zip(&other.exponents) {
            *exponent = (*exponent).min(*own);
        }
    }

    /// The quotient by another product, where it is whole.
    pub(crate) fn whole_quotient(&self, divisor: &PrimePowers) -> Integer {
        let mut product = Product::default();
        for ((exponent, own), p) in self.exponents.iter().zip(&divisor.exponents).zip(primes()) {
            product.times_power(*p, (exponent - own).unsigned_abs());
        }
        product.value()
    }

    /// A whole number times the square root of the product.
    pub(crate) fn square_root_times(&self, multiple: Integer) -> Surd {
        let (mut up, mut down, mut free) = (Product::default(), Product::default(), Product::default());
        for (exponent, p) in self.exponents.iter().zip(primes()) {
            let half = exponent.div_euclid(2);
            let part = if half >= 0 { &mut up } else { &mut down };
            part.times_power(*p, half.unsigned_abs());
            if exponent.rem_euclid(2) == 1 {
                free.times_power(*p, 1);
            }
        }
        let factor = Rational::from((multiple * up.value(), down.value()));
        Surd::with_squarefree_root(free.value(), factor)
    }
}

/// A product that stays in one machine word as long as it can.
struct Product {
    small: u64,
    large: Option<Integer>,
}

impl Default for Product {
    fn default() -> Self {
        Product { small: 1, large: None }
    }
}

impl Product {
    fn times_power(&mut self, base: u32, power: u32) {
        for _ in 0..power {
            match self.small.checked_mul(u64::from(base)) {
                Some(product) => self.small = product,
                None => {
                    self.large = Some(self.large.take().map_or_else(|| Integer::from(self.small), |l| l * self.small));
                    self.small = u64::from(base);
                }
            }
        }
    }

    fn value(self) -> Integer {
        match self.large {
            Some(large) => large * self.small,
            None => Integer::from(self.small),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn roots_of_factorials() {
        let mut product = PrimePowers::up_to(6);
        product.times_factorial(6, 1);
        product.times_factorial(4, -1);
        // 6!/4! = 30
        assert_eq!(product.square_root_times(Integer::from(1)).to_string(), "sqrt(30)");
        product.times_factorial(3, 1);
        product.times_factorial(2, -3);
        // 30 * 6 / 8 = 45/2
        assert_eq!(product.square_root_times(Integer::from(2)).to_string(), "3 sqrt(10)");
    }

    #[test]
    fn empty_product_is_one() {
        assert!(PrimePowers::up_to(0).square_root_times(Integer::from(1)).is_one());
    }

    #[test]
    fn table_and_formula_agree() {
        for k in [2, 3, 100, 251, 255, 256, 257, 1000] {
            // beyond the table's primes the formula is used for every k
            let (mut near, mut far) = (PrimePowers::up_to(k), PrimePowers::up_to(5000));
            near.times_factorial(k, 1);
            far.times_factorial(k, 1);
            let value = near.whole_quotient(&PrimePowers::up_to(k));
            assert_eq!(value, Integer::from(Integer::factorial(u32::try_from(k).expect("small"))));
            assert_eq!(far.whole_quotient(&PrimePowers::up_to(5000)), value);
        }
    }
}
