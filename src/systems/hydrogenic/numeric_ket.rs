//! Kets of the numeric backend: exact functions as long as they last, an expansion for what resolvents make.

use super::action::gradient_term;
use super::exact::{apply_exactly, no_integral};
use super::function::{RadialFunction, Unintegrable};
use super::moments::{LaguerreBasis, integral, moments};
use super::origin::Origin;
use super::radial::Radial;
use super::series::Series;
use super::vector::Vector;
use crate::num::Surd;
use crate::systems::{Number, Obstacle};
use rug::{Complex, Float, Rational};

/// A ket in one block: the sum of all its parts.
#[derive(Clone, Debug)]
pub(super) struct NumericKet {
    /// The part that is known exactly.
    exact: RadialFunction,
    /// Exact functions with weights that are not.
    weighted: Vec<(Complex, RadialFunction)>,
    series: Option<Series>,
    /// Weight of a delta function at the nucleus that is not exact.
    contact: Option<Complex>,
    /// Behaviour at the nucleus.
    origin: Origin,
    bits: u32,
}

impl NumericKet {
    pub(super) fn from_exact(exact: RadialFunction, l: u32, bits: u32) -> Self {
        let origin = origin_of(&exact, l);
        NumericKet { exact, weighted: Vec::new(), series: None, contact: None, origin, bits }
    }

    pub(super) fn from_series(series: Series, origin: Origin) -> Self {
        let bits = series.bits;
        let exact = RadialFunction::default();
        NumericKet { exact, weighted: Vec::new(), series: Some(series), contact: None, origin, bits }
    }

    /// The ket as one exact function, if it is one.
    pub(super) fn as_exact(&self) -> Option<&RadialFunction> {
        (self.weighted.is_empty() && self.series.is_none() && self.contact.is_none()).then_some(&self.exact)
    }

    pub(super) fn is_zero(&self) -> bool {
        self.exact.is_zero()
            && self.weighted.iter().all(|(c, _)| c.is_zero())
            && self.series.as_ref().is_none_or(Series::is_zero)
            && self.contact.as_ref().is_none_or(Complex::is_zero)
    }

    pub(super) fn origin(&self) -> Origin {
        self.origin
    }

    /// All exact functions; the weight is absent where it is one.
    fn functions(&self) -> impl Iterator<Item = (Option<&Complex>, &RadialFunction)> {
        let exact = (!self.exact.is_zero()).then_some((None, &self.exact));
        exact.into_iter().chain(self.weighted.iter().map(|(c, u)| (Some(c), u)))
    }

    /// The linear combination of kets.
    pub(super) fn combination(terms: &[(Number, &NumericKet)], l: u32, bits: u32) -> Self {
        let mut out = Self::from_exact(RadialFunction::default(), l, bits);
        for (weight, ket) in terms {
            match weight {
                Number::Exact(weight) if weight.is_zero() => continue,
                Number::Exact(weight) => out.exact.add_scaled(weight, &ket.exact),
                Number::Approx(weight) => out.add_weighted(weight.clone(), &ket.exact),
            }
            let weight = weight.to_complex(bits);
            for (c, u) in &ket.weighted {
                out.add_weighted(Complex::with_val(bits, c * &weight), u);
            }
            if let Some(series) = &ket.series {
                let scaled = series.scaled(&weight);
                out.series = Some(out.series.map_or(scaled.clone(), |sum| sum.plus(&scaled)));
            }
            if let Some(contact) = &ket.contact {
                let scaled = Complex::with_val(bits, contact * &weight);
                out.contact = Some(out.contact.map_or(scaled.clone(), |sum| sum + scaled));
            }
            if ket.as_exact().is_none() {
                out.origin = out.origin.joined(ket.origin);
            }
        }
        out.origin = out.origin.joined(origin_of(&out.exact, l));
        for (_, u) in &out.weighted {
            out.origin = out.origin.joined(origin_of(u, l));
        }
        if out.is_zero() { Self::from_exact(RadialFunction::default(), l, bits) } else { out }
    }

    fn add_weighted(&mut self, weight: Complex, u: &RadialFunction) {
        if u.is_zero() {
            return;
        }
        match self.weighted.iter_mut().find(|(_, known)| known == u) {
            Some((sum, _)) => *sum += weight,
            None => self.weighted.push((weight, u.clone())),
        }
    }

    pub(super) fn scaled_by(&self, factor: &Rational) -> Self {
        NumericKet {
            exact: self.exact.scaled(factor),
            weighted: self.weighted.iter().map(|(c, u)| (c.clone(), u.scaled(factor))).collect(),
            series: self.series.as_ref().map(|s| s.scaled_by(factor)),
            contact: self.contact.as_ref().map(|c| Complex::with_val(self.bits, c * factor)),
            ..self.clone()
        }
    }

    /// An operator on the ket, in the units of the atom with charge and reduced mass one.
    ///
    /// Errors: `Inexact` where the result is not a function, not even with a delta function.
    pub(super) fn applied(&self, operator: Radial, l: u32, lp: u32) -> Result<Self, Obstacle> {
        if let Some(exact) = self.as_exact() {
            return Ok(Self::from_exact(apply_exactly(operator, l, lp, exact)?, lp, self.bits));
        }
        match operator {
            Radial::Power(s) => self.powered(s, l, lp),
            Radial::Gradient => {
                self.differentiable(self.origin.has_gradient(lp))?;
                self.mapped(operator, l, lp, self.origin.gradient(l, lp), |s| s.gradient(gradient_term(l, lp)))
            }
            Radial::PSquared => self.p_squared(l),
            Radial::PFourth => self.p_squared(l)?.p_squared(l),
            Radial::Hamiltonian => {
                let mut half = self.p_squared(l)?.scaled_by(&Rational::from((1, 2)));
                let coulomb = self.powered(-1, l, l)?;
                let origin = self.origin.hamiltonian(l);
                let (one, minus) = (Number::Exact(Surd::one()), Number::Exact(Surd::from(-1)));
                half = Self::combination(&[(one, &half), (minus, &coulomb)], l, self.bits);
                half.origin = origin;
                Ok(half)
            }
            Radial::DeltaTimesPi => {
                let value = self.value_at_nucleus(&operator.name())?;
                let mut out = Self::from_exact(RadialFunction::default(), lp, self.bits);
                out.contact = Some(value / 4);
                out.origin = Origin::contact();
                Ok(out)
            }
        }
    }

    fn powered(&self, s: i64, l: u32, lp: u32) -> Result<Self, Obstacle> {
        if self.origin.delta && s < 0 {
            return Err(Obstacle::Inexact);
        }
        let origin = self.origin.times_power(s, l == lp);
        let mut out = self.mapped(Radial::Power(s), l, lp, origin, |u| u.times_power(s))?;
        out.contact = if s == 0 && l == lp { self.contact.clone() } else { None };
        Ok(out)
    }

    fn p_squared(&self, l: u32) -> Result<Self, Obstacle> {
        self.differentiable(self.origin.has_p_squared(l))?;
        let mut out = self.mapped(Radial::PSquared, l, l, self.origin.p_squared(l), |s| s.p_squared(l))?;
        if let Some(series) = self.series.as_ref().filter(|_| l == 0) {
            // -(1/r)'' holds 4 pi delta(r)
            let value = series.leading_coefficient(0).ok_or(Obstacle::Inexact)?;
            if !value.is_zero() {
                out.contact = Some(value);
            }
        }
        Ok(out)
    }

    fn differentiable(&self, allowed: bool) -> Result<(), Obstacle> {
        match (allowed, self.origin.certain) {
            (true, _) => Ok(()),
            (false, true) => Err(Obstacle::Inexact),
            (false, false) => Err(Obstacle::Undecided),
        }
    }

    /// Applies an operator to every part by itself.
    fn mapped(
        &self,
        operator: Radial,
        l: u32,
        lp: u32,
        origin: Origin,
        rule: impl Fn(&Series) -> Series,
    ) -> Result<Self, Obstacle> {
        let exact = apply_exactly(operator, l, lp, &self.exact)?;
        let mut weighted = Vec::with_capacity(self.weighted.len());
        for (c, u) in &self.weighted {
            weighted.push((c.clone(), apply_exactly(operator, l, lp, u)?));
        }
        let series = self.series.as_ref().map(rule);
        Ok(NumericKet { exact, weighted, series, contact: None, origin, bits: self.bits })
    }

    /// The coefficient of r.
    fn value_at_nucleus(&self, operator: &str) -> Result<Complex, Obstacle> {
        if !self.origin.finite_at_nucleus() {
            let certain = self.origin.certain;
            return Err(if certain { no_integral(operator, Unintegrable::Contact) } else { Obstacle::Undecided });
        }
        let mut sum = Complex::new(self.bits);
        for (weight, u) in self.functions() {
            let value = Number::Exact(u.expansion_coefficient(1)).to_complex(self.bits);
            sum += weight.map_or(value.clone(), |c| value * c);
        }
        if let Some(series) = &self.series {
            sum += series.leading_coefficient(1).ok_or_else(cancelling)?;
        }
        Ok(sum)
    }

    /// <self|other>, with the name of the operator between for a message.
    pub(super) fn inner(&self, other: &NumericKet, operator: &str) -> Result<Number, Obstacle> {
        if let (Some(bra), Some(ket)) = (self.as_exact(), other.as_exact()) {
            return match bra.inner(ket) {
                Ok(value) => Ok(Number::Exact(value)),
                Err(Unintegrable::Logarithms) => Err(cancelling()),
                Err(reason) => Err(no_integral(operator, reason)),
            };
        }
        let mut sum = Complex::new(self.bits);
        let certain = self.origin.certain && other.origin.certain;
        let doubtful = |obstacle| if certain { obstacle } else { Obstacle::Undecided };
        if self.origin.delta {
            sum += self.contact_weight().conj() * other.value_at_nucleus(operator).map_err(doubtful)?;
        }
        if other.origin.delta {
            sum += self.value_at_nucleus(operator).map_err(doubtful)?.conj() * other.contact_weight();
        }
        let power = self.origin.power.saturating_add(other.origin.power);
        if power < 0 {
            return Err(doubtful(no_integral(operator, Unintegrable::Diverges { power })));
        }
        sum += self.smooth_inner(other, operator)?;
        Ok(Number::Approx(sum))
    }

    /// The weight of all delta functions.
    fn contact_weight(&self) -> Complex {
        let mut sum = self.contact.clone().unwrap_or_else(|| Complex::new(self.bits));
        for (weight, u) in self.functions() {
            let value = Number::Exact(u.contact().clone()).to_complex(self.bits);
            sum += weight.map_or(value.clone(), |c| value * c);
        }
        sum
    }

    fn smooth_inner(&self, other: &NumericKet, operator: &str) -> Result<Complex, Obstacle> {
        let bits = self.bits;
        let mut sum = Complex::new(bits);
        let conjugate = |c: Option<&Complex>| c.map_or(Complex::with_val(bits, 1), |c| c.clone().conj());
        let plain = |c: Option<&Complex>| c.map_or(Complex::with_val(bits, 1), Complex::clone);
        for (a, u) in self.functions() {
            let u = u.map(|_, p| p.clone());
            for (b, v) in other.functions() {
                let value = u.inner(&v.map(|_, p| p.clone())).map_err(|reason| match reason {
                    Unintegrable::Logarithms => cancelling(),
                    reason => no_integral(operator, reason),
                })?;
                sum += conjugate(a) * plain(b) * Number::Exact(value).to_complex(bits);
            }
            if let Some(series) = &other.series {
                let value = integral(&u, &series.basis, &series.x, bits).ok_or_else(cancelling)?;
                sum += conjugate(a) * value;
            }
        }
        if let Some(series) = &self.series {
            for (b, v) in other.functions() {
                let value = integral(v, &series.basis, &series.x, bits).ok_or_else(cancelling)?;
                sum += value.conj() * plain(b);
            }
            if let Some(ket) = &other.series {
                sum += series.inner(ket).ok_or_else(cancelling)?;
            }
        }
        Ok(sum)
    }

    /// The integrals of the ket, delta functions included, with the first `count` functions of a basis that is regular in block l.
    pub(super) fn moments(&self, basis: &LaguerreBasis, l: u32, count: usize) -> Result<Vector, Obstacle> {
        let bits = self.bits;
        let mut out = Vector::real(vec![Float::new(bits); count]);
        for (weight, u) in self.functions() {
            let part = moments(u, basis, count, bits).ok_or_else(cancelling)?;
            out = out.plus(&weight.map_or(part.clone(), |c| part.scaled(c, bits)));
        }
        if let Some(series) = &self.series {
            out = out.plus(&series.moments(basis, count).ok_or_else(cancelling)?);
        }
        if l == 0 && self.origin.delta {
            // L_b^1(0) = b + 1
            let values = (1..=count).map(|b| Float::with_val(bits, b)).collect();
            out = out.plus(&Vector::real(values).scaled(&self.contact_weight(), bits));
        }
        Ok(out)
    }
}

/// <bra|operator|ket>, in the units of the atom with charge and reduced mass one.
pub(super) fn element(
    operator: Radial,
    (l, lp): (u32, u32),
    bra: &NumericKet,
    ket: &NumericKet,
) -> Result<Number, Obstacle> {
    let name = operator.name();
    match operator {
        Radial::PFourth => {
            let halves = (bra.applied(Radial::PSquared, lp, lp), ket.applied(Radial::PSquared, l, l));
            match halves {
                (Ok(bra), Ok(ket)) => bra.inner(&ket, &name),
                (Err(Obstacle::Inexact), _) | (_, Err(Obstacle::Inexact)) => Err(too_singular(&name)),
                (Err(obstacle), _) | (_, Err(obstacle)) => Err(obstacle),
            }
        }
        Radial::DeltaTimesPi => {
            if let (Some(bra), Some(ket)) = (bra.as_exact(), ket.as_exact())
                && let Ok(value) = super::exact::element_exactly(operator, (l, lp), bra, ket)
            {
                return Ok(Number::Exact(value));
            }
            let product = bra.value_at_nucleus(&name)?.conj() * ket.value_at_nucleus(&name)?;
            Ok(Number::Approx(product / 4))
        }
        _ => match ket.applied(operator, l, lp) {
            Ok(image) => bra.inner(&image, &name),
            // from the other side: all of these are their own adjoints, but for the sign of the gradient
            Err(Obstacle::Inexact) => {
                let image = bra.applied(operator, lp, l).map_err(|obstacle| match obstacle {
                    Obstacle::Inexact => too_singular(&name),
                    obstacle => obstacle,
                })?;
                let sign = if operator == Radial::Gradient { -1 } else { 1 };
                image.scaled_by(&Rational::from(sign)).inner(ket, &name)
            }
            Err(obstacle) => Err(obstacle),
        },
    }
}

fn origin_of(u: &RadialFunction, l: u32) -> Origin {
    let regular = i64::from(l) + 1;
    let function = if u.terms().next().is_none() { Origin::zero() } else { Origin::pure(u.leading_power(regular)) };
    if u.contact().is_zero() { function } else { function.joined(Origin::contact()) }
}

/// Functions whose singular parts cancel: the powers allow the integral, its parts do not exist.
fn cancelling() -> Obstacle {
    Obstacle::NotYet("integrals in which singular parts of several functions cancel at the nucleus".into())
}

fn too_singular(operator: &str) -> Obstacle {
    Obstacle::Diverges {
        operator: operator.into(),
        why: "it acts on functions that are so singular at the nucleus that their derivatives are no functions".into(),
    }
}

/// An operator whose result is not a function, for a numeric ket.
pub(super) fn not_a_function(operator: Radial, reason: Obstacle) -> Obstacle {
    match reason {
        Obstacle::Inexact => too_singular(&operator.name()),
        other => other,
    }
}
