//! From rows to a checked table: levels first, then the elements between them. Every defect is told, each once.

use super::fault::{Defect, MOST_ELEMENTS, MOST_FAULTS, MOST_LEVELS, Quantity, TableFault, dipole_units};
use super::labels::{momentum_of, shown, spectroscopic};
use super::numbers;
use super::reader::{Column, Row, RowKind, Rows, rows};
use super::table::{Datum, ElementEntry, LevelEntry, OperatorEntry, Table};
use super::units::{ENERGY_UNITS, dipole_in_atomic, dipole_strength_in_atomic, energy_in_hartree};
use crate::angular::{HalfInteger, Label, Parity};
use crate::lang::diagnostic::did_you_mean;
use crate::lang::vocabulary::is_reserved;
use crate::num::units::ConstantSet;
use crate::systems::Block;
use rug::Rational;
use std::collections::BTreeMap;

type Checked<T> = Result<T, TableFault>;

/// The dipole operator, whose rank, parity and units are known.
const DIPOLE: &str = "D";

/// The table of a text, its units by a set of constants.
///
/// Errors: its defects by line, at most [`MOST_FAULTS`].
pub fn table(text: &str, constants: ConstantSet) -> Result<Table, Vec<TableFault>> {
    let Rows { rows, mut faults, levels_left_out } = rows(text);
    let mut work = Work { levels_left_out, constants, ..Work::default() };
    for kind in [RowKind::Level, RowKind::Element] {
        for row in rows.iter().filter(|row| row.kind == kind) {
            if faults.len() >= MOST_FAULTS {
                break;
            }
            let taken = match kind {
                RowKind::Level => work.level(row),
                RowKind::Element => work.element(row),
            };
            faults.extend(taken.err());
        }
    }
    if work.levels.is_empty() && faults.is_empty() {
        faults.push(TableFault { line: 1, column: None, defect: Defect::NoLevels });
    }
    if faults.is_empty() {
        let operators = work.operators.into_iter().map(|(operator, _)| operator).collect();
        return Ok(Table::new(work.levels, operators, work.elements));
    }
    faults.sort_by_key(|fault| (fault.line, fault.column));
    faults.truncate(MOST_FAULTS);
    Err(faults)
}

#[derive(Default)]
struct Work {
    levels: Vec<(LevelEntry, Datum)>,
    /// Line and, where the row is in order, index of each level named.
    names: BTreeMap<String, (usize, Option<usize>)>,
    /// The first level with its line, which decides between whole and half-integer J.
    first: Option<(i32, usize)>,
    operators: Vec<(OperatorEntry, usize)>,
    elements: Vec<(ElementEntry, Datum)>,
    /// By operator, lower and higher level: line and the element with its value.
    pairs: BTreeMap<(usize, usize, usize), (usize, usize)>,
    levels_left_out: bool,
    constants: ConstantSet,
}

impl Work {
    fn level(&mut self, row: &Row) -> Checked<()> {
        let name = row.needed(Column::Name)?.to_string();
        if let Some((earlier, _)) = self.names.get(&name) {
            return Err(row.fault(Column::Name, Defect::RepeatedLevel { name: shown(&name), earlier: *earlier }));
        }
        if self.levels.len() >= MOST_LEVELS {
            return Err(row.fault(Column::Name, Defect::TooManyLevels));
        }
        // known even if something is wrong with it, so that elements do not complain again
        self.names.insert(name.clone(), (row.line, None));
        let (entry, energy) = self.checked_level(row, &name)?;
        self.names.insert(name, (row.line, Some(self.levels.len())));
        self.levels.push((entry, energy));
        Ok(())
    }

    fn checked_level(&mut self, row: &Row, name: &str) -> Checked<(LevelEntry, Datum)> {
        if let Some(sign) = name.chars().find(|c| !c.is_ascii_alphanumeric() && !"^_/+-.*".contains(*c)) {
            return Err(row.fault(Column::Name, Defect::Name { name: shown(name), sign }));
        }
        let label = spectroscopic(name).map_err(|error| row.fault(Column::Name, Defect::Label(error)))?;
        let energy = row.needed(Column::Energy)?;
        let energy = numbers::datum(energy).map_err(|defect| row.fault(Column::Energy, defect))?;
        let unit = row.needed(Column::Unit)?;
        let Some(unit) = energy_in_hartree(unit, self.constants) else {
            let near = did_you_mean(unit, ENERGY_UNITS).and_then(|near| ENERGY_UNITS.into_iter().find(|u| *u == near));
            return Err(row.fault(Column::Unit, Defect::EnergyUnit { unit: shown(unit), near }));
        };
        let twice_j = momentum(row, name, label.as_ref())?;
        let odd = parity(row, name, label.as_ref())?;
        let (other, other_line) = *self.first.get_or_insert((twice_j, row.line));
        if (twice_j - other) % 2 != 0 {
            return Err(row.fault(Column::J, Defect::MixedMomenta { twice_j, other, other_line }));
        }
        let block = Block::Level { twice_j: u32::try_from(twice_j).unwrap_or(0), odd };
        Ok((LevelEntry { name: name.to_string(), label, block, unit }, energy))
    }

    fn element(&mut self, row: &Row) -> Checked<()> {
        if self.elements.len() >= MOST_ELEMENTS {
            return Err(row.fault(Column::From, Defect::TooManyElements));
        }
        let (from, to) = (self.level_named(row, Column::From)?, self.level_named(row, Column::To)?);
        let name = row.needed(Column::Operator)?;
        check_operator_name(row, name)?;
        let rank = self.rank(row, name)?;
        let quantity = quantity(row, name)?;
        let unit = element_unit(row, name, quantity)?;
        let value = row.needed(Column::Value)?;
        let value = numbers::datum(value).map_err(|defect| row.fault(Column::Value, defect))?;
        check_strength(row, quantity, &value)?;
        // what is wrong with a level is told at its own row
        let (Some(from), Some(to)) = (from, to) else { return Ok(()) };
        let odd = self.joined(row, name, rank, from, to)?;
        if quantity == Quantity::OscillatorStrength && self.hartree(from) >= self.hartree(to) {
            let (from, to) = self.names_of(from, to);
            return Err(row.fault(Column::From, Defect::Downward { from, to }));
        }
        let operator = self.operator(row, name, rank, odd)?;
        let entry = ElementEntry { from, to, operator, quantity, unit };
        self.put(row, name, entry, value)
    }

    /// The index of a level, `None` for one whose row has a defect.
    fn level_named(&self, row: &Row, column: Column) -> Checked<Option<usize>> {
        let name = row.needed(column)?;
        match self.names.get(name) {
            Some((_, index)) => Ok(*index),
            None if self.levels_left_out => Ok(None),
            None => {
                let near = did_you_mean(name, self.names.keys().map(String::as_str)).map(str::to_string);
                Err(row.fault(column, Defect::UnknownLevel { name: shown(name), near }))
            }
        }
    }

    fn rank(&self, row: &Row, name: &str) -> Checked<u32> {
        let known = self.operators.iter().find(|(operator, _)| operator.name == name);
        let given = match row.cell(Column::Rank) {
            "" => None,
            text => Some(numbers::rank(text).map_err(|defect| row.fault(Column::Rank, defect))?),
        };
        let operator = || shown(name);
        match (given, known) {
            (Some(rank), _) if name == DIPOLE && rank != 1 => {
                Err(row.fault(Column::Rank, Defect::RankOfDipole { rank }))
            }
            _ if name == DIPOLE => Ok(1),
            (Some(rank), Some((known, line))) if rank != known.rank => {
                let defect = Defect::RankDiffers { operator: operator(), rank, other: known.rank, other_line: *line };
                Err(row.fault(Column::Rank, defect))
            }
            (Some(rank), _) => Ok(rank),
            (None, Some((known, _))) => Ok(known.rank),
            (None, None) => Err(row.fault(Column::Rank, Defect::MissingRank { operator: operator() })),
        }
    }

    /// Whether the operator changes the parity between two levels it may join.
    fn joined(&self, row: &Row, name: &str, rank: u32, from: usize, to: usize) -> Checked<bool> {
        let (a, b) = (&self.levels[from].0, &self.levels[to].0);
        let (twice_from, twice_to) = (a.twice_j(), b.twice_j());
        let twice_rank = 2 * i32::try_from(rank).unwrap_or(0);
        let (from, to) = (a.name.clone(), b.name.clone());
        if twice_rank < (twice_from - twice_to).abs() || twice_rank > twice_from + twice_to {
            return Err(row.fault(Column::To, Defect::Triangle { rank, from, to, twice_from, twice_to }));
        }
        let odd = is_odd(a.block) != is_odd(b.block);
        if name == DIPOLE && !odd {
            return Err(row.fault(Column::To, Defect::ParityOfDipole { from, to, odd: is_odd(a.block) }));
        }
        Ok(odd)
    }

    fn operator(&mut self, row: &Row, name: &str, rank: u32, odd: bool) -> Checked<usize> {
        match self.operators.iter().position(|(operator, _)| operator.name == name) {
            Some(at) if self.operators[at].0.odd != odd => {
                let defect = Defect::ParityDiffers { operator: shown(name), odd, other_line: self.operators[at].1 };
                Err(row.fault(Column::Operator, defect))
            }
            Some(at) => Ok(at),
            None => {
                self.operators.push((OperatorEntry { name: name.to_string(), rank, odd }, row.line));
                Ok(self.operators.len() - 1)
            }
        }
    }

    fn put(&mut self, row: &Row, name: &str, entry: ElementEntry, value: Datum) -> Checked<()> {
        let pair = (entry.operator, entry.from.min(entry.to), entry.from.max(entry.to));
        if let Some((earlier, at)) = self.pairs.get(&pair) {
            let (other, other_value) = &self.elements[*at];
            let turned = other.from != entry.from
                && (self.levels[entry.from].0.twice_j() - self.levels[entry.to].0.twice_j()) / 2 % 2 != 0;
            let sign = if turned && entry.quantity == Quantity::Reduced { -1 } else { 1 };
            let same = other.quantity == entry.quantity
                && Rational::from(&other_value.value * &other.unit) * sign
                    == Rational::from(&value.value * &entry.unit);
            let (from, to) = self.names_of(entry.from, entry.to);
            let operator = shown(name);
            let defect = Defect::RepeatedElement { operator, from, to, earlier: *earlier, contradicts: !same };
            return Err(row.fault(Column::Value, defect));
        }
        self.pairs.insert(pair, (row.line, self.elements.len()));
        self.elements.push((entry, value));
        Ok(())
    }

    fn hartree(&self, level: usize) -> Rational {
        let (entry, energy) = &self.levels[level];
        Rational::from(&energy.value * &entry.unit)
    }

    fn names_of(&self, from: usize, to: usize) -> (String, String) {
        (self.levels[from].0.name.clone(), self.levels[to].0.name.clone())
    }
}

fn is_odd(block: Block) -> bool {
    matches!(block, Block::Level { odd: true, .. })
}

/// Twice the J of a level from its column and its label.
fn momentum(row: &Row, name: &str, label: Option<&Label>) -> Checked<i32> {
    let given = match row.cell(Column::J) {
        "" => None,
        text => Some(numbers::twice_momentum(text).map_err(|defect| row.fault(Column::J, defect))?),
    };
    let said = label.and_then(momentum_of);
    let Some(twice_j) = given.or(said.map(HalfInteger::twice)) else {
        return Err(row.fault(Column::J, Defect::MissingMomentum { name: shown(name) }));
    };
    let contradiction = match (label, said) {
        (_, Some(said)) if said.twice() != twice_j => Some(format!("which says {said}")),
        (Some(label), None) if !label.term.has_momentum(HalfInteger::from_twice(twice_j)) => {
            let momenta: Vec<String> = label.term.momenta().map(|j| j.to_string()).collect();
            Some(format!("whose J can be {}", momenta.join(", ")))
        }
        _ => None,
    };
    match contradiction {
        Some(allowed) => Err(row.fault(Column::J, Defect::MomentumOfLabel { name: shown(name), twice_j, allowed })),
        None => Ok(twice_j),
    }
}

/// Whether a level is odd, from its column and its label.
fn parity(row: &Row, name: &str, label: Option<&Label>) -> Checked<bool> {
    let given = match row.cell(Column::Parity).to_ascii_lowercase().as_str() {
        "" => None,
        "even" | "e" => Some(false),
        "odd" | "o" => Some(true),
        _ => return Err(row.fault(Column::Parity, Defect::Parity { text: shown(row.cell(Column::Parity)) })),
    };
    match (given, label.map(|label| label.term.parity == Parity::Odd)) {
        (Some(odd), Some(said)) if odd != said => {
            Err(row.fault(Column::Parity, Defect::ParityOfLabel { name: shown(name), odd }))
        }
        (Some(odd), _) | (None, Some(odd)) => Ok(odd),
        (None, None) => Err(row.fault(Column::Parity, Defect::MissingParity { name: shown(name) })),
    }
}

fn check_operator_name(row: &Row, name: &str) -> Checked<()> {
    let plain = name.starts_with(|c: char| c.is_ascii_alphabetic()) && name.bytes().all(|b| b.is_ascii_alphanumeric());
    let why = match name {
        _ if !plain => "",
        "H" => ": H is the energy of the levels",
        "J" => ": J is the total angular momentum, which the levels have already",
        "E" | "C" | "i" | "pi" | "inf" => ": the word has another meaning in expressions",
        _ if is_reserved(name) => ": the word has another meaning in a session",
        _ => return Ok(()),
    };
    Err(row.fault(Column::Operator, Defect::OperatorName { name: shown(name), why }))
}

fn quantity(row: &Row, operator: &str) -> Checked<Quantity> {
    let word = row.cell(Column::Quantity);
    match Quantity::named(word) {
        Some(Quantity::OscillatorStrength) if operator != DIPOLE => {
            Err(row.fault(Column::Quantity, Defect::StrengthOfOperator { operator: shown(operator) }))
        }
        Some(quantity) => Ok(quantity),
        None => {
            let near = did_you_mean(word, Quantity::WORDS);
            let near = near.and_then(|near| Quantity::WORDS.into_iter().find(|known| *known == near));
            Err(row.fault(Column::Quantity, Defect::Quantity { word: shown(word), near }))
        }
    }
}

/// The size of an element's unit in atomic units.
fn element_unit(row: &Row, operator: &str, quantity: Quantity) -> Checked<Rational> {
    let unit = row.cell(Column::Unit);
    let (size, of, wanted) = match (quantity, operator) {
        (Quantity::OscillatorStrength, _) => (
            matches!(unit, "" | "1").then(|| Rational::from(1)),
            "an oscillator strength",
            "an oscillator strength has no unit: leave the cell empty".to_string(),
        ),
        (Quantity::Reduced, DIPOLE) => (dipole_in_atomic(unit), "a dipole", dipole_units()),
        (Quantity::LineStrength, DIPOLE) => (
            dipole_strength_in_atomic(unit),
            "a line strength of the dipole",
            "line strengths are in e^2 a0^2 or debye^2; an empty cell means e^2 a0^2".to_string(),
        ),
        _ => (
            matches!(unit, "" | "au" | "a.u.").then(|| Rational::from(1)),
            "an operator of your own",
            "elements of operators other than D are in atomic units: write au, or leave the cell empty".to_string(),
        ),
    };
    size.ok_or_else(|| row.fault(Column::Unit, Defect::ElementUnit { unit: shown(unit), of: of.into(), wanted }))
}

fn check_strength(row: &Row, quantity: Quantity, value: &Datum) -> Checked<()> {
    if quantity == Quantity::Reduced {
        return Ok(());
    }
    if value.value < 0 {
        let value = shown(row.cell(Column::Value));
        return Err(row.fault(Column::Value, Defect::NegativeStrength { value }));
    }
    if value.value == 0 && value.sigma != 0 {
        return Err(row.fault(Column::Value, Defect::UncertainZero));
    }
    Ok(())
}
