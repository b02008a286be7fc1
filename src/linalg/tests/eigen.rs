//! Eigenvalues and eigenvectors.

use nalgebra::DMatrix;
use proptest::prelude::*;
use rug::{Complex, Float};

use super::{Irregular, cases};
use crate::linalg::HermitianMatrix;
use crate::linalg::eigen::{all_eigenpairs, refine_cluster, spectrum_preview};
use crate::linalg::vectors::{exponent_complex, inner};
use crate::num::Effort;

const PRECISION: u32 = 700;

/// Makes a Hermitian matrix with given eigenvalues by turning a diagonal one with random eigenvectors.
fn with_spectrum(values: &[Float], seed: u64, complex: bool) -> HermitianMatrix {
    let order = values.len();
    let mut random = Irregular(seed);
    let mut basis: Vec<Vec<Complex>> = Vec::new();
    while basis.len() < order {
        let mut v: Vec<Complex> = (0..order)
            .map(|_| {
                let im = if complex { random.float(PRECISION) } else { Float::new(PRECISION) };
                Complex::with_val(PRECISION, (random.float(PRECISION), im))
            })
            .collect();
        for _ in 0..3 {
            for known in &basis {
                let component = -inner(known, &v, PRECISION);
                crate::linalg::vectors::add_multiple(&mut v, &component, known);
            }
        }
        let length = crate::linalg::vectors::norm(&v, PRECISION);
        crate::linalg::vectors::divide(&mut v, &length);
        basis.push(v);
    }
    let entry = |i: usize, j: usize| {
        let mut sum = Complex::new(PRECISION);
        for (value, v) in values.iter().zip(&basis) {
            sum += Complex::with_val(PRECISION, v[j].conj_ref()) * &v[i] * value;
        }
        sum
    };
    let lower: Vec<Vec<Complex>> = (0..order).map(|i| (0..=i).map(|j| entry(i, j)).collect()).collect();
    let re = DMatrix::from_fn(order, order, |i, j| lower[i.max(j)][i.min(j)].real().clone());
    let im = DMatrix::from_fn(order, order, |i, j| match i.cmp(&j) {
        std::cmp::Ordering::Greater => lower[i][j].imag().clone(),
        std::cmp::Ordering::Equal => Float::new(PRECISION),
        std::cmp::Ordering::Less => -lower[j][i].imag().clone(),
    });
    HermitianMatrix::new(re, complex.then_some(im)).expect("Hermitian")
}

/// Returns the exponent of the largest component of `H v - value v`.
fn residual(h: &HermitianMatrix, value: &Float, v: &[Complex]) -> i64 {
    let image = h.apply(v, PRECISION);
    let rest: Vec<Complex> = image.iter().zip(v).map(|(a, v)| a - Complex::with_val(PRECISION, v * value)).collect();
    exponent_complex(&rest).unwrap_or(i64::MIN)
}

fn check_orthonormal(vectors: &[Vec<Complex>], bits: u32) {
    for (i, a) in vectors.iter().enumerate() {
        for (j, b) in vectors.iter().enumerate() {
            let off = inner(a, b, PRECISION) - u32::from(i == j);
            let size = exponent_complex(&[off]).unwrap_or(i64::MIN);
            assert!(size <= -i64::from(bits), "<{i}|{j}> is off by 2^{size}");
        }
    }
}

fn numbers(texts: &[&str]) -> Vec<Float> {
    texts.iter().map(|t| Float::with_val(PRECISION, Float::parse(t).expect("a number"))).collect()
}

#[test]
fn all_pairs_of_known_spectra() {
    let effort = Effort::new();
    let values = numbers(&["-3", "-1.5", "-1.5", "0", "0", "0", "2", "2.0000000001", "7"]);
    for complex in [false, true] {
        let h = with_spectrum(&values, 3, complex);
        let pairs = all_eigenpairs(&h, 213, &effort).expect("settled");
        check_orthonormal(&pairs.vectors, 213);
        for ((found, v), expected) in pairs.values.iter().zip(&pairs.vectors).zip(&values) {
            let off = Float::with_val(PRECISION, found - expected).get_exp().unwrap_or(i32::MIN);
            assert!(off <= 3 - 213, "{found} for {expected}");
            assert!(residual(&h, found, v) <= 3 - 213);
        }
    }
}

#[test]
fn all_pairs_of_diagonal_and_tiny_matrices() {
    let effort = Effort::new();
    let diagonal = DMatrix::from_fn(4, 4, |i, j| Float::with_val(100, if i == j { 5 - i as i32 } else { 0 }));
    let pairs =
        all_eigenpairs(&HermitianMatrix::new(diagonal, None).expect("Hermitian"), 64, &effort).expect("settled");
    assert_eq!(pairs.values, [2, 3, 4, 5]);
    for order in [0, 1] {
        let zero = DMatrix::from_element(order, order, Float::new(64));
        let pairs =
            all_eigenpairs(&HermitianMatrix::new(zero, None).expect("Hermitian"), 64, &effort).expect("settled");
        assert_eq!(pairs.values.len(), order);
    }
}

#[test]
fn preview_sees_each_value_once() {
    let values = numbers(&["-3e500", "-1e500", "-1e500", "2e500", "4e500"]);
    for complex in [false, true] {
        let h = with_spectrum(&values, 8, complex);
        let preview = spectrum_preview(&h, &Effort::new()).expect("not stopped").expect("settled");
        assert_eq!(preview.values.len(), 5);
        for (k, expected) in values.iter().enumerate() {
            let ratio = preview.value(k).expect("there") / expected;
            assert!((ratio.to_f64() - 1.0).abs() < 1e-13);
        }
        assert_eq!(preview.cluster(1, 1), 1..3);
        assert_eq!(preview.cluster(0, 0), 0..1);
    }
}

#[test]
fn values_that_machine_numbers_confuse() {
    let effort = Effort::new();
    let mut texts = vec!["-9", "-8", "-7", "-6", "-5", "-4", "-3", "3", "4", "5", "6"];
    texts.extend([
        "1",
        "1",
        "1.0000000000000000000000000000000000000000000000000000000000001",
        "1.0000000000000000000000000000003",
    ]);
    let mut values = numbers(&texts);
    values.sort_by(Float::total_cmp);
    for complex in [false, true] {
        let h = with_spectrum(&values, 9, complex);
        let cluster = refine_cluster(&h, 8..9, 213, &effort).expect("settled");
        assert_eq!((cluster.first, cluster.values.len()), (7, 4));
        assert_eq!(cluster.levels, [0..2, 2..3, 3..4]);
        assert_eq!(cluster.level_of(8), Some(0..2));
        check_orthonormal(&cluster.vectors, 213);
        let gap = cluster.gap.as_ref().expect("others outside").to_f64();
        assert!((gap - 2.0).abs() < 1e-10);
        // Vectors of the nearest levels are still good to the wanted bits: the residual is below their distance by as
        // much.
        for (k, v) in cluster.vectors.iter().enumerate() {
            let left = residual(&h, &values[7 + k], v);
            assert!(left <= -200 - 213 + 10, "vector {k}: residual 2^{left}");
        }
    }
}

#[test]
fn single_values_of_a_random_matrix() {
    let effort = Effort::new();
    let mut random = Irregular(12);
    let h = HermitianMatrix::new(random.symmetric(40, 300), None).expect("Hermitian");
    let all = all_eigenpairs(&h, 230, &effort).expect("settled");
    for k in [0, 17, 39] {
        let cluster = refine_cluster(&h, k..k + 1, 213, &effort).expect("settled");
        assert_eq!((cluster.first, cluster.values.len()), (k, 1));
        let off = Float::with_val(300, &cluster.values[0] - &all.values[k]).get_exp().unwrap_or(i32::MIN);
        assert!(off <= 4 - 213);
        let overlap = inner(&cluster.vectors[0], &all.vectors[k], 300);
        let off = Float::with_val(300, overlap.real().clone().abs() - 1u32).get_exp().unwrap_or(i32::MIN);
        assert!(off <= 4 - 213);
        assert!(cluster.vectors[0].iter().all(|c| c.imag().is_zero()));
    }
}

#[test]
fn spread_beyond_machine_numbers() {
    let effort = Effort::new();
    let values = numbers(&["-1e400", "1e-40", "1", "1e60", "2e400"]);
    let diagonal = DMatrix::from_fn(5, 5, |i, j| if i == j { values[i].clone() } else { Float::new(PRECISION) });
    let h = HermitianMatrix::new(diagonal, None).expect("Hermitian");
    let cluster = refine_cluster(&h, 2..3, 1600, &effort).expect("settled");
    let place = 2 - cluster.first;
    assert_eq!(cluster.level_of(2), Some(place..place + 1));
    let off = Float::with_val(PRECISION, &cluster.values[place] - &values[2]).get_exp().unwrap_or(i32::MIN);
    assert!(off < -200, "off by 2^{off}");
}

#[test]
fn integers_on_the_diagonal() {
    // An eigenvalue that is a machine number exactly.
    let effort = Effort::new();
    let h = DMatrix::from_fn(8, 8, |i, j| Float::with_val(300, if i == j { i as i32 - 3 } else { 0 }));
    let h = HermitianMatrix::new(h, None).expect("Hermitian");
    for k in 0..8 {
        let cluster = refine_cluster(&h, k..k + 1, 213, &effort).expect("settled");
        assert!(Float::with_val(64, &cluster.values[0] - (k as i32 - 3)).get_exp().is_none_or(|e| e < -213));
    }
}

proptest! {
    #![proptest_config(cases(12))]

    /// Spectra with levels of any multiplicity and distances down to 2^-190, complex or real.
    #[test]
    fn random_spectra(seed in any::<u64>(), order in 2usize..10, complex: bool) {
        let effort = Effort::new();
        let mut random = Irregular(seed);
        let mut values: Vec<Float> = Vec::new();
        while values.len() < order {
            let step = match (values.is_empty(), random.next() % 4) {
                (true, _) | (_, 0) => Float::with_val(PRECISION, 1 + random.small(1)),
                (_, 1) => Float::new(PRECISION),
                _ => Float::with_val(PRECISION, 1) >> (random.next() % 190) as u32,
            };
            let last = values.last().cloned().unwrap_or_else(|| Float::with_val(PRECISION, random.small(3)));
            values.push(last + step);
        }
        let h = with_spectrum(&values, seed, complex);
        for k in 0..order {
            let cluster = refine_cluster(&h, k..k + 1, 213, &effort).expect("settled");
            check_orthonormal(&cluster.vectors, 213);
            for (i, (value, v)) in cluster.values.iter().zip(&cluster.vectors).enumerate() {
                let off = Float::with_val(PRECISION, value - &values[cluster.first + i]).get_exp().unwrap_or(i32::MIN);
                prop_assert!(off <= 6 - 213, "value {} off by 2^{}", i, off);
                prop_assert!(residual(&h, value, v) <= 6 - 213);
            }
            let level = cluster.level_of(k).expect("in the cluster");
            let equal = values.iter().filter(|v| **v == values[k]).count();
            prop_assert_eq!(level.len(), equal);
        }
    }
}
