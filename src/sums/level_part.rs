//! Averages over the M of a level, and the scalar, vector and tensor parts of its response to light.

use super::environment::Environment;
use super::evaluator::{Evaluated, Evaluator, open_momentum};
use super::problem::{Failure, Trouble};
use crate::angular::HalfInteger;
use crate::angular::polarization::Polarization;
use crate::angular::term::projections;
use crate::num::{Scalar, Surd};
use crate::theory::terms::*;
use crate::theory::visit::{Visitor, visit};
use rug::Rational;

/// What an expression says of its level.
#[derive(Default)]
struct Found {
    states: Vec<StateTerm>,
    light: bool,
}

impl Visitor for Found {
    fn operator(&mut self, term: &OperatorTerm) {
        let along = match &*term.node {
            OperatorNode::Atom(atom) => &atom.along,
            OperatorNode::Tensor(tensor) => &tensor.along,
            _ => &None,
        };
        self.light |= matches!(along, Some(Direction::Light | Direction::LightConjugate));
    }

    fn state(&mut self, state: &StateTerm) {
        if !self.states.iter().any(|known| known.system == state.system && known.label.text == state.label.text) {
            self.states.push(state.clone());
        }
    }
}

impl Evaluator<'_> {
    /// A part of a value that depends on the M of a level.
    ///
    /// With alpha(M) = a_s + C M/(2J) a_v - D (3M^2 - J(J+1))/(2J(2J-1)) a_t, C = 2 Im(e_x* e_y), D = 1 - 3 |e_z|^2: the average over M is a_s;
    /// linear light along z has D = -2, so alpha(J) - a_s = a_t; circular light has C = 1, so alpha(J) - alpha(-J) = a_v.
    /// Errors: no level without M in the expression, or several; light that is not left open where the part needs one of its own.
    /// Source: the form of alpha(M) after Manakov, Ovsiannikov, Rapoport, Phys. Rep. 141, 319 (1986), from memory; checked in tests against 3j symbols.
    pub(super) fn level_part(
        &mut self,
        part: LevelPart,
        inner: &ScalarTerm,
        environment: &Environment,
        bits: u32,
        place: Place,
    ) -> Evaluated<Scalar> {
        let refused =
            |message: String, help: &str| Failure::new(place, Trouble::Refused { message, help: help.into() });
        let mut found = Found::default();
        visit(inner, &mut found);
        let mut level: Option<HalfInteger> = None;
        let mut several = false;
        for term in &found.states {
            let system = self.system(&term.system, term.place)?;
            let state = self.state(term, environment)?;
            match (open_momentum(&*system, &state), level) {
                (None, _) => {}
                (Some(j), None) => level = Some(j),
                (Some(j), Some(known)) => several |= j != known,
            }
        }
        if several {
            let message = "levels of several J stand without M in the expression".to_string();
            return Err(refused(message, "give M of all but one of them"));
        }
        // where nothing is open there is one state only, of J = 0
        let j = match level {
            Some(j) => j,
            None if found.states.iter().all(|state| state.label.options.is_empty()) => HalfInteger::whole(0),
            None => {
                let message = format!("`{}` runs over the M of a level, and every state here has its M", part.name());
                return Err(refused(message, "name the level without M: `state g = h[2p]`"));
            }
        };
        let needs_light = matches!(part, LevelPart::Vector | LevelPart::Tensor);
        if needs_light && !found.light {
            let message = format!("`{}` looks at several polarizations, and none is left open here", part.name());
            return Err(refused(message, "write D_light where light is absorbed and D_light_conj where it is emitted"));
        }
        if part == LevelPart::Average && found.light {
            let message = "the polarization of the light is left open, and an average over M needs one".to_string();
            return Err(refused(message, "take `scalar_part(…)`, or declare a polarization"));
        }
        let light = found.light.then_some(match part {
            LevelPart::Vector => Polarization::sigma_plus(),
            _ => Polarization::z(),
        });
        let at = |error| Failure::new(place, error);
        let value =
            |this: &mut Self, m: HalfInteger| this.scalar(inner, &environment.with_level(light.clone(), m), bits);
        let top = |twice: i32| HalfInteger::from_twice(twice);
        match part {
            LevelPart::Vector if j.twice() == 0 => Ok(Scalar::zero()),
            LevelPart::Tensor if j.twice() < 2 => Ok(Scalar::zero()),
            LevelPart::Vector => {
                let up = value(self, top(j.twice()))?;
                let down = value(self, top(-j.twice()))?;
                up.sub(&down, bits).map_err(at)
            }
            _ => {
                let mut sum = Scalar::zero();
                let mut last = Scalar::zero();
                for m in projections(j) {
                    last = value(self, m)?;
                    sum = sum.add(&last, bits).map_err(at)?;
                }
                let count = Scalar::Exact(Surd::from(Rational::from((1, i64::from(j.twice()) + 1))));
                let average = sum.mul(&count, bits).map_err(at)?;
                if part == LevelPart::Tensor { last.sub(&average, bits).map_err(at) } else { Ok(average) }
            }
        }
    }
}
