//! Resolvents applied to vectors, real and complex, whole and reduced.

use nalgebra::DMatrix;
use proptest::prelude::*;
use rug::{Complex, Float};

use super::{Irregular, cases};
use crate::linalg::eigen::all_eigenpairs;
use crate::linalg::vectors::{exponent_complex, inner};
use crate::linalg::{HermitianMatrix, LinalgError, ShiftedSolver};
use crate::num::Effort;

const BITS: u32 = 213;
const PRECISION: u32 = 320;

fn random_hermitian(random: &mut Irregular, order: usize, complex: bool) -> HermitianMatrix {
    let re = random.symmetric(order, PRECISION);
    let im = complex.then(|| {
        let mut im = DMatrix::from_element(order, order, Float::new(PRECISION));
        for i in 0..order {
            for j in 0..i {
                im[(i, j)] = random.float(PRECISION);
                im[(j, i)] = -im[(i, j)].clone();
            }
        }
        im
    });
    HermitianMatrix::new(re, im).expect("Hermitian")
}

/// Returns the exponent of the largest component of `z x - H x - b`.
fn residual(h: &HermitianMatrix, z: &Complex, x: &[Complex], b: &[Complex]) -> Option<i64> {
    let image = h.apply(x, 2 * PRECISION);
    let rest: Vec<Complex> = (0..x.len())
        .map(|i| {
            let shifted = Complex::with_val(2 * PRECISION, z * &x[i]);
            Complex::with_val(2 * PRECISION, shifted - &image[i]) - &b[i]
        })
        .collect();
    exponent_complex(&rest)
}

#[test]
fn every_kind_of_energy() {
    let effort = Effort::new();
    for complex in [false, true] {
        for (re, im) in [("0.3", "0"), ("-7", "0"), ("0.3", "0.01"), ("0", "2"), ("0.3", "-1e-12")] {
            let mut random = Irregular(5);
            let h = random_hermitian(&mut random, 11, complex);
            let re = Float::with_val(PRECISION, Float::parse(re).expect("a number"));
            let im = Float::with_val(PRECISION, Float::parse(im).expect("a number"));
            let solver = ShiftedSolver::new(&h, (&re, Some(&im)), &[], BITS, &effort).expect("not singular");
            let b = random.ket(11, PRECISION);
            let solved = solver.solve(&b, &effort).expect("solved");
            assert!(solved.holds >= BITS as i32);
            let size = exponent_complex(&solved.ket).expect("not zero").max(0);
            let left = residual(&h, &Complex::with_val(PRECISION, (&re, &im)), &solved.ket, &b).unwrap_or(i64::MIN);
            assert!(left <= size + 6 - i64::from(BITS), "residual 2^{left} for complex {complex}, z = {re} + {im} i");
        }
    }
}

#[test]
fn reduced_resolvent_is_the_spectral_sum() {
    let effort = Effort::new();
    for complex in [false, true] {
        let mut random = Irregular(6);
        let order = 9;
        // A degenerate level: H = U diag(...) U^+ with the eigenvalue 1 three times.
        let seed = random_hermitian(&mut random, order, complex);
        let basis = all_eigenpairs(&seed, PRECISION + 80, &effort).expect("settled").vectors;
        let energies: Vec<i32> = vec![-4, -2, 1, 1, 1, 2, 3, 5, 8];
        let mut sum = vec![vec![Complex::new(PRECISION + 80); order]; order];
        for (energy, v) in energies.iter().zip(&basis) {
            for i in 0..order {
                for j in 0..order {
                    let mut term = Complex::with_val(PRECISION + 80, v[j].conj_ref());
                    term *= &v[i];
                    sum[i][j] += term * *energy;
                }
            }
        }
        let re = DMatrix::from_fn(order, order, |i, j| sum[i.max(j)][i.min(j)].real().clone());
        let im = DMatrix::from_fn(order, order, |i, j| match i.cmp(&j) {
            std::cmp::Ordering::Greater => sum[i][j].imag().clone(),
            std::cmp::Ordering::Equal => Float::new(PRECISION),
            std::cmp::Ordering::Less => -sum[j][i].imag().clone(),
        });
        let h = HermitianMatrix::new(re, complex.then_some(im)).expect("Hermitian");
        let b = random.ket(order, PRECISION);
        let one = Float::with_val(PRECISION, 1);
        for (place, level) in [(-4, 0..1), (1, 2..5), (8, 8..9)] {
            let z = Float::with_val(PRECISION, place);
            let solver =
                ShiftedSolver::new(&h, (&z, None), &basis[level.clone()], BITS, &effort).expect("not singular");
            let solved = solver.solve(&b, &effort).expect("solved");
            let mut expected = vec![Complex::new(PRECISION + 80); order];
            for (k, v) in basis.iter().enumerate().filter(|(k, _)| !level.contains(k)) {
                let weight = inner(v, &b, PRECISION + 80) / (place - energies[k]);
                crate::linalg::vectors::add_multiple(&mut expected, &weight, v);
            }
            let off: Vec<Complex> =
                solved.ket.iter().zip(&expected).map(|(a, b)| Complex::with_val(PRECISION, a - b)).collect();
            let off = exponent_complex(&off).unwrap_or(i64::MIN);
            assert!(off <= 3 - i64::from(BITS), "complex {complex}, level {place}: off by 2^{off}");
        }
        // Nothing left out: the energy is an eigenvalue.
        let error = ShiftedSolver::new(&h, (&one, None), &[], BITS, &effort).err();
        assert!(matches!(error, Some(LinalgError::Singular { .. })), "{error:?}");
        // Only a part of the level left out.
        let error = ShiftedSolver::new(&h, (&one, None), &basis[2..4], BITS, &effort).err();
        assert!(matches!(error, Some(LinalgError::Singular { .. })), "{error:?}");
    }
}

#[test]
fn lengths_are_checked() {
    let effort = Effort::new();
    let h = HermitianMatrix::new(DMatrix::identity_of(2), None).expect("Hermitian");
    let z = Float::with_val(64, 3);
    let short = vec![vec![Complex::with_val(64, 1)]];
    let error = ShiftedSolver::new(&h, (&z, None), &short, 64, &effort).err();
    assert_eq!(error, Some(LinalgError::WrongLength { found: 1, expected: 2 }));
}

/// Makes unit matrices, which nalgebra offers for its own number types only.
trait Identity {
    fn identity_of(order: usize) -> Self;
}

impl Identity for DMatrix<Float> {
    fn identity_of(order: usize) -> Self {
        DMatrix::from_fn(order, order, |i, j| Float::with_val(64, u32::from(i == j)))
    }
}

proptest! {
    #![proptest_config(cases(60))]

    /// Small whole numbers, where leading blocks are often singular: the residual is small or the energy is an
    /// eigenvalue.
    #[test]
    fn whole_numbers_by_residual(
        seed in any::<u64>(), order in 1usize..9, complex: bool, re in -3i32..4, im in -2i32..3
    ) {
        let effort = Effort::new();
        let mut random = Irregular(seed);
        let mut part = |sign: i32| {
            let mut part = DMatrix::from_element(order, order, Float::new(PRECISION));
            for i in 0..order {
                for j in 0..=i {
                    let value = random.small(2) as i32;
                    part[(i, j)] = Float::with_val(PRECISION, if i == j && sign < 0 { 0 } else { value });
                    part[(j, i)] = Float::with_val(PRECISION, sign * part[(i, j)].clone());
                }
            }
            part
        };
        let (h_re, h_im) = (part(1), complex.then(|| part(-1)));
        let h = HermitianMatrix::new(h_re, h_im).expect("Hermitian");
        let z = (Float::with_val(PRECISION, re), Float::with_val(PRECISION, im));
        let b = random.ket(order, PRECISION);
        match ShiftedSolver::new(&h, (&z.0, Some(&z.1)), &[], BITS, &effort) {
            Ok(solver) => {
                let solved = solver.solve(&b, &effort).expect("solved");
                let size = exponent_complex(&solved.ket).expect("not zero").max(0);
                let energy = Complex::with_val(PRECISION, (&z.0, &z.1));
                let left = residual(&h, &energy, &solved.ket, &b).unwrap_or(i64::MIN);
                prop_assert!(left <= size + 8 - i64::from(BITS), "residual 2^{}", left);
            }
            Err(error) => {
                prop_assert!(matches!(error, LinalgError::Singular { .. }), "{}", error);
                prop_assert_eq!(im, 0, "a complex energy is no eigenvalue");
                let values = all_eigenpairs(&h, BITS, &effort).expect("settled").values;
                let nearest = values.iter().filter_map(|v| Float::with_val(64, v - re).get_exp()).min();
                prop_assert!(values.iter().any(|v| *v == re) || nearest.is_some_and(|e| e < 10 - BITS as i32));
            }
        }
    }
}
