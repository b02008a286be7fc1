//! Reduction of a real symmetric matrix to tridiagonal form by reflections, and the iteration that finishes it.

use rug::{Assign, Float};

use crate::linalg::error::LinalgError;
use crate::num::Effort;

/// Steps of the implicit QL iteration for one eigenvalue before it is given up.
const STEPS_EACH: usize = 200;

/// Adds a product to a sum through a scratch number, which is quicker than one fused operation.
fn add_product(sum: &mut Float, a: &Float, b: &Float, scratch: &mut Float) {
    scratch.assign(a * b);
    *sum += &*scratch;
}

/// Takes a product away from a sum.
fn subtract_product(sum: &mut Float, a: &Float, b: &Float, scratch: &mut Float) {
    scratch.assign(a * b);
    *sum -= &*scratch;
}

/// A real symmetric tridiagonal matrix similar to a full one, and the columns of the orthogonal matrix between them.
pub(super) struct Reduced {
    pub diagonal: Vec<Float>,
    pub off: Vec<Float>,
    /// `vectors[k]` is the k-th column of Q in A = Q T Q^T; after [`Reduced::diagonalise`] the k-th eigenvector.
    pub vectors: Vec<Vec<Float>>,
    precision: u32,
}

impl Reduced {
    /// Reduces the symmetric matrix given by the rows of its lower triangle.
    ///
    /// *Cost*: about 2 order^3 multiply-adds with the orthogonal matrix. *Source*: Householder reflections, as in G.
    /// H. Golub and C. F. Van Loan, Matrix Computations, 8.3.1.
    pub fn new(mut lower: Vec<Vec<Float>>, precision: u32, effort: &Effort) -> Result<Self, LinalgError> {
        let order = lower.len();
        let zero = || Float::new(precision);
        let mut scratch = zero();
        let mut off = Vec::with_capacity(order.saturating_sub(1));
        // Reflector k: 1 - b v v^T on the components after k.
        let mut reflectors: Vec<Option<(Vec<Float>, Float)>> = Vec::with_capacity(order);
        for k in 0..order.saturating_sub(1) {
            let mut v: Vec<Float> = lower[k + 1..].iter().map(|row| row[k].clone()).collect();
            if v[1..].iter().all(Float::is_zero) {
                off.push(v[0].clone());
                reflectors.push(None);
                continue;
            }
            let mut square = zero();
            for x in &v {
                add_product(&mut square, x, x, &mut scratch);
            }
            let mut alpha = square.clone().sqrt();
            if v[0].is_sign_positive() {
                alpha = -alpha;
            }
            // v.v = 2 (square - alpha v0), both terms of one sign.
            subtract_product(&mut square, &alpha, &v[0], &mut scratch);
            let b = square.recip();
            v[0] -= &alpha;
            off.push(alpha);
            // p = b A v, then w = p - (b/2)(v.p) v and A -= v w^T + w v^T.
            let count = v.len();
            let mut p: Vec<Float> = (0..count).map(|_| zero()).collect();
            for i in 0..count {
                effort.check()?;
                let row = &lower[k + 1 + i][k + 1..];
                let (before, rest) = p.split_at_mut(i);
                for j in 0..i {
                    add_product(&mut rest[0], &row[j], &v[j], &mut scratch);
                    add_product(&mut before[j], &row[j], &v[i], &mut scratch);
                }
                add_product(&mut rest[0], &row[i], &v[i], &mut scratch);
            }
            let mut along = zero();
            for (p, v) in p.iter_mut().zip(&v) {
                *p *= &b;
                add_product(&mut along, p, v, &mut scratch);
            }
            along *= &b;
            along >>= 1;
            for (p, v) in p.iter_mut().zip(&v) {
                subtract_product(p, &along, v, &mut scratch);
            }
            for i in 0..count {
                effort.check()?;
                let row = &mut lower[k + 1 + i][k + 1..];
                for j in 0..=i {
                    subtract_product(&mut row[j], &v[i], &p[j], &mut scratch);
                    subtract_product(&mut row[j], &p[i], &v[j], &mut scratch);
                }
            }
            reflectors.push(Some((v, b)));
        }
        let diagonal = lower.iter().enumerate().map(|(i, row)| row[i].clone()).collect();
        let mut vectors: Vec<Vec<Float>> =
            (0..order).map(|k| (0..order).map(|i| Float::with_val(precision, u32::from(i == k))).collect()).collect();
        for (k, reflector) in reflectors.iter().enumerate().rev() {
            let Some((v, b)) = reflector else { continue };
            for column in &mut vectors[k + 1..] {
                effort.check()?;
                let column = &mut column[k + 1..];
                let mut along = zero();
                for (c, v) in column.iter().zip(v) {
                    add_product(&mut along, c, v, &mut scratch);
                }
                along *= b;
                for (c, v) in column.iter_mut().zip(v) {
                    subtract_product(c, &along, v, &mut scratch);
                }
            }
        }
        Ok(Self { diagonal, off, vectors, precision })
    }

    /// Turns the tridiagonal matrix into a diagonal one, and the vectors along with it.
    ///
    /// *Accuracy*: norm-wise, a few units in the last place of the largest eigenvalue. *Errors*: more steps than ever
    /// needed. *Cost*: about 3 order^3 multiply-adds with the vectors. *Source*: the implicit QL iteration with
    /// Wilkinson's shift, as in B. N. Parlett, The Symmetric Eigenvalue Problem, chapter 8.
    pub fn diagonalise(&mut self, effort: &Effort) -> Result<(), LinalgError> {
        let order = self.diagonal.len();
        let precision = self.precision;
        let mut scratch = Float::new(precision);
        self.off.push(Float::new(precision));
        let largest = self.diagonal.iter().chain(&self.off).filter_map(Float::get_exp).max();
        let Some(largest) = largest else { return Ok(()) };
        let negligible =
            |e: &Float| e.get_exp().is_none_or(|e| i64::from(e) < i64::from(largest) - i64::from(precision));
        for l in 0..order {
            for step in 0.. {
                effort.check()?;
                let end = (l..order).find(|&m| m + 1 == order || negligible(&self.off[m])).unwrap_or(l);
                if end == l {
                    break;
                }
                if step == STEPS_EACH {
                    return Err(LinalgError::EigenvaluesUnsettled { wanted: precision, holds: 0 });
                }
                self.sweep(l, end, &mut scratch, effort)?;
            }
        }
        self.off.clear();
        Ok(())
    }

    /// Does one QL step on the rows `l..=end`.
    fn sweep(&mut self, l: usize, end: usize, scratch: &mut Float, effort: &Effort) -> Result<(), LinalgError> {
        let precision = self.precision;
        let (d, e) = (&mut self.diagonal, &mut self.off);
        // Wilkinson's shift from the upper corner.
        let mut g = Float::with_val(precision, &d[l + 1] - &d[l]);
        g /= &e[l];
        g >>= 1;
        let mut r = Float::with_val(precision, &g * &g);
        r += 1;
        r = r.sqrt();
        if g.is_sign_negative() {
            r = -r;
        }
        r += &g;
        let quotient = Float::with_val(precision, &e[l] / &r);
        g.assign(&d[end] - &d[l]);
        g += &quotient;
        let (mut s, mut c) = (Float::with_val(precision, 1), Float::with_val(precision, 1));
        let mut p = Float::new(precision);
        for i in (l..end).rev() {
            effort.check()?;
            let f = Float::with_val(precision, &s * &e[i]);
            let b = Float::with_val(precision, &c * &e[i]);
            let r = Float::with_val(precision, f.hypot_ref(&g));
            e[i + 1].assign(&r);
            if r.is_zero() {
                d[i + 1] -= &p;
                e[end].assign(0);
                return Ok(());
            }
            s.assign(&f / &r);
            c.assign(&g / &r);
            g.assign(&d[i + 1] - &p);
            let mut t = Float::with_val(precision, &d[i] - &g);
            t *= &s;
            add_product(&mut t, &c, &b, scratch);
            add_product(&mut t, &c, &b, scratch);
            p.assign(&s * &t);
            d[i + 1].assign(&g + &p);
            g.assign(&c * &t);
            g -= &b;
            let (before, after) = self.vectors.split_at_mut(i + 1);
            let mut turned = Float::new(precision);
            for (x, y) in before[i].iter_mut().zip(after[0].iter_mut()) {
                // (x, y) -> (c x - s y, s x + c y)
                turned.assign(&s * &*x);
                add_product(&mut turned, &c, y, scratch);
                *x *= &c;
                subtract_product(x, &s, y, scratch);
                std::mem::swap(y, &mut turned);
            }
        }
        d[l] -= &p;
        e[l].assign(&g);
        e[end].assign(0);
        Ok(())
    }
}
