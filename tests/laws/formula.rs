//! What `formula` prints reads back and has the value of what it was asked of.

use crate::random::*;
use ketwork::session::Outcome;

/// A random operator expression over the names of the session.
fn operator(random: &mut Random, depth: u32) -> String {
    match random.below(if depth == 0 { 4 } else { 9 }) {
        0 => "V".into(),
        1 => "W".into(),
        2 => "Q".into(),
        3 => "R(1/3)".into(),
        4 => format!("({} + {})", operator(random, depth - 1), operator(random, depth - 1)),
        5 => format!("({} - {})", operator(random, depth - 1), scalar(random, depth - 1)),
        6 => format!("{} {}", operator(random, depth - 1), operator(random, depth - 1)),
        7 => format!("({}/{}) {}", random.between(1, 5), random.between(1, 5), operator(random, depth - 1)),
        _ => format!("({})^{}", operator(random, depth - 1), random.between(1, 3)),
    }
}

fn scalar(random: &mut Random, depth: u32) -> String {
    match random.below(if depth == 0 { 4 } else { 8 }) {
        0 => "<g|V|g>".into(),
        1 => "a".into(),
        2 => format!("({})", random.between(1, 9)),
        3 => "E(g)".into(),
        4 => format!("<g|{}|g>", operator(random, depth - 1)),
        5 => format!("<u|{}|g>", operator(random, depth - 1)),
        6 => format!("({} - {})", scalar(random, depth - 1), scalar(random, depth - 1)),
        _ => format!("f({}) {}", scalar(random, depth - 1), scalar(random, depth - 1)),
    }
}

#[test]
fn expansions_keep_the_value() {
    for seed in 0..cases(60) {
        let random = &mut Random::new(300_000 + u64::from(seed));
        let levels: Vec<rug::Rational> =
            [-20, random.between(-3, 3), random.between(-3, 3)].map(rug::Rational::from).to_vec();
        let (h, v) = (with_spectrum(random, &levels), symmetric(random, 3));
        let w = symmetric(random, 3);
        let expression = scalar(random, 3);
        let base = format!(
            "ketwork session 1\ndigits 25\nsystem m = matrix(H = {}, V = {}, W = {})\nstate g = m[0]\ndefine a = 3/7\n\
             resolvent Q = 1/(E(g) - H)'\nresolvent R(w) = 1/(E(g) - w - H)\nket u = (Q V - 2 R(a)) W |g>\ndefine f(x) = (x - a)^2 + <g|Q|u>\n",
            written(&h),
            written(&v),
            written(&w)
        );
        let answer = match last_outcome(&format!("{base}formula {expression}\n")) {
            Outcome::Result(answer) => answer,
            // Too long to be written out is an answer too; evaluation does not multiply out.
            Outcome::Failed(reports) if reports[0].diagnostic.message.contains("more than 10000 terms") => continue,
            other => panic!("seed {seed}: {other:?} of {expression} in\n{base}"),
        };
        let formula = answer.value.unwrap_or_default();
        let record = last_record(&format!("{base}compare {expression} with {formula}\n"));
        assert!(agrees(&record), "seed {seed}: {record}\n{expression}\n{formula}\nin\n{base}");
    }
}
