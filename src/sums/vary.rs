//! Evaluates what `vary` derives.

use super::environment::Environment;
use super::evaluator::{Evaluated, Evaluator, Systems};
use super::problem::{Failure, Trouble};
use crate::num::{Effort, Scalar};
use crate::systems::{State, StateLabel};
use crate::theory::normal::{Coupled, Degeneracy, Expanded, Expander, NamedState};
use crate::theory::terms::*;
use crate::theory::{Fault, Problem};
use rug::Rational;

/// The levels of the systems of a session.
struct Levels<'s> {
    systems: &'s Systems,
    effort: Effort,
}

impl Levels<'_> {
    fn named(&self, system: &str, state: &State, place: Place) -> NamedState {
        let name = format!("{system}[{}]", state.label);
        let label = written_label(&state.label);
        let options = label.options.into_iter().map(|(option, value)| {
            let shown = value.to_string();
            (option, Term::new(ScalarNode::Exact(value.into()), place, shown))
        });
        let label = LabelTerm {
            parts: vec![LabelPiece::Text(label.text)],
            options: options.collect(),
            text: format!("[{}]", state.label).into(),
        };
        NamedState { term: StateTerm { system: system.to_string(), label, place }, shown: name.clone(), name }
    }

    fn problem(place: Place, message: String) -> Problem {
        Problem::new(place, Fault::Other { message, help: String::new() })
    }
}

/// The label of a state taken apart: `2p, m=1`.
fn written_label(label: &str) -> StateLabel {
    let mut pieces = label.split(", ");
    let text = pieces.next().unwrap_or_default().to_string();
    let options = pieces.filter_map(|piece| {
        let (name, value) = piece.split_once('=')?;
        Some((name.to_string(), value.parse::<Rational>().ok()?))
    });
    StateLabel { text, options: options.collect() }
}

impl Degeneracy for Levels<'_> {
    fn level_of(&mut self, state: &NamedState) -> Expanded<Vec<NamedState>> {
        let place = state.term.place;
        let mut evaluator = Evaluator::new(self.systems, self.effort.clone());
        let found = evaluator
            .state(&state.term, &Environment::default())
            .map_err(|failure| Self::problem(place, failure.trouble.to_string()))?;
        let Some(system) = self.systems.get(&state.term.system) else { return Ok(vec![state.clone()]) };
        let level =
            system.level(&found, &self.effort).map_err(|obstacle| Self::problem(place, obstacle.to_string()))?;
        let other = |other: &State| {
            if *other == found { state.clone() } else { self.named(&state.term.system, other, place) }
        };
        Ok(level.iter().map(other).collect())
    }

    fn members_of(&mut self, manifold: &ManifoldTerm) -> Expanded<Vec<NamedState>> {
        let place = manifold.place;
        let mut evaluator = Evaluator::new(self.systems, self.effort.clone());
        let found = evaluator
            .manifold(manifold, &Environment::default())
            .map_err(|failure| Self::problem(place, failure.trouble.to_string()))?;
        let Some(system) = self.systems.get(&manifold.system) else { return Ok(Vec::new()) };
        let states =
            system.states_of(&found, &self.effort).map_err(|obstacle| Self::problem(place, obstacle.to_string()))?;
        Ok(states.iter().map(|state| self.named(&manifold.system, state, place)).collect())
    }
}

impl<'s> Evaluator<'s> {
    /// An expander that knows the levels of the session's systems.
    pub fn expander<'e>(&self, effort: &'e Effort) -> Expander<'e>
    where
        's: 'e,
    {
        Expander::with_levels(effort, Levels { systems: self.systems, effort: effort.clone() })
    }

    /// The value of a variation: derived by the rules, then evaluated chain by chain.
    pub(super) fn vary(
        &mut self,
        term: &ScalarTerm,
        variation: &Variation,
        environment: &Environment,
        bits: u32,
    ) -> Evaluated<Scalar> {
        // a name may be a definition in one place and a parameter in another
        let names: Vec<&str> = environment.variables().iter().map(|(name, _)| name.as_str()).collect();
        let key = format!("{}{{{}}}", term.text, names.join(","));
        let (derived, conjugated) = match self.derived.get(&key) {
            Some(known) => known.clone(),
            None => {
                let at = |problem: Problem| Failure::new(problem.place, Trouble::from(Box::new(problem.fault)));
                let effort = self.effort.clone();
                let mut expander = self.expander(&effort).keeping_names();
                let body = expander.expand(&variation.body).map_err(at)?;
                let couplings = expander.couplings(&body, &variation.perturbation, variation.order > 1).map_err(at)?;
                let couplings: Vec<(Coupled, ScalarTerm)> = couplings
                    .into_iter()
                    .map(|coupled| {
                        let element = expander.term(&coupled.element, term.place);
                        (coupled, element)
                    })
                    .collect();
                let sum = expander.expand(term).map_err(at)?;
                let derived = expander.term(&sum, term.place);
                for (coupled, element) in couplings {
                    self.refuse_coupling(&coupled, &element, variation, environment, bits)?;
                }
                let derived = (derived, expander.conjugated());
                self.derived.insert(key, derived.clone());
                derived
            }
        };
        let complex = environment.variables().iter().any(|(_, value)| !value.is_real());
        if conjugated.functions || conjugated.variables && complex {
            return Err(Failure::new(
                term.place,
                Trouble::Refused {
                    message: "a bra holds a number that need not be real, and its conjugate has no rule in a variation"
                        .into(),
                    help: "write the bracket with the conjugated number in front, without a bra of a ket".into(),
                },
            ));
        }
        self.scalar(&derived, environment, bits)
    }

    /// Refuses a perturbation that couples two states of one level: which states the level splits into is then for it to decide.
    fn refuse_coupling(
        &mut self,
        coupled: &Coupled,
        element: &ScalarTerm,
        variation: &Variation,
        environment: &Environment,
        bits: u32,
    ) -> Evaluated<()> {
        let value = match self.scalar(element, environment, bits) {
            Ok(value) => value,
            // what has no value for a variable of the session has none here either, and says so itself
            Err(failure) if failure.is_interrupted() => return Err(failure),
            Err(_) => return Ok(()),
        };
        if value.may_be_zero() {
            return Ok(());
        }
        let how = if coupled.order == 1 { "" } else { " in second order" };
        let message = format!(
            "the perturbation `{}` couples {} with {}{how}, which have one energy",
            variation.perturbation.text, coupled.right.shown, coupled.left.shown
        );
        let help = "take states of the level that diagonalise the perturbation, such as the combinations that a field along z leaves apart";
        Err(Failure::new(variation.perturbation.place, Trouble::Refused { message, help: help.into() }))
    }
}
