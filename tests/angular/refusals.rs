//! What cannot be decomposed is refused by name, and quickly.

use crate::words::{dipole, half, light, setting, triplet_s};
use ketwork::angular::chain::{AngularVector, Bracket, ChainSum, Operator, Product, Resolvent, State};
use ketwork::angular::paths::{PathError, decompose};
use ketwork::angular::polarization::{Component, ComponentError};
use ketwork::angular::selection::SelectionRule;
use ketwork::angular::tensor::Tensor;
use ketwork::angular::verdict::{Verdict, analyse};
use ketwork::angular::{Electrons, Term};
use ketwork::num::{Effort, Surd};

fn bracket(bra: State, operators: Vec<Operator>, ket: State) -> Bracket {
    Bracket::with_resolvent(bra, operators, &Resolvent::new("G"), ket)
}

fn refused(sum: &ChainSum) -> PathError {
    decompose(sum, &setting(Electrons::TWO), &Effort::new()).expect_err("no such sum")
}

fn vector(component: Component) -> Operator {
    Operator::new(Tensor::polar_vector("D"), component)
}

#[test]
fn components_that_do_not_exist() {
    let g = triplet_s();
    let single = |operator: Operator| refused(&ChainSum::from(bracket(g.clone(), vec![operator], g.clone())));
    let error = single(vector(Component::Spherical(2)));
    assert!(matches!(error, PathError::Component(ComponentError::OutOfRange { q: 2, rank: 1, .. })));
    let error = single(vector(Component::Index("i".into())));
    assert!(matches!(error, PathError::Component(ComponentError::IndexCount { count: 1, .. })));
    assert_eq!(error.help(), Some("an index summed over x, y, z stands at two operators, as in D_i R D_i"));
    let error = single(vector(Component::Light));
    assert!(matches!(error, PathError::Component(ComponentError::OpenPolarization { .. })));
    let quadrupole = Tensor::harmonic("Q", 2).expect("a rank");
    let twice = vec![Operator::new(quadrupole, Component::Index("i".into())); 2];
    let error = refused(&ChainSum::from(bracket(g.clone(), twice, g.clone())));
    assert!(matches!(error, PathError::Component(ComponentError::NotVector { rank: 2, .. })));
    let thrice = vec![vector(Component::Index("i".into())); 3];
    let error = refused(&ChainSum::from(bracket(g.clone(), thrice, g.clone())));
    assert!(matches!(error, PathError::Component(ComponentError::IndexCount { count: 3, .. })));
}

#[test]
fn states_that_do_not_exist() {
    let term = Term::natural(0, half(2));
    let g = triplet_s();
    let error = refused(&ChainSum::from(bracket(State::level("x", term, half(4)), vec![], g.clone())));
    assert!(matches!(error, PathError::NoSuchLevel { .. }));
    let error = refused(&ChainSum::from(bracket(State::coupled("x", term, half(2), half(1)), vec![], g.clone())));
    assert!(matches!(error, PathError::Projection { .. }));
    let error = refused(&ChainSum::from(bracket(State::product("x", term, half(0), half(4)), vec![], g.clone())));
    assert!(matches!(error, PathError::Projection { .. }));
    let other = State::level("x", term, half(2));
    let error = refused(&ChainSum::from(bracket(other, vec![], g.clone())));
    assert!(matches!(error, PathError::TwoOpenLevels { .. }));
    let fixed = State { vector: AngularVector::Coupled { j: half(2), m: Some(half(0)) }, ..g.clone() };
    let error = refused(&ChainSum::from(bracket(fixed, vec![], g.clone())));
    assert!(matches!(error, PathError::PartlyOpen { .. }));
    let operators = vec![dipole(&light(0)), dipole(&light(0))];
    let error = refused(&ChainSum::from(Bracket { bra: g.clone(), operators, gaps: vec![], ket: g }));
    assert!(matches!(error, PathError::Gaps { operators: 2, gaps: 0 }));
}

#[test]
fn more_paths_than_anyone_reads() {
    let g = triplet_s();
    let wide = || Operator::new(Tensor::new("T", 12, 12, 8).expect("ranks"), Component::Spherical(0));
    let sum = ChainSum::from(bracket(g.clone(), (0..12).map(|_| wide()).collect(), g.clone()));
    let many = decompose(&sum, &setting(Electrons::ANY), &Effort::new());
    assert!(matches!(many, Err(PathError::TooMany { .. })));
    let sum = ChainSum::from(bracket(g.clone(), vec![dipole(&light(0)); 41], g.clone()));
    assert!(matches!(refused(&sum), PathError::TooLong { .. }));
    let indices = (0..30).map(|i| vector(Component::Index((i / 2).to_string()))).collect();
    assert!(matches!(refused(&ChainSum::from(bracket(g.clone(), indices, g.clone()))), PathError::TooMany { .. }));
    let effort = Effort::new();
    effort.stop();
    let sum = ChainSum::from(bracket(g.clone(), vec![dipole(&light(0)); 2], g));
    assert!(matches!(decompose(&sum, &setting(Electrons::TWO), &effort), Err(PathError::Interrupted(_))));
}

/// The reason for a missing path is the rule that would have to be broken.
#[test]
fn the_rule_that_closes_a_path_is_named() {
    let reason = |bra: State, operators: Vec<Operator>, ket: State, electrons: Electrons| {
        let analysis =
            analyse(&ChainSum::from(bracket(bra, operators, ket)), &setting(electrons), None, &Effort::new());
        let analysis = analysis.expect("a valid sum");
        match analysis.chains.first() {
            None => analysis.closed[0].broken.iter().flat_map(|broken| broken.rules.clone()).collect(),
            Some(chain) => match &chain.verdict {
                Verdict::NoPath { rule } => vec![*rule],
                other => panic!("a path: {other:?}"),
            },
        }
    };
    let two = Electrons::TWO;
    let state = |l: u32, s: i32, j: i32, m: i32| State::coupled("g", Term::natural(l, half(s)), half(j), half(m));
    let d = || vec![dipole(&light(0))];
    assert_eq!(
        reason(state(0, 0, 0, 0), d(), state(2, 0, 4, 0), two),
        [SelectionRule::OrbitalTriangle, SelectionRule::TotalTriangle, SelectionRule::Parity]
    );
    assert_eq!(reason(state(0, 0, 0, 0), d(), state(1, 2, 2, 0), two), [SelectionRule::SpinTriangle]);
    assert_eq!(reason(state(1, 2, 4, 0), d(), state(1, 2, 4, 0), two), [SelectionRule::Parity]);
    assert_eq!(reason(state(0, 2, 2, 2), d(), state(1, 2, 2, 0), two), [SelectionRule::Projection]);
    // J = 1 to J = 1 with M = 0: a 3j symbol of odd sum
    assert_eq!(reason(state(0, 2, 2, 0), d(), state(1, 2, 2, 0), two), [SelectionRule::SymbolVanishes]);
    let spin = || vec![Operator::new(Tensor::total_spin("1"), Component::Spherical(0))];
    assert_eq!(reason(state(1, 2, 2, 0), spin(), state(1, 0, 2, 0), two), [SelectionRule::SpinExchange]);
    let orbital = || vec![Operator::new(Tensor::orbital_momentum("1"), Component::Spherical(0))];
    assert_eq!(
        reason(state(1, 0, 2, 0), orbital(), state(2, 0, 4, 0), two),
        [SelectionRule::Parity, SelectionRule::KnownElement]
    );
    // two dipoles by way of a term that one electron does not have
    let axial = || Operator::new(Tensor::new("A", 1, 0, 1).expect("ranks"), Component::Spherical(0));
    let doublet = |l: u32, j: i32| State::coupled("g", Term::natural(l, half(1)), half(j), half(1));
    assert_eq!(
        reason(doublet(0, 1), vec![axial(), axial()], doublet(2, 5), Electrons::ONE),
        [SelectionRule::ParityOfElectrons]
    );
}

#[test]
fn an_empty_bracket_is_an_overlap() {
    let g = triplet_s();
    let product = Product { coefficient: Surd::from(3), ..Product::from(bracket(g.clone(), vec![], g)) };
    let sum = ChainSum { products: vec![product] };
    let found = decompose(&sum, &setting(Electrons::TWO), &Effort::new()).expect("a valid sum");
    assert_eq!(found.contributions.len(), 1);
    assert!(found.contributions[0].factors.iter().all(|factor| *factor == Surd::from(3)));
    assert_eq!(found.contributions[0].key.to_string(), "<g|g>");
}
