//! Eigenvalues of real symmetric matrices in machine numbers, ready to be stopped.

use crate::num::{Effort, Interrupted};

/// Steps of the iteration an eigenvalue may take; it needs two or three.
const STEPS_EACH: usize = 60;

/// Sums that run side by side in an inner product.
const LANES: usize = 8;

/// Returns the eigenvalues in rising order; `None` if the iteration did not settle.
///
/// *Shapes*: the rows of the lower triangle, row i with i + 1 entries. *Accuracy*: about the order times 2^-53 of the largest eigenvalue.
/// *Cost*: 4/3 order^3 operations. *Source*: reduction by reflections and the implicit QL iteration, as in J. H. Wilkinson and C. Reinsch,
/// Handbook for Automatic Computation II, Linear Algebra, contributions II/2 and II/4.
pub fn eigenvalues(lower: Vec<Vec<f64>>, effort: &Effort) -> Result<Option<Vec<f64>>, Interrupted> {
    let (mut diagonal, mut beside) = tridiagonal(lower, effort)?;
    if !ql(&mut diagonal, &mut beside, effort)? || diagonal.iter().any(|x| !x.is_finite()) {
        return Ok(None);
    }
    diagonal.sort_by(f64::total_cmp);
    Ok(Some(diagonal))
}

/// Reduces a matrix to tridiagonal form: its diagonal, and what stands beside entry i and i + 1 of it.
fn tridiagonal(mut rows: Vec<Vec<f64>>, effort: &Effort) -> Result<(Vec<f64>, Vec<f64>), Interrupted> {
    let order = rows.len();
    let (mut diagonal, mut beside) = (vec![0.0; order], vec![0.0; order.saturating_sub(1)]);
    for i in (1..order).rev() {
        effort.check()?;
        let mut v = std::mem::take(&mut rows[i]);
        diagonal[i] = v.pop().unwrap_or(0.0);
        let last = v[i - 1];
        let length = inner(&v, &v).sqrt();
        if v[..i - 1].iter().all(|x| *x == 0.0) || length == 0.0 {
            beside[i - 1] = last;
            continue;
        }
        beside[i - 1] = -length.copysign(last);
        v[i - 1] = last + length.copysign(last);
        // 2/(v v)
        let factor = 1.0 / (length * (length + last.abs()));
        let mut image = vec![0.0; i];
        for (row, entries) in rows[..i].iter().enumerate() {
            image[row] += inner(entries, &v[..=row]);
            add_multiple(&mut image[..row], v[row], &entries[..row]);
        }
        for x in &mut image {
            *x *= factor;
        }
        let overlap = factor / 2.0 * inner(&image, &v);
        add_multiple(&mut image, -overlap, &v);
        for (row, entries) in rows[..i].iter_mut().enumerate() {
            let (a, b) = (v[row], image[row]);
            for ((entry, w), u) in entries.iter_mut().zip(&image).zip(&v) {
                *entry -= a * w + b * u;
            }
        }
    }
    if let Some(first) = rows.first().and_then(|row| row.first()) {
        diagonal[0] = *first;
    }
    Ok((diagonal, beside))
}

/// Sum of products, in an order that does not depend on the machine.
fn inner(a: &[f64], b: &[f64]) -> f64 {
    let mut sums = [0.0; LANES];
    let (chunks_a, chunks_b) = (a.chunks_exact(LANES), b.chunks_exact(LANES));
    let rest: f64 = chunks_a.remainder().iter().zip(chunks_b.remainder()).map(|(x, y)| x * y).sum();
    for (x, y) in chunks_a.zip(chunks_b) {
        for lane in 0..LANES {
            sums[lane] += x[lane] * y[lane];
        }
    }
    sums.iter().sum::<f64>() + rest
}

fn add_multiple(target: &mut [f64], factor: f64, source: &[f64]) {
    for (t, s) in target.iter_mut().zip(source) {
        *t += factor * s;
    }
}

/// Diagonalises a tridiagonal matrix in place; false if an eigenvalue does not settle.
fn ql(diagonal: &mut [f64], beside: &mut [f64], effort: &Effort) -> Result<bool, Interrupted> {
    let order = diagonal.len();
    for l in 0..order {
        effort.check()?;
        let mut steps = 0;
        loop {
            let negligible = |k: usize| {
                beside[k].abs() <= f64::EPSILON / 2.0 * (diagonal[k].abs() + diagonal[k + 1].abs())
                    || beside[k].abs() < f64::MIN_POSITIVE
            };
            let end = (l..order - 1).find(|k| negligible(*k)).unwrap_or(order - 1);
            if end == l {
                break;
            }
            if steps == STEPS_EACH {
                return Ok(false);
            }
            steps += 1;
            let slope = (diagonal[l + 1] - diagonal[l]) / (2.0 * beside[l]);
            let shift = diagonal[l] - beside[l] / (slope + slope.hypot(1.0).copysign(slope));
            let (mut sine, mut cosine, mut moved) = (1.0_f64, 1.0_f64, 0.0_f64);
            let mut g = diagonal[end] - shift;
            let mut split = false;
            for k in (l..end).rev() {
                let f = sine * beside[k];
                let b = cosine * beside[k];
                let r = f.hypot(g);
                // The place behind the block belongs to no pair.
                if k + 1 < end {
                    beside[k + 1] = r;
                }
                if r == 0.0 {
                    diagonal[k + 1] -= moved;
                    split = true;
                    break;
                }
                sine = f / r;
                cosine = g / r;
                let above = diagonal[k + 1] - moved;
                let turned = (diagonal[k] - above) * sine + 2.0 * cosine * b;
                moved = sine * turned;
                diagonal[k + 1] = above + moved;
                g = cosine * turned - b;
            }
            if end < order - 1 {
                beside[end] = 0.0;
            }
            if !split {
                diagonal[l] -= moved;
                beside[l] = g;
            }
        }
    }
    Ok(true)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn found(order: usize, entry: impl Fn(usize, usize) -> f64) -> Vec<f64> {
        let lower = (0..order).map(|i| (0..=i).map(|j| entry(i, j)).collect()).collect();
        eigenvalues(lower, &Effort::new()).expect("not stopped").expect("settled")
    }

    fn assert_near(found: &[f64], expected: &[f64]) {
        assert_eq!(found.len(), expected.len());
        for (a, b) in found.iter().zip(expected) {
            assert!((a - b).abs() < 1e-13 * expected.len() as f64, "{found:?} and {expected:?}");
        }
    }

    #[test]
    fn small_matrices() {
        assert_near(&found(0, |_, _| 0.0), &[]);
        assert_near(&found(1, |_, _| 3.0), &[3.0]);
        assert_near(&found(2, |i, j| if i == j { 0.0 } else { -1.0 }), &[-1.0, 1.0]);
        assert_near(&found(4, |_, _| 0.0), &[0.0; 4]);
        assert_near(&found(5, |_, _| 1.0), &[0.0, 0.0, 0.0, 0.0, 5.0]);
        assert_near(&found(4, |i, j| if i == j { [3.0, -1.0, 2.0, -1.0][i] } else { 0.0 }), &[-1.0, -1.0, 2.0, 3.0]);
    }

    #[test]
    fn a_hopping_chain() {
        // 2 cos(pi k/(n + 1))
        for order in [3, 8, 30, 61] {
            let mut expected: Vec<f64> =
                (1..=order).map(|k| 2.0 * (std::f64::consts::PI * k as f64 / (order as f64 + 1.0)).cos()).collect();
            expected.sort_by(f64::total_cmp);
            assert_near(&found(order, |i, j| f64::from(u8::from(i == j + 1))), &expected);
        }
    }

    #[test]
    fn a_dense_matrix_with_a_known_spectrum() {
        // H D H with the reflection H = 1 - 2 w w^T/(w w) and D = diag(0, 1, 2, 2, 3, 4, 4, …)
        let order = 50;
        let level = |k: usize| (2 * k / 3) as f64;
        let w = |k: usize| ((7 * k) % 11) as f64 - 4.5;
        let norm: f64 = (0..order).map(|k| w(k) * w(k)).sum();
        let mean: f64 = (0..order).map(|k| w(k) * w(k) * level(k)).sum::<f64>() / norm;
        let entry = |i: usize, j: usize| {
            let outer = w(i) * w(j) / norm;
            (if i == j { level(i) } else { 0.0 }) - 2.0 * outer * (level(i) + level(j)) + 4.0 * outer * mean
        };
        assert_near(&found(order, entry), &(0..order).map(level).collect::<Vec<_>>());
    }

    #[test]
    fn it_is_stopped() {
        let effort = Effort::new();
        effort.stop();
        assert_eq!(eigenvalues(vec![vec![1.0], vec![2.0, 3.0]], &effort), Err(Interrupted));
    }
}
