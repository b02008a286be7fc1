//! The exact backend: functions that are finite sums of powers times exponentials.

use super::action::{self, NoFunction};
use super::bound::{bound_state, energy, level_at};
use super::closed_sum::{NoSum, reduced_sum};
use super::couplings::sector;
use super::finite_solution::{finite_solution, project_out};
use super::function::{RadialFunction, Unintegrable};
use super::numbers::{Numbers, Vector, level_name, omitted_levels};
use super::radial::{Radial, Scale};
use crate::angular::{Electrons, HalfInteger, Level, Term, clebsch_gordan};
use crate::num::{Effort, Surd};
use crate::systems::{
    Backend, Block, BlockKet, FunctionOfH, Number, Obstacle, RadialOperator, Resolvent, Sector, State, SystemError,
};
use rug::Rational;
use std::cmp::Ordering;
use std::sync::Arc;

/// Exact kets, operators and resolvents of a hydrogen-like atom.
pub(super) struct ExactBackend {
    scale: Scale,
    electrons: Electrons,
    effort: Effort,
}

impl ExactBackend {
    pub(super) fn new(scale: Scale, electrons: Electrons, effort: Effort) -> Self {
        ExactBackend { scale, electrons, effort }
    }
}

/// The orbital angular momentum of a sector.
pub(super) fn orbital(sector: Sector) -> Result<u32, Obstacle> {
    match sector.block {
        Block::Orbital { l } | Block::Coupled { l, .. } => Ok(l),
        Block::Whole | Block::Level { .. } => Err(Obstacle::Refused {
            message: "a hydrogen-like atom has blocks with an orbital angular momentum only".into(),
            help: "take states of this atom".into(),
        }),
    }
}

/// An eigenstate that is not of this atom.
pub(super) fn foreign_state(state: &State) -> SystemError {
    SystemError::Refused {
        message: format!("{} is not a state of a hydrogen-like atom", state.label),
        help: "take states of this atom".into(),
    }
}

/// The sectors and the exact functions of an eigenstate.
///
/// Errors: `Refused` for a level whose M is left open.
pub(super) fn eigenstate(state: &State, electrons: Electrons) -> Result<Vec<(Sector, RadialFunction)>, Obstacle> {
    let numbers = Numbers::of(state).ok_or_else(foreign)?;
    let Numbers { n, l, vector } = numbers;
    if let Some(count) = numbers.count(electrons) {
        return Err(open_level(state, count, vector, electrons));
    }
    let u = bound_state(n, l);
    Ok(match vector {
        Vector::Product { ml, twice_ms } => {
            let parts = product_amplitudes(l, ml, twice_ms).into_iter().filter(|(_, amplitude)| !amplitude.is_zero());
            let weighted = |amplitude: &Surd| {
                let mut part = RadialFunction::default();
                part.add_scaled(amplitude, &u);
                part
            };
            parts.map(|(sector, amplitude)| (sector, weighted(&amplitude))).collect()
        }
        Vector::Coupled { twice_j, twice_m } => vec![(Sector { block: Block::Coupled { l, twice_j }, twice_m }, u)],
        Vector::Orbital { m } => vec![(Sector { block: Block::Orbital { l }, twice_m: 2 * m }, u)],
        Vector::Term | Vector::Level { .. } => Vec::new(),
    })
}

fn open_level(state: &State, count: u64, vector: Vector, electrons: Electrons) -> Obstacle {
    let label = &state.label;
    let example = match vector {
        Vector::Level { .. } => format!("give M, as in `[{label}, M=1/2]`"),
        _ if electrons.spin => format!("give j and M, as in `[{label}_1/2, M=1/2]`, or ML and MS"),
        _ => format!("give m, as in `[{label}, m=0]`"),
    };
    Obstacle::Refused {
        message: format!("{label} has {count} states"),
        help: format!("{example}; over all M of a level runs `average(…)`"),
    }
}

/// |l ml>|1/2 ms> over the sectors of its two j: <l ml 1/2 ms|j M>.
pub(super) fn product_amplitudes(l: u32, ml: i32, twice_ms: i32) -> Vec<(Sector, Surd)> {
    let orbital = HalfInteger::whole(i32::try_from(l).unwrap_or(0));
    let (spin, ms) = (HalfInteger::from_twice(1), HalfInteger::from_twice(twice_ms));
    let m = HalfInteger::from_twice(2 * ml + twice_ms);
    let term = Term::natural(l, spin);
    let coupled = term.momenta().filter(|j| m.twice().abs() <= j.twice()).map(|j| {
        // projections inside their momenta, as a label's are
        let amplitude = clebsch_gordan(orbital, HalfInteger::whole(ml), spin, ms, j, m).unwrap_or_default();
        (sector(Level::new(term, j), m, Electrons::ONE), amplitude)
    });
    coupled.collect()
}

/// Why a matrix element has no value, in words.
pub(super) fn no_integral(operator: &str, reason: Unintegrable) -> Obstacle {
    let why = match reason {
        Unintegrable::Diverges { power } => {
            format!("at the nucleus its integrand goes as r^{power}, and only powers above r^-1 can be integrated")
        }
        Unintegrable::Contact => "a delta function at the nucleus meets a function that is not finite there".into(),
        Unintegrable::Logarithms => return Obstacle::Inexact,
    };
    Obstacle::Diverges { operator: operator.into(), why }
}

/// Applies an operator to an exact function, in the units of the atom with charge and reduced mass one.
pub(super) fn apply_exactly(operator: Radial, l: u32, lp: u32, u: &RadialFunction) -> Result<RadialFunction, Obstacle> {
    let result = match operator {
        Radial::Power(s) => action::power(u, s, l == lp),
        Radial::Gradient => action::gradient(u, l, lp),
        Radial::PSquared => action::p_squared(u, l),
        Radial::PFourth => action::p_squared(u, l).and_then(|once| action::p_squared(&once, l)),
        Radial::DeltaTimesPi => action::delta_times_pi(u),
        Radial::Hamiltonian => action::hamiltonian(u, l),
    };
    result.map_err(|reason| match reason {
        NoFunction::Distribution => Obstacle::Inexact,
        NoFunction::NotFinite => no_integral(&operator.name(), Unintegrable::Contact),
    })
}

/// <bra|operator|ket> of exact functions, in the units of the atom with charge and reduced mass one.
pub(super) fn element_exactly(
    operator: Radial,
    (l, lp): (u32, u32),
    bra: &RadialFunction,
    ket: &RadialFunction,
) -> Result<Surd, Obstacle> {
    let named = |reason| no_integral(&operator.name(), reason);
    match operator {
        Radial::PFourth => {
            let bra = apply_exactly(Radial::PSquared, lp, lp, bra)?;
            let ket = apply_exactly(Radial::PSquared, l, l, ket)?;
            bra.inner(&ket).map_err(named)
        }
        Radial::DeltaTimesPi => {
            let bra = bra.value_at_nucleus().map_err(named)?;
            let ket = ket.value_at_nucleus().map_err(named)?;
            Ok((&bra.conj() * &ket).scaled(&Rational::from((1, 4))))
        }
        _ => bra.inner(&apply_exactly(operator, l, lp, ket)?).map_err(named),
    }
}

/// The levels left out of a block, after checking that the energy is not another level's.
///
/// z is in units of the atom with charge and reduced mass one.
pub(super) fn levels_left_out(resolvent: &Resolvent, z: &Rational, sector: Sector) -> Result<Vec<u32>, Obstacle> {
    let l = orbital(sector)?;
    if z.cmp0() != Ordering::Less {
        return Err(Obstacle::OnCut);
    }
    let levels = omitted_levels(&resolvent.omitted, sector.block);
    match level_at(z) {
        Some(n) if n > l && !levels.contains(&n) => Err(Obstacle::Singular { level: level_name(n, sector.block) }),
        _ => Ok(levels),
    }
}

/// Q (z - H)^-1 Q on an exact function, in the units of the atom with charge and reduced mass one.
pub(super) fn resolve_exactly(
    z: &Rational,
    levels: &[u32],
    l: u32,
    source: &RadialFunction,
    effort: &Effort,
) -> Result<RadialFunction, Obstacle> {
    let named = |reason| no_integral("the sum over intermediate states", reason);
    let source = project_out(source, l, levels).map_err(named)?;
    let solution = finite_solution(z, l, &source, effort)?.ok_or(Obstacle::Inexact)?;
    project_out(&solution, l, levels).map_err(named)
}

fn no_sum(reason: NoSum) -> Obstacle {
    let operator = "the sum over intermediate states";
    match reason {
        NoSum::Unintegrable(reason) => no_integral(operator, reason),
        NoSum::Diverges => Obstacle::Diverges {
            operator: operator.into(),
            why: "the operators on both of its sides are so singular at the nucleus that highly excited states do not fade out".into(),
        },
        NoSum::NotRational => Obstacle::Inexact,
        NoSum::Interrupted(stop) => Obstacle::Interrupted(stop),
    }
}

fn open(ket: &BlockKet) -> Result<&RadialFunction, Obstacle> {
    ket.downcast_ref().ok_or_else(foreign)
}

/// A ket that another backend has made.
pub(super) fn foreign() -> Obstacle {
    Obstacle::Refused {
        message: "a bra and a ket of two systems do not meet".into(),
        help: "take all states of an expression from one system".into(),
    }
}

impl Backend for ExactBackend {
    fn state(&self, state: &State) -> Result<Vec<(Sector, BlockKet)>, Obstacle> {
        let parts = eigenstate(state, self.electrons)?.into_iter();
        Ok(parts.map(|(sector, u)| (sector, Arc::new(u) as BlockKet)).collect())
    }

    fn apply(&self, operator: &RadialOperator, from: Sector, to: Sector, ket: &BlockKet) -> Result<BlockKet, Obstacle> {
        self.effort.check()?;
        let radial = Radial::of(operator)?;
        let u = apply_exactly(radial, orbital(from)?, orbital(to)?, open(ket)?)?;
        Ok(Arc::new(u.scaled(&self.scale.of(radial))))
    }

    fn resolve(&self, resolvent: &Resolvent, sector: Sector, ket: &BlockKet) -> Result<BlockKet, Obstacle> {
        let l = orbital(sector)?;
        let Number::Exact(z) = &resolvent.z else {
            return Err(Obstacle::Inexact);
        };
        let Some(z) = z.as_rational() else {
            return Err(Obstacle::Inexact);
        };
        let z = Rational::from(z.as_ref() / &self.scale.energy);
        let levels = levels_left_out(resolvent, &z, sector)?;
        let u = resolve_exactly(&z, &levels, l, open(ket)?, &self.effort)?;
        Ok(Arc::new(u.scaled(&Rational::from(self.scale.energy.recip_ref()))))
    }

    fn through(
        &self,
        resolvent: &Resolvent,
        sector: Sector,
        bra: &BlockKet,
        ket: &BlockKet,
    ) -> Result<Number, Obstacle> {
        let l = orbital(sector)?;
        let (bra, ket) = (open(bra)?, open(ket)?);
        let z = match &resolvent.z {
            Number::Exact(z) => z.as_rational().map(|z| Rational::from(z.as_ref() / &self.scale.energy)),
            Number::Approx(_) => None,
        };
        let Some(z) = z else {
            return Err(Obstacle::Inexact);
        };
        let levels = levels_left_out(resolvent, &z, sector)?;
        let Some(n) = level_at(&z) else {
            return Err(Obstacle::Inexact);
        };
        let mut value = reduced_sum(n, l, bra, ket, &self.effort).map_err(no_sum)?;
        // the other levels left out, term by term
        let named = |reason| no_integral("the sum over intermediate states", reason);
        for other in levels.into_iter().filter(|&other| other != n) {
            let state = bound_state(other, l);
            let product = &bra.inner(&state).map_err(named)? * &state.inner(ket).map_err(named)?;
            value -= &product.scaled(&(energy(n) - energy(other)).recip());
        }
        Ok(Number::Exact(value.scaled(&Rational::from(self.scale.energy.recip_ref()))))
    }

    fn function(&self, _: &FunctionOfH, _: Sector, _: &BlockKet) -> Result<BlockKet, Obstacle> {
        Err(Obstacle::Inexact)
    }

    fn combine(&self, _: Sector, terms: &[(Number, BlockKet)]) -> Result<BlockKet, Obstacle> {
        let mut sum = RadialFunction::default();
        for (weight, ket) in terms {
            let Number::Exact(weight) = weight else {
                return Err(Obstacle::Inexact);
            };
            sum.add_scaled(weight, open(ket)?);
        }
        Ok(Arc::new(sum))
    }

    fn overlap(&self, _: Sector, bra: &BlockKet, ket: &BlockKet) -> Result<Number, Obstacle> {
        self.effort.check()?;
        let value = open(bra)?.inner(open(ket)?);
        value.map(Number::Exact).map_err(|reason| no_integral(&Radial::Power(0).name(), reason))
    }

    fn element(
        &self,
        operator: &RadialOperator,
        from: Sector,
        to: Sector,
        bra: &BlockKet,
        ket: &BlockKet,
    ) -> Result<Number, Obstacle> {
        self.effort.check()?;
        let radial = Radial::of(operator)?;
        let value = element_exactly(radial, (orbital(from)?, orbital(to)?), open(bra)?, open(ket)?)?;
        Ok(Number::Exact(value.scaled(&self.scale.of(radial))))
    }

    fn vanishes(&self, ket: &BlockKet) -> bool {
        open(ket).is_ok_and(RadialFunction::is_zero)
    }
}
