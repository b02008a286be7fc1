//! The resolvent in Coulomb Sturmian functions r^(l+1) e^(-k r) L_b^(2l+1)(2 k r), where z - H is tridiagonal.

use super::bound::bound_state;
use super::laguerre::square_norms;
use super::moments::{LaguerreBasis, moments};
use super::series::Series;
use super::vector::Vector;
use crate::linalg::LinalgError;
use crate::linalg::tridiagonal::{Bordered, Scalar, Tridiagonal};
use crate::num::Effort;
use crate::systems::Obstacle;
use rug::ops::Pow;
use rug::{Complex, Float, Rational};
use std::collections::VecDeque;
use std::sync::{Arc, Mutex, PoisonError};

/// Bits of coefficients that kept factorisations may hold together.
const KEPT_BITS: usize = 1 << 29;

/// An energy, in units of the atom with charge and reduced mass one.
#[derive(Clone, PartialEq, Debug)]
pub(super) enum Energy {
    Exact(Rational),
    Real(Float),
    Complex(Complex),
}

/// The Sturmian functions of a block.
#[derive(Clone, PartialEq, Debug)]
pub(super) struct SturmianBlock {
    pub(super) k: Rational,
    pub(super) l: u32,
    pub(super) count: usize,
    pub(super) bits: u32,
}

impl SturmianBlock {
    pub(super) fn basis(&self) -> LaguerreBasis {
        LaguerreBasis { k: self.k.clone(), power: i64::from(self.l) + 1, order: 2 * self.l + 1 }
    }

    /// z S - H with the functions in descending order.
    ///
    /// The states left out are made of the first functions; elimination that starts from the far end meets what is singular last, where it
    /// cancels visibly instead of a little in each step.
    /// *Source*: derived here: H b = (-k^2/2 + (k n - 1)/r) b with n = b + l + 1, 1/r is diagonal, and 2 k r has the three-term recursion
    /// of the Laguerre polynomials.
    fn matrix<T: Scalar>(&self, zeta: &T, number: impl Fn(&Float) -> T) -> Result<Tridiagonal<T>, LinalgError> {
        // everything over the denominator of k, so that 1 - k n is exact: where it is zero, nothing but zeta is left
        let (up, down) = (self.k.numer().to_i32(), self.k.denom().to_i32());
        let (up, down) = (up.unwrap_or(i32::MAX), down.unwrap_or(i32::MAX));
        let unit = Float::with_val(self.bits, Rational::from(&self.k * 2)).pow(2 * self.l + 2) * down;
        let unit = unit.recip();
        let zeta = zeta.times(&zeta.whole(down));
        let twice_zeta = zeta.times(&zeta.whole(2));
        let inverse_r = square_norms(2 * self.l + 1, self.count, self.bits);
        let (mut diagonal, mut off) = (Vec::with_capacity(self.count), Vec::with_capacity(self.count));
        for (b, norm) in inverse_r.iter().enumerate().rev() {
            let norm = number(&Float::with_val(self.bits, norm * &unit));
            let index = i32::try_from(b).unwrap_or(i32::MAX);
            let twice_l = 2 * i32::try_from(self.l).unwrap_or(i32::MAX / 4);
            // (2 zeta n + 1 - k n)/r with n = b + l + 1
            let n = index + twice_l / 2 + 1;
            let mut entry = twice_zeta.times(&zeta.whole(n));
            entry.add(&zeta.whole(down - up * n));
            diagonal.push(entry.times(&norm));
            if b + 1 < self.count {
                off.push(zeta.times(&zeta.whole(-(index + twice_l + 2))).times(&norm));
            }
        }
        Tridiagonal::new(diagonal, off)
    }

    /// (z + k^2/2)/(2k).
    fn zeta(&self, z: &Energy) -> (Float, Option<Float>) {
        let half_square = Rational::from(self.k.square_ref()) / 2;
        let two_k = Rational::from(&self.k * 2);
        let real = |z: &Float| (Float::with_val(self.bits, z) + &half_square) / &two_k;
        match z {
            Energy::Exact(z) => (Float::with_val(self.bits, Rational::from(z + &half_square) / &two_k), None),
            Energy::Real(z) => (real(z), None),
            Energy::Complex(z) => (real(z.real()), Some(Float::with_val(self.bits, z.imag()) / &two_k)),
        }
    }

    fn factorised(&self, z: &Energy, left_out: &[u32], effort: &Effort) -> Result<Factorisation, Obstacle> {
        let mut border = Vec::with_capacity(left_out.len());
        for &n in left_out {
            let mut row = moments(&bound_state(n, self.l), &self.basis(), self.count, self.bits)
                .map(|f| f.re)
                .ok_or(Obstacle::Undecided)?;
            row.reverse();
            border.push(row);
        }
        match self.zeta(z) {
            (zeta, None) => {
                let matrix = self.matrix(&zeta, Float::clone).map_err(obstacle)?;
                Ok(Factorisation::Real(Complement::new(&matrix, border, effort)?))
            }
            (re, Some(im)) => {
                let complex = |x: &Float| Complex::with_val(self.bits, x);
                let matrix = self.matrix(&Complex::with_val(self.bits, (re, im)), complex).map_err(obstacle)?;
                let border: Vec<Vec<Complex>> = border.iter().map(|row| row.iter().map(complex).collect()).collect();
                Ok(Factorisation::Complex(Complement::new(&matrix, border, effort)?))
            }
        }
    }

    /// Solves (z - H) u = f in the complement of the levels left out, for f given by its integrals with the functions of the block.
    ///
    /// *Cost*: proportional to the number of functions; the factorisation is kept.
    pub(super) fn solve(
        &self,
        z: &Energy,
        left_out: &[u32],
        f: &Vector,
        kept: &Kept,
        effort: &Effort,
    ) -> Result<Series, Obstacle> {
        let key = Key { block: self.clone(), z: z.clone(), left_out: left_out.to_vec() };
        let factorisation = match kept.find(&key) {
            Some(known) => known,
            None => {
                let new = Arc::new(self.factorised(z, left_out, effort)?);
                kept.keep(key, &new);
                new
            }
        };
        let x = match &*factorisation {
            Factorisation::Real(complement) => {
                let solve = |f: &Vec<Float>| complement.solve(f.clone());
                Vector { re: solve(&f.re)?, im: f.im.as_ref().map(solve).transpose()? }
            }
            Factorisation::Complex(complement) => Vector::from_complex(complement.solve(f.to_complex(self.bits))?),
        };
        Ok(Series { basis: self.basis(), x, bits: self.bits })
    }
}

enum Factorisation {
    Real(Complement<Float>),
    Complex(Complement<Complex>),
}

/// z S - H on the complement of some states, functions in descending order.
struct Complement<T> {
    bordered: Bordered<T>,
    /// The integrals of the states with the functions.
    states: Vec<Vec<T>>,
}

impl<T: Scalar> Complement<T> {
    fn new(matrix: &Tridiagonal<T>, states: Vec<Vec<T>>, effort: &Effort) -> Result<Self, Obstacle> {
        let bordered = Bordered::new(matrix, &states, effort).map_err(obstacle)?;
        Ok(Complement { bordered, states })
    }

    fn solve(&self, mut f: Vec<T>) -> Result<Vec<T>, Obstacle> {
        f.reverse();
        let Some(zero) = f.first().map(|x| x.whole(0)) else {
            return Ok(f);
        };
        let mut x = self.bordered.solve(&f, &vec![zero.clone(); self.states.len()]).map_err(obstacle)?.x;
        // Within rounding of a level left out, rounding errors come back along its state as large as the solution: take them away.
        let along: Vec<T> = self.states.iter().map(|state| minus_dot(&zero, state, &x)).collect();
        if along.iter().any(|overlap| !overlap.is_zero()) {
            let correction = self.bordered.solve(&vec![zero; f.len()], &along).map_err(obstacle)?.x;
            for (x, c) in x.iter_mut().zip(&correction) {
                x.add(c);
            }
        }
        x.reverse();
        Ok(x)
    }
}

fn minus_dot<T: Scalar>(zero: &T, a: &[T], b: &[T]) -> T {
    let mut sum = zero.clone();
    for (a, b) in a.iter().zip(b) {
        sum.subtract_product(a, b);
    }
    sum
}

fn obstacle(error: LinalgError) -> Obstacle {
    match error {
        LinalgError::Interrupted(stop) => Obstacle::Interrupted(stop),
        _ => Obstacle::Undecided,
    }
}

/// What a factorisation depends on.
#[derive(PartialEq, Debug)]
struct Key {
    block: SturmianBlock,
    z: Energy,
    left_out: Vec<u32>,
}

/// The latest factorisations, oldest first, up to a bound on their size.
#[derive(Default)]
pub(super) struct Kept {
    entries: Mutex<VecDeque<(Key, Arc<Factorisation>)>>,
}

impl Kept {
    fn find(&self, key: &Key) -> Option<Arc<Factorisation>> {
        let entries = self.entries.lock().unwrap_or_else(PoisonError::into_inner);
        entries.iter().find(|(known, _)| known == key).map(|(_, found)| found.clone())
    }

    fn keep(&self, key: Key, factorisation: &Arc<Factorisation>) {
        let mut entries = self.entries.lock().unwrap_or_else(PoisonError::into_inner);
        entries.push_back((key, factorisation.clone()));
        let size = |key: &Key| {
            let a_row = 4 + 2 * key.left_out.len();
            key.block.count * a_row * usize::try_from(key.block.bits).unwrap_or(usize::MAX >> 32)
        };
        let mut total: usize = entries.iter().map(|(key, _)| size(key)).sum();
        while total > KEPT_BITS && entries.len() > 1 {
            if let Some((oldest, _)) = entries.pop_front() {
                total -= size(&oldest);
            }
        }
    }
}

impl std::fmt::Debug for Kept {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        let entries = self.entries.lock().unwrap_or_else(PoisonError::into_inner);
        write!(f, "{} factorisations", entries.len())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn block(k: (i32, i32), l: u32, count: usize) -> SturmianBlock {
        SturmianBlock { k: Rational::from(k), l, count, bits: 256 }
    }

    /// 1/(z - H) on a bound state, expanded with another exponential, is the state over z - E.
    #[test]
    fn bound_states_are_eigenvectors() {
        let kept = Kept::default();
        for (k, n, l) in [((1, 1), 2, 0), ((1, 2), 3, 1), ((1, 2), 1, 0)] {
            let block = block(k, l, 150);
            let state = bound_state(n, l);
            let z = Energy::Exact(Rational::from((-1, 3)));
            let f = moments(&state, &block.basis(), block.count, block.bits).expect("convergent");
            let u = block.solve(&z, &[], &f, &kept, &Effort::new()).expect("regular");
            let norm = super::super::moments::integral(&state, &u.basis, &u.x, 256).expect("convergent");
            let expected = (Rational::from((-1, 3)) - super::super::bound::energy(n)).recip();
            let error = Complex::with_val(256, norm - Float::with_val(256, expected)).abs().into_real_imag().0;
            assert!(error < 1e-30, "{k:?} {n} {l}: {error}");
        }
    }

    /// The energy of a level whose states are not in the basis: the solution stays orthogonal and of ordinary size.
    #[test]
    fn states_of_another_exponential_are_left_out() {
        let kept = Kept::default();
        let block = block((1, 1), 1, 400);
        let source = super::super::action::power(&bound_state(1, 0), 1, false).expect("regular");
        let f = moments(&source, &block.basis(), block.count, block.bits).expect("convergent");
        let z = Energy::Exact(Rational::from((-1, 8)));
        let u = block.solve(&z, &[2], &f, &kept, &Effort::new()).expect("regular");
        let overlap = super::super::moments::integral(&bound_state(2, 1), &u.basis, &u.x, 256).expect("convergent");
        assert!(overlap.abs().into_real_imag().0 < 1e-60);
        // at E_2 from 1s: the exact backend has no form for it; compare with a doubled basis
        let more = SturmianBlock { count: 800, ..block };
        let g = moments(&source, &more.basis(), more.count, more.bits).expect("convergent");
        let v = more.solve(&z, &[2], &g, &kept, &Effort::new()).expect("regular");
        let (a, b) = (f.inner(&u.x, 256), g.inner(&v.x, 256));
        assert!(Complex::with_val(256, a - b).abs().into_real_imag().0 < 1e-50);
    }

    #[test]
    fn old_factorisations_make_room() {
        let kept = Kept::default();
        let effort = Effort::new();
        let block = SturmianBlock { k: Rational::from(1), l: 0, count: 1000, bits: 20_000 };
        let f = Vector::real(vec![Float::new(64); 1000]);
        for i in 1..12 {
            block.solve(&Energy::Exact(Rational::from((-1, 3 * i))), &[], &f, &kept, &effort).expect("regular");
        }
        let entries = kept.entries.lock().expect("not poisoned");
        assert!(entries.len() < 11 && !entries.is_empty());
    }
}
