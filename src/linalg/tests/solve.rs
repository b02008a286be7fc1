//! Dense real systems.

use nalgebra::{DMatrix, DVector};
use proptest::prelude::*;
use rug::{Float, Rational};

use super::{Irregular, cases, difference, exact, float};
use crate::linalg::{LinalgError, Solved, Solver};
use crate::num::Effort;

/// Checks a solution by its residual at twice the precision, scaled by size and condition.
fn check_residual(a: &DMatrix<Float>, b: &DVector<Float>, solved: &Solved, bits: u32, lost: u32) {
    let precision = 2 * bits + 64;
    let (mut worst, mut size) = (Float::new(precision), Float::new(precision));
    for i in 0..b.len() {
        let mut sum = Float::with_val(precision, &b[i]);
        let mut row = Float::new(precision);
        for j in 0..b.len() {
            let product = Float::with_val(precision, &a[(i, j)] * &solved.x[j]);
            sum -= &product;
            row += product.abs();
        }
        worst.max_mut(&sum.abs());
        size.max_mut(&row);
    }
    assert!(solved.holds >= bits as i32, "{} of {bits} bits hold", solved.holds);
    size >>= bits;
    assert!(worst <= size, "residual {worst:e} above {size:e} (condition 2^{lost})");
}

fn solve_and_check(a: &DMatrix<Float>, b: &DVector<Float>, bits: u32, symmetric: bool) -> DVector<Float> {
    let effort = Effort::new();
    let make = if symmetric { Solver::symmetric } else { Solver::general };
    let solver = make(a.clone(), bits, &effort).expect("not singular");
    let solved = solver.solve(b, &effort).expect("solved");
    check_residual(a, b, &solved, bits, solver.condition_bits());
    solved.x
}

/// The exact solution agrees to the wanted bits, by both kinds of factorisation.
fn check_exact(a: &DMatrix<Float>, b: &DVector<Float>, bits: u32, symmetric: bool) {
    let rhs: Vec<Rational> = b.iter().map(|x| x.to_rational().expect("finite")).collect();
    let exact = exact::solve(&exact::rows(a), &rhs).expect("not singular");
    let exact = DVector::from_iterator(b.len(), exact.iter().map(|x| float(x, 2 * bits + 64)));
    let kinds: &[bool] = if symmetric { &[true, false] } else { &[false] };
    for &kind in kinds {
        let x = solve_and_check(a, b, bits, kind);
        let off = difference(&x, &exact);
        assert!(off <= -i64::from(bits), "symmetric {kind}: off by 2^{off}, wanted 2^-{bits}");
    }
}

#[test]
fn random_symmetric_and_general() {
    for (seed, order, bits) in
        [(1, 1, 64), (2, 2, 113), (3, 7, 213), (4, 24, 213), (5, 25, 300), (6, 18, 700), (7, 6, 1700)]
    {
        let mut random = Irregular(seed);
        let a = random.symmetric(order, bits + 40);
        let b = random.vector(order, bits + 40);
        check_exact(&a, &b, bits, true);
        let general = DMatrix::from_fn(order, order, |_, _| random.float(bits + 40));
        check_exact(&general, &b, bits, false);
    }
}

#[test]
fn larger_matrices_by_residual() {
    let mut random = Irregular(11);
    let a = random.symmetric(130, 260);
    let b = random.vector(130, 260);
    let x = solve_and_check(&a, &b, 213, true);
    let y = solve_and_check(&a, &b, 213, false);
    assert!(difference(&x, &y) < -212);
}

#[test]
fn zero_diagonal_and_saddle_points() {
    // Without pivots the first step would divide by zero.
    let mut random = Irregular(21);
    let mut a = random.symmetric(16, 260);
    for i in 0..16 {
        a[(i, i)] = Float::new(260);
    }
    let b = random.vector(16, 260);
    check_exact(&a, &b, 213, true);
    for i in 8..16 {
        for j in 8..16 {
            a[(i, j)] = Float::new(260);
        }
    }
    check_exact(&a, &b, 213, true);
}

#[test]
fn singular_leading_blocks() {
    // The leading block of order 2 is singular, or nearly so, while the matrix is not.
    for distance in [u32::MAX, 40, 150, 240] {
        let mut random = Irregular(31);
        let mut a = random.symmetric(12, 280);
        for i in 0..2 {
            for j in 0..2 {
                a[(i, j)] = Float::with_val(280, 1) >> 1;
            }
        }
        if distance != u32::MAX {
            a[(1, 1)] += Float::with_val(280, 1) >> distance;
        }
        let b = random.vector(12, 280);
        check_exact(&a, &b, 213, true);
    }
}

#[test]
fn hilbert_matrix() {
    // Entries over the least common multiple of the denominators are whole: the matrix is exact. Its condition number
    // is about 2^100 at order 20.
    let order = 20u32;
    let multiple = (1..2 * order).fold(rug::Integer::from(1), |m, k| m.lcm(&rug::Integer::from(k)));
    let a = DMatrix::from_fn(order as usize, order as usize, |i, j| {
        Float::with_val(400, multiple.clone() / (i as u32 + j as u32 + 1))
    });
    let b = DVector::from_fn(order as usize, |i, _| Float::with_val(400, 1 + 3 * i as u32));
    check_exact(&a, &b, 213, true);
    let solver = Solver::symmetric(a, 213, &Effort::new()).expect("not singular");
    assert!((80..=110).contains(&solver.condition_bits()), "{}", solver.condition_bits());
}

#[test]
fn graded_matrices() {
    for step in [3i32, 20, 60] {
        let mut random = Irregular(41);
        let mut a = random.symmetric(14, 300);
        for i in 0..14 {
            a[(i, i)] += 4;
            for j in 0..14 {
                a[(i, j)] <<= -step * (i as i32 + j as i32);
            }
        }
        let b = random.vector(14, 300);
        check_exact(&a, &b, 213, true);
        // Graded from row to row only.
        for i in 0..14 {
            for j in 0..14 {
                a[(i, j)] <<= step * j as i32;
            }
        }
        check_exact(&a, &b, 213, false);
    }
}

#[test]
fn beyond_machine_numbers() {
    let mut random = Irregular(51);
    let mut a = random.symmetric(9, 300);
    a *= Float::with_val(300, 1) << 3000;
    let b = random.vector(9, 300).map(|x| x >> 4000);
    check_exact(&a, &b, 213, true);
}

#[test]
fn nearly_singular_by_known_amount() {
    // A rank-one matrix plus a small multiple of the identity: condition about 2^90.
    let bits = 213;
    let mut random = Irregular(61);
    let u = random.vector(15, 60);
    let a = DMatrix::from_fn(15, 15, |i, j| {
        let mut x = Float::with_val(400, &u[i] * &u[j]);
        if i == j {
            x += Float::with_val(400, 1) >> 90;
        }
        x
    });
    let b = random.vector(15, 300);
    check_exact(&a, &b, bits, true);
}

#[test]
fn singular_matrices_are_refused() {
    let effort = Effort::new();
    let mut random = Irregular(71);
    let (u, v) = (random.vector(8, 40), random.vector(8, 40));
    // Rank two, exactly.
    let a = DMatrix::from_fn(8, 8, |i, j| Float::with_val(260, &u[i] * &u[j]) + Float::with_val(260, &v[i] * &v[j]));
    for symmetric in [true, false] {
        let make = if symmetric { Solver::symmetric } else { Solver::general };
        let error = make(a.clone(), 213, &effort).err();
        assert_eq!(error, Some(LinalgError::Singular { known: 260 }));
        let zero = DMatrix::from_element(3, 3, Float::new(100));
        assert_eq!(make(zero, 64, &effort).err(), Some(LinalgError::Singular { known: 100 }));
    }
}

#[test]
fn wrong_shapes_and_values_are_refused() {
    let effort = Effort::new();
    let a = DMatrix::from_element(2, 3, Float::with_val(64, 1));
    assert_eq!(Solver::general(a, 64, &effort).err(), Some(LinalgError::NotSquare { rows: 2, columns: 3 }));
    let a = DMatrix::from_element(1, 1, Float::with_val(64, rug::float::Special::Nan));
    assert_eq!(Solver::symmetric(a, 64, &effort).err(), Some(LinalgError::NotFinite));
    let a = DMatrix::from_element(1, 1, Float::with_val(64, 3));
    let solver = Solver::symmetric(a, 64, &effort).expect("not singular");
    let error = solver.solve(&DVector::from_element(2, Float::new(64)), &effort).err();
    assert_eq!(error, Some(LinalgError::WrongLength { found: 2, expected: 1 }));
    let zero = solver.solve(&DVector::from_element(1, Float::new(64)), &effort).expect("zero");
    assert!(zero.x[0].is_zero());
}

#[test]
fn a_stop_is_heard() {
    let effort = Effort::new();
    let mut random = Irregular(81);
    let a = random.symmetric(30, 300);
    effort.stop();
    assert!(matches!(Solver::symmetric(a, 213, &effort), Err(LinalgError::Interrupted(_))));
}

proptest! {
    #![proptest_config(cases(48))]

    /// Small whole numbers, often singular or with singular leading blocks, against exact elimination.
    #[test]
    fn whole_numbers_against_exact(seed in any::<u64>(), order in 1usize..9, bound in 1i64..4, bits in 64u32..400) {
        let mut random = Irregular(seed);
        let mut a = DMatrix::from_element(order, order, Float::new(bits + 64));
        for i in 0..order {
            for j in 0..=i {
                a[(i, j)] = Float::with_val(bits + 64, random.small(bound));
                a[(j, i)] = a[(i, j)].clone();
            }
        }
        let b = DVector::from_fn(order, |_, _| Float::with_val(bits + 64, random.small(9)));
        let rhs: Vec<Rational> = b.iter().map(|x| x.to_rational().expect("finite")).collect();
        match exact::solve(&exact::rows(&a), &rhs) {
            Some(_) if b.iter().all(Float::is_zero) => {}
            Some(_) => check_exact(&a, &b, bits, true),
            None => for make in [Solver::symmetric, Solver::general] {
                let refused = matches!(make(a.clone(), bits, &Effort::new()), Err(LinalgError::Singular { .. }));
                prop_assert!(refused, "a singular matrix was accepted: {a}");
            },
        }
    }

    /// Strongly scaled random matrices by residual and exact elimination.
    #[test]
    fn scaled_floats_against_exact(seed in any::<u64>(), order in 1usize..12, spread in 0i64..120, bits in 64u32..300) {
        let mut random = Irregular(seed);
        let mut a = random.symmetric(order, bits + 64);
        let scales: Vec<i32> = (0..order).map(|_| random.small(spread) as i32).collect();
        for i in 0..order {
            for j in 0..order {
                a[(i, j)] <<= scales[i] + scales[j];
            }
        }
        let b = random.vector(order, bits);
        check_exact(&a, &b, bits, true);
    }
}
