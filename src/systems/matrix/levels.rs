//! The levels of a matrix: which states are degenerate, and which energies and states are exact.
//!
//! A level is told from its neighbours by numbers that differ, and declared degenerate only when the count of distinct eigenvalues, certified
//! modulo primes, leaves no other reading. Its states are the orthonormalised projections of the basis vectors e_1, e_2, … on the level, in this
//! order: for a diagonal H the basis vectors themselves.

use super::MatrixSystem;
use super::elimination::{LARGEST_RATIONAL, LARGEST_WITH_ROOTS, solve};
use super::entries::ExactMatrix;
use crate::linalg::distinct::{Prime, distinct_eigenvalues};
use crate::linalg::eigen::{all_eigenpairs, refine_cluster};
use crate::linalg::{HermitianMatrix, LinalgError};
use crate::num::{ComplexBall, Effort, Scalar, Surd};
use crate::systems::Obstacle;
use nalgebra::DMatrix;
use rug::{Complex, Float, Integer, Rational};
use std::cmp::Ordering;
use std::collections::BTreeMap;

/// Bits at which eigenvalues are first told apart.
const FIRST_BITS: u32 = 192;

/// Bits at which the attempt to tell them apart ends.
const LAST_BITS: u32 = 20_000;

/// Longest denominator of a rational that an eigenvalue is guessed to be, in bits.
const GUESS_BITS: u32 = 64;

/// A sparse exact vector.
pub type ExactKet = BTreeMap<usize, Surd>;

/// A level: its place in the spectrum, and what is exact of it.
#[derive(Clone, Debug)]
pub struct LevelOfMatrix {
    /// The place of its first state, counted from 0.
    pub first: usize,
    /// Number of states.
    pub size: usize,
    pub exact: Option<ExactLevel>,
}

#[derive(Clone, Debug)]
pub struct ExactLevel {
    pub energy: Surd,
    /// Orthonormal states in the order of their labels; `None` where a norm is not a square root of a rational.
    pub states: Option<Vec<ExactKet>>,
    /// Vectors that span the level, each inside one connected component.
    pub span: Vec<ExactKet>,
}

/// Turns a failed linear-algebra step into an obstacle: what more precision may cure is undecided.
pub fn obstacle(error: LinalgError) -> Obstacle {
    match error {
        LinalgError::Interrupted(stop) => Obstacle::Interrupted(stop),
        LinalgError::Singular { .. }
        | LinalgError::NoPivot { .. }
        | LinalgError::IllConditioned { .. }
        | LinalgError::EigenvaluesUnsettled { .. } => Obstacle::Undecided,
        other => Obstacle::Refused { message: other.to_string(), help: String::new() },
    }
}

impl MatrixSystem {
    /// H with entries of `bits` bits.
    pub(super) fn hermitian(&self, bits: u32) -> Result<HermitianMatrix, Obstacle> {
        let h = self.hamiltonian();
        let n = h.order();
        let zero = Float::new(bits);
        let mut re = DMatrix::from_element(n, n, zero.clone());
        let mut im = (!h.is_real()).then(|| DMatrix::from_element(n, n, zero));
        for (row, entries) in h.rows().iter().enumerate() {
            for (column, entry) in entries.range(..=row) {
                let value = ComplexBall::from_surd(entry, bits)
                    .map_err(|error| Obstacle::Refused { message: error.to_string(), help: String::new() })?
                    .midpoint(bits);
                re[(row, *column)] = value.real().clone();
                re[(*column, row)] = value.real().clone();
                if let Some(im) = &mut im {
                    im[(row, *column)] = value.imag().clone();
                    im[(*column, row)] = Float::with_val(bits, -value.imag());
                }
            }
        }
        HermitianMatrix::new(re, im).map_err(obstacle)
    }

    /// The level that holds the state with this place in the spectrum.
    pub(super) fn level(&self, index: usize, effort: &Effort) -> Result<LevelOfMatrix, Obstacle> {
        let mut known = self.levels.lock().unwrap_or_else(std::sync::PoisonError::into_inner);
        if let Some(level) = known.iter().find(|level| (level.first..level.first + level.size).contains(&index)) {
            return Ok(level.clone());
        }
        let level = if self.components.iter().all(|component| component.len() == 1) {
            self.diagonal_level(index)?
        } else {
            self.numeric_level(index, effort)?
        };
        known.push(level.clone());
        Ok(level)
    }

    fn diagonal_level(&self, index: usize) -> Result<LevelOfMatrix, Obstacle> {
        let h = self.hamiltonian();
        let mut order: Vec<(Surd, usize)> = (0..h.order()).map(|k| (h.entry(k, k), k)).collect();
        let mut undecided = false;
        order.sort_by(|a, b| {
            let compared = exact_order(&a.0, &b.0);
            undecided |= compared.is_none();
            compared.unwrap_or(Ordering::Equal).then(a.1.cmp(&b.1))
        });
        if undecided {
            return Err(Obstacle::Undecided);
        }
        let energy = order[index].0.clone();
        let members: Vec<usize> = order.iter().filter(|(e, _)| *e == energy).map(|(_, k)| *k).collect();
        let first = order.iter().position(|(e, _)| *e == energy).unwrap_or(index);
        let states: Vec<ExactKet> = members.iter().map(|k| BTreeMap::from([(*k, Surd::one())])).collect();
        let exact = ExactLevel { energy, span: states.clone(), states: Some(states) };
        Ok(LevelOfMatrix { first, size: members.len(), exact: Some(exact) })
    }

    fn numeric_level(&self, index: usize, effort: &Effort) -> Result<LevelOfMatrix, Obstacle> {
        let mut bits = FIRST_BITS.max(self.entry_bits);
        loop {
            effort.check()?;
            let h = self.hermitian(bits + 64)?;
            let cluster = refine_cluster(&h, index..index + 1, bits, effort).map_err(obstacle)?;
            let level = cluster.level_of(index).unwrap_or(index - cluster.first..index - cluster.first + 1);
            let (first, size) = (cluster.first + level.start, level.len());
            if let Some(exact) = self.exact_level(&cluster.values[level.start], size, effort)? {
                return Ok(LevelOfMatrix { first, size, exact: Some(exact) });
            }
            if size == 1 || self.is_certain(&h, bits, effort)? {
                return Ok(LevelOfMatrix { first, size, exact: None });
            }
            if bits >= LAST_BITS {
                return Err(Obstacle::Refused {
                    message: format!(
                        "the states {first} to {} cannot be told apart, nor shown to be degenerate, with {bits} bits",
                        first + size - 1
                    ),
                    help: "scale the matrix, or give it with fewer digits".into(),
                });
            }
            bits *= 2;
        }
    }

    /// Tells whether the eigenvalues that agree to `bits` bits are all equal: there are as many clusters as distinct eigenvalues.
    fn is_certain(&self, h: &HermitianMatrix, bits: u32, effort: &Effort) -> Result<bool, Obstacle> {
        let pairs = all_eigenpairs(h, bits, effort).map_err(obstacle)?;
        let size = pairs.values.iter().map(|v| Float::with_val(32, v.abs_ref())).fold(Float::new(32), |a, b| a.max(&b));
        let close = size >> (bits - bits / 8);
        let clusters =
            1 + pairs.values.windows(2).filter(|pair| Float::with_val(64, &pair[1] - &pair[0]) > close).count();
        Ok(clusters == self.distinct(effort)?)
    }

    /// The certified number of distinct eigenvalues.
    fn distinct(&self, effort: &Effort) -> Result<usize, Obstacle> {
        let mut known = self.distinct.lock().unwrap_or_else(std::sync::PoisonError::into_inner);
        if let Some(count) = *known {
            return Ok(count);
        }
        let h = self.hamiltonian();
        let count = distinct_eigenvalues(h.order(), &|prime| entries_modulo(h, prime), effort).map_err(obstacle)?;
        *known = Some(count);
        Ok(count)
    }

    /// The level at a rational energy near `value`, if there is one and it has `size` states.
    fn exact_level(&self, value: &Float, size: usize, effort: &Effort) -> Result<Option<ExactLevel>, Obstacle> {
        let h = self.hamiltonian();
        let mut candidates: Vec<Surd> = guess(value).map(Surd::from).into_iter().collect();
        for component in self.components.iter().filter(|component| component.len() == 1) {
            let entry = h.entry(component[0], component[0]);
            if near(&entry, value) && !candidates.contains(&entry) {
                candidates.push(entry);
            }
        }
        for energy in candidates {
            let Some(span) = self.span_at(&energy, effort)? else { continue };
            if span.len() == size {
                let states = canonical(&span, h.order());
                return Ok(Some(ExactLevel { energy, states, span }));
            }
        }
        Ok(None)
    }

    /// Vectors that span the eigenspace of an exact energy, component by component; `None` if a component is too large to tell.
    pub(super) fn span_at(&self, energy: &Surd, effort: &Effort) -> Result<Option<Vec<ExactKet>>, Obstacle> {
        let mut span = Vec::new();
        for component in &self.components {
            let Some(rows) = self.shifted_rows(component, energy, |_| Surd::zero()) else { return Ok(None) };
            let Some(solutions) = solve(rows, effort)? else { return Ok(None) };
            for vector in solutions.null_space {
                span.push(
                    component.iter().copied().zip(vector).filter(|(_, entry)| !entry.is_zero()).collect::<ExactKet>(),
                );
            }
        }
        Ok(Some(span))
    }

    /// The rows of energy - H inside a component, with a right-hand side as last column; `None` when the component is too large.
    pub(super) fn shifted_rows(
        &self,
        component: &[usize],
        energy: &Surd,
        right: impl Fn(usize) -> Surd,
    ) -> Option<Vec<Vec<Surd>>> {
        let h = self.hamiltonian();
        let with_roots = energy.as_rational().is_none()
            || component.iter().any(|row| h.rows()[*row].values().any(|entry| !is_gaussian(entry)));
        if component.len() > if with_roots { LARGEST_WITH_ROOTS } else { LARGEST_RATIONAL } {
            return None;
        }
        Some(
            component
                .iter()
                .map(|row| {
                    let mut entries: Vec<Surd> = component
                        .iter()
                        .map(|column| {
                            let entry = -&h.entry(*row, *column);
                            if row == column { &entry + energy } else { entry }
                        })
                        .collect();
                    entries.push(right(*row));
                    entries
                })
                .collect(),
        )
    }

    /// The states of a level at `bits` bits, in the order of their labels.
    pub(super) fn numeric_states(
        &self,
        level: &LevelOfMatrix,
        bits: u32,
        effort: &Effort,
    ) -> Result<(Vec<Float>, Vec<Vec<Complex>>), Obstacle> {
        let h = self.hermitian(bits + 64)?;
        let range = level.first..level.first + level.size;
        let cluster = refine_cluster(&h, range.clone(), bits + 32, effort).map_err(obstacle)?;
        let inside = range.start - cluster.first..range.end - cluster.first;
        let (Some(values), Some(vectors)) = (cluster.values.get(inside.clone()), cluster.vectors.get(inside)) else {
            return Err(Obstacle::Undecided);
        };
        Ok((values.to_vec(), projected(vectors, bits + 32)))
    }
}

fn is_gaussian(entry: &Surd) -> bool {
    !entry.has_pi() && entry.terms().all(|(unit, _)| unit.radicand == 1)
}

/// Exact comparison of two real numbers.
fn exact_order(a: &Surd, b: &Surd) -> Option<Ordering> {
    if a == b {
        return Some(Ordering::Equal);
    }
    Scalar::Exact(a - b).sign().ok()
}

/// A rational with a short denominator that agrees with a value far beyond chance; from its continued fraction.
fn guess(value: &Float) -> Option<Rational> {
    let exact = value.to_rational()?;
    let (mut rest, mut h, mut k) =
        (exact.clone(), (Integer::from(1), Integer::new()), (Integer::new(), Integer::from(1)));
    loop {
        let whole = Integer::from(rest.floor_ref());
        let next_h = Integer::from(&whole * &h.0) + &h.1;
        let next_k = Integer::from(&whole * &k.0) + &k.1;
        h = (next_h, h.0);
        k = (next_k, k.0);
        if k.0.significant_bits() > GUESS_BITS {
            return None;
        }
        let convergent = Rational::from((h.0.clone(), k.0.clone()));
        let distance = Rational::from(&convergent - &exact).abs();
        let bound = Rational::from((Integer::from(1), Integer::from(1) << (3 * GUESS_BITS / 2 + 32)));
        if distance < bound {
            return Some(convergent);
        }
        rest -= whole;
        if rest == 0 {
            return None;
        }
        rest.recip_mut();
    }
}

fn near(entry: &Surd, value: &Float) -> bool {
    let Ok(ball) = ComplexBall::from_surd(entry, 128) else { return false };
    let distance = Float::with_val(64, ball.re.mid() - value).abs();
    distance <= (Float::with_val(64, value.abs_ref()) + 1u32) >> 60u32
}

/// The image of H modulo a prime in which every square root and i have one.
fn entries_modulo(h: &ExactMatrix, prime: &Prime) -> Option<Vec<u64>> {
    let i = prime.sqrt(prime.from_i64(-1))?;
    let pi = prime.from_i64(0x3243_F6A8_885A_308D);
    let mut roots: BTreeMap<Integer, u64> = BTreeMap::new();
    let mut image = vec![0; h.order() * h.order()];
    for (row, entries) in h.rows().iter().enumerate() {
        for (column, entry) in entries {
            let mut sum = 0;
            for (unit, c) in entry.terms() {
                let radicand = &unit.radicand;
                let root = match roots.get(radicand) {
                    Some(root) => *root,
                    None => {
                        let root = root_modulo(radicand, prime)?;
                        roots.insert(radicand.clone(), root);
                        root
                    }
                };
                // pi is transcendental: any element serves as its image, for all but a vanishing share of primes.
                let power = prime.power(pi, u64::from(unit.pi_power.unsigned_abs()));
                let power = if unit.pi_power < 0 { prime.inverse(power)? } else { power };
                let root = prime.multiply(root, power);
                let part = prime.add(fraction(&c.re, prime)?, prime.multiply(i, fraction(&c.im, prime)?));
                sum = prime.add(sum, prime.multiply(root, part));
            }
            image[row * h.order() + column] = sum;
        }
    }
    Some(image)
}

/// The square root of a squarefree integer as the product of those of its prime factors, so that products of roots fit.
fn root_modulo(radicand: &Integer, prime: &Prime) -> Option<u64> {
    let mut rest = radicand.clone();
    let mut root = prime.from_i64(1);
    let mut factor = 2u32;
    while Integer::from(factor) * factor <= rest && factor < 1 << 16 {
        if rest.is_divisible_u(factor) {
            rest.div_exact_u_mut(factor);
            root = prime.multiply(root, prime.sqrt(prime.from_i64(i64::from(factor)))?);
        }
        factor += 1;
    }
    Some(prime.multiply(root, prime.sqrt(prime.from_integer(&rest))?))
}

fn fraction(q: &Rational, prime: &Prime) -> Option<u64> {
    let below = prime.inverse(prime.from_integer(q.denom()))?;
    Some(prime.multiply(prime.from_integer(q.numer()), below))
}

/// <a|b> of sparse vectors.
pub fn inner(a: &ExactKet, b: &ExactKet) -> Surd {
    let mut sum = Surd::zero();
    for (k, x) in a {
        if let Some(y) = b.get(k) {
            sum += &(&x.conj() * y);
        }
    }
    sum
}

/// a + c b
pub fn add_multiple(a: &mut ExactKet, c: &Surd, b: &ExactKet) {
    for (k, y) in b {
        let entry = a.entry(*k).or_default();
        *entry += &(c * y);
        if entry.is_zero() {
            a.remove(k);
        }
    }
}

/// Orthogonal (not normalised) vectors with the same span.
pub fn orthogonal(span: &[ExactKet]) -> Option<Vec<(ExactKet, Surd)>> {
    let mut basis: Vec<(ExactKet, Surd)> = Vec::new();
    for vector in span {
        let mut rest = vector.clone();
        for (earlier, inverse_norm) in &basis {
            let overlap = inner(earlier, vector);
            add_multiple(&mut rest, &-&(&overlap * inverse_norm), earlier);
        }
        let norm = inner(&rest, &rest);
        if !norm.is_zero() {
            let inverse = norm.inverse()?;
            basis.push((rest, inverse));
        }
    }
    Some(basis)
}

/// The component of a vector in the span of orthogonal vectors.
pub fn projection(basis: &[(ExactKet, Surd)], vector: &ExactKet) -> ExactKet {
    let mut sum = ExactKet::new();
    for (direction, inverse_norm) in basis {
        let overlap = inner(direction, vector);
        if !overlap.is_zero() {
            add_multiple(&mut sum, &(&overlap * inverse_norm), direction);
        }
    }
    sum
}

/// The states of an exact level: the orthonormalised projections of e_1, e_2, …; `None` where a norm is not the root of a rational.
fn canonical(span: &[ExactKet], order: usize) -> Option<Vec<ExactKet>> {
    let basis = orthogonal(span)?;
    let mut states: Vec<ExactKet> = Vec::new();
    for k in 0..order {
        if states.len() == span.len() {
            break;
        }
        let mut vector = projection(&basis, &BTreeMap::from([(k, Surd::one())]));
        for state in &states {
            let overlap = inner(state, &vector);
            add_multiple(&mut vector, &-&overlap, state);
        }
        let norm = inner(&vector, &vector);
        if norm.is_zero() {
            continue;
        }
        let scale = norm.sqrt()?.inverse()?;
        states.push(vector.into_iter().map(|(k, x)| (k, &x * &scale)).collect());
    }
    Some(states)
}

/// The same in numbers: `vectors` are orthonormal and span the level.
fn projected(vectors: &[Vec<Complex>], bits: u32) -> Vec<Vec<Complex>> {
    let order = vectors.first().map_or(0, Vec::len);
    let mut states: Vec<Vec<Complex>> = Vec::new();
    // What is left of a basis vector must stand well above rounding; the choice is the same at every precision.
    let small = Float::with_val(32, 1) >> 64u32;
    for k in 0..order {
        if states.len() == vectors.len() {
            break;
        }
        let mut vector = vec![Complex::new(bits); order];
        for direction in vectors {
            let overlap = direction[k].clone().conj();
            for (entry, d) in vector.iter_mut().zip(direction) {
                *entry += Complex::with_val(bits, d * &overlap);
            }
        }
        for state in &states {
            let overlap = dot(state, &vector, bits);
            for (entry, s) in vector.iter_mut().zip(state) {
                *entry -= Complex::with_val(bits, s * &overlap);
            }
        }
        let norm = dot(&vector, &vector, bits).into_real_imag().0.sqrt();
        if norm > small {
            for entry in &mut vector {
                *entry /= &norm;
            }
            states.push(vector);
        }
    }
    states
}

/// <a|b>
pub fn dot(a: &[Complex], b: &[Complex], bits: u32) -> Complex {
    let mut sum = Complex::new(bits);
    for (x, y) in a.iter().zip(b) {
        sum += Complex::with_val(bits, x.clone().conj() * y);
    }
    sum
}
