//! Tests across the files: against exact rational elimination, against residuals at twice the precision, on hard
//! matrices.

mod eigen;
mod exact;
mod kernel;
mod shifted;
mod solve;
mod tridiagonal;

use nalgebra::{DMatrix, DVector};
use proptest::prelude::ProptestConfig;
use proptest::test_runner::RngSeed;
use rug::{Complex, Float, Rational};

/// Returns the number of random cases, scaled by KETWORK_CASES (1 is the quick run).
fn cases(quick: u32) -> ProptestConfig {
    let scale: f64 = std::env::var("KETWORK_CASES").ok().and_then(|s| s.parse().ok()).unwrap_or(1.0);
    ProptestConfig {
        cases: ((f64::from(quick) * scale) as u32).max(1),
        rng_seed: RngSeed::Fixed(0x6b65_7477),
        failure_persistence: None,
        ..ProptestConfig::default()
    }
}

/// A generator of irregular numbers with a printed seed.
struct Irregular(u64);

impl Irregular {
    fn next(&mut self) -> u64 {
        // Steele, Lea, Flood: SplitMix (2014).
        self.0 = self.0.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        z ^ (z >> 31)
    }

    fn small(&mut self, bound: i64) -> i64 {
        (self.next() % (2 * bound as u64 + 1)) as i64 - bound
    }

    /// A float between -1 and 1 with all bits of the precision in use.
    fn float(&mut self, precision: u32) -> Float {
        let mut x = Float::new(precision + 64);
        for k in 0..precision / 62 + 1 {
            x += Float::with_val(precision + 64, (self.next() >> 2) as i64 - (1 << 61)) >> (61 + 62 * k);
        }
        Float::with_val(precision, x)
    }

    fn symmetric(&mut self, order: usize, precision: u32) -> DMatrix<Float> {
        let mut a = DMatrix::from_element(order, order, Float::new(precision));
        for i in 0..order {
            for j in 0..=i {
                a[(i, j)] = self.float(precision);
                a[(j, i)] = a[(i, j)].clone();
            }
        }
        a
    }

    fn vector(&mut self, order: usize, precision: u32) -> DVector<Float> {
        DVector::from_fn(order, |_, _| self.float(precision))
    }

    fn ket(&mut self, order: usize, precision: u32) -> Vec<Complex> {
        (0..order).map(|_| Complex::with_val(precision, (self.float(precision), self.float(precision)))).collect()
    }
}

/// Returns log2 of the largest component of `a - b` over that of `b`, an upper bound; `i64::MIN` if equal.
fn difference(a: &DVector<Float>, b: &DVector<Float>) -> i64 {
    let precision = a.iter().chain(b.iter()).map(Float::prec).max().unwrap_or(64) + 64;
    let off = a.iter().zip(b.iter()).filter_map(|(a, b)| Float::with_val(precision, a - b).get_exp()).max();
    let size = b.iter().filter_map(Float::get_exp).max().unwrap_or(0);
    off.map_or(i64::MIN, |off| i64::from(off) - i64::from(size) + 1)
}

/// Returns a rational as a float.
fn float(x: &Rational, precision: u32) -> Float {
    Float::with_val(precision, x)
}
