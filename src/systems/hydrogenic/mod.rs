//! One electron, with spin or without, in the field of a nucleus: H = p^2/(2 mu) - Z/r in the relative coordinate.
//!
//! Factors of angles and spin are those of the angular engine, without spin as S = 0 and J = L; radial functions depend on n and l alone.
//! Everything inside is done for charge and reduced mass one, in lengths rho = mu Z r; `radial` holds the factors. The exact backend
//! represents functions as polynomials times exponentials, the numeric one expands them in Coulomb Sturmian functions.

mod action;
mod bound;
mod closed_sum;
mod couplings;
mod exact;
mod finite_solution;
mod function;
mod labels;
mod laguerre;
mod laurent;
mod moments;
mod numbers;
mod numeric;
mod numeric_ket;
mod operators;
mod origin;
mod radial;
mod rules;
mod series;
mod sturmian;
mod symmetry;
#[cfg(test)]
mod tests;
mod vector;

use crate::angular::Electrons;
use crate::num::{Effort, Surd};
use crate::systems::{
    Atom, Backend, Coupling, Level, Manifold, Number, Obstacle, Sector, State, StateLabel, Symmetry, System,
    SystemError,
};
use exact::ExactBackend;
use numbers::Numbers;
use numeric::NumericBackend;
use operators::Setting;
use radial::Scale;
use rug::Rational;
use std::cmp::Ordering;
use std::collections::HashMap;
use std::sync::{Arc, Mutex, PoisonError};
use sturmian::Kept;

/// A hydrogen-like atom.
#[derive(Clone, Debug)]
pub struct Hydrogenic {
    charge: Rational,
    mass: Option<Rational>,
    electrons: Electrons,
    scale: Scale,
    kept: Arc<Kept>,
    couplings: Arc<Couplings>,
}

/// Where operators lead from sectors, as far as it was asked: the same few are asked for at every level of accuracy.
type Couplings = Mutex<HashMap<(Atom, Sector), Vec<Coupling>>>;

/// Most answers kept.
const KEPT_COUPLINGS: usize = 10_000;

impl Hydrogenic {
    /// An atom with nuclear charge Z and nuclear mass in electron masses; `None` for an infinite mass.
    ///
    /// Units: atomic units of the electron mass.
    /// Range: Z > 0 and mass > 0, both rational.
    /// Errors: `Refused` outside of it.
    pub fn new(charge: Rational, mass: Option<Rational>) -> Result<Self, SystemError> {
        let refused = |message: String, help: &str| Err(SystemError::Refused { message, help: help.into() });
        if charge.cmp0() != Ordering::Greater {
            return refused(
                format!("Z={charge} binds no electron: the charge of the nucleus is positive"),
                "write hydrogenic(Z=1), or another positive charge",
            );
        }
        if let Some(mass) = mass.as_ref().filter(|m| m.cmp0() != Ordering::Greater) {
            return refused(
                format!("mass={mass} is not the mass of a nucleus"),
                "give the mass in electron masses, as mass=1836.15267343, or leave it out for an infinite one",
            );
        }
        let scale = Scale::new(&charge, &reduced_mass(mass.as_ref()));
        let electrons = Electrons::ONE_WITHOUT_SPIN;
        Ok(Hydrogenic { charge, mass, electrons, scale, kept: Arc::default(), couplings: Arc::default() })
    }

    /// The same atom with the spin of the electron taken in.
    #[must_use]
    pub fn with_spin(self) -> Self {
        Hydrogenic { electrons: Electrons::ONE, couplings: Arc::default(), ..self }
    }

    /// The states of n with some l, of one j or all.
    fn states(
        &self,
        n: u32,
        momenta: std::ops::Range<u32>,
        twice_j: Option<u32>,
        effort: &Effort,
    ) -> Result<Vec<State>, Obstacle> {
        let mut states = Vec::new();
        for l in momenta {
            effort.check()?;
            states.extend(numbers::states_of(n, l, twice_j, self.electrons));
        }
        Ok(states)
    }

    /// What operators have to know.
    fn setting(&self) -> Setting<'_> {
        Setting { charge: &self.charge, electrons: self.electrons }
    }

    /// The charge of the nucleus.
    pub fn charge(&self) -> &Rational {
        &self.charge
    }

    /// The mass of the nucleus in electron masses; `None` when it is infinite.
    pub fn mass(&self) -> Option<&Rational> {
        self.mass.as_ref()
    }
}

/// mu = M/(1 + M).
fn reduced_mass(mass: Option<&Rational>) -> Rational {
    mass.map_or(Rational::from(1), |m| m / Rational::from(m + 1))
}

impl System for Hydrogenic {
    fn kind(&self) -> &'static str {
        "hydrogenic"
    }

    /// Z, the mass of the nucleus where it is finite, and the reduced mass, in electron masses.
    fn parameters(&self) -> Vec<(&'static str, Rational)> {
        let mass = self.mass.iter().map(|mass| ("mass", mass.clone()));
        let reduced = reduced_mass(self.mass.as_ref());
        [("Z", self.charge.clone())].into_iter().chain(mass).chain([("reduced_mass", reduced)]).collect()
    }

    fn state(&self, label: &StateLabel, _: &Effort) -> Result<State, SystemError> {
        labels::state(label, self.electrons)
    }

    fn manifold(&self, label: &StateLabel, _: &Effort) -> Result<Manifold, SystemError> {
        labels::manifold(label, self.electrons)
    }

    /// -mu Z^2/(2 n^2).
    fn energy(&self, state: &State, _: u32, _: &Effort) -> Result<Number, Obstacle> {
        let Numbers { n, .. } = Numbers::of(state).ok_or_else(exact::foreign)?;
        Ok(Number::Exact(Surd::from(bound::energy(n) * &self.scale.energy)))
    }

    fn degenerate(&self, a: &State, b: &State) -> bool {
        a.numbers.first() == b.numbers.first()
    }

    fn level_in(&self, state: &State, sector: Sector, _: &Effort) -> Result<Vec<State>, Obstacle> {
        let numbers = Numbers::of(state).ok_or_else(exact::foreign)?;
        Ok(numbers.level_in(sector).into_iter().map(Numbers::state).collect())
    }

    fn level(&self, state: &State, effort: &Effort) -> Result<Vec<State>, Obstacle> {
        let Numbers { n, .. } = Numbers::of(state).ok_or_else(exact::foreign)?;
        self.states(n, 0..n, None, effort)
    }

    fn states_of(&self, manifold: &Manifold, effort: &Effort) -> Result<Vec<State>, Obstacle> {
        let number = |n: i64| u32::try_from(n).map_err(|_| exact::foreign());
        match manifold.numbers[..] {
            [n, l, twice_j] => self.states(number(n)?, number(l)?..number(l)? + 1, Some(number(twice_j)?), effort),
            [n, l] => self.states(number(n)?, number(l)?..number(l)? + 1, None, effort),
            [n] => self.states(number(n)?, 0..number(n)?, None, effort),
            _ => Err(exact::foreign()),
        }
    }

    fn members(&self, manifold: &Manifold, sector: Sector) -> Vec<State> {
        let n = manifold.numbers.first().and_then(|n| u32::try_from(*n).ok());
        let Some(n) = n.filter(|n| numbers::in_manifold(manifold, *n, sector.block)) else { return Vec::new() };
        let any = Numbers { n, l: 0, vector: numbers::Vector::Term };
        any.level_in(sector).into_iter().map(Numbers::state).collect()
    }

    /// A state whose j is open, or a sum over j, is held by what holds all of its parts.
    fn holds(&self, manifold: &Manifold, state: &State) -> bool {
        let Some(Numbers { n, l, vector }) = Numbers::of(state) else { return false };
        let twice_j = match vector {
            numbers::Vector::Level { twice_j } | numbers::Vector::Coupled { twice_j, .. } => Some(twice_j),
            _ => None,
        };
        let named = [Some(n), Some(l), twice_j];
        manifold.numbers.iter().zip(named).all(|(of, own)| own.is_some_and(|own| i64::from(own) == *of))
    }

    fn symmetry(&self) -> Option<&dyn Symmetry> {
        Some(self)
    }

    fn knows(&self, atom: &Atom) -> Result<bool, SystemError> {
        operators::knows(atom, self.setting())
    }

    fn couple(&self, atom: &Atom, from: Sector) -> Vec<Coupling> {
        let mut couplings = self.couplings.lock().unwrap_or_else(PoisonError::into_inner);
        if let Some(known) = couplings.get(&(atom.clone(), from)) {
            return known.clone();
        }
        let found = couplings::couple(atom, from, self.setting());
        if couplings.len() < KEPT_COUPLINGS {
            couplings.insert((atom.clone(), from), found.clone());
        }
        found
    }

    fn adjoint(&self, atom: &Atom) -> (i32, Atom) {
        operators::adjoint(atom)
    }

    fn selection_rule(&self, atom: &Atom) -> String {
        rules::selection_rule(atom, self.setting())
    }

    fn exact(&self, effort: &Effort) -> Option<Arc<dyn Backend>> {
        Some(Arc::new(ExactBackend::new(self.scale.clone(), self.electrons, effort.clone())))
    }

    fn numeric(&self, level: Level, anchor: &State, effort: &Effort) -> Result<Arc<dyn Backend>, Obstacle> {
        let Numbers { n, .. } = Numbers::of(anchor).ok_or_else(exact::foreign)?;
        let kept = self.kept.clone();
        Ok(Arc::new(NumericBackend::new((self.scale.clone(), self.electrons), level, n, kept, effort.clone())))
    }

    fn basis_range(&self) -> Option<(usize, usize)> {
        Some((16, 8192))
    }

    fn data_bits(&self) -> u32 {
        0
    }
}
