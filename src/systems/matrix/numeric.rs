//! The numeric backend: kets are vectors of complex numbers at one precision.

use super::entries::ExactMatrix;
use super::levels::EnergyLevel;
use super::vectors::{add_numeric_multiple, dot};
use super::{MatrixSystem, WHOLE};
use crate::num::Effort;
use crate::systems::{Backend, BlockKet, FunctionOfH, Number, Obstacle, RadialOperator, Resolvent, Sector, State};
use rug::{Complex, Float};
use std::collections::BTreeMap;
use std::sync::{Arc, Mutex, PoisonError};

/// A ket: its component along every basis vector.
pub type NumericKet = Vec<Complex>;

/// Kets of a matrix system at one precision.
pub struct NumericBackend {
    pub system: MatrixSystem,
    pub work: Arc<Work>,
    pub effort: Effort,
}

/// What was computed at one precision; the system keeps it from one evaluation to the next.
pub struct Work {
    pub bits: u32,
    matrices: Mutex<BTreeMap<i64, Arc<RoundedMatrix>>>,
    /// The states of levels by their first state.
    states: Mutex<BTreeMap<usize, Arc<Vec<NumericKet>>>>,
}

/// The nonzero entries of a matrix by rows.
enum RoundedMatrix {
    Real(Vec<Vec<(usize, Float)>>),
    Complex(Vec<Vec<(usize, Complex)>>),
}

impl RoundedMatrix {
    fn new(matrix: &ExactMatrix, precision: u32) -> Result<Self, Obstacle> {
        let mut rows = Vec::with_capacity(matrix.order());
        let mut real = true;
        for row in 0..matrix.order() {
            let mut rounded = Vec::with_capacity(matrix.row(row).len());
            for (column, entry) in matrix.row(row) {
                let value = entry.rounded(precision).map_err(|error| Obstacle::Refused {
                    message: error.to_string(),
                    help: "scale the matrix".into(),
                })?;
                real &= value.imag().is_zero();
                rounded.push((*column, value));
            }
            rows.push(rounded);
        }
        Ok(if real {
            let re = |(column, value): (usize, Complex)| (column, value.into_real_imag().0);
            RoundedMatrix::Real(rows.into_iter().map(|row| row.into_iter().map(re).collect()).collect())
        } else {
            RoundedMatrix::Complex(rows)
        })
    }

    fn apply(&self, ket: &[Complex], precision: u32) -> NumericKet {
        match self {
            RoundedMatrix::Real(rows) => {
                let real_ket = ket.iter().all(|x| x.imag().is_zero());
                let image = |row: &Vec<(usize, Float)>| {
                    let (mut re, mut im) = (Float::new(precision), Float::new(precision));
                    for (column, entry) in row {
                        re += entry * ket[*column].real();
                        if !real_ket {
                            im += entry * ket[*column].imag();
                        }
                    }
                    Complex::with_val(precision, (re, im))
                };
                rows.iter().map(image).collect()
            }
            RoundedMatrix::Complex(rows) => {
                let image = |row: &Vec<(usize, Complex)>| {
                    let mut sum = Complex::new(precision);
                    for (column, entry) in row {
                        sum += Complex::with_val(precision, entry * &ket[*column]);
                    }
                    sum
                };
                rows.iter().map(image).collect()
            }
        }
    }
}

fn open(ket: &BlockKet) -> Result<&NumericKet, Obstacle> {
    ket.downcast_ref().ok_or(Obstacle::Undecided)
}

impl Work {
    pub fn new(bits: u32) -> Self {
        Work { bits, matrices: Mutex::default(), states: Mutex::default() }
    }
}

impl std::ops::Deref for NumericBackend {
    type Target = Work;
    fn deref(&self) -> &Work {
        &self.work
    }
}

impl NumericBackend {
    /// Precision of every component of a ket.
    pub(super) fn precision(&self) -> u32 {
        self.bits + 32
    }

    fn rounded(&self, operator: &RadialOperator) -> Result<Arc<RoundedMatrix>, Obstacle> {
        let mut matrices = self.matrices.lock().unwrap_or_else(PoisonError::into_inner);
        if let Some(rounded) = matrices.get(&operator.index) {
            return Ok(rounded.clone());
        }
        let rounded = Arc::new(RoundedMatrix::new(self.system.matrix(operator), self.precision())?);
        matrices.insert(operator.index, rounded.clone());
        Ok(rounded)
    }

    /// The states of a level in the order of their labels.
    pub(super) fn states(&self, level: &EnergyLevel) -> Result<Arc<Vec<NumericKet>>, Obstacle> {
        if let Some(states) = self.states.lock().unwrap_or_else(PoisonError::into_inner).get(&level.first) {
            return Ok(states.clone());
        }
        let states = Arc::new(self.system.numeric_states(level, self.bits, &self.effort)?);
        self.states.lock().unwrap_or_else(PoisonError::into_inner).insert(level.first, states.clone());
        Ok(states)
    }

    /// Lets something act on the part of a ket in each component it reaches.
    fn by_component(
        &self,
        ket: &[Complex],
        mut act: impl FnMut(usize, &[Complex]) -> Result<Vec<Complex>, Obstacle>,
    ) -> Result<NumericKet, Obstacle> {
        let mut image = vec![Complex::new(self.precision()); ket.len()];
        for (component, part) in self.system.components.iter().enumerate() {
            if part.members.iter().all(|k| ket[*k].is_zero()) {
                continue;
            }
            self.effort.check()?;
            let local: Vec<Complex> = part.members.iter().map(|k| ket[*k].clone()).collect();
            for (k, x) in part.members.iter().zip(act(component, &local)?) {
                image[*k] = x;
            }
        }
        Ok(image)
    }
}

impl Backend for NumericBackend {
    fn state(&self, state: &State) -> Result<Vec<(Sector, BlockKet)>, Obstacle> {
        let place = self.system.place(&state.numbers);
        let level = self.system.level(place, &self.effort)?;
        let ket = self.states(&level)?.get(place - level.first).cloned().ok_or(Obstacle::Undecided)?;
        Ok(vec![(WHOLE, Arc::new(ket))])
    }

    fn apply(&self, operator: &RadialOperator, _: Sector, _: Sector, ket: &BlockKet) -> Result<BlockKet, Obstacle> {
        self.effort.check()?;
        Ok(Arc::new(self.rounded(operator)?.apply(open(ket)?, self.precision())))
    }

    fn resolve(&self, resolvent: &Resolvent, _: Sector, ket: &BlockKet) -> Result<BlockKet, Obstacle> {
        let omitted = self.system.omitted_levels(&resolvent.omitted, &self.effort)?;
        let solve = |component: usize, part: &[Complex]| self.solve_in(component, &resolvent.z, &omitted, part);
        Ok(Arc::new(self.by_component(open(ket)?, solve)?))
    }

    fn function(&self, function: &FunctionOfH, _: Sector, ket: &BlockKet) -> Result<BlockKet, Obstacle> {
        let omitted = self.system.omitted_levels(&function.omitted, &self.effort)?;
        let act = |component: usize, part: &[Complex]| self.function_in(component, function, &omitted, part);
        Ok(Arc::new(self.by_component(open(ket)?, act)?))
    }

    fn combine(&self, _: Sector, terms: &[(Number, BlockKet)]) -> Result<BlockKet, Obstacle> {
        let precision = self.precision();
        let mut sum = vec![Complex::new(precision); self.system.order()];
        for (factor, ket) in terms {
            add_numeric_multiple(&mut sum, &factor.to_complex(precision), open(ket)?);
        }
        Ok(Arc::new(sum))
    }

    fn overlap(&self, _: Sector, bra: &BlockKet, ket: &BlockKet) -> Result<Number, Obstacle> {
        Ok(Number::Approx(dot(open(bra)?, open(ket)?, self.precision())))
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
        // Structural zeros only: a vector of exact zeros stays one at every precision.
        open(ket).is_ok_and(|ket| ket.iter().all(Complex::is_zero))
    }
}
