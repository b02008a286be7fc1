//! Matrix elements of a tensor component between |(L S) J M>: where it leads from a vector, with exact factors.

use super::chain::Part;
use super::half_integer::{AngularError, HalfInteger};
use super::paths::{Amplitudes, Coefficients};
use super::polarization::ComponentError;
use super::selection::BlockRules;
use super::term::Level;
use crate::num::Surd;
use std::collections::BTreeMap;

/// A vector an operator leads to, with the factor of the operator's radial element.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Image {
    pub level: Level,
    pub m: HalfInteger,
    pub factor: Surd,
}

/// Why a component leads nowhere that could be said.
#[derive(Clone, PartialEq, Eq, Debug, thiserror::Error)]
pub enum ElementError {
    #[error(transparent)]
    Angular(#[from] AngularError),
    #[error(transparent)]
    Component(#[from] ComponentError),
}

impl Part {
    /// Every vector of the system the part leads to from |(L S) J M>, by level and M, ascending; those with a zero factor are left out.
    ///
    /// `<J M|T^K_Q|J' M'> = (-1)^(J-M) (J K J'; -M Q M') sqrt((2J+1)(2K+1)(2J'+1)) {L L' k; S S' s; J J' K} <LS|||T^{ks}|||L'S'>`.
    /// Errors: a component the tensor does not have, a summed index, an open polarization.
    /// Source: Edmonds, eq. 7.1.5, with the reduced element of this folder.
    pub fn images(&self, from: Level, m: HalfInteger, rules: &BlockRules) -> Result<Vec<Image>, ElementError> {
        let weights = self.component.weights(&self.tensor, &BTreeMap::new(), true)?;
        let start = Amplitudes::from([(m.twice(), self.coefficient.clone())]);
        let mut coefficients = Coefficients::default();
        let mut images = Vec::new();
        for level in rules.neighbours(&self.tensor, from, true) {
            let reduced = coefficients.reduced(&self.tensor, level, from)?;
            if reduced.is_zero() {
                continue;
            }
            for (twice_m, amplitude) in coefficients.carry(self.tensor.total, &weights, level.j, from.j, &start)? {
                images.push(Image { level, m: HalfInteger::from_twice(twice_m), factor: &amplitude * &reduced });
            }
        }
        Ok(images)
    }
}

#[cfg(test)]
mod tests {
    use super::super::chain::Operator;
    use super::super::label::Electrons;
    use super::super::polarization::Component;
    use super::super::spherical::c_element;
    use super::super::tensor::Tensor;
    use super::super::term::{Term, projections};
    use super::*;
    use rug::Rational;

    fn only(operator: Operator) -> Part {
        operator.parts.into_iter().next().expect("a part")
    }

    /// Without spin the elements are those of C^k between |l m>.
    #[test]
    fn without_spin() {
        let rules = BlockRules::of(Electrons::ONE_WITHOUT_SPIN);
        let none = HalfInteger::whole(0);
        for (k, q) in [(1, 0), (1, -1), (2, 1), (3, -2)] {
            let part = only(Operator::new(Tensor::harmonic("r", k).expect("a rank"), Component::Spherical(q)));
            for l in 0..4_u32 {
                let j = HalfInteger::from_twice(Term::natural(l, none).twice_l());
                for m in projections(j) {
                    for image in part.images(Level::new(Term::natural(l, none), j), m, &rules).expect("exists") {
                        let known = c_element(image.level.term.l, k, q, l, m.twice() / 2);
                        assert_eq!(image.factor, known, "{k} {q} {l} {m}");
                    }
                }
            }
        }
    }

    /// J_z is diagonal with M once the parts of L and S are added, and the squares of all J_q add up to j(j+1).
    #[test]
    fn total_momentum() {
        let rules = BlockRules::of(Electrons::ONE);
        for l in 0..4_u32 {
            let term = Term::natural(l, HalfInteger::from_twice(1));
            for j in term.momenta() {
                for m in projections(j) {
                    let mut square = Surd::zero();
                    for q in -1..=1 {
                        let mut sum: BTreeMap<(Level, HalfInteger), Surd> = BTreeMap::new();
                        for part in Operator::total_momentum(&Component::Spherical(q)).parts {
                            for image in part.images(Level::new(term, j), m, &rules).expect("exists") {
                                *sum.entry((image.level, image.m)).or_default() += &image.factor;
                            }
                        }
                        sum.retain(|_, factor| !factor.is_zero());
                        assert!(sum.keys().all(|(level, _)| level.j == j));
                        if q == 0 && m.twice() != 0 {
                            let expected = Surd::from(Rational::from((m.twice(), 2)));
                            assert_eq!(sum.get(&(Level::new(term, j), m)), Some(&expected));
                        }
                        for factor in sum.values() {
                            square += &(factor * factor);
                        }
                    }
                    let twice = j.twice();
                    assert_eq!(square, Surd::from(Rational::from((twice * (twice + 2), 4))));
                }
            }
        }
    }
}
