//! What `vary` derives is what finite differences of the expression find when H is changed.

use crate::random::*;
use rug::Rational;

/// Step of the differences: their error goes with its sixth power.
const STEP: (i64, i64) = (1, 10_000_000);

/// A random scalar built of the state g, its energy, the operator W, full and reduced resolvents, and a ket.
fn expression(random: &mut Random) -> String {
    let resolvent = |random: &mut Random| ["Q", "R(1/3)", "R(-2/7)", "N"][random.below(4) as usize];
    let chain = |random: &mut Random| {
        let mut text = "W".to_string();
        for _ in 0..random.below(3) {
            text += &format!(" {} W", resolvent(random));
        }
        text
    };
    match random.below(6) {
        0 => "E(g)".into(),
        1 => format!("<g| {} |g>", chain(random)),
        2 => format!("<u| {} |u>", chain(random)),
        3 => format!("<g| {} |g> (E(g) - <g| W |g>)", chain(random)),
        4 => format!("<g| {} |g>/(E(g) - 40)", chain(random)),
        _ => format!("<u| {} |g>", chain(random)),
    }
}

fn value(h: &Rows, w: &Rows, expression: &str) -> Rational {
    let text = format!(
        "ketwork session 1\ndigits 60\nsystem m = matrix(H = {}, W = {})\nstate g = m[0]\nmanifold P = m[0]\nresolvent Q = 1/(E(g) - H)'\n\
         resolvent R(w) = 1/(E(g) + w - H)\nresolvent N = 1/(E(g) + 1/5 - H) without P\nket u = Q W |g>\n{expression}\n",
        written(h),
        written(w)
    );
    let record = last_record(&text);
    number(&record).unwrap_or_else(|| panic!("{record} of\n{text}"))
}

fn moved(h: &Rows, v: &Rows, steps: i64) -> Rows {
    let step = Rational::from((STEP.0 * steps, STEP.1));
    h.iter()
        .zip(v)
        .map(|(row, change)| row.iter().zip(change).map(|(a, b)| Rational::from(b * &step) + a).collect())
        .collect()
}

/// Central differences of seven points.
fn differences(f: &[Rational; 7], order: u32) -> Rational {
    let step = Rational::from(STEP);
    let pair = |k: usize, sign: i32| -> Rational {
        let other = Rational::from(&f[3 - k] * sign);
        other + &f[3 + k]
    };
    if order == 1 {
        (pair(1, -1) * 45 - pair(2, -1) * 9 + pair(3, -1)) / (step * 60)
    } else {
        let sum = pair(3, 1) * 2 - pair(2, 1) * 27 + pair(1, 1) * 270 - Rational::from(&f[3] * 490);
        sum / (Rational::from(&step * &step) * 360)
    }
}

#[test]
fn changes_are_those_of_finite_differences() {
    let mut compared = 0;
    for seed in 0..cases(24) {
        let random = &mut Random::new(700_000 + u64::from(seed));
        // the ground level stands alone, others may be degenerate
        let levels: Vec<Rational> = [-30, random.between(-3, 3), random.between(-3, 3), 4].map(Rational::from).to_vec();
        let (h, v, w) = (with_spectrum(random, &levels), symmetric(random, 4), symmetric(random, 4));
        let expression = expression(random);
        let f = [-3, -2, -1, 0, 1, 2, 3].map(|steps| value(&moved(&h, &v, steps), &w, &expression));
        for order in [1, 2] {
            let text = format!(
                "ketwork session 1\ndigits 40\nsystem m = matrix(H = {}, W = {}, V = {})\nstate g = m[0]\nmanifold P = m[0]\n\
                 resolvent Q = 1/(E(g) - H)'\nresolvent R(w) = 1/(E(g) + w - H)\nresolvent N = 1/(E(g) + 1/5 - H) without P\nket u = Q W |g>\n\
                 vary({expression}, V, {order})\n",
                written(&h),
                written(&w),
                written(&v)
            );
            let record = last_record(&text);
            let Some(derived) = number(&record) else { panic!("seed {seed}: {record} from\n{text}") };
            let measured = differences(&f, order);
            if derived == 0 {
                assert!(measured.abs() < Rational::from((1, 10_i64.pow(15))), "seed {seed}: {record} from\n{text}");
                continue;
            }
            let digits = agreement(&derived, &measured);
            assert!(digits > 25.0, "seed {seed}: {digits} digits of {expression} in order {order}, {record}\n{text}");
            compared += 1;
        }
    }
    assert!(compared > 30, "{compared} values were compared");
}
