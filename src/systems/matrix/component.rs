//! The connected components of H: the sets of basis states that H mixes. Everything about H is done one component at a time.

use super::entries::{Entry, ExactMatrix};
use super::obstacle;
use crate::linalg::HermitianMatrix;
use crate::num::Surd;
use crate::systems::Obstacle;
use nalgebra::DMatrix;
use rug::{Float, Integer};
use std::sync::OnceLock;

/// Longest common denominator with which eigenvalues are tried for exact values, in bits.
const LONGEST_DENOMINATOR: u32 = 1024;

/// A set of basis states that H mixes among each other.
#[derive(Clone, Debug)]
pub struct Component {
    /// The basis states in rising order.
    pub members: Vec<usize>,
    /// Whether every entry inside is real.
    pub is_real: bool,
    /// The common denominator of all entries, with which only roots and i (and pi, which makes guesses of energies less often right) are left
    /// above the line; `None` if it is very long.
    pub denominator: Option<Integer>,
    size_exponent: OnceLock<i64>,
}

impl Component {
    pub fn order(&self) -> usize {
        self.members.len()
    }

    /// An exponent e with every eigenvalue below 2^e in absolute value: the order times the largest entry is a bound.
    pub fn size_exponent(&self, h: &ExactMatrix) -> i64 {
        *self.size_exponent.get_or_init(|| {
            let entries = self.members.iter().flat_map(|row| h.row(*row)).map(|(_, entry)| entry);
            let largest = entries.filter_map(|entry| entry.rounded(8).ok()).flat_map(|value| {
                let (re, im) = value.into_real_imag();
                [re.get_exp(), im.get_exp()]
            });
            let largest = largest.flatten().max().unwrap_or(0);
            // One bit for complex entries, and one for the rounding.
            i64::from(largest) + i64::from(usize::BITS - self.order().leading_zeros()) + 2
        })
    }

    /// The place of a basis state inside the component.
    pub fn local(&self, index: usize) -> Option<usize> {
        self.members.binary_search(&index).ok()
    }
}

/// The components of H by rising first state.
pub fn components(h: &ExactMatrix) -> Vec<Component> {
    h.components()
        .into_iter()
        .map(|members| {
            let entries = || members.iter().flat_map(|row| h.row(*row)).map(|(_, entry)| entry);
            let is_real = entries().all(Entry::is_real);
            let mut denominator = Some(Integer::from(1));
            for entry in entries() {
                denominator = denominator.and_then(|common| with_denominators(common, entry));
            }
            Component { members, is_real, denominator, size_exponent: OnceLock::new() }
        })
        .collect()
}

/// The least common multiple of a number and the denominators of an entry, unless it is too long.
fn with_denominators(mut common: Integer, entry: &Entry) -> Option<Integer> {
    match entry {
        Entry::Rational(q) => common.lcm_mut(q.denom()),
        Entry::Roots(surd) => {
            for (_, c) in surd.terms() {
                common.lcm_mut(c.re.denom());
                common.lcm_mut(c.im.denom());
            }
        }
    }
    (common.significant_bits() <= LONGEST_DENOMINATOR).then_some(common)
}

/// H inside a component, with entries of `bits` bits.
pub fn hermitian(h: &ExactMatrix, component: &Component, bits: u32) -> Result<HermitianMatrix, Obstacle> {
    let n = component.order();
    let zero = || DMatrix::from_element(n, n, Float::new(bits));
    let (mut re, mut im) = (zero(), (!component.is_real).then(zero));
    for (row, member) in component.members.iter().enumerate() {
        for (column, entry) in h.row(*member).iter().take_while(|(column, _)| column <= member) {
            let Some(column) = component.local(*column) else { continue };
            let value = entry
                .rounded(bits)
                .map_err(|error| Obstacle::Refused { message: error.to_string(), help: "scale the matrix".into() })?;
            re[(row, column)] = value.real().clone();
            re[(column, row)] = value.real().clone();
            if let Some(im) = &mut im
                && row != column
            {
                im[(row, column)] = value.imag().clone();
                im[(column, row)] = Float::with_val(bits, -value.imag());
            }
        }
    }
    HermitianMatrix::new(re, im).map_err(obstacle)
}

/// The rows of energy - H inside a component, with a right-hand side as last column.
pub fn shifted_rows(
    h: &ExactMatrix,
    component: &Component,
    energy: &Surd,
    right: impl Fn(usize) -> Surd,
) -> Vec<Vec<Surd>> {
    let n = component.order();
    let mut rows = vec![vec![Surd::zero(); n + 1]; n];
    for (row, member) in component.members.iter().enumerate() {
        for (column, entry) in h.row(*member) {
            if let Some(column) = component.local(*column) {
                rows[row][column] = -&entry.to_surd();
            }
        }
        rows[row][row] += energy;
        rows[row][n] = right(*member);
    }
    rows
}

#[cfg(test)]
mod tests {
    use super::*;
    use rug::Rational;

    #[test]
    fn denominators_are_common_to_a_component() {
        let q = |n, d| Surd::from(Rational::from((n, d)));
        let root = Surd::sqrt_of(&Rational::from((1, 2))).expect("small");
        let main = vec![q(1, 4), q(1, 6), q(1, 5)];
        let matrix = ExactMatrix::from_diagonals(vec![main, vec![root, Surd::zero()]]).expect("symmetric");
        let found: Vec<_> = components(&matrix).into_iter().map(|c| (c.members, c.denominator)).collect();
        assert_eq!(found, [(vec![0, 1], Some(Integer::from(12))), (vec![2], Some(Integer::from(5)))]);
    }

    #[test]
    fn shifted_rows_stand_for_one_component() {
        let q = |n| Surd::from(n);
        let matrix = ExactMatrix::from_diagonals(vec![vec![q(1), q(7), q(3)], vec![q(0), q(0)], vec![q(5)]]);
        let matrix = matrix.expect("symmetric");
        let parts = components(&matrix);
        assert_eq!(
            shifted_rows(&matrix, &parts[0], &q(10), |k| q(k as i64)),
            [vec![q(9), q(-5), q(0)], vec![q(-5), q(7), q(2)]]
        );
        let h = hermitian(&matrix, &parts[0], 64).expect("in range");
        assert_eq!(h.re()[(0, 1)], 5);
        assert!(h.is_real());
    }
}
