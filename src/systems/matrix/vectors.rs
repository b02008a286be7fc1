//! Small helpers for exact and numeric vectors.

use super::entries::ExactKet;
use crate::num::Surd;
use rug::{Complex, Float};

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

/// a + c b, into a.
pub fn add_multiple(a: &mut ExactKet, c: &Surd, b: &ExactKet) {
    for (k, y) in b {
        let entry = a.entry(*k).or_default();
        *entry += &(c * y);
        if entry.is_zero() {
            a.remove(k);
        }
    }
}

/// Orthogonal (not normalised) vectors with the same span, each with one over its squared norm; `None` where that is not to be had.
pub fn orthogonal(span: &[ExactKet]) -> Option<Vec<(ExactKet, Surd)>> {
    let mut basis: Vec<(ExactKet, Surd)> = Vec::new();
    for vector in span {
        let mut rest = vector.clone();
        for (earlier, inverse_norm) in &basis {
            let overlap = inner(earlier, vector);
            if !overlap.is_zero() {
                add_multiple(&mut rest, &-&(&overlap * inverse_norm), earlier);
            }
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

/// <a|b>, real where both are.
pub fn dot(a: &[Complex], b: &[Complex], bits: u32) -> Complex {
    let (mut re, mut im) = (Float::new(bits), Float::new(bits));
    for (x, y) in a.iter().zip(b) {
        re += x.real() * y.real();
        if x.imag().is_zero() && y.imag().is_zero() {
            continue;
        }
        re += x.imag() * y.imag();
        im += x.real() * y.imag();
        im -= x.imag() * y.real();
    }
    Complex::with_val(bits, (re, im))
}

/// a + c b, into a.
pub fn add_numeric_multiple(a: &mut [Complex], c: &Complex, b: &[Complex]) {
    for (x, y) in a.iter_mut().zip(b) {
        let (re, im) = x.as_mut_real_imag();
        *re += c.real() * y.real();
        if c.imag().is_zero() && y.imag().is_zero() {
            continue;
        }
        *re -= c.imag() * y.imag();
        *im += c.real() * y.imag();
        *im += c.imag() * y.real();
    }
}
