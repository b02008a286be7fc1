//! One electron without spin in the field of a nucleus: H = p^2/(2 mu) - Z/r in the relative coordinate.
//!
//! Everything inside is done for charge and reduced mass one, in lengths rho = mu Z r; `radial` holds the factors. The exact backend
//! represents functions as polynomials times exponentials, the numeric one expands them in Coulomb Sturmian functions.

mod action;
mod bound;
mod closed_sum;
mod exact;
mod finite_solution;
mod function;
mod labels;
mod laguerre;
mod laurent;
mod moments;
mod numeric;
mod numeric_ket;
mod operators;
mod origin;
mod radial;
mod series;
mod sturmian;
#[cfg(test)]
mod tests;
mod vector;

use crate::num::{Effort, Surd};
use crate::systems::{
    Atom, Backend, Block, Coupling, Level, Manifold, Number, Obstacle, Sector, State, StateLabel, System, SystemError,
};
use exact::ExactBackend;
use numeric::NumericBackend;
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
        Ok(Hydrogenic { charge, mass, scale, kept: Arc::default(), couplings: Arc::default() })
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
        labels::state(label)
    }

    fn manifold(&self, label: &StateLabel, _: &Effort) -> Result<Manifold, SystemError> {
        labels::manifold(label)
    }

    /// -mu Z^2/(2 n^2).
    fn energy(&self, state: &State, _: u32, _: &Effort) -> Result<Number, Obstacle> {
        let (n, ..) = labels::quantum_numbers(state).ok_or_else(exact::foreign)?;
        Ok(Number::Exact(Surd::from(bound::energy(n) * &self.scale.energy)))
    }

    fn degenerate(&self, a: &State, b: &State) -> bool {
        a.numbers.first() == b.numbers.first()
    }

    fn level_in(&self, state: &State, sector: Sector, _: &Effort) -> Result<Vec<State>, Obstacle> {
        let (n, ..) = labels::quantum_numbers(state).ok_or_else(exact::foreign)?;
        let Block::Orbital { l } = sector.block else { return Ok(Vec::new()) };
        Ok((l < n).then(|| labels::named_state(n, l, sector.twice_m / 2)).into_iter().collect())
    }

    fn level(&self, state: &State, effort: &Effort) -> Result<Vec<State>, Obstacle> {
        let (n, ..) = labels::quantum_numbers(state).ok_or_else(exact::foreign)?;
        let mut states = Vec::new();
        for l in 0..n {
            effort.check()?;
            let reach = i32::try_from(l).unwrap_or(i32::MAX);
            states.extend((-reach..=reach).map(|m| labels::named_state(n, l, m)));
        }
        Ok(states)
    }

    fn states_of(&self, manifold: &Manifold, effort: &Effort) -> Result<Vec<State>, Obstacle> {
        let number = |n: i64| u32::try_from(n).map_err(|_| exact::foreign());
        let (n, momenta) = match manifold.numbers[..] {
            [n, l] => (number(n)?, number(l)?..number(l)? + 1),
            [n] => (number(n)?, 0..number(n)?),
            _ => return Err(exact::foreign()),
        };
        let mut states = Vec::new();
        for l in momenta {
            effort.check()?;
            let reach = i32::try_from(l).unwrap_or(i32::MAX);
            states.extend((-reach..=reach).map(|m| labels::named_state(n, l, m)));
        }
        Ok(states)
    }

    fn knows(&self, atom: &Atom) -> Result<bool, SystemError> {
        operators::knows(atom)
    }

    fn couple(&self, atom: &Atom, from: Sector) -> Vec<Coupling> {
        let mut couplings = self.couplings.lock().unwrap_or_else(PoisonError::into_inner);
        if let Some(known) = couplings.get(&(atom.clone(), from)) {
            return known.clone();
        }
        let found = operators::couple(atom, from, &self.charge);
        if couplings.len() < KEPT_COUPLINGS {
            couplings.insert((atom.clone(), from), found.clone());
        }
        found
    }

    fn adjoint(&self, atom: &Atom) -> (i32, Atom) {
        operators::adjoint(atom)
    }

    fn selection_rule(&self, atom: &Atom) -> String {
        operators::selection_rule(atom)
    }

    fn exact(&self, effort: &Effort) -> Option<Arc<dyn Backend>> {
        Some(Arc::new(ExactBackend::new(self.scale.clone(), effort.clone())))
    }

    fn numeric(&self, level: Level, anchor: &State, effort: &Effort) -> Result<Arc<dyn Backend>, Obstacle> {
        let (n, ..) = labels::quantum_numbers(anchor).ok_or_else(exact::foreign)?;
        let kept = self.kept.clone();
        Ok(Arc::new(NumericBackend::new(self.scale.clone(), level, n, kept, effort.clone())))
    }

    fn basis_range(&self) -> Option<(usize, usize)> {
        Some((16, 8192))
    }

    fn data_bits(&self) -> u32 {
        0
    }
}
