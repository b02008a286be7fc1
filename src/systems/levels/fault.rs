//! What can be wrong with a level table, as data, with its words.

use super::labels::half;
use super::reader::{Column, RowKind};
use super::units::{DIPOLE_UNITS, ENERGY_UNITS};
use crate::angular::LabelError;
use crate::angular::tensor::LARGEST_RANK;

/// Most defects of one file that are told; reading stops there.
pub const MOST_FAULTS: usize = 20;

/// Most lines a table may have.
pub const MOST_LINES: usize = 100_000;

/// Most levels and most elements a table may have.
pub const MOST_LEVELS: usize = 10_000;
pub const MOST_ELEMENTS: usize = 50_000;

/// Most cells a line may have.
pub const MOST_CELLS: usize = 1000;

/// Most characters a cell may have.
pub const LONGEST_CELL: usize = 1000;

/// What the value of an element is.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Quantity {
    /// `<from||T||to>`.
    Reduced,
    /// Of absorption from the lower to the upper level.
    OscillatorStrength,
    /// `|<from||T||to>|^2`.
    LineStrength,
}

impl Quantity {
    pub const WORDS: [&str; 3] = ["reduced", "oscillator_strength", "line_strength"];

    /// The quantity of a word; none means a reduced element.
    pub fn named(word: &str) -> Option<Self> {
        match word {
            "" | "reduced" => Some(Quantity::Reduced),
            "oscillator_strength" => Some(Quantity::OscillatorStrength),
            "line_strength" => Some(Quantity::LineStrength),
            _ => None,
        }
    }
}

/// A defect with its line and column; lines are counted from 1.
#[derive(Clone, PartialEq, Debug)]
pub struct TableFault {
    pub line: usize,
    pub column: Option<Column>,
    pub defect: Defect,
}

/// What is wrong.
#[derive(Clone, PartialEq, Debug, thiserror::Error)]
pub enum Defect {
    #[error("the file is empty")]
    Empty,
    #[error("a row stands above the header that names its columns")]
    NoHeader,
    #[error("the cells of this file are separated by {}, where commas are wanted", if *.tab { "tabs" } else { "semicolons" })]
    Separator { tab: bool },
    #[error("`{name}` is not a column of a level table")]
    UnknownColumn { name: String, near: Option<&'static str> },
    #[error("the column `{}` stands twice in the header", .column.word())]
    RepeatedColumn { column: Column },
    #[error("the header in line {header} lacks the column `{}` that {} rows need", .column.word(), .kind.word())]
    MissingColumn { header: usize, column: Column, kind: RowKind },
    #[error("this row has {found} cells, where the header in line {header} names {wanted} columns")]
    TooManyCells { found: usize, wanted: usize, header: usize },
    #[error("a quotation mark is opened and not closed in this line")]
    Quote,
    #[error("this cell has {length} characters, more than the {LONGEST_CELL} that are read")]
    LongCell { length: usize },
    #[error("this line has {found} cells, more than the {MOST_CELLS} that are read")]
    ManyCells { found: usize },
    #[error("the table has more than {MOST_LINES} lines")]
    TooManyLines,
    #[error("the table has more than {MOST_LEVELS} levels")]
    TooManyLevels,
    #[error("the table has more than {MOST_ELEMENTS} elements")]
    TooManyElements,
    #[error("`{word}` is not a kind of row")]
    UnknownRow { word: String, near: Option<&'static str> },
    #[error("nothing stands here, and {} rows need it", .kind.word())]
    MissingCell { kind: RowKind },
    #[error("`{text}` stands in a column that {} rows do not have", .kind.word())]
    ForeignCell { text: String, kind: RowKind },
    #[error("`{name}` cannot be the name of a level: `{sign}` does not stand in a label")]
    Name { name: String, sign: char },
    #[error("{0}")]
    Label(LabelError),
    #[error("J is not given, and the name `{name}` does not say it")]
    MissingMomentum { name: String },
    #[error("`{text}` is not a J")]
    Momentum { text: String },
    #[error("J = {} contradicts the label {name}, {allowed}", half(*.twice_j))]
    MomentumOfLabel { name: String, twice_j: i32, allowed: String },
    #[error("J = {} is {}, and J = {} of line {other_line} is {}: an atom has one kind", half(*.twice_j), kind(*.twice_j), half(*.other), kind(*.other))]
    MixedMomenta { twice_j: i32, other: i32, other_line: usize },
    #[error("the parity is not given, and the name `{name}` does not say it")]
    MissingParity { name: String },
    #[error("`{text}` is not a parity")]
    Parity { text: String },
    #[error("the parity {} contradicts the label {name}, which says {}", parity(*.odd), parity(!*.odd))]
    ParityOfLabel { name: String, odd: bool },
    #[error("the level `{name}` is given in line {earlier} already")]
    RepeatedLevel { name: String, earlier: usize },
    #[error("`{text}` is not a number")]
    Number { text: String },
    #[error("`{text}` is no finite number")]
    NotFinite { text: String },
    #[error("the uncertainty of `{text}` is negative")]
    NegativeUncertainty { text: String },
    #[error("this number is longer than any measurement")]
    LongNumber,
    #[error("`{unit}` is not a unit of energy")]
    EnergyUnit { unit: String, near: Option<&'static str> },
    #[error("`{unit}` is not a unit of {of}")]
    ElementUnit { unit: String, of: String, wanted: String },
    #[error("there is no level `{name}` in this table")]
    UnknownLevel { name: String, near: Option<String> },
    #[error("`{name}` cannot be the name of an operator{why}")]
    OperatorName { name: String, why: &'static str },
    #[error("the rank of `{operator}` is not given")]
    MissingRank { operator: String },
    #[error("`{text}` is not a rank")]
    RankNumber { text: String },
    #[error("the rank of `{operator}` is {rank} here and {other} in line {other_line}")]
    RankDiffers { operator: String, rank: u32, other: u32, other_line: usize },
    #[error("D, the dipole, has rank 1, not {rank}")]
    RankOfDipole { rank: u32 },
    #[error("an operator of rank {rank} does not connect {from} and {to}: J = {}, {rank} and J = {} form no triangle", half(*.twice_from), half(*.twice_to))]
    Triangle { rank: u32, from: String, to: String, twice_from: i32, twice_to: i32 },
    #[error("D changes the parity, and {from} and {to} are both {}", parity(*.odd))]
    ParityOfDipole { from: String, to: String, odd: bool },
    #[error("`{operator}` {} the parity here and {} it in line {other_line}", changes(*.odd), changes(!*.odd))]
    ParityDiffers { operator: String, odd: bool, other_line: usize },
    #[error("`{word}` is not a quantity")]
    Quantity { word: String, near: Option<&'static str> },
    #[error("an oscillator strength belongs to D, and the operator is `{operator}`")]
    StrengthOfOperator { operator: String },
    #[error("a strength is not negative; this one is {value}")]
    NegativeStrength { value: String },
    #[error("a strength of zero with an uncertainty has no reduced element with an uncertainty")]
    UncertainZero,
    #[error("the oscillator strength is that of absorption, and {from} does not lie below {to}")]
    Downward { from: String, to: String },
    #[error("the element of `{operator}` between {from} and {to} is given in line {earlier} already{}", if *.contradicts { ", with another value" } else { "" })]
    RepeatedElement { operator: String, from: String, to: String, earlier: usize, contradicts: bool },
    #[error("the table has no level")]
    NoLevels,
}

fn kind(twice: i32) -> &'static str {
    if twice % 2 == 0 { "a whole number" } else { "half an odd number" }
}

fn parity(odd: bool) -> &'static str {
    if odd { "odd" } else { "even" }
}

fn changes(odd: bool) -> &'static str {
    if odd { "changes" } else { "keeps" }
}

fn meant(near: Option<&str>, otherwise: impl FnOnce() -> String) -> String {
    near.map_or_else(otherwise, |near| format!("did you mean `{near}`?"))
}

impl TableFault {
    /// Where it is, in the words of messages: `line 3, column energy`.
    pub fn place(&self) -> String {
        match self.column {
            Some(column) => format!("line {}, column {}", self.line, column.word()),
            None => format!("line {}", self.line),
        }
    }

    /// Place and defect in one line.
    pub fn to_text(&self) -> String {
        format!("{}: {}", self.place(), self.defect)
    }
}

impl Defect {
    /// What to write instead.
    pub fn help(&self) -> String {
        let header = "begin with a header, as `row,name,energy,unit,J,parity`, and then `level,4s_1/2,0,cm^-1,,`";
        match self {
            Defect::Empty | Defect::NoLevels | Defect::NoHeader => header.into(),
            Defect::Separator { .. } => "save the table with commas between its cells and points in its decimals".into(),
            Defect::UnknownColumn { near, .. } => meant(*near, || format!("the columns are {}", words(&Column::ALL.map(Column::word)))),
            Defect::RepeatedColumn { .. } => "give every column a name of its own".into(),
            Defect::MissingColumn { column, .. } => format!("write `{}` into the header, over its cells", column.word()),
            Defect::TooManyCells { .. } => "put a cell with a comma in it into quotation marks, and leave out what has no column".into(),
            Defect::Quote => "close it in the same line; a cell holds no line end".into(),
            Defect::ManyCells { .. } => "a row has a cell for each column of its header, twelve at most".into(),
            Defect::LongCell { .. } => "write notes into comment lines, which begin with #".into(),
            Defect::TooManyLines | Defect::TooManyLevels | Defect::TooManyElements => "keep the levels that matter".into(),
            Defect::UnknownRow { near, .. } => meant(*near, || "a row begins with `level` or `element`, a header with `row`, a comment with #".into()),
            Defect::MissingCell { .. } => "fill the cell, or leave the whole row out".into(),
            Defect::ForeignCell { .. } => "leave the cell empty".into(),
            Defect::Name { .. } => "letters, digits and ^ _ / + - . * make a label, as in 4p_3/2, 2^3P_1 or a5D4".into(),
            Defect::Label(error) => error.help(),
            Defect::MissingMomentum { .. } => "write it into the column J, or into the label as in 4p_3/2".into(),
            Defect::Momentum { .. } => format!("J is 0, 1/2, 1, 3/2, … up to {}", half(super::numbers::LARGEST_TWICE_J)),
            Defect::MomentumOfLabel { .. } => "mend one of the two, or leave the column J empty".into(),
            Defect::MixedMomenta { .. } => "an even number of electrons has whole J, an odd number half-integer J".into(),
            Defect::MissingParity { .. } => "write `even` or `odd` into the column parity".into(),
            Defect::Parity { .. } => "write `even` or `odd`".into(),
            Defect::ParityOfLabel { name, odd } if name.contains('^') => {
                format!("mark a term whose parity is not (-1)^L, as {name}^{}, or mend the column", if *odd { "o" } else { "e" })
            }
            Defect::ParityOfLabel { .. } => "one electron has the parity (-1)^l: mend one of the two, or leave the column empty".into(),
            Defect::RepeatedLevel { .. } => "give each level one row and a name of its own".into(),
            Defect::Number { .. } => "write a decimal such as 12985.185724, with an uncertainty 12985.185724(3) or 4.106 +- 0.004".into(),
            Defect::NotFinite { .. } => "leave out the row of a number that is not known".into(),
            Defect::NegativeUncertainty { .. } => "a standard uncertainty is positive, or zero".into(),
            Defect::LongNumber => "write the digits that are known".into(),
            Defect::EnergyUnit { near, .. } => meant(*near, || format!("energies are in {}", words(&ENERGY_UNITS))),
            Defect::ElementUnit { wanted, .. } => wanted.clone(),
            Defect::UnknownLevel { near, .. } => meant(near.as_deref(), || "give the level a row of its own".into()),
            Defect::OperatorName { .. } => "an operator has a name of letters and digits, as D, Q or M1; its component is written in the session, as Q_0".into(),
            Defect::MissingRank { .. } => "write the rank of the tensor into the column rank: 0 for a scalar, 1 for a vector, 2 for a quadrupole".into(),
            Defect::RankNumber { .. } => format!("a rank is a whole number from 0 to {LARGEST_RANK}"),
            Defect::RankDiffers { .. } => "give operators of different rank different names".into(),
            Defect::RankOfDipole { .. } => "leave the rank of D out, or give the operator another name".into(),
            Defect::Triangle { .. } => "the element is zero by the selection rule: leave the row out, or mend J or the rank".into(),
            Defect::ParityOfDipole { .. } => "leave the row out, mend a parity, or give the operator another name".into(),
            Defect::ParityDiffers { .. } => "give an operator for each parity".into(),
            Defect::Quantity { near, .. } => meant(*near, || format!("it is {}; without a word it is {}", words(&Quantity::WORDS), Quantity::WORDS[0])),
            Defect::StrengthOfOperator { .. } => "give a line strength or a reduced element".into(),
            Defect::NegativeStrength { .. } => "write its absolute value; the strength of emission is given as that of absorption, from the lower level".into(),
            Defect::UncertainZero => "give the reduced element, as 0(1), or leave the row out".into(),
            Defect::Downward { from, to } => format!("write it from {to} to {from}: f(absorption) = f(emission) times 2J+1 of the upper level over that of the lower"),
            Defect::RepeatedElement { .. } => "keep one: the element of the opposite direction follows by Hermiticity".into(),
        }
    }
}

fn words(list: &[&str]) -> String {
    list.join(", ")
}

/// What to write as the unit of a dipole element.
pub fn dipole_units() -> String {
    format!("dipole elements are in {}; an empty cell means e a0", words(&DIPOLE_UNITS))
}
