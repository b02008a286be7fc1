//! Small helpers for vectors of multi-precision numbers.

use rug::{Assign, Complex, Float};

/// Returns an exponent e with every component below 2^e in absolute value, close to the largest; `None` if all are
/// zero.
pub(super) fn exponent<'a>(components: impl IntoIterator<Item = &'a Float>) -> Option<i64> {
    components.into_iter().filter_map(Float::get_exp).map(i64::from).max()
}

/// Returns the exponent of the largest real or imaginary part; `None` if all are zero.
pub(super) fn exponent_complex(components: &[Complex]) -> Option<i64> {
    exponent(components.iter().flat_map(|c| [c.real(), c.imag()]))
}

/// Multiplies by 2^shift, exactly (or to zero or infinity far outside the range of exponents).
pub(super) fn shift(value: &mut Float, shift: i64) {
    let shift = shift.clamp(i64::from(i32::MIN / 2), i64::from(i32::MAX / 2)) as i32;
    *value <<= shift;
}

/// Returns sum conj(a_i) b_i at the given precision.
pub(super) fn inner(a: &[Complex], b: &[Complex], precision: u32) -> Complex {
    let (mut re, mut im) = (Float::new(precision), Float::new(precision));
    for (a, b) in a.iter().zip(b) {
        re += a.real() * b.real();
        re += a.imag() * b.imag();
        im += a.real() * b.imag();
        im -= a.imag() * b.real();
    }
    Complex::with_val(precision, (re, im))
}

/// Adds `factor * source` to `target`, at the precision of the target's components.
pub(super) fn add_multiple(target: &mut [Complex], factor: &Complex, source: &[Complex]) {
    for (t, s) in target.iter_mut().zip(source) {
        let (re, im) = t.as_mut_real_imag();
        *re += factor.real() * s.real();
        *re -= factor.imag() * s.imag();
        *im += factor.real() * s.imag();
        *im += factor.imag() * s.real();
    }
}

/// Returns the 2-norm at the given precision.
pub(super) fn norm(vector: &[Complex], precision: u32) -> Float {
    let mut sum = Float::new(precision);
    for c in vector {
        sum += c.real() * c.real();
        sum += c.imag() * c.imag();
    }
    sum.sqrt()
}

/// Divides every component by a real number.
pub(super) fn divide(vector: &mut [Complex], by: &Float) {
    for c in vector {
        let (re, im) = c.as_mut_real_imag();
        *re /= by;
        *im /= by;
    }
}

/// Copies a vector to another precision.
pub(super) fn at_precision(vector: &[Complex], precision: u32) -> Vec<Complex> {
    vector.iter().map(|c| Complex::with_val(precision, c)).collect()
}

/// Returns a copy of a number at another precision.
pub(super) fn float_at(value: &Float, precision: u32) -> Float {
    let mut copy = Float::new(precision);
    copy.assign(value);
    copy
}
