//! No printed digit may differ from the same value computed at three times the precision.

use crate::random::*;
use ketwork::session::Outcome;

/// A chain whose value nearly cancels, in one of several ways.
fn cancelling(random: &mut Random) -> String {
    let w = random.between(1, 99);
    let tiny = random.between(1, 35);
    let chains = [
        "<g|V R V|g> - <g|V S V|g>".to_string(),
        format!("<g|V R W R V|g> + 10^-{tiny} <g|W|g>"),
        format!("(<g|V R V|g> + 10^{tiny}) - 10^{tiny}"),
        format!(
            "<g|(V - <g|V|g>) R (V - <g|V|g>)|g> - <g|V R V|g> + 2 <g|V|g> <g|R V|g> - <g|V|g>^2 <g|R|g> + 10^-{tiny}"
        ),
        format!("<g|V Q V|g> - <g|V 1/(E(g) + {w}/10^{tiny} - H)' V|g>"),
        format!("exp(<g|V R V|g>/10^{tiny}) - 1"),
        format!("sqrt(1 + <g|V|m[1]>^2/10^{tiny}) - 1"),
    ];
    let pick = random.below(chains.len() as u64) as usize;
    chains[pick].clone()
}

/// Rounds a printed decimal away from its last digit: what must not change are the digits before it, and the last one by at most one.
fn agrees_to_every_digit(short: &str, long: &str) -> bool {
    let (Some(a), Some(b)) = (number(short), number(long)) else { return short == long };
    let text = short.trim_start_matches(['~', ' ']);
    let (mantissa, exponent) = text.split_once('e').unwrap_or((text, "0"));
    let decimals = mantissa.split_once('.').map_or(0, |(_, fraction)| fraction.len() as i64);
    let place = exponent.parse::<i64>().unwrap_or(0) - decimals;
    let unit = ketwork::num::parse_decimal(&format!("1e{place}")).unwrap_or_default();
    // A correctly rounded value lies within half a unit; the longer one is itself rounded.
    (a - b).abs() <= unit * rug::Rational::from((5001, 10000))
}

#[test]
fn no_printed_digit_changes_at_three_times_the_precision() {
    for seed in 0..cases(150) {
        let random = &mut Random::new(77_000 + u64::from(seed));
        let n = 2 + random.below(4) as usize;
        let (h, v, w) = (symmetric(random, n), symmetric(random, n), symmetric(random, n));
        let digits = random.between(3, 30) as u32;
        let (shift, close) = (random.between(1, 40), random.between(1, 40));
        let chain = cancelling(random);
        let text = |digits: u32| {
            format!(
                "ketwork session 1\ndigits {digits}\nsystem m = matrix(H = {}, V = {}, W = {})\nstate g = m[0]\n\
                 resolvent Q = 1/(E(g) - H)'\nresolvent R = 1/(E(g) - {shift}/7 - H)\n\
                 resolvent S = 1/(E(g) - {shift}/7 - 1/10^{close} - H)\n{chain}\n",
                written(&h),
                written(&v),
                written(&w)
            )
        };
        let (short, long) = (last_outcome(&text(digits)), last_outcome(&text(3 * digits)));
        match (&short, &long) {
            (Outcome::Result(a), Outcome::Result(b)) => {
                let (a, b) = (&a.lines[0], &b.lines[0]);
                let honest = match (a.starts_with('='), a.contains("not proved")) {
                    (true, _) => a == b,
                    (_, true) => true,
                    _ => agrees_to_every_digit(a, b),
                };
                assert!(
                    honest,
                    "seed {seed}: {a} at {digits} digits and {b} at three times as many, from\n{}",
                    text(digits)
                );
            }
            // A degenerate ground level may refuse a chain; then it does so at every precision.
            (Outcome::Failed(a), Outcome::Failed(b)) => {
                assert_eq!(a[0].diagnostic.message, b[0].diagnostic.message, "seed {seed}");
            }
            _ => panic!("seed {seed}: {short:?} and {long:?} from\n{}", text(digits)),
        }
    }
}
