//! The names an entry may use: what the entries above it have bound, and the words of the language.

use super::terms::{Definition, ManifoldTerm, StateTerm};
use crate::angular::polarization::Polarization;
use crate::num::units::ConstantSet;
use rug::Rational;
use std::collections::{BTreeMap, BTreeSet};
use std::sync::Arc;

/// What a name stands for.
#[derive(Clone, Debug)]
pub enum Binding {
    System,
    State(StateTerm),
    Manifold(ManifoldTerm),
    Definition(Arc<Definition>),
    Polarization(Polarization),
}

impl Binding {
    /// The binding in words, for messages.
    pub fn describe(&self) -> String {
        use crate::lang::tree::DefinitionKind;
        match self {
            Binding::System => "a system".into(),
            Binding::State(_) => "a state".into(),
            Binding::Manifold(_) => "a manifold".into(),
            Binding::Polarization(_) => "a polarization".into(),
            Binding::Definition(definition) => match definition.kind {
                DefinitionKind::Operator => "an operator".into(),
                DefinitionKind::Resolvent => "a resolvent".into(),
                DefinitionKind::Ket => "a ket".into(),
                DefinitionKind::Define => "a defined number".into(),
                DefinitionKind::Polarization => "a polarization".into(),
            },
        }
    }
}

/// Names in scope. Bound names win over words of the vocabulary.
#[derive(Clone, Debug, Default)]
pub struct Names {
    pub bound: BTreeMap<String, Binding>,
    /// Operators the vocabulary lists, by the name before their component (`D`, `C`, `delta`).
    pub operators: BTreeSet<String>,
    /// Operators declared by matrix systems.
    pub matrix_operators: BTreeSet<String>,
    /// Words of the vocabulary that are not available yet, with what they belong to.
    pub later: BTreeMap<String, String>,
    /// Names an entry above should have bound, had it not failed, with its number.
    pub broken: BTreeMap<String, usize>,
    /// The set of recommended constants in force.
    pub constants: ConstantSet,
    /// Parameters of systems by the system's name: `mass`, `reduced_mass`, `Z`.
    pub parameters: BTreeMap<String, Vec<(&'static str, Rational)>>,
}

impl Names {
    /// The closest known name, if any is close.
    pub fn near(&self, name: &str) -> Option<String> {
        let known = self.bound.keys().chain(&self.operators).chain(&self.matrix_operators);
        known
            .map(|candidate| (strsim::jaro_winkler(name, candidate), candidate))
            .filter(|(score, _)| *score > 0.8)
            .max_by(|a, b| a.0.total_cmp(&b.0))
            .map(|(_, candidate)| candidate.clone())
    }
}
