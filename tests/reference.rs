//! Values against an independent computation in Python (tests/reference/), run in the same test.

use ketwork::num::parse_decimal;
use ketwork::session::{NoFiles, Outcome, Session};
use rug::Rational;
use std::path::PathBuf;
use std::process::Command;
use std::sync::Arc;

/// The interpreter with the packages of tests/reference/requirements.txt: the one the README sets up, or `KETWORK_PYTHON`.
fn python() -> PathBuf {
    match std::env::var_os("KETWORK_PYTHON") {
        Some(path) => path.into(),
        None => PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("target/reference/bin/python"),
    }
}

fn reference(script: &str) -> Vec<(String, Vec<Rational>)> {
    let output = Command::new(python())
        .arg(PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/reference").join(script))
        .output()
        .expect("no Python with the reference packages: run the test command of the README, which sets it up");
    assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
    String::from_utf8(output.stdout)
        .expect("text")
        .lines()
        .map(|line| {
            let words: Vec<&str> = line.rsplitn(3, ' ').collect();
            let mut values = Vec::new();
            let mut rest = line.len();
            for word in words {
                let Some(value) = signed(word) else { break };
                if rest != line.len() && line[..rest].trim_end().ends_with(')') {
                    break;
                }
                values.insert(0, value);
                rest = rest.saturating_sub(word.len() + 1);
            }
            (line[..rest].trim().to_string(), values)
        })
        .collect()
}

fn signed(word: &str) -> Option<Rational> {
    match word.strip_prefix('-') {
        Some(word) => parse_decimal(word).ok().map(|value| -value),
        None => parse_decimal(word).ok(),
    }
}

/// The numbers of a record line: real part, and imaginary part where there is one.
fn record_values(record: &str) -> Vec<Rational> {
    let mut values = Vec::new();
    let mut sign = 1;
    for word in record.trim_start_matches(['~', '=', ' ']).split(' ') {
        match word {
            "-" => sign = -1,
            "+" => sign = 1,
            "i" => {}
            word => {
                let value = match word.split_once('/') {
                    Some((a, b)) => signed(a).and_then(|a| Some(a / signed(b)?)),
                    None => signed(word),
                };
                values.push(value.expect(record) * sign);
            }
        }
    }
    values
}

#[test]
fn dynamic_polarizability_of_hydrogen_and_its_zeros_to_forty_digits() {
    let expected = reference("polarizability.py");
    assert!(expected.len() >= 10, "{expected:?}");
    let mut text = String::from(
        "ketwork session 1\ndigits 40\nsystem h = hydrogenic(Z=1)\nstate g = h[1s]\nresolvent R(w) = 1/(E(g) + w - H)\n\
         define pol(w) = -<g| D_z (R(w) + R(-w)) D_z |g>\n",
    );
    let first = session_lines(&text);
    for (name, _) in &expected {
        text.push_str(name);
        text.push('\n');
    }
    let mut session = Session::open(&text, Arc::new(NoFiles)).expect("a session");
    session.evaluate(&mut |_, _| {});
    for (position, (name, values)) in expected.iter().enumerate() {
        let entry = session.entry(first + position).expect("an entry for each value");
        assert_eq!(entry.text, name);
        let Some(Outcome::Result(answer)) = entry.outcome else { panic!("{name}: {:?}", entry.outcome) };
        let got = record_values(&answer.lines[0]);
        assert_eq!(got.len(), values.len(), "{name}: {}", answer.lines[0]);
        let size = values.iter().map(|v| Rational::from(v.abs_ref())).max().expect("a value");
        for (a, b) in got.iter().zip(values) {
            let distance = Rational::from(a - b).abs();
            let allowed = parse_decimal("1e-39").expect("a decimal") * &size;
            assert!(distance <= allowed, "{name}: {} and {}", answer.lines[0], b.to_f64());
        }
    }
}

/// The number of the entry that follows the text so far: one line an entry behind the header.
fn session_lines(text: &str) -> usize {
    text.lines().count()
}
