//! Elementary functions of real balls.
//!
//! The midpoint is correctly rounded; each function says the bound by which the radius of its argument is propagated. The bounds hold for every
//! point of the ball, not only for small radii.

use super::ball::{Ball, RADIUS_BITS, down, up};
use super::error::{DigitCount, NumberError, Question};
use rug::Float;
use rug::float::{Constant, Round};
use std::cmp::Ordering;

/// Sine and cosine need as many bits of pi as the argument has before the point; beyond this many they are refused.
const LARGEST_ANGLE_EXPONENT: i32 = 1 << 22;

fn nearest<T>(bits: u32, value: T) -> (Float, Ordering)
where
    Float: rug::ops::AssignRound<T, Round = Round, Ordering = Ordering>,
{
    Float::with_val_round(bits, value, Round::Nearest)
}

impl Ball {
    /// The square root of a number that is not negative.
    ///
    /// Accuracy: radius r / (sqrt(m) + sqrt(m - r)).
    /// Errors: `NotReal` when certainly negative, `Undecided` when the ball reaches zero.
    pub fn sqrt(&self) -> Result<Self, NumberError> {
        if self.is_exact_zero() {
            return Ok(self.clone());
        }
        if self.is_negative() {
            return Err(NumberError::NotReal { function: "the square root" });
        }
        if self.contains_zero() {
            return Err(NumberError::Undecided { question: Question::SideOfCut });
        }
        let sum_of_roots = down(&down(down(self.mid()).sqrt_ref()) + &down(self.magnitude_below().sqrt_ref()));
        Self::enclose(nearest(self.bits(), self.mid().sqrt_ref()), up(self.rad() / &sum_of_roots))
    }

    /// The exponential.
    ///
    /// Accuracy: radius exp(m) (exp(r) - 1).
    pub fn exp(&self) -> Result<Self, NumberError> {
        let value = nearest(self.bits(), self.mid().exp_ref());
        let rad = if self.is_exact() {
            Float::new(RADIUS_BITS)
        } else {
            up(&up(up(self.mid()).exp_ref()) * &up(self.rad().exp_m1_ref()))
        };
        Self::enclose(value, rad)
    }

    /// The natural logarithm of a positive number.
    ///
    /// Accuracy: radius ln(1 + r / (m - r)).
    /// Errors: `LogarithmOfZero`, `NotReal` when certainly negative, `Undecided` when the ball reaches zero.
    pub fn ln(&self) -> Result<Self, NumberError> {
        if self.is_exact_zero() {
            return Err(NumberError::LogarithmOfZero);
        }
        if self.is_negative() {
            return Err(NumberError::NotReal { function: "the logarithm" });
        }
        if self.contains_zero() {
            return Err(NumberError::Undecided { question: Question::LogarithmOfZero });
        }
        let rad = up(up(self.rad() / &self.magnitude_below()).ln_1p_ref());
        Self::enclose(nearest(self.bits(), self.mid().ln_ref()), rad)
    }

    /// Sine and cosine.
    ///
    /// Accuracy: radius min(r, 2), since no derivative exceeds 1; an argument known no better than a period gives 0 +- 1.
    /// Errors: `TooLarge` for an argument of more than about a million digits before the point.
    pub fn sin_cos(&self) -> Result<(Self, Self), NumberError> {
        if *self.rad() >= 4 {
            let anything = Self::with_radius(Float::new(self.bits()), Float::with_val(RADIUS_BITS, 1))?;
            return Ok((anything.clone(), anything));
        }
        if let Some(exponent) = self.mid().get_exp()
            && exponent > LARGEST_ANGLE_EXPONENT
        {
            let digits = (f64::from(exponent) * std::f64::consts::LOG10_2) as u64;
            return Err(NumberError::TooLarge { decimal_digits: DigitCount::About(digits) });
        }
        let rad = if *self.rad() > 2 { Float::with_val(RADIUS_BITS, 2) } else { self.rad().clone() };
        let sine = Self::enclose(nearest(self.bits(), self.mid().sin_ref()), rad.clone())?;
        let cosine = Self::enclose(nearest(self.bits(), self.mid().cos_ref()), rad)?;
        Ok((sine, cosine))
    }

    pub fn sin(&self) -> Result<Self, NumberError> {
        Ok(self.sin_cos()?.0)
    }

    pub fn cos(&self) -> Result<Self, NumberError> {
        Ok(self.sin_cos()?.1)
    }

    /// Hyperbolic sine and cosine.
    ///
    /// Accuracy: radius r cosh(|m| + r) bounds both, since neither derivative exceeds that.
    pub fn sinh_cosh(&self) -> Result<(Self, Self), NumberError> {
        let rad = if self.is_exact() {
            Float::new(RADIUS_BITS)
        } else {
            up(self.rad() * &up(self.magnitude_above().cosh_ref()))
        };
        let sine = Self::enclose(nearest(self.bits(), self.mid().sinh_ref()), rad.clone())?;
        let cosine = Self::enclose(nearest(self.bits(), self.mid().cosh_ref()), rad)?;
        Ok((sine, cosine))
    }

    /// The length of the vector (x, y).
    ///
    /// Accuracy: radius sqrt(r_x^2 + r_y^2): a length changes by no more than the point moves.
    pub fn hypot(&self, other: &Self) -> Result<Self, NumberError> {
        let bits = self.bits().max(other.bits());
        Self::enclose(nearest(bits, self.mid().hypot_ref(other.mid())), up(self.rad().hypot_ref(other.rad())))
    }

    /// The angle of the point (x, y) with y = `self`, in (-pi, pi]; pi on the negative x axis when y is exactly zero.
    ///
    /// Accuracy: radius sqrt(r_x^2 + r_y^2) / d with d the least distance of the ball from the origin.
    /// Errors: `Undecided` when the ball touches the negative x axis or the origin without lying in the axis; `LogarithmOfZero` at the origin.
    pub fn atan2(&self, x: &Self) -> Result<Self, NumberError> {
        if self.is_exact_zero() && x.is_exact_zero() {
            return Err(NumberError::LogarithmOfZero);
        }
        let bits = self.bits().max(x.bits());
        if self.is_exact_zero() {
            return match x.sign() {
                Some(Ordering::Greater) => Ok(Self::zero(bits)),
                Some(_) => Self::pi(bits),
                None => Err(NumberError::Undecided { question: Question::SideOfCut }),
            };
        }
        if self.contains_zero() && !x.is_positive() {
            return Err(NumberError::Undecided { question: Question::SideOfCut });
        }
        let distance = down(self.magnitude_below().hypot_ref(&x.magnitude_below()));
        let moved = up(self.rad().hypot_ref(x.rad()));
        let whole_turn = up(Constant::Pi) * 2u32;
        let mut rad = up(&moved / &distance);
        if rad > whole_turn {
            rad = whole_turn;
        }
        Self::enclose(nearest(bits, self.mid().atan2_ref(x.mid())), rad)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use rug::Rational;

    fn ball(mid: f64, rad: f64) -> Ball {
        Ball::with_radius(Float::with_val(64, mid), Float::with_val(32, rad)).expect("finite")
    }

    #[test]
    fn functions_of_a_point_lose_no_more_than_a_unit() {
        let x = ball(1.25, 0.0);
        let (sine, cosine) = x.sin_cos().expect("defined");
        let (hyperbolic_sine, hyperbolic_cosine) = x.sinh_cosh().expect("defined");
        let functions = [x.sqrt(), x.exp(), x.ln(), x.hypot(&x), x.atan2(&ball(3.0, 0.0)), Ball::pi(64)];
        for y in
            functions.into_iter().map(|y| y.expect("defined")).chain([sine, cosine, hyperbolic_sine, hyperbolic_cosine])
        {
            let relative = Float::with_val(64, y.rad() / y.mid());
            assert!(relative > 0 && relative <= Float::with_val(64, Float::i_exp(1, -63)), "{y:?}");
        }
    }

    #[test]
    fn roots_and_logarithms_at_the_edge_of_their_domain() {
        let zero = ball(0.0, 0.0);
        assert_eq!(zero.sqrt(), Ok(zero.clone()));
        assert_eq!(zero.ln(), Err(NumberError::LogarithmOfZero));
        assert_eq!(ball(-1.0, 0.5).sqrt(), Err(NumberError::NotReal { function: "the square root" }));
        assert_eq!(ball(1.0, 1.0).sqrt(), Err(NumberError::Undecided { question: Question::SideOfCut }));
        assert_eq!(ball(1.0, 1.0).ln(), Err(NumberError::Undecided { question: Question::LogarithmOfZero }));
        assert_eq!(zero.atan2(&zero), Err(NumberError::LogarithmOfZero));
        assert_eq!(
            ball(0.0, 0.1).atan2(&ball(-1.0, 0.0)),
            Err(NumberError::Undecided { question: Question::SideOfCut })
        );
        assert!(zero.atan2(&ball(-1.0, 0.5)).expect("on the cut").overlaps(&Ball::pi(64).expect("finite")));
    }

    #[test]
    fn an_angle_known_to_no_period_has_any_sine() {
        let sine = ball(1e9, 100.0).sin().expect("bounded");
        assert!(sine.contains_rational(&Rational::from(1)) && sine.contains_rational(&Rational::from(-1)));
        let far = Ball::from_float(Float::with_val(64, Float::i_exp(1, 1 << 28))).expect("finite");
        assert_eq!(far.sin(), Err(NumberError::TooLarge { decimal_digits: DigitCount::About(80_807_124) }));
        assert_eq!(far.exp(), Err(NumberError::beyond_exponent_range()));
    }
}
