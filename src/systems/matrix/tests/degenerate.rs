//! Degenerate and nearly degenerate spectra.

use super::*;

/// x y^T of integer vectors, scaled.
fn rotated(order: usize, eigenvalues: &[Surd]) -> ExactMatrix {
    // A reflection 1 - 2 w w^T/|w|^2 with w = (1, 2, 3, …) has rational entries.
    let norm = (1..=order as i64).map(|k| k * k).sum::<i64>();
    let u = |i: usize, j: usize| {
        let product = Rational::from((2 * (i as i64 + 1) * (j as i64 + 1), norm));
        Rational::from(i64::from(i == j)) - product
    };
    symmetric(order, |i, j| (0..order).fold(Surd::zero(), |sum, k| &sum + &eigenvalues[k].scaled(&(u(i, k) * u(j, k)))))
}

#[test]
fn a_degenerate_level_that_is_not_diagonal() {
    let m = system(rotated(4, &[q(2, 1), q(-1, 3), q(2, 1), q(2, 1)]), vec![]);
    assert_eq!(levels(&m), [(0, 1), (1, 3)]);
    assert!(m.degenerate(&state(&m, 1), &state(&m, 3)));
    assert!(!m.degenerate(&state(&m, 0), &state(&m, 1)));
    let (backend, rounded) = (exact(&m), numeric(&m, 160));
    for a in 1..4 {
        let left = ket(&backend, &state(&m, a)).expect("exact");
        for b in 1..4 {
            let right = ket(&backend, &state(&m, b)).expect("exact");
            assert_eq!(backend.overlap(WHOLE, &left, &right), Ok(Number::Exact(q(i64::from(a == b), 1))));
        }
        // The first state of the level is the projection of the first basis vector, the numeric ket the same.
        let value = rounded.element(
            &operator(0),
            WHOLE,
            WHOLE,
            &ket(&rounded, &state(&m, a)).expect("numbers"),
            &ket(&rounded, &state(&m, a)).expect("numbers"),
        );
        assert_close(&value.expect("a number"), &Number::Exact(q(2, 1)), 150);
    }
}

#[test]
fn states_of_a_diagonal_matrix_are_basis_vectors() {
    let h = ExactMatrix::from_diagonals(vec![[3, 1, 3, 1, 2].map(|n| q(n, 1)).to_vec()]).expect("real");
    let m = system(h.clone(), vec![("V", h)]);
    assert_eq!(levels(&m), [(0, 2), (2, 1), (3, 2)]);
    let backend = exact(&m);
    for (place, basis) in [1, 3, 4, 0, 2].into_iter().enumerate() {
        let found = ket(&backend, &state(&m, place)).expect("exact");
        let found: &super::super::entries::ExactKet = found.downcast_ref().expect("an exact ket");
        assert_eq!(found.iter().collect::<Vec<_>>(), [(&basis, &Surd::one())]);
    }
}

#[test]
fn a_projector_has_two_levels() {
    // P = w w^T/|w|^2
    let w = [1, -2, 3, 1, 5, 2];
    let norm: i64 = w.iter().map(|k| k * k).sum();
    let m = system(symmetric(6, |i, j| q(w[i] * w[j], norm)), vec![]);
    assert_eq!(levels(&m), [(0, 5), (5, 1)]);
    assert_eq!(energy(&m, 3), Number::Exact(Surd::zero()));
    assert_eq!(energy(&m, 5), Number::Exact(Surd::one()));
}

#[test]
fn a_degenerate_level_without_exact_energy() {
    // 2 cos(2 pi k/7) are roots of cubics: degeneracy is shown by counting distinct eigenvalues.
    let ring = symmetric(7, |i, j| q(i64::from(i == j + 1 || (i == 6 && j == 0)), 1));
    let v = symmetric(7, |i, j| q((i * j) as i64, 5));
    let m = system(ring, vec![("V", v)]);
    assert_eq!(levels(&m), [(0, 2), (2, 2), (4, 2), (6, 1)]);
    assert!(matches!(energy(&m, 0), Number::Approx(_)));
    // The states are the same at every precision: first the projection of e_0, which is even under k -> -k.
    let (low, high) = (numeric(&m, 100), numeric(&m, 300));
    for place in 0..6 {
        let values: Vec<Number> = [&low, &high]
            .into_iter()
            .map(|backend| {
                let ket = ket(backend, &state(&m, place)).expect("numbers");
                backend.element(&operator(1), WHOLE, WHOLE, &ket, &ket).expect("a number")
            })
            .collect();
        assert_close(&values[0], &values[1], 90);
    }
    // sum over the two states of the level |<e_0|.>|^2 = 2/7, all in the first
    let first = ket(&low, &state(&m, 0)).expect("numbers");
    let second = ket(&low, &state(&m, 1)).expect("numbers");
    let component = |ket: &BlockKet| ket.downcast_ref::<Vec<Complex>>().expect("numbers")[0].clone();
    assert_close(&Number::Approx(component(&first).square()), &Number::Exact(q(2, 7)), 90);
    assert!(component(&second).abs().into_real_imag().0 < 1e-25);
}

#[test]
fn complex_entries() {
    // i (P - P^T) on a ring: 2 sin(2 pi k/6) = 0, 0, +-sqrt 3 twice each
    let ring = symmetric(6, |i, j| match (i, j) {
        (5, 0) => -&Surd::i(),
        _ if i == j + 1 => Surd::i(),
        _ => Surd::zero(),
    });
    let m = system(ring, vec![]);
    assert_eq!(levels(&m), [(0, 2), (2, 2), (4, 2)]);
    assert_eq!(energy(&m, 0), Number::Exact(-&root(3, 1)));
    assert_eq!(energy(&m, 3), Number::Exact(Surd::zero()));
    assert_eq!(energy(&m, 5), Number::Exact(root(3, 1)));
    let backend = numeric(&m, 128);
    for a in 0..6 {
        let left = ket(&backend, &state(&m, a)).expect("numbers");
        for b in 0..6 {
            let right = ket(&backend, &state(&m, b)).expect("numbers");
            let overlap = complex(&backend.overlap(WHOLE, &left, &right).expect("a number"), 128);
            let distance = (overlap - i32::from(a == b)).abs().into_real_imag().0;
            assert!(distance < 1e-35, "<{a}|{b}> is off by {distance}");
        }
    }
}

#[test]
fn equal_levels_of_different_components() {
    // Two copies of a matrix with irrational energies, in a different order of the basis.
    let block = |i: usize, j: usize| q([[0, 1, 2], [1, 3, 1], [2, 1, 7]][i][j], 1);
    let m = system(symmetric(6, |i, j| if i % 2 == j % 2 { block(i / 2, j / 2) } else { Surd::zero() }), vec![]);
    assert_eq!(m.components.len(), 2);
    assert_eq!(levels(&m), [(0, 2), (2, 2), (4, 2)]);
    // A copy moved by 10^-90 is no copy.
    let moved = |i: usize, j: usize| {
        let entry = if i % 2 == j % 2 { block(i / 2, j / 2) } else { Surd::zero() };
        if i == j && i % 2 == 1 { &entry + &Surd::from(tiny(90)) } else { entry }
    };
    let m = system(symmetric(6, moved), vec![]);
    assert_eq!(levels(&m), [(0, 1), (1, 1), (2, 1), (3, 1), (4, 1), (5, 1)]);
}

#[test]
fn energies_that_differ_in_the_130th_decimal() {
    let near = Surd::from(Rational::from(1) + tiny(130));
    let diagonal = ExactMatrix::from_diagonals(vec![vec![near.clone(), q(1, 1)]]).expect("real");
    let m = system(diagonal, vec![]);
    assert_eq!((energy(&m, 0), energy(&m, 1)), (Number::Exact(Surd::one()), Number::Exact(near.clone())));
    // Not diagonal: exact energies all the same, each with its own state.
    let m =
        system(rotated(3, &[near.clone(), q(1, 1), q(5, 1)]), vec![("V", symmetric(3, |i, j| q((i + j) as i64, 1)))]);
    assert_eq!(levels(&m), [(0, 1), (1, 1), (2, 1)]);
    assert_eq!((energy(&m, 0), energy(&m, 1)), (Number::Exact(Surd::one()), Number::Exact(near)));
    let found = second_order(&exact(&m), &reduced(&m, 0), &state(&m, 0), &state(&m, 0)).expect("exact");
    let rounded = second_order(&numeric(&m, 200), &reduced(&m, 0), &state(&m, 0), &state(&m, 0)).expect("numbers");
    assert_close(&found, &rounded, 150);
}

#[test]
fn nearly_degenerate_states_without_exact_energies_stay_apart() {
    // [[M, e], [e, M]] has the energies of M moved by +-e, with even and odd states, for e = 10^-70.
    let block = |i: usize, j: usize| q([[0, 1, 2], [1, 3, 1], [2, 1, 7]][i % 3][j % 3], 1);
    let h = symmetric(6, |i, j| match (i / 3 == j / 3, i % 3 == j % 3) {
        (true, _) => block(i, j),
        (false, true) => Surd::from(tiny(70)),
        (false, false) => Surd::zero(),
    });
    // The exchange of the halves: -1 in the odd state, +1 in the even one.
    let exchange = symmetric(6, |i, j| q(i64::from(i == j + 3), 1));
    let m = system(h, vec![("X", exchange)]);
    assert_eq!(levels(&m).len(), 6);
    let backend = numeric(&m, 100);
    for place in 0..6 {
        let ket = ket(&backend, &state(&m, place)).expect("numbers");
        let parity = backend.element(&operator(1), WHOLE, WHOLE, &ket, &ket).expect("a number");
        assert_close(&parity, &Number::Exact(q(if place % 2 == 0 { -1 } else { 1 }, 1)), 90);
    }
}
