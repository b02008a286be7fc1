//! The numeric backend: Coulomb Sturmian functions with the exponential of one level.
//!
//! States and what operators make of them stay exact; resolvents give expansions, on which operators act without loss. The only
//! truncation is the number of functions in which a resolvent is solved.

use super::bound::level_at;
use super::exact::{eigenstate, foreign, levels_left_out, no_integral, orbital, resolve_exactly};
use super::finite_solution::project_out;
use super::function::{RadialFunction, Unintegrable};

use super::numbers::{level_name, omitted_levels};
use super::numeric_ket::{NumericKet, element, not_a_function};
use super::radial::{Radial, Scale};
use super::sturmian::{Energy, Kept, SturmianBlock};
use crate::angular::Electrons;
use crate::num::Effort;
use crate::systems::{
    Backend, BlockKet, FunctionOfH, Level, Number, Obstacle, RadialOperator, Resolvent, Sector, State,
};
use rug::{Complex, Float, Rational};
use std::sync::Arc;

/// Bits by which work is more precise than what is asked.
const GUARD: u32 = 32;

/// Bits of an approximate energy that may be rounding.
const ROUNDING: u32 = 24;

/// Kets, operators and resolvents of a hydrogen-like atom at one accuracy.
pub(super) struct NumericBackend {
    scale: Scale,
    electrons: Electrons,
    /// The level whose exponential the basis has.
    anchor: u32,
    count: usize,
    bits: u32,
    kept: Arc<Kept>,
    effort: Effort,
}

impl NumericBackend {
    pub(super) fn new(
        (scale, electrons): (Scale, Electrons),
        level: Level,
        anchor: u32,
        kept: Arc<Kept>,
        effort: Effort,
    ) -> Self {
        let bits = level.bits + GUARD;
        NumericBackend { scale, electrons, anchor, count: level.basis, bits, kept, effort }
    }

    /// The energy of a resolvent in units of the atom with charge and reduced mass one, and the levels left out of block l.
    ///
    /// Errors: `OnCut`, and `Singular` at a level that is not left out, for approximate energies as near as rounding.
    fn energy(&self, resolvent: &Resolvent, sector: Sector) -> Result<(Energy, Vec<u32>), Obstacle> {
        let z = match &resolvent.z {
            Number::Exact(surd) => match surd.as_rational() {
                Some(z) => {
                    let z = Rational::from(z.as_ref() / &self.scale.energy);
                    let levels = levels_left_out(resolvent, &z, sector)?;
                    return Ok((Energy::Exact(z), levels));
                }
                None if surd.is_real() => Complex::with_val(self.bits, resolvent.z.to_complex(self.bits).real()),
                None => resolvent.z.to_complex(self.bits),
            },
            Number::Approx(z) => z.clone(),
        };
        let z = z / &self.scale.energy;
        let levels = omitted_levels(&resolvent.omitted, sector.block);
        let l = orbital(sector)?;
        if let Some(n) = nearest_level(&z, self.bits - GUARD).filter(|n| *n > l && !levels.contains(n)) {
            return Err(Obstacle::Singular { level: level_name(n, sector.block) });
        }
        if !z.imag().is_zero() {
            return Ok((Energy::Complex(z), levels));
        }
        let (z, _) = z.into_real_imag();
        if z.is_sign_negative() && !z.is_zero() { Ok((Energy::Real(z), levels)) } else { Err(Obstacle::OnCut) }
    }

    fn block(&self, l: u32, left_out: &[u32]) -> SturmianBlock {
        // the states left out must fit in, however small the basis
        let room = left_out.iter().copied().max().unwrap_or(0) + self.anchor;
        let count = self.count + usize::try_from(room).unwrap_or(0);
        SturmianBlock { k: Rational::from((1, self.anchor)), l, count, bits: self.bits }
    }

    fn resolved(&self, resolvent: &Resolvent, sector: Sector, ket: &NumericKet) -> Result<NumericKet, Obstacle> {
        let l = orbital(sector)?;
        let (z, levels) = self.energy(resolvent, sector)?;
        if let Some(exact) = ket.as_exact() {
            let attempt = match &z {
                Energy::Exact(z) => resolve_exactly(z, &levels, l, exact, &self.effort),
                // a source inside the space left out: nothing, and not something small
                _ if project_out(exact, l, &levels).is_ok_and(|rest| rest.is_zero()) => Ok(RadialFunction::default()),
                _ => Err(Obstacle::Inexact),
            };
            match attempt {
                Ok(u) => return Ok(NumericKet::from_exact(u, l, self.bits)),
                Err(Obstacle::Inexact) => {}
                Err(obstacle) => return Err(obstacle),
            }
        }
        let origin = ket.origin();
        if let Some(power) = origin.too_singular_for_source(l) {
            let diverges = no_integral("the source of a resolvent", Unintegrable::Diverges { power });
            return Err(if origin.certain { diverges } else { Obstacle::Undecided });
        }
        let block = self.block(l, &levels);
        let f = ket.moments(&block.basis(), l, block.count)?;
        let u = block.solve(&z, &levels, &f, &self.kept, &self.effort)?;
        Ok(NumericKet::from_series(u, origin.solution(l)))
    }

    fn rounded(&self, value: Number) -> Number {
        match value {
            Number::Exact(value) => Number::Exact(value),
            Number::Approx(value) => Number::Approx(Complex::with_val(self.bits - GUARD, value)),
        }
    }
}

/// The level an approximate energy cannot be told from.
fn nearest_level(z: &Complex, bits: u32) -> Option<u32> {
    if z.real().is_sign_positive() {
        return None;
    }
    let prec = z.prec().0;
    let n =
        Float::with_val(prec, Float::with_val(prec, z.real() * -2).recip()).sqrt().round().to_integer()?.to_u32()?;
    if n == 0 {
        return None;
    }
    let level = super::bound::energy(n);
    debug_assert_eq!(level_at(&level), Some(n));
    let distance = Complex::with_val(prec, z - Float::with_val(prec, &level)).abs().into_real_imag().0;
    let near = Float::with_val(prec, level.abs()) >> bits.saturating_sub(ROUNDING);
    (distance <= near).then_some(n)
}

fn open(ket: &BlockKet) -> Result<&NumericKet, Obstacle> {
    ket.downcast_ref().ok_or_else(foreign)
}

impl Backend for NumericBackend {
    fn state(&self, state: &State) -> Result<Vec<(Sector, BlockKet)>, Obstacle> {
        let mut parts: Vec<(Sector, BlockKet)> = Vec::new();
        for (sector, u) in eigenstate(state, self.electrons)? {
            parts.push((sector, Arc::new(NumericKet::from_exact(u, orbital(sector)?, self.bits))));
        }
        Ok(parts)
    }

    fn apply(&self, operator: &RadialOperator, from: Sector, to: Sector, ket: &BlockKet) -> Result<BlockKet, Obstacle> {
        self.effort.check()?;
        let radial = Radial::of(operator)?;
        let image = open(ket)?.applied(radial, orbital(from)?, orbital(to)?);
        let image = image.map_err(|reason| not_a_function(radial, reason))?;
        Ok(Arc::new(image.scaled_by(&self.scale.of(radial))))
    }

    fn resolve(&self, resolvent: &Resolvent, sector: Sector, ket: &BlockKet) -> Result<BlockKet, Obstacle> {
        let u = self.resolved(resolvent, sector, open(ket)?)?;
        Ok(Arc::new(u.scaled_by(&Rational::from(self.scale.energy.recip_ref()))))
    }

    fn function(&self, _: &FunctionOfH, _: Sector, _: &BlockKet) -> Result<BlockKet, Obstacle> {
        Err(Obstacle::NotYet("ln, sqrt and exp of H for a hydrogen-like atom".into()))
    }

    fn combine(&self, sector: Sector, terms: &[(Number, BlockKet)]) -> Result<BlockKet, Obstacle> {
        let mut open_terms = Vec::with_capacity(terms.len());
        for (weight, ket) in terms {
            open_terms.push((weight.clone(), open(ket)?));
        }
        Ok(Arc::new(NumericKet::combination(&open_terms, orbital(sector)?, self.bits)))
    }

    fn overlap(&self, _: Sector, bra: &BlockKet, ket: &BlockKet) -> Result<Number, Obstacle> {
        self.effort.check()?;
        Ok(self.rounded(open(bra)?.inner(open(ket)?, &Radial::Power(0).name())?))
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
        let value = element(radial, (orbital(from)?, orbital(to)?), open(bra)?, open(ket)?)?;
        let scale = Number::Exact(self.scale.of(radial).into());
        Ok(self.rounded(value.times(&scale, self.bits)))
    }

    fn vanishes(&self, ket: &BlockKet) -> bool {
        open(ket).is_ok_and(NumericKet::is_zero)
    }
}
