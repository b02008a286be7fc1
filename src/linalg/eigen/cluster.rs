//! Some eigenvalues and eigenvectors to any precision, with all those that machine numbers cannot tell from them.

use std::ops::Range;

use nalgebra::DMatrix;
use rug::{Complex, Float};

use super::full::{Eigenpairs, all_eigenpairs};
use super::preview::{Preview, spectrum_preview};
use crate::linalg::error::LinalgError;
use crate::linalg::hermitian::HermitianMatrix;
use crate::linalg::shifted::ShiftedSolver;
use crate::linalg::vectors::{add_multiple, at_precision, divide, exponent_complex, inner, norm};
use crate::num::Effort;

/// Bits beyond those wanted.
const GUARD: u32 = 40;

/// Bits that a step of inverse iteration gains at least, for the nearest values machine numbers still tell apart.
const GAINED: u32 = 4;

/// Times the precision is raised to tell eigenvalues of one cluster apart.
const RAISES: usize = 4;

/// Consecutive eigenvalues with orthonormal eigenvectors.
#[derive(Clone, Debug)]
pub struct EigenCluster {
    /// The place of the first value in the whole spectrum, counted from 0.
    pub first: usize,
    /// The eigenvalues in rising order.
    pub values: Vec<Float>,
    /// The eigenvectors, real (zero imaginary parts) for a real matrix.
    pub vectors: Vec<Vec<Complex>>,
    /// The values that belong to one level each: nearer to each other than 2^-bits of the largest eigenvalue. Indices
    /// into `values`.
    pub levels: Vec<Range<usize>>,
    /// The distance to the nearest eigenvalue outside, to the accuracy of machine numbers; `None` if there is none.
    pub gap: Option<Float>,
}

impl EigenCluster {
    /// Returns the values of the level that holds an eigenvalue, given by its place in the whole spectrum, as indices
    /// into `values`.
    pub fn level_of(&self, index: usize) -> Option<Range<usize>> {
        let place = index.checked_sub(self.first)?;
        self.levels.iter().find(|level| level.contains(&place)).cloned()
    }
}

/// Finds the eigenvalues number `wanted` (from 0, in rising order) and their eigenvectors, with all those that
/// machine numbers cannot tell from them.
///
/// *Accuracy*: values within 2^-bits of the largest eigenvalue; vectors of different levels within 2^-bits, even where
/// values agree in machine numbers; a level is what stays together at 2^-bits of the largest eigenvalue. Residuals are
/// checked. *Errors*: an index beyond the order, or an iteration that does not settle. *Cost*: one factorisation of H
/// less a number, then for each vector about one solve for every 50 bits; where the cluster is more than half of the
/// spectrum, all eigenpairs. *Source*: inverse iteration on a subspace with the Rayleigh-Ritz projection, as in
/// Parlett, The Symmetric Eigenvalue Problem, chapter 14.
pub fn refine_cluster(
    h: &HermitianMatrix,
    wanted: Range<usize>,
    bits: u32,
    effort: &Effort,
) -> Result<EigenCluster, LinalgError> {
    let preview = spectrum_preview(h, effort)?;
    refine_cluster_near(h, preview.as_ref(), wanted, bits, effort)
}

/// Like [`refine_cluster`], with the preview of H where one is known.
pub fn refine_cluster_near(
    h: &HermitianMatrix,
    preview: Option<&Preview>,
    wanted: Range<usize>,
    bits: u32,
    effort: &Effort,
) -> Result<EigenCluster, LinalgError> {
    let order = h.order();
    if wanted.end > order || wanted.is_empty() {
        return Err(LinalgError::NoSuchEigenvalue { last: wanted.end.saturating_sub(1), order });
    }
    let Some(preview) = preview else { return from_all(h, None, wanted, bits, effort) };
    let range = preview.cluster(wanted.start, wanted.end - 1);
    if 2 * range.len() > order {
        return from_all(h, Some(preview), range, bits, effort);
    }
    iterate(h, preview, range, bits, effort)
}

/// Takes a range out of all eigenpairs.
fn from_all(
    h: &HermitianMatrix,
    preview: Option<&Preview>,
    range: Range<usize>,
    bits: u32,
    effort: &Effort,
) -> Result<EigenCluster, LinalgError> {
    let scale = i64::from(preview.map_or(0, |p| p.exponent)).max(h.exponent().unwrap_or(0));
    let mut precision = bits.saturating_add(GUARD);
    for _ in 0..RAISES {
        let Eigenpairs { values, vectors } = all_eigenpairs(h, precision, effort)?;
        let levels = levels(&values, scale - i64::from(bits));
        let needed = precision_needed(&values, &levels, scale, bits);
        if needed > precision {
            precision = needed;
            continue;
        }
        // The level of a wanted value is always whole.
        let start = levels.iter().find(|l| l.contains(&range.start)).map_or(range.start, |l| l.start);
        let end = levels.iter().find(|l| l.contains(&(range.end - 1))).map_or(range.end, |l| l.end);
        let inside = |l: &&Range<usize>| l.start >= start && l.end <= end;
        let below = start.checked_sub(1).map(|i| Float::with_val(64, &values[start] - &values[i]));
        let above = values.get(end).map(|next| Float::with_val(64, next - &values[end - 1]));
        return Ok(EigenCluster {
            first: start,
            levels: levels.iter().filter(inside).map(|l| l.start - start..l.end - start).collect(),
            values: values[start..end].to_vec(),
            vectors: vectors[start..end].to_vec(),
            gap: match (below, above) {
                (Some(a), Some(b)) => Some(a.min(&b)),
                (a, b) => a.or(b),
            },
        });
    }
    Err(LinalgError::EigenvaluesUnsettled { wanted: bits, holds: 0 })
}

/// Runs inverse iteration for one cluster, at a precision that rises until its levels are told apart.
fn iterate(
    h: &HermitianMatrix,
    preview: &Preview,
    range: Range<usize>,
    bits: u32,
    effort: &Effort,
) -> Result<EigenCluster, LinalgError> {
    let (values, scale) = (&preview.values, i64::from(preview.exponent));
    let largest = values.iter().fold(f64::MIN_POSITIVE, |m, v| m.max(v.abs()));
    let below = range.start.checked_sub(1).map(|i| values[range.start] - values[i]);
    let above = values.get(range.end).map(|next| next - values[range.end - 1]);
    let distance = below.into_iter().chain(above).fold(f64::INFINITY, f64::min);
    // Machine numbers misplace the ends of the gap a little.
    let gap_bits = (largest / distance).log2().max(0.0).ceil() as u32 + 1;
    let mut block = start_block(h, range.len(), bits);
    let mut precision = bits.saturating_add(gap_bits).saturating_add(GUARD);
    for _ in 0..RAISES {
        let ritz = settle(h, preview, &range, block, gap_bits, precision, effort)?;
        let levels = levels(&ritz.values, scale - i64::from(bits));
        let needed = precision_needed(&ritz.values, &levels, scale, bits).saturating_add(gap_bits);
        if needed <= precision {
            let gap = distance.is_finite().then(|| Float::with_val(64, distance) << preview.exponent);
            return Ok(EigenCluster { first: range.start, values: ritz.values, vectors: ritz.vectors, levels, gap });
        }
        block = ritz.vectors;
        precision = needed;
    }
    Err(LinalgError::EigenvaluesUnsettled { wanted: bits, holds: 0 })
}

/// Iterates a block at one precision until it spans an invariant subspace, and returns the eigenpairs in it.
fn settle(
    h: &HermitianMatrix,
    preview: &Preview,
    range: &Range<usize>,
    mut block: Vec<Vec<Complex>>,
    gap_bits: u32,
    precision: u32,
    effort: &Effort,
) -> Result<Eigenpairs, LinalgError> {
    let scale = i64::from(preview.exponent);
    let working = precision.saturating_add(GUARD);
    let solver = nearby_solver(h, preview, range, working, effort)?;
    let mut holds = 0;
    for _ in 0..32 + working / GAINED {
        for vector in &mut block {
            *vector = solver.solve(vector, effort)?.ket;
        }
        orthonormalise(&mut block, working);
        let images: Vec<Vec<Complex>> = block.iter().map(|v| h.apply(v, working)).collect();
        // What H leads out of the block is the residual of the subspace.
        let mut outside: Option<i64> = None;
        for image in &images {
            effort.check()?;
            let mut rest = image.clone();
            for v in &block {
                let component = -inner(v, &rest, working);
                add_multiple(&mut rest, &component, v);
            }
            outside = outside.max(exponent_complex(&rest));
        }
        let reached = outside.map_or(i64::from(working), |e| scale - e);
        if reached >= i64::from(precision) {
            return ritz(h, &block, &images, working, effort);
        }
        holds = reached - i64::from(gap_bits);
    }
    Err(LinalgError::EigenvaluesUnsettled { wanted: precision, holds: holds.clamp(0, i64::from(i32::MAX)) as i32 })
}

/// Factors H less a number close to the cluster, but not on one of its values.
fn nearby_solver(
    h: &HermitianMatrix,
    preview: &Preview,
    range: &Range<usize>,
    bits: u32,
    effort: &Effort,
) -> Result<ShiftedSolver, LinalgError> {
    let values = &preview.values;
    let largest = values.iter().fold(f64::MIN_POSITIVE, |m, v| m.max(v.abs()));
    let centre = (values[range.start] + values[range.end - 1]) / 2.0;
    // The square root of 1/2 of a step that machine numbers just resolve: no eigenvalue of a matrix of rationals is
    // there.
    let mut error = LinalgError::NotFinite;
    for step in [1.0, -1.0, 3.0, -3.0] {
        let aside = std::f64::consts::FRAC_1_SQRT_2 * step * largest * (-46.0_f64).exp2();
        let shift = Float::with_val(bits.max(64), centre + aside) << preview.exponent;
        match ShiftedSolver::new(h, (&shift, None), &[], bits, effort) {
            Ok(solver) => return Ok(solver),
            Err(stop @ LinalgError::Interrupted(_)) => return Err(stop),
            Err(other) => error = other,
        }
    }
    Err(error)
}

/// Returns a block of vectors with irregular components, the same at every call.
fn start_block(h: &HermitianMatrix, count: usize, bits: u32) -> Vec<Vec<Complex>> {
    let mut state = 0x2545_F491_4F6C_DD1D_u64;
    let mut next = || {
        state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (state >> 33) as i32 - (1 << 30)
    };
    let precision = bits.max(64);
    let mut component = || {
        let im = if h.is_real() { 0 } else { next() };
        Complex::with_val(precision, (next(), im))
    };
    (0..count).map(|_| (0..h.order()).map(|_| component()).collect()).collect()
}

/// Makes a block orthonormal, twice over so that nearly parallel vectors come out right.
fn orthonormalise(block: &mut [Vec<Complex>], precision: u32) {
    for k in 0..block.len() {
        let (known, rest) = block.split_at_mut(k);
        let mut vector = at_precision(&rest[0], precision);
        let length = norm(&vector, precision);
        divide(&mut vector, &length);
        for _ in 0..2 {
            for v in known.iter() {
                let component = -inner(v, &vector, precision);
                add_multiple(&mut vector, &component, v);
            }
            let length = norm(&vector, precision);
            divide(&mut vector, &length);
        }
        rest[0] = vector;
    }
}

/// Diagonalises H within an invariant block.
fn ritz(
    h: &HermitianMatrix,
    block: &[Vec<Complex>],
    images: &[Vec<Complex>],
    working: u32,
    effort: &Effort,
) -> Result<Eigenpairs, LinalgError> {
    let count = block.len();
    let mut small = DMatrix::from_element(count, count, Complex::new(working));
    for i in 0..count {
        for j in 0..=i {
            small[(i, j)] = inner(&block[i], &images[j], working);
        }
    }
    // Less its first entry, so that the differences within the cluster keep all their bits.
    let centre = small[(0, 0)].real().clone();
    let entry = |i: usize, j: usize| if i >= j { &small[(i, j)] } else { &small[(j, i)] };
    let re = DMatrix::from_fn(count, count, |i, j| {
        let mut re = entry(i, j).real().clone();
        if i == j {
            re -= &centre;
        }
        re
    });
    let im = DMatrix::from_fn(count, count, |i, j| match i.cmp(&j) {
        std::cmp::Ordering::Greater => entry(i, j).imag().clone(),
        std::cmp::Ordering::Equal => Float::new(working),
        std::cmp::Ordering::Less => -entry(i, j).imag().clone(),
    });
    let small = HermitianMatrix::new(re, (!h.is_real()).then_some(im))?;
    let Eigenpairs { mut values, vectors: turns } = all_eigenpairs(&small, working, effort)?;
    for value in &mut values {
        *value = Float::with_val(working, &*value + &centre);
    }
    let vectors = turns
        .iter()
        .map(|turn| {
            let mut vector = vec![Complex::new(working); h.order()];
            for (coefficient, v) in turn.iter().zip(block) {
                add_multiple(&mut vector, coefficient, v);
            }
            vector
        })
        .collect();
    Ok(Eigenpairs { values, vectors })
}

/// Joins values in rising order that differ by less than 2^exponent.
fn levels(values: &[Float], exponent: i64) -> Vec<Range<usize>> {
    let mut levels: Vec<Range<usize>> = Vec::new();
    for i in 0..values.len() {
        let joins = i > 0 && {
            let difference = Float::with_val(values[i].prec(), &values[i] - &values[i - 1]);
            difference.get_exp().is_none_or(|e| i64::from(e) <= exponent)
        };
        match levels.last_mut() {
            Some(level) if joins => level.end = i + 1,
            _ => levels.push(i..i + 1),
        }
    }
    levels
}

/// Returns the precision at which the vectors of the nearest two levels are good to the wanted bits.
fn precision_needed(values: &[Float], levels: &[Range<usize>], scale: i64, bits: u32) -> u32 {
    let nearest = levels
        .windows(2)
        .filter_map(|pair| {
            let difference = Float::with_val(values[0].prec(), &values[pair[1].start] - &values[pair[0].end - 1]);
            difference.get_exp()
        })
        .min();
    let lost = nearest.map_or(0, |e| (scale - i64::from(e)).max(0));
    bits.saturating_add(GUARD).saturating_add(u32::try_from(lost).unwrap_or(u32::MAX / 2))
}
