//! Exact numbers: finite sums of Gaussian rationals times square roots of squarefree integers times whole powers of pi.
//!
//! The square roots of distinct squarefree integers n >= 1 are independent over Q(i), and the powers of pi over the algebraic numbers (pi is
//! transcendental, Lindemann 1882), so a number is zero exactly when its map of terms is empty. Powers of pi come with the delta function at the
//! nucleus: <1s|delta(r)|1s> is 1/pi.

use rug::{Integer, Rational, ops::NegAssign};
use std::cmp::Ordering;
use std::collections::BTreeMap;
use std::fmt;
use std::ops::{Add, AddAssign, Mul, Neg, Sub, SubAssign};

/// Largest number of terms for which an exact inverse is attempted; every further prime under a root doubles the work.
const INVERSE_TERMS: usize = 16;

/// Trial division goes up to this bound when a square root is made squarefree.
const TRIAL_BOUND: u32 = 1 << 16;

/// Bits that are read in trial divisions of one number before it is given up: up to the bound for radicands of about 10,000 digits.
const TRIAL_BITS: u64 = 1 << 30;

/// A finite sum of (a + b i) sqrt(n) pi^k with rational a, b, squarefree n and whole k.
#[derive(Clone, PartialEq, Eq, Debug, Default, Hash)]
pub struct Surd {
    terms: BTreeMap<Unit, GaussianRational>,
}

/// pi^power sqrt(radicand), the radicand squarefree.
#[derive(Clone, PartialEq, Eq, PartialOrd, Ord, Debug, Hash)]
pub struct Unit {
    pub pi_power: i32,
    pub radicand: Integer,
}

impl Unit {
    fn root(radicand: Integer) -> Self {
        Unit { pi_power: 0, radicand }
    }

    /// The product, as a whole number times a unit: sqrt(n) sqrt(m) = g sqrt(n m/g^2) with g = gcd(n, m).
    pub fn product(&self, other: &Unit) -> (Integer, Unit) {
        let common = Integer::from(self.radicand.gcd_ref(&other.radicand));
        let radicand = Integer::from(&self.radicand / &common) * Integer::from(&other.radicand / &common);
        let pi_power = self.pi_power.saturating_add(other.pi_power);
        (common, Unit { pi_power, radicand })
    }
}

/// a + b i with rational a and b.
#[derive(Clone, PartialEq, Eq, Debug, Default, Hash)]
pub struct GaussianRational {
    pub re: Rational,
    pub im: Rational,
}

impl GaussianRational {
    fn is_zero(&self) -> bool {
        self.re.cmp0() == Ordering::Equal && self.im.cmp0() == Ordering::Equal
    }

    fn times(&self, other: &Self) -> Self {
        if self.im.cmp0() == Ordering::Equal && other.im.cmp0() == Ordering::Equal {
            return GaussianRational { re: Rational::from(&self.re * &other.re), im: Rational::new() };
        }
        GaussianRational {
            re: Rational::from(&self.re * &other.re) - Rational::from(&self.im * &other.im),
            im: Rational::from(&self.re * &other.im) + Rational::from(&self.im * &other.re),
        }
    }
}

impl Surd {
    pub fn zero() -> Self {
        Self::default()
    }

    pub fn one() -> Self {
        Self::from(Rational::from(1))
    }

    /// The imaginary unit.
    pub fn i() -> Self {
        Self::gaussian(Rational::new(), Rational::from(1))
    }

    /// re + i im.
    pub fn gaussian(re: Rational, im: Rational) -> Self {
        let mut terms = BTreeMap::new();
        let value = GaussianRational { re, im };
        if !value.is_zero() {
            terms.insert(Unit::root(Integer::from(1)), value);
        }
        Surd { terms }
    }

    /// The number (a + b i) times a unit; the radicand of the unit must be squarefree.
    pub fn of_unit(unit: Unit, a: Rational, b: Rational) -> Self {
        let mut out = Self::zero();
        out.add_term(unit, GaussianRational { re: a, im: b });
        out
    }

    /// A whole power of pi.
    pub fn pi_to(pi_power: i32) -> Self {
        let one = GaussianRational { re: Rational::from(1), im: Rational::new() };
        Surd { terms: BTreeMap::from([(Unit { pi_power, radicand: Integer::from(1) }, one)]) }
    }

    /// Whether a power of pi stands in a term.
    pub fn has_pi(&self) -> bool {
        self.terms.keys().any(|unit| unit.pi_power != 0)
    }

    /// Whether it is a + b i with rational a and b: neither a square root nor pi in it.
    pub fn is_gaussian(&self) -> bool {
        self.terms.keys().all(|unit| unit.pi_power == 0 && unit.radicand == 1)
    }

    /// The square root of a rational; i times a root when it is negative.
    ///
    /// Errors: `None` when the radicand is too large to be shown squarefree by trial division.
    pub fn sqrt_of(q: &Rational) -> Option<Self> {
        if q.cmp0() == Ordering::Equal {
            return Some(Self::zero());
        }
        // Numerator and denominator have no common factor, so the product of their squarefree parts is squarefree.
        let (square_above, free_above) = squarefree_part(q.numer().clone().abs())?;
        let (square_below, free_below) = squarefree_part(q.denom().clone())?;
        let factor = Rational::from((square_above, square_below * &free_below));
        let free = free_above * free_below;
        let value = if q.cmp0() == Ordering::Less {
            GaussianRational { re: Rational::new(), im: factor }
        } else {
            GaussianRational { re: factor, im: Rational::new() }
        };
        Some(Surd { terms: BTreeMap::from([(Unit::root(free), value)]) })
    }

    /// A rational times the square root of an integer that is known to be squarefree and positive.
    pub(crate) fn with_squarefree_root(root: Integer, factor: Rational) -> Self {
        let mut terms = BTreeMap::new();
        if factor.cmp0() != Ordering::Equal {
            terms.insert(Unit::root(root), GaussianRational { re: factor, im: Rational::new() });
        }
        Surd { terms }
    }

    /// The square root of this number where it is a rational; otherwise `None`.
    pub fn sqrt(&self) -> Option<Self> {
        Self::sqrt_of(self.as_rational()?.as_ref())
    }

    pub fn is_zero(&self) -> bool {
        self.terms.is_empty()
    }

    pub fn is_one(&self) -> bool {
        self.as_rational().is_some_and(|q| *q == 1)
    }

    pub fn is_real(&self) -> bool {
        self.terms.values().all(|c| c.im.cmp0() == Ordering::Equal)
    }

    /// The rational this number is, if it is one.
    pub fn as_rational(&self) -> Option<std::borrow::Cow<'_, Rational>> {
        use std::borrow::Cow;
        match self.terms.len() {
            0 => Some(Cow::Owned(Rational::new())),
            1 => {
                let (unit, c) = self.terms.first_key_value()?;
                (unit.pi_power == 0 && unit.radicand == 1 && c.im.cmp0() == Ordering::Equal)
                    .then_some(Cow::Borrowed(&c.re))
            }
            _ => None,
        }
    }

    /// The terms in ascending order of the power of pi, then of the integer under the root.
    pub fn terms(&self) -> impl Iterator<Item = (&Unit, &GaussianRational)> {
        self.terms.iter()
    }

    pub fn term_count(&self) -> usize {
        self.terms.len()
    }

    /// The largest number of bits in any numerator, denominator or radicand: a measure of how long the number is.
    pub fn bits(&self) -> u32 {
        let rational_bits = |q: &Rational| q.numer().significant_bits().max(q.denom().significant_bits());
        self.terms
            .iter()
            .map(|(unit, c)| unit.radicand.significant_bits().max(rational_bits(&c.re)).max(rational_bits(&c.im)))
            .max()
            .unwrap_or(0)
    }

    pub fn conj(&self) -> Self {
        let mut out = self.clone();
        for c in out.terms.values_mut() {
            c.im.neg_assign();
        }
        out
    }

    pub fn re(&self) -> Self {
        self.part(|c| c.re.clone())
    }

    pub fn im(&self) -> Self {
        self.part(|c| c.im.clone())
    }

    fn part(&self, take: impl Fn(&GaussianRational) -> Rational) -> Self {
        let mut out = Self::zero();
        for (unit, c) in &self.terms {
            out.add_term(unit.clone(), GaussianRational { re: take(c), im: Rational::new() });
        }
        out
    }

    pub fn scaled(&self, q: &Rational) -> Self {
        if q.cmp0() == Ordering::Equal {
            return Self::zero();
        }
        let mut out = self.clone();
        for c in out.terms.values_mut() {
            c.re *= q;
            c.im *= q;
        }
        out
    }

    /// One over this number.
    ///
    /// Errors: `None` for zero, for numbers of more than 16 terms, and for sums with different powers of pi.
    /// Source: derived here: multiply by conjugates sqrt(p) -> -sqrt(p), one p after the other.
    pub fn inverse(&self) -> Option<Self> {
        if self.is_zero() || self.terms.len() > INVERSE_TERMS {
            return None;
        }
        let pi_power = self.terms.first_key_value()?.0.pi_power;
        if self.terms.keys().any(|unit| unit.pi_power != pi_power) {
            return None;
        }
        if pi_power != 0 {
            let inverse_power = Self::pi_to(pi_power.checked_neg()?);
            return Some(&(self * &inverse_power).inverse()? * &inverse_power);
        }
        let Some(split) = self.splitting_radicand() else {
            let c = self.terms.first_key_value()?.1;
            let norm = Rational::from(c.re.square_ref()) + Rational::from(c.im.square_ref());
            return Some(Self::gaussian(Rational::from(&c.re / &norm), -Rational::from(&c.im / &norm)));
        };
        let (mut with, mut without) = (Self::zero(), Self::zero());
        for (unit, c) in &self.terms {
            if unit.radicand.is_divisible(&split) {
                with.add_term(unit.clone(), c.clone());
            } else {
                without.add_term(unit.clone(), c.clone());
            }
        }
        let conjugate = &without - &with;
        let norm = &(&without * &without) - &(&with * &with);
        Some(&conjugate * &norm.inverse()?)
    }

    /// An integer p > 1 such that every radicand is a multiple of p or coprime to it; `None` when there is no radicand above 1.
    fn splitting_radicand(&self) -> Option<Integer> {
        let mut split = self.terms.keys().map(|unit| &unit.radicand).find(|n| **n != 1)?.clone();
        for n in self.terms.keys().map(|unit| &unit.radicand) {
            let common = Integer::from(n.gcd_ref(&split));
            if common != 1 {
                split = common;
            }
        }
        Some(split)
    }

    /// Integer power; `None` for a negative power of a number without an exact inverse.
    pub fn pow(&self, exponent: i32) -> Option<Self> {
        let base = if exponent < 0 { self.inverse()? } else { self.clone() };
        let mut result = Self::one();
        let mut square = base;
        let mut left = exponent.unsigned_abs();
        while left > 0 {
            if left & 1 == 1 {
                result = &result * &square;
            }
            left >>= 1;
            if left > 0 {
                square = &square * &square;
            }
        }
        Some(result)
    }

    fn add_term(&mut self, unit: Unit, c: GaussianRational) {
        use std::collections::btree_map::Entry;
        if c.is_zero() {
            return;
        }
        match self.terms.entry(unit) {
            Entry::Vacant(slot) => {
                slot.insert(c);
            }
            Entry::Occupied(mut slot) => {
                slot.get_mut().re += c.re;
                slot.get_mut().im += c.im;
                if slot.get().is_zero() {
                    slot.remove();
                }
            }
        }
    }
}

/// Writes n = s^2 f with f squarefree; `None` when trial division cannot certify f.
fn squarefree_part(mut n: Integer) -> Option<(Integer, Integer)> {
    let (mut square, mut free) = (Integer::from(1), Integer::from(1));
    let mut take = |n: &mut Integer, p: u32| {
        let count = n.remove_factor_mut(&Integer::from(p));
        square *= Integer::from(Integer::u_pow_u(p, count / 2));
        if count % 2 == 1 {
            free *= p;
        }
    };
    take(&mut n, 2);
    let mut p = 3;
    let mut bits_left = TRIAL_BITS;
    while p < TRIAL_BOUND && Integer::from(p) * p <= n {
        match bits_left.checked_sub(u64::from(n.significant_bits())) {
            Some(left) => bits_left = left,
            None => break,
        }
        if n.is_divisible_u(p) {
            take(&mut n, p);
        }
        p += 2;
    }
    if n.is_perfect_square() {
        square *= n.sqrt();
    } else if n < Integer::from(p).square() * p {
        // No factor below p and not a square: at most two distinct primes are left.
        free *= n;
    } else {
        return None;
    }
    Some((square, free))
}

impl From<Rational> for Surd {
    fn from(q: Rational) -> Self {
        Self::gaussian(q, Rational::new())
    }
}

impl From<i64> for Surd {
    fn from(n: i64) -> Self {
        Self::from(Rational::from(n))
    }
}

impl AddAssign<&Surd> for Surd {
    fn add_assign(&mut self, other: &Surd) {
        for (unit, c) in &other.terms {
            self.add_term(unit.clone(), c.clone());
        }
    }
}

impl SubAssign<&Surd> for Surd {
    fn sub_assign(&mut self, other: &Surd) {
        *self += &-other;
    }
}

impl Add for &Surd {
    type Output = Surd;
    fn add(self, other: &Surd) -> Surd {
        let mut out = self.clone();
        out += other;
        out
    }
}

impl Sub for &Surd {
    type Output = Surd;
    fn sub(self, other: &Surd) -> Surd {
        let mut out = self.clone();
        out -= other;
        out
    }
}

impl Neg for &Surd {
    type Output = Surd;
    fn neg(self) -> Surd {
        let mut out = self.clone();
        for c in out.terms.values_mut() {
            c.re.neg_assign();
            c.im.neg_assign();
        }
        out
    }
}

impl Mul for &Surd {
    type Output = Surd;
    fn mul(self, other: &Surd) -> Surd {
        let mut out = Surd::zero();
        for (n, a) in &self.terms {
            for (m, b) in &other.terms {
                let (g, unit) = n.product(m);
                let mut c = a.times(b);
                if g != 1 {
                    c.re *= &g;
                    c.im *= &g;
                }
                out.add_term(unit, c);
            }
        }
        out
    }
}

/// Writes a form the session language reads back: `9/2`, `-1/3 sqrt(2) + 2 i`, `(1/2 + 3 i) sqrt(5)` as separate terms.
impl fmt::Display for Surd {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if self.is_zero() {
            return write!(f, "0");
        }
        let mut first = true;
        for (Unit { pi_power, radicand }, c) in &self.terms {
            for (q, imaginary) in [(&c.re, false), (&c.im, true)] {
                if q.cmp0() == Ordering::Equal {
                    continue;
                }
                let negative = q.cmp0() == Ordering::Less;
                write!(f, "{}", ["", "-", " + ", " - "][usize::from(!first) * 2 + usize::from(negative)])?;
                first = false;
                let size = Rational::from(q.abs_ref());
                let mut factors: Vec<String> = Vec::new();
                if size != 1 || (*radicand == 1 && *pi_power == 0 && !imaginary) {
                    factors.push(size.to_string());
                }
                if *radicand != 1 {
                    factors.push(format!("sqrt({radicand})"));
                }
                match pi_power {
                    0 => {}
                    1 => factors.push("pi".into()),
                    power => factors.push(format!("pi^{power}")),
                }
                if imaginary {
                    factors.push("i".into());
                }
                write!(f, "{}", factors.join(" "))?;
            }
        }
        Ok(())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn root(n: i64, d: i64) -> Surd {
        Surd::sqrt_of(&Rational::from((n, d))).expect("small radicand")
    }

    #[test]
    fn square_roots_are_made_squarefree() {
        assert_eq!(root(8, 9).to_string(), "2/3 sqrt(2)");
        assert_eq!(root(-1, 4).to_string(), "1/2 i");
        assert_eq!(root(49, 1).to_string(), "7");
        assert_eq!(root(50, 12).to_string(), "5/6 sqrt(6)");
        assert_eq!((&root(6, 1) * &root(10, 1)).to_string(), "2 sqrt(15)");
    }

    #[test]
    fn differences_of_equal_numbers_are_zero() {
        let x = &root(2, 1) + &root(3, 1);
        let square = &x * &x;
        assert!((&square - &(&Surd::from(5) + &(&Surd::from(2) * &root(6, 1)))).is_zero());
    }

    #[test]
    fn inverse_of_a_sum_of_roots() {
        let x = &(&Surd::one() + &root(6, 1)) + &(&root(10, 1) + &Surd::i());
        let inverse = x.inverse().expect("nonzero");
        assert!((&x * &inverse).is_one());
    }

    #[test]
    fn a_radicand_that_cannot_be_factored_is_refused() {
        let p = (Integer::from(1) << 89u32) - 1u32;
        let q = (Integer::from(1) << 107u32) - 1u32;
        assert!(Surd::sqrt_of(&Rational::from(Integer::from(&p * &q))).is_none());
        assert_eq!(Surd::sqrt_of(&Rational::from(Integer::from(&p * &p))), Some(Surd::from(Rational::from(p.clone()))));
        // too long for trial division, and a smooth number of the same length
        let long = (Integer::from(1) << 400_001u32) + 1u32;
        assert!(Surd::sqrt_of(&Rational::from(long)).is_none());
        let smooth = Integer::from(15) << 400_000u32;
        assert_eq!(Surd::sqrt_of(&Rational::from(smooth)).map(|root| root.term_count()), Some(1));
    }
}
