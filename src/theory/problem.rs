//! What can be wrong with the meaning of an expression, as data; the words stand here and nowhere else.

use super::terms::Place;

/// A fault of meaning at a place.
#[derive(Clone, PartialEq, Debug)]
pub struct Problem {
    pub place: Place,
    pub fault: Fault,
}

impl Problem {
    pub fn new(place: Place, fault: Fault) -> Self {
        Problem { place, fault }
    }
}

/// The kinds of thing an expression can be.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Kind {
    Number,
    Operator,
    Ket,
    Bra,
}

impl std::fmt::Display for Kind {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str(match self {
            Kind::Number => "a number",
            Kind::Operator => "an operator",
            Kind::Ket => "a ket",
            Kind::Bra => "a bra",
        })
    }
}

#[derive(Clone, PartialEq, Debug, thiserror::Error)]
pub enum Fault {
    #[error("`{name}` is not known here")]
    UnknownName { name: String, near: Option<String> },
    #[error("`{name}` has no meaning, since entry {entry}, which declares it, fails")]
    Broken { name: String, entry: usize },
    #[error("`{name}` is {got}, where {wanted} is needed")]
    WrongBinding { name: String, got: String, wanted: String },
    #[error("{wanted} is needed here, and this is {got}")]
    WrongKind { wanted: Kind, got: Kind },
    #[error("{left} and {right} cannot be {action}")]
    CannotCombine { left: Kind, right: Kind, action: &'static str },
    #[error("`{name}` takes {wanted}, and {got} given")]
    ArgumentCount { name: String, wanted: String, got: String },
    #[error("`{name}` needs {wanted} here")]
    ArgumentForm { name: String, wanted: String },
    #[error("a denominator holds something other than numbers and H")]
    DenominatorNotLinear,
    #[error("a denominator without H divides by an operator")]
    DivisionByOperator,
    #[error("the prime belongs to a fraction with H, as in 1/(E(g) - H)'")]
    MisplacedPrime,
    #[error("the prime leaves out the level whose energy stands in the denominator, and {}", match .found { 0 => "no E(…) stands there".to_string(), n => format!("{n} different ones stand there") })]
    PrimeWithoutEnergy { found: usize },
    #[error("`without {name}` leaves states out of a resolvent, and there is no function of H here")]
    MisplacedWithout { name: String },
    #[error("the bra belongs to {bra} and the ket to {ket}")]
    TwoSystems { bra: String, ket: String },
    #[error("the index `{index}` occurs {} in this bracket; a summed index occurs twice", times(*.count))]
    IndexCount { index: String, count: usize },
    #[error("an operator is raised to a power that is not a positive whole number")]
    OperatorPower,
    #[error("not available yet: {what}")]
    NotYet { what: String },
    #[error("`{name}` is bound already, by entry {entry}")]
    BoundTwice { name: String, entry: usize },
    #[error("`{name}` is a word of the language and cannot be a name")]
    Reserved { name: String },
    #[error("interrupted")]
    Interrupted,
    /// A data file with several defects, each told with its place and cure.
    #[error("\"{name}\" has {}{} defects", if *.more { "at least " } else { "" }, .faults.len())]
    DataFile { name: String, faults: Vec<String>, more: bool },
    #[error("{message}")]
    Other { message: String, help: String },
}

fn times(count: usize) -> String {
    match count {
        1 => "once".into(),
        n => format!("{n} times"),
    }
}

impl Fault {
    /// What stands under the marked text.
    pub fn label(&self) -> String {
        match self {
            Fault::UnknownName { .. } => "nothing of this name stands above".into(),
            Fault::WrongKind { got, .. } => format!("this is {got}"),
            Fault::TwoSystems { .. } => "two Hilbert spaces in one bracket".into(),
            Fault::NotYet { .. } => "this part is still to come".into(),
            Fault::BoundTwice { .. } => "a second meaning".into(),
            _ => "here".into(),
        }
    }

    /// What else belongs to the fault.
    pub fn notes(&self) -> &[String] {
        match self {
            Fault::DataFile { faults, .. } => faults,
            _ => &[],
        }
    }

    /// What to write instead.
    pub fn help(&self) -> Option<String> {
        Some(match self {
            Fault::UnknownName { near: Some(near), .. } => format!("did you mean `{near}`?"),
            Fault::UnknownName { name, near: None } => format!(
                "declare it above: `define {name} = …`, `operator {name} = …`, `state {name} = h[1s]`; `help operators` lists those that every system has"
            ),
            Fault::Broken { entry, .. } => format!("mend entry {entry} first"),
            Fault::WrongBinding { wanted, .. } => format!("write {wanted} instead"),
            Fault::WrongKind { wanted: Kind::Number, got: Kind::Operator } => {
                "put the operator between a bra and a ket: `<g| … |g>`".into()
            }
            Fault::WrongKind { wanted: Kind::Number, got: Kind::Ket } => "close it with a bra: `<g| … |u>`".into(),
            Fault::WrongKind { wanted: Kind::Ket, .. } => "end it with a ket: `… |g>`".into(),
            Fault::WrongKind { .. } => return None,
            Fault::CannotCombine { .. } => {
                "a number next to an operator is that multiple of the identity; operators act on kets, and a bra closes a ket".into()
            }
            Fault::ArgumentCount { wanted, .. } => format!("give it {wanted}"),
            Fault::ArgumentForm { .. } => return None,
            Fault::DenominatorNotLinear => {
                "a resolvent is a number over something linear in H, as in `1/(E(g) + w - H)`; other operators are brought in by perturbation, between resolvents".into()
            }
            Fault::DivisionByOperator => "only `r` and functions of H have an inverse: `1/r`, `1/(E(g) - H)'`".into(),
            Fault::MisplacedPrime => "write the prime behind the parenthesis of the denominator: `1/(E(g) - H)'`".into(),
            Fault::PrimeWithoutEnergy { .. } => {
                "write the energy of the level, `1/(E(g) - H)'`, or name the states to leave out: `1/(x - H) without P`".into()
            }
            Fault::MisplacedWithout { .. } => "write it behind a resolvent: `1/(E(g) - H) without P`".into(),
            Fault::TwoSystems { .. } => "take both from one system, or multiply two brackets".into(),
            Fault::IndexCount { .. } => "write the index twice, as in `D_i R D_i`, or a component: `D_z`".into(),
            Fault::OperatorPower => "write `V^2`, `V^3`, …".into(),
            Fault::NotYet { .. } | Fault::Interrupted => return None,
            Fault::BoundTwice { name, .. } => {
                format!("choose another name, or change the earlier entry (at the prompt a new declaration of `{name}` revises it)")
            }
            Fault::Reserved { .. } => "choose another name".into(),
            Fault::DataFile { .. } => "mend the file, then enter the declaration again".into(),
            Fault::Other { help, .. } => return (!help.is_empty()).then(|| help.clone()),
        })
    }
}
