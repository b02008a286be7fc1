//! Exact Hermitian matrices: sparse rows of rationals and sums of square roots.

use super::fault::MatrixFault;
use crate::num::{ComplexBall, NumberError, Surd};
use rug::{Complex, Rational};
use std::borrow::Cow;
use std::collections::BTreeMap;

/// Largest dimension of a matrix.
pub const LARGEST_DIMENSION: usize = 2000;

/// A sparse exact vector: its nonzero components.
pub type ExactKet = BTreeMap<usize, Surd>;

/// An exact entry, never zero. Most are rational, and as such take a tenth of the memory of a sum of roots.
#[derive(Clone, Debug, PartialEq)]
pub enum Entry {
    Rational(Rational),
    /// A sum of roots that is not rational.
    Roots(Box<Surd>),
}

impl Entry {
    /// The entry of this value; `None` for zero.
    pub fn new(value: Surd) -> Option<Self> {
        if value.is_zero() {
            return None;
        }
        let rational = value.as_rational().map(Cow::into_owned);
        Some(rational.map_or_else(|| Entry::Roots(Box::new(value)), Entry::Rational))
    }

    pub fn to_surd(&self) -> Surd {
        match self {
            Entry::Rational(q) => Surd::from(q.clone()),
            Entry::Roots(surd) => (**surd).clone(),
        }
    }

    pub fn is_real(&self) -> bool {
        match self {
            Entry::Rational(_) => true,
            Entry::Roots(surd) => surd.is_real(),
        }
    }

    /// The longest numerator, denominator or radicand, in bits.
    fn bits(&self) -> u32 {
        match self {
            Entry::Rational(q) => q.numer().significant_bits().max(q.denom().significant_bits()),
            Entry::Roots(surd) => surd.bits(),
        }
    }

    fn is_conjugate_of(&self, other: &Entry) -> bool {
        match (self, other) {
            (Entry::Rational(a), Entry::Rational(b)) => a == b,
            (Entry::Roots(a), Entry::Roots(b)) => a.conj() == **b,
            _ => false,
        }
    }

    /// The entry to `bits` bits.
    ///
    /// Errors: beyond the range of exponents.
    pub fn rounded(&self, bits: u32) -> Result<Complex, NumberError> {
        let ball = match self {
            Entry::Rational(q) => ComplexBall::from_rational(q, bits)?,
            Entry::Roots(surd) => ComplexBall::from_surd(surd, bits)?,
        };
        Ok(ball.midpoint(bits))
    }
}

/// A finite Hermitian matrix with exact entries.
#[derive(Clone, Debug, PartialEq)]
pub struct ExactMatrix {
    /// The nonzero entries of each row by rising column.
    rows: Vec<Vec<(usize, Entry)>>,
}

impl ExactMatrix {
    /// The matrix with these rows.
    ///
    /// Errors: rows of different length, too many of them, or entries that are not Hermitian.
    pub fn from_rows(rows: Vec<Vec<Surd>>) -> Result<Self, MatrixFault> {
        let order = rows.len();
        for (row, entries) in rows.iter().enumerate() {
            if entries.len() != order {
                return Err(MatrixFault::RowLength { row: row + 1, found: entries.len(), order });
            }
        }
        let sparse = |row: Vec<Surd>| {
            row.into_iter().enumerate().filter_map(|(column, value)| Some((column, Entry::new(value)?))).collect()
        };
        Self::from_sparse(rows.into_iter().map(sparse).collect())
    }

    /// A band matrix: main diagonal, then the diagonals beside it, mirrored below by complex conjugation.
    ///
    /// Errors: a diagonal longer than fits, an empty or complex main diagonal.
    pub fn from_diagonals(diagonals: Vec<Vec<Surd>>) -> Result<Self, MatrixFault> {
        let order = diagonals.first().map_or(0, Vec::len);
        if order > LARGEST_DIMENSION {
            return Err(MatrixFault::TooLarge { order });
        }
        let mut rows: Vec<BTreeMap<usize, Entry>> = vec![BTreeMap::new(); order];
        for (offset, diagonal) in diagonals.into_iter().enumerate() {
            if diagonal.len() + offset > order {
                return Err(MatrixFault::DiagonalLength { diagonal: offset, found: diagonal.len(), order });
            }
            for (row, value) in diagonal.into_iter().enumerate() {
                if offset > 0
                    && let Some(mirrored) = Entry::new(value.conj())
                {
                    rows[row + offset].insert(row, mirrored);
                }
                if let Some(entry) = Entry::new(value) {
                    rows[row].insert(row + offset, entry);
                }
            }
        }
        Self::from_sparse(rows)
    }

    /// The matrix with these rows of nonzero entries.
    ///
    /// Errors: no rows, too many of them, or entries that are not Hermitian.
    pub fn from_sparse(rows: Vec<BTreeMap<usize, Entry>>) -> Result<Self, MatrixFault> {
        if rows.is_empty() {
            return Err(MatrixFault::Empty);
        }
        if rows.len() > LARGEST_DIMENSION {
            return Err(MatrixFault::TooLarge { order: rows.len() });
        }
        for (row, entries) in rows.iter().enumerate() {
            for (column, entry) in entries {
                let mirror = rows.get(*column).and_then(|mirror| mirror.get(&row));
                if mirror.is_none_or(|mirror| !entry.is_conjugate_of(mirror)) {
                    return Err(if row == *column {
                        MatrixFault::ComplexDiagonal { row: row + 1 }
                    } else {
                        MatrixFault::NotHermitian { row: row + 1, column: column + 1 }
                    });
                }
            }
        }
        Ok(ExactMatrix { rows: rows.into_iter().map(|row| row.into_iter().collect()).collect() })
    }

    pub fn order(&self) -> usize {
        self.rows.len()
    }

    /// The nonzero entries of a row by rising column.
    pub fn row(&self, row: usize) -> &[(usize, Entry)] {
        &self.rows[row]
    }

    /// The entry, zero where none is kept.
    pub fn entry(&self, row: usize, column: usize) -> Surd {
        let entries = &self.rows[row];
        match entries.binary_search_by_key(&column, |(column, _)| *column) {
            Ok(at) => entries[at].1.to_surd(),
            Err(_) => Surd::zero(),
        }
    }

    /// The matrix times a sparse vector.
    pub fn apply(&self, vector: &ExactKet) -> ExactKet {
        let mut image = ExactKet::new();
        for (column, x) in vector {
            // The column of a Hermitian matrix is its row conjugated.
            for (row, entry) in &self.rows[*column] {
                let term = match entry {
                    Entry::Rational(q) => x.scaled(q),
                    Entry::Roots(surd) => &surd.conj() * x,
                };
                *image.entry(*row).or_default() += &term;
            }
        }
        image.retain(|_, x| !x.is_zero());
        image
    }

    /// The sets of basis states that the matrix connects, each in rising order.
    pub fn components(&self) -> Vec<Vec<usize>> {
        let mut seen = vec![false; self.order()];
        let mut components = Vec::new();
        for start in 0..self.order() {
            if seen[start] {
                continue;
            }
            let mut members = vec![start];
            seen[start] = true;
            let mut next = 0;
            while next < members.len() {
                for (column, _) in &self.rows[members[next]] {
                    if !seen[*column] {
                        seen[*column] = true;
                        members.push(*column);
                    }
                }
                next += 1;
            }
            members.sort_unstable();
            components.push(members);
        }
        components
    }

    /// The longest numerator, denominator or radicand, in bits.
    pub fn bits(&self) -> u32 {
        self.rows.iter().flatten().map(|(_, entry)| entry.bits()).max().unwrap_or(0)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn surds(row: &[i64]) -> Vec<Surd> {
        row.iter().map(|n| Surd::from(*n)).collect()
    }

    #[test]
    fn diagonals_are_mirrored() {
        let matrix = ExactMatrix::from_diagonals(vec![surds(&[1, 2, 3]), vec![Surd::i(), Surd::zero()], surds(&[5])]);
        let rows = vec![
            vec![Surd::one(), Surd::i(), Surd::from(5)],
            vec![-&Surd::i(), Surd::from(2), Surd::zero()],
            vec![Surd::from(5), Surd::zero(), Surd::from(3)],
        ];
        assert_eq!(matrix, ExactMatrix::from_rows(rows));
    }

    #[test]
    fn defects_name_their_place() {
        let faults = [
            (ExactMatrix::from_rows(vec![]), "the matrix has no rows"),
            (
                ExactMatrix::from_rows(vec![surds(&[1, 2]), surds(&[2])]),
                "row 2 has 1 entries, where the matrix has 2 rows",
            ),
            (
                ExactMatrix::from_rows(vec![surds(&[1, 2]), surds(&[3, 1])]),
                "row 1, column 2 is not the complex conjugate of row 2, column 1: the matrix is not Hermitian",
            ),
            (
                ExactMatrix::from_rows(vec![surds(&[1, 0]), surds(&[3, 1])]),
                "row 2, column 1 is not the complex conjugate of row 1, column 2: the matrix is not Hermitian",
            ),
            (
                ExactMatrix::from_diagonals(vec![vec![Surd::one(), Surd::i()]]),
                "row 2, column 2 is not real: the matrix is not Hermitian",
            ),
            (
                ExactMatrix::from_diagonals(vec![surds(&[1, 1]), surds(&[1, 1])]),
                "diagonal 1 (0 is the main one) has 2 entries, too many beside a main diagonal of 2",
            ),
            (
                ExactMatrix::from_diagonals(vec![vec![Surd::zero(); LARGEST_DIMENSION + 1]]),
                "the matrix has 2001 rows; the largest has 2000",
            ),
        ];
        for (result, message) in faults {
            assert_eq!(result.map_err(|fault| fault.to_string()), Err(message.to_string()));
        }
    }

    #[test]
    fn components_are_what_h_connects() {
        let mut rows = vec![vec![Surd::zero(); 5]; 5];
        for (row, column) in [(0, 3), (3, 0), (1, 4), (4, 1)] {
            rows[row][column] = Surd::one();
        }
        let matrix = ExactMatrix::from_rows(rows).expect("symmetric");
        assert_eq!(matrix.components(), vec![vec![0, 3], vec![1, 4], vec![2]]);
    }

    #[test]
    fn a_product_takes_columns_conjugated_from_rows() {
        let matrix = ExactMatrix::from_rows(vec![vec![Surd::one(), Surd::i()], vec![-&Surd::i(), Surd::zero()]]);
        let image = matrix.expect("Hermitian").apply(&BTreeMap::from([(0, Surd::one()), (1, Surd::i())]));
        // (1 + i i, -i)
        assert_eq!(image, BTreeMap::from([(1, -&Surd::i())]));
    }
}
