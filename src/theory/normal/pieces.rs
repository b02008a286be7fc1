//! What chains are made of once they are multiplied out.

use super::NormalSum;
use super::expand::Strings;
use crate::angular::tensor::Sign;
use crate::theory::terms::{Direction, OmittedTerm, Place, ScalarFunction, StateTerm, TensorTerm};
use rug::Rational;
use std::fmt;

/// A part of a chain. Bras and kets stand inside a string of pieces where a projector |a><b| was multiplied out.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum Piece {
    Ket(NamedState),
    Bra(NamedState),
    Atom(NormalAtom),
    Tensor(NormalTensor),
    Named(NamedOperator),
    Hamiltonian,
    Function(FunctionPiece),
}

/// An eigenstate with nothing left to compute in its label.
#[derive(Clone, Debug)]
pub struct NamedState {
    pub term: StateTerm,
    /// `h[2p, m=1]`: system and label as text.
    pub name: String,
    /// How the session calls it: `g`, or the name.
    pub shown: String,
}

impl PartialEq for NamedState {
    fn eq(&self, other: &Self) -> bool {
        self.name == other.name
    }
}

impl Eq for NamedState {}

/// An operator of the vocabulary or of a matrix.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct NormalAtom {
    pub name: String,
    pub component: Option<String>,
    pub along: Option<Direction>,
    pub arguments: Vec<Rational>,
    pub power: i64,
}

/// A sum of operators that is its own adjoint, by the name it has in the session.
#[derive(Clone, Debug)]
pub struct NamedOperator {
    pub text: String,
    /// What it stands for: sums of strings without symbols or brackets.
    pub expanded: Strings,
}

impl PartialEq for NamedOperator {
    fn eq(&self, other: &Self) -> bool {
        self.text == other.text
    }
}

impl Eq for NamedOperator {}

/// An operator known by its ranks.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct NormalTensor {
    pub term: TensorTerm,
    pub adjoint: bool,
}

/// A function of H, its argument written with H to the first power and the factor +-1.
#[derive(Clone, Debug)]
pub struct FunctionPiece {
    /// How it is shown: `R(w)`, or `1/(E(g) + w - H)'`.
    pub label: String,
    /// Two functions with one key are the same.
    pub key: String,
    /// `None` for a fraction.
    pub function: Option<ScalarFunction>,
    pub constant: NormalSum,
    /// The sign of H.
    pub slope: Sign,
    pub omitted: Vec<OmittedTerm>,
}

impl PartialEq for FunctionPiece {
    fn eq(&self, other: &Self) -> bool {
        self.key == other.key
    }
}

impl Eq for FunctionPiece {}

/// <bra| pieces |ket>
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct NormalBracket {
    pub bra: NamedState,
    /// Operators and functions of H only.
    pub pieces: Vec<Piece>,
    pub ket: NamedState,
    /// Where the bracket is written.
    pub place: Place,
}

/// The adjoint of pieces in a row, with its sign: the pieces turned round, each its adjoint.
pub(super) fn adjoint(pieces: &[Piece]) -> (Sign, Vec<Piece>) {
    let mut sign = Sign::Plus;
    let mut turned = Vec::with_capacity(pieces.len());
    for piece in pieces.iter().rev() {
        let (own, piece) = piece.adjoint();
        sign = sign.times(own);
        turned.push(piece);
    }
    (sign, turned)
}

impl Piece {
    fn adjoint(&self) -> (Sign, Piece) {
        let piece = match self {
            Piece::Ket(state) => Piece::Bra(state.clone()),
            Piece::Bra(state) => Piece::Ket(state.clone()),
            Piece::Atom(atom) => {
                let (sign, atom) = atom.adjoint();
                return (sign, Piece::Atom(atom));
            }
            Piece::Tensor(tensor) => Piece::Tensor(NormalTensor { adjoint: !tensor.adjoint, ..tensor.clone() }),
            Piece::Named(_) | Piece::Hamiltonian => self.clone(),
            Piece::Function(function) => Piece::Function(function.conj()),
        };
        (Sign::Plus, piece)
    }
}

impl NormalAtom {
    /// (T_q)^+ = (-1)^q T_-q for a spherical component; a direction is conjugated; everything else is its own adjoint.
    fn adjoint(&self) -> (Sign, Self) {
        let mut atom = self.clone();
        let mut sign = Sign::Plus;
        match (&self.along, self.component.as_deref()) {
            (Some(along), Some(component)) => {
                atom.along = Some(match along {
                    Direction::Fixed(fixed) => Direction::Fixed(fixed.conj()),
                    Direction::Light => Direction::LightConjugate,
                    Direction::LightConjugate => Direction::Light,
                });
                atom.component = Some(match component.strip_suffix("_conj") {
                    Some(plain) => plain.to_string(),
                    None => format!("{component}_conj"),
                });
            }
            (None, Some(component)) => {
                if let Some(q) = component.parse::<i32>().ok().filter(|q| *q != 0) {
                    atom.component = Some(format!("{:+}", -q));
                    if q % 2 != 0 && self.power % 2 != 0 {
                        sign = Sign::Minus;
                    }
                }
            }
            _ => {}
        }
        (sign, atom)
    }
}

impl FunctionPiece {
    /// The function that stands in the adjoint: its constant conjugated. Symbols are real, so most functions are their own.
    fn conj(&self) -> Self {
        let constant = self.constant.conj();
        if constant == self.constant {
            return self.clone();
        }
        FunctionPiece::written(self.function, constant, self.slope, self.omitted.clone())
    }

    /// A function named by what stands in it.
    pub(super) fn written(
        function: Option<ScalarFunction>,
        constant: NormalSum,
        slope: Sign,
        omitted: Vec<OmittedTerm>,
    ) -> Self {
        let sign = if slope == Sign::Plus { '+' } else { '-' };
        let inner = match (constant.terms.is_empty(), slope) {
            (true, Sign::Plus) => "H".to_string(),
            (true, Sign::Minus) => "-H".to_string(),
            _ => format!("{constant} {sign} H"),
        };
        let mut label = match function {
            None => format!("1/({inner})"),
            Some(function) => format!("{}({inner})", function_name(function)),
        };
        let mut key = label.clone();
        for state in &omitted {
            match state {
                OmittedTerm::LevelOf(state) => {
                    label.push('\'');
                    key += &format!("'{}{}", state.system, state.label.text);
                }
                OmittedTerm::Manifold(manifold) => {
                    let text = format!(" without {}{}", manifold.system, manifold.label.text);
                    label += &text;
                    key += &text;
                }
            }
        }
        FunctionPiece { label, key, function, constant, slope, omitted }
    }
}

pub(super) fn function_name(function: ScalarFunction) -> &'static str {
    match function {
        ScalarFunction::Sqrt => "sqrt",
        ScalarFunction::Exp => "exp",
        ScalarFunction::Ln => "ln",
        ScalarFunction::Sin => "sin",
        ScalarFunction::Cos => "cos",
        ScalarFunction::Abs => "abs",
        ScalarFunction::Conj => "conj",
        ScalarFunction::Re => "re",
        ScalarFunction::Im => "im",
    }
}

/// A text that is the same for equal pieces only.
pub(super) fn pieces_key(pieces: &[Piece]) -> String {
    let piece = |piece: &Piece| match piece {
        Piece::Tensor(tensor) => format!("{tensor:?}"),
        Piece::Atom(atom) => format!("{atom:?}"),
        Piece::Function(function) => function.key.clone(),
        other => other.to_string(),
    };
    pieces.iter().map(piece).collect::<Vec<_>>().join(" ")
}

impl NormalBracket {
    /// A text that is the same for equal brackets only.
    pub(super) fn key(&self) -> String {
        format!("<{}|{}|{}>", self.bra.name, pieces_key(&self.pieces), self.ket.name)
    }

    /// <a|X|b>* = <b|X^+|a>, with the sign of X^+.
    pub(super) fn conj(&self) -> (Sign, Self) {
        let (sign, pieces) = adjoint(&self.pieces);
        (sign, NormalBracket { bra: self.ket.clone(), pieces, ket: self.bra.clone(), place: self.place })
    }
}

impl fmt::Display for NormalAtom {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}", self.name)?;
        if !self.arguments.is_empty() {
            let arguments: Vec<String> = self.arguments.iter().map(Rational::to_string).collect();
            write!(f, "({})", arguments.join(", "))?;
        }
        if let Some(component) = &self.component {
            write!(f, "_{component}")?;
        }
        if self.power != 1 {
            write!(f, "^{}", self.power)?;
        }
        Ok(())
    }
}

impl fmt::Display for NormalTensor {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let element = &self.term.tensor.element;
        if element.name.is_empty() {
            write!(f, "tensor({}, {}, {})", element.orbital, element.spin, self.term.tensor.total)?;
        } else {
            write!(f, "{}", element.name)?;
        }
        if let Some(component) = &self.term.component {
            write!(f, "_{component}")?;
        }
        if self.adjoint { write!(f, "^+") } else { Ok(()) }
    }
}

impl fmt::Display for Piece {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Piece::Ket(state) => write!(f, "|{}>", state.shown),
            Piece::Bra(state) => write!(f, "<{}|", state.shown),
            Piece::Atom(atom) => write!(f, "{atom}"),
            Piece::Tensor(tensor) => write!(f, "{tensor}"),
            Piece::Named(named) => write!(f, "{}", named.text),
            Piece::Hamiltonian => write!(f, "H"),
            Piece::Function(function) => write!(f, "{}", function.label),
        }
    }
}

impl fmt::Display for NormalBracket {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let mut pieces: Vec<String> = Vec::new();
        let mut rest = &self.pieces[..];
        while let Some(first) = rest.first() {
            // the same function of H several times is a power
            let same = match first {
                Piece::Function(_) => rest.iter().take_while(|piece| *piece == first).count(),
                _ => 1,
            };
            pieces.push(if same > 1 { format!("{first}^{same}") } else { first.to_string() });
            rest = &rest[same..];
        }
        if pieces.is_empty() {
            return write!(f, "<{}|{}>", self.bra.shown, self.ket.shown);
        }
        write!(f, "<{}| {} |{}>", self.bra.shown, pieces.join(" "), self.ket.shown)
    }
}
