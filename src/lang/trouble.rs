//! The parsers' own error: where reading got furthest, and what would have been welcome there.

use nom::error::{ErrorKind, ParseError};
use nom::{Err, IResult};

use super::fault::Fault;

/// What could have come next. A set of these is a bit mask, so that joining the sets of many branches costs nothing.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Wanted {
    Operand,
    Name,
    State,
    Label,
    SystemKind,
    Unit,
    WholeNumber,
    QuotedText,
    Equals,
    Comma,
    Colon,
    Dots,
    OpenParenthesis,
    OpenSquare,
    OpenCurly,
    CloseParenthesis,
    CloseSquare,
    CloseCurly,
    Bar,
    CloseAngle,
    With,
    Over,
    From,
    To,
    Step,
    Dot,
    BudgetLine,
    EndOfEntry,
}

impl Wanted {
    const ALL: [Wanted; 28] = [
        Wanted::Operand,
        Wanted::Name,
        Wanted::State,
        Wanted::Label,
        Wanted::SystemKind,
        Wanted::Unit,
        Wanted::WholeNumber,
        Wanted::QuotedText,
        Wanted::Equals,
        Wanted::Comma,
        Wanted::Colon,
        Wanted::Dots,
        Wanted::OpenParenthesis,
        Wanted::OpenSquare,
        Wanted::OpenCurly,
        Wanted::CloseParenthesis,
        Wanted::CloseSquare,
        Wanted::CloseCurly,
        Wanted::Bar,
        Wanted::CloseAngle,
        Wanted::With,
        Wanted::Over,
        Wanted::From,
        Wanted::To,
        Wanted::Step,
        Wanted::Dot,
        Wanted::BudgetLine,
        Wanted::EndOfEntry,
    ];

    /// Names the thing as it stands in a sentence.
    pub fn phrase(self) -> &'static str {
        match self {
            Wanted::Operand => "a number, a name, a bra or a bracket",
            Wanted::Name => "a name",
            Wanted::State => "a state",
            Wanted::Label => "a label such as `1s`",
            Wanted::SystemKind => "a kind of system such as `hydrogenic(Z=1)`",
            Wanted::Unit => "a unit such as `MHz`",
            Wanted::WholeNumber => "a whole number or `exact`",
            Wanted::QuotedText => "a text in quotes",
            Wanted::Equals => "`=`",
            Wanted::Comma => "`,`",
            Wanted::Colon => "`:`",
            Wanted::Dots => "`..`",
            Wanted::OpenParenthesis => "`(`",
            Wanted::OpenSquare => "`[`",
            Wanted::OpenCurly => "`{`",
            Wanted::CloseParenthesis => "`)`",
            Wanted::CloseSquare => "`]`",
            Wanted::CloseCurly => "`}`",
            Wanted::Bar => "`|`",
            Wanted::CloseAngle => "`>`",
            Wanted::With => "`with`",
            Wanted::Over => "`over`",
            Wanted::From => "`from`",
            Wanted::To => "`to`",
            Wanted::Step => "`step`",
            Wanted::Dot => "`.`",
            Wanted::BudgetLine => "a line `\"label\": value` or `measured: value`",
            Wanted::EndOfEntry => "the end of the entry",
        }
    }
}

/// A set of things wanted at one place.
#[derive(Clone, Copy, PartialEq, Eq, Debug, Default)]
pub struct WantedSet(u32);

impl WantedSet {
    pub fn joined(self, other: WantedSet) -> WantedSet {
        WantedSet(self.0 | other.0)
    }

    pub fn contains(self, wanted: Wanted) -> bool {
        self.0 & WantedSet::from(wanted).0 != 0
    }

    pub fn is_empty(self) -> bool {
        self.0 == 0
    }

    pub fn members(self) -> impl Iterator<Item = Wanted> {
        Wanted::ALL.into_iter().filter(move |wanted| self.contains(*wanted))
    }
}

impl From<Wanted> for WantedSet {
    fn from(wanted: Wanted) -> Self {
        WantedSet(1 << wanted as u32)
    }
}

/// Why reading stopped.
#[derive(Clone, PartialEq, Debug)]
pub(super) enum Reason {
    Wanted(WantedSet),
    /// Something recognised as wrong, with a sentence of its own.
    Fault(Box<Fault>),
}

/// An error of a parser: how much text was left, and why it stopped there.
///
/// The part of the text it concerns runs from `left` bytes before the end to `left_after` bytes before the end.
#[derive(Clone, PartialEq, Debug)]
pub(super) struct Trouble {
    pub left: usize,
    pub left_after: usize,
    pub reason: Reason,
}

impl Trouble {
    pub fn wanted(rest: &str, wanted: Wanted) -> Self {
        Trouble { left: rest.len(), left_after: rest.len(), reason: Reason::Wanted(wanted.into()) }
    }

    /// The one that got further; at the same place a recognised fault speaks louder, and sets of wants are joined.
    pub fn or_further(self, other: Trouble) -> Trouble {
        if self.left != other.left {
            return if self.left < other.left { self } else { other };
        }
        match (&self.reason, &other.reason) {
            (Reason::Wanted(mine), Reason::Wanted(theirs)) => {
                Trouble { reason: Reason::Wanted(mine.joined(*theirs)), ..self }
            }
            (Reason::Wanted(_), Reason::Fault(_)) => other,
            (Reason::Fault(_), _) => self,
        }
    }
}

impl ParseError<&str> for Trouble {
    fn from_error_kind(input: &str, _: ErrorKind) -> Self {
        Trouble { left: input.len(), left_after: input.len(), reason: Reason::Wanted(WantedSet::default()) }
    }

    fn append(_: &str, _: ErrorKind, other: Self) -> Self {
        other
    }

    fn or(self, other: Self) -> Self {
        self.or_further(other)
    }
}

pub(super) type Parsed<'a, T> = IResult<&'a str, T, Trouble>;

/// Stops reading for good at the text between `from` and `to` (both are rests of the same text).
// Kept out of line: these values are large, and the parsers that recurse must not carry them in their frames.
#[cold]
#[inline(never)]
pub(super) fn fault<T>(from: &str, to: &str, fault: Fault) -> Result<T, Err<Trouble>> {
    Err(Err::Failure(Trouble { left: from.len(), left_after: to.len(), reason: Reason::Fault(Box::new(fault)) }))
}
