//! Kets of a session as parts over the sectors of a backend.

use super::environment::Environment;
use super::problem::Failure;
use super::walker::{SectorKet, Walked, Walker};
use crate::num::{Scalar, Surd};
use crate::systems::{BlockKet, Number, Obstacle, Sector, State};
use crate::theory::terms::*;
use std::collections::BTreeMap;
use std::sync::Arc;

impl Walker<'_, '_> {
    /// A ket term as parts over sectors.
    pub(super) fn ket(&mut self, term: &KetTerm, environment: &Environment) -> Walked<SectorKet> {
        match &*term.node {
            KetNode::State(state) => {
                let state = self.evaluator.state(state, environment)?;
                self.eigenstate(&state, term.place)
            }
            KetNode::Applied(operator, inner) => {
                let flat = self.flatten(operator, environment)?;
                let mut image = self.ket(inner, environment)?;
                for factor in flat.factors.iter().rev() {
                    image = self.act(factor, &image)?;
                }
                self.rescaled(image, &flat.coefficient, term.place)
            }
            KetNode::Sum(terms) => {
                let mut sum: BTreeMap<Sector, Vec<(Number, BlockKet)>> = BTreeMap::new();
                let one = Number::Exact(Surd::one());
                for inner in terms {
                    for (sector, part) in self.ket(inner, environment)?.parts.iter() {
                        sum.entry(*sector).or_default().push((one.clone(), part.clone()));
                    }
                }
                let key = format!("({}){{{}}}", term.text, environment.fingerprint());
                Ok(SectorKet { key: key.into(), parts: Arc::new(self.collect(sum, term.place)?) })
            }
            KetNode::Scaled(scalar, inner) => {
                let coefficient = self.evaluator.scalar(scalar, environment, self.scalar_bits())?;
                let image = self.ket(inner, environment)?;
                self.rescaled(image, &coefficient, term.place)
            }
            KetNode::Call(call) => match &call.definition.body {
                Meaning::Ket(body) => {
                    let inside = self.evaluator.enter(call, environment, self.scalar_bits())?;
                    self.ket(body, &inside)
                }
                _ => Err(Failure::new(term.place, Obstacle::Inexact)),
            },
        }
    }

    pub(super) fn eigenstate(&mut self, state: &State, place: Place) -> Walked<SectorKet> {
        let key = format!("|{}>", state.label);
        if let Some(known) = self.kept.get(&key) {
            return Ok(known.clone());
        }
        let parts = self.backend.state(state).map_err(|obstacle| Failure::new(place, obstacle))?;
        let result = SectorKet { key: key.as_str().into(), parts: Arc::new(parts.into_iter().collect()) };
        self.keep(key, &result);
        Ok(result)
    }

    fn rescaled(&mut self, ket: SectorKet, coefficient: &Scalar, place: Place) -> Walked<SectorKet> {
        if matches!(coefficient, Scalar::Exact(c) if c.is_one()) {
            return Ok(ket);
        }
        let number = self.number(coefficient, place)?;
        let key = format!("{coefficient:?}*{}", ket.key);
        Ok(SectorKet { key: key.into(), parts: Arc::new(self.scaled(&ket, &number, place)?) })
    }
}
