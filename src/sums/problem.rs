//! Why an expression has no value, as data; the words stand here.

use crate::num::{Interrupted, NumberError};
use crate::systems::{Obstacle, SystemError};
use crate::theory::Fault;
use crate::theory::terms::Place;

/// A failed evaluation with the place of its cause.
#[derive(Clone, PartialEq, Debug)]
pub struct Failure {
    pub place: Place,
    pub trouble: Trouble,
}

impl Failure {
    pub fn new(place: Place, trouble: impl Into<Trouble>) -> Self {
        Failure { place, trouble: trouble.into() }
    }

    /// Tells whether more precision may cure it.
    pub fn is_undecided(&self) -> bool {
        matches!(
            self.trouble,
            Trouble::Number(NumberError::Undecided { .. })
                | Trouble::Obstacle(Obstacle::Undecided)
                | Trouble::Undecided { .. }
        )
    }

    /// Tells whether a numeric evaluation may succeed where the exact one did not.
    pub fn is_inexact(&self) -> bool {
        matches!(self.trouble, Trouble::Obstacle(Obstacle::Inexact))
    }

    /// Tells whether the expression divides by exactly zero, or a resolvent stands at a level.
    pub fn is_division_by_zero(&self) -> bool {
        matches!(
            self.trouble,
            Trouble::Number(NumberError::DivisionByZero) | Trouble::Obstacle(Obstacle::Singular { .. })
        )
    }

    pub fn is_interrupted(&self) -> bool {
        matches!(
            self.trouble,
            Trouble::Interrupted(_)
                | Trouble::Obstacle(Obstacle::Interrupted(_))
                | Trouble::System(SystemError::Interrupted(_))
        ) || matches!(&self.trouble, Trouble::Meaning(fault) if **fault == Fault::Interrupted)
    }
}

#[derive(Clone, PartialEq, Debug, thiserror::Error)]
pub enum Trouble {
    #[error(transparent)]
    Number(#[from] NumberError),
    #[error(transparent)]
    Obstacle(#[from] Obstacle),
    #[error(transparent)]
    System(#[from] SystemError),
    #[error(transparent)]
    Interrupted(#[from] Interrupted),
    #[error("no exact value is known, and `digits exact` stands above")]
    NotExact,
    #[error(
        "the value is not decided even with {digits} digits: a number that divides or stands at a cut cannot be told from zero"
    )]
    Undecided { digits: u32 },
    #[error("{variable} runs over {what}, which is not a whole number")]
    NotWhole { variable: String, what: String },
    #[error("{message}")]
    Refused { message: String, help: String },
    #[error(transparent)]
    NoSignChange(Box<NoSignChange>),
    #[error("the sign changes at {variable} = {near} through a pole, not through zero")]
    Pole { variable: String, near: String },
    /// What an `expect` wanted and what came out.
    #[error("{0}")]
    Unmet(String),
    /// The expression has no meaning here.
    #[error(transparent)]
    Meaning(#[from] Box<Fault>),
    #[error("not available yet: {0}")]
    NotYet(String),
}

/// The ends of an interval at which an expression has the same sign, and where inside it changes sign all the same.
#[derive(Clone, PartialEq, Debug, thiserror::Error)]
#[error(
    "the expression has the same sign at both ends: {at_from} at {variable} = {from} and {at_to} at {variable} = {to}"
)]
pub struct NoSignChange {
    pub variable: String,
    pub from: String,
    pub to: String,
    pub at_from: String,
    pub at_to: String,
    pub inside: Vec<(String, String)>,
}

impl Trouble {
    /// What stands under the marked text.
    pub fn label(&self) -> String {
        match self {
            Trouble::Obstacle(Obstacle::Singular { .. }) => "divides by zero on this state".into(),
            Trouble::Obstacle(Obstacle::Diverges { .. }) => "this matrix element does not exist".into(),
            Trouble::Obstacle(Obstacle::OnCut) => "a real energy above threshold".into(),
            Trouble::Meaning(fault) => fault.label(),
            Trouble::NoSignChange(_) => "no change of sign in this interval".into(),
            Trouble::Pole { .. } => "a pole lies in this interval".into(),
            Trouble::NotYet(_) | Trouble::Obstacle(Obstacle::NotYet(_)) | Trouble::System(SystemError::NotYet(_)) => {
                "this part is still to come".into()
            }
            _ => "here".into(),
        }
    }

    /// What to write instead.
    pub fn help(&self) -> Option<String> {
        Some(match self {
            Trouble::Meaning(fault) => return fault.help(),
            Trouble::Number(error) => return error.help().map(String::from),
            Trouble::Obstacle(Obstacle::Singular { level }) => format!(
                "leave the level out with a prime, `1/(E(g) - H)'`, or with `without P`, or move the energy off {level}"
            ),
            Trouble::Obstacle(Obstacle::OnCut) => {
                "give the energy an imaginary part, as in `w + 0.1 i`: above or below the cut are different values"
                    .into()
            }
            Trouble::Obstacle(Obstacle::Refused { help, .. })
            | Trouble::System(SystemError::Refused { help, .. })
            | Trouble::Refused { help, .. } => return (!help.is_empty()).then(|| help.clone()),
            Trouble::System(SystemError::UnknownOperator { known, .. }) => {
                format!("operators here: {}", known.join(", "))
            }
            Trouble::NotExact => {
                "write `digits 30` (or another number) before this entry to allow approximate values".into()
            }
            Trouble::NoSignChange(found) if !found.inside.is_empty() => {
                let list: Vec<String> = found.inside.iter().map(|(a, b)| format!("{a} .. {b}")).collect();
                format!("the sign changes inside {}", list.join(" and "))
            }
            Trouble::NoSignChange(_) => "choose an interval at whose ends the expression has opposite signs".into(),
            Trouble::Pole { .. } => "choose an interval between two poles (resonances)".into(),
            Trouble::Unmet(_) => "correct the entry that is wrong, or what is expected of it".into(),
            Trouble::NotWhole { .. } => "write whole numbers, as in `sum(n in 1 .. 20, …)`".into(),
            _ => return None,
        })
    }
}
