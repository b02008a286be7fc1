//! Laws of numbers on random cases: balls contain what they promise, exact numbers form a field, printed digits are certain.
//!
//! `KETWORK_CASES` sets the number of cases of each law.

use ketwork::num::{
    Agreement, Ball, ComplexBall, Decimal, Function, RenderedKind, Scalar, Surd, bits_for_digits, concise,
    digits_in_common, needs_more, parse_decimal, parse_uncertain, render,
};
use proptest::prelude::*;
use proptest::test_runner::RngSeed;
use rug::{Complex, Float, Integer, Rational};
use std::cmp::Ordering;

/// Working bits of the balls under test; the values they are compared with have four times as many.
const BITS: u32 = 96;

fn config() -> ProptestConfig {
    let cases = std::env::var("KETWORK_CASES").ok().and_then(|n| n.parse().ok()).unwrap_or(300);
    ProptestConfig {
        cases,
        rng_seed: RngSeed::Fixed(0x6b65_7477),
        failure_persistence: None,
        ..ProptestConfig::default()
    }
}

/// A ball and one of its points.
#[derive(Clone, Debug)]
struct Sample {
    ball: Ball,
    point: Rational,
}

impl Sample {
    fn float(&self) -> Float {
        Float::with_val(4 * BITS, &self.point)
    }
}

/// Midpoints of moderate size, radii from none to several times the midpoint, points up to the rim.
fn sample() -> impl Strategy<Value = Sample> {
    let mantissa = prop_oneof![4 => any::<i64>(), 1 => -8..8i64];
    let along = prop_oneof![2 => -1000..=1000i32, 1 => Just(1000), 1 => Just(-1000)];
    let radius_shift = prop_oneof![1 => Just(None), 4 => (-4..120i32).prop_map(Some)];
    (mantissa, -4..5i32, radius_shift, 1u32..=u32::MAX, along).prop_map(|(mantissa, scale, shift, radius, along)| {
        let bits = 64 - mantissa.unsigned_abs().leading_zeros() as i32;
        let mid = Float::with_val(BITS, mantissa) << (scale - bits);
        let rad = shift.map_or(Float::new(32), |shift| Float::with_val(32, radius) >> (32 + shift));
        let ball = Ball::with_radius(mid, rad).expect("finite");
        let rational = |x: &Float| x.to_rational().expect("finite");
        let point = rational(ball.mid()) + rational(ball.rad()) * Rational::from((along, 1000));
        Sample { ball, point }
    })
}

fn complex_sample() -> impl Strategy<Value = (Sample, Sample)> {
    let real = sample().prop_map(|s| (s, Sample { ball: Ball::zero(BITS), point: Rational::new() }));
    prop_oneof![4 => (sample(), sample()), 1 => real]
}

fn complex_ball((re, im): &(Sample, Sample)) -> ComplexBall {
    ComplexBall::new(re.ball.clone(), im.ball.clone())
}

fn complex_point((re, im): &(Sample, Sample)) -> Complex {
    Complex::with_val(4 * BITS, (re.float(), im.float()))
}

fn holds_rational(ball: &Ball, value: &Rational) -> bool {
    let rational = |x: &Float| x.to_rational().expect("finite");
    (value - rational(ball.mid())).abs() <= rational(ball.rad())
}

fn holds(ball: &Ball, value: &Float) -> bool {
    holds_rational(ball, &value.to_rational().expect("finite"))
}

fn holds_complex(ball: &ComplexBall, value: &Complex) -> bool {
    holds(&ball.re, value.real()) && holds(&ball.im, value.imag())
}

proptest! {
    #![proptest_config(config())]

    #[test]
    fn arithmetic_of_balls_contains_exact_results(x in sample(), y in sample(), n in -6..7i64) {
        let (a, b) = (&x.ball, &y.ball);
        prop_assert!(holds_rational(a, &x.point));
        prop_assert!(holds_rational(&a.add(b).unwrap(), &Rational::from(&x.point + &y.point)));
        prop_assert!(holds_rational(&a.sub(b).unwrap(), &Rational::from(&x.point - &y.point)));
        prop_assert!(holds_rational(&a.mul(b).unwrap(), &Rational::from(&x.point * &y.point)));
        prop_assert!(holds_rational(&a.abs(), &x.point.clone().abs()));
        prop_assert!(holds_rational(&a.neg(), &-x.point.clone()));
        prop_assert!(holds_rational(&a.rounded(20).unwrap(), &x.point));
        match a.div(b) {
            Ok(quotient) => prop_assert!(holds_rational(&quotient, &Rational::from(&x.point / &y.point))),
            Err(error) => prop_assert!(b.contains_zero(), "{error}"),
        }
        match a.powi(n) {
            Ok(power) => {
                let exact = (0..n.abs()).fold(Rational::from(1), |product, _| product * &x.point);
                let exact = if n < 0 { exact.recip() } else { exact };
                prop_assert!(holds_rational(&power, &exact));
            }
            Err(error) => prop_assert!(n < 0 && (a.contains_zero() || a.powi(-n).unwrap().contains_zero()), "{error}"),
        }
        if let Some(order) = a.compare(b) {
            prop_assert_eq!(order, x.point.cmp(&y.point));
        }
        prop_assert!(a.magnitude_above() >= x.point.clone().abs() && a.magnitude_below() <= x.point.clone().abs());
        prop_assert_eq!(a.sign().is_some(), !a.contains_zero() || a.is_exact_zero());
    }

    #[test]
    fn functions_of_balls_contain_values_at_four_times_the_precision(x in sample(), y in sample()) {
        let (a, point) = (&x.ball, x.float());
        prop_assert!(holds(&a.exp().unwrap(), &point.clone().exp()));
        let (sine, cosine) = a.sin_cos().unwrap();
        prop_assert!(holds(&sine, &point.clone().sin()) && holds(&cosine, &point.clone().cos()));
        let (sine, cosine) = a.sinh_cosh().unwrap();
        prop_assert!(holds(&sine, &point.clone().sinh()) && holds(&cosine, &point.clone().cosh()));
        prop_assert!(holds(&a.hypot(&y.ball).unwrap(), &point.clone().hypot(&y.float())));
        if a.is_positive() {
            prop_assert!(holds(&a.sqrt().unwrap(), &point.clone().sqrt()));
            prop_assert!(holds(&a.ln().unwrap(), &point.clone().ln()));
        } else if !a.is_exact_zero() {
            prop_assert!(a.sqrt().is_err() && a.ln().is_err());
        }
        match a.atan2(&y.ball) {
            Ok(angle) => prop_assert!(holds(&angle, &point.clone().atan2(&y.float()))),
            Err(error) => prop_assert!(a.contains_zero() && !y.ball.is_positive(), "{error}"),
        }
    }

    #[test]
    fn complex_balls_contain_values_at_four_times_the_precision(x in complex_sample(), y in complex_sample(), n in -5..6i64) {
        let (a, b) = (complex_ball(&x), complex_ball(&y));
        let (z, w) = (complex_point(&x), complex_point(&y));
        // A hair of slack for the rounding of the reference; the radii under test are never that tight.
        let hair = Float::with_val(32, 1) >> (3 * BITS as i32);
        let within = |ball: &ComplexBall, value: Complex| {
            let slack = Float::with_val(32, &hair * Complex::with_val(32, value.abs_ref()).real());
            holds_complex(&ball.widened(&slack).unwrap(), &value)
        };
        prop_assert!(within(&a.add(&b).unwrap(), Complex::with_val(4 * BITS, &z + &w)));
        prop_assert!(within(&a.sub(&b).unwrap(), Complex::with_val(4 * BITS, &z - &w)));
        prop_assert!(within(&a.mul(&b).unwrap(), Complex::with_val(4 * BITS, &z * &w)));
        prop_assert!(within(&a.exp().unwrap(), z.clone().exp()));
        prop_assert!(within(&a.sin().unwrap(), z.clone().sin()));
        prop_assert!(within(&a.cos().unwrap(), z.clone().cos()));
        prop_assert!(holds(&a.abs().unwrap().widened(&hair).unwrap(), z.clone().abs().real()));
        if let Ok(power) = a.powi(n) {
            let value = (0..n.abs()).fold(Complex::with_val(4 * BITS, 1), |product, _| product * &z);
            let value = if n < 0 { value.recip() } else { value };
            prop_assert!(within(&power, value));
        }
        match a.div(&b) {
            Ok(quotient) => prop_assert!(within(&quotient, Complex::with_val(4 * BITS, &z / &w))),
            Err(error) => prop_assert!(b.contains_zero(), "{error}"),
        }
        let touches_cut = a.im.contains_zero() && !a.re.is_positive();
        match (a.sqrt(), a.ln(), a.pow(&b)) {
            (Ok(root), Ok(logarithm), power) => {
                prop_assert!(within(&root, z.clone().sqrt()));
                prop_assert!(within(&logarithm, z.clone().ln()));
                if let Ok(power) = power {
                    prop_assert!(within(&power, (w * z.ln()).exp()));
                }
            }
            (root, logarithm, _) => prop_assert!(touches_cut, "{root:?} {logarithm:?}"),
        }
    }
}

/// A short exact number over the square roots of 1, 2, 3, 5 and their products.
fn surd() -> impl Strategy<Value = Surd> {
    let rational = (-9..10i64, 1..7i64).prop_map(Rational::from);
    let term = (rational.clone(), prop_oneof![2 => Just(Rational::new()), 1 => rational], 0..7usize);
    prop::collection::vec(term, 0..4).prop_map(|terms| {
        let mut sum = Surd::zero();
        for (re, im, root) in terms {
            let root = Surd::sqrt_of(&Rational::from([1, 2, 3, 5, 6, 10, 15][root])).expect("small");
            sum += &(&Surd::gaussian(re, im) * &root);
        }
        sum
    })
}

proptest! {
    #![proptest_config(config())]

    #[test]
    fn exact_numbers_form_a_field(a in surd(), b in surd(), c in surd()) {
        prop_assert_eq!(&a + &b, &b + &a);
        prop_assert_eq!(&a * &b, &b * &a);
        prop_assert_eq!(&(&a + &b) + &c, &a + &(&b + &c));
        prop_assert_eq!(&(&a * &b) * &c, &a * &(&b * &c));
        prop_assert_eq!(&a * &(&b + &c), &(&a * &b) + &(&a * &c));
        prop_assert!((&a - &a).is_zero());
        prop_assert_eq!((&a * &b).conj(), &a.conj() * &b.conj());
        prop_assert_eq!(&a.re() + &(&Surd::i() * &a.im()), a.clone());
        match a.inverse() {
            Some(inverse) => prop_assert!((&a * &inverse).is_one()),
            None => prop_assert!(a.is_zero()),
        }
    }

    #[test]
    fn exact_and_approximate_arithmetic_agree(a in surd(), b in surd(), n in -4..5i64, halves in -5..6i64) {
        let (exact_a, exact_b) = (Scalar::Exact(a), Scalar::Exact(b));
        let (ball_a, ball_b) = (
            Scalar::Approx(exact_a.to_ball(BITS).unwrap()),
            Scalar::Approx(exact_b.to_ball(BITS).unwrap()),
        );
        let agree = |exact: Scalar, approx: Scalar| {
            exact.to_ball(2 * BITS).unwrap().overlaps(&approx.to_ball(BITS).unwrap())
        };
        prop_assert!(agree(exact_a.add(&exact_b, BITS).unwrap(), ball_a.add(&ball_b, BITS).unwrap()));
        prop_assert!(agree(exact_a.sub(&exact_b, BITS).unwrap(), ball_a.sub(&ball_b, BITS).unwrap()));
        prop_assert!(agree(exact_a.mul(&exact_b, BITS).unwrap(), ball_a.mul(&ball_b, BITS).unwrap()));
        prop_assert!(agree(exact_a.abs(BITS).unwrap(), ball_a.abs(BITS).unwrap()));
        if let Ok(approx) = ball_a.div(&ball_b, BITS) {
            prop_assert!(agree(exact_a.div(&exact_b, BITS).unwrap(), approx));
        }
        for exponent in [Scalar::from(n), Scalar::from(Rational::from((halves, 2))), Scalar::from(Rational::from((n, 3)))] {
            match (exact_a.pow(&exponent, BITS), ball_a.pow(&exponent, BITS)) {
                (Ok(exact), Ok(approx)) => prop_assert!(agree(exact, approx)),
                (Err(error), Err(_)) => prop_assert!(exact_a.is_zero(), "{error}"),
                (exact, approx) => prop_assert!(exact.is_ok() && approx.unwrap_err().is_undecided()),
            }
        }
        let root = exact_a.apply(Function::Sqrt, BITS).unwrap();
        prop_assert!(agree(exact_a.clone(), root.mul(&root, BITS).unwrap()));
        prop_assert!(root.to_ball(BITS).unwrap().re.sign() != Some(Ordering::Less));
        if exact_a.is_real() && exact_b.is_real() {
            let difference = ball_a.to_ball(BITS).unwrap().sub(&ball_b.to_ball(BITS).unwrap()).unwrap().re;
            if let Some(order) = difference.sign() {
                prop_assert_eq!(exact_a.compare(&exact_b, BITS), Ok(order));
            }
        }
    }
}

/// A computation that can be repeated at any precision, with cancellation of up to `lost` decimal digits.
#[derive(Clone, Debug)]
struct Computation {
    first: Rational,
    second: Rational,
    lost: i32,
    complex: bool,
}

fn computation() -> impl Strategy<Value = Computation> {
    let rational = (-3000..3000i64, 1..1000i64).prop_map(Rational::from);
    (rational.clone(), rational, 0..60i32, any::<bool>()).prop_map(|(first, second, lost, complex)| Computation {
        first,
        second,
        lost,
        complex,
    })
}

impl Computation {
    /// exp(a) - (exp(a) rounded at a fixed place) (+ b), the fixed value being the same at every precision.
    fn value(&self, bits: u32) -> Scalar {
        let step = |x: Result<Scalar, ketwork::num::NumberError>| x.expect("defined");
        let first = Scalar::from(Rational::from(&self.first / 100));
        let reference = step(first.apply(Function::Exp, 2000)).to_ball(2000).expect("finite").re;
        let scale = Integer::from(Integer::u_pow_u(10, self.lost as u32));
        let rounded = Float::with_val(2000, reference.mid() * &scale).to_integer().expect("finite");
        let rounded = Scalar::from(Rational::from((rounded, scale.clone())));
        let re = step(step(first.apply(Function::Exp, bits)).sub(&rounded, bits));
        if !self.complex {
            return re;
        }
        let small = step(Scalar::from(self.second.clone()).mul(&Scalar::from(Rational::from((1, scale))), bits));
        let im = step(step(small.apply(Function::Sin, bits)).mul(&Scalar::i(), bits));
        step(re.add(&im, bits))
    }
}

proptest! {
    #![proptest_config(config())]

    #[test]
    fn no_printed_digit_differs_at_three_times_the_precision(computation in computation(), digits in 1..40u32, bits in 40..260u32) {
        let (rough, fine) = (computation.value(bits), computation.value(3 * bits));
        let printed = render(&rough, digits);
        match printed.kind {
            RenderedKind::Exact => prop_assert!(rough.is_zero() || rough.is_exact()),
            RenderedKind::Approx { digits_held: 0 } => prop_assert!(!rough.may_be_zero()),
            RenderedKind::Approx { digits_held } => {
                prop_assert!(digits_held <= digits + 1);
                prop_assert_eq!(&printed.text, &render(&fine, digits_held).text);
                prop_assert_eq!(needs_more(&rough, digits), digits_held < digits);
            }
            RenderedKind::BelowZero { power } => {
                let bound = parse_decimal(&format!("1e{}", -power)).unwrap();
                prop_assert!(fine.to_ball(bits).unwrap().magnitude_below() <= bound);
            }
        }
        if let (false, Agreement::Digits(common)) = (rough.may_be_zero(), digits_in_common(&rough, &fine))
            && let (false, RenderedKind::Approx { digits_held }) = (computation.complex, printed.kind)
        {
            // digits that agree are nearly as many as digits that are certain
            prop_assert!(common + 2 >= digits_held, "{common} {digits_held}");
        }
    }

    #[test]
    fn printed_reals_are_read_as_what_was_rounded(x in sample(), digits in 1..40u32) {
        let value = Scalar::from(x.ball.clone());
        let printed = render(&value, digits);
        match printed.kind {
            RenderedKind::Approx { digits_held: 0 } => {
                let read = parse_uncertain(&printed.text).unwrap();
                prop_assert!((read.value - &x.point).abs() <= read.uncertainty);
            }
            RenderedKind::Approx { digits_held } => {
                let read = parse_decimal(&printed.text).unwrap();
                let spelt = Decimal::parse(&printed.text).unwrap();
                prop_assert_eq!(spelt.leading_power().unwrap() - spelt.place + 1, i64::from(digits_held));
                let unit = Decimal { units: Integer::from(1), place: spelt.place }.to_rational();
                prop_assert!((read - &x.point).abs() * 2 <= unit);
            }
            RenderedKind::BelowZero { power } => {
                let bound = parse_decimal(&format!("1e{}", -power)).unwrap();
                prop_assert!(x.point.abs() <= bound);
            }
            RenderedKind::Exact => prop_assert_eq!(x.point, Rational::new()),
        }
    }

    #[test]
    fn decimals_are_read_as_printed(units in any::<i64>(), place in -30..30i64, power in -40..40i64) {
        let decimal = Decimal { units: Integer::from(units), place };
        prop_assert_eq!(parse_decimal(&decimal.plain()).unwrap(), decimal.to_rational());
        prop_assert_eq!(parse_decimal(&decimal.scientific(power)).unwrap(), decimal.to_rational());
    }

    #[test]
    fn concise_uncertainties_are_read_as_printed(
        value in any::<i32>(), value_place in -30..30i64, spread in 1..100_000i64, spread_place in -30..30i64,
    ) {
        let decimal = |units, place| Decimal { units: Integer::from(units), place }.to_rational();
        let (value, spread) = (decimal(i64::from(value), value_place), decimal(spread, spread_place));
        let text = concise(&value, &spread);
        let read = parse_uncertain(&text).unwrap();
        // at most 5 % of the uncertainty is rounded away, and half a unit of the place it ends at
        prop_assert!((Rational::from(&read.uncertainty - &spread)).abs() * 20 <= spread, "{text}");
        prop_assert!((read.value - value).abs() * 2 <= read.uncertainty, "{text}");
    }

    #[test]
    fn bits_hold_their_digits(digits in 1..100_000u32) {
        let bits = f64::from(bits_for_digits(digits));
        prop_assert!(bits * std::f64::consts::LOG10_2 >= f64::from(digits));
    }
}
