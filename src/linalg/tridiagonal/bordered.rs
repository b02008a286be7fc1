//! Tridiagonal systems with a border of dense rows, also where the tridiagonal part alone is singular.

use super::small::SmallLu;
use super::{Factored, Scalar, Tridiagonal};
use crate::linalg::error::LinalgError;
use crate::num::Effort;

/// Bits a pivot may cancel before its row joins the border.
const CANCELLED: u32 = 24;

/// The solution of a bordered system: `T x + B y = b`, `B^T x = c`.
#[derive(Clone, Debug, PartialEq)]
pub struct BorderedSolution<T> {
    pub x: Vec<T>,
    pub multipliers: Vec<T>,
}

/// A symmetric tridiagonal matrix bordered by dense rows, `[[T, B], [B^T, 0]]`, factored for any number of right-hand
/// sides.
///
/// With B = S g for the eigenvectors g of an eigenvalue of (H, S), `T = E S - H` is singular but the bordered matrix
/// is not: its solution is the reduced resolvent. Rows of T whose pivots cancel join the border, so T may be singular
/// or nearly so. *Shapes*: k rows of the order n of T. *Cost*: n (k + m)^2 operations once, n (k + m) for each
/// right-hand side, m the number of rows that joined, which is at least the number of eigenvalues of T near zero and
/// seldom more. *Source*: block elimination; the rows set aside are derived here.
#[derive(Clone, Debug)]
pub struct Bordered<T> {
    tridiagonal: Factored<T>,
    /// Rows of T in the border.
    aside: Vec<usize>,
    /// All rows of the border, those of T first, with the components that were set aside taken out.
    rows: Vec<Vec<T>>,
    /// Solutions of the tridiagonal part for each row of the border.
    solved: Vec<Vec<T>>,
    schur: SmallLu<T>,
    given: usize,
}

impl<T: Scalar> Bordered<T> {
    /// Factorises a bordered matrix.
    ///
    /// *Errors*: a row of another length than T, or [`LinalgError::NoPivot`] where the bordered matrix itself is
    /// singular.
    pub fn new(matrix: &Tridiagonal<T>, border: &[Vec<T>], effort: &Effort) -> Result<Self, LinalgError> {
        let order = matrix.order();
        if let Some(row) = border.iter().find(|row| row.len() != order) {
            return Err(LinalgError::WrongLength { found: row.len(), expected: order });
        }
        let (tridiagonal, aside) = Factored::setting_aside(matrix, Some(CANCELLED), effort)?;
        let mut rows: Vec<Vec<T>> = aside.iter().map(|&i| row_of(matrix, i)).chain(border.iter().cloned()).collect();
        // The corner holds what the rows of the border have at the rows set aside.
        let count = rows.len();
        let mut corner: Vec<Vec<T>> = Vec::with_capacity(count);
        for (r, row) in rows.iter().enumerate() {
            let like = row.first().or(matrix.diagonal().first());
            let zero = like.map(|x| x.whole(0)).ok_or(LinalgError::WrongLength { found: 0, expected: order })?;
            let entry = |c: usize| match (aside.get(r), aside.get(c)) {
                (_, Some(&column)) => row[column].clone(),
                (Some(&mirror), None) => rows[c][mirror].clone(),
                (None, None) => zero.clone(),
            };
            corner.push((0..count).map(entry).collect());
        }
        for row in &mut rows {
            for &i in &aside {
                row[i] = row[i].whole(0);
            }
        }
        let mut solved = Vec::with_capacity(count);
        for row in &rows {
            effort.check()?;
            solved.push(tridiagonal.solve(row)?);
        }
        for (r, row) in rows.iter().enumerate() {
            for (c, solution) in solved.iter().enumerate() {
                subtract_dot(&mut corner[r][c], row, solution);
            }
        }
        let schur = SmallLu::new(corner).ok_or(LinalgError::NoPivot { row: order + border.len() })?;
        Ok(Self { tridiagonal, aside, rows, solved, schur, given: border.len() })
    }

    /// Returns how many rows of T were moved to the border.
    pub fn moved(&self) -> usize {
        self.aside.len()
    }

    /// Solves `T x + B y = b`, `B^T x = c`.
    ///
    /// *Errors*: a right-hand side of another length.
    pub fn solve(&self, b: &[T], c: &[T]) -> Result<BorderedSolution<T>, LinalgError> {
        if b.len() != self.tridiagonal.order() || c.len() != self.given {
            return Err(LinalgError::WrongLength {
                found: b.len() + c.len(),
                expected: self.tridiagonal.order() + self.given,
            });
        }
        let mut x = b.to_vec();
        for &i in &self.aside {
            x[i] = x[i].whole(0);
        }
        self.tridiagonal.solve_in_place(&mut x)?;
        let mut right: Vec<T> = self.aside.iter().map(|&i| b[i].clone()).chain(c.iter().cloned()).collect();
        for (r, row) in right.iter_mut().zip(&self.rows) {
            subtract_dot(r, row, &x);
        }
        let mut border = self.schur.solve(&right)?;
        for (y, solution) in border.iter().zip(&self.solved) {
            for (x, s) in x.iter_mut().zip(solution) {
                x.subtract_product(y, s);
            }
        }
        let multipliers = border.split_off(self.aside.len());
        for (&i, value) in self.aside.iter().zip(border) {
            x[i] = value;
        }
        Ok(BorderedSolution { x, multipliers })
    }
}

/// Returns a row of a tridiagonal matrix in full.
fn row_of<T: Scalar>(matrix: &Tridiagonal<T>, i: usize) -> Vec<T> {
    let mut row: Vec<T> = matrix.diagonal().iter().map(|x| x.whole(0)).collect();
    row[i] = matrix.diagonal()[i].clone();
    if i > 0 {
        row[i - 1] = matrix.off()[i - 1].clone();
    }
    if let Some(off) = matrix.off().get(i) {
        row[i + 1] = off.clone();
    }
    row
}

/// Takes the sum of products away.
fn subtract_dot<T: Scalar>(from: &mut T, a: &[T], b: &[T]) {
    for (a, b) in a.iter().zip(b) {
        if !a.is_zero() {
            from.subtract_product(a, b);
        }
    }
}
