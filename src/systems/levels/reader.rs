//! From the text of a level table to rows of named cells.
//!
//! A line that begins with the cell `row` is a header: it names the columns of the lines below it, up to the next header. Every line stands alone:
//! quotation marks do not reach over its end, so that one slip does not swallow the rest of the file.

use super::fault::{Defect, LONGEST_CELL, MOST_CELLS, MOST_FAULTS, MOST_LINES, TableFault};
use super::labels::shown;
use crate::lang::diagnostic::did_you_mean;
use std::sync::Arc;

/// The columns of a table.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Debug)]
pub enum Column {
    Row,
    Name,
    Energy,
    J,
    Parity,
    From,
    To,
    Operator,
    Rank,
    Quantity,
    Value,
    Unit,
}

impl Column {
    pub const ALL: [Column; 12] = [
        Column::Row,
        Column::Name,
        Column::Energy,
        Column::J,
        Column::Parity,
        Column::From,
        Column::To,
        Column::Operator,
        Column::Rank,
        Column::Quantity,
        Column::Value,
        Column::Unit,
    ];

    pub const fn word(self) -> &'static str {
        match self {
            Column::Row => "row",
            Column::Name => "name",
            Column::Energy => "energy",
            Column::J => "J",
            Column::Parity => "parity",
            Column::From => "from",
            Column::To => "to",
            Column::Operator => "operator",
            Column::Rank => "rank",
            Column::Quantity => "quantity",
            Column::Value => "value",
            Column::Unit => "unit",
        }
    }

    fn named(word: &str) -> Option<Self> {
        Self::ALL.into_iter().find(|column| column.word().eq_ignore_ascii_case(word))
    }
}

/// The two kinds of rows.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum RowKind {
    Level,
    Element,
}

impl RowKind {
    pub const fn word(self) -> &'static str {
        match self {
            RowKind::Level => "level",
            RowKind::Element => "element",
        }
    }

    /// The columns a row of this kind cannot do without.
    fn needed(self) -> &'static [Column] {
        match self {
            RowKind::Level => &[Column::Name, Column::Energy, Column::Unit],
            RowKind::Element => &[Column::From, Column::To, Column::Operator, Column::Value],
        }
    }

    fn has(self, column: Column) -> bool {
        use Column as C;
        match column {
            C::Row | C::Unit => true,
            C::Name | C::Energy | C::J | C::Parity => self == RowKind::Level,
            C::From | C::To | C::Operator | C::Rank | C::Quantity | C::Value => self == RowKind::Element,
        }
    }
}

/// The columns a header names; `None` for one that is not known.
struct Header {
    line: usize,
    columns: Vec<Option<Column>>,
}

/// A row with its cells.
pub struct Row {
    pub line: usize,
    pub kind: RowKind,
    header: Arc<Header>,
    cells: Vec<String>,
}

impl Row {
    /// What stands in a column; nothing where the header does not name it.
    pub fn cell(&self, column: Column) -> &str {
        let at = self.header.columns.iter().position(|known| *known == Some(column));
        at.and_then(|at| self.cells.get(at)).map_or("", String::as_str)
    }

    /// What stands in a column that may not be empty.
    pub fn needed(&self, column: Column) -> Result<&str, TableFault> {
        match self.cell(column) {
            "" => Err(self.fault(column, Defect::MissingCell { kind: self.kind })),
            text => Ok(text),
        }
    }

    pub fn fault(&self, column: Column, defect: Defect) -> TableFault {
        TableFault { line: self.line, column: Some(column), defect }
    }
}

/// The rows of a text and what is wrong with them.
#[derive(Default)]
pub struct Rows {
    pub rows: Vec<Row>,
    pub faults: Vec<TableFault>,
    /// Whether a row of a kind was left out because of its header: then what others say of it cannot be judged.
    pub levels_left_out: bool,
}

/// Reads the rows; goes on behind a defect.
pub fn rows(text: &str) -> Rows {
    let mut out = Rows::default();
    let mut header: Option<Arc<Header>> = None;
    let mut reported: Vec<RowKind> = Vec::new();
    for (at, line) in text.strip_prefix('\u{feff}').unwrap_or(text).lines().enumerate() {
        let number = at + 1;
        let mut wrong = |column, defect| out.faults.push(TableFault { line: number, column, defect });
        if number > MOST_LINES {
            wrong(None, Defect::TooManyLines);
            break;
        }
        if line.trim_start().starts_with('#') {
            continue;
        }
        let cells = match cells(line) {
            Ok(cells) => cells,
            Err(defect) => {
                wrong(None, defect);
                continue;
            }
        };
        let Some(first) = cells.first() else { continue };
        if cells.iter().all(String::is_empty) {
            continue;
        }
        let semicolons = first.matches(';').count() > 1;
        if first.to_ascii_lowercase().starts_with("row") && (semicolons || first.contains('\t')) {
            // one cause for whatever comes below
            out.faults =
                vec![TableFault { line: number, column: None, defect: Defect::Separator { tab: !semicolons } }];
            return out;
        }
        if first.eq_ignore_ascii_case(Column::Row.word()) {
            header = Some(Arc::new(read_header(number, &cells, &mut out.faults)));
            reported.clear();
        } else if let Some(kind) = kind_of(first) {
            let Some(header) = &header else {
                wrong(None, Defect::NoHeader);
                out.levels_left_out = true;
                return out;
            };
            let missing: Vec<Column> =
                kind.needed().iter().copied().filter(|column| !header.columns.contains(&Some(*column))).collect();
            if missing.is_empty() {
                out.take(Row { line: number, kind, header: header.clone(), cells });
            } else if !reported.contains(&kind) {
                reported.push(kind);
                // a misspelt column is one defect, told at the header
                if header.columns.iter().all(Option::is_some) {
                    for column in missing {
                        wrong(None, Defect::MissingColumn { header: header.line, column, kind });
                    }
                }
                out.levels_left_out |= kind == RowKind::Level;
            }
        } else {
            let near = did_you_mean(first, ["level", "element", "row"]).and_then(known_row);
            wrong(Some(Column::Row), Defect::UnknownRow { word: shown(first), near });
            out.levels_left_out = true;
        }
        if out.faults.len() >= MOST_FAULTS {
            break;
        }
    }
    if out.rows.is_empty() && out.faults.is_empty() {
        let defect = if header.is_some() { Defect::NoLevels } else { Defect::Empty };
        out.faults.push(TableFault { line: 1, column: None, defect });
    }
    out
}

impl Rows {
    /// Keeps a row whose cells have columns of its kind.
    fn take(&mut self, row: Row) {
        let wanted = row.header.columns.len();
        if row.cells.len() > wanted && row.cells[wanted..].iter().any(|cell| !cell.is_empty()) {
            let defect = Defect::TooManyCells { found: row.cells.len(), wanted, header: row.header.line };
            self.faults.push(TableFault { line: row.line, column: None, defect });
            self.levels_left_out |= row.kind == RowKind::Level;
            return;
        }
        for (column, cell) in row.header.columns.iter().zip(&row.cells) {
            if let Some(column) = column.filter(|column| !cell.is_empty() && !row.kind.has(*column)) {
                let defect = Defect::ForeignCell { text: shown(cell), kind: row.kind };
                self.faults.push(row.fault(column, defect));
            }
        }
        self.rows.push(row);
    }
}

fn kind_of(word: &str) -> Option<RowKind> {
    [RowKind::Level, RowKind::Element].into_iter().find(|kind| kind.word().eq_ignore_ascii_case(word))
}

fn known_row(word: &str) -> Option<&'static str> {
    ["level", "element", "row"].into_iter().find(|known| *known == word)
}

fn read_header(line: usize, cells: &[String], faults: &mut Vec<TableFault>) -> Header {
    let mut columns: Vec<Option<Column>> = Vec::new();
    // a spreadsheet may end lines in empty cells
    let named = cells.iter().rposition(|cell| !cell.is_empty()).map_or(0, |last| last + 1);
    for cell in &cells[..named] {
        let column = Column::named(cell);
        let defect = match column {
            Some(column) if columns.contains(&Some(column)) => Some(Defect::RepeatedColumn { column }),
            Some(_) => None,
            None => {
                let near = did_you_mean(cell, Column::ALL.map(Column::word)).and_then(Column::named);
                Some(Defect::UnknownColumn { name: shown(cell), near: near.map(Column::word) })
            }
        };
        faults.extend(defect.map(|defect| TableFault { line, column: None, defect }));
        columns.push(column);
    }
    Header { line, columns }
}

/// The cells of one line, without blanks around them.
fn cells(line: &str) -> Result<Vec<String>, Defect> {
    let commas = line.matches(',').count();
    if commas >= MOST_CELLS {
        return Err(Defect::ManyCells { found: commas + 1 });
    }
    let cells: Vec<String> = match line.matches('"').count() {
        // nearly every line; the same as below, without the cost of a reader for each
        0 => line.split(',').map(|cell| cell.trim().to_string()).collect(),
        quotes if quotes % 2 != 0 => return Err(Defect::Quote),
        _ => {
            let reader = csv::ReaderBuilder::new().has_headers(false).trim(csv::Trim::All).from_reader(line.as_bytes());
            match reader.into_records().next() {
                None => Vec::new(),
                Some(Ok(record)) => record.iter().map(str::to_string).collect(),
                Some(Err(_)) => return Err(Defect::Quote),
            }
        }
    };
    match cells.iter().map(|cell| cell.chars().count()).find(|length| *length > LONGEST_CELL) {
        Some(length) => Err(Defect::LongCell { length }),
        None => Ok(cells),
    }
}
