//! Whole matrix systems: levels, exact against numeric kets, closed forms.

mod degenerate;
mod functions;
mod models;
mod random;
mod singular;

use super::{ExactMatrix, MatrixSystem, WHOLE};
use crate::num::{Effort, Surd};
use crate::systems::{
    Backend, BlockKet, FunctionKind, FunctionOfH, Level, Number, Obstacle, Omitted, RadialOperator, Resolvent, State,
    StateLabel, System,
};
use rug::{Complex, Float, Integer, Rational};
use std::sync::Arc;

fn q(n: i64, d: i64) -> Surd {
    Surd::from(Rational::from((n, d)))
}

fn root(n: i64, d: i64) -> Surd {
    Surd::sqrt_of(&Rational::from((n, d))).expect("small radicand")
}

/// 10^-n
fn tiny(n: u32) -> Rational {
    Rational::from((Integer::from(1), Integer::from(Integer::u_pow_u(10, n))))
}

fn matrix(rows: Vec<Vec<Surd>>) -> ExactMatrix {
    ExactMatrix::from_rows(rows).unwrap_or_else(|fault| panic!("{fault}"))
}

/// The matrix with these entries on and below the diagonal, mirrored.
fn symmetric(order: usize, entry: impl Fn(usize, usize) -> Surd) -> ExactMatrix {
    let value = |i: usize, j: usize| if i >= j { entry(i, j) } else { entry(j, i).conj() };
    matrix((0..order).map(|i| (0..order).map(|j| value(i, j)).collect()).collect())
}

fn system(h: ExactMatrix, operators: Vec<(&str, ExactMatrix)>) -> MatrixSystem {
    let mut all = vec![("H".to_string(), h)];
    all.extend(operators.into_iter().map(|(name, matrix)| (name.to_string(), matrix)));
    MatrixSystem::new(all).unwrap_or_else(|fault| panic!("{fault}"))
}

fn state(system: &MatrixSystem, place: usize) -> State {
    let label = StateLabel { text: place.to_string(), options: Vec::new() };
    system.state(&label, &Effort::new()).unwrap_or_else(|error| panic!("{error}"))
}

fn exact(system: &MatrixSystem) -> Arc<dyn Backend> {
    system.exact(&Effort::new()).expect("matrices have an exact backend")
}

fn numeric(system: &MatrixSystem, bits: u32) -> Arc<dyn Backend> {
    let level = Level { bits, basis: 0 };
    system.numeric(level, &state(system, 0), &Effort::new()).expect("any precision")
}

/// The operator declared at this place, H being number 0.
fn operator(index: i64) -> RadialOperator {
    RadialOperator { kind: "matrix", index }
}

fn ket(backend: &Arc<dyn Backend>, state: &State) -> Result<BlockKet, Obstacle> {
    Ok(backend.state(state)?.remove(0).1)
}

fn energy(system: &MatrixSystem, place: usize) -> Number {
    system.energy(&state(system, place), 128, &Effort::new()).unwrap_or_else(|error| panic!("{error}"))
}

/// First place and number of states of the level of each state.
fn levels(system: &MatrixSystem) -> Vec<(usize, usize)> {
    let mut found = Vec::new();
    let mut place = 0;
    while place < system.order() {
        let level = system.level(place, &Effort::new()).unwrap_or_else(|error| panic!("{error}"));
        found.push((level.first, level.size));
        place = level.first + level.size;
    }
    found
}

fn reduced(system: &MatrixSystem, place: usize) -> Resolvent {
    let z = system.energy(&state(system, place), 1000, &Effort::new()).expect("an energy");
    Resolvent { z, omitted: vec![Omitted::LevelOf(state(system, place))] }
}

/// <a| V R V |b> for the operator number 1.
fn second_order(
    backend: &Arc<dyn Backend>,
    resolvent: &Resolvent,
    bra: &State,
    right: &State,
) -> Result<Number, Obstacle> {
    let (bra, right) = (ket(backend, bra)?, ket(backend, right)?);
    let image = backend.apply(&operator(1), WHOLE, WHOLE, &right)?;
    let solved = backend.resolve(resolvent, WHOLE, &image)?;
    backend.element(&operator(1), WHOLE, WHOLE, &bra, &solved)
}

fn complex(number: &Number, bits: u32) -> Complex {
    number.to_complex(bits)
}

/// Asserts that two numbers agree to so many bits of the larger.
fn assert_close(a: &Number, b: &Number, bits: u32) {
    let (a, b) = (complex(a, bits + 64), complex(b, bits + 64));
    let difference = Complex::with_val(bits + 64, &a - &b).abs().into_real_imag().0;
    let size = a.clone().abs().into_real_imag().0.max(&b.clone().abs().into_real_imag().0);
    assert!(difference <= Float::with_val(64, size >> bits), "{a} and {b} differ before bit {bits}");
}
