//! The shortest way to evaluate a chain with a backend.

use super::super::Hydrogenic;
use crate::num::{Effort, Surd};
use crate::systems::{
    Atom, Backend, BlockKet, Manifold, Number, Obstacle, Omitted, Resolvent, Sector, State, StateLabel, System,
};
use rug::Rational;
use std::collections::BTreeMap;

#[derive(Clone, Debug)]
pub(super) enum Step {
    Operator(Atom),
    Resolvent(Resolvent),
}

pub(super) fn hydrogen() -> Hydrogenic {
    Hydrogenic::new(Rational::from(1), None).expect("hydrogen")
}

pub(super) fn rational(n: i64, d: i64) -> Rational {
    Rational::from((n, d))
}

pub(super) fn exact(n: i64, d: i64) -> Number {
    Number::Exact(Surd::from(rational(n, d)))
}

pub(super) fn label(text: &str, m: i64) -> StateLabel {
    StateLabel { text: text.into(), options: vec![("m".into(), Rational::from(m))] }
}

pub(super) fn state(atom: &Hydrogenic, text: &str, m: i64) -> State {
    atom.state(&label(text, m), &Effort::new()).expect("a state")
}

pub(super) fn manifold(atom: &Hydrogenic, text: &str) -> Manifold {
    let label = StateLabel { text: text.into(), options: vec![] };
    atom.manifold(&label, &Effort::new()).expect("a manifold")
}

/// An operator from a short text: `D_z`, `r^-3`, `C(2)_0`, `delta(r)`.
pub(super) fn operator(text: &str) -> Atom {
    let (rest, power) = match text.rsplit_once('^') {
        Some((rest, power)) => (rest, power.parse().expect("a power")),
        None => (text, 1),
    };
    let named = ["mass_velocity", "spin_orbit"].contains(&rest);
    let (rest, component) = match rest.split_once('_').filter(|_| !named) {
        Some((rest, component)) => (rest, Some(component.to_string())),
        None => (rest, None),
    };
    let (name, arguments) = match rest.strip_prefix("C(").and_then(|r| r.strip_suffix(')')) {
        Some(k) => ("C".to_string(), vec![Rational::from(k.parse::<i64>().expect("a rank"))]),
        None => (rest.to_string(), vec![]),
    };
    Atom { name, component, arguments, power }
}

/// Operators side by side.
pub(super) fn operators(text: &str) -> Vec<Step> {
    text.split_whitespace().map(|one| Step::Operator(operator(one))).collect()
}

/// 1/(E(state) - H)'.
pub(super) fn reduced(atom: &Hydrogenic, state: &State) -> Step {
    let z = atom.energy(state, 64, &Effort::new()).expect("an energy");
    Step::Resolvent(Resolvent { z, omitted: vec![Omitted::LevelOf(state.clone())] })
}

/// 1/(z - H).
pub(super) fn full(z: Number) -> Step {
    Step::Resolvent(Resolvent { z, omitted: vec![] })
}

/// The steps, with `Q` for the given resolvent: `D_z Q D_z`.
pub(super) fn chain(text: &str, q: &Step) -> Vec<Step> {
    text.split_whitespace().map(|one| if one == "Q" { q.clone() } else { Step::Operator(operator(one)) }).collect()
}

/// A ket in all its sectors.
pub(super) type Ket = BTreeMap<Sector, BlockKet>;

pub(super) fn start(backend: &dyn Backend, state: &State) -> Result<Ket, Obstacle> {
    Ok(backend.state(state)?.into_iter().collect())
}

pub(super) fn act(atom: &Hydrogenic, backend: &dyn Backend, step: &Step, ket: &Ket) -> Result<Ket, Obstacle> {
    let mut parts: BTreeMap<Sector, Vec<(Number, BlockKet)>> = BTreeMap::new();
    for (&sector, part) in ket {
        match step {
            Step::Resolvent(resolvent) => {
                let solved = backend.resolve(resolvent, sector, part)?;
                parts.entry(sector).or_default().push((Number::Exact(Surd::one()), solved));
            }
            Step::Operator(operator) => {
                for coupling in atom.couple(operator, sector) {
                    let moved = backend.apply(&coupling.radial, sector, coupling.to, part)?;
                    parts.entry(coupling.to).or_default().push((Number::Exact(coupling.factor), moved));
                }
            }
        }
    }
    parts.into_iter().map(|(sector, terms)| Ok((sector, backend.combine(sector, &terms)?))).collect()
}

/// <bra|steps|ket>: the operator in the middle as a matrix element, whichever the backend can do.
pub(super) fn value(
    atom: &Hydrogenic,
    backend: &dyn Backend,
    bra: &State,
    steps: &[Step],
    ket: &State,
) -> Result<Number, Obstacle> {
    let middles: Vec<usize> = (0..steps.len()).filter(|&i| matches!(steps[i], Step::Operator(_))).collect();
    if middles.is_empty() {
        let mut right = start(backend, ket)?;
        for step in steps.iter().rev() {
            right = act(atom, backend, step, &right)?;
        }
        return overlap(backend, &start(backend, bra)?, &right);
    }
    let mut result = Err(Obstacle::Inexact);
    for middle in middles {
        result = split(atom, backend, bra, steps, middle, ket);
        if result != Err(Obstacle::Inexact) {
            break;
        }
    }
    result
}

/// <bra|steps|ket> with the operator at `middle` as a matrix element.
pub(super) fn split(
    atom: &Hydrogenic,
    backend: &dyn Backend,
    bra: &State,
    steps: &[Step],
    middle: usize,
    ket: &State,
) -> Result<Number, Obstacle> {
    let mut right = start(backend, ket)?;
    for step in steps[middle + 1..].iter().rev() {
        right = act(atom, backend, step, &right)?;
    }
    let mut left = start(backend, bra)?;
    let mut sign = 1;
    for step in &steps[..middle] {
        let adjoint = match step {
            Step::Operator(operator) => {
                let (factor, operator) = atom.adjoint(operator);
                sign *= factor;
                Step::Operator(operator)
            }
            Step::Resolvent(resolvent) => {
                let z = match &resolvent.z {
                    Number::Exact(z) => Number::Exact(z.conj()),
                    Number::Approx(z) => Number::Approx(z.clone().conj()),
                };
                Step::Resolvent(Resolvent { z, omitted: resolvent.omitted.clone() })
            }
        };
        left = act(atom, backend, &adjoint, &left)?;
    }
    let Step::Operator(operator) = &steps[middle] else {
        return overlap(backend, &left, &right);
    };
    let mut sum = Number::Exact(Surd::zero());
    for (&sector, part) in &right {
        for coupling in atom.couple(operator, sector) {
            if let Some(bra) = left.get(&coupling.to) {
                let element = backend.element(&coupling.radial, sector, coupling.to, bra, part)?;
                sum = add(sum, multiply(&coupling.factor.scaled(&Rational::from(sign)), element));
            }
        }
    }
    Ok(sum)
}

fn overlap(backend: &dyn Backend, left: &Ket, right: &Ket) -> Result<Number, Obstacle> {
    let mut sum = Number::Exact(Surd::zero());
    for (sector, part) in right {
        if let Some(bra) = left.get(sector) {
            sum = add(sum, backend.overlap(*sector, bra, part)?);
        }
    }
    Ok(sum)
}

/// Precision of sums of approximate numbers.
const BITS: u32 = 1024;

fn add(a: Number, b: Number) -> Number {
    a.plus(&b, BITS)
}

fn multiply(a: &Surd, b: Number) -> Number {
    Number::Exact(a.clone()).times(&b, BITS)
}
