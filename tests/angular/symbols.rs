//! Wigner symbols: against sympy, published values, and the laws they obey.

use crate::random::{Random, cases};
use crate::words::half;
use ketwork::angular::{AngularError, HalfInteger, clebsch_gordan, ninej, sixj, threej};
use ketwork::num::Surd;
use proptest::prelude::*;
use rug::{Float, Rational};
use std::io::Write;
use std::path::PathBuf;
use std::process::{Command, Stdio};

fn three(j: [i32; 6]) -> Result<Surd, AngularError> {
    let [a, b, c, d, e, f] = j.map(half);
    threej(a, b, c, d, e, f)
}

fn six(j: [i32; 6]) -> Result<Surd, AngularError> {
    sixj(j.map(half))
}

fn nine(j: [i32; 9]) -> Result<Surd, AngularError> {
    let j = j.map(half);
    ninej([[j[0], j[1], j[2]], [j[3], j[4], j[5]], [j[6], j[7], j[8]]])
}

/// A third momentum that closes a triangle with two.
fn third(random: &mut Random, a: i32, b: i32) -> i32 {
    (a - b).abs() + 2 * random.between(0, a.min(b))
}

/// A momentum that closes a triangle with each of two pairs, where there is one.
fn common(random: &mut Random, pairs: [(i32, i32); 2]) -> Option<i32> {
    let low = pairs.iter().map(|(a, b)| (a - b).abs()).max()?;
    let high = pairs.iter().map(|(a, b)| a + b).min()?;
    let odd = pairs.iter().any(|(a, b)| (a + b + low) % 2 != 0);
    if odd || low > high { None } else { Some(low + 2 * random.between(0, (high - low) / 2)) }
}

fn random_three(random: &mut Random, largest: i32) -> [i32; 6] {
    loop {
        let (a, b) = (random.between(0, largest), random.between(0, largest));
        let c = third(random, a, b);
        let m = |random: &mut Random, j: i32| -j + 2 * random.between(0, j);
        let (ma, mb) = (m(random, a), m(random, b));
        // one in eight keeps projections that do not add up
        let mc = if random.below(8) == 0 { m(random, c) } else { -ma - mb };
        if mc.abs() <= c {
            return [a, b, c, ma, mb, mc];
        }
    }
}

fn random_six(random: &mut Random, largest: i32) -> [i32; 6] {
    loop {
        let (a, b, d) = (random.between(0, largest), random.between(0, largest), random.between(0, largest));
        let c = third(random, a, b);
        // {a b c; d e f}: (d e c), (d b f), (a e f)
        let e = third(random, d, c);
        if let Some(f) = common(random, [(d, b), (a, e)]) {
            return [a, b, c, d, e, f];
        }
    }
}

fn random_nine(random: &mut Random, largest: i32) -> [i32; 9] {
    loop {
        let j: [i32; 4] = std::array::from_fn(|_| random.between(0, largest));
        let (c, f) = (third(random, j[0], j[1]), third(random, j[2], j[3]));
        let (g, h) = (third(random, j[0], j[2]), third(random, j[1], j[3]));
        if let Some(i) = common(random, [(c, f), (g, h)]) {
            return [j[0], j[1], c, j[2], j[3], f, g, h, i];
        }
    }
}

/// The interpreter with the packages of tests/reference/requirements.txt: the one the README sets up, or `KETWORK_PYTHON`.
fn python() -> PathBuf {
    match std::env::var_os("KETWORK_PYTHON") {
        Some(path) => path.into(),
        None => PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("target/reference/bin/python"),
    }
}

fn reference(questions: &str) -> Vec<String> {
    let script = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/reference/wigner.py");
    let mut child = Command::new(python())
        .arg(script)
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .spawn()
        .expect("no Python with the reference packages: run the test command of the README, which sets it up");
    child.stdin.take().expect("a pipe").write_all(questions.as_bytes()).expect("the questions are read");
    let output = child.wait_with_output().expect("an answer");
    assert!(output.status.success(), "the reference failed");
    String::from_utf8(output.stdout).expect("text").lines().map(str::to_string).collect()
}

/// `sign square` as the reference writes it.
fn signed_square(value: &Surd) -> String {
    let square = (value * value).as_rational().expect("the root of a rational").into_owned();
    let sign = match value.terms().next() {
        None => 0,
        Some((_, c)) if c.re > 0 => 1,
        Some(_) => -1,
    };
    format!("{sign} {}/{}", square.numer(), square.denom())
}

#[test]
fn symbols_are_those_of_sympy() {
    let mut random = Random::new(6);
    let (mut questions, mut ours) = (String::new(), Vec::new());
    let mut ask = |kind: &str, j: &[i32], value: Result<Surd, AngularError>| {
        let arguments: Vec<String> = j.iter().map(i32::to_string).collect();
        questions += &format!("{kind} {}\n", arguments.join(" "));
        ours.push(signed_square(&value.expect("momenta that couple")));
    };
    for case in 0..cases(200) {
        // corners: a few large ones, many small ones
        let largest = if case % 10 == 0 { 60 } else { 14 };
        let j = random_three(&mut random, largest);
        ask("3j", &j, three(j));
        let j = random_six(&mut random, largest);
        ask("6j", &j, six(j));
        let j = random_nine(&mut random, if case % 20 == 0 { 10 } else { 5 });
        ask("9j", &j, nine(j));
    }
    let answers = reference(&questions);
    assert_eq!(answers.len(), ours.len());
    let mut alive = 0;
    for ((question, answer), value) in questions.lines().zip(&answers).zip(&ours) {
        assert_eq!(value, answer, "{question}");
        alive += usize::from(!value.starts_with('0'));
    }
    assert!(2 * alive > ours.len(), "most of the symbols are zero");
}

/// Exact values of the standard tables (Edmonds, Angular Momentum in Quantum Mechanics, table 2 and 5; Varshalovich, Moskalev, Khersonskii,
/// Quantum Theory of Angular Momentum, chapters 8-10, both from memory); computed anew for this project with exact arithmetic.
#[test]
fn published_values() {
    let whole = |j: [i32; 6]| j.map(|x| 2 * x);
    for (j, value) in [
        (whole([1, 1, 0, 0, 0, 0]), "-1/3 sqrt(3)"),
        (whole([1, 1, 2, 0, 0, 0]), "1/15 sqrt(30)"),
        (whole([2, 2, 2, 0, 0, 0]), "-1/35 sqrt(70)"),
        (whole([3, 2, 1, 0, 0, 0]), "-1/35 sqrt(105)"),
        ([3, 2, 1, 1, -2, 1], "1/6 sqrt(3)"),
        ([3, 3, 4, 3, -1, -2], "-1/10 sqrt(10)"),
        (whole([6, 4, 2, 0, 0, 0]), "1/143 sqrt(715)"),
    ] {
        assert_eq!(three(j).expect("valid").to_string(), value, "{j:?}");
    }
    for (j, value) in [
        (whole([1, 1, 1, 1, 1, 1]), "1/6"),
        (whole([2, 2, 2, 2, 2, 2]), "-3/70"),
        ([1, 2, 3, 2, 1, 2], "-1/6"),
        (whole([2, 2, 1, 1, 1, 1]), "-1/10 sqrt(5)"),
        (whole([8, 8, 8, 8, 8, 8]), "-12219/965770"),
        (whole([20, 20, 20, 20, 20, 20]), "-33188637458619/6598917336119836"),
    ] {
        assert_eq!(six(j).expect("valid").to_string(), value, "{j:?}");
    }
    for (j, value) in [
        ([1, 1, 1, 1, 1, 1, 1, 1, 0], "1/18"),
        ([1, 1, 2, 1, 1, 2, 2, 2, 4], "1/25"),
        ([2, 2, 2, 2, 2, 2, 2, 2, 2], "41/2450"),
        ([1, 2, 3, 4, 5, 6, 3, 6, 9], "1/6370 sqrt(15)"),
    ] {
        assert_eq!(nine(j.map(|x| 2 * x)).expect("valid").to_string(), value, "{j:?}");
    }
}

fn float(value: &Surd) -> Float {
    let mut sum = Float::new(400);
    for (unit, c) in value.terms() {
        sum += Float::with_val(400, &unit.radicand).sqrt() * &c.re;
    }
    sum
}

/// Large arguments by a second way: {a b c; 0 c b} = (-1)^(a+b+c)/sqrt((2b+1)(2c+1)) (Edmonds, eq. 6.3.2).
#[test]
fn large_symbols() {
    for (a, b, c) in [(200, 300, 400), (401, 600, 999), (2000, 2000, 2000), (3, 9_998, 9_997)] {
        let root = Surd::sqrt_of(&Rational::from((1, i64::from(b + 1) * i64::from(c + 1)))).expect("small");
        let expected = if (a + b + c) / 2 % 2 == 0 { root } else { -&root };
        assert_eq!(six([a, b, c, 0, c, b]).expect("valid"), expected, "{a} {b} {c}");
    }
    // 3j (100 100 100; 0 0 0), computed independently for this project
    let value = float(&three([200, 200, 200, 0, 0, 0]).expect("valid"));
    let known = Float::with_val(400, Float::parse("0.006032391313465684006650805520554418231889").expect("digits"));
    assert!((value - known).abs() < 1e-42);
    // all j = 200: the sum over x of (2x+1) {j j x; j j j}^2 is 1/(2j+1)
    let mut sum = Surd::zero();
    for x in (0..=800).step_by(2) {
        let symbol = six([400, 400, x, 400, 400, 400]).expect("valid");
        sum += &(&symbol * &symbol).scaled(&Rational::from(x + 1));
    }
    assert_eq!(sum, Surd::from(Rational::from((1, 401))));
    assert!(matches!(six([20_000, 2, 2, 2, 2, 2]), Err(AngularError::TooLarge { .. })));
}

fn momentum(largest: i32) -> impl Strategy<Value = i32> {
    0..=largest
}

fn seeded() -> impl Strategy<Value = u64> {
    any::<u64>()
}

fn config() -> ProptestConfig {
    ProptestConfig {
        cases: u32::try_from(cases(256)).unwrap_or(u32::MAX),
        rng_seed: proptest::test_runner::RngSeed::Fixed(0x6b65_7477),
        failure_persistence: None,
        ..ProptestConfig::default()
    }
}

fn odd(sum: i32) -> bool {
    sum / 2 % 2 != 0
}

fn with_sign(value: &Surd, negative: bool) -> Surd {
    if negative { -value } else { value.clone() }
}

proptest! {
    #![proptest_config(config())]

    /// Columns swapped, all M reversed: (-1)^(j1+j2+j3); columns turned: the same.
    #[test]
    fn three_is_symmetric(seed in seeded()) {
        let j = random_three(&mut Random::new(seed), 20);
        let [a, b, c, d, e, f] = j;
        let value = three(j).expect("valid");
        let other = with_sign(&value, odd(a + b + c));
        prop_assert_eq!(three([b, c, a, e, f, d]).expect("valid"), value);
        prop_assert_eq!(&three([b, a, c, e, d, f]).expect("valid"), &other);
        prop_assert_eq!(three([a, b, c, -d, -e, -f]).expect("valid"), other);
    }

    /// Regge's symmetry of the 3j symbol, which no permutation gives (Regge, Nuovo Cimento 10, 544 (1958), from memory).
    #[test]
    fn three_has_the_symmetry_of_regge(seed in seeded()) {
        let j = random_three(&mut Random::new(seed), 20);
        let [a, b, c, d, e, f] = j;
        prop_assume!(d + e + f == 0);
        let value = three(j).expect("valid");
        let turned = [a, (b + c - d) / 2, (b + c + d) / 2, c - b, (b - c - d) / 2 - f, (b - c + d) / 2 + f];
        prop_assert_eq!(three(turned).expect("valid"), value);
    }

    /// sum over m1 of (2 j3 + 1) (j1 j2 j3; m1 m2 m3)^2 = 1, and zero between different j3.
    #[test]
    fn three_is_orthogonal(a in momentum(14), b in momentum(14), x in 0..15_i32, y in 0..15_i32, m in 0..30_i32) {
        let steps = a.min(b) + 1;
        let (c, d) = ((a - b).abs() + 2 * (x % steps), (a - b).abs() + 2 * (y % steps));
        let reach = c.min(d);
        let mc = reach - 2 * (m % (reach + 1));
        let mut sum = Surd::zero();
        for ma in (-a..=a).step_by(2) {
            let mb = -ma - mc;
            if mb.abs() <= b {
                let left = three([a, b, c, ma, mb, mc]).expect("valid");
                sum += &(&left * &three([a, b, d, ma, mb, mc]).expect("valid"));
            }
        }
        prop_assert_eq!(sum.scaled(&Rational::from(c + 1)), Surd::from(i64::from(c == d)));
    }

    /// Columns permuted, and two columns turned upside down: the same; Regge's symmetry too.
    #[test]
    fn six_is_symmetric(seed in seeded()) {
        let j = random_six(&mut Random::new(seed), 24);
        let [a, b, c, d, e, f] = j;
        let value = six(j).expect("valid");
        prop_assert_eq!(&six([b, a, c, e, d, f]).expect("valid"), &value);
        prop_assert_eq!(&six([c, a, b, f, d, e]).expect("valid"), &value);
        prop_assert_eq!(&six([d, e, c, a, b, f]).expect("valid"), &value);
        // Regge, Nuovo Cimento 11, 116 (1959), from memory: s = (b + c + e + f)/2
        let s = (b + c + e + f) / 2;
        prop_assert_eq!(six([a, s - b, s - c, d, s - e, s - f]).expect("valid"), value);
    }

    /// sum over x of (2x+1)(2y+1) {a b x; c d y} {a b x; c d z} = delta(y, z).
    #[test]
    fn six_is_orthogonal(seed in seeded()) {
        let random = &mut Random::new(seed);
        let [a, b, _, c, d, y] = random_six(random, 12);
        let Some(z) = common(random, [(c, b), (a, d)]) else { return Err(TestCaseError::reject("no triangle")) };
        let mut sum = Surd::zero();
        for x in ((a - b).abs().max((c - d).abs())..=(a + b).min(c + d)).step_by(2) {
            let product = &six([a, b, x, c, d, y]).expect("valid") * &six([a, b, x, c, d, z]).expect("valid");
            sum += &product.scaled(&Rational::from(i64::from(x + 1) * i64::from(y + 1)));
        }
        prop_assert_eq!(sum, Surd::from(i64::from(y == z)));
    }

    /// Rows or columns swapped: (-1)^(sum of all); transposed: the same.
    #[test]
    fn nine_is_symmetric(seed in seeded()) {
        let j = random_nine(&mut Random::new(seed), 8);
        let value = nine(j).expect("valid");
        let [a, b, c, d, e, f, g, h, i] = j;
        let other = with_sign(&value, odd(j.iter().sum()));
        prop_assert_eq!(&nine([a, d, g, b, e, h, c, f, i]).expect("valid"), &value);
        prop_assert_eq!(&nine([d, e, f, a, b, c, g, h, i]).expect("valid"), &other);
        prop_assert_eq!(&nine([b, a, c, e, d, f, h, g, i]).expect("valid"), &other);
        prop_assert_eq!(nine([g, h, i, a, b, c, d, e, f]).expect("valid"), value);
    }

    /// A 9j with a zero is a 6j (Edmonds, eq. 6.4.14).
    #[test]
    fn nine_with_a_zero_is_a_six(seed in seeded()) {
        let [a, b, c, d, e, f] = random_six(&mut Random::new(seed), 16);
        let symbol = six([a, b, c, d, e, f]).expect("valid");
        let root = Surd::sqrt_of(&Rational::from((1, i64::from(c + 1) * i64::from(f + 1)))).expect("small");
        let expected = with_sign(&(&symbol * &root), odd(b + c + e + f));
        prop_assert_eq!(nine([a, b, c, e, d, c, f, f, 0]).expect("valid"), expected);
    }

    /// sum over columns of squares with their dimensions is one.
    #[test]
    fn nine_is_orthogonal(seed in seeded()) {
        let [a, b, c, d, e, f, _, _, i] = random_nine(&mut Random::new(seed), 5);
        let mut sum = Surd::zero();
        for g in ((a - d).abs()..=a + d).step_by(2) {
            for h in ((b - e).abs()..=b + e).step_by(2) {
                let value = nine([a, b, c, d, e, f, g, h, i]).unwrap_or_default();
                sum += &(&value * &value).scaled(&Rational::from((g + 1) * (h + 1)));
            }
        }
        prop_assert_eq!(sum, Surd::from(Rational::from((1, (c + 1) * (f + 1)))));
    }

    /// Clebsch-Gordan coefficients are a rotation: the squares over J add up to one.
    #[test]
    fn clebsch_gordan_coefficients_are_complete(a in momentum(12), b in momentum(12), p in 0..13_i32, q in 0..13_i32) {
        let (ma, mb) = (a - 2 * (p % (a + 1)), b - 2 * (q % (b + 1)));
        let mut sum = Surd::zero();
        for j in ((a - b).abs().max((ma + mb).abs())..=a + b).step_by(2) {
            let value = clebsch_gordan(half(a), half(ma), half(b), half(mb), half(j), half(ma + mb)).expect("valid");
            sum += &(&value * &value);
        }
        prop_assert!(sum.is_one());
    }

    /// Nothing a person can write makes the symbols panic.
    #[test]
    fn any_arguments_are_answered(j in proptest::array::uniform9(-30..60_i32)) {
        let _ = three([j[0], j[1], j[2], j[3], j[4], j[5]]);
        let _ = six([j[0], j[1], j[2], j[3], j[4], j[5]]);
        let value = nine(j);
        prop_assert!(value.is_ok() || value.is_err_and(|error| !error.to_string().is_empty()));
    }
}

/// The sum over four 3j symbols that defines the 6j symbol, for every set of small momenta.
#[test]
fn six_is_its_sum_over_projections() {
    let top = 3;
    let mut compared = 0;
    for code in 0..4_i32.pow(6) {
        let j: [i32; 6] = std::array::from_fn(|i| code / 4_i32.pow(u32::try_from(i).expect("small")) % (top + 1));
        let Ok(value) = six(j) else { continue };
        if value.is_zero() {
            continue;
        }
        compared += 1;
        assert_eq!(value, by_projections(j), "{j:?}");
    }
    assert!(compared > 100);
}

/// Source: Edmonds, eq. 6.2.4, summed over all projections.
fn by_projections([a, b, c, d, e, f]: [i32; 6]) -> Surd {
    let range = |j: i32| (-j..=j).step_by(2);
    let mut sum = Surd::zero();
    for ma in range(a) {
        for mb in range(b) {
            for me in range(e) {
                let (mc, mf) = (-ma - mb, me - ma);
                let md = mf - mb;
                let left = &three_or_zero([a, b, c, -ma, -mb, -mc]) * &three_or_zero([a, e, f, ma, -me, mf]);
                let right = &three_or_zero([d, b, f, md, mb, -mf]) * &three_or_zero([d, e, c, -md, me, mc]);
                let exponent = a - ma + b - mb + c - mc + d - md + e - me + f - mf;
                sum += &with_sign(&(&left * &right), odd(exponent));
            }
        }
    }
    sum
}

fn three_or_zero(j: [i32; 6]) -> Surd {
    three(j).unwrap_or_default()
}

/// A half-integer written beside a whole one is refused by name.
#[test]
fn broken_rules_are_named() {
    let error = three([1, 1, 1, 1, -1, 0]).expect_err("no triangle of halves");
    assert!(matches!(error, AngularError::Sum { .. }));
    let error = three([2, 2, 2, 1, -1, 0]).expect_err("no such projection");
    assert_eq!(error.to_string(), "j = 1 does not go with m = 1/2: they differ by a whole number or not at all");
    assert_eq!(HalfInteger::from_twice(3).to_string(), "3/2");
}
