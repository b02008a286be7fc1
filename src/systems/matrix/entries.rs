//! Exact Hermitian matrices: sparse rows of sums of square roots.

use super::MatrixFault;
use crate::num::Surd;
use std::collections::BTreeMap;

/// Largest dimension of a matrix.
pub const LARGEST_DIMENSION: usize = 2000;

/// A finite Hermitian matrix with exact entries.
#[derive(Clone, Debug, PartialEq)]
pub struct ExactMatrix {
    rows: Vec<BTreeMap<usize, Surd>>,
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
        Self::from_sparse(
            rows.into_iter()
                .map(|row| row.into_iter().enumerate().filter(|(_, entry)| !entry.is_zero()).collect())
                .collect(),
        )
    }

    /// A band matrix: main diagonal, then the diagonals beside it, mirrored below by complex conjugation.
    ///
    /// Errors: a diagonal longer than fits, an empty or complex main diagonal.
    pub fn from_diagonals(diagonals: Vec<Vec<Surd>>) -> Result<Self, MatrixFault> {
        let order = diagonals.first().map_or(0, Vec::len);
        let mut rows = vec![BTreeMap::new(); order.min(LARGEST_DIMENSION + 1)];
        for (offset, diagonal) in diagonals.iter().enumerate() {
            if diagonal.len() + offset > order {
                return Err(MatrixFault::DiagonalLength { diagonal: offset, found: diagonal.len(), order });
            }
            for (row, entry) in diagonal.iter().enumerate().take(LARGEST_DIMENSION + 1) {
                if !entry.is_zero() && row + offset < rows.len() {
                    rows[row].insert(row + offset, entry.clone());
                    rows[row + offset].insert(row, entry.conj());
                }
            }
        }
        // A complex entry on the main diagonal was overwritten by its conjugate; the check needs what was written.
        for (row, entry) in diagonals.first().into_iter().flatten().enumerate() {
            if !entry.is_real() {
                return Err(MatrixFault::NotHermitian { row: row + 1, column: row + 1 });
            }
        }
        Self::from_sparse(rows)
    }

    /// The matrix with these rows of nonzero entries.
    pub fn from_sparse(rows: Vec<BTreeMap<usize, Surd>>) -> Result<Self, MatrixFault> {
        if rows.is_empty() {
            return Err(MatrixFault::Empty);
        }
        if rows.len() > LARGEST_DIMENSION {
            return Err(MatrixFault::TooLarge { order: rows.len() });
        }
        for (row, entries) in rows.iter().enumerate() {
            for (column, entry) in entries {
                if rows.get(*column).and_then(|mirror| mirror.get(&row)) != Some(&entry.conj()) {
                    return Err(MatrixFault::NotHermitian { row: row + 1, column: column + 1 });
                }
            }
        }
        Ok(ExactMatrix { rows })
    }

    pub fn order(&self) -> usize {
        self.rows.len()
    }

    pub fn rows(&self) -> &[BTreeMap<usize, Surd>] {
        &self.rows
    }

    /// The entry, zero where none is kept.
    pub fn entry(&self, row: usize, column: usize) -> Surd {
        self.rows[row].get(&column).cloned().unwrap_or_default()
    }

    /// The matrix times a sparse vector.
    pub fn apply(&self, vector: &BTreeMap<usize, Surd>) -> BTreeMap<usize, Surd> {
        let mut image: BTreeMap<usize, Surd> = BTreeMap::new();
        for (column, x) in vector {
            // The column of a Hermitian matrix is its row conjugated.
            for (row, entry) in &self.rows[*column] {
                *image.entry(*row).or_default() += &(&entry.conj() * x);
            }
        }
        image.retain(|_, x| !x.is_zero());
        image
    }

    /// The sets of basis states that the matrix connects, each in rising order.
    pub fn components(&self) -> Vec<Vec<usize>> {
        let mut owner = vec![usize::MAX; self.order()];
        let mut components = Vec::new();
        for start in 0..self.order() {
            if owner[start] != usize::MAX {
                continue;
            }
            let mut members = vec![start];
            owner[start] = components.len();
            let mut next = 0;
            while next < members.len() {
                for column in self.rows[members[next]].keys() {
                    if owner[*column] == usize::MAX {
                        owner[*column] = components.len();
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

    /// Whether every entry is real.
    pub fn is_real(&self) -> bool {
        self.rows.iter().flat_map(BTreeMap::values).all(Surd::is_real)
    }

    /// The longest numerator, denominator or radicand, in bits.
    pub fn bits(&self) -> u32 {
        self.rows.iter().flat_map(BTreeMap::values).map(Surd::bits).max().unwrap_or(0)
    }
}
