//! What can be wrong with a text, as data. The sentence for each kind is in `sentences`.

use super::tree::Span;
use super::trouble::WantedSet;

/// What stands at the place where something else was wanted.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum Found {
    EndOfEntry,
    Token(String),
}

/// Everything that can be wrong with the text of an entry or a session file.
#[derive(Clone, PartialEq, Debug)]
pub enum Fault {
    /// Something else was wanted here, and nothing better can be said.
    Wanted {
        wanted: WantedSet,
        found: Found,
    },
    /// An operand is missing, after the operator or opening given.
    NoOperand {
        after: Option<String>,
        found: Found,
    },
    /// A complete entry is followed by something that cannot go on from there.
    CannotFollow(String),
    UnknownCharacter(char),
    ControlCharacter(char),
    EntryTooLong {
        bytes: usize,
        limit: usize,
    },
    TooDeep {
        limit: usize,
    },
    TooManyTerms {
        limit: usize,
    },
    LiteralTooLong {
        digits: usize,
        limit: usize,
    },
    ExponentTooLarge {
        limit: u32,
    },
    /// `+3`
    LeadingPlus,
    /// `f(a=1 b=2)`
    NoComma,
    /// `5.` or `.5` or `1.2.3`
    DecimalPoint,
    /// `1.5(1.2)`
    ConciseWithPoint {
        value: String,
        uncertainty: String,
    },
    /// `1.5e3(2)`
    ConciseAfterExponent {
        mantissa: String,
        exponent: String,
        uncertainty: String,
    },
    /// `a +- 3`
    PlusMinus,
    /// `1 000`
    NumbersSideBySide,
    DoubleStar,
    Unclosed {
        bracket: char,
        opened: Span,
        found: Found,
    },
    /// `)` with nothing open
    NothingToClose(char),
    TrailingComma,
    /// `<` that does not begin a bra: `E < 3`
    NotABra(Found),
    /// `<1s|`, `|2p>`
    BareLabel {
        label: String,
        ket: bool,
    },
    BraWithoutBar {
        bra: String,
        found: Found,
    },
    /// `<g| D_z` with no ket before the end
    MissingKet {
        bra: Span,
        bra_text: String,
        behind_ket: bool,
        found: Found,
    },
    /// `<g| D_z |` with no state after the last bar
    EmptyKet,
    /// `|g` not closed by `>`
    KetUnclosed {
        ket: String,
        found: Found,
    },
    /// `<a| V W>`: what stands before `>` is not a state
    NotAState,
    LoneKet(String),
    LoneBra(String),
    StrayBar,
    StrayAngle,
    /// A reserved word where a name or a value should be
    Reserved {
        word: String,
        begins_entry: bool,
    },
    PromptCommand(String),
    /// `define list = …`
    CommandAsName(String),
    MisspeltEntry {
        word: String,
        meant: &'static str,
    },
    NotDeclared {
        name: String,
        call: bool,
    },
    StrayEquals,
    EmptyLabel,
    LabelBlank,
    LabelOption,
    /// `h [1s]`
    LabelApart,
    SquareBrackets,
    CurlyBrackets,
    TextOutside,
    UnclosedText,
    Prime {
        blank: bool,
    },
    PrimeAfterPower,
    /// `state g = 1s`
    NeedsSystem {
        word: &'static str,
        name: String,
        label: String,
    },
    /// `state g = h` or `state g = h(1s)`
    NeedsLabel {
        word: &'static str,
        name: String,
        system: String,
    },
    /// `system h = hydrogenic` without parentheses
    SystemArguments {
        kind: String,
    },
    /// `resolvent = …`
    NamelessDefinition {
        word: String,
    },
    Digits(Found),
    Semicolon,
    Factorial,
    Backslash,
    Relation(String),
    /// A sign with no meaning: `$`, `&`, …
    Sign(char),
    SecondEntry,
    EmptyEntry,
    MissingHeader,
    WrongVersion(String),
    RecordWithoutEntry,
    RecordNotIndented,
    ProvenanceTooLate,
}
