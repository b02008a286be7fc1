//! Values against independent computations in Python (tests/reference/), run in the same test.

use ketwork::num::{parse_decimal, parse_uncertain};
use ketwork::session::{NoFiles, Outcome, Session};
use rug::Rational;
use std::path::{Path, PathBuf};
use std::process::Command;
use std::sync::Arc;

/// Digits asked of the program; the references give 60.
const DIGITS: u32 = 40;

/// What the expressions of tests/reference/polarizability.py mean.
const POLARIZABILITIES: &str = "\
system h = hydrogenic(Z=1)
state g = h[1s]
state s = h[2s]
state p = h[2p, m=0]
state q = h[2p, m=1]
resolvent R1(w) = 1/(E(g) + w - H)
resolvent R2(w) = 1/(E(s) + w - H)
operator F = r^2 C(2)_0
define dipole_1s(w) = -<g| D_z (R1(w) + R1(-w)) D_z |g>
define quadrupole_1s(w) = -<g| F (R1(w) + R1(-w)) F |g>
define dipole_2s(w) = -<s| D_z (R2(w) + R2(-w)) D_z |s>
define dipole_2p(w) = -(<p| D_z (R2(w) + R2(-w)) D_z |p> + 2 <q| D_z (R2(w) + R2(-w)) D_z |q>)/3
";

/// The lines that a script of tests/reference/ prints, by the Python that the README's test command sets up, or that of `KETWORK_PYTHON`.
fn reference(script: &str) -> Vec<String> {
    let root = Path::new(env!("CARGO_MANIFEST_DIR"));
    let python =
        std::env::var_os("KETWORK_PYTHON").map_or_else(|| root.join("target/reference/bin/python"), PathBuf::from);
    let output = Command::new(python)
        .arg(root.join("tests/reference").join(script))
        .output()
        .expect("no Python with the reference packages: the test command of the README sets it up");
    assert!(output.status.success(), "{script}: {}", String::from_utf8_lossy(&output.stderr));
    String::from_utf8(output.stdout).expect("text").lines().map(str::to_string).collect()
}

/// The session that holds `preamble` and then one entry a line, evaluated; with it the number of the first of those entries.
fn evaluated(preamble: &str, entries: &[String]) -> (Session, usize) {
    let text = format!("ketwork session 1\ndigits {DIGITS}\n{preamble}{}\n", entries.join("\n"));
    let mut session = Session::open(&text, Arc::new(NoFiles)).expect("a session");
    session.evaluate(&mut |_, _| {});
    let first = session.len() - entries.len() + 1;
    (session, first)
}

/// A decimal, with or without sign.
fn decimal(text: &str) -> Rational {
    match text.strip_prefix('-') {
        Some(rest) => -parse_decimal(rest).expect(text),
        None => parse_decimal(text).expect(text),
    }
}

/// Real and imaginary part of an approximate record, `~ a` or `~ a + b i`.
fn parts(record: &str) -> Vec<Rational> {
    let words: Vec<&str> = record.strip_prefix("~ ").expect(record).split(' ').collect();
    match words[..] {
        [real] => vec![decimal(real)],
        [real, "+", imaginary, "i"] => vec![decimal(real), decimal(imaginary)],
        [real, "-", imaginary, "i"] => vec![decimal(real), -decimal(imaginary)],
        _ => panic!("{record}"),
    }
}

#[test]
fn dynamic_polarizabilities_and_zeros_to_every_digit_claimed() {
    let lines = reference("polarizability.py");
    assert!(lines.len() >= 15, "{lines:?}");
    let expressions: Vec<String> =
        lines.iter().map(|line| line.split('\t').next().expect("an expression").to_string()).collect();
    let (session, first) = evaluated(POLARIZABILITIES, &expressions);
    for (position, line) in lines.iter().enumerate() {
        let entry = session.entry(first + position).expect("an entry for each value");
        let Some(Outcome::Result(answer)) = entry.outcome else { panic!("{line}: {:?}", entry.outcome) };
        let got = parts(&answer.lines[0]);
        let wanted: Vec<Rational> = line.split('\t').skip(1).map(decimal).collect();
        assert_eq!(got.len(), wanted.len(), "{line}: {}", answer.lines[0]);
        // One unit in the last of 40 digits, of the larger part.
        let size = wanted.iter().map(|part| part.clone().abs()).max().expect("a value");
        let allowed = size * decimal("1e-39");
        for (a, b) in got.iter().zip(&wanted) {
            assert!(Rational::from(a - b).abs() <= allowed, "{line}: {}", answer.lines[0]);
        }
    }
}

#[test]
fn series_recorded_in_sessions_come_out_without_a_basis() {
    let lines = reference("series.py");
    let compared: usize = lines[0].parse().expect("the number of records compared");
    assert!(compared >= 40, "{compared} records");
}

/// Every constant and what follows from it, value and standard uncertainty, in both sets.
///
/// A table rounds its uncertainties to two digits and what is exact to about ten; its adjustment knows small correlations between constants,
/// which the program leaves out.
#[test]
fn constants_and_units_as_in_the_tables() {
    let lines = reference("constants.py");
    let rows: Vec<[&str; 4]> =
        lines.iter().map(|line| line.split('\t').collect::<Vec<_>>().try_into().expect(line)).collect();
    assert!(rows.len() >= 2 * 60, "{} rows", rows.len());
    for set in ["CODATA-2018", "CODATA-2022"] {
        let rows: Vec<&[&str; 4]> = rows.iter().filter(|row| row[0] == set).collect();
        let expressions: Vec<String> = rows.iter().map(|row| row[1].to_string()).collect();
        let (session, first) = evaluated(&format!("constants {set}\n"), &expressions);
        for (position, row) in rows.iter().enumerate() {
            let [_, expression, value, sigma] = **row;
            let entry = session.entry(first + position).expect("an entry for each value");
            let Some(Outcome::Result(answer)) = entry.outcome else { panic!("{expression}: {:?}", entry.outcome) };
            let told = format!("{set} {expression}: {}, and the table has {value} +- {sigma}", answer.lines[0]);
            let number = answer.value.as_deref().expect(&told);
            let (value, sigma) = (decimal(value), decimal(sigma));
            if sigma == 0 {
                let got = fraction(number);
                let distance = Rational::from(&got - &value).abs();
                assert!(distance <= value.abs() * decimal("2e-9"), "{told}");
                continue;
            }
            let (sign, number) = number.strip_prefix('-').map_or((1, number), |number| (-1, number));
            let got = parse_uncertain(number).expect(&told);
            let distance: Rational = got.value * Rational::from(sign) - &value;
            let distance = distance.abs();
            assert!(distance <= Rational::from(&sigma * &decimal("0.55")), "{told}");
            let spread = Rational::from(&got.uncertainty - &sigma).abs();
            assert!(spread <= sigma * decimal("0.11"), "{told}");
        }
    }
}

/// A decimal or a fraction.
fn fraction(text: &str) -> Rational {
    match text.split_once('/') {
        Some((above, below)) => decimal(above) / decimal(below),
        None => decimal(text),
    }
}
