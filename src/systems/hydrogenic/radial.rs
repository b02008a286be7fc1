//! The radial operators of this system, and how each depends on the unit of length.

use crate::num::Surd;
use crate::systems::{Obstacle, RadialOperator};
use rug::{Rational, ops::Pow};

/// A radial operator, between two blocks or inside one.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(super) enum Radial {
    /// r^s; with s = 0 only the block changes, if anything.
    Power(i64),
    /// The radial part of the gradient towards the block l + 1 or l - 1.
    Gradient,
    PSquared,
    PFourth,
    /// pi delta(r), whose elements are free of pi.
    DeltaTimesPi,
    Hamiltonian,
}

impl Radial {
    pub(super) fn operator(self) -> RadialOperator {
        let (kind, index) = match self {
            Radial::Power(s) => ("r", s),
            Radial::Gradient => ("gradient", 0),
            Radial::PSquared => ("p", 2),
            Radial::PFourth => ("p", 4),
            Radial::DeltaTimesPi => ("pi delta(r)", 0),
            Radial::Hamiltonian => ("H", 0),
        };
        RadialOperator { kind, index }
    }

    /// Errors: `Refused` for an operator that this system did not make.
    pub(super) fn of(operator: &RadialOperator) -> Result<Self, Obstacle> {
        match (operator.kind, operator.index) {
            ("r", s) => Ok(Radial::Power(s)),
            ("gradient", _) => Ok(Radial::Gradient),
            ("p", 2) => Ok(Radial::PSquared),
            ("p", 4) => Ok(Radial::PFourth),
            ("pi delta(r)", _) => Ok(Radial::DeltaTimesPi),
            ("H", _) => Ok(Radial::Hamiltonian),
            (kind, index) => Err(Obstacle::Refused {
                message: format!("{kind}^{index} is not a radial operator of a hydrogen-like atom"),
                help: "use the operators that this atom has".into(),
            }),
        }
    }

    /// The factor between the operator of this name and the radial one.
    pub(super) fn weight(self) -> Surd {
        if self == Radial::DeltaTimesPi { Surd::pi_to(-1) } else { Surd::one() }
    }

    /// How a message calls it.
    pub(super) fn name(self) -> String {
        match self {
            Radial::Power(0) => "the overlap".into(),
            Radial::Power(1) => "r".into(),
            Radial::Power(s) => format!("r^{s}"),
            Radial::Gradient => "P".into(),
            Radial::PSquared => "p^2".into(),
            Radial::PFourth => "p^4".into(),
            Radial::DeltaTimesPi => "delta(r)".into(),
            Radial::Hamiltonian => "H".into(),
        }
    }
}

/// Charge and reduced mass, by which lengths and energies of the atom differ from those of the atom with both equal to one.
///
/// With rho = mu Z r: H = mu Z^2 H_1(rho).
#[derive(Clone, PartialEq, Debug)]
pub(super) struct Scale {
    /// mu Z, the inverse of the length unit.
    pub(super) inverse_length: Rational,
    /// mu Z^2, the unit of energy.
    pub(super) energy: Rational,
}

impl Scale {
    pub(super) fn new(charge: &Rational, reduced_mass: &Rational) -> Self {
        let inverse_length = Rational::from(charge * reduced_mass);
        let energy = Rational::from(&inverse_length * charge);
        Scale { inverse_length, energy }
    }

    /// The factor between an operator and the same in the units of the atom with charge and reduced mass one.
    pub(super) fn of(&self, operator: Radial) -> Rational {
        let power = |k: i64| {
            let size = Rational::from((&self.inverse_length).pow(u32::try_from(k.unsigned_abs()).unwrap_or(u32::MAX)));
            if k < 0 { size.recip() } else { size }
        };
        match operator {
            Radial::Power(s) => power(-s),
            Radial::Gradient => power(1),
            Radial::PSquared => power(2),
            Radial::PFourth => power(4),
            Radial::DeltaTimesPi => power(3),
            Radial::Hamiltonian => self.energy.clone(),
        }
    }
}
