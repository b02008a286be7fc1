//! Reads Matrix Market text: the open exchange format of the trade for matrices (Boisvert, Pozo, Remington, NISTIR 5935 (1996)).
//!
//! Entries are read exactly, of any length. Beyond the standard an entry may be a fraction, `3/7`.

use super::entries::{Entry, ExactMatrix, LARGEST_DIMENSION};
use super::fault::MatrixFault;
use crate::num::{DecimalError, Surd, parse_decimal};
use rug::Rational;
use std::collections::BTreeMap;

/// Most bits the entries of one file may have together; short text such as `1e99999` makes long numbers.
const MOST_BITS: u64 = 1 << 31;

/// What the first line promises.
struct Banner {
    coordinate: bool,
    complex: bool,
    symmetry: Symmetry,
}

#[derive(Clone, Copy, PartialEq, Eq)]
enum Symmetry {
    General,
    Symmetric,
    Hermitian,
}

/// The entries given of a row, zeros (`None`) among them.
type Row = BTreeMap<usize, Option<Entry>>;

fn fault(line: usize, message: impl Into<String>) -> MatrixFault {
    MatrixFault::File { line, message: message.into() }
}

impl ExactMatrix {
    /// Reads a Hermitian matrix from Matrix Market text.
    ///
    /// Errors: every defect with its line; the matrix must be square and symmetric or Hermitian in fact, whatever the first line says.
    pub fn from_matrix_market(text: &str) -> Result<Self, MatrixFault> {
        let mut lines = text.lines().enumerate().map(|(at, line)| (at + 1, line.trim()));
        let (_, first) = lines.next().ok_or_else(|| fault(1, "the file is empty"))?;
        let banner = banner(first)?;
        let mut lines = lines.filter(|(_, line)| !line.is_empty() && !line.starts_with('%'));
        let (at, sizes) =
            lines.next().ok_or_else(|| fault(1, "the line with the numbers of rows and columns is missing"))?;
        let sizes = sizes
            .split_whitespace()
            .map(|word| {
                word.parse::<usize>()
                    .map_err(|_| fault(at, format!("`{}` is not a number of rows, columns or entries", cut(word))))
            })
            .collect::<Result<Vec<_>, _>>()?;
        let (order, columns, count) = match (banner.coordinate, sizes.as_slice()) {
            (true, [rows, columns, count]) => (*rows, *columns, Some(*count)),
            (false, [rows, columns]) => (*rows, *columns, None),
            (true, _) => return Err(fault(at, "three numbers are wanted here: rows, columns and entries")),
            (false, _) => return Err(fault(at, "two numbers are wanted here: rows and columns")),
        };
        if order != columns {
            return Err(fault(
                at,
                format!("the matrix has {order} rows and {columns} columns; an operator has as many of each"),
            ));
        }
        if order > LARGEST_DIMENSION {
            return Err(MatrixFault::TooLarge { order });
        }
        let mut rows: Vec<Row> = vec![BTreeMap::new(); order];
        match count {
            Some(count) => read_coordinates(lines, &banner, order, count, &mut rows)?,
            None => read_array(lines, &banner, order, &mut rows)?,
        }
        let nonzero = rows
            .into_iter()
            .map(|row| row.into_iter().filter_map(|(column, entry)| Some((column, entry?))).collect())
            .collect();
        ExactMatrix::from_sparse(nonzero)
    }
}

fn banner(line: &str) -> Result<Banner, MatrixFault> {
    let words: Vec<String> = line.split_whitespace().map(str::to_ascii_lowercase).collect();
    let words: Vec<&str> = words.iter().map(String::as_str).collect();
    let ["%%matrixmarket", "matrix", layout, field, symmetry] = words.as_slice() else {
        return Err(fault(
            1,
            "the first line is not that of a matrix file, such as `%%MatrixMarket matrix coordinate real symmetric`",
        ));
    };
    let coordinate = match *layout {
        "coordinate" => true,
        "array" => false,
        other => return Err(fault(1, format!("`{}` is not a layout; `coordinate` or `array` is wanted", cut(other)))),
    };
    let complex = match *field {
        "integer" | "real" => false,
        "complex" => true,
        "pattern" => return Err(fault(1, "a pattern file has places but no values")),
        other => {
            return Err(fault(
                1,
                format!("`{}` is not a kind of entry; `integer`, `real` or `complex` is wanted", cut(other)),
            ));
        }
    };
    let symmetry = match *symmetry {
        "general" => Symmetry::General,
        "symmetric" => Symmetry::Symmetric,
        "hermitian" => Symmetry::Hermitian,
        "skew-symmetric" => {
            return Err(fault(
                1,
                "a skew-symmetric matrix is not Hermitian; multiply it by i and give it as `hermitian`",
            ));
        }
        other => {
            return Err(fault(1, format!("`{}` is not a symmetry; `symmetric` or `hermitian` is wanted", cut(other))));
        }
    };
    Ok(Banner { coordinate, complex, symmetry })
}

/// A word short enough to repeat in a message.
fn cut(word: &str) -> String {
    if word.chars().count() > 30 { word.chars().take(30).chain(['…']).collect() } else { word.to_string() }
}

fn number(word: &str) -> Result<Rational, String> {
    let (sign, digits) = match word.strip_prefix('-') {
        Some(digits) => (-1, digits),
        None => (1, word.strip_prefix('+').unwrap_or(word)),
    };
    let value = match digits.split_once('/') {
        None => unsigned(digits, word)?,
        Some((above, below)) => {
            let (above, below) = (unsigned(above, word)?, unsigned(below, word)?);
            if below == 0 {
                return Err(format!("`{}` divides by zero", cut(word)));
            }
            above / below
        }
    };
    Ok(value * sign)
}

/// A number without a sign. Files of the trade write `1.`, `.5`, `1E5` and `1D5`; the language's decimals have digits on both sides of the point.
fn unsigned(digits: &str, word: &str) -> Result<Rational, String> {
    let (mantissa, exponent) = match digits.split_once(['e', 'E', 'd', 'D']) {
        Some((mantissa, exponent)) => (mantissa, Some(exponent)),
        None => (digits, None),
    };
    if mantissa.starts_with(['+', '-']) {
        return Err(format!("`{}` is not a number", cut(word)));
    }
    let mut text = match (mantissa.starts_with('.'), mantissa.ends_with('.')) {
        (true, false) => format!("0{mantissa}"),
        (false, true) => format!("{mantissa}0"),
        _ => mantissa.to_string(),
    };
    if let Some(exponent) = exponent {
        text.push('e');
        text.push_str(exponent.strip_prefix('+').unwrap_or(exponent));
    }
    parse_decimal(&text).map_err(|error| match error {
        DecimalError::NotANumber { .. } => format!("`{}` is not a number", cut(word)),
        other => other.to_string(),
    })
}

/// Reads the entries of lines and counts how long they are together.
struct Values<'b> {
    banner: &'b Banner,
    bits: u64,
}

impl Values<'_> {
    /// The entry of a row and column, counted from 0.
    fn read(&mut self, words: &[&str], (row, column): (usize, usize), line: usize) -> Result<Surd, MatrixFault> {
        let wrong = |message: String| fault(line, format!("row {}, column {}: {message}", row + 1, column + 1));
        let value = match (self.banner.complex, words) {
            (false, [re]) => Surd::from(number(re).map_err(wrong)?),
            (true, [re, im]) => Surd::gaussian(number(re).map_err(wrong)?, number(im).map_err(wrong)?),
            (false, _) => return Err(wrong("one number is wanted as the entry".into())),
            (true, _) => return Err(wrong("two numbers are wanted as the entry, real and imaginary part".into())),
        };
        self.bits += u64::from(value.bits());
        if self.bits > MOST_BITS {
            return Err(wrong("the entries up to here are longer than all entries of a file may be together".into()));
        }
        Ok(value)
    }

    /// The entry on the other side of the diagonal.
    fn mirrored(&self, entry: &Surd) -> Option<Entry> {
        Entry::new(if self.banner.symmetry == Symmetry::Hermitian { entry.conj() } else { entry.clone() })
    }
}

fn read_coordinates<'t>(
    lines: impl Iterator<Item = (usize, &'t str)>,
    banner: &Banner,
    order: usize,
    count: usize,
    rows: &mut [Row],
) -> Result<(), MatrixFault> {
    let mut values = Values { banner, bits: 0 };
    let mut found = 0;
    let mut last = 1;
    for (line, text) in lines {
        last = line;
        found += 1;
        if found > count {
            return Err(fault(line, format!("there are more entries than the {count} announced")));
        }
        let words: Vec<&str> = text.split_whitespace().collect();
        let [row, column, rest @ ..] = words.as_slice() else {
            return Err(fault(line, "a row, a column and an entry are wanted"));
        };
        let index = |word: &str, what: &str| match word.parse::<usize>() {
            Ok(index) if (1..=order).contains(&index) => Ok(index - 1),
            _ => Err(fault(line, format!("{what} `{}` is not one of 1 to {order}", cut(word)))),
        };
        let (row, column) = (index(row, "row")?, index(column, "column")?);
        let entry = values.read(rest, (row, column), line)?;
        if banner.symmetry != Symmetry::General {
            if column > row {
                return Err(fault(
                    line,
                    format!(
                        "row {}, column {} lies above the diagonal, and a symmetric file keeps the entries on and below it",
                        row + 1,
                        column + 1
                    ),
                ));
            }
            if row != column {
                rows[column].insert(row, values.mirrored(&entry));
            }
        }
        if rows[row].insert(column, Entry::new(entry)).is_some() {
            return Err(fault(line, format!("row {}, column {} is given twice", row + 1, column + 1)));
        }
    }
    if found < count {
        return Err(fault(last, format!("the file ends after {found} of the {count} entries announced")));
    }
    Ok(())
}

fn read_array<'t>(
    mut lines: impl Iterator<Item = (usize, &'t str)>,
    banner: &Banner,
    order: usize,
    rows: &mut [Row],
) -> Result<(), MatrixFault> {
    let mut values = Values { banner, bits: 0 };
    let mut last = 1;
    for column in 0..order {
        let first = if banner.symmetry == Symmetry::General { 0 } else { column };
        for row in first..order {
            let Some((line, text)) = lines.next() else {
                return Err(fault(
                    last,
                    format!("the file ends before the entry of row {}, column {}", row + 1, column + 1),
                ));
            };
            last = line;
            let words: Vec<&str> = text.split_whitespace().collect();
            let entry = values.read(&words, (row, column), line)?;
            if banner.symmetry != Symmetry::General && row != column {
                rows[column].insert(row, values.mirrored(&entry));
            }
            rows[row].insert(column, Entry::new(entry));
        }
    }
    match lines.next() {
        Some((line, _)) => Err(fault(line, "there are more entries than the matrix has places")),
        None => Ok(()),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_symmetric_file_of_fractions_and_decimals() {
        let text =
            "%%MatrixMarket matrix coordinate real symmetric\n% a comment\n2 2 3\n1 1 0.1\n2 1 -3/7\n2 2 1.5E+2\n";
        let matrix = ExactMatrix::from_matrix_market(text).expect("good file");
        assert_eq!(matrix.entry(0, 0).to_string(), "1/10");
        assert_eq!(matrix.entry(0, 1).to_string(), "-3/7");
        assert_eq!(matrix.entry(1, 1).to_string(), "150");
    }

    #[test]
    fn spellings_of_the_trade() {
        let text =
            "%%MatrixMarket  MATRIX coordinate Real general\r\n%\n\n2 2 4\r\n1 1 1.\n 2 2 +.5d-1 \n1 2 -7E0\n2 1 -7\n";
        let matrix = ExactMatrix::from_matrix_market(text).expect("good file");
        assert_eq!(matrix.entry(1, 1).to_string(), "1/20");
        assert_eq!(matrix.entry(0, 1).to_string(), "-7");
        let digits = "3".repeat(5000);
        let text = format!("%%MatrixMarket matrix array integer symmetric\n1 1\n{digits}\n");
        let matrix = ExactMatrix::from_matrix_market(&text).expect("good file");
        assert_eq!(matrix.entry(0, 0).to_string(), digits);
    }

    #[test]
    fn a_hermitian_array() {
        let text = "%%MatrixMarket matrix array complex hermitian\n2 2\n1 0\n2 5\n3 0\n";
        let matrix = ExactMatrix::from_matrix_market(text).expect("good file");
        assert_eq!(matrix.entry(1, 0).to_string(), "2 + 5 i");
        assert_eq!(matrix.entry(0, 1).to_string(), "2 - 5 i");
    }

    #[test]
    fn defects_are_told_with_their_line() {
        for (text, message) in [
            ("", "line 1: the file is empty"),
            (
                "hello\n1 1 1\n",
                "line 1: the first line is not that of a matrix file, such as `%%MatrixMarket matrix coordinate real symmetric`",
            ),
            ("%%MatrixMarket matrix coordinate pattern symmetric\n", "line 1: a pattern file has places but no values"),
            (
                "%%MatrixMarket matrix coordinate real symmetric\n2 3 1\n1 1 1\n",
                "line 2: the matrix has 2 rows and 3 columns; an operator has as many of each",
            ),
            (
                "%%MatrixMarket matrix coordinate real symmetric\n2 2 2\n1 1 1\n",
                "line 3: the file ends after 1 of the 2 entries announced",
            ),
            (
                "%%MatrixMarket matrix coordinate real symmetric\n2 2 1\n1 3 1\n",
                "line 3: column `3` is not one of 1 to 2",
            ),
            (
                "%%MatrixMarket matrix coordinate real symmetric\n2 2 1\n1 1 x\n",
                "line 3: row 1, column 1: `x` is not a number",
            ),
            (
                "%%MatrixMarket matrix coordinate real symmetric\n2 2 1\n1 2 5\n",
                "line 3: row 1, column 2 lies above the diagonal, and a symmetric file keeps the entries on and below it",
            ),
            (
                "%%MatrixMarket matrix coordinate real general\n2 2 2\n1 2 5\n2 1 6\n",
                "row 1, column 2 is not the complex conjugate of row 2, column 1",
            ),
            (
                "%%MatrixMarket matrix coordinate real symmetric\n2 2 1\n1 1 --1\n",
                "line 3: row 1, column 1: `--1` is not a number",
            ),
            (
                "%%MatrixMarket matrix coordinate real symmetric\n2 2 1\n1 1 1/-2\n",
                "line 3: row 1, column 1: `1/-2` is not a number",
            ),
            (
                "%%MatrixMarket matrix coordinate real symmetric\n2 2 1\n1 1 1/0\n",
                "line 3: row 1, column 1: `1/0` divides by zero",
            ),
            (
                "%%MatrixMarket matrix coordinate real symmetric\n2 2 1\n1 1 1e999999999\n",
                "line 3: row 1, column 1: the power of ten 999999999 is too large; at most 100000 is read",
            ),
            (
                "%%MatrixMarket matrix coordinate real symmetric\n2 2 3\n1 1 0\n\n1 1 0\n",
                "line 5: row 1, column 1 is given twice",
            ),
            (
                "%%MatrixMarket matrix coordinate real symmetric\n2 2 1\n1 1 1\n2 2 1\n",
                "line 4: there are more entries than the 1 announced",
            ),
            (
                "%%MatrixMarket matrix coordinate complex hermitian\n1 1 1\n1 1 2 3\n",
                "row 1, column 1 is not real: the matrix is not Hermitian",
            ),
            (
                "%%MatrixMarket matrix coordinate complex symmetric\n2 2 1\n2 1 0 3\n",
                "row 1, column 2 is not the complex conjugate of row 2, column 1",
            ),
            (
                "%%MatrixMarket matrix coordinate complex hermitian\n1 1 1\n1 1 2\n",
                "line 3: row 1, column 1: two numbers are wanted as the entry, real and imaginary part",
            ),
            (
                "%%MatrixMarket matrix array real symmetric\n2 2\n1\n2\n",
                "line 4: the file ends before the entry of row 2, column 2",
            ),
            (
                "%%MatrixMarket matrix coordinate real skew-symmetric\n2 2 1\n2 1 3\n",
                "line 1: a skew-symmetric matrix is not Hermitian; multiply it by i and give it as `hermitian`",
            ),
            (
                "%%MatrixMarket matrix coordinate real symmetric\n999999999 999999999 1\n1 1 1\n",
                "the matrix has 999999999 rows; the largest has 2000",
            ),
        ] {
            let error = ExactMatrix::from_matrix_market(text).expect_err(text);
            assert!(error.to_string().starts_with(message), "{error}\n{message}");
        }
    }
}
