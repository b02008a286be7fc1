//! Certified counts about H from its images modulo primes: distinct eigenvalues, and null vectors of energy - H.

use super::component::Component;
use super::entries::{Entry, ExactMatrix};
use super::obstacle;
use crate::linalg::distinct::{Prime, distinct_eigenvalues, nullity};
use crate::num::{Effort, Surd};
use crate::systems::Obstacle;
use rug::{Integer, Rational};
use std::collections::BTreeSet;

/// The number of distinct eigenvalues of H in some of its components together.
pub fn distinct(h: &ExactMatrix, components: &[&Component], effort: &Effort) -> Result<usize, Obstacle> {
    let order = components.iter().map(|component| component.order()).sum();
    let base = coprime_base(components.iter().flat_map(|component| radicands(h, component)));
    let entries = |prime: &Prime| {
        let field = Field::new(prime, &base)?;
        let mut image = vec![0; order * order];
        let mut first = 0;
        for component in components {
            field.image(h, component, first, order, &mut image)?;
            first += component.order();
        }
        Some(image)
    };
    distinct_eigenvalues(order, &entries, effort).map_err(obstacle)
}

/// The number of states of a component at an exact energy. Zero is certain; for more see [`nullity`].
pub fn states_at(h: &ExactMatrix, component: &Component, energy: &Surd, effort: &Effort) -> Result<usize, Obstacle> {
    let order = component.order();
    let base = coprime_base(radicands(h, component).chain(energy.terms().map(|(unit, _)| unit.radicand.clone())));
    let entries = |prime: &Prime| {
        let field = Field::new(prime, &base)?;
        let mut image = vec![0; order * order];
        field.image(h, component, 0, order, &mut image)?;
        let energy = field.surd(energy)?;
        for k in 0..order {
            image[k * order + k] = prime.subtract(image[k * order + k], energy);
        }
        Some(image)
    };
    nullity(order, &entries, effort).map_err(obstacle)
}

/// The integers under the roots in the entries of a component.
fn radicands<'h>(h: &'h ExactMatrix, component: &'h Component) -> impl Iterator<Item = Integer> + 'h {
    component.members.iter().flat_map(|row| h.row(*row)).flat_map(|(_, entry)| match entry {
        Entry::Rational(_) => Vec::new(),
        Entry::Roots(surd) => surd.terms().map(|(unit, _)| unit.radicand.clone()).collect(),
    })
}

/// Integers without common factors, of which all the given squarefree ones are products.
fn coprime_base(radicands: impl Iterator<Item = Integer>) -> Vec<Integer> {
    let mut base: Vec<Integer> = Vec::new();
    for mut rest in radicands.collect::<BTreeSet<_>>() {
        let mut refined = Vec::with_capacity(base.len() + 1);
        for known in base {
            let common = Integer::from(known.gcd_ref(&rest));
            rest.div_exact_mut(&common);
            refined.extend([Integer::from(&known / &common), common].into_iter().filter(|factor| *factor != 1));
        }
        if rest != 1 {
            refined.push(rest);
        }
        base = refined;
    }
    base
}

/// A homomorphism from the exact numbers into a prime field.
struct Field<'p> {
    prime: &'p Prime,
    i: u64,
    /// Any element serves as the image of a transcendental number, for all but a vanishing share of primes.
    pi: u64,
    /// The base and the images of its square roots.
    roots: Vec<(&'p Integer, u64)>,
}

impl<'p> Field<'p> {
    fn new(prime: &'p Prime, base: &'p [Integer]) -> Option<Self> {
        let i = prime.sqrt(prime.from_i64(-1))?;
        // The digits of pi after the point, moved about so that no number of a session fits the image for two primes.
        let pi = prime.from_i64(0x243F_6A88_85A3_08D3) ^ (prime.value() >> 7);
        let mut roots = Vec::with_capacity(base.len());
        for factor in base {
            roots.push((factor, prime.sqrt(prime.from_integer(factor))?));
        }
        Some(Field { prime, i, pi: pi % prime.value(), roots })
    }

    /// Writes the image of H in a component into a block on the diagonal of a larger matrix.
    fn image(
        &self,
        h: &ExactMatrix,
        component: &Component,
        first: usize,
        order: usize,
        image: &mut [u64],
    ) -> Option<()> {
        for (row, member) in component.members.iter().enumerate() {
            for (column, entry) in h.row(*member) {
                let Some(column) = component.local(*column) else { continue };
                image[(first + row) * order + first + column] = match entry {
                    Entry::Rational(q) => self.fraction(q)?,
                    Entry::Roots(surd) => self.surd(surd)?,
                };
            }
        }
        Some(())
    }

    fn fraction(&self, q: &Rational) -> Option<u64> {
        let below = self.prime.inverse(self.prime.from_integer(q.denom()))?;
        Some(self.prime.multiply(self.prime.from_integer(q.numer()), below))
    }

    fn surd(&self, value: &Surd) -> Option<u64> {
        let mut sum = 0;
        for (unit, c) in value.terms() {
            let power = self.prime.power(self.pi, u64::from(unit.pi_power.unsigned_abs()));
            let power = if unit.pi_power < 0 { self.prime.inverse(power)? } else { power };
            let factors = self.roots.iter().filter(|(factor, _)| unit.radicand.is_divisible(factor));
            let root = factors.fold(power, |product, (_, root)| self.prime.multiply(product, *root));
            let (re, im) = (self.fraction(&c.re)?, self.fraction(&c.im)?);
            let part = self.prime.add(re, self.prime.multiply(self.i, im));
            sum = self.prime.add(sum, self.prime.multiply(root, part));
        }
        Some(sum)
    }
}

#[cfg(test)]
mod tests {
    use super::super::component::components;
    use super::*;

    #[test]
    fn a_base_without_common_factors() {
        let base = coprime_base([6, 10, 15, 77, 1, 7].into_iter().map(Integer::from));
        let mut base: Vec<u32> = base.iter().filter_map(Integer::to_u32).collect();
        base.sort_unstable();
        assert_eq!(base, [2, 3, 5, 7, 11]);
    }

    #[test]
    fn states_at_an_energy_are_counted() {
        // [[0, sqrt 2, 0], [sqrt 2, 0, i], [0, -i, 0]] has 0 and +-sqrt 3.
        let root = |n: i64| Surd::sqrt_of(&Rational::from(n)).expect("small");
        let zero = Surd::zero;
        let rows =
            vec![vec![zero(), root(2), zero()], vec![root(2), zero(), Surd::i()], vec![zero(), -&Surd::i(), zero()]];
        let h = ExactMatrix::from_rows(rows).expect("Hermitian");
        let parts = components(&h);
        let count = |energy: &Surd| states_at(&h, &parts[0], energy, &Effort::new());
        assert_eq!(count(&zero()), Ok(1));
        assert_eq!(count(&root(3)), Ok(1));
        assert_eq!(count(&-&root(3)), Ok(1));
        assert_eq!(count(&root(2)), Ok(0));
        assert_eq!(distinct(&h, &[&parts[0], &parts[0]], &Effort::new()), Ok(3));
    }
}
