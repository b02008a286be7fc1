//! Chains with spin against the same chains without, and against sums over the other basis.

use super::super::Hydrogenic;
use super::super::numbers::{Numbers, Vector};
use super::chain::*;
use crate::num::{Effort, Surd};
use crate::systems::{Number, Obstacle, State, System};
use proptest::prelude::*;
use rug::Rational;

fn cases() -> ProptestConfig {
    ProptestConfig {
        cases: 48,
        rng_seed: proptest::test_runner::RngSeed::Fixed(0x7370_696e),
        failure_persistence: None,
        ..ProptestConfig::default()
    }
}

fn with_spin() -> Hydrogenic {
    hydrogen().with_spin()
}

fn product(n: u32, l: u32, ml: i32, twice_ms: i32) -> State {
    Numbers { n, l, vector: Vector::Product { ml, twice_ms } }.state()
}

fn any_orbital() -> impl Strategy<Value = (u32, u32, i32)> {
    (1..4_u32).prop_flat_map(|n| (Just(n), 0..n)).prop_flat_map(|(n, l)| {
        (Just(n), Just(l), -i32::try_from(l).expect("small")..=i32::try_from(l).expect("small"))
    })
}

fn any_operator() -> impl Strategy<Value = &'static str> {
    prop::sample::select(vec![
        "D_z", "D_x", "D_+1", "D_-1", "P_z", "P_x", "r", "r^2", "r^-1", "r^-2", "p^2", "p^4", "H", "L_z", "L_+1",
        "L^2", "C(1)_0", "C(2)_-1", "delta(r)",
    ])
}

fn exactly(atom: &Hydrogenic, bra: &State, steps: &[Step], ket: &State) -> Result<Number, Obstacle> {
    let exact = atom.exact(&Effort::new()).expect("exact backend");
    value(atom, &*exact, bra, steps, ket)
}

proptest! {
    #![proptest_config(cases())]

    /// Operators without spin and resolvents between product states: the value without spin where MS is the same, zero where it is not.
    #[test]
    fn spin_is_a_spectator(
        (n, l, m) in any_orbital(),
        (np, lp, mp) in any_orbital(),
        names in prop::collection::vec(any_operator(), 1..4),
        solves in prop::collection::vec(any::<bool>(), 3),
    ) {
        let (spinless, spin) = (hydrogen(), with_spin());
        let (bra, ket) = (Numbers::orbital(n, l, m).state(), Numbers::orbital(np, lp, mp).state());
        let q = reduced(&spinless, &ket);
        let mut steps = Vec::new();
        for (name, solve) in names.iter().zip(&solves) {
            steps.extend(solve.then(|| q.clone()));
            steps.push(Step::Operator(operator(name)));
        }
        let known = exactly(&spinless, &bra, &steps, &ket);
        for twice_ms in [1, -1] {
            let bra = product(n, l, m, twice_ms);
            let same = exactly(&spin, &bra, &steps, &product(np, lp, mp, twice_ms));
            match (&known, &same) {
                (Ok(a), Ok(b)) => prop_assert_eq!(a, b, "{:?}", &names),
                (Err(Obstacle::Diverges { .. }), Err(Obstacle::Diverges { .. })) => {}
                // one side of a chain may be exact for one j alone, never the other way round
                (a, b) => prop_assert!(a.is_err() && b.is_err(), "{names:?}: {a:?} {b:?}"),
            }
            if let Ok(flipped) = exactly(&spin, &bra, &steps, &product(np, lp, mp, -twice_ms)) {
                prop_assert!(flipped.is_zero(), "{:?}: {:?}", &names, flipped);
            }
        }
    }

    /// Spin-orbit in product states: Z/2 <r^-3> (ML MS + half of the flips).
    #[test]
    fn spin_orbit_in_product_states((n, l, m) in any_orbital().prop_filter("l > 0", |(_, l, _)| *l > 0), up in any::<bool>()) {
        let atom = with_spin();
        let twice_ms = if up { 1 } else { -1 };
        let ket = product(n, l, m, twice_ms);
        let element = |bra: &State, text: &str| match exactly(&atom, bra, &operators(text), &ket) {
            Ok(Number::Exact(value)) => value,
            other => panic!("{text}: {other:?}"),
        };
        let half = element(&ket, "r^-3").scaled(&Rational::from((1, 2)));
        prop_assert_eq!(element(&ket, "spin_orbit"), half.scaled(&Rational::from((m * twice_ms, 2))));
        // L_+ S_-/2 lowers MS, L_- S_+/2 raises it
        let (li, to) = (i32::try_from(l).expect("small"), m + twice_ms);
        if to.abs() <= li {
            let flip = Surd::sqrt_of(&Rational::from((li * (li + 1) - m * to, 4))).expect("a root");
            prop_assert_eq!(element(&product(n, l, to, -twice_ms), "spin_orbit"), &half * &flip);
        }
    }
}

/// A level without M is refused by both backends, and has its energy.
#[test]
fn open_levels_have_an_energy_and_no_ket() {
    let atom = with_spin();
    let open = Numbers { n: 2, l: 1, vector: Vector::Level { twice_j: 3 } }.state();
    assert_eq!(atom.energy(&open, 64, &Effort::new()), Ok(exact(-1, 8)));
    let Err(Obstacle::Refused { message, help }) = exactly(&atom, &open, &[], &open) else { panic!("a refusal") };
    assert_eq!(message, "2p_3/2 has 4 states");
    assert!(help.contains("average"));
}

/// A level of one j that is left out leaves the other j in.
#[test]
fn one_j_left_out() {
    let atom = with_spin();
    let label = |text: &str| crate::systems::StateLabel { text: text.into(), options: vec![] };
    let manifold = |text: &str| atom.manifold(&label(text), &Effort::new()).expect("a manifold");
    let z = atom.energy(&product(2, 1, 0, 1), 64, &Effort::new()).expect("an energy");
    let without = |texts: &[&str]| {
        let omitted = texts.iter().map(|text| crate::systems::Omitted::Manifold(manifold(text))).collect();
        vec![
            Step::Operator(operator("D_z")),
            Step::Resolvent(crate::systems::Resolvent { z: z.clone(), omitted }),
            Step::Operator(operator("D_z")),
        ]
    };
    let ground = product(1, 0, 0, 1);
    let both = exactly(&atom, &ground, &without(&["2p_1/2", "2p_3/2"]), &ground);
    assert_eq!(both, exactly(&atom, &ground, &without(&["2p"]), &ground));
    let one = exactly(&atom, &ground, &without(&["2p_3/2"]), &ground);
    assert_eq!(one, Err(Obstacle::Singular { level: "2p_1/2".into() }));
}
