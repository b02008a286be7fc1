//! Random systems and the sessions around them.

use ketwork::num::parse_decimal;
use ketwork::session::{NoFiles, Outcome, Session};
use rug::Rational;
use std::fmt::Write;
use std::sync::Arc;

/// Number of cases: the default, or what `KETWORK_CASES` says.
pub fn cases(default: u32) -> u32 {
    std::env::var("KETWORK_CASES").ok().and_then(|text| text.parse().ok()).unwrap_or(default)
}

/// A small deterministic generator (splitmix64, Steele, Lea & Flood, OOPSLA 2014): the seed printed on failure brings the case back.
pub struct Random(u64);

impl Random {
    pub fn new(seed: u64) -> Self {
        Random(seed.wrapping_mul(0x9E37_79B9_7F4A_7C15).wrapping_add(0x1234_5678_9ABC_DEF1))
    }

    pub fn next(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        z ^ (z >> 31)
    }

    pub fn below(&mut self, n: u64) -> u64 {
        self.next() % n
    }

    pub fn between(&mut self, low: i64, high: i64) -> i64 {
        low + (self.below((high - low + 1) as u64) as i64)
    }

    pub fn rational(&mut self) -> Rational {
        Rational::from((self.between(-12, 12), self.between(1, 7)))
    }
}

pub type Rows = Vec<Vec<Rational>>;

/// A random symmetric matrix of small rationals.
pub fn symmetric(random: &mut Random, n: usize) -> Rows {
    let mut rows = vec![vec![Rational::new(); n]; n];
    for i in 0..n {
        for j in 0..=i {
            let value = if random.below(5) == 0 { Rational::new() } else { random.rational() };
            rows[i][j] = value.clone();
            rows[j][i] = value;
        }
    }
    rows
}

/// The matrix U diag(levels) U^T with a random rational orthogonal U (Cayley transform (1 - A)(1 + A)^-1 of an antisymmetric A, one plane at a
/// time), so that its spectrum is known exactly, degeneracies included.
pub fn with_spectrum(random: &mut Random, levels: &[Rational]) -> Rows {
    let n = levels.len();
    let mut rows = vec![vec![Rational::new(); n]; n];
    for (k, level) in levels.iter().enumerate() {
        rows[k][k] = level.clone();
    }
    for p in 0..n {
        for q in 0..p {
            // A rotation by a rational point of the circle: ((1 - t^2)/(1 + t^2), 2 t/(1 + t^2)).
            let t = Rational::from((random.between(-3, 3), random.between(1, 3)));
            let square = Rational::from(t.square_ref());
            let norm = Rational::from(&square + 1u32);
            let c = (1 - square) / &norm;
            let s = Rational::from(&t * 2u32) / &norm;
            rotate(&mut rows, p, q, &c, &s);
        }
    }
    rows
}

fn rotate(rows: &mut Rows, p: usize, q: usize, c: &Rational, s: &Rational) {
    let n = rows.len();
    for k in 0..n {
        let (a, b) = (rows[k][p].clone(), rows[k][q].clone());
        rows[k][p] = Rational::from(&a * c) - Rational::from(&b * s);
        rows[k][q] = Rational::from(&a * s) + Rational::from(&b * c);
    }
    for k in 0..n {
        let (a, b) = (rows[p][k].clone(), rows[q][k].clone());
        rows[p][k] = Rational::from(&a * c) - Rational::from(&b * s);
        rows[q][k] = Rational::from(&a * s) + Rational::from(&b * c);
    }
}

/// The rows as the session language writes them.
pub fn written(rows: &Rows) -> String {
    let lines: Vec<String> = rows
        .iter()
        .map(|row| format!("[{}]", row.iter().map(Rational::to_string).collect::<Vec<_>>().join(", ")))
        .collect();
    format!("[{}]", lines.join(", "))
}

/// Evaluates a session and gives the first record line of its last entry.
pub fn last_record(text: &str) -> String {
    let outcome = last_outcome(text);
    match outcome {
        Outcome::Result(answer) => answer.lines.first().cloned().unwrap_or_default(),
        other => panic!("no value but {other:?} from\n{text}"),
    }
}

/// Evaluates a session and gives the outcome of its last entry.
pub fn last_outcome(text: &str) -> Outcome {
    let mut session = Session::open(text, Arc::new(NoFiles)).unwrap_or_else(|faults| panic!("{faults:?} in\n{text}"));
    session.evaluate(&mut |_, _| {});
    for number in 1..session.len() {
        if let Some(Outcome::Failed(reports)) = session.entry(number).and_then(|entry| entry.outcome) {
            panic!("entry {number} fails with {reports:?} in\n{text}");
        }
    }
    session
        .entry(session.len())
        .and_then(|entry| entry.outcome.cloned())
        .unwrap_or_else(|| panic!("nothing in\n{text}"))
}

/// The number of a record line, exact or approximate; `None` for what is not one real rational or decimal.
pub fn number(record: &str) -> Option<Rational> {
    let text = record.trim_start_matches(['=', '~', ' ']);
    let text = text.split(" exactly:").next().unwrap_or(text);
    if record.starts_with("= 0 exactly") {
        return Some(Rational::new());
    }
    if let Ok(value) = parse_decimal(text.trim_start_matches('-')) {
        return Some(if text.starts_with('-') { -value } else { value });
    }
    text.parse().ok()
}

/// Whether the record of a `compare` says that both sides agree; two zeros that are not proved agree.
pub fn agrees(record: &str) -> bool {
    record.contains("equal") || record.contains("both 0 below")
}

/// A session that starts with the system `m` (H and V), its ground state g, and a number of digits.
pub fn session(h: &Rows, v: &Rows, digits: u32) -> String {
    let mut text = String::from("ketwork session 1\n");
    let _ = writeln!(text, "digits {digits}");
    let _ = writeln!(text, "system m = matrix(H = {}, V = {})", written(h), written(v));
    let _ = writeln!(text, "state g = m[0]");
    text
}

/// Digits in which two numbers agree.
pub fn agreement(a: &Rational, b: &Rational) -> f64 {
    let difference = Rational::from(a - b).abs();
    let size = Rational::from(a.abs_ref()).max(Rational::from(b.abs_ref()));
    if difference == 0 {
        return f64::INFINITY;
    }
    if size == 0 {
        return 0.0;
    }
    -rug::Float::with_val(64, difference / size).log10().to_f64()
}
