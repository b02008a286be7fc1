//! What an entry sees: the names, systems and settings that the entries above it have made.

use crate::num::Effort;
use crate::num::units::ConstantSet;
use crate::sums::{Evaluator, Systems, Wanted};
use crate::systems::System;
use crate::theory::{Binding, Names};
use std::sync::Arc;

/// Digits of approximate results when no `digits` entry stands above.
pub const DEFAULT_DIGITS: u32 = 30;

/// What an entry does to the entries below it.
#[derive(Clone)]
pub enum Effect {
    Bind(String, Binding),
    /// A system, with the operators it declares by name: plain ones, and tensors that are written with a component.
    System {
        name: String,
        system: Arc<dyn System>,
        operators: Vec<String>,
        tensors: Vec<String>,
    },
    Digits(Wanted),
    Constants(ConstantSet),
}

/// The names, systems and settings in force at a point of the session.
#[derive(Clone)]
pub struct Scope {
    pub names: Names,
    pub systems: Systems,
    pub wanted: Wanted,
    /// The number of the entry that bound each name.
    pub bound_by: std::collections::BTreeMap<String, usize>,
}

impl Scope {
    /// What every session starts with: the words of the vocabulary.
    pub fn new() -> Self {
        Scope {
            names: super::words::names(),
            systems: Systems::new(),
            wanted: Wanted::Digits(DEFAULT_DIGITS),
            bound_by: std::collections::BTreeMap::new(),
        }
    }

    /// Takes in what the entry with this number has done.
    pub fn apply(&mut self, number: usize, effect: &Effect) {
        match effect {
            Effect::Bind(name, binding) => {
                self.names.bound.insert(name.clone(), binding.clone());
                self.bound_by.insert(name.clone(), number);
            }
            Effect::System { name, system, operators, tensors } => {
                self.names.bound.insert(name.clone(), Binding::System);
                self.names.matrix_operators.extend(operators.iter().cloned());
                self.names.operators.extend(tensors.iter().cloned());
                self.names.later.retain(|word, _| !tensors.contains(word));
                self.names.parameters.insert(name.clone(), system.parameters());
                self.systems.insert(name.clone(), system.clone());
                self.bound_by.insert(name.clone(), number);
            }
            Effect::Digits(wanted) => self.wanted = *wanted,
            Effect::Constants(set) => self.names.constants = *set,
        }
    }

    /// Takes in that the entry with this number fails and binds nothing.
    pub fn apply_failure(&mut self, number: usize, name: &str) {
        if !self.names.bound.contains_key(name) {
            self.names.broken.insert(name.to_string(), number);
        }
    }

    pub fn evaluator(&self, effort: &Effort) -> Evaluator<'_> {
        Evaluator::new(&self.systems, effort.clone())
    }
}

impl Default for Scope {
    fn default() -> Self {
        Self::new()
    }
}
