//! The magnetic quantum numbers a decomposition is done for.

use super::PathError;
use crate::angular::chain::{AngularVector, ChainSum, State};
use crate::angular::half_integer::HalfInteger;
use crate::angular::term::{Level, projections};
use crate::angular::wigner::clebsch_gordan;
use crate::num::Surd;
use rug::Rational;

/// What the entries of a list of factors belong to.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum Columns {
    /// All states of the expression are as written: one factor.
    AsWritten,
    /// All states are one level: a factor for every M, ascending from -J.
    EveryM {
        j: HalfInteger,
        /// The M that was written, if one was.
        asked: Option<HalfInteger>,
    },
}

impl Columns {
    /// Decides from the states of a sum.
    ///
    /// Every M is looked at where all states are the same level, or where M is left open in some, which then share it.
    /// Errors: M is left open in two different levels, or in one of several states.
    pub(super) fn of(sum: &ChainSum) -> Result<Self, PathError> {
        let mut open: Option<&State> = None;
        for state in sum.states() {
            if let AngularVector::Coupled { m: None, .. } = state.vector {
                match open {
                    Some(other) if other != state => {
                        let names = [other.name.clone(), state.name.clone()];
                        return Err(PathError::TwoOpenLevels { names });
                    }
                    _ => open = Some(state),
                }
            }
        }
        let level_of = |state: &State| match state.vector {
            AngularVector::Coupled { j, .. } => Some((state.name.clone(), state.term, j)),
            AngularVector::Product { .. } => None,
        };
        let m_of = |state: &State| match state.vector {
            AngularVector::Coupled { m, .. } => m,
            AngularVector::Product { .. } => None,
        };
        let Some(first) = sum.states().next() else { return Ok(Columns::AsWritten) };
        let alike = sum.states().all(|state| level_of(state) == level_of(first));
        match (level_of(open.unwrap_or(first)), alike) {
            (Some((_, _, j)), true) if sum.states().all(|state| m_of(state) == m_of(first)) => {
                Ok(Columns::EveryM { j, asked: m_of(first) })
            }
            (Some((_, _, j)), false) if open.is_some() => Ok(Columns::EveryM { j, asked: None }),
            (Some((name, _, _)), true) if open.is_some() => Err(PathError::PartlyOpen { name }),
            _ => Ok(Columns::AsWritten),
        }
    }

    pub fn len(&self) -> usize {
        match self {
            Columns::AsWritten => 1,
            Columns::EveryM { j, .. } => usize::try_from(j.twice()).unwrap_or(0) + 1,
        }
    }

    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// The M of every column; nothing where the states are as written.
    pub fn projections(&self) -> Vec<HalfInteger> {
        match self {
            Columns::AsWritten => Vec::new(),
            Columns::EveryM { j, .. } => projections(*j).collect(),
        }
    }

    /// The column of the M that was written.
    pub fn asked(&self) -> Option<usize> {
        match self {
            Columns::AsWritten => Some(0),
            Columns::EveryM { j, asked } => {
                let asked = (*asked)?;
                usize::try_from((asked.twice() + j.twice()) / 2).ok()
            }
        }
    }

    /// The average of a list of factors over M, which is the scalar part; `None` where the states are as written.
    pub fn average(&self, factors: &[Surd]) -> Option<Surd> {
        let Columns::EveryM { j, .. } = self else { return None };
        let mut sum = Surd::zero();
        for factor in factors {
            sum += factor;
        }
        Some(sum.scaled(&Rational::from((1, i64::from(j.twice()) + 1))))
    }

    /// The amplitudes <J M|state> by level, for the M of a column.
    pub(super) fn amplitudes(&self, state: &State, column: usize) -> Result<Vec<(Level, i32, Surd)>, PathError> {
        let level = |j| Level::new(state.term, j);
        match state.vector {
            AngularVector::Coupled { j, m } => {
                // a written M is one of the scanned ones whenever every M is looked at
                let scanned = matches!(self, Columns::EveryM { asked, .. } if *asked == m);
                let column = i32::try_from(column).unwrap_or(0);
                let twice = match m {
                    Some(m) if !scanned => m.twice(),
                    _ => 2 * column - j.twice(),
                };
                Ok(vec![(level(j), twice, Surd::one())])
            }
            AngularVector::Product { ml, ms } => {
                let m = HalfInteger::from_twice(ml.twice() + ms.twice());
                let l = HalfInteger::from_twice(state.term.twice_l());
                let mut out = Vec::new();
                for j in state.term.momenta().filter(|j| j.twice() >= m.twice().abs()) {
                    let amplitude = clebsch_gordan(l, ml, state.term.s, ms, j, m)?;
                    if !amplitude.is_zero() {
                        out.push((level(j), m.twice(), amplitude));
                    }
                }
                Ok(out)
            }
        }
    }
}
