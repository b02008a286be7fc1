//! Scalar, vector and tensor parts of whole chains.
//!
//! The values were computed independently for this project as explicit sums over ML, MS in exact arithmetic.

use crate::words::{half, rational, s_and_p, setting, triplet_s};
use ketwork::angular::chain::{Bracket, ChainSum, Operator, Resolvent, State};
use ketwork::angular::paths::Setting;
use ketwork::angular::polarizability::{Parts, parts_of_level, parts_of_sum};
use ketwork::angular::polarization::{Component, Polarization};
use ketwork::angular::tensor::{Sign, Tensor};
use ketwork::angular::term::projections;
use ketwork::angular::{Electrons, Term};
use ketwork::num::{Effort, Surd};
use rug::Rational;

fn open_light() -> [Operator; 2] {
    let dipole = || Tensor::polar_vector("D");
    [Operator::new(dipole(), Component::LightConjugate), Operator::new(dipole(), Component::Light)]
}

/// A^k.B^k with the doubly reduced element as the unit.
fn dot(name: &str, k: u32) -> Operator {
    Operator::dot(Tensor::dot(name, k).expect("ranks"))
}

fn chain(g: &State, operators: Vec<Operator>) -> ChainSum {
    ChainSum::from(Bracket::with_resolvent(g.clone(), operators, &Resolvent::new("G"), g.clone()))
}

fn total(sum: &ChainSum) -> Parts {
    total_over(sum, &setting(Electrons::TWO))
}

fn total_over(sum: &ChainSum, setting: &Setting) -> Parts {
    let mut total = Parts::default();
    for path in parts_of_sum(sum, setting, &Effort::new()).expect("a valid sum") {
        total.scalar += &path.parts.scalar;
        total.vector += &path.parts.vector;
        total.tensor += &path.parts.tensor;
    }
    total
}

#[test]
fn insertions_between_the_dipoles() {
    let insertions: &[(&[Operator], [&str; 3])] = &[
        (&[], ["1/3", "0", "0"]),
        (&[dot("SO", 1)], ["0", "1/9", "0"]),
        (&[dot("SS", 2)], ["0", "0", "-1/45"]),
        (&[dot("SO", 1), dot("SO", 1)], ["1/81", "-1/108", "-1/324"]),
        (&[dot("SO", 1), dot("SS", 2)], ["0", "1/108", "1/180"]),
        (&[dot("SS", 2), dot("SS", 2)], ["1/135", "-1/60", "-7/2700"]),
    ];
    for (middle, expected) in insertions {
        let [left, right] = open_light();
        let operators = std::iter::once(left).chain(middle.iter().cloned()).chain(std::iter::once(right)).collect();
        let parts = total_over(&chain(&triplet_s(), operators), &s_and_p());
        let expected = expected.map(rational);
        assert_eq!([parts.scalar, parts.vector, parts.tensor], expected, "{} insertions", middle.len());
    }
}

/// Outside the dipoles spin-orbit interaction gives a vector part only, spin-spin interaction a tensor part only.
#[test]
fn insertions_outside_the_dipoles() {
    for (k, rank) in [(1, 1), (2, 2)] {
        let [left, right] = open_light();
        let before = chain(&triplet_s(), vec![dot("V", k), left.clone(), right.clone()]);
        let after = chain(&triplet_s(), vec![left, right, dot("V", k)]);
        let sum = ChainSum { products: before.products.into_iter().chain(after.products).collect() };
        let parts = total(&sum);
        assert!(parts.scalar.is_zero());
        assert_eq!(parts.vector.is_zero(), rank != 1, "vector part of rank {k}");
        assert_eq!(parts.tensor.is_zero(), rank != 2, "tensor part of rank {k}");
        let g = triplet_s();
        let renormalisation = chain(&g, vec![dot("V", k)]);
        assert!(parts_of_sum(&renormalisation, &setting(Electrons::TWO), &Effort::new()).expect("valid").is_empty());
    }
}

/// Every path through one level, with scalars anywhere, has the weights of that level.
#[test]
fn parts_of_paths_are_those_of_levels() {
    let scalar = || Operator::scalar(Tensor::scalar("T"));
    for (l, twice_s, electrons) in [
        (0, 2, Electrons::TWO),
        (1, 2, Electrons::TWO),
        (2, 2, Electrons::TWO),
        (1, 1, Electrons::ONE),
        (3, 1, Electrons::ONE),
    ] {
        let term = Term::natural(l, half(twice_s));
        for j in term.momenta() {
            let g = State::level("g", term, j);
            let [left, right] = open_light();
            let sum = chain(&g, vec![scalar(), left, scalar(), scalar(), right]);
            for path in parts_of_sum(&sum, &setting(electrons), &Effort::new()).expect("valid") {
                let other = path.levels[0][1].j;
                assert_eq!(path.levels[0][2], path.levels[0][1]);
                let known = parts_of_level(j, other).expect("valid");
                // the same multiple of all three
                let ratio = &path.parts.scalar * &known.scalar.inverse().expect("not zero");
                assert_eq!(path.parts.vector, &known.vector * &ratio, "{j} {other}");
                assert_eq!(path.parts.tensor, &known.tensor * &ratio, "{j} {other}");
            }
        }
    }
}

/// alpha(M) from the parts equals the chain itself in elliptical light, whose other elements are not diagonal.
#[test]
fn parts_hold_for_elliptical_light() {
    let term = Term::natural(1, half(2));
    let elliptic =
        Polarization::new([Surd::from(2), &Surd::i() * &Surd::from(3), Surd::from(-6)]).expect("a direction");
    for j in term.momenta() {
        let g = State::level("g", term, j);
        let [left, right] = open_light();
        let vector = Tensor::new("W", 1, 1, 0).expect("ranks").with_adjoint(Sign::Plus);
        let sum = chain(&g, vec![left, Operator::dot(vector), right]);
        let parts = total(&sum);
        let found = crate::words::paths(&sum.in_light(&elliptic), Electrons::TWO);
        for (column, m) in projections(j).enumerate() {
            let mut direct = Surd::zero();
            for path in &found.contributions {
                direct += &path.factors[column];
            }
            assert_eq!(parts.at(j, m, &elliptic), direct, "J = {j}, M = {m}");
        }
    }
}

/// A dipole that acts on the total spin, once, with the ordinary dipole once: 0 for linear light, -M/18 or M/18 for circular light.
#[test]
fn spin_dependent_dipole() {
    let g = triplet_s();
    for q in [0, 1] {
        let spin_dipole = || Tensor::new("D'", 1, 1, 1).expect("ranks").odd();
        let dipole = || Tensor::new("D", 1, 0, 1).expect("ranks").odd();
        let sign = Surd::from(if q % 2 == 0 { 1 } else { -1 });
        for (left, right, order) in [(spin_dipole(), dipole(), 1), (dipole(), spin_dipole(), -1)] {
            let operators = vec![
                Operator::new(left, Component::Spherical(-q)).times(&sign),
                Operator::new(right, Component::Spherical(q)),
            ];
            let found = crate::words::paths(&chain(&g, operators), Electrons::TWO);
            assert_eq!(found.contributions.len(), 3);
            for (column, m) in (-1..=1).enumerate() {
                let mut sum = Surd::zero();
                for path in &found.contributions {
                    sum += &path.factors[column];
                }
                assert_eq!(sum, Surd::from(Rational::from((order * q * m, 18))), "q = {q}, M = {m}");
            }
        }
    }
}

/// Lower J of a P level weighted by 2J+1: the sum over upper D levels with L.S between cancels only in the sum over the lower J.
#[test]
fn p_levels_cancel_only_over_the_lower_momenta() {
    let term = Term::natural(1, half(1));
    let upper = Term::natural(2, half(1));
    let mut weighted = Surd::zero();
    for j in term.momenta() {
        let g = State::level("g", term, j);
        let [left, right] = open_light();
        let sum = chain(&g, vec![left, crate::words::orbit_dot_spin(), right]);
        let mut scalar = Surd::zero();
        for path in parts_of_sum(&sum, &setting(Electrons::ONE), &Effort::new()).expect("valid") {
            if path.levels[0][0].term == upper {
                scalar += &path.parts.scalar;
            }
        }
        assert!(!scalar.is_zero(), "J = {j}");
        weighted += &scalar.scaled(&Rational::from(j.twice() + 1));
    }
    assert!(weighted.is_zero());
}
