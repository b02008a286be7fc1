//! Exact energies: guessed from the numbers, then proved.
//!
//! With D the common denominator of the entries, D times an eigenvalue is an algebraic integer. If it is rational it is a whole number; if it is
//! one of two roots of a quadratic with rational coefficients, sum and product of the two are whole numbers over D and D^2.

use super::MatrixSystem;
use super::component::shifted_rows;
use super::elimination::solve;
use super::entries::ExactKet;
use super::modular::states_at;
use crate::num::{Effort, Surd};
use crate::systems::Obstacle;
use rug::{Float, Integer, Rational};
use std::sync::{Arc, PoisonError};

/// Largest component in which pairs of eigenvalues are tried as roots of a quadratic.
const LARGEST_FOR_PAIRS: usize = 40;

/// Longest common denominator with which components too large for exact elimination are tried, in bits.
const LONGEST_FOR_LARGE: u32 = 128;

/// Bits beyond those that make a whole number out of a window: a wrong guess is then rare.
const GUARD: u32 = 96;

/// An interval with exact ends that is certain to hold an eigenvalue.
#[derive(Clone, Debug)]
pub struct Window {
    pub low: Float,
    pub high: Float,
}

impl Window {
    /// The interval around a number.
    pub fn around(value: &Float, error: &Float) -> Self {
        let bits = value.prec();
        Window { low: Float::with_val(bits, value - error), high: Float::with_val(bits, value + error) }
    }

    fn ends(&self) -> Option<(Rational, Rational)> {
        Some((self.low.to_rational()?, self.high.to_rational()?))
    }
}

/// Windows around all eigenvalues of a component, in rising order.
pub type Windows = Arc<Vec<Window>>;

/// A proved energy, and vectors that span its states in one component where they are to be had.
#[derive(Clone, Debug)]
pub struct ExactEnergy {
    pub energy: Surd,
    pub span: Option<Vec<ExactKet>>,
}

impl MatrixSystem {
    /// The bits of a window that make guesses of exact energies in a component sensible; `None` where they are not tried.
    pub(super) fn bits_for_guess(&self, component: usize) -> Option<u32> {
        let part = &self.components[component];
        let denominator = part.denominator.as_ref()?.significant_bits();
        if part.order() > LARGEST_FOR_PAIRS && denominator > LONGEST_FOR_LARGE {
            return None;
        }
        let size = u32::try_from(self.size_exponent(component).max(0)).ok()?;
        (size <= 4 * LONGEST_FOR_LARGE).then(|| 2 * (denominator + size) + GUARD)
    }

    /// The energy of `size` states of a component, all the eigenvalues in a window of `bits` bits, if it is found to be exact.
    pub(super) fn exact_energy(
        &self,
        component: usize,
        window: &Window,
        size: usize,
        bits: u32,
        effort: &Effort,
    ) -> Result<Option<ExactEnergy>, Obstacle> {
        if self.bits_for_guess(component).is_none_or(|wanted| bits < wanted) {
            return Ok(None);
        }
        let Some(denominator) = &self.components[component].denominator else { return Ok(None) };
        let Some(ends) = window.ends() else { return Ok(None) };
        for energy in rational_or_root(denominator, &ends) {
            if let Some(found) = self.proved(component, energy, size, effort)? {
                return Ok(Some(found));
            }
        }
        if self.components[component].order() > LARGEST_FOR_PAIRS {
            return Ok(None);
        }
        for other in self.windows(component, bits, effort)?.iter() {
            if other.low <= window.high && window.low <= other.high {
                continue;
            }
            let Some(other_ends) = other.ends() else { continue };
            if let Some(energy) = root_of_quadratic(denominator, &ends, &other_ends)
                && let Some(found) = self.proved(component, energy, size, effort)?
            {
                return Ok(Some(found));
            }
        }
        Ok(None)
    }

    /// The energy if exactly `size` states of the component have it.
    fn proved(
        &self,
        component: usize,
        energy: Surd,
        size: usize,
        effort: &Effort,
    ) -> Result<Option<ExactEnergy>, Obstacle> {
        let part = &self.components[component];
        let h = self.hamiltonian();
        // Cheap, and a count of zero is certain.
        if states_at(h, part, &energy, effort).is_ok_and(|count| count != size) {
            return Ok(None);
        }
        match solve(shifted_rows(h, part, &energy, |_| Surd::zero()), effort)? {
            Some(solutions) => {
                let vector = |x: Vec<Surd>| {
                    part.members.iter().copied().zip(x).filter(|(_, x)| !x.is_zero()).collect::<ExactKet>()
                };
                let span: Vec<ExactKet> = solutions.null_space.into_iter().map(vector).collect();
                Ok((span.len() == size).then_some(ExactEnergy { energy, span: Some(span) }))
            }
            None => {
                let count = states_at(h, part, &energy, effort)?;
                Ok((count == size).then_some(ExactEnergy { energy, span: None }))
            }
        }
    }

    /// Windows around all eigenvalues of a component.
    fn windows(&self, component: usize, bits: u32, effort: &Effort) -> Result<Windows, Obstacle> {
        let key = (component, bits);
        if let Some(known) = self.windows.lock().unwrap_or_else(PoisonError::into_inner).get(&key) {
            return Ok(known.clone());
        }
        let cluster = self.refined(component, 0..self.components[component].order(), bits, 0, effort)?;
        let error = self.error_at(component, bits);
        let found: Windows = Arc::new(cluster.values.iter().map(|value| Window::around(value, &error)).collect());
        let mut known = self.windows.lock().unwrap_or_else(PoisonError::into_inner);
        known.insert(key, Arc::clone(&found));
        Ok(found)
    }
}

/// The only whole number in an interval.
fn whole(low: Rational, high: Rational) -> Option<Integer> {
    let (low, high) = (low.ceil().into_numer_denom().0, high.floor().into_numer_denom().0);
    (low == high).then_some(low)
}

/// A rational, or plus or minus the root of one, inside an interval.
fn rational_or_root(denominator: &Integer, (low, high): &(Rational, Rational)) -> Vec<Surd> {
    let mut found = Vec::new();
    if let Some(above) = whole(Rational::from(low * denominator), Rational::from(high * denominator)) {
        found.push(Surd::from(Rational::from((above, denominator.clone()))));
    }
    let positive = *low > 0;
    if positive || *high < 0 {
        let square = Integer::from(denominator.square_ref());
        let (a, b) = (Rational::from(low.square_ref()) * &square, Rational::from(high.square_ref()) * &square);
        let (a, b) = if positive { (a, b) } else { (b, a) };
        if let Some(root) = whole(a, b).and_then(|above| Surd::sqrt_of(&Rational::from((above, square)))) {
            found.push(if positive { root } else { -&root });
        }
    }
    found
}

/// The number in the first interval, if it and the one in the second are the roots of x^2 - s x + p with D s and D^2 p whole.
fn root_of_quadratic(denominator: &Integer, a: &(Rational, Rational), b: &(Rational, Rational)) -> Option<Surd> {
    let sum = (Rational::from(&a.0 + &b.0) * denominator, Rational::from(&a.1 + &b.1) * denominator);
    let sum = Rational::from((whole(sum.0, sum.1)?, denominator.clone()));
    let corners = [(&a.0, &b.0), (&a.0, &b.1), (&a.1, &b.0), (&a.1, &b.1)].map(|(x, y)| Rational::from(x * y));
    let square = Integer::from(denominator.square_ref());
    let (low, high) = (corners.iter().min()?, corners.iter().max()?);
    let product = whole(Rational::from(low * &square), Rational::from(high * &square))?;
    let product = Rational::from((product, square));
    let discriminant = Rational::from(sum.square_ref()) - product * 4u32;
    let root = Surd::sqrt_of(&discriminant)?;
    let half = Rational::from((1, 2));
    let centre = Surd::from(sum * &half);
    let offset = root.scaled(&half);
    Some(if a.0 > b.0 { &centre + &offset } else { &centre - &offset })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn around(value: f64) -> (Rational, Rational) {
        let value = Rational::from_f64(value).expect("finite");
        let error = Rational::from((1, 1_000_000_000));
        (Rational::from(&value - &error), value + error)
    }

    #[test]
    fn guesses_of_each_kind() {
        let one = Integer::from(1);
        assert_eq!(rational_or_root(&Integer::from(6), &around(-1.0 / 3.0))[0].to_string(), "-1/3");
        assert_eq!(rational_or_root(&one, &around(-(3f64.sqrt())))[0].to_string(), "-sqrt(3)");
        assert_eq!(rational_or_root(&one, &around(0.0)).len(), 1);
        assert!(rational_or_root(&one, &around(std::f64::consts::PI)).is_empty());
        let golden = (1.0 + 5f64.sqrt()) / 2.0;
        let found = |a, b| root_of_quadratic(&one, &around(a), &around(b)).map(|x| x.to_string());
        assert_eq!(found(golden, 1.0 - golden), Some("1/2 + 1/2 sqrt(5)".into()));
        assert_eq!(found(1.0 - golden, golden), Some("1/2 - 1/2 sqrt(5)".into()));
        assert_eq!(found(golden, golden + 1.0), None);
    }

    #[test]
    fn a_window_with_two_whole_numbers_decides_nothing() {
        let wide = (Rational::from((1, 2)), Rational::from((5, 2)));
        assert!(rational_or_root(&Integer::from(1), &wide).is_empty());
    }
}
