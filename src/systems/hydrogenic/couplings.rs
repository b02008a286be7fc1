//! Where operators lead from sectors of the atom, with exact factors.

use super::numbers::{half, momentum};
use super::operators::{Piece, Setting, read};
use crate::angular::selection::BlockRules;
use crate::angular::{Electrons, HalfInteger, Level, Term};
use crate::num::Surd;
use crate::systems::{Atom, Block, Coupling, Sector};
use std::collections::BTreeMap;

/// Where an operator leads from a sector; parts that lead to one sector with one radial operator are one coupling.
pub(super) fn couple(atom: &Atom, from: Sector, setting: Setting<'_>) -> Vec<Coupling> {
    let (Ok(Some(pieces)), Some((level, m))) = (read(atom, setting), vector(from, setting.electrons)) else {
        return Vec::new();
    };
    // in the order in which the pieces name them
    let mut radials = Vec::new();
    let mut factors: BTreeMap<(usize, Sector), Surd> = BTreeMap::new();
    let rules = BlockRules::of(setting.electrons);
    for Piece { part, radial } in &pieces {
        let place = radials.iter().position(|known| known == radial).unwrap_or_else(|| {
            radials.push(*radial);
            radials.len() - 1
        });
        // a component that was read exists, and momenta of labelled states are far below the limits of the symbols
        for image in part.images(level, m, &rules).unwrap_or_default() {
            let to = sector(image.level, image.m, setting.electrons);
            *factors.entry((place, to)).or_default() += &(&image.factor * &radial.weight());
        }
    }
    let nonzero = factors.into_iter().filter(|(_, factor)| !factor.is_zero());
    nonzero.map(|((place, to), factor)| Coupling { to, factor, radial: radials[place].operator() }).collect()
}

/// The angular vector of a sector.
fn vector(sector: Sector, electrons: Electrons) -> Option<(Level, HalfInteger)> {
    let (l, j) = match sector.block {
        Block::Orbital { l } if !electrons.spin => (l, HalfInteger::whole(i32::try_from(l).ok()?)),
        Block::Coupled { l, twice_j } if electrons.spin => (l, momentum(twice_j)),
        _ => return None,
    };
    let term = Term::natural(l, half(electrons));
    term.has_momentum(j).then(|| (Level::new(term, j), HalfInteger::from_twice(sector.twice_m)))
}

/// The sector of an angular vector.
pub(super) fn sector(level: Level, m: HalfInteger, electrons: Electrons) -> Sector {
    let l = level.term.l;
    let block = if electrons.spin {
        Block::Coupled { l, twice_j: u32::try_from(level.j.twice()).unwrap_or(0) }
    } else {
        Block::Orbital { l }
    };
    Sector { block, twice_m: m.twice() }
}

#[cfg(test)]
mod tests {
    use super::super::operators::adjoint;
    use super::*;
    use crate::angular::term::projections;
    use proptest::prelude::*;
    use rug::Rational;

    const CASES: [Electrons; 2] = [Electrons::ONE, Electrons::ONE_WITHOUT_SPIN];

    fn atom(name: &str, component: &str, power: i64) -> Atom {
        let component = (!component.is_empty()).then(|| component.to_string());
        Atom { name: name.into(), component, arguments: vec![], power }
    }

    fn tensor_atom(k: i64, component: &str) -> Atom {
        Atom { arguments: vec![Rational::from(k)], ..atom("C", component, 1) }
    }

    fn couple_one(operator: &Atom, from: Sector, electrons: Electrons) -> Vec<Coupling> {
        couple(operator, from, Setting { charge: &Rational::from(2), electrons })
    }

    /// Every sector with l below a limit.
    fn sectors(electrons: Electrons, limit: u32) -> Vec<Sector> {
        let mut out = Vec::new();
        for l in 0..limit {
            let term = Term::natural(l, half(electrons));
            for j in term.momenta() {
                out.extend(projections(j).map(|m| sector(Level::new(term, j), m, electrons)));
            }
        }
        out
    }

    fn names(electrons: Electrons) -> Vec<&'static str> {
        if electrons.spin { vec!["D", "L", "P", "S", "J"] } else { vec!["D", "L", "P"] }
    }

    /// The elements of an operator obey <a|T|b> = conj(<b|T^+|a>); the radial gradient changes sign with the sides.
    #[test]
    fn factors_of_adjoints_are_conjugate() {
        for electrons in CASES {
            let mut operators: Vec<Atom> = Vec::new();
            for component in ["x", "y", "z", "+1", "0", "-1"] {
                operators.extend(names(electrons).into_iter().map(|name| atom(name, component, 1)));
            }
            operators.extend((-2..=2).map(|q: i32| tensor_atom(2, &q.to_string())));
            if electrons.spin {
                operators.extend([atom("spin_orbit", "", 1), atom("J", "", 2), atom("S", "", 2)]);
            }
            for operator in operators {
                let (sign, other) = adjoint(&operator);
                let sign = if operator.name == "P" { -sign } else { sign };
                for from in sectors(electrons, 4) {
                    for step in couple_one(&operator, from, electrons) {
                        let mut back = Surd::zero();
                        for coupling in couple_one(&other, step.to, electrons) {
                            if coupling.to == from {
                                back += &coupling.factor;
                            }
                        }
                        assert_eq!(step.factor, back.conj().scaled(&Rational::from(sign)), "{operator:?} {from:?}");
                    }
                }
            }
        }
    }

    type Vector = BTreeMap<Sector, Surd>;

    /// Operators that leave radial functions as they are, one after the other.
    fn walk(operators: &[&Atom], from: Sector, electrons: Electrons) -> Vector {
        let mut vector = Vector::from([(from, Surd::one())]);
        for operator in operators.iter().rev() {
            let mut next = Vector::new();
            for (sector, amplitude) in &vector {
                for step in couple_one(operator, *sector, electrons) {
                    *next.entry(step.to).or_default() += &(amplitude * &step.factor);
                }
            }
            next.retain(|_, amplitude| !amplitude.is_zero());
            vector = next;
        }
        vector
    }

    fn minus(mut a: Vector, b: Vector) -> Vector {
        for (sector, amplitude) in b {
            *a.entry(sector).or_default() -= &amplitude;
        }
        a.retain(|_, amplitude| !amplitude.is_zero());
        a
    }

    fn scaled(a: Vector, factor: &Surd) -> Vector {
        a.into_iter().map(|(sector, amplitude)| (sector, &amplitude * factor)).collect()
    }

    /// A x A = i A for L, S and J; L and S commute; J rotates every vector; the squares are the sums of the squares of components.
    #[test]
    fn angular_momentum_algebra() {
        for electrons in CASES {
            for from in sectors(electrons, 4) {
                let commutator =
                    |a: &Atom, b: &Atom| minus(walk(&[a, b], from, electrons), walk(&[b, a], from, electrons));
                let expected = |a: &Atom| scaled(walk(&[a], from, electrons), &Surd::i());
                let own = if electrons.spin { vec!["L", "S", "J"] } else { vec!["L"] };
                for name in &own {
                    let [x, y, z] = ["x", "y", "z"].map(|axis| atom(name, axis, 1));
                    assert_eq!(commutator(&x, &y), expected(&z), "{name} {from:?}");
                    let mut sum = walk(&[&atom(name, "", 2)], from, electrons);
                    for component in [&x, &y, &z] {
                        sum = minus(sum, walk(&[component, component], from, electrons));
                    }
                    assert!(sum.is_empty(), "{name}^2 {from:?}");
                }
                let rotation = atom(own[own.len() - 1], "x", 1);
                for name in own.iter().chain(&["C"]) {
                    let arguments = if *name == "C" { vec![Rational::from(1)] } else { vec![] };
                    let [y, z] = ["y", "z"].map(|axis| Atom { arguments: arguments.clone(), ..atom(name, axis, 1) });
                    assert_eq!(commutator(&rotation, &y), expected(&z), "{name} {from:?}");
                }
                if electrons.spin {
                    let (l, s) = (atom("L", "x", 1), atom("S", "y", 1));
                    assert!(commutator(&l, &s).is_empty());
                }
            }
        }
    }

    /// |l ml>|ms> as a vector over coupled sectors.
    fn product(l: u32, ml: i32, twice_ms: i32) -> Vector {
        super::super::exact::product_amplitudes(l, ml, twice_ms).into_iter().filter(|(_, a)| !a.is_zero()).collect()
    }

    fn spin_operators() -> Vec<Atom> {
        let mut out: Vec<Atom> = Vec::new();
        for component in ["x", "y", "z", "+1", "-1"] {
            out.extend(["L", "S", "J"].map(|name| atom(name, component, 1)));
            out.push(tensor_atom(1, component));
        }
        out.extend(["0", "1", "-2"].map(|q| tensor_atom(2, q)));
        out.extend([atom("J", "", 2), atom("L", "", 2), atom("S", "", 2)]);
        out
    }

    proptest! {
        #![proptest_config(ProptestConfig {
            cases: 64,
            rng_seed: proptest::test_runner::RngSeed::Fixed(0x7370_696e),
            failure_persistence: None,
            ..ProptestConfig::default()
        })]

        /// A chain in coupled states is the sum over product states: the orbit and the spin act apart, with 3j symbols of the orbit alone
        /// and the matrices of spin 1/2.
        #[test]
        fn chains_agree_with_product_states(
            chain in prop::collection::vec(prop::sample::select(spin_operators()), 1..5),
            start in prop::sample::select(sectors(Electrons::ONE, 4)),
        ) {
            let coupled = walk(&chain.iter().collect::<Vec<_>>(), start, Electrons::ONE);
            let mut apart = uncoupled(start);
            for operator in chain.iter().rev() {
                apart = act_apart(operator, &apart);
            }
            let mut sum = Vector::new();
            for ((l, ml, twice_ms), amplitude) in apart {
                for (sector, weight) in product(l, ml, twice_ms) {
                    *sum.entry(sector).or_default() += &(&amplitude * &weight);
                }
            }
            sum.retain(|_, amplitude| !amplitude.is_zero());
            prop_assert_eq!(coupled, sum);
        }
    }

    /// Amplitudes over l, ml and doubled ms.
    type Apart = BTreeMap<(u32, i32, i32), Surd>;

    fn uncoupled(from: Sector) -> Apart {
        let Block::Coupled { l, .. } = from.block else { panic!("a sector with spin") };
        let reach = i32::try_from(l).expect("small");
        let mut out = Apart::new();
        for ml in -reach..=reach {
            for twice_ms in [1, -1] {
                let amplitude = product(l, ml, twice_ms).remove(&from).unwrap_or_default();
                out.insert((l, ml, twice_ms), amplitude);
            }
        }
        out
    }

    /// Without the angular engine: the orbit by the couplings without spin, the spin by its matrices.
    fn act_apart(operator: &Atom, on: &Apart) -> Apart {
        let mut out = Apart::new();
        let mut add = |key: (u32, i32, i32), value: Surd| *out.entry(key).or_default() += &value;
        match (operator.name.as_str(), operator.power) {
            ("S", 2) => on.iter().for_each(|(key, a)| add(*key, a.scaled(&Rational::from((3, 4))))),
            ("J", 2) => {
                for axis in ["x", "y", "z"] {
                    let component = atom("J", axis, 1);
                    act_apart(&component, &act_apart(&component, on)).into_iter().for_each(|(key, a)| add(key, a));
                }
            }
            ("J", _) => {
                for name in ["L", "S"] {
                    let part = Atom { name: name.into(), ..operator.clone() };
                    act_apart(&part, on).into_iter().for_each(|(key, a)| add(key, a));
                }
            }
            ("S", _) => {
                for (&(l, ml, twice_ms), amplitude) in on {
                    for (to, weight) in spin_half(operator.component.as_deref().expect("a component"), twice_ms) {
                        add((l, ml, to), amplitude * &weight);
                    }
                }
            }
            _ => {
                for (&(l, ml, twice_ms), amplitude) in on {
                    let from = Sector { block: Block::Orbital { l }, twice_m: 2 * ml };
                    for step in couple_one(operator, from, Electrons::ONE_WITHOUT_SPIN) {
                        let Block::Orbital { l } = step.to.block else { panic!("no spin") };
                        add((l, step.to.twice_m / 2, twice_ms), amplitude * &step.factor);
                    }
                }
            }
        }
        out
    }

    /// Half of a Pauli matrix on a spin up (1) or down (-1).
    fn spin_half(component: &str, up: i32) -> Vec<(i32, Surd)> {
        let half = Surd::from(Rational::from((1, 2)));
        let root = Surd::sqrt_of(&Rational::from((1, 2))).expect("a root");
        match component {
            "z" => vec![(up, half.scaled(&Rational::from(up)))],
            "x" => vec![(-up, half)],
            "y" => vec![(-up, (&half * &Surd::i()).scaled(&Rational::from(up)))],
            "+1" => {
                if up == -1 {
                    vec![(1, -&root)]
                } else {
                    vec![]
                }
            }
            _ => {
                if up == 1 {
                    vec![(-1, root)]
                } else {
                    vec![]
                }
            }
        }
    }
}
