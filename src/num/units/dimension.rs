//! What a quantity is a quantity of: powers of kilogram, metre, second and ampere.

use rug::Rational;
use std::cmp::Ordering;
use std::fmt;

/// The powers of kilogram, metre, second and ampere in a quantity. Roots make fractions of them.
#[derive(Clone, PartialEq, Eq, PartialOrd, Ord, Hash, Debug, Default)]
pub struct Dimension {
    exponents: [Rational; 4],
}

/// Quantities that have a name of their own: powers of kg, m, s, A; in words; their atomic unit.
const NAMED: [([i32; 4], &str, &str); 21] = [
    ([0, 0, 0, 0], "a plain number", ""),
    ([1, 2, -2, 0], "an energy", "hartree"),
    ([0, 1, 0, 0], "a length", "bohr"),
    ([0, 2, 0, 0], "an area", "bohr^2"),
    ([0, 3, 0, 0], "a volume", "bohr^3"),
    ([0, -1, 0, 0], "an inverse length", "bohr^-1"),
    ([0, 0, 1, 0], "a time", "hbar/hartree"),
    ([0, 0, -1, 0], "an inverse time", "hartree/hbar"),
    ([0, 1, -1, 0], "a velocity", "bohr hartree/hbar"),
    ([1, 0, 0, 0], "a mass", "m_e"),
    ([1, 2, -1, 0], "an action", "hbar"),
    ([1, 1, -1, 0], "a momentum", "hbar/bohr"),
    ([0, 0, 1, 1], "an electric charge", "e"),
    ([0, 1, 1, 1], "an electric dipole moment", "e bohr"),
    ([0, 2, 1, 1], "an electric quadrupole moment", "e bohr^2"),
    ([1, 1, -3, -1], "an electric field", "hartree/(e bohr)"),
    ([1, 2, -3, -1], "a voltage", "hartree/e"),
    ([-1, 0, 4, 2], "a polarizability", "e^2 bohr^2/hartree"),
    ([1, 0, -3, 0], "an intensity", "hartree^2/(hbar bohr^2)"),
    ([1, 0, -2, -1], "a magnetic field", "hbar/(e bohr^2)"),
    ([0, 2, 0, 1], "a magnetic moment", "e hbar/m_e"),
];

impl Dimension {
    /// From whole powers of kg, m, s and A.
    pub fn new(exponents: [i32; 4]) -> Self {
        Dimension { exponents: exponents.map(Rational::from) }
    }

    /// Of a plain number.
    pub fn none() -> Self {
        Self::default()
    }

    pub fn energy() -> Self {
        Self::new([1, 2, -2, 0])
    }

    pub fn length() -> Self {
        Self::new([0, 1, 0, 0])
    }

    pub fn inverse_length() -> Self {
        Self::new([0, -1, 0, 0])
    }

    pub fn mass() -> Self {
        Self::new([1, 0, 0, 0])
    }

    pub fn is_none(&self) -> bool {
        self.exponents.iter().all(|exponent| exponent.cmp0() == Ordering::Equal)
    }

    /// Of a product.
    pub fn times(&self, other: &Self) -> Self {
        let mut exponents = self.exponents.clone();
        exponents.iter_mut().zip(&other.exponents).for_each(|(a, b)| *a += b);
        Dimension { exponents }
    }

    /// Of a power; 1/2 for a square root.
    pub fn power(&self, exponent: &Rational) -> Self {
        let mut exponents = self.exponents.clone();
        exponents.iter_mut().for_each(|a| *a *= exponent);
        Dimension { exponents }
    }

    pub fn inverse(&self) -> Self {
        self.power(&Rational::from(-1))
    }

    /// The powers where all of them are whole.
    pub fn whole(&self) -> Option<[i32; 4]> {
        let mut whole = [0; 4];
        for (slot, exponent) in whole.iter_mut().zip(&self.exponents) {
            if !exponent.is_integer() {
                return None;
            }
            *slot = exponent.numer().to_i32()?;
        }
        Some(whole)
    }

    fn named(&self) -> Option<(&'static str, &'static str)> {
        let whole = self.whole()?;
        NAMED.iter().find(|(exponents, ..)| *exponents == whole).map(|(_, words, unit)| (*words, *unit))
    }

    /// The quantity in words with its article: `an energy`.
    pub fn words(&self) -> String {
        match self.named() {
            Some((words, _)) => words.to_string(),
            None => format!("a quantity in {}", powers(["kg", "m", "s", "A"], &self.exponents)),
        }
    }

    /// The atomic unit of the quantity as an expression of unit words; empty for a plain number.
    pub fn atomic_unit(&self) -> String {
        if let Some((_, unit)) = self.named() {
            return unit.to_string();
        }
        let [mass, length, time, current] = &self.exponents;
        let hartree = Rational::from(current - time);
        let hbar = Rational::from(-&hartree);
        powers(["m_e", "bohr", "hartree", "hbar", "e"], &[mass.clone(), length.clone(), hartree, hbar, current.clone()])
    }
}

impl fmt::Display for Dimension {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.words())
    }
}

/// A product of powers as text.
fn powers<const N: usize>(bases: [&str; N], exponents: &[Rational; N]) -> String {
    let factors = bases.iter().zip(exponents).filter(|(_, exponent)| exponent.cmp0() != Ordering::Equal);
    let written: Vec<String> = factors
        .map(|(base, exponent)| match exponent {
            one if *one == 1 => (*base).to_string(),
            whole if whole.is_integer() => format!("{base}^{whole}"),
            fraction => format!("{base}^({fraction})"),
        })
        .collect();
    written.join(" ")
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::num::units::{ConstantSet, Unit};

    #[test]
    fn quantities_have_names() {
        let field = Dimension::new([1, 1, -3, -1]);
        assert_eq!(field.words(), "an electric field");
        assert_eq!(field.times(&Dimension::new([0, 1, 1, 1])).words(), "an energy");
        assert_eq!(Dimension::energy().power(&Rational::from((1, 2))).words(), "a quantity in kg^(1/2) m s^-1");
        assert_eq!(Dimension::new([0, 1, -2, 0]).words(), "a quantity in m s^-2");
        assert_eq!(Dimension::new([0, 1, -2, 0]).atomic_unit(), "bohr hartree^2 hbar^-2");
    }

    /// What is told as the atomic unit is one, of this dimension.
    #[test]
    fn atomic_units_are_atomic_units() {
        for (exponents, ..) in NAMED.iter().skip(1) {
            let dimension = Dimension::new(*exponents);
            let unit = Unit::parse(&dimension.atomic_unit()).expect("a unit");
            assert_eq!(*unit.dimension(), dimension, "{}", unit.text());
            assert!(unit.factor().is_one(), "{}", unit.text());
        }
        assert_eq!(ConstantSet::default(), ConstantSet::Codata2022);
    }
}
