//! Polynomials in r and 1/r with rational coefficients.

use rug::Rational;
use std::cmp::Ordering;

/// sum over i of `coefficients[i] r^(lowest + i)`; first and last coefficient are not zero.
#[derive(Clone, PartialEq, Eq, Debug, Default)]
pub(super) struct Laurent {
    lowest: i64,
    coefficients: Vec<Rational>,
}

impl Laurent {
    pub(super) fn new(lowest: i64, coefficients: Vec<Rational>) -> Self {
        let mut out = Laurent { lowest, coefficients };
        out.trim();
        out
    }

    pub(super) fn is_zero(&self) -> bool {
        self.coefficients.is_empty()
    }

    /// The lowest power that occurs; zero for the zero polynomial.
    pub(super) fn lowest(&self) -> i64 {
        self.lowest
    }

    /// The highest power that occurs; below the lowest for the zero polynomial.
    pub(super) fn highest(&self) -> i64 {
        self.lowest + to_power(self.coefficients.len()) - 1
    }

    pub(super) fn coefficient(&self, power: i64) -> Option<&Rational> {
        usize::try_from(power - self.lowest).ok().and_then(|i| self.coefficients.get(i))
    }

    /// Powers with their coefficients, ascending.
    pub(super) fn iter(&self) -> impl DoubleEndedIterator<Item = (i64, &Rational)> {
        self.coefficients.iter().enumerate().map(|(i, c)| (self.lowest + to_power(i), c))
    }

    pub(super) fn scaled(&self, factor: &Rational) -> Self {
        if factor.cmp0() == Ordering::Equal {
            return Self::default();
        }
        let coefficients = self.coefficients.iter().map(|c| Rational::from(c * factor)).collect();
        Laurent { lowest: self.lowest, coefficients }
    }

    pub(super) fn times_power(&self, s: i64) -> Self {
        if self.is_zero() {
            return Self::default();
        }
        Laurent { lowest: self.lowest + s, coefficients: self.coefficients.clone() }
    }

    /// Adds factor times another polynomial.
    pub(super) fn add_scaled(&mut self, factor: &Rational, other: &Laurent) {
        if other.is_zero() || factor.cmp0() == Ordering::Equal {
            return;
        }
        if self.is_zero() {
            *self = other.scaled(factor);
            return;
        }
        let lowest = self.lowest.min(other.lowest);
        let highest = self.highest().max(other.highest());
        let below = usize::try_from(self.lowest - lowest).unwrap_or(0);
        drop(self.coefficients.splice(0..0, std::iter::repeat_with(Rational::new).take(below)));
        self.lowest = lowest;
        self.coefficients.resize(usize::try_from(highest - lowest + 1).unwrap_or(0), Rational::new());
        let shift = usize::try_from(other.lowest - lowest).unwrap_or(0);
        for (slot, c) in self.coefficients[shift..].iter_mut().zip(&other.coefficients) {
            *slot += Rational::from(c * factor);
        }
        self.trim();
    }

    pub(super) fn product(&self, other: &Laurent) -> Self {
        if self.is_zero() || other.is_zero() {
            return Self::default();
        }
        let mut coefficients = vec![Rational::new(); self.coefficients.len() + other.coefficients.len() - 1];
        for (i, a) in self.coefficients.iter().enumerate() {
            for (slot, b) in coefficients[i..].iter_mut().zip(&other.coefficients) {
                *slot += Rational::from(a * b);
            }
        }
        Self::new(self.lowest + other.lowest, coefficients)
    }

    /// Sends r^j to the sum of the listed multiples of r^(j + shift).
    pub(super) fn map_powers<const N: usize>(&self, rule: impl Fn(i64) -> [(i64, Rational); N]) -> Self {
        let mut out = Laurent::default();
        let mut sums: std::collections::BTreeMap<i64, Rational> = std::collections::BTreeMap::new();
        for (j, c) in self.iter() {
            for (shift, factor) in rule(j) {
                *sums.entry(j + shift).or_default() += factor * c;
            }
        }
        if let Some((&first, _)) = sums.first_key_value() {
            let last = sums.last_key_value().map_or(first, |(&k, _)| k);
            out = Laurent::new(first, (first..=last).map(|k| sums.remove(&k).unwrap_or_default()).collect());
        }
        out
    }

    /// The integral over r of this polynomial times e^(-k r), from the terms with a power that is not negative.
    pub(super) fn integral(&self, k: &Rational) -> Rational {
        // c_0 + (1/k) (c_1 + (2/k) (c_2 + ...)), all over k
        let mut sum = Rational::new();
        for power in (0..=self.highest()).rev() {
            sum *= power + 1;
            sum /= k;
            if let Some(c) = self.coefficient(power) {
                sum += c;
            }
        }
        sum / k
    }

    /// The coefficient of r^power in this polynomial times e^(-k r).
    pub(super) fn expansion_coefficient(&self, k: &Rational, power: i64) -> Rational {
        // sum over j <= power of c_j (-k)^(power - j)/(power - j)!
        let mut sum = Rational::new();
        for j in self.lowest..=power.min(self.highest()) {
            // Horner from the lowest power up: each step divides by the number of steps left
            if let Some(c) = self.coefficient(j) {
                sum += c;
            }
            if j < power {
                sum *= Rational::from(-k);
                sum /= power - j;
            }
        }
        for j in self.highest() + 1..power {
            sum *= Rational::from(-k);
            sum /= power - j;
        }
        sum
    }

    fn trim(&mut self) {
        let zero = |c: &Rational| c.cmp0() == Ordering::Equal;
        while self.coefficients.last().is_some_and(zero) {
            self.coefficients.pop();
        }
        let leading = self.coefficients.iter().take_while(|c| zero(c)).count();
        if leading > 0 {
            self.coefficients.drain(..leading);
            self.lowest += to_power(leading);
        }
        if self.coefficients.is_empty() {
            self.lowest = 0;
        }
    }
}

/// A length as a power; lengths here are at most some thousands.
pub(super) fn to_power(i: usize) -> i64 {
    i64::try_from(i).unwrap_or(i64::MAX / 4)
}
