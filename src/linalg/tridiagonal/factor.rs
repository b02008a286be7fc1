//! The block factorisation T = L D L^T of a symmetric tridiagonal matrix with pivots of order 1 and 2.

use super::{Scalar, Tridiagonal};
use crate::linalg::error::LinalgError;
use crate::num::Effort;

/// A pivot with so few bits left is noise.
const NOISE: u32 = 8;

/// How many eigenvalues are below, at and above zero.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Inertia {
    pub negative: usize,
    pub zero: usize,
    pub positive: usize,
}

/// A pivot block with the rows of L below it.
#[derive(Clone, Debug)]
enum Pivot<T> {
    /// One row: the pivot, and the multiplier of the next row.
    One { pivot: T, below: Option<T> },
    /// Two rows: the inverse of the block (first, mixed, second), and the multipliers of the next row.
    Two { inverse: [T; 3], below: Option<[T; 2]> },
    /// A row set aside for a border: nothing is known of it here.
    Aside,
}

/// A factorised symmetric tridiagonal matrix.
///
/// Pivots of order 2 are taken where one of order 1 would let entries grow, so the factorisation is stable norm-wise
/// without exchanging rows. *Cost*: about 3 operations a row to factor, 5 a row to solve. *Source*: the pivots of J.
/// R. Bunch (SIAM J. Numer. Anal. 11 (1974) 521), compared with the neighbouring entries instead of the largest of
/// all.
#[derive(Clone, Debug)]
pub struct Factored<T> {
    pivots: Vec<Pivot<T>>,
    order: usize,
    cancelled_bits: u32,
}

impl<T: Scalar> Factored<T> {
    /// Factorises a matrix.
    ///
    /// *Errors*: [`LinalgError::NoPivot`] at a pivot that is zero, or lost in rounding.
    pub fn new(matrix: &Tridiagonal<T>, effort: &Effort) -> Result<Self, LinalgError> {
        let bits = matrix.diagonal().iter().filter_map(Scalar::bits).min();
        let most = bits.map(|bits| bits.saturating_sub(NOISE));
        let (factored, aside) = Self::setting_aside(matrix, most, effort)?;
        aside.first().map_or(Ok(factored), |&row| Err(LinalgError::NoPivot { row }))
    }

    /// Factorises a matrix less the rows and columns whose pivots cancel more than `bits` bits, which are returned;
    /// without `bits`, only those whose pivots are exactly zero.
    pub(super) fn setting_aside(
        matrix: &Tridiagonal<T>,
        bits: Option<u32>,
        effort: &Effort,
    ) -> Result<(Self, Vec<usize>), LinalgError> {
        let (diagonal, off) = (matrix.diagonal(), matrix.off());
        let order = diagonal.len();
        let mut pivots: Vec<Pivot<T>> = Vec::with_capacity(order);
        let mut aside = Vec::new();
        let mut cancelled_bits = 0;
        let mut i = 0;
        let mut taken: Option<Taken<T>> = None;
        while i < order {
            if i % 4096 == 0 {
                effort.check()?;
            }
            let mut pivot = diagonal[i].clone();
            let mut scale = diagonal[i].size();
            if let Some(taken) = &taken {
                pivot.subtract_product(&taken.value, &taken.value.whole(1));
                scale = scale.max(taken.scale);
            }
            let next = off.get(i).filter(|off| !off.is_zero());
            if let Some(off_i) = next
                && wants_two(&pivot, off_i, &diagonal[i + 1], off.get(i + 1))
            {
                let (block, taken_next) = two_rows(&pivot, scale, off_i, &diagonal[i + 1], off.get(i + 1));
                pivots.push(block);
                taken = taken_next;
                i += 2;
                continue;
            }
            let lost = match (scale, pivot.size()) {
                (Some(scale), Some(after)) => u32::try_from(scale - after).unwrap_or(0),
                (_, None) => u32::MAX,
                (None, Some(_)) => 0,
            };
            if pivot.is_zero() || bits.is_some_and(|bits| !T::EXACT && lost > bits) {
                detach(pivots.last_mut());
                pivots.push(Pivot::Aside);
                aside.push(i);
                taken = None;
            } else {
                if !T::EXACT {
                    cancelled_bits = lost.max(cancelled_bits);
                }
                let below = next.map(|off| off.over(&pivot));
                taken = below.as_ref().zip(next).map(|(below, off)| {
                    let value = below.times(off);
                    let scale = value.size().map(|size| size + i64::from(lost));
                    Taken { value, scale }
                });
                pivots.push(Pivot::One { pivot, below });
            }
            i += 1;
        }
        Ok((Self { pivots, order, cancelled_bits }, aside))
    }

    /// Returns the number of rows.
    pub fn order(&self) -> usize {
        self.order
    }

    /// Returns the most bits that cancelled in a pivot: about what the nearness of an eigenvalue to zero costs.
    pub fn cancelled_bits(&self) -> u32 {
        self.cancelled_bits
    }

    /// Solves in place.
    ///
    /// *Errors*: a right-hand side of another length.
    pub fn solve_in_place(&self, x: &mut [T]) -> Result<(), LinalgError> {
        if x.len() != self.order {
            return Err(LinalgError::WrongLength { found: x.len(), expected: self.order });
        }
        let mut i = 0;
        for pivot in &self.pivots {
            match pivot {
                Pivot::One { pivot, below } => {
                    let (known, rest) = x.split_at_mut(i + 1);
                    if let Some(below) = below {
                        rest[0].subtract_product(below, &known[i]);
                    }
                    known[i] = known[i].over(pivot);
                    i += 1;
                }
                Pivot::Two { inverse: [first, mixed, second], below } => {
                    let (known, rest) = x.split_at_mut(i + 2);
                    if let Some([one, two]) = below {
                        rest[0].subtract_product(one, &known[i]);
                        rest[0].subtract_product(two, &known[i + 1]);
                    }
                    let mut upper = first.times(&known[i]);
                    upper.add(&mixed.times(&known[i + 1]));
                    let mut lower = mixed.times(&known[i]);
                    lower.add(&second.times(&known[i + 1]));
                    known[i] = upper;
                    known[i + 1] = lower;
                    i += 2;
                }
                Pivot::Aside => {
                    x[i] = x[i].whole(0);
                    i += 1;
                }
            }
        }
        for pivot in self.pivots.iter().rev() {
            match pivot {
                Pivot::One { below, .. } => {
                    i -= 1;
                    let (rest, known) = x.split_at_mut(i + 1);
                    if let Some(below) = below {
                        rest[i].subtract_product(below, &known[0]);
                    }
                }
                Pivot::Two { below, .. } => {
                    i -= 2;
                    let (rest, known) = x.split_at_mut(i + 2);
                    if let Some([one, two]) = below {
                        rest[i].subtract_product(one, &known[0]);
                        rest[i + 1].subtract_product(two, &known[0]);
                    }
                }
                Pivot::Aside => i -= 1,
            }
        }
        Ok(())
    }

    /// Solves for one right-hand side.
    ///
    /// *Errors*: a right-hand side of another length.
    pub fn solve(&self, rhs: &[T]) -> Result<Vec<T>, LinalgError> {
        let mut x = rhs.to_vec();
        self.solve_in_place(&mut x)?;
        Ok(x)
    }
}

impl<T: Scalar> Tridiagonal<T> {
    /// Counts the eigenvalues of a real matrix below, at and above zero.
    ///
    /// *Accuracy*: exact for rationals; for floats the count of a matrix whose entries differ by a few units in the
    /// last place, and a zero is only counted where a pivot vanishes exactly. *Source*: Sylvester's law of inertia.
    pub fn inertia(&self, effort: &Effort) -> Result<Inertia, LinalgError> {
        let (factored, aside) = Factored::setting_aside(self, None, effort)?;
        // A zero pivot is met only where the entry beside it is zero as well, or in the last row.
        let mut inertia = Inertia { negative: 0, zero: aside.len(), positive: 0 };
        for pivot in &factored.pivots {
            match pivot {
                Pivot::One { pivot, .. } if pivot.is_negative() => inertia.negative += 1,
                Pivot::One { .. } => inertia.positive += 1,
                Pivot::Two { .. } => {
                    inertia.negative += 1;
                    inertia.positive += 1;
                }
                Pivot::Aside => {}
            }
        }
        Ok(inertia)
    }
}

/// Tells whether a pivot of order 1 is too small beside its neighbour.
fn wants_two<T: Scalar>(pivot: &T, off: &T, next: &T, off_next: Option<&T>) -> bool {
    if T::EXACT {
        return pivot.is_zero();
    }
    let Some(off) = off.size() else { return false };
    match (pivot.size(), next.size().max(off_next.and_then(Scalar::size))) {
        (Some(pivot), Some(neighbour)) => pivot + neighbour <= 2 * off - 5,
        _ => true,
    }
}

/// What the rows before take away from the next entry of the diagonal.
struct Taken<T> {
    value: T,
    /// Rounding has made it uncertain as if it were a number of this size, through what cancelled before.
    scale: Option<i64>,
}

/// Forms a pivot of order 2 and what it takes from the diagonal after it; `scale` is the size that the uncertainty of
/// the first entry belongs to.
fn two_rows<T: Scalar>(
    pivot: &T,
    scale: Option<i64>,
    off: &T,
    next: &T,
    off_next: Option<&T>,
) -> (Pivot<T>, Option<Taken<T>>) {
    let mut determinant = pivot.times(next);
    determinant.subtract_product(off, off);
    let minus_off = off.times(&off.whole(-1));
    let inverse = [next.over(&determinant), minus_off.over(&determinant), pivot.over(&determinant)];
    let coupling = off_next.filter(|off| !off.is_zero());
    let below = coupling.map(|off| [off.times(&inverse[1]), off.times(&inverse[2])]);
    let taken = below.as_ref().zip(coupling).map(|(below, off)| {
        let value = below[1].times(off);
        // value = off^2 pivot / determinant, of which only the pivot is uncertain.
        let uncertain = match (scale, off.size(), determinant.size()) {
            (Some(scale), Some(off), Some(determinant)) => Some(scale + 2 * off - determinant),
            _ => None,
        };
        Taken { scale: value.size().max(uncertain), value }
    });
    (Pivot::Two { inverse, below }, taken)
}

/// Cuts the coupling of a pivot to the row after it, which is set aside.
fn detach<T>(pivot: Option<&mut Pivot<T>>) {
    match pivot {
        Some(Pivot::One { below, .. }) => *below = None,
        Some(Pivot::Two { below, .. }) => *below = None,
        Some(Pivot::Aside) | None => {}
    }
}
