//! A number of atomic units as an exact number times powers of the measured constants.

use crate::num::Surd;
use rug::Rational;
use rug::ops::Pow;

/// An exact constant of the SI: mantissa and power of ten.
pub type ExactConstant = (u64, i32);

/// The Planck constant in J s. Source: SI Brochure (2019), exact.
pub const PLANCK: ExactConstant = (662_607_015, -42);
/// The speed of light in m/s. Source: SI Brochure (2019), exact.
pub const SPEED_OF_LIGHT: ExactConstant = (299_792_458, 0);
/// The elementary charge in C. Source: SI Brochure (2019), exact.
pub const ELEMENTARY_CHARGE: ExactConstant = (1_602_176_634, -28);
/// The Boltzmann constant in J/K. Source: SI Brochure (2019), exact.
pub const BOLTZMANN: ExactConstant = (1_380_649, -29);

/// rational pi^pi alpha^alpha R^rydberg A^electron_mass, with the fine structure constant alpha, the number R of the Rydberg constant in 1/m, and
/// the electron's relative atomic mass A.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct AtomicFactor {
    pub rational: Rational,
    pub pi: i32,
    pub alpha: i32,
    pub rydberg: i32,
    pub electron_mass: i32,
}

/// 10^power.
pub(super) fn ten_to(power: i32) -> Rational {
    Rational::from(10).pow(power)
}

/// An exact constant as a rational.
pub(super) fn exact((mantissa, power): ExactConstant) -> Rational {
    Rational::from(mantissa) * ten_to(power)
}

impl AtomicFactor {
    pub fn rational(rational: Rational) -> Self {
        AtomicFactor { rational, pi: 0, alpha: 0, rydberg: 0, electron_mass: 0 }
    }

    pub fn one() -> Self {
        Self::rational(Rational::from(1))
    }

    /// 1/(4 pi).
    pub(super) fn over_four_pi() -> Self {
        AtomicFactor { pi: -1, ..Self::rational(Rational::from((1, 4))) }
    }

    /// How many atomic units `number` SI units of kg^a m^b s^t A^d are.
    ///
    /// The atomic units in terms of exact constants: m_e = 2 h R/(c alpha^2), a0 = alpha/(4 pi R), hbar/E_h = 1/(4 pi c R),
    /// e E_h/hbar = 4 pi c R e.
    /// Source: derived here from the definitions R = alpha^2 m_e c/(2 h), a0 = hbar/(m_e c alpha) and E_h = 2 h c R.
    pub fn of_si(number: Rational, [a, b, t, d]: [i32; 4]) -> Self {
        let (h, c, e) = (exact(PLANCK), exact(SPEED_OF_LIGHT), exact(ELEMENTARY_CHARGE));
        let rational =
            (Rational::from(2) * h / &c).pow(a) * (c * 4u32).pow(d - t) * Rational::from(4).pow(-b) * e.pow(d);
        let atomic_unit =
            AtomicFactor { rational, pi: d - t - b, alpha: b - 2 * a, rydberg: a - b - t + d, electron_mass: 0 };
        Self::rational(number).times(&atomic_unit.power(-1))
    }

    pub fn times(&self, other: &Self) -> Self {
        AtomicFactor {
            rational: Rational::from(&self.rational * &other.rational),
            pi: self.pi + other.pi,
            alpha: self.alpha + other.alpha,
            rydberg: self.rydberg + other.rydberg,
            electron_mass: self.electron_mass + other.electron_mass,
        }
    }

    pub fn power(&self, exponent: i32) -> Self {
        AtomicFactor {
            rational: self.rational.clone().pow(exponent),
            pi: self.pi * exponent,
            alpha: self.alpha * exponent,
            rydberg: self.rydberg * exponent,
            electron_mass: self.electron_mass * exponent,
        }
    }

    pub fn is_one(&self) -> bool {
        *self == Self::one()
    }

    /// The part that is known exactly.
    pub fn exact_part(&self) -> Surd {
        &Surd::from(self.rational.clone()) * &Surd::pi_to(self.pi)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn powers_of_the_constants_follow_the_dimension() {
        // One joule is 1/(2 h c R) hartree.
        let joule = AtomicFactor::of_si(Rational::from(1), [1, 2, -2, 0]);
        assert_eq!((joule.pi, joule.alpha, joule.rydberg), (0, 0, -1));
        assert_eq!(joule.rational, Rational::from(1) / (exact(PLANCK) * exact(SPEED_OF_LIGHT) * 2u32));
        // One coulomb is 1/e atomic units of charge, exactly.
        let coulomb = AtomicFactor::of_si(Rational::from(1), [0, 0, 1, 1]);
        assert_eq!(coulomb, AtomicFactor::rational(Rational::from(1) / exact(ELEMENTARY_CHARGE)));
        // One metre is 4 pi R/alpha bohr.
        let metre = AtomicFactor::of_si(Rational::from(1), [0, 1, 0, 0]);
        assert_eq!(metre, AtomicFactor { pi: 1, alpha: -1, rydberg: 1, ..AtomicFactor::rational(Rational::from(4)) });
    }
}
