//! Zeros proved by angular algebra.

use super::evaluator::Evaluator;
use crate::angular::verdict::{Verdict, Whole, analyse};
use crate::theory::normal::Conjugated;
use crate::theory::terms::ScalarTerm;

/// Chains named in a reason.
const MOST_NAMED: usize = 3;

/// What makes a value zero.
enum Proof {
    /// Selection rules alone.
    NoPath(String),
    Cancels(String),
}

impl Evaluator<'_> {
    /// Why a value is exactly zero, if the angular factors of all of its chains say so; `None` where they do not.
    ///
    /// Levels that were moved apart are not taken to have one energy.
    pub(super) fn proved_zero(&mut self, term: &ScalarTerm) -> Option<String> {
        match self.proof(term)? {
            Proof::NoPath(reason) | Proof::Cancels(reason) => Some(reason),
        }
    }

    /// Why the chains of an expression cancel, where that is what makes it zero.
    pub(super) fn cancellation(&mut self, term: &ScalarTerm) -> Option<String> {
        match self.proof(term)? {
            Proof::Cancels(reason) => Some(reason),
            Proof::NoPath(_) => None,
        }
    }

    fn proof(&mut self, term: &ScalarTerm) -> Option<Proof> {
        let effort = self.effort.clone();
        let mut expander = self.expander(&effort);
        let normal = expander.expand(term).ok()?;
        // the conjugate of what need not be real is not known
        if expander.conjugated() != Conjugated::default() {
            return None;
        }
        if normal.terms.is_empty() {
            return Some(Proof::Cancels("the terms of the expression cancel".into()));
        }
        let angular = self.angular_sum(&normal, term.place).ok()?;
        let shifts = self.level_shifts(&normal, term.place).ok()?;
        let analysis = analyse(&angular.sum, &angular.setting, None, &effort).ok()?;
        let split = |chain: &crate::angular::verdict::ChainReport| {
            chain.equal_levels.keys().any(|term| shifts.iter().any(|shift| shift.level.term == *term))
        };
        match analysis.whole() {
            Whole::NotZero | Whole::ZeroOnAverage => None,
            _ if analysis.chains.iter().any(split) => None,
            Whole::NoPath => Some(Proof::NoPath("no path leads through the intermediate blocks".into())),
            Whole::Zero | Whole::ZeroForAskedM => {
                let mut named: Vec<String> = analysis
                    .chains
                    .iter()
                    .filter(|chain| !matches!(chain.verdict, Verdict::NoPath { .. }))
                    .map(|chain| chain.key.to_string())
                    .collect();
                if named.len() > MOST_NAMED {
                    named.truncate(MOST_NAMED);
                    named.push("…".into());
                }
                Some(Proof::Cancels(format!("the angular factors of {} sum to zero", named.join(" and of "))))
            }
        }
    }
}
