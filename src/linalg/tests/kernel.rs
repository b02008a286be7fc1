//! The fixed-point kernels beside elimination on multi-precision floats, which shares no code with them.

use nalgebra::DMatrix;
use rug::Float;

use super::Irregular;
use crate::linalg::equilibrate::Equilibration;
use crate::linalg::factor::{Balanced, Factorisation, Failure};
use crate::linalg::kernel;
use crate::linalg::plain::PlainLu;
use crate::linalg::source::Source;
use crate::linalg::{Solver, threads};
use crate::num::Effort;

fn made(result: Result<(Box<dyn Factorisation>, u32), Failure>) -> (Box<dyn Factorisation>, u32) {
    match result {
        Ok(made) => made,
        Err(Failure::Growth) => panic!("growth"),
        Err(Failure::NoPivot) => panic!("no pivot"),
        Err(Failure::Error(error)) => panic!("{error}"),
    }
}

/// Returns the bits in common of two solutions, relative to the largest component.
fn common_bits(a: &[Float], b: &[Float]) -> i64 {
    let off = a.iter().zip(b).filter_map(|(a, b)| Float::with_val(2000, a - b).get_exp()).max();
    let size = b.iter().filter_map(Float::get_exp).max().unwrap_or(0);
    off.map_or(2000, |off| i64::from(size - off))
}

#[test]
fn every_count_of_limbs_against_plain_elimination() {
    let effort = Effort::new();
    for precision in [50, 70, 71, 72, 130, 131, 200, 250, 310, 370, 430, 550, 670, 900, 1000] {
        for order in [1, 2, 23, 24, 25, 31, 32, 33, 50] {
            let mut random = Irregular(u64::from(precision) + order as u64);
            let mut a = random.symmetric(order, precision + 100);
            for i in 0..order {
                // Definite, or with signs that alternate, so that no pivot is small.
                a[(i, i)] += if i % 3 == 1 && order > 24 { -2 * order as i32 } else { 2 * order as i32 };
            }
            let source = Source::Whole(a);
            let scale = Equilibration::symmetric(&source).expect("no zero row");
            let balanced = Balanced { source: &source, scale: &scale };
            let b: Vec<Float> = (0..order).map(|_| random.float(precision)).collect();
            let reference = made(
                PlainLu::new(balanced, precision + 100, &effort).map(|lu| (Box::new(lu) as Box<dyn Factorisation>, 0)),
            );
            let reference = reference.0.solve(&b, &effort).expect("not stopped");
            for pivoted in [false, true] {
                let (factors, used) = made(kernel::factorise(balanced, None, precision, pivoted, &effort));
                assert!(used >= precision);
                let x = factors.solve(&b, &effort).expect("not stopped");
                let common = common_bits(&x, &reference);
                assert!(common >= i64::from(used) - 14, "{common} of {used} bits, order {order}, pivoted {pivoted}");
            }
        }
    }
}

#[test]
fn the_number_of_threads_changes_no_bit() {
    let effort = Effort::new();
    let mut random = Irregular(99);
    let a = random.symmetric(150, 260);
    let b = random.vector(150, 260);
    for make in [Solver::symmetric, Solver::general] {
        let solutions: Vec<_> = [1, 2, 3, 7]
            .into_iter()
            .map(|count| {
                threads::set(count);
                make(a.clone(), 160, &effort).expect("not singular").solve(&b, &effort).expect("solved").x
            })
            .collect();
        assert!(solutions.windows(2).all(|pair| pair[0] == pair[1]));
    }
    threads::set(0);
}

#[test]
fn growth_of_pivoted_elimination() {
    // Wilkinson's matrix: ones on the diagonal and in the last column, -1 below; U grows to 2^(order - 1).
    let effort = Effort::new();
    let order = 100;
    let a = DMatrix::from_fn(order, order, |i, j| {
        Float::with_val(
            400,
            if i == j || j == order - 1 {
                1
            } else if i > j {
                -1
            } else {
                0
            },
        )
    });
    let mut random = Irregular(7);
    let b = random.vector(order, 300);
    let solver = Solver::general(a.clone(), 213, &effort).expect("not singular");
    let solved = solver.solve(&b, &effort).expect("solved");
    assert!(solved.holds >= 213);
    for i in 0..order {
        let mut sum = Float::with_val(600, &b[i]);
        for j in 0..order {
            sum -= Float::with_val(600, &a[(i, j)] * &solved.x[j]);
        }
        assert!(sum.get_exp().is_none_or(|e| e < -205), "residual {sum}");
    }
}

#[test]
fn an_answer_does_not_depend_on_earlier_ones() {
    let effort = Effort::new();
    let mut random = Irregular(17);
    let a = random.symmetric(40, 300);
    let (b, c) = (random.vector(40, 300), random.vector(40, 300));
    let first = Solver::symmetric(a.clone(), 213, &effort).expect("not singular");
    let second = Solver::symmetric(a, 213, &effort).expect("not singular");
    let fresh = first.solve(&b, &effort).expect("solved").x;
    second.solve(&c, &effort).expect("solved");
    assert_eq!(second.solve(&b, &effort).expect("solved").x, fresh);
}
