//! Radial functions expanded in a Laguerre basis: r^p e^(-k r) times a sum over m of x_m L_m^a(2 k r).
//!
//! Multiplication by a power of r changes p alone, derivatives are tridiagonal: every operator acts without loss, on bras as on kets.

use super::laguerre::{self, banded, raise, shift_down, times_variable, value_at_zero, weighted};
use super::moments::LaguerreBasis;
use super::vector::Vector;
use rug::ops::Pow;
use rug::{Complex, Float, Rational};

/// A function in a Laguerre basis.
#[derive(Clone, Debug)]
pub(super) struct Series {
    pub(super) basis: LaguerreBasis,
    pub(super) x: Vector,
    pub(super) bits: u32,
}

impl Series {
    pub(super) fn times_power(&self, s: i64) -> Self {
        let basis = LaguerreBasis { power: self.basis.power + s, ..self.basis.clone() };
        Series { basis, x: self.x.clone(), bits: self.bits }
    }

    pub(super) fn scaled(&self, factor: &Complex) -> Self {
        Series { basis: self.basis.clone(), x: self.x.scaled(factor, self.bits), bits: self.bits }
    }

    pub(super) fn scaled_by(&self, factor: &Rational) -> Self {
        if *factor == 1 {
            return self.clone();
        }
        let factor = Float::with_val(self.bits, factor);
        self.with(|x| x.iter().map(|c| Float::with_val(self.bits, c * &factor)).collect())
    }

    /// The same function with a lower power in front.
    fn with_power(&self, power: i64) -> Self {
        let mut out = self.clone();
        let factor = self.per_variable();
        for _ in power..self.basis.power {
            out = out.with(|x| scale(times_variable(x, self.basis.order, self.bits), &factor));
            out.basis.power -= 1;
        }
        out
    }

    /// The same function with polynomials of another order.
    fn with_order(&self, order: u32) -> Self {
        let mut out = self.with(|x| laguerre::with_order(x, self.basis.order, order));
        out.basis.order = order;
        out
    }

    pub(super) fn plus(&self, other: &Series) -> Self {
        let power = self.basis.power.min(other.basis.power);
        let order = self.basis.order.max(other.basis.order);
        let here = self.with_power(power).with_order(order);
        let there = other.with_power(power).with_order(order);
        Series { x: here.x.plus(&there.x), ..here }
    }

    /// u' + c u/r.
    ///
    /// *Source*: derived here: r d/dr of L_m is m L_m - (m+a) L_(m-1); in the order a+1, L_m' = -L_(m-1) and L_m = L_m - L_(m-1).
    pub(super) fn gradient(&self, c: i64) -> Self {
        let factor = self.basis.power + c;
        let k = Float::with_val(self.bits, &self.basis.k);
        // -k (L_m + L_(m-1)) in the order a+1
        let mut out = self.with(|x| {
            let sum = laguerre::sum(x, &shift_down(x));
            laguerre::negated(scale(sum, &k))
        });
        out.basis.order += 1;
        if factor != 0 {
            out = out.plus(&self.times_power(-1).scaled_by(&Rational::from(factor)));
        }
        out
    }

    /// p^2 u = -u'' + l(l+1) u/r^2, without the delta function.
    ///
    /// *Source*: derived here, with x L'' = (x - a - 1) L' - m L.
    pub(super) fn p_squared(&self, l: u32) -> Self {
        let (p, a, l) = (self.basis.power, i64::from(self.basis.order), i64::from(l));
        if p == -l {
            // both (d/dr + l/r) and, in s waves, (d/dr - l/r) keep this power
            return self.gradient(l).gradient(-l).scaled_by(&Rational::from(-1));
        }
        // -2k r^(p-1) e [ (x/4 - m - p) L_m + (2p - a - 1) L_m' ]
        let quarter = |x: &[Float]| {
            let quarter = scale(times_variable(x, self.basis.order, self.bits), &Float::with_val(self.bits, 0.25));
            let rest = banded(x, self.bits, |m| [0, -super::laurent::to_power(m) - p, 0]);
            laguerre::sum(&quarter, &rest)
        };
        let minus_two_k = Float::with_val(self.bits, Rational::from(&self.basis.k * -2));
        let slope = Float::with_val(self.bits, a + 1 - 2 * p);
        let mut out = self.with(|x| {
            let mut y = quarter(x);
            if !slope.is_zero() {
                y = laguerre::sum(&raise(&y), &scale(shift_down(x), &slope));
            }
            scale(y, &minus_two_k)
        });
        out.basis.power -= 1;
        out.basis.order += u32::from(!slope.is_zero());
        let centrifugal = -(p - l - 1) * (p + l);
        if centrifugal != 0 {
            out = out.plus(&self.times_power(-2).scaled_by(&Rational::from(centrifugal)));
        }
        out
    }

    /// The coefficient of r^power at the nucleus, for a power that is not above the first.
    pub(super) fn leading_coefficient(&self, power: i64) -> Option<Complex> {
        match power.cmp(&self.basis.power) {
            std::cmp::Ordering::Less => Some(Complex::new(self.bits)),
            std::cmp::Ordering::Greater => None,
            std::cmp::Ordering::Equal => {
                Some(self.x.reduce(self.bits, |x| value_at_zero(x, self.basis.order, self.bits)))
            }
        }
    }

    /// <self|other>.
    ///
    /// Errors: `None` where the product of the powers in front cannot be integrated.
    pub(super) fn inner(&self, other: &Series) -> Option<Complex> {
        let order = u32::try_from(self.basis.power + other.basis.power).ok()?;
        let (bra, ket) = (self.with_order(order), other.with_order(order));
        let count = bra.x.re.len().min(ket.x.re.len());
        let norms = laguerre::square_norms(order, count, self.bits);
        let weighted = ket.x.map(|x| weighted(x, &norms));
        Some(bra.x.inner(&weighted, self.bits) / self.two_k_to(order + 1))
    }

    /// The integrals with the first `count` functions of another basis of the same k.
    ///
    /// Errors: `None` as for `inner`.
    pub(super) fn moments(&self, basis: &LaguerreBasis, count: usize) -> Option<Vector> {
        let order = u32::try_from(self.basis.power + basis.power).ok()?;
        let here = self.with_order(order);
        let norms = laguerre::square_norms(order, count, self.bits);
        let inverse = self.two_k_to(order + 1).recip();
        Some(here.x.map(|x| {
            let mut f: Vec<Float> = weighted(x, &norms);
            f.resize(count, Float::new(self.bits));
            scale(laguerre::integrals_with_order(f, order, basis.order), &inverse)
        }))
    }

    pub(super) fn is_zero(&self) -> bool {
        self.x.is_zero()
    }

    fn with(&self, rule: impl Fn(&[Float]) -> Vec<Float>) -> Self {
        Series { basis: self.basis.clone(), x: self.x.map(rule), bits: self.bits }
    }

    /// r over x = 2 k r.
    fn per_variable(&self) -> Float {
        Float::with_val(self.bits, Rational::from(&self.basis.k * 2).recip())
    }

    fn two_k_to(&self, exponent: u32) -> Float {
        Float::with_val(self.bits, Rational::from(&self.basis.k * 2)).pow(exponent)
    }
}

fn scale(mut x: Vec<Float>, factor: &Float) -> Vec<Float> {
    for c in &mut x {
        *c *= factor;
    }
    x
}

#[cfg(test)]
mod tests {
    use super::super::action;
    use super::super::function::RadialFunction;
    use super::super::laurent::Laurent;
    use super::*;
    use crate::num::Surd;
    use rug::Integer;

    const BITS: u32 = 256;

    /// A short series and the same function exactly.
    fn pair(k: (i32, i32), power: i64, order: u32, x: &[i32]) -> (Series, RadialFunction) {
        let k = Rational::from(k);
        let mut polynomial = Laurent::default();
        for (m, &c) in (0_u32..).zip(x) {
            let mut coefficients = Vec::new();
            for i in 0..=m {
                let binomial = Integer::from(Integer::binomial_u(m + order, m - i));
                coefficients.push(Rational::from(&k * -2).pow(i) * binomial / Integer::from(Integer::factorial(i)));
            }
            polynomial.add_scaled(&Rational::from(c), &Laurent::new(power, coefficients));
        }
        let exact = RadialFunction::new(&k, &Surd::one(), &polynomial);
        let x = Vector::real(x.iter().map(|&c| Float::with_val(BITS, c)).collect());
        (Series { basis: LaguerreBasis { k, power, order }, x, bits: BITS }, exact)
    }

    /// Compares a series with an exact function through their integrals with a few functions.
    fn same(series: &Series, exact: &RadialFunction) {
        let probe_power = 12;
        for order in [0, 3] {
            let probe = LaguerreBasis { k: series.basis.k.clone(), power: probe_power, order };
            let here = series.moments(&probe, 20).expect("convergent");
            let there = super::super::moments::moments(exact, &probe, 20, BITS).expect("convergent");
            let scale =
                there.re.iter().fold(Float::with_val(BITS, 1), |a, b| a.max(&Float::with_val(BITS, b.abs_ref())));
            for (a, b) in here.re.iter().zip(&there.re) {
                let difference = Float::with_val(BITS, a - b).abs();
                assert!(difference <= Float::with_val(BITS, &scale >> (BITS - 60)), "{a} {b}");
            }
        }
    }

    #[test]
    fn operators_agree_with_the_exact_ones() {
        for (k, power, order, l) in [
            ((1, 1), 1, 1, 0),
            ((1, 2), 2, 3, 1),
            ((1, 3), 3, 1, 1),
            ((2, 1), 0, 3, 1),
            ((2, 1), 0, 3, 0),
            ((1, 1), 5, 2, 2),
            ((1, 1), -1, 7, 3),
        ] {
            let (series, exact) = pair(k, power, order, &[2, -1, 3, 5]);
            same(&series, &exact);
            same(&series.p_squared(l), &action::p_squared(&exact, l).expect("a function").without_contact());
            for lp in [l + 1, l.max(1) - 1] {
                if lp != l {
                    same(
                        &series.gradient(action::gradient_term(l, lp)),
                        &action::gradient(&exact, l, lp).expect("a function"),
                    );
                }
            }
            let (other, other_exact) = pair(k, power + 2, order + 2, &[1, 1, -4]);
            let mut sum = exact.clone();
            sum.add_scaled(&Surd::one(), &other_exact);
            same(&series.plus(&other), &sum);
            if power > 0 {
                let value = series.inner(&other).expect("convergent");
                let known =
                    crate::systems::Number::Exact(exact.inner(&other_exact).expect("convergent")).to_complex(BITS);
                assert!(Complex::with_val(BITS, &value - &known).abs().real() < &Float::with_val(BITS, 1e-60));
            }
        }
    }

    #[test]
    fn values_at_the_nucleus() {
        let (series, exact) = pair((1, 1), 1, 1, &[2, -1, 3]);
        let known = crate::systems::Number::Exact(exact.expansion_coefficient(1)).to_complex(BITS);
        assert_eq!(series.leading_coefficient(1), Some(known));
        assert_eq!(series.leading_coefficient(0), Some(Complex::new(BITS)));
        assert!(series.times_power(-1).leading_coefficient(1).is_none());
    }

    #[test]
    fn regular_functions_stay_integrable() {
        let (series, _) = pair((1, 1), 1, 1, &[2, -1, 3]);
        // p^2 of a regular function loses one power, the gradient to l + 1 none
        assert_eq!(series.p_squared(0).basis.power, 0);
        assert_eq!(series.gradient(-1).basis.power, 1);
        // and p^2 of r^0 in s waves none either: what it loses is the delta function
        assert_eq!(series.times_power(-1).p_squared(0).basis.power, 0);
    }
}
