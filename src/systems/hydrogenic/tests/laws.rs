//! Operator identities and the two backends against each other, on random chains.

use super::super::Hydrogenic;
use super::chain::*;
use crate::num::{Effort, Surd};
use crate::systems::{Backend, Level, Number, Obstacle, Omitted, Resolvent, State, System};
use proptest::prelude::*;
use rug::{Complex, Float, Rational};
use std::sync::Arc;

const BITS: u32 = 300;

fn cases() -> ProptestConfig {
    let scale: u32 = std::env::var("KETWORK_CASES").ok().and_then(|n| n.parse().ok()).unwrap_or(64);
    ProptestConfig {
        cases: scale,
        rng_seed: proptest::test_runner::RngSeed::Fixed(0x6b65_7477),
        failure_persistence: None,
        ..ProptestConfig::default()
    }
}

fn any_atom() -> impl Strategy<Value = Hydrogenic> {
    ((1_i64..5, 1_i64..4), prop::option::of(1_i64..50))
        .prop_map(|((n, d), mass)| Hydrogenic::new(rational(n, d), mass.map(Rational::from)).expect("an atom"))
}

fn any_state(largest: u32) -> impl Strategy<Value = State> {
    (1..=largest)
        .prop_flat_map(|n| (Just(n), 0..n))
        .prop_flat_map(|(n, l)| {
            let reach = i32::try_from(l).expect("small");
            (Just(n), Just(l), -reach..=reach)
        })
        .prop_map(|(n, l, m)| super::super::numbers::Numbers::orbital(n, l, m).state())
}

fn any_operator() -> impl Strategy<Value = &'static str> {
    prop::sample::select(vec![
        "D_z", "D_x", "D_y", "D_+1", "D_-1", "P_z", "P_x", "P_-1", "r", "r^2", "r^3", "r^-1", "r^-2", "r^-3", "p^2",
        "p^4", "H", "L_z", "L_+1", "L^2", "C(1)_0", "C(2)_0", "C(2)_-1", "delta(r)", "r^0",
    ])
}

fn numeric(atom: &Hydrogenic, basis: usize, anchor: &State) -> Arc<dyn Backend> {
    atom.numeric(Level { bits: BITS, basis }, anchor, &Effort::new()).expect("a backend")
}

fn energy(atom: &Hydrogenic, state: &State) -> Number {
    atom.energy(state, BITS, &Effort::new()).expect("an energy")
}

/// The reduced resolvent with an energy that is not exact: the numeric backend cannot take exact shortcuts.
fn rounded(step: &Step) -> Step {
    match step {
        Step::Resolvent(Resolvent { z, omitted }) => {
            Step::Resolvent(Resolvent { z: Number::Approx(z.to_complex(BITS + 32)), omitted: omitted.clone() })
        }
        Step::Operator(_) => step.clone(),
    }
}

fn close(a: &Complex, b: &Complex, bits: u32) -> bool {
    let size = Float::with_val(BITS, a.abs_ref()).max(&Float::with_val(BITS, 1));
    Float::with_val(BITS, Complex::with_val(BITS, a - b).abs_ref()) <= size >> bits
}

fn size(number: &Number) -> Complex {
    number.to_complex(BITS)
}

proptest! {
    #![proptest_config(cases())]

    /// Whatever has an exact value has the same numerically, however the chain is cut; what diverges, diverges in both.
    #[test]
    fn backends_agree(
        atom in any_atom(),
        bra in any_state(4),
        ket in any_state(4),
        names in prop::collection::vec(any_operator(), 1..4),
        solves in prop::collection::vec(0..3_usize, 3),
    ) {
        let q = reduced(&atom, &ket);
        let mut steps = Vec::new();
        for (name, &count) in names.iter().zip(&solves) {
            steps.extend(std::iter::repeat_n(q.clone(), count.min(1)));
            steps.push(Step::Operator(operator(name)));
        }
        let approximate: Vec<Step> = steps.iter().map(rounded).collect();
        let exact = atom.exact(&Effort::new()).expect("exact backend");
        // states of another exponential than the anchor's are not in the basis
        let basis = if bra.numbers[0] == ket.numbers[0] { 24 } else { 320 };
        let numeric = numeric(&atom, basis, &ket);
        for middle in 0..steps.len() {
            let here = split(&atom, &*exact, &bra, &steps, middle, &ket);
            let there = split(&atom, &*numeric, &bra, &approximate, middle, &ket);
            match (&here, &there) {
                (Ok(a), Ok(b)) if close(&size(a), &size(b), 150) => {}
                (Ok(a), Ok(b)) => {
                    // a solution that starts with a lower power than the basis is approached slowly
                    let more = self::numeric(&atom, 4 * basis, &ket);
                    let c = split(&atom, &*more, &bra, &approximate, middle, &ket).expect("a value");
                    let error = |x: &Number| Complex::with_val(BITS, size(x) - size(a)).abs().into_real_imag().0;
                    let shown = format!("{names:?} {solves:?} {middle}: {a:?} {b:?} {c:?}");
                    prop_assert!(error(&c) < error(b) / 2 && error(b) < 0.1, "{shown}");
                }
                (Err(Obstacle::Diverges { .. }), _) => {
                    prop_assert!(matches!(there, Err(Obstacle::Diverges { .. } | Obstacle::Undecided)), "{here:?} {there:?}");
                }
                // H on what a resolvent made: whether its leading terms cancel is not known numerically
                (Ok(_), Err(Obstacle::Undecided)) if names.contains(&"H") => {}
                (Ok(_), Err(obstacle)) => prop_assert!(false, "{names:?} {solves:?} {middle}: {obstacle}"),
                (Err(_), _) => {}
            }
        }
    }

    /// (s+1)/n^2 <r^s> - (2s+1) <r^(s-1)> + (s/4) ((2l+1)^2 - s^2) <r^(s-2)> = 0 (Kramers).
    #[test]
    fn hypervirial_relation(state in any_state(7), s in -6_i64..7) {
        let atom = hydrogen();
        let exact = atom.exact(&Effort::new()).expect("exact backend");
        let [n, l, _] = state.numbers[..] else { panic!("three numbers") };
        // below, the means do not exist
        let s = if s - 2 > -2 * l - 3 { s } else { -s };
        let mean = |power: i64| match value(&atom, &*exact, &state, &operators(&format!("r^{power}")), &state) {
            Ok(Number::Exact(value)) => value.as_rational().expect("rational").into_owned(),
            other => panic!("{power}: {other:?}"),
        };
        let sum = mean(s) * rational(s + 1, n * n) - mean(s - 1) * (2 * s + 1)
            + mean(s - 2) * rational(s * ((2 * l + 1) * (2 * l + 1) - s * s), 4);
        prop_assert_eq!(sum, 0);
    }

    /// [D_i, H] = i P_i/mu and [D_i, P_j] = i delta_ij between states.
    #[test]
    fn commutators(atom in any_atom(), bra in any_state(5), ket in any_state(5), axes in (0..3_usize, 0..3_usize)) {
        let exact = atom.exact(&Effort::new()).expect("exact backend");
        let element = |text: &str| match value(&atom, &*exact, &bra, &operators(text), &ket) {
            Ok(Number::Exact(value)) => value,
            other => panic!("{text}: {other:?}"),
        };
        let names = ["x", "y", "z"];
        let (i, j) = (names[axes.0], names[axes.1]);
        let left = &element(&format!("D_{i} H")) - &element(&format!("H D_{i}"));
        let mass = atom.mass().map_or(Rational::from(1), |m| (Rational::from(m + 1)) / m);
        prop_assert_eq!(left, (&element(&format!("P_{i}")) * &Surd::i()).scaled(&mass));
        let left = &element(&format!("D_{i} P_{j}")) - &element(&format!("P_{j} D_{i}"));
        let right = if i == j { &element("r^0") * &Surd::i() } else { Surd::zero() };
        prop_assert_eq!(left, right);
    }

    /// G(a) - G(b) = (b - a) G(a) G(b), and G(z) (z - H) = 1, for complex energies.
    #[test]
    fn resolvent_identities(
        atom in any_atom(),
        state in any_state(3),
        source in prop::sample::select(vec!["D_z", "D_x", "P_z", "r", "r^-1", "p^2"]),
        first in (-30_i64..30, 5_i64..40),
        second in (-30_i64..30, 5_i64..40),
    ) {
        let unit = energy(&atom, &state).to_complex(BITS);
        let near = |(re, im): (i64, i64)| {
            let factor = Complex::with_val(BITS, (Rational::from((30 + re, 30)), Rational::from((im, 20))));
            Number::Approx(factor * &unit)
        };
        let (a, b) = (near(first), near(second));
        let backend = numeric(&atom, 150, &state);
        let with = |middle: Vec<Step>| {
            let mut steps = operators(source);
            steps.extend(middle);
            steps.extend(operators(source));
            size(&value(&atom, &*backend, &state, &steps, &state).expect("a value"))
        };
        let (ga, gb) = (with(vec![full(a.clone())]), with(vec![full(b.clone())]));
        let product = with(vec![full(a.clone()), full(b.clone())]);
        let difference = size(&b) - size(&a);
        prop_assert!(close(&(ga.clone() - gb), &(product * difference), 60));
        let with_h = with(vec![full(a.clone()), Step::Operator(operator("H"))]);
        let nothing = with(vec![]);
        prop_assert!(close(&(ga * size(&a)), &(with_h + nothing), 60));
    }

    /// Length and velocity: <P_z G P_z> follows from <D_z G D_z> at any energy.
    #[test]
    fn gauges_agree(atom in any_atom(), state in any_state(3), w in (1_i64..20, 20_i64..40)) {
        // P = i mu [H, D]: <P G P> = mu^2 (w^2 <D G D> - w <D D>) - mu/2, with G = 1/(E + w - H)
        let backend = numeric(&atom, 150, &state);
        let e = energy(&atom, &state).to_complex(BITS);
        let w = Complex::with_val(BITS, (0, rational(w.0, w.1))) * &e;
        let step = full(Number::Approx(Complex::with_val(BITS, &e + &w)));
        let evaluate = |text: &str| size(&value(&atom, &*backend, &state, &chain(text, &step), &state).expect("a value"));
        let mu = atom.mass().map_or(Rational::from(1), |m| m / Rational::from(m + 1));
        let square = Rational::from(mu.square_ref());
        let length = (evaluate("D_z Q D_z") * &w * &w - evaluate("D_z D_z") * &w) * square - Float::with_val(BITS, mu / 2);
        prop_assert!(close(&evaluate("P_z Q P_z"), &length, 60));
    }

    /// A level left out by name gives the full resolvent less its terms.
    #[test]
    fn leaving_out_is_subtracting(state in any_state(3), n in 2_i64..6, re in -30_i64..30) {
        let atom = hydrogen();
        let backend = numeric(&atom, 200, &state);
        let z = Number::Approx(Complex::with_val(BITS, (rational(-1, 2), rational(31 + re, 40))));
        let manifold = manifold(&atom, &format!("{n}p"));
        let without = Step::Resolvent(Resolvent { z: z.clone(), omitted: vec![Omitted::Manifold(manifold)] });
        let evaluate = |step: Step| size(&value(&atom, &*backend, &state, &chain("D_z Q D_z", &step), &state).expect("a value"));
        let mut sum = evaluate(without);
        for m in -1..=1 {
            let p = super::super::numbers::Numbers::orbital(u32::try_from(n).expect("small"), 1, m).state();
            let element = size(&value(&atom, &*backend, &p, &operators("D_z"), &state).expect("an element"));
            let gap = size(&z) - size(&energy(&atom, &p));
            sum += Complex::with_val(BITS, element.square_ref()) / gap;
        }
        prop_assert!(close(&evaluate(full(z)), &sum, 60));
    }
}

/// An energy that differs from a level left out by rounding, or by a little more, at exponentials with and without a finite binary form.
#[test]
fn energies_next_to_a_level_left_out() {
    for anchor in ["2p", "3p"] {
        let atom = Hydrogenic::new(rational(3, 1), Some(rational(14, 1))).expect("an atom");
        let (bra, ket) = (state(&atom, "1s", 0), state(&atom, anchor, 0));
        let exact = atom.exact(&Effort::new()).expect("exact backend");
        let numeric = numeric(&atom, 320, &ket);
        let q = reduced(&atom, &ket);
        let steps = chain("r^3 Q r D_z", &q);
        let known = size(&split(&atom, &*exact, &bra, &steps, 0, &ket).expect("finite"));
        let Step::Resolvent(resolvent) = &q else { panic!("a resolvent") };
        let z = resolvent.z.to_complex(BITS + 32);
        for (ulps, bits) in [(0, 250), (1, 250), (-3, 250), (1 << 20, 240), (-(1 << 30), 230)] {
            let shift = Complex::with_val(BITS + 32, &z * ulps) >> (BITS + 32);
            let near = Resolvent { z: Number::Approx(Complex::with_val(BITS + 32, &z + &shift)), ..resolvent.clone() };
            let steps = chain("r^3 Q r D_z", &Step::Resolvent(near));
            let found = size(&split(&atom, &*numeric, &bra, &steps, 0, &ket).expect("a value"));
            assert!(close(&found, &known, bits), "{anchor} {ulps}: {found} {known}");
        }
    }
}
