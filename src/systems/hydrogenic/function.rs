//! Radial functions that are known exactly: sums of powers of r times decaying exponentials.
//!
//! A function u stands for the wave function u(r)/r Y_lm, so that <v|u> is the integral of conj(v) u over r. Lengths are those of the atom
//! with charge and reduced mass one; `radial` says how the real atom's differ.

use super::laurent::Laurent;
use crate::num::{Surd, Unit};
use rug::Rational;
use std::cmp::Ordering;
use std::collections::{BTreeMap, BTreeSet};

/// What a term carries besides its polynomial: its unit times e^(-kappa r), times i where `imaginary`.
#[derive(Clone, PartialEq, Eq, PartialOrd, Ord, Debug)]
pub(super) struct Envelope {
    pub(super) kappa: Rational,
    pub(super) unit: Unit,
    pub(super) imaginary: bool,
}

/// An exact radial function, with a delta function at the nucleus where an operator has made one.
#[derive(Clone, PartialEq, Eq, Debug, Default)]
pub(super) struct RadialFunction {
    terms: BTreeMap<Envelope, Laurent>,
    /// Weight of the functional v -> (coefficient of r in v): a delta function at the nucleus, in s waves only.
    contact: Surd,
}

/// Why an integral of exact functions has no exact value.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(super) enum Unintegrable {
    /// At the nucleus the integrand goes as this power of r.
    Diverges { power: i64 },
    /// A delta function meets a function that is not finite at the nucleus.
    Contact,
    /// It converges, but with logarithms.
    Logarithms,
}

impl RadialFunction {
    /// sqrt-weighted polynomial times e^(-kappa r).
    pub(super) fn new(kappa: &Rational, weight: &Surd, polynomial: &Laurent) -> Self {
        let mut out = Self::default();
        for (unit, c) in weight.terms() {
            for (part, imaginary) in [(&c.re, false), (&c.im, true)] {
                let envelope = Envelope { kappa: kappa.clone(), unit: unit.clone(), imaginary };
                out.add_term(envelope, part, polynomial);
            }
        }
        out
    }

    /// The delta function at the nucleus with a weight.
    pub(super) fn contact_of(weight: Surd) -> Self {
        RadialFunction { terms: BTreeMap::new(), contact: weight }
    }

    pub(super) fn is_zero(&self) -> bool {
        self.terms.is_empty() && self.contact.is_zero()
    }

    pub(super) fn terms(&self) -> impl Iterator<Item = (&Envelope, &Laurent)> {
        self.terms.iter()
    }

    pub(super) fn contact(&self) -> &Surd {
        &self.contact
    }

    /// The function without its delta function at the nucleus.
    #[cfg(test)]
    pub(super) fn without_contact(&self) -> Self {
        RadialFunction { terms: self.terms.clone(), contact: Surd::zero() }
    }

    pub(super) fn add_term(&mut self, envelope: Envelope, factor: &Rational, polynomial: &Laurent) {
        let slot = self.terms.entry(envelope.clone()).or_default();
        slot.add_scaled(factor, polynomial);
        if slot.is_zero() {
            self.terms.remove(&envelope);
        }
    }

    pub(super) fn add_contact(&mut self, weight: &Surd) {
        self.contact += weight;
    }

    /// Adds weight times another function.
    pub(super) fn add_scaled(&mut self, weight: &Surd, other: &RadialFunction) {
        for (unit, c) in weight.terms() {
            for (envelope, polynomial) in &other.terms {
                let (common, unit) = unit.product(&envelope.unit);
                for (part, turned) in [(&c.re, false), (&c.im, true)] {
                    let mut factor = Rational::from(part * &common);
                    if turned && envelope.imaginary {
                        factor = -factor;
                    }
                    let imaginary = turned != envelope.imaginary;
                    let target = Envelope { kappa: envelope.kappa.clone(), unit: unit.clone(), imaginary };
                    self.add_term(target, &factor, polynomial);
                }
            }
        }
        self.contact += &(weight * &other.contact);
    }

    pub(super) fn scaled(&self, factor: &Rational) -> Self {
        if factor.cmp0() == Ordering::Equal {
            return Self::default();
        }
        RadialFunction {
            terms: self.terms.iter().map(|(e, p)| (e.clone(), p.scaled(factor))).collect(),
            contact: self.contact.scaled(factor),
        }
    }

    /// Applies a rule to every polynomial, leaving out the delta function.
    pub(super) fn map(&self, rule: impl Fn(&Envelope, &Laurent) -> Laurent) -> Self {
        let terms = self.terms.iter().map(|(e, p)| (e.clone(), rule(e, p))).filter(|(_, p)| !p.is_zero()).collect();
        RadialFunction { terms, contact: Surd::zero() }
    }

    /// The coefficient of r^power in the expansion at the nucleus.
    pub(super) fn expansion_coefficient(&self, power: i64) -> Surd {
        let mut sum = Surd::zero();
        for (envelope, polynomial) in &self.terms {
            let c = polynomial.expansion_coefficient(&envelope.kappa, power);
            let (re, im) = if envelope.imaginary { (Rational::new(), c) } else { (c, Rational::new()) };
            sum += &Surd::of_unit(envelope.unit.clone(), re, im);
        }
        sum
    }

    /// The lowest power of r in the expansion at the nucleus, up to and including `limit`; `limit + 1` when all of those vanish.
    pub(super) fn leading_power(&self, limit: i64) -> i64 {
        let lowest = self.terms.values().map(Laurent::lowest).min().unwrap_or(limit + 1);
        (lowest..=limit).find(|&power| !self.expansion_coefficient(power).is_zero()).unwrap_or(limit + 1)
    }

    /// <self|other>, conjugate-linear in self.
    ///
    /// Errors: what keeps the integral from being exact.
    pub(super) fn inner(&self, other: &RadialFunction) -> Result<Surd, Unintegrable> {
        let mut value = Surd::zero();
        match (self.contact.is_zero(), other.contact.is_zero()) {
            (true, true) => {}
            (false, false) => return Err(Unintegrable::Contact),
            (true, false) => value += &(&self.value_at_nucleus()?.conj() * &other.contact),
            (false, true) => value += &(&self.contact.conj() * &other.value_at_nucleus()?),
        }
        let mut product: BTreeMap<Envelope, Laurent> = BTreeMap::new();
        for (bra, p) in &self.terms {
            for (ket, q) in &other.terms {
                let (common, unit) = bra.unit.product(&ket.unit);
                let kappa = Rational::from(&bra.kappa + &ket.kappa);
                // conj(i) = -i, conj(i) i = 1
                let sign = if bra.imaginary && !ket.imaginary { -1 } else { 1 };
                let envelope = Envelope { kappa, unit, imaginary: bra.imaginary != ket.imaginary };
                product.entry(envelope).or_default().add_scaled(&(Rational::from(common) * sign), &p.product(q));
            }
        }
        check_at_nucleus(&product)?;
        for (envelope, polynomial) in &product {
            let integral = polynomial.integral(&envelope.kappa);
            let (re, im) = if envelope.imaginary { (Rational::new(), integral) } else { (integral, Rational::new()) };
            value += &Surd::of_unit(envelope.unit.clone(), re, im);
        }
        Ok(value)
    }

    /// The coefficient of r, to which the wave function at the nucleus is proportional.
    ///
    /// Errors: `Contact` where the function is larger than r there.
    pub(super) fn value_at_nucleus(&self) -> Result<Surd, Unintegrable> {
        if !self.contact.is_zero() || self.leading_power(0) <= 0 {
            return Err(Unintegrable::Contact);
        }
        Ok(self.expansion_coefficient(1))
    }
}

/// Checks that a sum of polynomials times exponentials can be integrated from the nucleus on, term by term.
fn check_at_nucleus(product: &BTreeMap<Envelope, Laurent>) -> Result<(), Unintegrable> {
    let Some(lowest) = product.values().filter(|p| !p.is_zero()).map(Laurent::lowest).min() else {
        return Ok(());
    };
    if lowest >= 0 {
        return Ok(());
    }
    let classes: BTreeSet<(&Unit, bool)> = product.keys().map(|e| (&e.unit, e.imaginary)).collect();
    for power in lowest..0 {
        for &(unit, imaginary) in &classes {
            let mut sum = Rational::new();
            for (envelope, polynomial) in product.iter().filter(|(e, _)| &e.unit == unit && e.imaginary == imaginary) {
                sum += polynomial.expansion_coefficient(&envelope.kappa, power);
            }
            if sum.cmp0() != Ordering::Equal {
                return Err(Unintegrable::Diverges { power });
            }
        }
    }
    Err(Unintegrable::Logarithms)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn term(kappa: i64, lowest: i64, coefficients: &[i64]) -> RadialFunction {
        let polynomial = Laurent::new(lowest, coefficients.iter().map(|&c| Rational::from(c)).collect());
        RadialFunction::new(&Rational::from(kappa), &Surd::one(), &polynomial)
    }

    #[test]
    fn gamma_integrals() {
        // int r^3 e^(-3r) = 6/81
        assert_eq!(term(1, 1, &[1]).inner(&term(2, 2, &[1])), Ok(Surd::from(Rational::from((2, 27)))));
    }

    #[test]
    fn singular_parts_are_told_apart() {
        assert_eq!(term(1, -1, &[1]).inner(&term(1, 0, &[1])), Err(Unintegrable::Diverges { power: -1 }));
        // (e^-r - e^-2r)/r is finite at the origin, but its integral is ln 2
        let mut difference = term(1, -1, &[1]);
        difference.add_scaled(&Surd::from(-1), &term(2, -1, &[1]));
        assert_eq!(difference.inner(&term(1, 0, &[1])), Err(Unintegrable::Logarithms));
        assert_eq!(difference.leading_power(3), 0);
        // the same exponential: the poles cancel and nothing is left
        let mut nothing = term(1, -1, &[1]);
        nothing.add_scaled(&Surd::from(-1), &term(1, -1, &[1]));
        assert!(nothing.is_zero());
    }

    #[test]
    fn conjugation_of_the_bra() {
        let mut u = RadialFunction::default();
        u.add_scaled(&Surd::i(), &term(1, 1, &[2]));
        let v = term(1, 1, &[1]);
        // int 2 r^2 e^(-2r) = 1/2
        let half_i = Surd::i().scaled(&Rational::from((1, 2)));
        assert_eq!(v.inner(&u), Ok(half_i.clone()));
        assert_eq!(u.inner(&v), Ok(-&half_i));
        assert_eq!(u.inner(&u), Ok(Surd::one()));
    }

    #[test]
    fn contact_reads_the_value_at_the_nucleus() {
        let contact = RadialFunction::contact_of(Surd::from(3));
        assert_eq!(term(1, 1, &[2, 5]).inner(&contact), Ok(Surd::from(6)));
        assert_eq!(term(1, 2, &[5]).inner(&contact), Ok(Surd::zero()));
        assert_eq!(term(1, 0, &[1]).inner(&contact), Err(Unintegrable::Contact));
        assert_eq!(contact.inner(&contact), Err(Unintegrable::Contact));
    }
}
