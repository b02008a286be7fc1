//! Chains on matrices against explicit spectral sums and against finite differences of the diagonalised H + lambda V.

use crate::random::*;
use rug::{Integer, Rational};
use std::fmt::Write;

/// Second-, third- and fourth-order energies through reduced resolvents (Rayleigh-Schroedinger; derived in grammar/ under `resolvent`).
const ORDERS: [&str; 3] = [
    "<g|V Q V|g>",
    "<g|V Q V Q V|g> - <g|V|g> <g|V Q Q V|g>",
    "<g|V Q V Q V Q V|g> - <g|V Q V|g> <g|V Q^2 V|g> - 2 <g|V|g> <g|V Q V Q^2 V|g> + <g|V|g>^2 <g|V Q^3 V|g>",
];

fn levels(random: &mut Random, n: usize) -> Vec<Rational> {
    // The ground level is single; the others may coincide.
    let mut levels = vec![Rational::from(-20)];
    levels.extend((1..n).map(|_| Rational::from((random.between(-15, 15), random.between(1, 2)))));
    levels
}

#[test]
fn chains_equal_spectral_sums() {
    for seed in 0..cases(40) {
        let random = &mut Random::new(u64::from(seed));
        let n = 2 + random.below(4) as usize;
        let known = random.below(2) == 0;
        let h = if known {
            let list = levels(random, n);
            with_spectrum(random, &list)
        } else {
            // Entries are at most 12 and there are at most five rows, so that the ground level is single.
            let mut rows = symmetric(random, n);
            rows[0][0] -= 100;
            rows
        };
        let v = symmetric(random, n);
        let base = session(&h, &v, 40);
        // The ground level is single, so the sum runs over all other states.
        let text = format!(
            "{base}resolvent Q = 1/(E(g) - H)'\n\
             compare <g|V Q V|g> with sum(n in 1 .. {last}, <g|V|m[{{n}}]> <m[{{n}}]|V|g> / (E(g) - E(m[{{n}}])))\n",
            last = n - 1
        );
        let record = last_record(&text);
        assert!(agrees(&record), "seed {seed}: {record} from\n{text}");
        let z = Rational::from((random.between(1, 9), 100));
        let text = format!(
            "{base}resolvent R = 1/(E(g) - 1000 - {z} - H)\n\
             compare <g|V R V R|g> with sum(n in 0 .. {last}, sum(k in 0 .. 0, <g|V|m[{{n}}]> <m[{{n}}]|V|m[{{k}}]> \
             / ((E(g) - 1000 - {z} - E(m[{{n}}])) (E(g) - 1000 - {z} - E(m[{{k}}])))))\n",
            last = n - 1
        );
        let record = last_record(&text);
        assert!(agrees(&record), "seed {seed}: {record} from\n{text}");
    }
}

/// E(lambda) of the lowest level by diagonalising, to `digits` digits.
fn energy(h: &Rows, v: &Rows, lambda: &Rational, digits: u32) -> Rational {
    let sum: Rows =
        h.iter().zip(v).map(|(a, b)| a.iter().zip(b).map(|(x, y)| x + Rational::from(y * lambda)).collect()).collect();
    let mut text = session(&sum, v, digits);
    text.push_str("E(g)\n");
    let record = last_record(&text);
    number(&record).unwrap_or_else(|| panic!("{record} from\n{text}"))
}

#[test]
fn chains_equal_finite_differences() {
    for seed in 0..cases(12) {
        let random = &mut Random::new(1000 + u64::from(seed));
        let n = 2 + random.below(4) as usize;
        let list = levels(random, n);
        let h = with_spectrum(random, &list);
        let v = symmetric(random, n);
        // Five-point stencils for derivatives of order 2, 3, 4; the step leaves an error of relative order h^2.
        let step = Rational::from((1, Integer::from(Integer::u_pow_u(10, 20))));
        let at: Vec<Rational> = (-2..=2).map(|k| energy(&h, &v, &Rational::from(&step * k), 150)).collect();
        let stencils: [([i64; 5], i64, u32); 3] =
            [([0, 1, -2, 1, 0], 2, 2), ([-1, 2, 0, -2, 1], 12, 3), ([1, -4, 6, -4, 1], 24, 4)];
        for (chain, (weights, divisor, order)) in ORDERS.iter().zip(stencils) {
            let mut difference = Rational::new();
            for (weight, value) in weights.iter().zip(&at) {
                difference += Rational::from(value * *weight);
            }
            for _ in 0..order {
                difference /= &step;
            }
            difference /= divisor;
            let mut text = session(&h, &v, 40);
            let _ = write!(text, "resolvent Q = 1/(E(g) - H)'\n{chain}\n");
            let record = last_record(&text);
            let value = number(&record).unwrap_or_else(|| panic!("{record} from\n{text}"));
            assert!(
                agreement(&value, &difference) > 25.0
                    || Rational::from(&value - &difference).abs() < Rational::from((1, 10u64.pow(18))) && value == 0,
                "seed {seed}, order {order}: {record} and {} from\n{text}",
                difference.to_f64()
            );
        }
    }
}
