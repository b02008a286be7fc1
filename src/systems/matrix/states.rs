//! The states of a level: one basis for all purposes, told by a rule.
//!
//! The basis vectors e_0, e_1, … are taken in turn. Of each the part inside the level that is orthogonal to the states found before is normalised
//! and becomes the next state; a basis vector of which hardly anything is new (less than 2^-40 of its square) is passed over, so that the rule
//! gives the same states at every precision. For a diagonal H these are basis vectors themselves.

use super::component::Component;
use super::entries::ExactKet;
use super::vectors::{add_multiple, add_numeric_multiple, dot, inner, orthogonal, projection};
use crate::num::{Scalar, Surd};
use rug::{Complex, Float, Rational};
use std::cmp::Ordering;

/// A basis vector of whose square less than two to minus this power is new is passed over. Sum rule: as long as this times the number of basis
/// vectors is below one, enough are left.
const PASSED_OVER: u32 = 40;

/// The exact states of a level inside one component, each with the basis vector it comes from; `None` where a norm is not the root of a rational.
pub fn exact_states(span: &[ExactKet], component: &Component) -> Option<Vec<(usize, ExactKet)>> {
    let basis = orthogonal(span)?;
    let mut states: Vec<(usize, ExactKet)> = Vec::with_capacity(span.len());
    for k in &component.members {
        if states.len() == span.len() {
            break;
        }
        let mut vector = projection(&basis, &ExactKet::from([(*k, Surd::one())]));
        for (_, state) in &states {
            let overlap = inner(state, &vector);
            if !overlap.is_zero() {
                add_multiple(&mut vector, &-&overlap, state);
            }
        }
        let norm = inner(&vector, &vector);
        let threshold = Rational::from((1, 1u64 << PASSED_OVER));
        if norm.is_zero() || Scalar::Exact(&norm - &Surd::from(threshold)).sign().ok()? == Ordering::Less {
            continue;
        }
        let scale = norm.sqrt()?.inverse()?;
        states.push((*k, vector.into_iter().map(|(k, x)| (k, &x * &scale)).collect()));
    }
    Some(states)
}

/// The same in numbers: `vectors` are orthonormal, span the level inside a component, and count its members only; so do the states.
pub fn numeric_states(vectors: &[Vec<Complex>], bits: u32) -> Vec<(usize, Vec<Complex>)> {
    let order = vectors.first().map_or(0, Vec::len);
    let mut states: Vec<(usize, Vec<Complex>)> = Vec::with_capacity(vectors.len());
    let threshold = Float::with_val(32, 1) >> PASSED_OVER;
    for k in 0..order {
        if states.len() == vectors.len() {
            break;
        }
        let mut vector = vec![Complex::new(bits); order];
        for direction in vectors {
            let overlap = direction[k].clone().conj();
            add_numeric_multiple(&mut vector, &overlap, direction);
        }
        for (_, state) in &states {
            let overlap = -dot(state, &vector, bits);
            add_numeric_multiple(&mut vector, &overlap, state);
        }
        let norm = dot(&vector, &vector, bits).into_real_imag().0;
        if norm < threshold {
            continue;
        }
        let length = norm.sqrt();
        for entry in &mut vector {
            *entry /= &length;
        }
        states.push((k, vector));
    }
    states
}
