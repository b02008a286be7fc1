//! Functions of H against closed forms.

use super::*;

fn function(kind: FunctionKind, constant: Surd, slope: Surd) -> FunctionOfH {
    FunctionOfH {
        kind,
        constant: Number::Exact(constant),
        slope: Number::Exact(slope),
        omitted: Vec::new(),
        adjoint: false,
    }
}

/// <e_0| f(a + b H) |e_1> for H = [[1, 1], [1, 1]] (energies 0 and 2) and a third state by itself with energy 4; V = H with a 1 in place of 0.
fn model() -> (MatrixSystem, State) {
    let h =
        matrix(vec![vec![q(1, 1), q(1, 1), q(0, 1)], vec![q(1, 1), q(1, 1), q(0, 1)], vec![q(0, 1), q(0, 1), q(4, 1)]]);
    let m = system(h, vec![]);
    let top = state(&m, 1);
    (m, top)
}

fn value(kind: FunctionKind, constant: Surd, slope: Surd, place: usize) -> Result<Number, Obstacle> {
    let (m, _) = model();
    let backend = numeric(&m, 192);
    let ket = ket(&backend, &state(&m, place))?;
    let image = backend.function(&function(kind, constant, slope), WHOLE, &ket)?;
    backend.overlap(WHOLE, &ket, &image)
}

fn real(x: Float) -> Number {
    Number::Approx(Complex::with_val(256, (x, 0)))
}

#[test]
fn exponentials_roots_and_logarithms() {
    let number = |n: i64| Float::with_val(256, n);
    assert_close(&value(FunctionKind::Exp, q(0, 1), q(-1, 1), 1).expect("a number"), &real(number(-2).exp()), 180);
    assert_close(&value(FunctionKind::Sqrt, q(1, 1), q(1, 1), 1).expect("a number"), &real(number(3).sqrt()), 180);
    assert_close(&value(FunctionKind::Ln, q(3, 1), q(1, 1), 2).expect("a number"), &real(number(7).ln()), 180);
    // On the cut: the values from above.
    let pi = Float::with_val(256, rug::float::Constant::Pi);
    let logarithm = Number::Approx(Complex::with_val(256, (number(5).ln(), pi)));
    assert_close(&value(FunctionKind::Ln, q(-1, 1), q(-1, 1), 2).expect("a number"), &logarithm, 180);
    let imaginary = Number::Approx(Complex::with_val(256, (0, number(2).sqrt())));
    assert_close(&value(FunctionKind::Sqrt, q(0, 1), q(-1, 1), 1).expect("a number"), &imaginary, 180);
}

#[test]
fn the_adjoint_on_the_cut() {
    // (ln(-1 - H))^+ on the state with energy 4: ln 5 - i pi
    let (m, _) = model();
    let backend = numeric(&m, 192);
    let top = ket(&backend, &state(&m, 2)).expect("numbers");
    let adjoint = FunctionOfH { adjoint: true, ..function(FunctionKind::Ln, q(-1, 1), q(-1, 1)) };
    let image = backend.function(&adjoint, WHOLE, &top).expect("numbers");
    let pi = Float::with_val(256, rug::float::Constant::Pi);
    let expected = Number::Approx(Complex::with_val(256, (Float::with_val(256, 5).ln(), -pi)));
    assert_close(&backend.overlap(WHOLE, &top, &image).expect("a number"), &expected, 180);
}

#[test]
fn the_root_of_a_level_at_zero_is_zero() {
    let (m, _) = model();
    let backend = numeric(&m, 192);
    let ground = ket(&backend, &state(&m, 0)).expect("numbers");
    let image = backend.function(&function(FunctionKind::Sqrt, q(0, 1), q(1, 1)), WHOLE, &ground).expect("numbers");
    let size = complex(&backend.overlap(WHOLE, &image, &image).expect("a number"), 64).abs().into_real_imag().0;
    assert!(size < 1e-100, "{size}");
    let refused = value(FunctionKind::Ln, q(0, 1), q(1, 1), 0);
    assert!(matches!(refused, Err(Obstacle::Refused { .. })), "{refused:?}");
    // The state with energy 4 is not reached by the level at zero.
    assert_close(
        &value(FunctionKind::Ln, q(0, 1), q(1, 1), 2).expect("a number"),
        &real(Float::with_val(256, 4).ln()),
        180,
    );
}

#[test]
fn levels_left_out_and_values_too_large() {
    let (m, top) = model();
    let backend = numeric(&m, 192);
    let ground = ket(&backend, &state(&m, 0)).expect("numbers");
    let logarithm =
        FunctionOfH { omitted: vec![Omitted::LevelOf(state(&m, 0))], ..function(FunctionKind::Ln, q(0, 1), q(1, 1)) };
    let image = backend.function(&logarithm, WHOLE, &ground).expect("left out");
    let overlap = complex(&backend.overlap(WHOLE, &ground, &image).expect("a number"), 64);
    assert!(overlap.abs().into_real_imag().0 < 1e-50);
    let upper = ket(&backend, &top).expect("numbers");
    let huge = function(FunctionKind::Exp, q(0, 1), Surd::from(Rational::from(Integer::from(1) << 70u32)));
    assert!(matches!(backend.function(&huge, WHOLE, &upper), Err(Obstacle::Refused { .. })));
}
