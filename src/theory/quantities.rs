//! Numbers with units, constants, parameters of systems, and the functions between energies and wavelengths.

use super::dimensions::{Known, known};
use super::names::Binding;
use super::problem::{Fault, Problem};
use super::resolve::{Resolved, Resolver};
use super::terms::*;
use crate::lang::tree::{Expr, ExprKind, Name, Operation, Span};
use crate::num::Surd;
use crate::num::units::{AtomicFactor, ConstantSet, Dimension, MeasuredConstant, Unit, UnitFault};
use rug::Rational;

/// One factor of a product with the sign in front of it.
pub(super) type Factor<'e> = (Operation, &'e Expr);

/// Which names count as units.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Reading {
    /// Behind `in`, where nothing else can stand.
    Every,
    /// Behind a number or another unit: all but names of numbers and operators.
    BehindNumber,
    /// Elsewhere: only names that mean nothing else.
    Unbound,
}

impl Resolver<'_> {
    /// The unit of `EXPR in UNIT`.
    ///
    /// Errors: what the words are instead.
    pub fn unit(&self, expr: &Expr) -> Resolved<Unit> {
        match self.unit_in(expr, Reading::Every) {
            Some(unit) => unit,
            None => self.fault(
                expr.span,
                Fault::Other {
                    message: "this is not a unit".into(),
                    help: "write a unit or a product of powers of units, as in `MHz`, `cm^-1`, `C m^2/V`; `help units` lists them".into(),
                },
            ),
        }
    }

    /// The unit that an expression is, if it is made of unit words alone.
    fn unit_in(&self, expr: &Expr, reading: Reading) -> Option<Resolved<Unit>> {
        let at = |unit: Result<Unit, UnitFault>| unit.map_err(|fault| self.unit_problem(expr.span, &fault));
        match &expr.kind {
            ExprKind::Name(name) if reading == Reading::Every => Some(at(Unit::word(name))),
            ExprKind::Name(name) => match Unit::word(name) {
                Ok(unit) => self.stands_for_unit(name, reading).then_some(Ok(unit)),
                Err(fault @ UnitFault::NoPrefix { .. }) if self.means_nothing_else(name) => Some(at(Err(fault))),
                Err(_) => None,
            },
            ExprKind::Member { owner, field } if reading == Reading::Every => self.unit_of_system(owner, field),
            ExprKind::Number(text) if reading == Reading::Every && text == "1" => Some(Ok(Unit::one())),
            ExprKind::Binary { operation: Operation::Power, left, right } => {
                let unit = self.unit_in(left, reading)?;
                let Some(exponent) = super::algebra::whole_number(right) else {
                    return Some(self.fault(
                        right.span,
                        Fault::Other {
                            message: "the power of a unit is a whole number".into(),
                            help: "as in `cm^-1`, `a0^3`".into(),
                        },
                    ));
                };
                let exponent = i32::try_from(exponent).map_err(|_| UnitFault::Power);
                Some(unit.and_then(|unit| at(exponent.and_then(|exponent| unit.power(exponent)))))
            }
            ExprKind::Binary { operation: Operation::Multiply | Operation::Juxtapose, left, right } => {
                let (left, right) = (self.unit_in(left, reading)?, self.unit_in(right, reading)?);
                Some(left.and_then(|left| right.and_then(|right| at(left.times(&right)))))
            }
            ExprKind::Binary { operation: Operation::Divide, left, right } => {
                let (left, right) = (self.unit_in(left, reading)?, self.unit_in(right, reading)?);
                Some(left.and_then(|left| right.and_then(|right| at(left.over(&right)))))
            }
            _ => None,
        }
    }

    fn unit_problem(&self, span: Span, fault: &UnitFault) -> Problem {
        Problem::new(self.place(span), Fault::Other { message: fault.to_string(), help: fault.help() })
    }

    /// Whether a word that is a unit is one here.
    fn stands_for_unit(&self, name: &str, reading: Reading) -> bool {
        if self.variables.iter().any(|variable| variable == name) || self.names.matrix_operators.contains(name) {
            return false;
        }
        match self.names.bound.get(name) {
            Some(Binding::Definition(_)) => return false,
            // Systems and states are no factors of a product.
            Some(_) if reading == Reading::Unbound => return false,
            _ => {}
        }
        reading == Reading::BehindNumber && !name.contains('_') || !self.operator_word(name)
    }

    fn means_nothing_else(&self, name: &str) -> bool {
        !self.names.bound.contains_key(name)
            && !self.variables.iter().any(|variable| variable == name)
            && !self.operator_word(name)
            && !self.names.later.contains_key(name)
            && function_named(name).is_none()
    }

    /// The units at the front of a list of factors, put together, and how many factors they are.
    fn units_at_front(&self, factors: &[Factor<'_>], first: Reading) -> Option<(Resolved<Unit>, usize)> {
        let mut unit: Option<Unit> = None;
        let mut count = 0;
        for (operation, factor) in factors {
            let reading = if count == 0 { first } else { Reading::BehindNumber };
            let Some(next) = self.unit_in(factor, reading) else { break };
            let next = match next {
                Ok(next) => next,
                Err(problem) => return Some((Err(problem), count)),
            };
            let joined = match (unit.take(), operation) {
                (None, Operation::Divide) => Unit::one().over(&next),
                (None, _) => Ok(next),
                (Some(unit), Operation::Divide) => unit.over(&next),
                (Some(unit), _) => unit.times(&next),
            };
            match joined {
                Ok(joined) => unit = Some(joined),
                Err(fault) => return Some((Err(self.unit_problem(factor.span, &fault)), count)),
            }
            count += 1;
        }
        unit.map(|unit| (Ok(unit), count))
    }

    /// A number with the units behind it as one factor, and how many of the factors behind it belong to it.
    pub(super) fn number_with_unit(
        &mut self,
        number: &Expr,
        behind: &[Factor<'_>],
    ) -> Resolved<Option<(Meaning, usize)>> {
        if !matches!(number.kind, ExprKind::Number(_) | ExprKind::Measured { .. }) {
            return Ok(None);
        }
        let Some((unit, count)) = self.units_at_front(behind, Reading::BehindNumber) else { return Ok(None) };
        let unit = unit?;
        let Meaning::Scalar(value) = self.resolve(number)? else { return Ok(None) };
        let end = behind.get(count - 1).map_or(number.span, |(_, last)| last.span);
        Ok(Some((self.in_units(value, unit, Known::Number, Span::new(number.span.start, end.end)), count)))
    }

    /// A value in the units behind it, `(EXPR) bohr`, and how many factors the units are.
    pub(super) fn value_in_units(
        &mut self,
        value: &Meaning,
        behind: &[Factor<'_>],
        span: Span,
    ) -> Resolved<Option<(Meaning, usize)>> {
        let (Meaning::Scalar(value), Some((operation, _))) = (value, behind.first()) else { return Ok(None) };
        let Some((unit, count)) = self.units_at_front(behind, Reading::Unbound) else { return Ok(None) };
        let unit = unit?;
        let mut before = known(value);
        if *operation != Operation::Divide && !matches!(before, Known::Definite(_)) {
            before = Known::Number;
        }
        Ok(Some((self.in_units(value.clone(), unit, before, span), count)))
    }

    /// Whether the last factor of a product is a unit, to be taken together with what stands before it.
    pub(super) fn ends_in_unit(&self, last: &Expr) -> bool {
        self.unit_in(last, Reading::BehindNumber).is_some()
    }

    /// A unit that stands alone.
    pub(super) fn lone_unit<T>(&self, expr: &Expr) -> Option<Resolved<T>> {
        let unit = self.unit_in(expr, Reading::Unbound)?;
        Some(unit.and_then(|unit| {
            let text = unit.text();
            self.fault(
                expr.span,
                Fault::Other {
                    message: format!("`{text}` is a unit, and no number stands before it"),
                    help: format!("write `1 {text}`, or ask for the unit of a result: `EXPR in {text}`"),
                },
            )
        }))
    }

    fn in_units(&self, value: ScalarTerm, unit: Unit, before: Known, span: Span) -> Meaning {
        let unit_term = self.unit_term(&unit, span);
        let known = before.times(&Known::definite(unit.dimension().clone()));
        let product = Term::new(ScalarNode::Product(vec![value, unit_term]), self.place(span), "");
        let node = ScalarNode::Quantity { known, unit: Some(unit), value: product };
        Meaning::Scalar(self.term(node, span))
    }

    /// One of a unit, in atomic units.
    pub fn unit_term(&self, unit: &Unit, span: Span) -> ScalarTerm {
        let text = format!("1 {}{}", unit.text(), self.constants_text());
        let value = self.factor_term(&unit.factor(), span);
        let known = Known::definite(unit.dimension().clone());
        Term::new(ScalarNode::Quantity { known, unit: Some(unit.clone()), value }, self.place(span), text)
    }

    /// Exact numbers and powers of measured constants.
    fn factor_term(&self, factor: &AtomicFactor, span: Span) -> ScalarTerm {
        let exact = factor.exact_part();
        let text = exact.to_string();
        let mut factors = vec![Term::new(ScalarNode::Exact(exact), self.place(span), text)];
        let powers = [factor.alpha, factor.rydberg, factor.electron_mass];
        for (constant, power) in self.names.constants.behind_units().into_iter().zip(powers) {
            let Some(constant) = constant.filter(|_| power != 0) else { continue };
            let base = self.measured_term(&constant, span);
            let text = format!("({})^{power}", base.text);
            let exponent =
                Term::new(ScalarNode::Exact(Surd::from(i64::from(power))), self.place(span), power.to_string());
            factors.push(if power == 1 {
                base
            } else {
                Term::new(ScalarNode::Power(base, exponent), self.place(span), text)
            });
        }
        let text = factors.iter().map(|factor| format!("({})", factor.text)).collect::<Vec<_>>().join(" ");
        Term::new(ScalarNode::Product(factors), self.place(span), text)
    }

    fn measured_term(&self, constant: &MeasuredConstant, span: Span) -> ScalarTerm {
        let source = Source::Constant(constant.id);
        let node = ScalarNode::Measured { source, value: constant.value.clone(), sigma: constant.sigma.clone() };
        Term::new(node, self.place(span), constant.id)
    }

    /// `codata.alpha`, `h.reduced_mass`.
    pub(super) fn member(&self, owner: &Name, field: &Name, span: Span) -> Resolved<Meaning> {
        if owner.text == "codata" && !self.names.bound.contains_key("codata") {
            return self.constant(field, span);
        }
        let Some(Binding::System) = self.names.bound.get(&owner.text) else {
            return match self.names.bound.get(&owner.text) {
                None => self.unknown(&owner.text, owner.span),
                Some(other) => self.fault(
                    owner.span,
                    Fault::WrongBinding {
                        name: owner.text.clone(),
                        got: other.describe(),
                        wanted: "a system with parameters (`h.mass`), or `codata`".into(),
                    },
                ),
            };
        };
        if let Some(unit) = self.unit_of_system(owner, field) {
            return Ok(Meaning::Scalar(self.unit_term(&unit?, span)));
        }
        let parameters = self.names.parameters.get(&owner.text);
        if let Some((_, value)) = parameters.into_iter().flatten().find(|(name, _)| *name == field.text) {
            let number = self.term(ScalarNode::Exact(Surd::from(value.clone())), span);
            let known = if field.text.ends_with("mass") { Known::Atomic(Dimension::mass()) } else { Known::Number };
            return Ok(Meaning::Scalar(self.term(ScalarNode::Quantity { known, unit: None, value: number }, span)));
        }
        let known: Vec<String> =
            parameters.into_iter().flatten().map(|(name, _)| format!("`{}.{name}`", owner.text)).collect();
        self.fault(
            field.span,
            Fault::Other {
                message: format!("`{}` is not a parameter of the system {}", field.text, owner.text),
                help: match (known.is_empty(), field.text.as_str()) {
                    (false, "mass") => "the mass of its nucleus is infinite".into(),
                    (false, _) => format!("it has {}", known.join(", ")),
                    (true, _) => "it has none that can be asked for".into(),
                },
            },
        )
    }

    /// `h.reduced_hartree`, `h.reduced_bohr`: the atomic units with the reduced mass in place of the electron's.
    fn unit_of_system(&self, owner: &Name, field: &Name) -> Option<Resolved<Unit>> {
        let parameters = self.names.parameters.get(&owner.text)?;
        let (_, mass) = parameters.iter().find(|(name, _)| *name == "reduced_mass")?;
        let (number, dimension) = match field.text.as_str() {
            "reduced_hartree" => (mass.clone(), Dimension::energy()),
            "reduced_bohr" => (Rational::from(mass.recip_ref()), Dimension::length()),
            _ => return None,
        };
        Some(Ok(Unit::of_system(format!("{}.{}", owner.text, field.text), number, dimension)))
    }

    fn constant(&self, field: &Name, span: Span) -> Resolved<Meaning> {
        let set = self.names.constants;
        let Some(constant) = set.constant(&field.text) else {
            let names = || ConstantSet::names().map(|(name, _)| name);
            let near = crate::lang::diagnostic::did_you_mean(&field.text, names());
            return self.fault(
                field.span,
                Fault::Other {
                    message: format!("`codata.{}` is not one of the constants", field.text),
                    help: match near {
                        Some(near) => format!("did you mean `codata.{near}`?"),
                        None => format!("there are {}", names().collect::<Vec<_>>().join(", ")),
                    },
                },
            );
        };
        let mut factors = vec![self.factor_term(&constant.factor, span)];
        factors.extend(constant.measured.iter().map(|measured| self.measured_term(measured, span)));
        let text =
            |factors: &[ScalarTerm]| factors.iter().map(|f| format!("({})", f.text)).collect::<Vec<_>>().join(" ");
        let product_text = text(&factors);
        let mut value = Term::new(ScalarNode::Product(factors), self.place(span), product_text);
        if constant.offset != 0 {
            let shown = constant.offset.to_string();
            let offset = Term::new(ScalarNode::Exact(Surd::from(constant.offset)), self.place(span), shown);
            let sum = format!("({}) + ({})", offset.text, value.text);
            value = Term::new(ScalarNode::Sum(vec![offset, value]), self.place(span), sum);
        }
        // Masses are numbers of electron masses in formulas: 1 + codata.m_p.
        let known = if constant.dimension == Dimension::mass() {
            Known::Atomic(constant.dimension)
        } else {
            Known::definite(constant.dimension)
        };
        Ok(Meaning::Scalar(self.term(ScalarNode::Quantity { known, unit: None, value }, span)))
    }

    /// `photon(413.09 nm)` and `wavelength(E)`: 2 pi c/x either way, with hbar = 1.
    pub(super) fn photon_or_wavelength(&mut self, name: &Name, argument: &Expr, span: Span) -> Resolved<Meaning> {
        let argument = self.scalar(argument)?;
        let (wanted, result, example) = if name.text == "photon" {
            (Dimension::length(), Dimension::energy(), "`photon(413.09 nm)` takes a vacuum wavelength")
        } else {
            (Dimension::energy(), Dimension::length(), "`wavelength(3 eV)` takes an energy")
        };
        let got = match known(&argument) {
            Known::Number => Some("a plain number".to_string()),
            Known::Definite(dimension) | Known::Atomic(dimension) if dimension != wanted => Some(dimension.words()),
            _ => None,
        };
        if let Some(got) = got {
            let message = format!("`{}` takes {}, and this is {got}", name.text, wanted.words());
            return self.fault(argument.place.span, Fault::Other { message, help: example.into() });
        }
        let factor = AtomicFactor { pi: 1, alpha: -1, ..AtomicFactor::rational(Rational::from(2)) };
        let two_pi_c = self.factor_term(&factor, span);
        let text = format!("({})/({})", two_pi_c.text, argument.text);
        let value = Term::new(ScalarNode::Quotient(two_pi_c, argument), self.place(span), text);
        let node = ScalarNode::Quantity { known: Known::Definite(result), unit: None, value };
        Ok(Meaning::Scalar(self.term(node, span)))
    }

    /// The term that has the number of `unit`s a term is as its value.
    ///
    /// Errors: a dimension that is definite and another one; a length asked of a number that may be a wavelength.
    pub fn in_unit(&self, term: &ScalarTerm, unit: &Unit, span: Span) -> Resolved<ScalarTerm> {
        let known = known(term);
        let unit = match &known {
            // Here the inverse length is meant.
            Known::Definite(dimension) if unit.is_wavenumber() && *dimension == Dimension::inverse_length() => {
                unit.literally()
            }
            _ => unit.clone(),
        };
        let written = unit.text();
        let wanted = unit.dimension();
        let refused = |message: String, help: String| self.fault(span, Fault::Other { message, help });
        match &known {
            Known::Definite(dimension) | Known::Atomic(dimension) if dimension == wanted => {}
            Known::Definite(dimension) | Known::Atomic(dimension) => {
                let message = format!("this is {}, and `{written}` is a unit of {}", dimension.words(), wanted.words());
                let help = if *wanted == Dimension::length() && *dimension == Dimension::energy() {
                    format!("ask for the vacuum wavelength: `wavelength({}) in {written}`", shortened(&term.text))
                } else if *wanted == Dimension::energy() && *dimension == Dimension::length() {
                    format!("ask for the photon energy: `photon({}) in {written}`", shortened(&term.text))
                } else {
                    format!("ask for a unit of {}, as `{}`", dimension.words(), dimension.atomic_unit())
                };
                return refused(message, help);
            }
            Known::Number if wanted.is_none() => {}
            Known::Number => {
                let message = format!("this is a plain number, and `{written}` is a unit of {}", wanted.words());
                let atomic = wanted.atomic_unit();
                let text = shortened(&term.text);
                return refused(message, format!("if it is in atomic units, say so: `({text}) {atomic} in {written}`"));
            }
            Known::Free if *wanted == Dimension::length() => {
                let text = shortened(&term.text);
                let message = format!(
                    "whether this is a length or an energy to be given as a wavelength is not known, and `{written}` is asked"
                );
                let help = format!(
                    "write `wavelength({text}) in {written}` for an energy, `({text}) bohr in {written}` for a length"
                );
                return refused(message, help);
            }
            Known::Free => {}
        }
        let one = self.unit_term(&unit, span);
        let text = format!("({})/({})", term.text, one.text);
        Ok(Term::new(ScalarNode::Quotient(term.clone(), one), term.place, text))
    }

    /// The unit in which results of this dimension are shown: the only one that the first of the terms with such units is written in, or else
    /// the atomic unit.
    pub fn unit_to_show(&self, terms: &[&ScalarTerm], dimension: &Dimension) -> Unit {
        for term in terms {
            let mut found: Vec<Unit> = Vec::new();
            super::visit::scalars(term, &mut |inner| {
                if let ScalarNode::Quantity { unit: Some(unit), .. } = &*inner.node
                    && unit.dimension() == dimension
                    && !found.contains(unit)
                {
                    found.push(unit.clone());
                }
            });
            match found.as_slice() {
                [] => {}
                [only] => return only.clone(),
                _ => break,
            }
        }
        Unit::atomic(dimension)
    }
}

/// The text of an expression where it is short enough to be repeated.
fn shortened(text: &str) -> &str {
    if text.len() <= 40 && !text.contains('\n') { text } else { "…" }
}

/// Whether a term is a fixed number: constants, units and numbers alone.
pub(super) fn is_fixed(term: &ScalarTerm) -> bool {
    match &*term.node {
        ScalarNode::Exact(_) | ScalarNode::Measured { .. } | ScalarNode::Pi => true,
        ScalarNode::Sum(list) | ScalarNode::Product(list) => list.iter().all(is_fixed),
        ScalarNode::Negated(inner) | ScalarNode::Quantity { value: inner, .. } => is_fixed(inner),
        ScalarNode::Quotient(a, b) | ScalarNode::Power(a, b) => is_fixed(a) && is_fixed(b),
        _ => false,
    }
}
