//! Kets of a level table: a number for each level of a block. H is diagonal, so every function of it is a division.
//!
//! One backend serves both ways of computing: with exact numbers as long as all of them are, and at a precision.

use super::labels;
use super::table::Table;
use crate::num::{Effort, Surd};
use crate::systems::{
    Backend, BlockKet, FunctionKind, FunctionOfH, Number, Obstacle, Omitted, RadialOperator, Resolvent, Sector, State,
};
use rug::{Complex, Rational};
use std::collections::BTreeMap;
use std::sync::Arc;

/// The radial part of H.
pub const HAMILTONIAN: &str = "hamiltonian";
/// The radial part of a tensor of the table: its reduced elements.
pub const REDUCED: &str = "reduced";
/// The radial part of the total angular momentum.
pub const IDENTITY: &str = "identity";

/// Extra bits of every number of the numeric backend.
const GUARD_BITS: u32 = 32;

/// Most square roots in an exact number before the numeric backend takes over.
const MOST_ROOTS: usize = 64;

/// Longest exact number in bits before the numeric backend takes over.
const LONGEST_NUMBER: u32 = 400_000;

/// Longest denominator, in bits, of an exact sum over the levels of a ket; beyond, nobody reads it, and numbers at a precision are faster.
const LONGEST_DENOMINATOR: u64 = 8192;

/// Components by level.
type Ket = BTreeMap<usize, Number>;

/// The backend of a table; exact without `bits`.
pub struct LevelBackend {
    pub table: Arc<Table>,
    pub bits: Option<u32>,
    pub effort: Effort,
}

fn open(ket: &BlockKet) -> Result<&Ket, Obstacle> {
    ket.downcast_ref().ok_or(Obstacle::Inexact)
}

impl LevelBackend {
    fn precision(&self) -> u32 {
        self.bits.map_or(64, |bits| bits + GUARD_BITS)
    }

    /// The number as this backend holds it.
    fn taken(&self, number: &Number) -> Result<Number, Obstacle> {
        match (self.bits, number) {
            (None, Number::Exact(value)) if value.term_count() > MOST_ROOTS || value.bits() > LONGEST_NUMBER => {
                Err(Obstacle::Inexact)
            }
            (None, Number::Exact(_)) => Ok(number.clone()),
            (None, Number::Approx(_)) => Err(Obstacle::Inexact),
            (Some(_), _) => Ok(Number::Approx(number.to_complex(self.precision()))),
        }
    }

    fn energy(&self, level: usize) -> Number {
        let energy = self.table.energy(level);
        match self.bits {
            None => Number::Exact(Surd::from(energy.clone())),
            Some(_) => Number::Approx(Complex::with_val(self.precision(), (energy, 0))),
        }
    }

    fn element(&self, at: usize) -> Result<Number, Obstacle> {
        match self.bits {
            None => self.table.exact_element(at).cloned().map(Number::Exact).ok_or(Obstacle::Inexact),
            Some(_) => Ok(Number::Approx(self.table.numeric_element(at, self.precision()))),
        }
    }

    fn add(&self, ket: &mut Ket, level: usize, value: Number) -> Result<(), Obstacle> {
        let sum = match ket.get(&level) {
            Some(earlier) => earlier.plus(&value, self.precision()),
            None => value,
        };
        let sum = self.taken(&sum)?;
        if sum.is_zero() {
            ket.remove(&level);
        } else {
            ket.insert(level, sum);
        }
        Ok(())
    }

    fn omitted(&self, omitted: &[Omitted], level: usize) -> bool {
        omitted.iter().any(|one| match one {
            Omitted::LevelOf(state) => labels::level_of(state).is_some_and(|of| self.table.shape.degenerate(of, level)),
            Omitted::Manifold(manifold) => manifold.numbers.iter().any(|number| usize::try_from(*number) == Ok(level)),
        })
    }

    /// value/(z - E) for the energy of a level, exactly.
    fn divided_exactly(&self, z: &Surd, level: usize, value: &Number) -> Result<Number, Obstacle> {
        let Number::Exact(value) = value else { return Err(Obstacle::Inexact) };
        let difference = z - &Surd::from(self.table.energy(level).clone());
        if difference.is_zero() {
            return Err(self.singular(level));
        }
        let inverse = difference.inverse().ok_or(Obstacle::Inexact)?;
        Ok(Number::Exact(value * &inverse))
    }

    /// value/(z - E) for the energy of a level; `rational` is z where it is one.
    fn divided(
        &self,
        z: &Complex,
        rational: Option<&Rational>,
        level: usize,
        value: &Number,
    ) -> Result<Number, Obstacle> {
        let energy = self.table.energy(level);
        if rational == Some(energy) {
            return Err(self.singular(level));
        }
        let precision = self.precision();
        let difference = Complex::with_val(precision, z - energy);
        // a difference that the rounding of z may have made
        let exponent = |x: &Complex| x.real().get_exp().max(x.imag().get_exp());
        let lost = match (exponent(z), exponent(&difference)) {
            (Some(whole), Some(left)) => i64::from(whole) - i64::from(left),
            (None, _) => 0,
            (_, None) => i64::MAX,
        };
        if lost >= i64::from(precision - precision / 8) {
            return Err(Obstacle::Undecided);
        }
        Ok(Number::Approx(value.to_complex(precision) / difference))
    }

    fn singular(&self, level: usize) -> Obstacle {
        Obstacle::Singular { level: self.table.shape.levels[level].name.clone() }
    }

    /// f(a + b E) for the energy of a level; on the cut of logarithm and square root the value from above, as for numbers.
    fn function_at(&self, function: &FunctionOfH, level: usize) -> Result<Complex, Obstacle> {
        let precision = self.precision();
        let energy = Number::Exact(Surd::from(self.table.energy(level).clone()));
        let argument = function.constant.plus(&function.slope.times(&energy, precision), precision);
        if argument.is_zero() && function.kind == FunctionKind::Ln {
            return Err(Obstacle::Refused {
                message: format!(
                    "the logarithm of zero does not exist: its argument vanishes at the energy of {}",
                    self.table.shape.levels[level].name
                ),
                help: "leave the level out with a prime or with `without P`".into(),
            });
        }
        let argument = argument.to_complex(precision);
        let value = match function.kind {
            FunctionKind::Exp => argument.exp(),
            FunctionKind::Ln => argument.ln(),
            FunctionKind::Sqrt => argument.sqrt(),
        };
        if !(value.real().is_finite() && value.imag().is_finite()) {
            return Err(Obstacle::Refused {
                message: "the function of H is too large for any number at one of the energies".into(),
                help: "give H a smaller factor".into(),
            });
        }
        Ok(if function.adjoint { value.conj() } else { value })
    }
}

impl Backend for LevelBackend {
    fn state(&self, state: &State) -> Result<Vec<(Sector, BlockKet)>, Obstacle> {
        let level = labels::level_of(state).filter(|level| *level < self.table.shape.levels.len());
        let Some(level) = level else { return Err(Obstacle::Inexact) };
        let entry = &self.table.shape.levels[level];
        let Some(twice_m) = labels::twice_m_of(state) else {
            return Err(Obstacle::Refused {
                message: format!(
                    "{} has J = {}, and this state does not say its M",
                    entry.name,
                    labels::half(entry.twice_j())
                ),
                help: format!(
                    "give M, as in [{}, M={}], or take `average(…)`",
                    entry.name,
                    labels::half(entry.twice_j())
                ),
            });
        };
        let one = self.taken(&Number::Exact(Surd::one()))?;
        Ok(vec![(Sector { block: entry.block, twice_m }, Arc::new(Ket::from([(level, one)])))])
    }

    fn apply(&self, operator: &RadialOperator, _: Sector, to: Sector, ket: &BlockKet) -> Result<BlockKet, Obstacle> {
        self.effort.check()?;
        let ket = open(ket)?;
        let shape = &self.table.shape;
        let mut image = Ket::new();
        for (level, value) in ket {
            match operator.kind {
                IDENTITY => self.add(&mut image, *level, value.clone())?,
                HAMILTONIAN => {
                    let product = value.times(&self.energy(*level), self.precision());
                    self.add(&mut image, *level, product)?;
                }
                _ => {
                    let index = usize::try_from(operator.index).unwrap_or(usize::MAX);
                    for link in shape.links(index, *level).iter().filter(|l| shape.levels[l.other].block == to.block) {
                        let mut product = value.times(&self.element(link.element)?, self.precision());
                        if link.negative {
                            product = negated(product);
                        }
                        self.add(&mut image, link.other, product)?;
                    }
                }
            }
        }
        Ok(Arc::new(image))
    }

    fn resolve(&self, resolvent: &Resolvent, _: Sector, ket: &BlockKet) -> Result<BlockKet, Obstacle> {
        self.effort.check()?;
        let ket = open(ket)?;
        if let (None, Number::Exact(z)) = (self.bits, &resolvent.z) {
            // the denominators of the energies seldom have a common factor
            let energy = |level: &usize| u64::from(self.table.energy(*level).denom().significant_bits());
            let length = |level| energy(level) + 2 * u64::from(z.bits());
            if ket.keys().map(length).sum::<u64>() > LONGEST_DENOMINATOR {
                return Err(Obstacle::Inexact);
            }
        }
        let z = resolvent.z.to_complex(self.precision());
        let rational = match &resolvent.z {
            Number::Exact(z) => z.as_rational(),
            Number::Approx(_) => None,
        };
        let mut image = Ket::new();
        for (level, value) in ket {
            if self.omitted(&resolvent.omitted, *level) {
                continue;
            }
            let quotient = match (self.bits, &resolvent.z) {
                (None, Number::Exact(z)) => self.divided_exactly(z, *level, value)?,
                (None, Number::Approx(_)) => return Err(Obstacle::Inexact),
                (Some(_), _) => self.divided(&z, rational.as_deref(), *level, value)?,
            };
            self.add(&mut image, *level, quotient)?;
        }
        Ok(Arc::new(image))
    }

    fn function(&self, function: &FunctionOfH, _: Sector, ket: &BlockKet) -> Result<BlockKet, Obstacle> {
        if self.bits.is_none() {
            return Err(Obstacle::Inexact);
        }
        let mut image = Ket::new();
        for (level, value) in open(ket)? {
            self.effort.check()?;
            if !self.omitted(&function.omitted, *level) {
                let factor = Number::Approx(self.function_at(function, *level)?);
                self.add(&mut image, *level, value.times(&factor, self.precision()))?;
            }
        }
        Ok(Arc::new(image))
    }

    fn combine(&self, _: Sector, terms: &[(Number, BlockKet)]) -> Result<BlockKet, Obstacle> {
        let mut sum = Ket::new();
        for (factor, ket) in terms.iter().filter(|(factor, _)| !factor.is_zero()) {
            let factor = self.taken(factor)?;
            for (level, value) in open(ket)? {
                self.add(&mut sum, *level, factor.times(value, self.precision()))?;
            }
        }
        Ok(Arc::new(sum))
    }

    fn overlap(&self, _: Sector, bra: &BlockKet, ket: &BlockKet) -> Result<Number, Obstacle> {
        let ket = open(ket)?;
        let mut sum = Number::zero();
        for (level, value) in open(bra)? {
            if let Some(other) = ket.get(level) {
                sum = sum.plus(&value.conj().times(other, self.precision()), self.precision());
            }
        }
        Ok(sum)
    }

    fn element(
        &self,
        operator: &RadialOperator,
        from: Sector,
        to: Sector,
        bra: &BlockKet,
        ket: &BlockKet,
    ) -> Result<Number, Obstacle> {
        let image = self.apply(operator, from, to, ket)?;
        self.overlap(to, bra, &image)
    }

    fn vanishes(&self, ket: &BlockKet) -> bool {
        open(ket).is_ok_and(Ket::is_empty)
    }
}

fn negated(number: Number) -> Number {
    match number {
        Number::Exact(value) => Number::Exact(-&value),
        Number::Approx(value) => Number::Approx(-value),
    }
}
