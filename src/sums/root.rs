//! Roots of an expression of one real variable: bracketed, told apart from poles, enclosed to the asked precision.

use super::environment::Environment;
use super::evaluator::{Evaluated, Evaluator};
use super::problem::{Failure, NoSignChange, Trouble};
use crate::num::render::render;
use crate::num::{Ball, ComplexBall, Scalar, Surd};
use crate::theory::terms::*;
use rug::{Float, Rational};
use std::cmp::Ordering;

/// Precision at which signs are first asked for.
const COARSE_BITS: u32 = 64;

/// How often the precision of a sign is raised before it counts as undecided.
const SIGN_TRIES: u32 = 6;

/// Points looked at inside an interval without a change of sign, to tell the user where there is one.
const SCAN_POINTS: i64 = 16;

/// Bisection-like steps before a root is given up; superlinear steps need far fewer.
const STEP_LIMIT: u32 = 20_000;

/// A point with the sign and value of the expression there.
#[derive(Clone)]
struct Sample {
    at: Rational,
    sign: Ordering,
    value: Float,
}

/// What a root is sought of.
struct Sought<'t> {
    variable: &'t str,
    body: &'t ScalarTerm,
    environment: &'t Environment,
    place: Place,
}

impl Evaluator<'_> {
    /// The root of `body` between `from` and `to`.
    ///
    /// Accuracy: the ball returned has opposite, certain signs of the expression at its two ends.
    /// Errors: no change of sign, a pole in place of a root, complex or undecided values.
    #[allow(clippy::too_many_arguments)]
    pub(super) fn root(
        &mut self,
        variable: &str,
        from: &ScalarTerm,
        to: &ScalarTerm,
        body: &ScalarTerm,
        environment: &Environment,
        bits: u32,
        place: Place,
    ) -> Evaluated<Scalar> {
        let sought = Sought { variable, body, environment, place };
        let a = self.end(from, environment)?;
        let b = self.end(to, environment)?;
        if a >= b {
            let message = format!("the interval {variable} in {} .. {} is empty", short(&a), short(&b));
            let help = "write the smaller end first".into();
            return Err(Failure::new(place, Trouble::Refused { message, help }));
        }
        let low = self.sample(&sought, a, COARSE_BITS)?;
        let high = self.sample(&sought, b, COARSE_BITS)?;
        for end in [&low, &high] {
            if end.sign == Ordering::Equal {
                return Ok(Scalar::Exact(Surd::from(end.at.clone())));
            }
        }
        if low.sign == high.sign {
            return Err(self.no_sign_change(&sought, &low, &high)?);
        }
        self.close_in(&sought, low, high, bits)
    }

    /// An end of the interval as a rational; an approximate one is taken at its midpoint.
    fn end(&mut self, term: &ScalarTerm, environment: &Environment) -> Evaluated<Rational> {
        let value = self.scalar(term, environment, 128)?;
        let rational = match &value {
            Scalar::Exact(surd) => match surd.as_rational() {
                Some(q) => Some(q.into_owned()),
                None if surd.is_real() => {
                    crate::systems::Number::Exact(surd.clone()).to_complex(128).real().to_rational()
                }
                None => None,
            },
            Scalar::Approx(ball) if ball.is_real() => ball.midpoint(128).real().to_rational(),
            Scalar::Approx(_) => None,
        };
        rational.ok_or_else(|| {
            let message = "the end of an interval is complex".into();
            Failure::new(term.place, Trouble::Refused { message, help: "roots are sought on the real axis".into() })
        })
    }

    /// The expression at a point, its sign certain. A value that stays within its error of zero counts as zero only if it is exactly zero.
    fn sample(&mut self, sought: &Sought<'_>, at: Rational, bits: u32) -> Evaluated<Sample> {
        let inside = sought.environment.with(sought.variable, Scalar::Exact(Surd::from(at.clone())));
        let mut bits = bits;
        for _ in 0..SIGN_TRIES {
            let value = match self.scalar(sought.body, &inside, bits) {
                Ok(value) => value,
                Err(failure) if failure.is_undecided() => {
                    bits *= 2;
                    continue;
                }
                Err(failure) => return Err(failure),
            };
            let ball = match &value {
                Scalar::Exact(surd) if surd.is_zero() => {
                    return Ok(Sample { at, sign: Ordering::Equal, value: Float::new(64) });
                }
                Scalar::Exact(surd) => {
                    ComplexBall::from_surd(surd, bits.max(64)).map_err(|e| Failure::new(sought.body.place, e))?
                }
                Scalar::Approx(ball) => ball.clone(),
            };
            if !ball.is_real() {
                return Err(Failure::new(
                    sought.body.place,
                    Trouble::Refused {
                        message: format!("the expression is complex at {} = {}", sought.variable, short(&at)),
                        help: "take its real part or its modulus squared: `re(…)`, `abs(…)^2`".into(),
                    },
                ));
            }
            if let Some(sign) = ball.re.sign() {
                return Ok(Sample { at, sign, value: Float::with_val(64, ball.re.mid()) });
            }
            bits *= 2;
        }
        let digits = digits_of(bits);
        Err(Failure::new(sought.place, Trouble::Undecided { digits }))
    }

    fn no_sign_change(&mut self, sought: &Sought<'_>, low: &Sample, high: &Sample) -> Evaluated<Failure> {
        let mut inside = Vec::new();
        let width = Rational::from(&high.at - &low.at);
        let mut last = low.clone();
        for step in 1..SCAN_POINTS {
            let at = &low.at + (&width * Rational::from((step, SCAN_POINTS)));
            let Ok(here) = self.sample(sought, at, COARSE_BITS) else { continue };
            if here.sign != last.sign {
                inside.push((short(&last.at), short(&here.at)));
            }
            last = here;
        }
        if high.sign != last.sign {
            inside.push((short(&last.at), short(&high.at)));
        }
        Ok(Failure::new(
            sought.place,
            Trouble::NoSignChange(Box::new(NoSignChange {
                variable: sought.variable.to_string(),
                from: short(&low.at),
                to: short(&high.at),
                at_from: brief(&low.value),
                at_to: brief(&high.value),
                inside,
            })),
        ))
    }

    /// Shrinks a bracket until it is relatively narrower than 2^-bits.
    ///
    /// Source: derived here: each secant estimate is followed by a point just past it, on the side where the root must lie, so that both ends
    /// close in with order 7/4; halving steps in between keep it safe.
    fn close_in(&mut self, sought: &Sought<'_>, mut low: Sample, mut high: Sample, bits: u32) -> Evaluated<Scalar> {
        let start = (low.clone(), high.clone());
        if low.at < 0 && high.at > 0 {
            // Digits are relative: zero itself is asked first, and then the bracket lies on one side of it.
            let here = match self.sample(sought, Rational::new(), COARSE_BITS) {
                Ok(here) => here,
                Err(failure) if failure.is_division_by_zero() => {
                    return Err(Failure::new(
                        sought.place,
                        Trouble::Pole { variable: sought.variable.to_string(), near: "0".into() },
                    ));
                }
                Err(failure) => return Err(failure),
            };
            match here.sign {
                Ordering::Equal => return Ok(Scalar::zero()),
                sign if sign == low.sign => low = here,
                _ => high = here,
            }
        }
        let target = bits + 8;
        let mut checked_pole = false;
        let mut slow_steps = 0;
        for _ in 0..STEP_LIMIT {
            self.effort.check().map_err(|stop| Failure::new(sought.place, stop))?;
            let width = Rational::from(&high.at - &low.at);
            let size = Rational::from(low.at.abs_ref()).max(Rational::from(high.at.abs_ref()));
            let have = relative_bits(&width, &size);
            if !checked_pole && have >= 24 {
                checked_pole = true;
                self.refuse_pole(sought, &start, &low, &high)?;
            }
            if have >= i64::from(target) {
                self.refuse_pole(sought, &start, &low, &high)?;
                return enclosure(&low.at, &high.at, bits).map_err(|e| Failure::new(sought.place, e));
            }
            // Twice the digits the bracket has, and a few more.
            let work = u32::try_from((2 * have + 64).clamp(i64::from(COARSE_BITS), i64::from(target) + 64))
                .unwrap_or(target + 64);
            let secant = secant(&low, &high, work);
            let guess = if slow_steps >= 3 { None } else { secant };
            let (guess, margin) = match guess {
                // A margin well inside the present bracket but larger than the error of a converging secant step.
                Some(guess) => (guess, Rational::from(&width >> margin_bits(have))),
                None => (rounded(&(&low.at + Rational::from(&width / 2)), work), Rational::new()),
            };
            slow_steps = if slow_steps >= 3 { 0 } else { slow_steps };
            let Some(side) = self.step(sought, &guess, target, work, &mut low, &mut high)? else {
                return Ok(Scalar::Exact(Surd::from(rounded(&guess, target + 64))));
            };
            if margin != 0 {
                let past = match side {
                    Ordering::Less => Rational::from(&guess + &margin),
                    _ => Rational::from(&guess - &margin),
                };
                if self.step(sought, &past, target, work, &mut low, &mut high)?.is_none() {
                    return Ok(Scalar::Exact(Surd::from(rounded(&past, target + 64))));
                }
            }
            let now = Rational::from(&high.at - &low.at);
            if now > Rational::from(&width / 4) {
                slow_steps += 1;
            } else {
                slow_steps = 0;
            }
            if now == width {
                // The secant lands outside by rounding: halve next.
                slow_steps = 3;
            }
        }
        Err(Failure::new(sought.place, Trouble::Undecided { digits: digits_of(bits) }))
    }

    /// Moves one end of the bracket to a point inside it and tells on which side of the root the point lies; `None` when it is the root.
    fn step(
        &mut self,
        sought: &Sought<'_>,
        point: &Rational,
        target: u32,
        work: u32,
        low: &mut Sample,
        high: &mut Sample,
    ) -> Evaluated<Option<Ordering>> {
        if *point <= low.at {
            return Ok(Some(Ordering::Less));
        }
        if *point >= high.at {
            return Ok(Some(Ordering::Greater));
        }
        let here = self.sample(sought, rounded(point, target + 64), work)?;
        if here.sign == Ordering::Equal {
            return Ok(None);
        }
        if here.sign == low.sign {
            *low = here;
            Ok(Some(Ordering::Less))
        } else {
            *high = here;
            Ok(Some(Ordering::Greater))
        }
    }

    /// At a root the expression shrinks with the bracket; at a pole it grows.
    fn refuse_pole(&self, sought: &Sought<'_>, start: &(Sample, Sample), low: &Sample, high: &Sample) -> Evaluated<()> {
        let ends = |a: &Sample, b: &Sample| {
            Float::with_val(64, a.value.abs_ref()).max(&Float::with_val(64, b.value.abs_ref()))
        };
        if ends(low, high) > ends(&start.0, &start.1) {
            return Err(Failure::new(
                sought.place,
                Trouble::Pole { variable: sought.variable.to_string(), near: short(&low.at) },
            ));
        }
        Ok(())
    }
}

/// The secant estimate between two samples, rounded to `bits` bits.
fn secant(low: &Sample, high: &Sample, bits: u32) -> Option<Rational> {
    let a = low.value.to_rational()?;
    let b = high.value.to_rational()?;
    let slope = Rational::from(&b - &a);
    if slope == 0 {
        return None;
    }
    let width = Rational::from(&high.at - &low.at);
    let step = Rational::from(&width * &a) / slope;
    let estimate = &low.at - step;
    Some(rounded(&estimate, bits))
}

/// How far beside a secant estimate the bracket's new ends are put.
fn margin_bits(have: i64) -> u32 {
    u32::try_from((have * 3 / 4).clamp(2, 100_000)).unwrap_or(2)
}

fn rounded(value: &Rational, bits: u32) -> Rational {
    Float::with_val(bits, value).to_rational().unwrap_or_else(|| value.clone())
}

/// -log2 of width/size, at most one bit too small.
fn relative_bits(width: &Rational, size: &Rational) -> i64 {
    if *size == 0 {
        return i64::MAX;
    }
    let ratio = Float::with_val(32, Rational::from(width / size));
    ratio.get_exp().map_or(i64::MAX, |exponent| -i64::from(exponent))
}

fn enclosure(low: &Rational, high: &Rational, bits: u32) -> Result<Scalar, crate::num::NumberError> {
    let middle = Rational::from(low + high) / 2u32;
    let mid = Float::with_val(bits + 32, &middle);
    let width = Float::with_val_round(32, Rational::from(high - low), rug::float::Round::Up).0;
    Ok(Scalar::Approx(ComplexBall::real(Ball::with_radius(mid, width)?)))
}

fn digits_of(bits: u32) -> u32 {
    (f64::from(bits) * std::f64::consts::LOG10_2) as u32
}

fn short(value: &Rational) -> String {
    brief(&Float::with_val(64, value))
}

/// A value to a few digits, for messages.
pub fn brief(value: &Float) -> String {
    match Ball::with_radius(value.clone(), Float::new(32)) {
        Ok(ball) => render(&Scalar::Approx(ComplexBall::real(ball)), 6).text,
        Err(_) => value.to_string(),
    }
}
