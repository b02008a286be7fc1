//! Models with closed forms.

use super::*;

#[test]
fn a_two_level_model() {
    // H = [[0, v], [v, d]]: E = (d -+ sqrt(d^2 + 4 v^2))/2
    let (d, v) = (Rational::from((3, 7)), Rational::from((2, 5)));
    let h = matrix(vec![vec![q(0, 1), Surd::from(v.clone())], vec![Surd::from(v.clone()), Surd::from(d.clone())]]);
    let m = system(h, vec![]);
    let discriminant = Rational::from(d.square_ref()) + Rational::from(v.square_ref()) * 4u32;
    let half = Rational::from((1, 2));
    let split = Surd::sqrt_of(&discriminant).expect("small").scaled(&half);
    let centre = Surd::from(d).scaled(&half);
    assert_eq!(energy(&m, 0), Number::Exact(&centre - &split));
    assert_eq!(energy(&m, 1), Number::Exact(&centre + &split));
    assert_eq!(levels(&m), [(0, 1), (1, 1)]);
    // The states are numbers; their components are cos and sin of half the angle with tan = 2v/d.
    let backend = numeric(&m, 256);
    assert_eq!(ket(&exact(&m), &state(&m, 0)).err(), Some(Obstacle::Inexact));
    let ground = ket(&backend, &state(&m, 0)).expect("numbers");
    let value = backend.element(&operator(0), WHOLE, WHOLE, &ground, &ground).expect("a number");
    assert_close(&value, &energy(&m, 0), 250);
}

#[test]
fn a_two_level_model_with_rational_states() {
    // [[1, 2], [2, 4]]: 0 along (2, -1), 5 along (1, 2)
    let h = matrix(vec![vec![q(1, 1), q(2, 1)], vec![q(2, 1), q(4, 1)]]);
    let v = matrix(vec![vec![q(0, 1), q(1, 1)], vec![q(1, 1), q(0, 1)]]);
    let m = system(h, vec![("V", v)]);
    assert_eq!(energy(&m, 0), Number::Exact(Surd::zero()));
    // <0|V|1> = (2 2 - 1 1)/5, so the second order is (3/5)^2/(0 - 5)
    let found = second_order(&exact(&m), &reduced(&m, 0), &state(&m, 0), &state(&m, 0));
    assert_eq!(found, Ok(Number::Exact(q(-9, 125))));
}

/// The oscillator with n states, and x^4 from the exact x.
fn oscillator(n: usize) -> MatrixSystem {
    let h = ExactMatrix::from_diagonals(vec![(0..n).map(|k| q(2 * k as i64 + 1, 2)).collect()]).expect("real");
    let x = ExactMatrix::from_diagonals(vec![vec![Surd::zero(); n], (1..n).map(|k| root(k as i64, 2)).collect()]);
    system(h, vec![("x", x.expect("real"))])
}

fn x4(backend: &Arc<dyn Backend>, mut ket: BlockKet) -> BlockKet {
    for _ in 0..4 {
        ket = backend.apply(&operator(1), WHOLE, WHOLE, &ket).expect("exact");
    }
    ket
}

#[test]
fn the_anharmonic_oscillator_to_third_order() {
    // E = 1/2 + 3/4 g - 21/8 g^2 + 333/16 g^3 - …, C. M. Bender and T. T. Wu, Phys. Rev. 184 (1969) 1231, in units of this H (from memory).
    let m = oscillator(16);
    let backend = exact(&m);
    let ground = ket(&backend, &state(&m, 0)).expect("a basis vector");
    let image = x4(&backend, ground.clone());
    let first = backend.overlap(WHOLE, &ground, &image).expect("exact");
    assert_eq!(first, Number::Exact(q(3, 4)));
    let solved = backend.resolve(&reduced(&m, 0), WHOLE, &image).expect("exact");
    assert_eq!(backend.overlap(WHOLE, &image, &solved), Ok(Number::Exact(q(-21, 8))));
    let shifted = backend
        .combine(
            WHOLE,
            &[(Number::Exact(Surd::one()), x4(&backend, solved.clone())), (Number::Exact(q(-3, 4)), solved.clone())],
        )
        .expect("exact");
    assert_eq!(backend.overlap(WHOLE, &solved, &shifted), Ok(Number::Exact(q(333, 16))));
    // The same in numbers.
    let backend = numeric(&m, 200);
    let ground = ket(&backend, &state(&m, 0)).expect("numbers");
    let image = x4(&backend, ground);
    let solved = backend.resolve(&reduced(&m, 0), WHOLE, &image).expect("numbers");
    assert_close(&backend.overlap(WHOLE, &image, &solved).expect("a number"), &Number::Exact(q(-21, 8)), 190);
}

#[test]
fn orbital_angular_momentum_of_a_p_wave() {
    // L_x in the basis m = 1, 0, -1 has 1/sqrt 2 beside the diagonal and the energies -1, 0, 1.
    let side = vec![root(1, 2), root(1, 2)];
    let lx = ExactMatrix::from_diagonals(vec![vec![Surd::zero(); 3], side]).expect("real");
    let ly = ExactMatrix::from_diagonals(vec![
        vec![Surd::zero(); 3],
        vec![-&(&Surd::i() * &root(1, 2)), -&(&Surd::i() * &root(1, 2))],
    ]);
    let m = system(lx, vec![("Ly", ly.expect("Hermitian"))]);
    for (place, value) in [-1, 0, 1].into_iter().enumerate() {
        assert_eq!(energy(&m, place), Number::Exact(q(value, 1)));
    }
    let backend = exact(&m);
    let top = ket(&backend, &state(&m, 2)).expect("exact");
    let middle = ket(&backend, &state(&m, 1)).expect("exact");
    // |<1|L_y|0>|^2 = 1/2
    let element = backend.element(&operator(1), WHOLE, WHOLE, &top, &middle).expect("exact");
    let Number::Exact(element) = element else { panic!("not exact") };
    assert_eq!(&element * &element.conj(), q(1, 2));
}

#[test]
fn energies_with_pi() {
    // 3 < pi < sqrt 10, and pi twice.
    let h =
        ExactMatrix::from_diagonals(vec![vec![Surd::pi_to(1), root(10, 1), q(3, 1), Surd::pi_to(1)]]).expect("real");
    let m = system(h, vec![]);
    assert_eq!(levels(&m), [(0, 1), (1, 2), (3, 1)]);
    assert_eq!(energy(&m, 2), Number::Exact(Surd::pi_to(1)));
    // pi (1 + sigma_x) and 2 pi: the levels 0, 2 pi, 2 pi
    let rows = vec![
        vec![Surd::pi_to(1), Surd::pi_to(1), Surd::zero()],
        vec![Surd::pi_to(1), Surd::pi_to(1), Surd::zero()],
        vec![Surd::zero(), Surd::zero(), Surd::pi_to(1).scaled(&Rational::from(2))],
    ];
    let m = system(matrix(rows), vec![]);
    assert_eq!(levels(&m), [(0, 1), (1, 2)]);
    assert_eq!(energy(&m, 0), Number::Exact(Surd::zero()));
    assert_eq!(energy(&m, 1), Number::Exact(Surd::pi_to(1).scaled(&Rational::from(2))));
}

#[test]
fn a_hopping_ring_of_five() {
    // 2 cos(2 pi k/5): 2, twice (sqrt 5 - 1)/2, twice -(sqrt 5 + 1)/2
    let ring = symmetric(5, |i, j| q(i64::from(i == j + 1 || (i == 4 && j == 0)), 1));
    let m = system(ring, vec![]);
    assert_eq!(levels(&m), [(0, 2), (2, 2), (4, 1)]);
    let golden = root(5, 4);
    assert_eq!(energy(&m, 1), Number::Exact(&q(-1, 2) - &golden));
    assert_eq!(energy(&m, 2), Number::Exact(&q(-1, 2) + &golden));
    assert_eq!(energy(&m, 4), Number::Exact(q(2, 1)));
}

#[test]
fn whole_energies_of_a_matrix_too_large_for_exact_elimination() {
    // All ones: 0 (n - 1 times) and n.
    let n = 70;
    let m = system(symmetric(n, |_, _| q(1, 1)), vec![]);
    assert_eq!(levels(&m), [(0, n - 1), (n - 1, 1)]);
    assert_eq!(energy(&m, 5), Number::Exact(Surd::zero()));
    assert_eq!(energy(&m, n - 1), Number::Exact(q(n as i64, 1)));
    let top = ket(&numeric(&m, 128), &state(&m, n - 1)).expect("numbers");
    let norm = numeric(&m, 128).overlap(WHOLE, &top, &top).expect("a number");
    assert_close(&norm, &Number::Exact(Surd::one()), 120);
}
