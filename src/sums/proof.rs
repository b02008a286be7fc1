//! Zeros proved by angular algebra.

use super::evaluator::Evaluator;
use crate::angular::verdict::{Verdict, Whole, analyse};
use crate::theory::normal::Expander;
use crate::theory::terms::ScalarTerm;

/// Chains named in a reason.
const MOST_NAMED: usize = 3;

impl Evaluator<'_> {
    /// Why a value is exactly zero, if the angular factors of all of its chains say so; `None` where they do not.
    ///
    /// Levels that were moved apart are not taken to have one energy.
    pub(super) fn proved_zero(&mut self, term: &ScalarTerm) -> Option<String> {
        let effort = self.effort.clone();
        let normal = Expander::new(&effort).expand(term).ok()?;
        if normal.terms.is_empty() {
            return Some("the terms of the expression cancel".into());
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
            Whole::NoPath => Some("no path leads through the intermediate blocks".into()),
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
                Some(format!("the angular factors of {} sum to zero", named.join(" and of ")))
            }
        }
    }
}
