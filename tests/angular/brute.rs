//! Operators and states in the uncoupled basis |L ML> |S MS>, straight from the definitions.

use ketwork::angular::chain::{AngularVector, State};
use ketwork::angular::tensor::Tensor;
use ketwork::angular::term::{Level, Term, projections};
use ketwork::angular::{HalfInteger, clebsch_gordan, threej};
use ketwork::num::Surd;
use std::collections::BTreeMap;

/// Amplitudes by term, doubled ML and doubled MS.
pub type Vector = BTreeMap<(Term, i32, i32), Surd>;

fn h(twice: i32) -> HalfInteger {
    HalfInteger::from_twice(twice)
}

fn momentum(term: Term) -> HalfInteger {
    HalfInteger::whole(i32::try_from(term.l).expect("small"))
}

fn whole(rank: u32) -> i32 {
    i32::try_from(rank).expect("small")
}

/// The state |(L S) J M> or |L ML> |S MS>.
pub fn state(state: &State) -> Vector {
    match state.vector {
        AngularVector::Product { ml, ms } => Vector::from([((state.term, ml.twice(), ms.twice()), Surd::one())]),
        AngularVector::Coupled { j, m } => coupled(Level::new(state.term, j), m.expect("M is given")),
    }
}

fn coupled(level: Level, m: HalfInteger) -> Vector {
    let l = momentum(level.term);
    let mut out = Vector::new();
    for ml in projections(l) {
        let ms = h(m.twice() - ml.twice());
        if ms.twice().abs() > level.term.s.twice() {
            continue;
        }
        let amplitude = clebsch_gordan(l, ml, level.term.s, ms, level.j, m).expect("valid");
        if !amplitude.is_zero() {
            out.insert((level.term, ml.twice(), ms.twice()), amplitude);
        }
    }
    out
}

pub fn overlap(bra: &Vector, ket: &Vector) -> Surd {
    let mut sum = Surd::zero();
    for (place, amplitude) in bra {
        if let Some(other) = ket.get(place) {
            sum += &(&amplitude.conj() * other);
        }
    }
    sum
}

/// The part of a vector that lies in one level.
pub fn project(level: Level, vector: &Vector) -> Vector {
    let mut out = Vector::new();
    for m in projections(level.j) {
        let basis = coupled(level, m);
        let amplitude = overlap(&basis, vector);
        for (place, component) in basis {
            *out.entry(place).or_default() += &(&component * &amplitude);
        }
    }
    out.retain(|_, amplitude| !amplitude.is_zero());
    out
}

/// T^{(ks)K}_Q applied to a vector, into the given terms, with the doubly reduced elements given by bra and ket term.
pub fn apply(
    tensor: &Tensor,
    q_total: i32,
    into: &[Term],
    reduced: &dyn Fn(Term, Term) -> Surd,
    vector: &Vector,
) -> Vector {
    let (k, s) = (whole(tensor.element.orbital), whole(tensor.element.spin));
    let mut out = Vector::new();
    for q in -k..=k {
        let sigma = q_total - q;
        if sigma.abs() > s {
            continue;
        }
        let total = HalfInteger::whole(whole(tensor.total));
        let coupling = clebsch_gordan(
            HalfInteger::whole(k),
            HalfInteger::whole(q),
            HalfInteger::whole(s),
            HalfInteger::whole(sigma),
            total,
            HalfInteger::whole(q_total),
        )
        .expect("valid");
        if coupling.is_zero() {
            continue;
        }
        for ((ket, mlp, msp), amplitude) in vector {
            let (ml, ms) = (mlp + 2 * q, msp + 2 * sigma);
            for bra in into {
                let element = reduced(*bra, *ket);
                let l = momentum(*bra);
                if element.is_zero() || ml.abs() > l.twice() || ms.abs() > bra.s.twice() {
                    continue;
                }
                let orbital = threej(l, HalfInteger::whole(k), momentum(*ket), h(-ml), h(2 * q), h(*mlp));
                let spin = threej(bra.s, HalfInteger::whole(s), ket.s, h(-ms), h(2 * sigma), h(*msp));
                let (Ok(orbital), Ok(spin)) = (orbital, spin) else { continue };
                let mut value = &(&orbital * &spin) * &(&(&element * amplitude) * &coupling);
                if (l.twice() - ml + bra.s.twice() - ms) / 2 % 2 != 0 {
                    value = -&value;
                }
                if !value.is_zero() {
                    *out.entry((*bra, ml, ms)).or_default() += &value;
                }
            }
        }
    }
    out.retain(|_, amplitude| !amplitude.is_zero());
    out
}
