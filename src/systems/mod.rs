//! The Hilbert spaces a session can declare, a folder each, behind one trait.
//!
//! A [`System`] knows its symmetry: which states carry a label, what an operator couples, and with which exact factor. Its [`Backend`]s know
//! the rest, block by block: one exact (where functions are represented exactly), one for every numeric [`Level`]. A backend hands out opaque
//! [`BlockKet`]s, so that `sums` walks a chain the same way for every atom. Nothing here knows of the session language.

pub mod hydrogenic;
pub mod levels;
pub mod matrix;
mod number;
pub mod shifted;
pub mod symbolic;
mod symmetry;

use crate::num::{Effort, Interrupted, Surd};
use rug::{Complex, Rational};
use std::any::Any;
use std::sync::Arc;
pub use symmetry::{LevelShift, Symmetry};

/// A symmetry block with its magnetic component: what a ket is split into.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub struct Sector {
    pub block: Block,
    /// Twice the magnetic quantum number; zero where there is none.
    pub twice_m: i32,
}

/// A subspace in which the Hamiltonian acts by itself.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub enum Block {
    /// The whole space of a plain matrix.
    Whole,
    /// One electron without spin, orbital angular momentum l.
    Orbital { l: u32 },
    /// One electron with spin, l and s = 1/2 coupled to j.
    Coupled { l: u32, twice_j: u32 },
    /// Levels of which only J and the parity are known.
    Level { twice_j: u32, odd: bool },
}

/// A label as the session gives it: `2p` with options such as m = 1; whole number holes are already filled in.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct StateLabel {
    pub text: String,
    pub options: Vec<(String, Rational)>,
}

/// An eigenstate of a system: its quantum numbers in the system's own order, and its label for messages (`2p, m=1`).
#[derive(Clone, PartialEq, Eq, Hash, Debug)]
pub struct State {
    pub label: String,
    pub numbers: Vec<i64>,
}

/// All states that carry a label.
#[derive(Clone, PartialEq, Eq, Hash, Debug)]
pub struct Manifold {
    pub label: String,
    pub numbers: Vec<i64>,
}

/// An operator as it is written: name, component (`z`, `+1`, …), arguments in parentheses, and the power written on it.
#[derive(Clone, PartialEq, Eq, Hash, Debug)]
pub struct Atom {
    pub name: String,
    pub component: Option<String>,
    pub arguments: Vec<Rational>,
    pub power: i64,
}

/// One way an operator leads from a sector to another: exact angular factor, and the part that acts inside the blocks.
#[derive(Clone, Debug)]
pub struct Coupling {
    pub to: Sector,
    pub factor: Surd,
    pub radial: RadialOperator,
}

/// The part of an operator that acts between two blocks; the meaning of `kind` and `index` is the system's own.
#[derive(Clone, PartialEq, Eq, Hash, Debug)]
pub struct RadialOperator {
    pub kind: &'static str,
    pub index: i64,
}

/// A scalar at the border between sums and systems.
#[derive(Clone, Debug, PartialEq)]
pub enum Number {
    Exact(Surd),
    Approx(Complex),
}

/// A ket restricted to one sector; only the backend that made it can look inside.
pub type BlockKet = Arc<dyn Any + Send + Sync>;

/// How accurately a numeric backend works.
#[derive(Clone, Copy, PartialEq, Eq, Hash, Debug)]
pub struct Level {
    /// Working precision in bits.
    pub bits: u32,
    /// Number of basis functions a block; systems of a fixed size ignore it.
    pub basis: usize,
}

/// What a resolvent leaves out of the space.
#[derive(Clone, PartialEq, Eq, Hash, Debug)]
pub enum Omitted {
    /// Every state degenerate with this one, in every block.
    LevelOf(State),
    Manifold(Manifold),
}

/// Q (z - H)^-1 Q, where Q leaves out what `omitted` names.
#[derive(Clone, PartialEq, Debug)]
pub struct Resolvent {
    pub z: Number,
    pub omitted: Vec<Omitted>,
}

/// f(a + b H) for the functions a resolvent declaration may name.
#[derive(Clone, PartialEq, Debug)]
pub struct FunctionOfH {
    pub kind: FunctionKind,
    pub constant: Number,
    pub slope: Number,
    pub omitted: Vec<Omitted>,
    /// Whether the values are to be conjugated. On the cut of a logarithm or a root this is not the function of the conjugated argument.
    pub adjoint: bool,
}

#[derive(Clone, Copy, PartialEq, Eq, Hash, Debug)]
pub enum FunctionKind {
    Ln,
    Sqrt,
    Exp,
}

/// Why a system cannot do what a declaration or an expression asks of it.
#[derive(Clone, PartialEq, Debug, thiserror::Error)]
pub enum SystemError {
    /// A label, option or argument breaks a rule; `help` says what to write.
    #[error("{message}")]
    Refused { message: String, help: String },
    #[error("{name} is not an operator of this system")]
    UnknownOperator { name: String, known: Vec<String> },
    #[error("not available yet: {0}")]
    NotYet(String),
    #[error(transparent)]
    Interrupted(#[from] Interrupted),
}

impl SystemError {
    /// What to write instead, where that is known.
    pub fn help(&self) -> String {
        match self {
            SystemError::Refused { help, .. } => help.clone(),
            _ => String::new(),
        }
    }
}

/// Why a step of a chain did not give a ket or a number.
#[derive(Clone, PartialEq, Debug, thiserror::Error)]
pub enum Obstacle {
    /// The exact backend cannot hold the result (or not from this side): go numeric, or come from the other side.
    #[error("the result has no exact finite form here")]
    Inexact,
    /// A matrix element does not exist.
    #[error("{operator} diverges: {why}")]
    Diverges { operator: String, why: String },
    /// The resolvent's energy is an eigenvalue that is not left out.
    #[error("the resolvent is singular: its energy is that of {level}")]
    Singular { level: String },
    /// A real energy on the continuous spectrum.
    #[error("the energy lies in the continuum, where the resolvent of a real energy has a cut")]
    OnCut,
    /// This level's precision or basis does not decide; a higher one may.
    #[error("not decided at this precision")]
    Undecided,
    #[error("not available yet: {0}")]
    NotYet(String),
    #[error("{message}")]
    Refused { message: String, help: String },
    #[error(transparent)]
    Interrupted(#[from] Interrupted),
}

/// A Hilbert space with its Hamiltonian, its labels and its operators.
pub trait System: Send + Sync {
    /// The word that declares it (`hydrogenic`).
    fn kind(&self) -> &'static str;

    /// What may be asked of it by name, as `h.mass`.
    fn parameters(&self) -> Vec<(&'static str, Rational)> {
        Vec::new()
    }

    /// The eigenstate that carries a label.
    fn state(&self, label: &StateLabel, effort: &Effort) -> Result<State, SystemError>;

    /// All states that carry a label.
    fn manifold(&self, label: &StateLabel, effort: &Effort) -> Result<Manifold, SystemError>;

    /// The energy of a state: exact where it can be, else good to `bits` bits relative.
    fn energy(&self, state: &State, bits: u32, effort: &Effort) -> Result<Number, Obstacle>;

    /// Tells whether two states belong to the same level (their energies are equal, not only close).
    fn degenerate(&self, a: &State, b: &State) -> bool;

    /// The states of a state's level that have a part in a sector, the state itself included.
    fn level_in(&self, state: &State, sector: Sector, effort: &Effort) -> Result<Vec<State>, Obstacle>;

    /// All states of the level of a state, itself included, in every sector.
    fn level(&self, state: &State, _effort: &Effort) -> Result<Vec<State>, Obstacle> {
        Ok(vec![state.clone()])
    }

    /// Tells whether the system has this operator with this component, arguments and power.
    ///
    /// Errors: `UnknownOperator`, or `Refused` with the reason. A power other than 1 that the system does not know as an operator of its
    /// own is refused by `Ok(false)`: the caller then multiplies.
    fn knows(&self, atom: &Atom) -> Result<bool, SystemError>;

    /// Where an operator leads from a sector, with exact factors. An empty list is a selection rule.
    fn couple(&self, atom: &Atom, from: Sector) -> Vec<Coupling>;

    /// The adjoint of an operator: a factor and the operator it is a multiple of.
    fn adjoint(&self, atom: &Atom) -> (i32, Atom);

    /// Why an operator leads nowhere from a sector, in the words of the trade (`D changes l by one`), for an exact zero;
    /// empty where there is no rule.
    fn selection_rule(&self, atom: &Atom) -> String;

    /// The backend whose numbers are exact, if there is one.
    fn exact(&self, effort: &Effort) -> Option<Arc<dyn Backend>>;

    /// The numeric backend of a level, best suited to chains that start at `anchor`.
    fn numeric(&self, level: Level, anchor: &State, effort: &Effort) -> Result<Arc<dyn Backend>, Obstacle>;

    /// First and largest basis size a block; `None` for systems of a fixed size.
    fn basis_range(&self) -> Option<(usize, usize)>;

    /// Bits below which the data of the system cannot be told apart; numeric work starts above.
    fn data_bits(&self) -> u32;

    /// All states of a manifold.
    fn states_of(&self, manifold: &Manifold, _effort: &Effort) -> Result<Vec<State>, Obstacle> {
        Err(Obstacle::NotYet(format!("the states of {} one by one", manifold.label)))
    }

    /// The states of a manifold that have a part in a sector.
    fn members(&self, _manifold: &Manifold, _sector: Sector) -> Vec<State> {
        Vec::new()
    }

    /// Tells whether a state belongs to a manifold.
    fn holds(&self, _manifold: &Manifold, _state: &State) -> bool {
        false
    }

    /// What the angular algebra knows of the system; `None` for a space without symmetry.
    fn symmetry(&self) -> Option<&dyn Symmetry> {
        None
    }

    /// The standard uncertainties of the numbers the system was made of, in a fixed order; zero for those without.
    fn data(&self) -> Vec<Rational> {
        Vec::new()
    }

    /// The system with one of its data moved.
    fn moved(&self, _datum: usize, _by: &Rational) -> Result<Arc<dyn System>, SystemError> {
        Err(SystemError::Refused { message: "the system has no data of its own".into(), help: String::new() })
    }
}

/// Kets, operators and resolvents of a system at one accuracy. Every ket passed in must come from the same backend.
pub trait Backend: Send + Sync {
    /// The normalised eigenstate, split into sectors.
    fn state(&self, state: &State) -> Result<Vec<(Sector, BlockKet)>, Obstacle>;

    /// The radial part of an operator on a ket.
    fn apply(&self, operator: &RadialOperator, from: Sector, to: Sector, ket: &BlockKet) -> Result<BlockKet, Obstacle>;

    /// Q (z - H)^-1 Q on a ket.
    fn resolve(&self, resolvent: &Resolvent, sector: Sector, ket: &BlockKet) -> Result<BlockKet, Obstacle>;

    /// <bra| Q (z - H)^-1 Q |ket> inside a sector, where the resolvent on neither of them has a form the backend can hold.
    fn through(&self, _: &Resolvent, _: Sector, _bra: &BlockKet, _ket: &BlockKet) -> Result<Number, Obstacle> {
        Err(Obstacle::Inexact)
    }

    /// A function of H on a ket.
    fn function(&self, function: &FunctionOfH, sector: Sector, ket: &BlockKet) -> Result<BlockKet, Obstacle>;

    /// The linear combination of kets of one sector.
    fn combine(&self, sector: Sector, terms: &[(Number, BlockKet)]) -> Result<BlockKet, Obstacle>;

    /// <bra|ket> inside a sector, conjugate-linear in the bra.
    fn overlap(&self, sector: Sector, bra: &BlockKet, ket: &BlockKet) -> Result<Number, Obstacle>;

    /// <bra|operator|ket> of the radial part. Differs from applying and overlapping where the operator is a form only (delta(r), p^4).
    fn element(
        &self,
        operator: &RadialOperator,
        from: Sector,
        to: Sector,
        bra: &BlockKet,
        ket: &BlockKet,
    ) -> Result<Number, Obstacle>;

    /// Tells whether a ket is zero: exactly, not only small. Numeric backends answer `false` unless all coefficients are exactly zero.
    fn vanishes(&self, ket: &BlockKet) -> bool;
}
