//! Terms: expressions after their names are resolved and their kinds (number, operator, ket) are known.
//!
//! Terms know systems only by name. Every term carries the place it was written at and the text it was written as; the text, with the values of
//! the variables in scope, identifies the term while names keep their meaning, which they do during one evaluation.

use super::dimensions::Known;
use crate::angular::polarization::Polarization;
use crate::angular::tensor::Tensor;
use crate::angular::{AngularError, HalfInteger, clebsch_gordan, ninej, sixj, threej};
use crate::lang::tree::{DefinitionKind, Expr, Span};
pub use crate::num::Function as ScalarFunction;
use crate::num::Surd;
use crate::num::units::Unit;
use rug::Rational;
use std::sync::Arc;

/// Where a term stands: the entry that holds it, and the span inside that entry's text.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Debug, Default, Hash)]
pub struct Place {
    pub entry: u64,
    pub span: Span,
}

/// A term of one kind with its place and text.
#[derive(Clone, Debug)]
pub struct Term<N> {
    pub node: Arc<N>,
    pub place: Place,
    pub text: Arc<str>,
}

pub type ScalarTerm = Term<ScalarNode>;
pub type OperatorTerm = Term<OperatorNode>;
pub type KetTerm = Term<KetNode>;

impl<N> Term<N> {
    pub fn new(node: N, place: Place, text: impl Into<Arc<str>>) -> Self {
        Term { node: Arc::new(node), place, text: text.into() }
    }
}

/// Where an uncertainty comes from. The same source counts once, however often it enters a value; different sources are independent.
#[derive(Clone, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub enum Source {
    /// A number with an uncertainty, by the place where it is written.
    Written(Place),
    /// A recommended constant, by its name.
    Constant(&'static str),
    /// A number of a table of levels: the system's name in the session, and which of [`crate::systems::System::data`].
    Datum { system: String, index: usize },
}

// Terms are shared by their nodes; a node is made once.
#[allow(clippy::large_enum_variant)]
#[derive(Clone, Debug)]
pub enum ScalarNode {
    Exact(Surd),
    /// A value with a standard uncertainty.
    Measured {
        source: Source,
        value: Rational,
        sigma: Rational,
    },
    Pi,
    /// A value of which the dimension is known, and the unit it is written in
    Quantity {
        known: Known,
        unit: Option<Unit>,
        value: ScalarTerm,
    },
    /// Bound by `zero`, `sum` or a definition's parameter list.
    Variable(String),
    Sum(Vec<ScalarTerm>),
    Product(Vec<ScalarTerm>),
    Negated(ScalarTerm),
    Quotient(ScalarTerm, ScalarTerm),
    Power(ScalarTerm, ScalarTerm),
    Function(ScalarFunction, ScalarTerm),
    Energy(StateTerm),
    Bracket(Bracket),
    Call(Call),
    /// `zero(w in a .. b, f)`
    Root {
        variable: String,
        from: ScalarTerm,
        to: ScalarTerm,
        body: ScalarTerm,
    },
    /// `sum(n in a .. b, f)`
    Series {
        variable: String,
        from: ScalarTerm,
        to: ScalarTerm,
        body: ScalarTerm,
    },
    /// `threej(j1, j2, j3, m1, m2, m3)` and its like
    Wigner(WignerSymbol, Vec<ScalarTerm>),
    /// A part of the dependence of a level's value on M and on the polarization of the light
    LevelPart(LevelPart, ScalarTerm),
    /// `vary(f, V, n)`
    Vary(Variation),
}

/// The coefficient of lambda^order in the body when H becomes H + lambda V.
#[derive(Clone, Debug)]
pub struct Variation {
    pub body: ScalarTerm,
    pub perturbation: OperatorTerm,
    pub order: u32,
}

/// The parts of a value that depends on the M of a level.
#[derive(Clone, Copy, PartialEq, Eq, Debug, Hash)]
pub enum LevelPart {
    Average,
    Scalar,
    Vector,
    Tensor,
}

impl LevelPart {
    /// The part of that name in the session language.
    pub fn named(name: &str) -> Option<Self> {
        match name {
            "average" => Some(Self::Average),
            "scalar_part" => Some(Self::Scalar),
            "vector_part" => Some(Self::Vector),
            "tensor_part" => Some(Self::Tensor),
            _ => None,
        }
    }

    pub fn name(self) -> &'static str {
        match self {
            Self::Average => "average",
            Self::Scalar => "scalar_part",
            Self::Vector => "vector_part",
            Self::Tensor => "tensor_part",
        }
    }
}

/// The function of numbers with that name in the session language.
pub fn function_named(name: &str) -> Option<ScalarFunction> {
    Some(match name {
        "sqrt" => ScalarFunction::Sqrt,
        "exp" => ScalarFunction::Exp,
        "ln" => ScalarFunction::Ln,
        "sin" => ScalarFunction::Sin,
        "cos" => ScalarFunction::Cos,
        "abs" => ScalarFunction::Abs,
        "conj" => ScalarFunction::Conj,
        "re" => ScalarFunction::Re,
        "im" => ScalarFunction::Im,
        _ => return None,
    })
}

/// The symbols of angular momentum theory that expressions may ask for.
#[derive(Clone, Copy, PartialEq, Eq, Debug, Hash)]
pub enum WignerSymbol {
    ClebschGordan,
    ThreeJ,
    SixJ,
    NineJ,
}

impl WignerSymbol {
    /// The symbol of that name in the session language.
    pub fn named(name: &str) -> Option<Self> {
        match name {
            "clebsch_gordan" => Some(Self::ClebschGordan),
            "threej" => Some(Self::ThreeJ),
            "sixj" => Some(Self::SixJ),
            "ninej" => Some(Self::NineJ),
            _ => None,
        }
    }

    /// How many arguments it takes, and which.
    pub fn arguments(self) -> (usize, &'static str) {
        match self {
            Self::ClebschGordan => (6, "six arguments (j1, m1, j2, m2, J, M)"),
            Self::ThreeJ => (6, "six arguments (j1, j2, j3, m1, m2, m3)"),
            Self::SixJ => (6, "six arguments (the upper row, then the lower)"),
            Self::NineJ => (9, "nine arguments, row by row"),
        }
    }

    /// Its value; `None` for a wrong number of arguments.
    ///
    /// Errors: angular momenta or projections that do not exist.
    pub fn value(self, j: &[HalfInteger]) -> Option<Result<Surd, AngularError>> {
        match (self, j) {
            (Self::ClebschGordan, &[j1, m1, j2, m2, j, m]) => Some(clebsch_gordan(j1, m1, j2, m2, j, m)),
            (Self::ThreeJ, &[j1, j2, j3, m1, m2, m3]) => Some(threej(j1, j2, j3, m1, m2, m3)),
            (Self::SixJ, &[j1, j2, j3, l1, l2, l3]) => Some(sixj([j1, j2, j3, l1, l2, l3])),
            (Self::NineJ, &[a, b, c, d, e, f, g, h, i]) => Some(ninej([[a, b, c], [d, e, f], [g, h, i]])),
            _ => None,
        }
    }
}

/// A definition used with arguments; each argument is evaluated once.
#[derive(Clone, Debug)]
pub struct Call {
    pub definition: Arc<Definition>,
    pub arguments: Vec<ScalarTerm>,
}

/// What `operator`, `resolvent`, `ket` and `define` bind.
#[derive(Debug)]
pub struct Definition {
    pub name: String,
    pub kind: DefinitionKind,
    pub parameters: Vec<String>,
    pub body: Meaning,
    /// What is known of the dimension of a defined number.
    pub known: Known,
    /// The body as it was written, for `formula`.
    pub written: Expr,
}

/// A resolved expression of any kind.
#[derive(Clone, Debug)]
pub enum Meaning {
    Scalar(ScalarTerm),
    Operator(OperatorTerm),
    Ket(KetTerm),
    /// A lone bra, kept as the ket it is the adjoint of, with the operators to its right still to come.
    Bra(BraTerm),
}

/// `<bra| chain`, on its way to become a bracket.
#[derive(Clone, Debug)]
pub struct BraTerm {
    pub bra: KetTerm,
    pub chain: Vec<OperatorTerm>,
    pub factor: Option<ScalarTerm>,
    pub place: Place,
    pub text: Arc<str>,
}

/// <bra| operator |ket>, the bra given as the ket it is the adjoint of.
#[derive(Clone, Debug)]
pub struct Bracket {
    pub system: String,
    pub bra: KetTerm,
    pub operator: Option<OperatorTerm>,
    pub ket: KetTerm,
    /// Cartesian indices to be summed over x, y, z.
    pub indices: Vec<String>,
}

#[derive(Clone, Debug)]
pub enum OperatorNode {
    /// A multiple of the identity.
    Scalar(ScalarTerm),
    Atom(AtomTerm),
    Hamiltonian,
    Sum(Vec<OperatorTerm>),
    /// In the order written: the last acts first.
    Product(Vec<OperatorTerm>),
    Power(OperatorTerm, u32),
    /// |ket><bra|
    Dyad(KetTerm, KetTerm),
    /// 1/(constant + slope H), the omitted states left out.
    Resolvent(LinearInH),
    /// f(constant + slope H), the omitted states left out.
    Function(ScalarFunction, LinearInH),
    /// An operator of which only the symmetry is given.
    Tensor(TensorTerm),
    Adjoint(OperatorTerm),
    Call(Call),
}

/// An operator known by its ranks alone.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct TensorTerm {
    pub tensor: Tensor,
    pub component: Option<String>,
    pub along: Option<Direction>,
}

/// The direction a vector operator is taken along.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum Direction {
    Fixed(Polarization),
    /// The polarization of the light, left open.
    Light,
    /// Its complex conjugate.
    LightConjugate,
}

/// An operator as written, its arguments not yet numbers.
#[derive(Clone, Debug)]
pub struct AtomTerm {
    pub name: String,
    pub component: Option<String>,
    /// Stands in place of a component.
    pub along: Option<Direction>,
    pub arguments: Vec<ScalarTerm>,
    pub power: i64,
}

/// constant + slope H on the space without the omitted states.
#[derive(Clone, Debug)]
pub struct LinearInH {
    pub constant: ScalarTerm,
    pub slope: ScalarTerm,
    pub omitted: Vec<OmittedTerm>,
}

#[derive(Clone, Debug)]
pub enum OmittedTerm {
    /// The prime: the level of this state.
    LevelOf(StateTerm),
    /// `without P`
    Manifold(ManifoldTerm),
}

#[derive(Clone, Debug)]
pub enum KetNode {
    State(StateTerm),
    Applied(OperatorTerm, KetTerm),
    Sum(Vec<KetTerm>),
    Scaled(ScalarTerm, KetTerm),
    Call(Call),
}

/// A state of a system by its label; computed parts of the label are terms.
#[derive(Clone, Debug)]
pub struct StateTerm {
    pub system: String,
    pub label: LabelTerm,
    pub place: Place,
}

/// All states that carry a label.
#[derive(Clone, Debug)]
pub struct ManifoldTerm {
    pub system: String,
    pub label: LabelTerm,
    pub place: Place,
}

#[derive(Clone, Debug)]
pub struct LabelTerm {
    pub parts: Vec<LabelPiece>,
    pub options: Vec<(String, ScalarTerm)>,
    pub text: Arc<str>,
}

#[derive(Clone, Debug)]
pub enum LabelPiece {
    Text(String),
    Computed(ScalarTerm),
}

/// The system a ket lives in.
pub fn system_of(ket: &KetTerm) -> Option<&str> {
    match &*ket.node {
        KetNode::State(state) => Some(&state.system),
        KetNode::Applied(_, inner) | KetNode::Scaled(_, inner) => system_of(inner),
        KetNode::Sum(terms) => terms.first().and_then(system_of),
        KetNode::Call(call) => match &call.definition.body {
            Meaning::Ket(body) => system_of(body),
            _ => None,
        },
    }
}
