//! Real or complex coefficient vectors on which real linear maps act.

use super::laguerre;
use rug::{Complex, Float};

/// Coefficients; the imaginary parts are absent where all are zero.
#[derive(Clone, Debug, Default)]
pub(super) struct Vector {
    pub(super) re: Vec<Float>,
    pub(super) im: Option<Vec<Float>>,
}

impl Vector {
    pub(super) fn real(re: Vec<Float>) -> Self {
        Vector { re, im: None }
    }

    pub(super) fn from_complex(entries: Vec<Complex>) -> Self {
        let (re, im) = entries.into_iter().map(Complex::into_real_imag).unzip();
        Vector { re, im: Some(im) }
    }

    /// The entries as complex numbers.
    pub(super) fn to_complex(&self, bits: u32) -> Vec<Complex> {
        match &self.im {
            None => self.re.iter().map(|x| Complex::with_val(bits, x)).collect(),
            Some(im) => self.re.iter().zip(im).map(|(x, y)| Complex::with_val(bits, (x, y))).collect(),
        }
    }

    /// Applies a real linear map.
    pub(super) fn map(&self, rule: impl Fn(&[Float]) -> Vec<Float>) -> Self {
        Vector { re: rule(&self.re), im: self.im.as_deref().map(rule) }
    }

    /// Applies a real linear functional.
    pub(super) fn reduce(&self, bits: u32, rule: impl Fn(&[Float]) -> Float) -> Complex {
        let im = self.im.as_deref().map_or_else(|| Float::new(bits), &rule);
        Complex::with_val(bits, (rule(&self.re), im))
    }

    pub(super) fn plus(&self, other: &Vector) -> Self {
        let im = match (&self.im, &other.im) {
            (None, None) => None,
            (Some(im), None) | (None, Some(im)) => Some(im.clone()),
            (Some(a), Some(b)) => Some(laguerre::sum(a, b)),
        };
        Vector { re: laguerre::sum(&self.re, &other.re), im }
    }

    pub(super) fn scaled(&self, factor: &Complex, bits: u32) -> Self {
        let times = |x: &[Float], c: &Float| x.iter().map(|x| Float::with_val(bits, x * c)).collect::<Vec<_>>();
        let (c, d) = (factor.real(), factor.imag());
        if d.is_zero() {
            return self.map(|x| times(x, c));
        }
        let turned = Vector { re: times(&self.re, c), im: Some(times(&self.re, d)) };
        match &self.im {
            None => turned,
            Some(im) => turned.plus(&Vector { re: laguerre::negated(times(im, d)), im: Some(times(im, c)) }),
        }
    }

    /// The sum of conj(x_m) y_m.
    pub(super) fn inner(&self, other: &Vector, bits: u32) -> Complex {
        let dot = |a: &Option<Vec<Float>>, b: &Option<Vec<Float>>| match (a, b) {
            (Some(a), Some(b)) => laguerre::dot(a, b, bits),
            _ => Float::new(bits),
        };
        let own = Some(other.re.clone());
        let re = laguerre::dot(&self.re, &other.re, bits) + dot(&self.im, &other.im);
        let im = dot(&Some(self.re.clone()), &other.im) - dot(&self.im, &own);
        Complex::with_val(bits, (re, im))
    }

    pub(super) fn is_zero(&self) -> bool {
        let zero = |x: &[Float]| x.iter().all(Float::is_zero);
        zero(&self.re) && self.im.as_deref().is_none_or(zero)
    }
}
