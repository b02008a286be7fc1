//! The resolvent applied to a vector: (z - H) x = b for Hermitian H, whole or in the complement of given vectors.

use nalgebra::{DMatrix, DVector};
use rug::ops::NegAssign;
use rug::{Complex, Float};

use super::error::LinalgError;
use super::hermitian::HermitianMatrix;
use super::solve::{Solved, Solver};
use super::source::Source;
use super::vectors::{add_multiple, at_precision, inner};
use crate::num::Effort;

/// A vector that solves a shifted system, and the bits that hold of it relative to its largest component.
#[derive(Clone, Debug)]
pub struct SolvedKet {
    pub ket: Vec<Complex>,
    pub holds: i32,
}

/// How the complex system is written as a real one.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
enum Embedding {
    /// Everything real: two right-hand sides of the same symmetric matrix.
    Real,
    /// Complex H, real z: [[X, -Y], [Y, X]] with X symmetric and Y antisymmetric is symmetric.
    Hermitian,
    /// Real H, z = x + i y: [[x-H, -y], [-y, -(x-H)]], the second row with its sign turned, is symmetric.
    Flipped,
    /// Complex H and z: [[X, -Y], [Y, X]], not symmetric.
    General,
}

/// `z - H`, factored for any number of right-hand sides.
///
/// With vectors P to leave out it solves `Q (z - H) Q x = Q b` with x in the range of Q = 1 - P P^+, the reduced
/// resolvent where P spans the whole eigenspace of z.
///
/// *Shapes*: vectors of the order of H. *Accuracy*: the bits asked for, norm-wise, of the system as given; P enters
/// with its own errors, to first order in the range of Q and to second order in the compressed operator. *Cost*: that
/// of a real solver of the order n of H if everything is real, else of order 2n.
pub struct ShiftedSolver {
    solver: Solver,
    embedding: Embedding,
    /// The matrix factored is H - z instead of z - H.
    turned: bool,
    order: usize,
    without: Vec<Vec<Complex>>,
    precision: u32,
}

impl ShiftedSolver {
    /// Factors `z - H`, in the complement of the orthonormal vectors `without`, for solutions of `bits` bits.
    ///
    /// *Shapes*: `z` is the real part and, for a complex energy, the imaginary part. *Errors*:
    /// [`LinalgError::Singular`] when z is an eigenvalue (of the compressed operator) to the precision of the entries.
    pub fn new(
        h: &HermitianMatrix,
        z: (&Float, Option<&Float>),
        without: &[Vec<Complex>],
        bits: u32,
        effort: &Effort,
    ) -> Result<Self, LinalgError> {
        let order = h.order();
        if let Some(vector) = without.iter().find(|v| v.len() != order) {
            return Err(LinalgError::WrongLength { found: vector.len(), expected: order });
        }
        let z_imag = z.1.filter(|y| !y.is_zero());
        let precision = [h.precision(), z.0.prec(), z_imag.map_or(0, Float::prec), bits.saturating_add(64)]
            .into_iter()
            .chain(without.iter().flatten().map(|c| c.prec().0.max(c.prec().1)))
            .max()
            .unwrap_or(bits)
            .saturating_add(32);
        let real = h.is_real() && without.iter().flatten().all(|c| c.imag().is_zero());
        let embedding = match (real, z_imag) {
            (true, None) => Embedding::Real,
            (false, None) => Embedding::Hermitian,
            (true, Some(_)) => Embedding::Flipped,
            (false, Some(_)) => Embedding::General,
        };
        let source = if embedding == Embedding::Real && without.is_empty() {
            let entry = |i: usize| Float::with_val(precision, &h.re()[(i, i)] - z.0);
            Source::Shifted { matrix: h.shared_re(), diagonal: (0..order).map(entry).collect() }
        } else {
            let (x, y) = parts(h, z.0, z_imag, without, real, precision);
            Source::Whole(embed(embedding, x, y))
        };
        let turned = matches!(source, Source::Shifted { .. });
        // Forming z - H with more bits tells no more of H than its own bits do.
        let (symmetric, known) = (embedding != Embedding::General, h.precision());
        let solver = Solver::new(source, symmetric, known, bits, effort)?;
        Ok(Self { solver, embedding, turned, order, without: without.to_vec(), precision })
    }

    /// Solves for one right-hand side.
    ///
    /// *Errors*: a wrong length, or fewer bits than wanted at the highest sensible precision.
    pub fn solve(&self, b: &[Complex], effort: &Effort) -> Result<SolvedKet, LinalgError> {
        if b.len() != self.order {
            return Err(LinalgError::WrongLength { found: b.len(), expected: self.order });
        }
        let mut b = at_precision(b, self.precision.max(b.iter().map(|c| c.prec().0).max().unwrap_or(0)));
        self.project(&mut b);
        if self.turned {
            b.iter_mut().for_each(NegAssign::neg_assign);
        }
        let re = b.iter().map(|c| c.real().clone());
        let im = b.iter().map(|c| c.imag().clone());
        let (re, im, holds) = match self.embedding {
            Embedding::Real => {
                let real = self.solver.solve(&DVector::from_iterator(self.order, re), effort)?;
                let imag = if b.iter().all(|c| c.imag().is_zero()) {
                    Solved { x: DVector::from_element(self.order, Float::new(self.precision)), holds: real.holds }
                } else {
                    self.solver.solve(&DVector::from_iterator(self.order, im), effort)?
                };
                (real.x, imag.x, real.holds.min(imag.holds))
            }
            embedding => {
                let im: Vec<Float> = match embedding {
                    Embedding::Flipped => im.map(|x| -x).collect(),
                    _ => im.collect(),
                };
                let both = self.solver.solve(&DVector::from_iterator(2 * self.order, re.chain(im)), effort)?;
                let (re, im) = (both.x.rows(0, self.order), both.x.rows(self.order, self.order));
                (re.into_owned(), im.into_owned(), both.holds)
            }
        };
        let precision = re.iter().map(Float::prec).max().unwrap_or(self.precision);
        let mut ket: Vec<Complex> =
            re.iter().zip(im.iter()).map(|(re, im)| Complex::with_val(precision, (re, im))).collect();
        self.project(&mut ket);
        Ok(SolvedKet { ket, holds })
    }

    /// Returns an estimate of the binary logarithm of the condition number: the bits that rounding in H, z or b can
    /// cost.
    pub fn condition_bits(&self) -> u32 {
        self.solver.condition_bits()
    }

    /// Takes the components along the vectors left out away.
    fn project(&self, ket: &mut [Complex]) {
        for p in &self.without {
            let mut component = inner(p, ket, self.precision);
            component.neg_assign();
            add_multiple(ket, &component, p);
        }
    }
}

/// Returns the real and imaginary part of `z - H + s P P^+`, s of the size of `z - H` and of the sign most of its
/// eigenvalues have, so that the matrix of a lowest level stays definite; vectors that are real to `real` have no
/// imaginary part.
fn parts(
    h: &HermitianMatrix,
    x: &Float,
    y: Option<&Float>,
    without: &[Vec<Complex>],
    real: bool,
    precision: u32,
) -> (DMatrix<Float>, DMatrix<Float>) {
    let order = h.order();
    let mut re = DMatrix::from_fn(order, order, |i, j| Float::with_val(precision, -&h.re()[(i, j)]));
    let mut im = match h.im() {
        Some(im) => DMatrix::from_fn(order, order, |i, j| Float::with_val(precision, -&im[(i, j)])),
        None if real && y.is_none() => DMatrix::from_fn(0, 0, |_, _| Float::new(precision)),
        None => DMatrix::from_fn(order, order, |_, _| Float::new(precision)),
    };
    let mut trace = Float::new(64);
    for i in 0..order {
        re[(i, i)] += x;
        trace += &re[(i, i)];
        if let Some(y) = y {
            im[(i, i)] += y;
        }
    }
    if without.is_empty() {
        return (re, im);
    }
    let size = re.iter().filter_map(Float::get_exp).max().unwrap_or(0);
    let mut strength = Float::with_val(precision, 1);
    strength <<= size;
    if trace.is_sign_negative() {
        strength.neg_assign();
    }
    for p in without {
        for j in 0..order {
            let scaled = Complex::with_val(precision, p[j].conj_ref()) * &strength;
            // Entry (i, j) of s |p><p|, put on both sides of the diagonal so that they round alike.
            for i in j..order {
                let entry = Complex::with_val(precision, &scaled * &p[i]);
                re[(i, j)] += entry.real();
                if i != j {
                    re[(j, i)] += entry.real();
                }
                if !real {
                    im[(i, j)] += entry.imag();
                    if i != j {
                        im[(j, i)] -= entry.imag();
                    }
                }
            }
        }
    }
    (re, im)
}

/// Writes X + i Y as a real matrix.
fn embed(embedding: Embedding, x: DMatrix<Float>, y: DMatrix<Float>) -> DMatrix<Float> {
    if embedding == Embedding::Real {
        return x;
    }
    let order = x.nrows();
    let flipped = embedding == Embedding::Flipped;
    DMatrix::from_fn(2 * order, 2 * order, |i, j| {
        let (lower, right) = (i >= order, j >= order);
        let entry = (i % order, j % order);
        match (lower, right) {
            (false, false) => x[entry].clone(),
            (false, true) => Float::with_val(y[entry].prec(), -&y[entry]),
            (true, false) if flipped => Float::with_val(y[entry].prec(), -&y[entry]),
            (true, false) => y[entry].clone(),
            (true, true) if flipped => Float::with_val(x[entry].prec(), -&x[entry]),
            (true, true) => x[entry].clone(),
        }
    })
}
