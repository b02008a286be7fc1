//! Gauss-Jordan elimination without fractions.

use crate::num::{Effort, Interrupted, Surd};
use rug::{Integer, Rational};

/// Longest number an elimination may reach, in bits.
const LONGEST: u32 = 1 << 17;

/// Numbers that are added, multiplied, and divided where the quotient is known to be whole.
pub trait Whole: Clone {
    fn one() -> Self;
    fn is_zero(&self) -> bool;
    fn bits(&self) -> u32;
    /// (a d - b c) / divisor, which leaves no rest.
    fn cross(a: &Self, d: &Self, b: &Self, c: &Self, divisor: &Self) -> Self;
}

impl Whole for Integer {
    fn one() -> Self {
        Integer::from(1)
    }

    fn is_zero(&self) -> bool {
        *self == 0
    }

    fn bits(&self) -> u32 {
        self.significant_bits()
    }

    fn cross(a: &Self, d: &Self, b: &Self, c: &Self, divisor: &Self) -> Self {
        let mut value = Integer::from(a * d);
        value -= b * c;
        value.div_exact_mut(divisor);
        value
    }
}

/// a + b i with whole a and b.
#[derive(Clone, Debug, PartialEq)]
pub struct GaussianInteger {
    pub re: Integer,
    pub im: Integer,
}

impl GaussianInteger {
    /// a/b as an exact number.
    pub fn quotient(above: &Self, below: &Self) -> Surd {
        let norm = below.norm();
        let re = Integer::from(&above.re * &below.re) + Integer::from(&above.im * &below.im);
        let im = Integer::from(&above.im * &below.re) - Integer::from(&above.re * &below.im);
        Surd::gaussian(Rational::from((re, norm.clone())), Rational::from((im, norm)))
    }

    fn norm(&self) -> Integer {
        Integer::from(self.re.square_ref()) + Integer::from(self.im.square_ref())
    }
}

impl Whole for GaussianInteger {
    fn one() -> Self {
        GaussianInteger { re: Integer::from(1), im: Integer::new() }
    }

    fn is_zero(&self) -> bool {
        self.re == 0 && self.im == 0
    }

    fn bits(&self) -> u32 {
        self.re.significant_bits().max(self.im.significant_bits())
    }

    fn cross(a: &Self, d: &Self, b: &Self, c: &Self, divisor: &Self) -> Self {
        let mut re = Integer::from(&a.re * &d.re);
        re -= &a.im * &d.im;
        re -= &b.re * &c.re;
        re += &b.im * &c.im;
        let mut im = Integer::from(&a.re * &d.im);
        im += &a.im * &d.re;
        im -= &b.re * &c.im;
        im -= &b.im * &c.re;
        if divisor.im == 0 {
            re.div_exact_mut(&divisor.re);
            im.div_exact_mut(&divisor.re);
            return GaussianInteger { re, im };
        }
        let norm = divisor.norm();
        let mut quotient_re = Integer::from(&re * &divisor.re);
        quotient_re += &im * &divisor.im;
        quotient_re.div_exact_mut(&norm);
        let mut quotient_im = Integer::from(&im * &divisor.re);
        quotient_im -= &re * &divisor.im;
        quotient_im.div_exact_mut(&norm);
        GaussianInteger { re: quotient_re, im: quotient_im }
    }
}

/// A system after elimination: row k has its pivot in column `pivots[k]`, alone in that column; rows beyond the rank are zero in the matrix.
pub struct Reduced<T> {
    pub rows: Vec<Vec<T>>,
    pub pivots: Vec<usize>,
    /// Which entries are zero.
    pub zero: Vec<Vec<bool>>,
}

impl<T> Reduced<T> {
    /// Whether a column is zero in every row beyond the rank.
    pub fn zero_beyond_rank(&self, column: usize) -> bool {
        self.zero[self.pivots.len()..].iter().all(|row| row[column])
    }
}

/// Reduces a square system with its right-hand side as last column; `None` when a number outgrows the limit.
///
/// Every number on the way is a minor of the system, so they stay as short as they can.
/// *Source*: E. H. Bareiss, Math. Comp. 22 (1968) 565; rows above the pivot are treated like those below.
pub fn reduce<T: Whole>(mut rows: Vec<Vec<T>>, effort: &Effort) -> Result<Option<Reduced<T>>, Interrupted> {
    let n = rows.len();
    let mut pivots: Vec<usize> = Vec::new();
    let mut before = T::one();
    for column in 0..n {
        effort.check()?;
        let next = pivots.len();
        let best = (next..n).filter(|&row| !rows[row][column].is_zero()).min_by_key(|&row| rows[row][column].bits());
        let Some(best) = best else { continue };
        rows.swap(next, best);
        let pivot_row = rows[next].clone();
        let pivot = &pivot_row[column];
        if pivot.bits() > LONGEST {
            return Ok(None);
        }
        for (row, entries) in rows.iter_mut().enumerate() {
            if row == next {
                continue;
            }
            effort.check()?;
            let factor = entries[column].clone();
            for (k, entry) in entries.iter_mut().enumerate() {
                if !(entry.is_zero() && (factor.is_zero() || pivot_row[k].is_zero())) {
                    *entry = T::cross(pivot, entry, &factor, &pivot_row[k], &before);
                }
            }
        }
        before = pivot.clone();
        pivots.push(column);
    }
    let zero = rows.iter().map(|row| row.iter().map(T::is_zero).collect()).collect();
    Ok(Some(Reduced { rows, pivots, zero }))
}
