//! Costly values that do not rest on a source of uncertainty, kept while the source is moved.
//!
//! A root or chain in a unit is multiplied by constants; the gradient with respect to them needs it once, not once for every end of every
//! difference.

use super::environment::Environment;
use super::evaluator::{Evaluated, Evaluator};
use crate::num::Scalar;
use crate::theory::terms::*;
use std::collections::HashMap;

/// Most values kept.
const MOST_SETTLED: usize = 10_000;

/// Values by their text and the variables in them, with the precision they were asked to.
pub(super) type Settled = HashMap<String, (u32, Scalar)>;

impl Evaluator<'_> {
    /// The value of a term, kept if it was costly and rests on nothing that is moved.
    pub(super) fn settled(&mut self, term: &ScalarTerm, environment: &Environment, bits: u32) -> Evaluated<Scalar> {
        if self.nudge.is_some() || !is_costly(term) {
            return self.scalar_node(term, environment, bits);
        }
        if let Some((source, _)) = &self.shift
            && rests_on(term, source)
        {
            return self.scalar_node(term, environment, bits);
        }
        let key = format!("{}{{{}}}", term.text, environment.fingerprint());
        if let Some((to, value)) = self.settled.get(&key)
            && (*to >= bits || value.is_exact())
        {
            return Ok(value.clone());
        }
        let value = self.scalar_node(term, environment, bits)?;
        if self.settled.len() >= MOST_SETTLED {
            self.settled.clear();
        }
        self.settled.insert(key, (bits, value.clone()));
        Ok(value)
    }
}

fn is_costly(term: &ScalarTerm) -> bool {
    matches!(
        &*term.node,
        ScalarNode::Bracket(_)
            | ScalarNode::Root { .. }
            | ScalarNode::Series { .. }
            | ScalarNode::Vary(_)
            | ScalarNode::LevelPart(..)
    )
}

/// Whether a value may change when a source is moved.
fn rests_on(term: &ScalarTerm, moved: &Source) -> bool {
    // The ends of the interval of a root do not move the root.
    let term = match &*term.node {
        ScalarNode::Root { body, .. } => body,
        _ => term,
    };
    let mut found = false;
    crate::theory::visit::scalars(term, &mut |inner| {
        found = found
            || match (&*inner.node, moved) {
                (ScalarNode::Measured { source, .. }, moved) => source == moved,
                (ScalarNode::Energy(state), Source::Datum { system, .. }) => state.system == *system,
                (ScalarNode::Bracket(bracket), Source::Datum { system, .. }) => bracket.system == *system,
                _ => false,
            };
    });
    found
}
