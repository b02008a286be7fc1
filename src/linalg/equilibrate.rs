//! Scaling of a matrix by powers of two, so that the largest entry of every row and column is about 1.

use super::source::Source;

/// Rounds of scaling; each halves the exponents that are left.
const ROUNDS: usize = 24;

/// Powers of two for the rows and columns of a matrix: `2^rows[i] a_ij 2^columns[j]`.
#[derive(Clone, Debug)]
pub(super) struct Equilibration {
    pub rows: Vec<i64>,
    pub columns: Vec<i64>,
}

impl Equilibration {
    /// Balances a symmetric matrix, rows and columns alike; `None` if a row is zero.
    ///
    /// *Source*: the simultaneous row and column scaling of D. Ruiz (2001) in the maximum norm, on exponents only.
    pub fn symmetric(a: &Source) -> Option<Self> {
        let order = a.order();
        let exponents = exponents(a);
        let mut scale = vec![0i64; order];
        for _ in 0..ROUNDS {
            let largest: Option<Vec<i64>> = (0..order)
                .map(|j| {
                    let column = &exponents[j * order..(j + 1) * order];
                    column.iter().zip(&scale).filter_map(|(e, s)| e.map(|e| e + s + scale[j])).max()
                })
                .collect();
            let largest = largest?;
            if largest.iter().all(|e| (-1..=0).contains(e)) {
                break;
            }
            for (s, e) in scale.iter_mut().zip(&largest) {
                // Rounding up keeps entries below 1.
                *s -= (e + 1).div_euclid(2);
            }
        }
        Some(Self { rows: scale.clone(), columns: scale })
    }

    /// Balances a general matrix: columns, then rows, a few times over; `None` if a row or column is zero.
    pub fn general(a: &Source) -> Option<Self> {
        let order = a.order();
        let exponents = exponents(a);
        let (mut rows, mut columns) = (vec![0i64; order], vec![0i64; order]);
        for _ in 0..3 {
            for j in 0..order {
                let column = &exponents[j * order..(j + 1) * order];
                columns[j] = -column.iter().zip(&rows).filter_map(|(e, r)| e.map(|e| e + r)).max()?;
            }
            let mut largest: Vec<Option<i64>> = vec![None; order];
            for j in 0..order {
                let column = &exponents[j * order..(j + 1) * order];
                for (l, e) in largest.iter_mut().zip(column) {
                    *l = (*l).max(e.map(|e| e + columns[j]));
                }
            }
            for (r, l) in rows.iter_mut().zip(largest) {
                *r = -l?;
            }
        }
        Some(Self { rows, columns })
    }

    /// Returns the number of bits between the largest and the smallest column factor.
    pub fn column_spread(&self) -> u32 {
        let (least, most) = self.columns.iter().fold((i64::MAX, i64::MIN), |(l, m), c| (l.min(*c), m.max(*c)));
        u32::try_from(most.saturating_sub(least)).unwrap_or(u32::MAX)
    }
}

/// Returns the exponents of the entries by columns, `None` for zeros.
fn exponents(a: &Source) -> Vec<Option<i64>> {
    let order = a.order();
    (0..order * order).map(|k| a.entry(k % order, k / order).get_exp().map(i64::from)).collect()
}

#[cfg(test)]
mod tests {
    use nalgebra::DMatrix;
    use rug::Float;

    use super::*;

    #[test]
    fn graded_matrix_becomes_flat() {
        let a = DMatrix::from_fn(12, 12, |i, j| Float::with_val(64, 1) >> (40 * (i + j)) as u32);
        let scaled = Equilibration::symmetric(&Source::Whole(a.clone())).expect("no zero row");
        for i in 0..12 {
            let largest = (0..12).map(|j| i64::from(a[(i, j)].get_exp().unwrap()) + scaled.rows[i] + scaled.columns[j]);
            assert!((-2..=1).contains(&largest.max().unwrap()));
        }
    }

    #[test]
    fn zero_row_is_noticed() {
        let mut a = DMatrix::from_element(3, 3, Float::with_val(64, 1));
        for k in 0..3 {
            a[(1, k)] = Float::new(64);
            a[(k, 1)] = Float::new(64);
        }
        let a = Source::Whole(a);
        assert!(Equilibration::symmetric(&a).is_none());
        assert!(Equilibration::general(&a).is_none());
    }
}
