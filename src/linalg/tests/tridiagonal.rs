//! Tridiagonal and bordered systems.

use proptest::prelude::*;
use rug::{Complex, Float, Rational};

use super::{Irregular, cases, exact};
use crate::linalg::LinalgError;
use crate::linalg::tridiagonal::{Bordered, Factored, Inertia, Scalar, Tridiagonal};
use crate::num::Effort;

/// Writes a bordered tridiagonal matrix in full.
fn dense(t: &Tridiagonal<Rational>, border: &[Vec<Rational>]) -> Vec<Vec<Rational>> {
    let (order, count) = (t.order(), border.len());
    let mut rows = vec![vec![Rational::new(); order + count]; order + count];
    for i in 0..order {
        rows[i][i] = t.diagonal()[i].clone();
        if i + 1 < order {
            rows[i][i + 1] = t.off()[i].clone();
            rows[i + 1][i] = t.off()[i].clone();
        }
        for (k, row) in border.iter().enumerate() {
            rows[order + k][i] = row[i].clone();
            rows[i][order + k] = row[i].clone();
        }
    }
    rows
}

fn rationals(values: &[i32]) -> Vec<Rational> {
    values.iter().map(|&v| Rational::from(v)).collect()
}

fn floats(values: &[Rational], precision: u32) -> Vec<Float> {
    values.iter().map(|v| Float::with_val(precision, v)).collect()
}

fn as_floats(t: &Tridiagonal<Rational>, precision: u32) -> Tridiagonal<Float> {
    Tridiagonal::new(floats(t.diagonal(), precision), floats(t.off(), precision)).expect("shape")
}

#[test]
fn zero_diagonal_needs_pivots_of_order_two() {
    let effort = Effort::new();
    let t = Tridiagonal::new(rationals(&[0; 6]), rationals(&[1, 2, 3, 4, 5])).expect("shape");
    let b = rationals(&[1, -1, 2, 0, 3, 1]);
    let x = Factored::new(&t, &effort).expect("not singular").solve(&b).expect("length");
    assert_eq!(t.apply(&x), b);
    assert_eq!(t.inertia(&effort).expect("not stopped"), Inertia { negative: 3, zero: 0, positive: 3 });
    // Odd order: one eigenvalue is zero.
    let t = Tridiagonal::new(rationals(&[0; 5]), rationals(&[1, 2, 3, 4])).expect("shape");
    assert_eq!(Factored::new(&t, &effort).err(), Some(LinalgError::NoPivot { row: 4 }));
    assert_eq!(t.inertia(&effort).expect("not stopped"), Inertia { negative: 2, zero: 1, positive: 2 });
}

#[test]
fn count_of_eigenvalues_below_a_number() {
    // The eigenvalues of the chain with 2 on the diagonal and -1 beside it are 2 - 2 cos(k pi/(n+1)).
    let effort = Effort::new();
    let n = 30;
    for tenths in 0..40 {
        let z = Rational::from((tenths * 10 + 3, 100));
        let diagonal = vec![Rational::from(2) - &z; n];
        let t = Tridiagonal::new(diagonal, vec![Rational::from(-1); n - 1]).expect("shape");
        let below = (1..=n)
            .filter(|&k| 2.0 - 2.0 * (k as f64 * std::f64::consts::PI / (n as f64 + 1.0)).cos() < z.to_f64())
            .count();
        assert_eq!(t.inertia(&effort).expect("not stopped").negative, below);
        assert_eq!(as_floats(&t, 100).inertia(&effort).expect("not stopped").negative, below);
    }
}

#[test]
fn complex_energies() {
    let effort = Effort::new();
    let mut random = Irregular(4);
    let n = 50;
    let diagonal: Vec<Complex> = (0..n).map(|_| Complex::with_val(300, (random.float(300), 0.001))).collect();
    let off: Vec<Complex> = (1..n).map(|_| Complex::with_val(300, random.float(300))).collect();
    let t = Tridiagonal::new(diagonal, off).expect("shape");
    let b = random.ket(n, 300);
    let x = Factored::new(&t, &effort).expect("not singular").solve(&b).expect("length");
    for (left, right) in t.apply(&x).iter().zip(&b) {
        let off = Complex::with_val(300, left - right).size().unwrap_or(i64::MIN);
        assert!(off < -270, "off by 2^{off}");
    }
}

#[test]
fn singular_part_in_a_border() {
    // T has the eigenvector (1, 1, ..., 1) at zero: the second difference with free ends.
    let effort = Effort::new();
    let n = 12;
    let mut diagonal = vec![Rational::from(2); n];
    diagonal[0] = Rational::from(1);
    diagonal[n - 1] = Rational::from(1);
    let t = Tridiagonal::new(diagonal, vec![Rational::from(-1); n - 1]).expect("shape");
    assert!(Factored::new(&t, &effort).is_err());
    let border = vec![vec![Rational::from(1); n]];
    let b: Vec<Rational> = (0..n).map(|i| Rational::from((i as i32 * i as i32 - 7, 3))).collect();
    let bordered = Bordered::new(&t, &border, &effort).expect("not singular");
    assert_eq!(bordered.moved(), 1);
    let solution = bordered.solve(&b, &[Rational::from(2)]).expect("length");
    let full: Vec<Rational> = b.iter().cloned().chain([Rational::from(2)]).collect();
    let expected = exact::solve(&dense(&t, &border), &full).expect("not singular");
    assert_eq!(solution.x, expected[..n]);
    assert_eq!(solution.multipliers, expected[n..]);
    // The same in floats, where thirds spoil the exact zero of the last pivot.
    let scaled: Vec<Rational> = t.diagonal().iter().map(|x| Rational::from(x / 3u32)).collect();
    let scaled_off: Vec<Rational> = t.off().iter().map(|x| Rational::from(x / 3u32)).collect();
    let thirds = Tridiagonal::new(scaled, scaled_off).expect("shape");
    assert_eq!(Factored::new(&as_floats(&thirds, 200), &effort).err(), Some(LinalgError::NoPivot { row: n - 1 }));
    let border_floats = vec![floats(&border[0], 200)];
    let bordered = Bordered::new(&as_floats(&thirds, 200), &border_floats, &effort).expect("not singular");
    let solution = bordered.solve(&floats(&b, 200), &floats(&[Rational::from(2)], 200)).expect("length");
    let expected = exact::solve(&dense(&thirds, &border), &full).expect("not singular");
    for (x, e) in solution.x.iter().zip(&expected) {
        let off = Float::with_val(200, x - Float::with_val(200, e)).get_exp().unwrap_or(i32::MIN);
        assert!(off < -165, "off by 2^{off}");
    }
}

#[test]
fn decoupled_zero_row_in_a_border() {
    // The first basis function is an eigenvector by itself.
    let effort = Effort::new();
    let t = Tridiagonal::new(rationals(&[0, 3, 1, 4]), rationals(&[0, 1, 2])).expect("shape");
    let border = vec![rationals(&[1, 0, 0, 0])];
    let b = rationals(&[5, 1, -2, 7]);
    let solution =
        Bordered::new(&t, &border, &effort).expect("not singular").solve(&b, &rationals(&[0])).expect("length");
    assert_eq!(solution.x[0], 0);
    assert_eq!(solution.multipliers[0], 5);
    assert_eq!(t.apply(&solution.x)[1..], b[1..]);
    // Without the right border it stays singular.
    let wrong = vec![rationals(&[0, 1, 0, 0])];
    assert!(matches!(Bordered::new(&t, &wrong, &effort), Err(LinalgError::NoPivot { .. })));
}

#[test]
fn shapes_are_checked() {
    assert!(Tridiagonal::new(rationals(&[1, 2]), rationals(&[])).is_err());
    assert!(Tridiagonal::new(rationals(&[]), rationals(&[])).is_ok());
    let t = Tridiagonal::new(rationals(&[1, 2]), rationals(&[1])).expect("shape");
    let factored = Factored::new(&t, &Effort::new()).expect("not singular");
    assert_eq!(factored.solve(&rationals(&[1])).err(), Some(LinalgError::WrongLength { found: 1, expected: 2 }));
    assert!(Bordered::new(&t, &[rationals(&[1])], &Effort::new()).is_err());
}

#[test]
fn noise_goes_through_a_pivot_of_order_two() {
    // Thirds leave a pivot that should be zero at 2^-198; the pivot of order 2 that covers it hands it on to a later
    // row.
    let effort = Effort::new();
    let t = Tridiagonal::new(rationals(&[1, 3, -1, -3, -1, 0, 3, 0, -1]), rationals(&[-3, -2, -1, -1, -3, 0, 3, 0]));
    let t = t.expect("shape");
    let border = vec![rationals(&[-1, -1, 1, 3, 2, 0, 0, -1, 0])];
    let full = rationals(&[1, 2, -3, 1, 0, 2, 1, 1, -1, 2]);
    let expected = exact::solve(&dense(&t, &border), &full).expect("not singular");
    let bordered = Bordered::new(&as_floats(&t, 200), &[floats(&border[0], 200)], &effort).expect("not singular");
    assert_eq!(bordered.moved(), 1);
    let solution = bordered.solve(&floats(&full[..9], 200), &floats(&full[9..], 200)).expect("length");
    for (x, e) in solution.x.iter().zip(&expected) {
        let off = Float::with_val(200, x - Float::with_val(200, e)).get_exp().unwrap_or(i32::MIN);
        assert!(off < -180, "off by 2^{off}");
    }
}

proptest! {
    #![proptest_config(cases(200))]

    /// Small whole numbers with many zeros against exact elimination, with and without borders.
    #[test]
    fn whole_numbers_against_exact(seed in any::<u64>(), order in 1usize..10, count in 0usize..3, bound in 1i64..4) {
        let effort = Effort::new();
        let mut random = Irregular(seed);
        let mut draw = |n: usize| -> Vec<Rational> { (0..n).map(|_| Rational::from(random.small(bound))).collect() };
        let t = Tridiagonal::new(draw(order), draw(order - 1)).expect("shape");
        let border: Vec<Vec<Rational>> = (0..count).map(|_| draw(order)).collect();
        let (b, c) = (draw(order), draw(count));
        let full: Vec<Rational> = b.iter().chain(&c).cloned().collect();
        let expected = exact::solve(&dense(&t, &border), &full);
        match (Bordered::new(&t, &border, &effort), &expected) {
            (Ok(bordered), Some(expected)) => {
                let solution = bordered.solve(&b, &c).expect("length");
                prop_assert_eq!(&solution.x[..], &expected[..order]);
                prop_assert_eq!(&solution.multipliers[..], &expected[order..]);
                let floating: Vec<Vec<Float>> = border.iter().map(|row| floats(row, 200)).collect();
                let bordered = Bordered::new(&as_floats(&t, 200), &floating, &effort).expect("not singular");
                let solution = bordered.solve(&floats(&b, 200), &floats(&c, 200)).expect("length");
                for (x, e) in solution.x.iter().chain(&solution.multipliers).zip(expected) {
                    let off = Float::with_val(200, x - Float::with_val(200, e)).get_exp().unwrap_or(i32::MIN);
                    prop_assert!(off < -120, "off by 2^{}", off);
                }
            }
            (Err(_), None) => {}
            (Ok(_), None) => prop_assert!(false, "a singular matrix was factored"),
            (Err(error), Some(_)) => prop_assert!(false, "refused: {}", error),
        }
        if let (Ok(factored), 0) = (Factored::new(&t, &effort), count) {
            prop_assert_eq!(t.apply(&factored.solve(&b).expect("length")), b);
        }
    }

    /// Graded entries: the residual stays small beside each row's own terms.
    #[test]
    fn graded_floats_by_residual(seed in any::<u64>(), order in 2usize..60, step in -12i32..12) {
        let mut random = Irregular(seed);
        let diagonal: Vec<Float> = (0..order).map(|i| random.float(200) << (step * i as i32)).collect();
        let off: Vec<Float> = (1..order).map(|i| random.float(200) << (step * i as i32)).collect();
        let t = Tridiagonal::new(diagonal, off).expect("shape");
        let b: Vec<Float> = (0..order).map(|_| random.float(200)).collect();
        let Ok(factored) = Factored::new(&t, &Effort::new()) else { return Ok(()) };
        let x = factored.solve(&b).expect("length");
        let size = x.iter().chain(&b).filter_map(Float::get_exp).max().unwrap_or(0);
        let entries = t.diagonal().iter().chain(t.off()).filter_map(Float::get_exp).max().unwrap_or(0).max(0);
        for (left, right) in t.apply(&x).iter().zip(&b) {
            let off = Float::with_val(200, left - right).get_exp().unwrap_or(i32::MIN);
            prop_assert!(off <= size + entries - 170, "residual 2^{} beside 2^{}", off, size + entries);
        }
    }
}
