//! A chain of three resolvents, <b| 1/(z1 - H) 1/(z2 - H) 1/(z3 - H) |b>, on a dense symmetric matrix.
//!
//! `cargo bench --bench dense_chain -- [ORDER DIGITS REPEATS THREADS]` prints the value and the seconds of each run,
//! one line each; tests/bench/reference_dense.py runs it beside the same job in Python.

use std::time::Instant;

use ketwork::linalg::{HermitianMatrix, ShiftedSolver, threads};
use ketwork::num::Effort;
use nalgebra::DMatrix;
use rug::ops::CompleteRound;
use rug::{Complex, Float, Integer};

/// Bits of an entry of the matrix.
const ENTRY_BITS: u32 = 320;

/// The three energies, within the spectrum.
const ENERGIES: [&str; 3] = ["0.3", "-1.7", "2.9"];

/// Steele, Lea, Flood: SplitMix (2014); the Python reference draws the same numbers.
struct Irregular(u64);

impl Irregular {
    fn word(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        z ^ (z >> 31)
    }

    /// A number between -1/2 and 1/2 with `ENTRY_BITS` bits.
    fn number(&mut self) -> Float {
        let whole = (0..ENTRY_BITS / 64).fold(Integer::new(), |v, _| (v << 64u32) + self.word());
        Float::with_val(ENTRY_BITS, whole - (Integer::from(1) << (ENTRY_BITS - 1))) >> ENTRY_BITS
    }
}

fn main() {
    let numbers: Vec<usize> = std::env::args().filter_map(|arg| arg.parse().ok()).collect();
    let argument = |place: usize, usual: usize| numbers.get(place).copied().unwrap_or(usual);
    let (order, digits, repeats) = (argument(0, 200), argument(1, 64), argument(2, 3));
    threads::set(argument(3, 1));
    let bits = (digits as f64 * std::f64::consts::LOG2_10).ceil() as u32;
    // The matrix is exact; the energies and the sum are rounded.
    let precision = bits + 64;
    let mut random = Irregular(2024);
    let mut h = DMatrix::from_element(order, order, Float::new(ENTRY_BITS));
    for i in 0..order {
        for j in 0..=i {
            h[(i, j)] = random.number();
            h[(j, i)] = h[(i, j)].clone();
        }
    }
    let b: Vec<Complex> = (0..order).map(|_| Complex::with_val(ENTRY_BITS, random.number())).collect();
    let h = HermitianMatrix::new(h, None).expect("symmetric");
    let effort = Effort::new();
    for _ in 0..repeats {
        let begin = Instant::now();
        let mut x = b.clone();
        let mut holds = i32::MAX;
        for energy in ENERGIES.iter().rev() {
            let z = Float::parse(energy).expect("a number").complete(precision);
            let solver = ShiftedSolver::new(&h, (&z, None), &[], bits, &effort).expect("not singular");
            let solved = solver.solve(&x, &effort).expect("solved");
            holds = holds.min(solved.holds);
            x = solved.ket;
        }
        let seconds = begin.elapsed().as_secs_f64();
        let value = b.iter().zip(&x).fold(Float::new(precision), |sum, (b, x)| sum + b.real() * x.real());
        println!("{seconds:.6} {holds} {}", value.to_string_radix(10, Some(digits + 6)));
    }
}
