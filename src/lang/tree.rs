//! The tree of a session: what the parser builds and the printer writes.
//!
//! The tree is untyped: whether `V` is a number, an operator or a state is decided in `theory`, where the session's names are known.
//! Every node carries the byte span of the text it came from; two trees are *the same* when they agree apart from spans (`same_as`).

// Variants differ in size; a session holds a few hundred of them, and boxes in patterns would cost more than they save.
#![allow(clippy::large_enum_variant)]

use serde::Serialize;

/// Byte range `start..end` in the source text.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Debug, Default, Hash, Serialize)]
pub struct Span {
    pub start: usize,
    pub end: usize,
}

impl Span {
    pub fn new(start: usize, end: usize) -> Self {
        Span { start, end }
    }

    /// The smallest span that covers both.
    pub fn to(self, other: Span) -> Span {
        Span { start: self.start.min(other.start), end: self.end.max(other.end) }
    }
}

/// A name with the place where it stands. Spelt in the ASCII form (`omega` for `ω`).
#[derive(Clone, PartialEq, Eq, Debug, Serialize)]
pub struct Name {
    pub text: String,
    pub span: Span,
}

/// An entry of a session.
#[derive(Clone, PartialEq, Debug, Serialize)]
pub struct Entry {
    pub kind: EntryKind,
    pub span: Span,
}

#[derive(Clone, PartialEq, Debug, Serialize)]
pub enum EntryKind {
    /// `digits 50`, `digits exact`
    Digits(DigitsWanted),
    /// `constants CODATA-2022`
    Constants(Name),
    /// `system h = hydrogenic(Z=1)`
    System { name: Name, kind: Name, arguments: Vec<Argument> },
    /// `state g = h[1s]`
    State { name: Name, system: Name, label: Label },
    /// `manifold P = he[2^3P]`
    Manifold { name: Name, system: Name, label: Label },
    /// `operator …`, `resolvent …`, `ket …`, `define …`
    Definition { kind: DefinitionKind, name: Name, parameters: Vec<Name>, body: Expr },
    /// An expression to evaluate, `EXPR in UNIT` when a unit is asked for
    Evaluate { expression: Expr, unit: Option<Expr> },
    /// `formula EXPR`, `crosscheck EXPR`, `contributions EXPR`
    Inspect { verb: InspectVerb, expression: Expr },
    /// `paths EXPR`, `paths A with B`
    Paths { expression: Expr, beside: Option<Expr> },
    /// `compare A with B`
    Compare { left: Expr, right: Expr },
    /// `expect A = B`
    Expect { left: Expr, right: Expr },
    /// `sweep w from A to B step C: e1, e2, …`
    Sweep { variable: Name, from: Expr, to: Expr, step: Expr, columns: Vec<Expr> },
    /// `converge EXPR over he.size = 100, 200, 400`
    Converge { expression: Expr, system: Name, field: Name, values: Vec<Expr> },
    /// `budget "title" in MHz { "label": EXPR … }`
    Budget { title: String, unit: Option<Expr>, lines: Vec<BudgetLine> },
}

/// One line of a budget; `measured: EXPR` is the line the total is compared with.
#[derive(Clone, PartialEq, Debug, Serialize)]
pub struct BudgetLine {
    pub label: BudgetLabel,
    pub value: Expr,
}

#[derive(Clone, PartialEq, Debug, Serialize)]
pub enum BudgetLabel {
    Contribution(String),
    Measured,
}

#[derive(Clone, PartialEq, Debug, Serialize)]
pub enum DigitsWanted {
    /// `digits exact`
    Exact,
    /// The expression after `digits`; it must come out as a whole number.
    Count(Expr),
}

#[derive(Clone, Copy, PartialEq, Eq, Debug, Serialize)]
pub enum DefinitionKind {
    Operator,
    Resolvent,
    Ket,
    Define,
    Polarization,
}

#[derive(Clone, Copy, PartialEq, Eq, Debug, Serialize)]
pub enum InspectVerb {
    Formula,
    Crosscheck,
    Contributions,
}

/// An expression with its place.
#[derive(Clone, PartialEq, Debug, Serialize)]
pub struct Expr {
    pub kind: ExprKind,
    pub span: Span,
}

#[derive(Clone, PartialEq, Debug, Serialize)]
pub enum ExprKind {
    /// A whole number or decimal as it was spelt (`12`, `0.10`, `1.5e-3`): always an exact rational.
    Number(String),
    /// `725(3)`, `1.50(25)e3`, `725 +- 3`: a value and its standard uncertainty, both spelt as decimals of the same scale
    /// (`1.5(2)` is value `1.5`, uncertainty `0.2`).
    Measured {
        value: String,
        uncertainty: String,
    },
    /// A name, with its component where it has one: `g`, `pi`, `D_z`, `D_+1`, `L_z`, `H`.
    Name(String),
    /// `codata.alpha`, `he.size`
    Member {
        owner: Name,
        field: Name,
    },
    /// `"h.mtx"`: a file name; only as an argument
    Text(String),
    /// `[a, b]`: only as an argument (rows of a matrix)
    List(Vec<Expr>),
    /// `f(x, …)`, and with a component `C(2)_0` (subscript `0`; `+1`, `-1`, `i`, …)
    Call {
        name: Name,
        arguments: Vec<Argument>,
        subscript: Option<String>,
    },
    /// `h[1s]` where a state is meant
    Labelled {
        system: Name,
        label: Label,
    },
    Negate(Box<Expr>),
    Binary {
        operation: Operation,
        left: Box<Expr>,
        right: Box<Expr>,
    },
    /// `X'`
    Primed(Box<Expr>),
    /// `X without P`
    Without {
        body: Box<Expr>,
        manifold: Name,
    },
    /// `<a| X |b>`; `<a|b>` when there is nothing between
    Bracket {
        bra: StateRef,
        chain: Option<Box<Expr>>,
        ket: StateRef,
    },
    /// A lone `|g>`
    Ket(StateRef),
    /// A lone `<g|`
    Bra(StateRef),
}

#[derive(Clone, Copy, PartialEq, Eq, Debug, Serialize)]
pub enum Operation {
    Add,
    Subtract,
    /// `*` or `·`
    Multiply,
    /// Side by side
    Juxtapose,
    Divide,
    Power,
}

/// What stands inside a bra or ket: `g`, `u(w)`, `h[2p, m=1]`.
#[derive(Clone, PartialEq, Debug, Serialize)]
pub struct StateRef {
    pub kind: StateRefKind,
    pub span: Span,
}

#[derive(Clone, PartialEq, Debug, Serialize)]
pub enum StateRefKind {
    Named { name: Name, arguments: Vec<Expr> },
    Labelled { system: Name, label: Label },
}

/// A label in square brackets: `1s`, `{n}p, m=1`, `2^3P_1, M=0`.
#[derive(Clone, PartialEq, Debug, Serialize)]
pub struct Label {
    pub parts: Vec<LabelPart>,
    pub options: Vec<(Name, Expr)>,
    pub span: Span,
}

#[derive(Clone, PartialEq, Debug, Serialize)]
pub enum LabelPart {
    /// Literal text without blanks, superscripts already in the ASCII form (`2^3P_1`)
    Text(String),
    /// `{n}`: a computed whole number
    Computed(Expr),
}

#[derive(Clone, PartialEq, Debug, Serialize)]
pub enum Argument {
    Positional(Expr),
    /// `Z=1`
    Named {
        name: Name,
        value: Expr,
    },
    /// `w in a .. b`
    Range {
        variable: Name,
        from: Expr,
        to: Expr,
    },
    /// `w at w0`
    At {
        variable: Name,
        point: Expr,
    },
    /// `2^3P_0: 31.9 GHz`
    Level {
        label: Label,
        value: Expr,
    },
}
