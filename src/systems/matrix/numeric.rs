//! The numeric backend: kets are vectors of complex numbers at one precision.

use super::MatrixSystem;
use super::exact::WHOLE;
use super::levels::{dot, obstacle};
use crate::linalg::eigen::{Eigenpairs, all_eigenpairs, spectrum_preview};
use crate::linalg::{HermitianMatrix, LinalgError, ShiftedSolver};
use crate::num::{ComplexBall, Effort};
use crate::systems::{
    Backend, BlockKet, FunctionKind, FunctionOfH, Number, Obstacle, Omitted, RadialOperator, Resolvent, Sector, State,
};
use rug::{Complex, Float};
use std::collections::{BTreeMap, HashMap};
use std::sync::{Arc, Mutex, PoisonError};

/// Most factorisations kept at a time.
const KEPT_SOLVERS: usize = 24;

type NumericKet = Vec<Complex>;
type SparseRows = Vec<Vec<(usize, Complex)>>;

/// Kets of a matrix system at one precision.
pub struct NumericBackend {
    pub system: MatrixSystem,
    pub work: Arc<Work>,
    pub effort: Effort,
}

/// What was computed at one precision; the system keeps it from one evaluation to the next.
pub struct Work {
    pub bits: u32,
    hermitian: HermitianMatrix,
    matrices: Mutex<BTreeMap<i64, Arc<SparseRows>>>,
    states: Mutex<HashMap<usize, NumericKet>>,
    solvers: Mutex<Vec<(String, Arc<ShiftedSolver>)>>,
    eigenpairs: Mutex<Option<Arc<Eigenpairs>>>,
}

fn open(ket: &BlockKet) -> Result<&NumericKet, Obstacle> {
    ket.downcast_ref().ok_or(Obstacle::Undecided)
}

impl Work {
    pub fn new(system: &MatrixSystem, bits: u32) -> Result<Self, Obstacle> {
        Ok(Work {
            bits,
            hermitian: system.hermitian(bits + 64)?,
            matrices: Mutex::default(),
            states: Mutex::default(),
            solvers: Mutex::default(),
            eigenpairs: Mutex::default(),
        })
    }
}

impl std::ops::Deref for NumericBackend {
    type Target = Work;
    fn deref(&self) -> &Work {
        &self.work
    }
}

impl NumericBackend {
    /// Precision of every component.
    fn precision(&self) -> u32 {
        self.bits + 32
    }

    fn rows(&self, operator: &RadialOperator) -> Result<Arc<SparseRows>, Obstacle> {
        let mut matrices = self.matrices.lock().unwrap_or_else(PoisonError::into_inner);
        if let Some(rows) = matrices.get(&operator.index) {
            return Ok(rows.clone());
        }
        let precision = self.precision();
        let rows = self
            .system
            .matrix(operator)
            .rows()
            .iter()
            .map(|row| {
                row.iter()
                    .map(|(column, entry)| {
                        ComplexBall::from_surd(entry, precision)
                            .map(|ball| (*column, ball.midpoint(precision)))
                            .map_err(|error| Obstacle::Refused { message: error.to_string(), help: String::new() })
                    })
                    .collect::<Result<Vec<_>, _>>()
            })
            .collect::<Result<Vec<_>, _>>()?;
        let rows = Arc::new(rows);
        matrices.insert(operator.index, rows.clone());
        Ok(rows)
    }

    /// The orthonormal states of the omitted levels.
    fn left_out(&self, omitted: &[Omitted]) -> Result<Vec<NumericKet>, Obstacle> {
        let mut vectors = Vec::new();
        for first in self.system.omitted_levels(omitted, &self.effort)? {
            let level = self.system.level(first, &self.effort)?;
            for index in level.first..level.first + level.size {
                vectors.push(self.eigenstate(index)?);
            }
        }
        Ok(vectors)
    }

    fn eigenstate(&self, index: usize) -> Result<NumericKet, Obstacle> {
        if let Some(ket) = self.states.lock().unwrap_or_else(PoisonError::into_inner).get(&index) {
            return Ok(ket.clone());
        }
        let level = self.system.level(index, &self.effort)?;
        let precision = self.precision();
        let kets: Vec<NumericKet> = match level.exact.as_ref().and_then(|exact| exact.states.as_ref()) {
            Some(states) => states
                .iter()
                .map(|state| {
                    let mut ket = vec![Complex::new(precision); self.system.order()];
                    for (k, entry) in state {
                        ket[*k] = Number::Exact(entry.clone()).to_complex(precision);
                    }
                    ket
                })
                .collect(),
            None => self.system.numeric_states(&level, self.bits, &self.effort)?.1,
        };
        let mut states = self.states.lock().unwrap_or_else(PoisonError::into_inner);
        for (offset, ket) in kets.into_iter().enumerate() {
            states.insert(level.first + offset, ket);
        }
        states.get(&index).cloned().ok_or(Obstacle::Undecided)
    }

    fn solver(&self, resolvent: &Resolvent) -> Result<Arc<ShiftedSolver>, Obstacle> {
        let z = resolvent.z.to_complex(self.bits + 64);
        let key = format!("{z:?} {:?}", resolvent.omitted);
        let mut solvers = self.solvers.lock().unwrap_or_else(PoisonError::into_inner);
        if let Some((_, solver)) = solvers.iter().find(|(known, _)| *known == key) {
            return Ok(solver.clone());
        }
        let left_out = self.left_out(&resolvent.omitted)?;
        let imaginary = (!z.imag().is_zero()).then(|| z.imag());
        if imaginary.is_none() {
            self.refuse_singular(z.real(), resolvent)?;
        }
        let solver = ShiftedSolver::new(&self.hermitian, (z.real(), imaginary), &left_out, self.bits, &self.effort)
            .map_err(|error| self.unsolved(error, &z))?;
        let solver = Arc::new(solver);
        if solvers.len() >= KEPT_SOLVERS {
            solvers.remove(0);
        }
        solvers.push((key, solver.clone()));
        Ok(solver)
    }

    /// Refuses a real energy that cannot be told from that of a level which is not left out.
    ///
    /// An exact energy near a level may be told from it with more bits; an approximate one (from `E(g)`, say) is taken to be the level's.
    fn refuse_singular(&self, z: &Float, resolvent: &Resolvent) -> Result<(), Obstacle> {
        let omitted = self.system.omitted_levels(&resolvent.omitted, &self.effort)?;
        let Some(preview) = spectrum_preview(&self.hermitian) else { return Ok(()) };
        let size = Float::with_val(64, 1) << i32::try_from(self.hermitian.exponent().unwrap_or(0)).unwrap_or(0);
        for index in 0..self.system.order() {
            let Some(rough) = preview.value(index) else { continue };
            if Float::with_val(64, &rough - z).abs() > Float::with_val(64, &size >> 30u32) {
                continue;
            }
            let level = self.system.level(index, &self.effort)?;
            if omitted.contains(&level.first) {
                continue;
            }
            let energy = match level.exact {
                Some(exact) => Number::Exact(exact.energy),
                None => {
                    let (values, _) = self.system.numeric_states(&level, self.bits, &self.effort)?;
                    let value = values.into_iter().nth(index - level.first).ok_or(Obstacle::Undecided)?;
                    Number::Approx(Complex::with_val(self.bits + 32, (value, 0)))
                }
            };
            let singular = || Obstacle::Singular { level: format!("state {index} (energy {:.6})", rough.to_f64()) };
            if energy == resolvent.z {
                return Err(singular());
            }
            let distance = Float::with_val(64, energy.to_complex(self.bits + 32).real() - z).abs();
            if distance <= Float::with_val(64, &size >> (self.bits - self.bits / 8)) {
                return Err(match &resolvent.z {
                    Number::Exact(_) => Obstacle::Undecided,
                    Number::Approx(_) => singular(),
                });
            }
        }
        Ok(())
    }

    /// A system that has no solution at this precision stands at an eigenvalue or too near to one.
    fn unsolved(&self, error: LinalgError, z: &Complex) -> Obstacle {
        match error {
            LinalgError::Singular { .. } | LinalgError::NoPivot { .. } => {
                Obstacle::Singular { level: self.system.nearest_level(&self.hermitian, z.real()) }
            }
            other => obstacle(other),
        }
    }

    fn eigenpairs(&self) -> Result<Arc<Eigenpairs>, Obstacle> {
        let mut known = self.eigenpairs.lock().unwrap_or_else(PoisonError::into_inner);
        if let Some(pairs) = &*known {
            return Ok(pairs.clone());
        }
        let pairs = Arc::new(all_eigenpairs(&self.hermitian, self.bits + 32, &self.effort).map_err(obstacle)?);
        *known = Some(pairs.clone());
        Ok(pairs)
    }
}

impl Backend for NumericBackend {
    fn state(&self, state: &State) -> Result<Vec<(Sector, BlockKet)>, Obstacle> {
        Ok(vec![(WHOLE, Arc::new(self.eigenstate(self.system.index(state))?))])
    }

    fn apply(&self, operator: &RadialOperator, _: Sector, _: Sector, ket: &BlockKet) -> Result<BlockKet, Obstacle> {
        self.effort.check()?;
        let ket = open(ket)?;
        let precision = self.precision();
        let image: NumericKet = self
            .rows(operator)?
            .iter()
            .map(|row| {
                let mut sum = Complex::new(precision);
                for (column, entry) in row {
                    sum += Complex::with_val(precision, entry * &ket[*column]);
                }
                sum
            })
            .collect();
        Ok(Arc::new(image))
    }

    fn resolve(&self, resolvent: &Resolvent, _: Sector, ket: &BlockKet) -> Result<BlockKet, Obstacle> {
        let solved = self.solver(resolvent)?.solve(open(ket)?, &self.effort).map_err(obstacle)?;
        let precision = self.precision();
        let ket: NumericKet = solved.ket.iter().map(|x| Complex::with_val(precision, x)).collect();
        Ok(Arc::new(ket))
    }

    fn function(&self, function: &FunctionOfH, _: Sector, ket: &BlockKet) -> Result<BlockKet, Obstacle> {
        let ket = open(ket)?;
        let pairs = self.eigenpairs()?;
        let precision = self.precision();
        let (constant, slope) = (function.constant.to_complex(precision), function.slope.to_complex(precision));
        let mut left_out = Vec::new();
        for first in self.system.omitted_levels(&function.omitted, &self.effort)? {
            let level = self.system.level(first, &self.effort)?;
            left_out.push(level.first..level.first + level.size);
        }
        let size = pairs.values.iter().map(|v| Float::with_val(32, v.abs_ref())).fold(Float::new(32), |a, b| a.max(&b));
        let mut image = vec![Complex::new(precision); ket.len()];
        for (index, (value, vector)) in pairs.values.iter().zip(&pairs.vectors).enumerate() {
            if left_out.iter().any(|range| range.contains(&index)) {
                continue;
            }
            let argument = Complex::with_val(precision, &slope * value) + &constant;
            let noise = Float::with_val(32, &size + 1u32) >> (self.bits - self.bits / 8);
            let length = Float::with_val(32, Complex::with_val(32, &argument).abs().real());
            if function.kind == FunctionKind::Ln && length <= noise {
                return Err(Obstacle::Singular { level: format!("state {index}") });
            }
            let factor = match function.kind {
                FunctionKind::Exp => argument.exp(),
                // On the cut the value is the one from above, as for numbers.
                FunctionKind::Ln => argument.ln(),
                FunctionKind::Sqrt => argument.sqrt(),
            };
            let amplitude = factor * dot(vector, ket, precision);
            for (entry, v) in image.iter_mut().zip(vector) {
                *entry += Complex::with_val(precision, v * &amplitude);
            }
        }
        Ok(Arc::new(image))
    }

    fn combine(&self, _: Sector, terms: &[(Number, BlockKet)]) -> Result<BlockKet, Obstacle> {
        let precision = self.precision();
        let mut sum = vec![Complex::new(precision); self.system.order()];
        for (factor, ket) in terms {
            let factor = factor.to_complex(precision);
            for (entry, x) in sum.iter_mut().zip(open(ket)?) {
                *entry += Complex::with_val(precision, x * &factor);
            }
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
        open(ket).is_ok_and(|ket| ket.iter().all(|x| x.real().is_zero() && x.imag().is_zero()))
    }
}
