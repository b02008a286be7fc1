//! Values without a finite form, in growing bases.

use super::chain::*;
use crate::num::Effort;
use crate::systems::{Level, Number, Obstacle, System};
use rug::{Complex, Float, Rational};

/// <bra|steps|ket> in a basis of a size, at a precision.
fn at(bra: (&str, i64), steps: &[Step], ket: (&str, i64), basis: usize, bits: u32) -> Result<Complex, Obstacle> {
    let atom = hydrogen();
    let (bra, ket) = (state(&atom, bra.0, bra.1), state(&atom, ket.0, ket.1));
    let backend = atom.numeric(Level { bits, basis }, &ket, &Effort::new())?;
    value(&atom, &*backend, &bra, steps, &ket).map(|number| number.to_complex(bits))
}

/// -<g|D_z (R(w) + R(-w)) D_z|g> for w = re + i im.
fn polarizability(of: &str, m: i64, w: Number, basis: usize) -> Complex {
    let atom = hydrogen();
    let Number::Exact(energy) = atom.energy(&state(&atom, of, m), 64, &Effort::new()).expect("an energy") else {
        panic!("an exact energy");
    };
    let w = w.to_complex(400);
    let mut sum = Complex::new(400);
    for sign in [1, -1] {
        let z = Complex::with_val(400, &w * sign) + Number::Exact(energy.clone()).to_complex(400);
        let step = full(Number::Approx(z));
        sum -= at((of, m), &chain("D_z Q D_z", &step), (of, m), basis, 400).expect("a value");
    }
    sum
}

fn assert_digits(found: &Complex, known: &str, digits: u32) {
    let known = Float::with_val(400, Float::parse(known).expect("digits"));
    let error = Float::with_val(400, found.real() - &known).abs() / known.abs();
    let bound = Float::with_val(400, 10).recip() * Float::with_val(400, Float::i_exp(1, 0));
    let limit = rug::ops::Pow::pow(bound, digits);
    assert!(error < limit, "{found} has not {digits} digits right: {error}");
    assert!(Float::with_val(400, found.imag().abs_ref()) < limit, "{found} is real");
}

#[test]
fn dynamic_polarizabilities() {
    // computed independently for this project, by another method at high precision
    let real = |n: i64, d: i64| exact(n, d);
    assert_digits(&polarizability("1s", 0, real(1, 10), 60), "4.78430034299754387888637096440062318907043534", 44);
    assert_digits(&polarizability("1s", 0, real(2, 5), 200), "-16.8226453544936829044370018420127285071591712", 43);
    assert_digits(&polarizability("1s", 0, real(1, 100), 60), "4.5026600563770130476939072644690532985451808", 43);
    assert_digits(&polarizability("2s", 0, real(1, 20), 200), "225.033590581669109051907520024180835077989757", 43);
    let i = Number::Exact(crate::num::Surd::i());
    assert_digits(&polarizability("1s", 0, i, 120), "0.742440752952082847124047159867454820661585062", 43);
    let mut scalar = polarizability("2p", 0, real(1, 100), 120);
    scalar += polarizability("2p", 1, real(1, 100), 120) * 2;
    assert_digits(&(scalar / 3), "179.381701707922898909021656946219510235584928", 43);
}

#[test]
fn quadrupole_polarizability() {
    // computed independently for this project
    let mut sum = Complex::new(400);
    for z in [exact(-6, 10), exact(-4, 10)] {
        sum -= at(("1s", 0), &chain("C(2)_0 r^2 Q r^2 C(2)_0", &full(z)), ("1s", 0), 80, 400).expect("a value");
    }
    assert_digits(&sum, "15.519764398805022718586768198682625011057627", 42);
}

#[test]
fn singular_operators_converge_to_their_closed_sums() {
    // exact rationals, computed independently for this project by rational summation; convergence is algebraic
    let atom = hydrogen();
    let q = reduced(&atom, &state(&atom, "2p", 0));
    for (steps, n, d) in
        [("r^-3 Q r^-3", -49, 864), ("r^-3 Q p^4", -115, 432), ("p^4 Q p^4", -271, 216), ("r^-2 Q r^-2", -13, 216)]
    {
        let known = Float::with_val(200, Rational::from((n, d)));
        let errors: Vec<f64> = [100, 400]
            .iter()
            .map(|&basis| {
                let found = at(("2p", 0), &chain(steps, &q), ("2p", 0), basis, 200).expect("a value");
                (Float::with_val(200, found.real() - &known) / &known).to_f64().abs()
            })
            .collect();
        assert!(errors[1] < errors[0] / 3.0 && errors[1] < 1e-2, "{steps}: {errors:?}");
    }
}

#[test]
fn divergences_are_recognised_by_powers() {
    let atom = hydrogen();
    let (s, p) = (state(&atom, "1s", 0), state(&atom, "2p", 0));
    let s2 = state(&atom, "2s", 0);
    let (qs, qp, q2) = (reduced(&atom, &s), reduced(&atom, &p), reduced(&atom, &s2));
    let half = full(exact(-1, 3));
    for (steps, q, of) in [
        ("delta(r) Q delta(r)", &qs, "1s"),
        ("p^4 Q p^4", &qs, "1s"),
        ("delta(r) Q p^4", &qs, "1s"),
        ("p^4 Q delta(r)", &q2, "2s"),
        ("delta(r) Q r^-2", &qs, "1s"),
        ("p^4 Q r^-2", &qs, "1s"),
        ("r^-2 Q r^-2", &half, "1s"),
        ("r^-3", &qs, "1s"),
        ("r^-4 Q r^-3", &qp, "2p"),
        ("r^-3 Q r^-4", &qp, "2p"),
        ("r^-5 Q r", &qp, "2p"),
        ("r Q r^-5", &qp, "2p"),
    ] {
        let found = at((of, 0), &chain(steps, q), (of, 0), 40, 100);
        if steps == "r^-2 Q r^-2" {
            assert!(found.is_ok(), "{steps}: {found:?}");
        } else {
            assert!(matches!(found, Err(Obstacle::Diverges { .. })), "{steps}: {found:?}");
        }
    }
    for (steps, q, of) in
        [("p^4 Q r", &qs, "1s"), ("delta(r) Q r", &qs, "1s"), ("r^-2 Q r^-2", &qs, "1s"), ("r Q delta(r)", &half, "1s")]
    {
        assert!(at((of, 0), &chain(steps, q), (of, 0), 40, 100).is_ok(), "{steps}");
    }
}

#[test]
fn energies_that_are_refused() {
    let on = |z: Number| at(("1s", 0), &chain("D_z Q D_z", &full(z)), ("1s", 0), 20, 100);
    assert_eq!(on(exact(1, 10)), Err(Obstacle::OnCut));
    assert_eq!(on(Number::Approx(Complex::with_val(132, 0.1))), Err(Obstacle::OnCut));
    assert_eq!(on(Number::Approx(Complex::new(132))), Err(Obstacle::OnCut));
    assert_eq!(on(exact(-1, 18)), Err(Obstacle::Singular { level: "3p".into() }));
    let third = Float::with_val(132, -1) / 18;
    assert_eq!(on(Number::Approx(Complex::with_val(132, third))), Err(Obstacle::Singular { level: "3p".into() }));
    assert!(on(Number::Approx(Complex::with_val(132, (0.1, 0.1)))).is_ok());
}

#[test]
fn resolvents_of_another_level_than_the_anchor() {
    // 1/(E(2s) - H)' between 1s: anchored at 1s (the states left out are not in the basis) and at 2s
    let atom = hydrogen();
    let (s1, s2) = (state(&atom, "1s", 0), state(&atom, "2s", 0));
    let steps = chain("D_z Q D_z", &reduced(&atom, &s2));
    let mut values = Vec::new();
    for (anchor, basis) in [(&s1, 300), (&s2, 300)] {
        let backend = atom.numeric(Level { bits: 300, basis }, anchor, &Effort::new()).expect("a backend");
        values.push(value(&atom, &*backend, &s1, &steps, &s1).expect("a value").to_complex(300));
    }
    let difference = Complex::with_val(300, &values[0] - &values[1]).abs().into_real_imag().0;
    assert!(difference < 1e-60, "{values:?}");
}
