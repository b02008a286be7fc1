//! Energies on, and near, a level.

use super::*;

fn resolvent(z: Number) -> Resolvent {
    Resolvent { z, omitted: Vec::new() }
}

/// A ring of seven states with V = e_0 e_0^T and the like; its energies are not exact but one.
fn ring() -> MatrixSystem {
    let ring = symmetric(7, |i, j| q(i64::from(i == j + 1 || (i == 6 && j == 0)), 1));
    system(ring, vec![("V", symmetric(7, |i, j| q((i + 2 * j) as i64 % 5, 3)))])
}

#[test]
fn an_exact_level_is_named() {
    let h = ExactMatrix::from_diagonals(vec![[1, 2, 2, 5].map(|n| q(n, 1)).to_vec()]).expect("real");
    let m = system(h, vec![("V", symmetric(4, |_, _| q(1, 1)))]);
    let expected = |level: &str| Err(Obstacle::Singular { level: level.into() });
    for backend in [exact(&m), numeric(&m, 128)] {
        let at = |z: Surd| second_order(&backend, &resolvent(Number::Exact(z)), &state(&m, 0), &state(&m, 0));
        assert_eq!(at(q(2, 1)), expected("states 1 to 2 (energy 2)"));
        assert_eq!(at(q(5, 1)), expected("state 3 (energy 5)"));
        assert!(at(q(3, 1)).is_ok());
        // Leaving out another level does not help.
        let other = Resolvent { z: Number::Exact(q(2, 1)), omitted: vec![Omitted::LevelOf(state(&m, 0))] };
        assert_eq!(second_order(&backend, &other, &state(&m, 0), &state(&m, 0)), expected("states 1 to 2 (energy 2)"));
    }
}

#[test]
fn a_level_the_ket_does_not_reach_does_no_harm() {
    // V couples 0 to 1 only.
    let h = ExactMatrix::from_diagonals(vec![[1, 2, 3].map(|n| q(n, 1)).to_vec()]).expect("real");
    let m = system(h, vec![("V", symmetric(3, |i, j| q(i64::from((i, j) == (1, 0)), 1)))]);
    for backend in [exact(&m), numeric(&m, 128)] {
        let found = second_order(&backend, &resolvent(Number::Exact(q(3, 1))), &state(&m, 0), &state(&m, 0));
        assert_close(&found.expect("not singular"), &Number::Exact(q(1, 1)), 120);
    }
}

#[test]
fn an_exact_energy_close_to_a_level_is_not_singular() {
    let m = ring();
    let z = Surd::from(Rational::from(2) + tiny(100));
    let at =
        |bits| second_order(&numeric(&m, bits), &resolvent(Number::Exact(z.clone())), &state(&m, 0), &state(&m, 0));
    let (low, high) = (at(128).expect("decided"), at(800).expect("decided"));
    assert_close(&low, &high, 100);
    let at = second_order(&numeric(&m, 128), &resolvent(Number::Exact(q(2, 1))), &state(&m, 0), &state(&m, 0));
    assert_eq!(at, Err(Obstacle::Singular { level: "state 6 (energy 2)".into() }));
}

#[test]
fn an_approximate_energy_on_a_level() {
    let m = ring();
    let z = m.energy(&state(&m, 0), 2000, &Effort::new()).expect("an energy");
    let at = |bits| second_order(&numeric(&m, bits), &resolvent(z.clone()), &state(&m, 0), &state(&m, 0));
    assert_eq!(at(128), Err(Obstacle::Undecided));
    let Err(Obstacle::Singular { level }) = at(600) else { panic!("not told singular") };
    assert!(level.starts_with("states 0 to 1 (energy -1.801938, the same in all "), "{level}");
    assert!(second_order(&numeric(&m, 128), &reduced(&m, 0), &state(&m, 0), &state(&m, 0)).is_ok());
}

#[test]
fn reduced_resolvents_are_orthogonal_to_what_they_leave_out() {
    let m = ring();
    let backend = numeric(&m, 200);
    let image =
        backend.apply(&operator(1), WHOLE, WHOLE, &ket(&backend, &state(&m, 0)).expect("numbers")).expect("numbers");
    let solved = backend.resolve(&reduced(&m, 0), WHOLE, &image).expect("numbers");
    for place in 0..2 {
        let overlap = backend.overlap(WHOLE, &ket(&backend, &state(&m, place)).expect("numbers"), &solved);
        assert!(complex(&overlap.expect("a number"), 64).abs().into_real_imag().0 < 1e-55);
    }
    // A level left out with all its states leaves nothing where there is nothing else.
    let one = system(symmetric(3, |i, j| q(i64::from(i == j), 1)), vec![("V", symmetric(3, |_, _| q(1, 1)))]);
    for backend in [exact(&one), numeric(&one, 128)] {
        let found = second_order(&backend, &reduced(&one, 0), &state(&one, 0), &state(&one, 0)).expect("zero");
        assert!(complex(&found, 64).is_zero());
    }
}

#[test]
fn labels_and_operators_are_checked() {
    let m = ring();
    let effort = Effort::new();
    let refuse = |text: &str| {
        let label = StateLabel { text: text.into(), options: Vec::new() };
        m.state(&label, &effort).expect_err("refused").to_string()
    };
    assert_eq!(refuse("7"), "there is no state 7: the matrix has 7 states");
    assert_eq!(refuse("2p"), "`2p` is not the number of a state");
    assert_eq!(refuse("-1"), "`-1` is not the number of a state");
    assert_eq!(refuse("99999999999999999999"), "there is no state 99999999999999999999: the matrix has 7 states");
    let label = StateLabel { text: "1".into(), options: vec![("J".into(), Rational::from(1))] };
    let error = m.state(&label, &effort).expect_err("refused");
    assert_eq!(error.to_string(), "a state of a matrix has no quantum number `J`");
    let atom =
        |name: &str, power| crate::systems::Atom { name: name.into(), component: None, arguments: vec![], power };
    assert_eq!(m.knows(&atom("V", 1)), Ok(true));
    assert_eq!(m.knows(&atom("V", 2)), Ok(false));
    assert!(m.knows(&atom("W", 1)).is_err());
    let fault = MatrixSystem::new(vec![("V".into(), symmetric(2, |_, _| q(1, 1)))]).err().expect("refused");
    assert_eq!(fault.to_string(), "the matrix of H is missing");
}

#[test]
fn a_stopped_computation_ends() {
    let m = ring();
    let effort = Effort::new();
    effort.stop();
    assert!(matches!(m.energy(&state(&m, 0), 128, &effort), Err(Obstacle::Interrupted(_))));
}
