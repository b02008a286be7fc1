//! The headline verdicts: what cancels, why, and what is left.

use crate::words::{
    dipole, doublet_s, half, light, mixing, orbit_dot_spin, rational, response, s_and_p, setting, spin_spin, triplet_s,
};
use ketwork::angular::chain::{Bracket, ChainSum, Operator, Product, Resolvent, State};
use ketwork::angular::polarization::Component;
use ketwork::angular::selection::SelectionRule;
use ketwork::angular::tensor::{Sign, SpinExchange, Tensor};
use ketwork::angular::term::Level;
use ketwork::angular::verdict::{Analysis, Verdict, Where, Whole, analyse};
use ketwork::angular::{Electrons, HalfInteger, Term};
use ketwork::num::{Effort, Surd};
use rug::Rational;
use std::collections::BTreeMap;

fn analysed(sum: &ChainSum, electrons: Electrons) -> Analysis {
    analyse(sum, &setting(electrons), None, &Effort::new()).expect("a valid sum")
}

fn only(analysis: &Analysis) -> &ketwork::angular::verdict::ChainReport {
    assert_eq!(analysis.chains.len(), 1, "one radial chain");
    &analysis.chains[0]
}

/// The form at one place, as text, the same for every resolvent.
fn residual(analysis: &Analysis, place: Where) -> String {
    let chain = only(analysis);
    let (_, residual) = chain.residuals.iter().find(|(found, _)| *found == place).expect("a residual there");
    assert_eq!(residual.order, 1);
    residual.common_form().expect("the same for both resolvents").to_string()
}

fn at(m: i32) -> Where {
    Where::Projection(HalfInteger::whole(m))
}

#[test]
fn spin_orbit_in_linear_light_cancels_for_every_m() {
    let analysis = analysed(&response(&triplet_s(), 0, vec![orbit_dot_spin()]), Electrons::TWO);
    let chain = only(&analysis);
    assert_eq!(chain.verdict, Verdict::CancelsExactly);
    assert_eq!(analysis.whole(), Whole::Zero);
    let spelled = |place| chain.spelled(place, &analysis.columns).expect("a sum");
    assert_eq!(spelled(at(0)), "0 = -2/9 (J=0) + 2/9 (J=2)");
    assert_eq!(spelled(at(1)), "0 = -1/6 (J=1) + 1/6 (J=2)");
    assert_eq!(spelled(Where::Average), "0 = -2/27 (J=0) - 1/9 (J=1) + 5/27 (J=2)");
    assert_eq!(chain.assumption(), "^3P_0, ^3P_1, ^3P_2 have one energy");
    assert_eq!(chain.key.to_string(), "<g||D||^3P> G <^3P||SO||^3P> G <g||D||^3P>");
    assert_eq!(residual(&analysis, at(0)), "2/9 (d[^3P_2] - d[^3P_0])");
    assert_eq!(residual(&analysis, at(1)), "1/6 (d[^3P_2] - d[^3P_1])");
    assert_eq!(residual(&analysis, Where::Average), "1/27 (5 d[^3P_2] - 3 d[^3P_1] - 2 d[^3P_0])");
}

/// Shifts by the interval rule, d = beta x with x = <L.S>, leave what second-order spin-orbit interaction gives.
#[test]
fn residual_with_interval_rule() {
    let term = Term::natural(1, half(2));
    let shifts: BTreeMap<Level, Rational> =
        term.momenta().zip([-2, -1, 1]).map(|(j, x)| (Level::new(term, j), Rational::from(x))).collect();
    let once = analysed(&response(&triplet_s(), 0, vec![orbit_dot_spin()]), Electrons::TWO);
    let twice = analysed(&response(&triplet_s(), 0, vec![orbit_dot_spin(), orbit_dot_spin()]), Electrons::TWO);
    for (place, expected) in [(at(0), "2/3"), (at(1), "1/3"), (Where::Average, "4/9")] {
        let (_, residual) = only(&once).residuals.iter().find(|(found, _)| *found == place).expect("a residual");
        let value = residual.common_form().expect("one form").value(&shifts).expect("all shifts");
        assert_eq!(value, rational(expected), "{place:?}");
        let second = match place {
            Where::Projection(m) => &only(&twice).sums[usize::try_from(m.twice() / 2 + 1).expect("a column")],
            _ => only(&twice).average.as_ref().expect("every M"),
        };
        assert_eq!(value, *second, "{place:?}");
    }
    let missing = BTreeMap::new();
    let form = only(&once).residuals[0].1.common_form().expect("one form").clone();
    assert!(form.value(&missing).is_err());
}

#[test]
fn spin_orbit_in_circular_light_cancels_on_average() {
    let analysis = analysed(&response(&triplet_s(), 1, vec![orbit_dot_spin()]), Electrons::TWO);
    let chain = only(&analysis);
    assert_eq!(chain.verdict, Verdict::CancelsMAverageOnly { also: vec![HalfInteger::whole(0)], ranks: vec![1] });
    assert_eq!(chain.sums, ["-1/3", "0", "1/3"].map(rational));
    assert_eq!(analysis.whole(), Whole::ZeroOnAverage);
    assert_eq!(residual(&analysis, at(0)), "1/6 (d[^3P_2] - d[^3P_1])");
    assert_eq!(
        chain.verdict.sentence(),
        "cancels in the average over M and for M = 0, not for every M; the vector part is left"
    );
}

/// The vector part is odd in the frequency: at w = 0 both orders together are zero for every M.
#[test]
fn vector_part_vanishes_at_zero_frequency() {
    let term = |q: i32, label: &str| {
        let operators = vec![dipole(&light(q).conj()), orbit_dot_spin(), dipole(&light(q))];
        Product::from(Bracket::with_resolvent(triplet_s(), operators, &Resolvent::new(label), triplet_s()))
    };
    // with e and e* exchanged the other order absorbs what this one emits
    let exchanged = |label: &str| {
        let operators = vec![dipole(&light(1)), orbit_dot_spin(), dipole(&light(1).conj())];
        Product::from(Bracket::with_resolvent(triplet_s(), operators, &Resolvent::new(label), triplet_s()))
    };
    let moving = ChainSum { products: vec![term(1, "G(+w)"), exchanged("G(-w)")] };
    let analysis = analysed(&moving, Electrons::TWO);
    assert_eq!(analysis.chains.len(), 2);
    assert_eq!(analysis.whole(), Whole::ZeroOnAverage);
    let fixed = ChainSum { products: vec![term(1, "G(0)"), exchanged("G(0)")] };
    let analysis = analysed(&fixed, Electrons::TWO);
    assert_eq!(only(&analysis).verdict, Verdict::CancelsBetweenTerms { products: vec![0, 1] });
    assert_eq!(
        only(&analysis).spelled(at(-1), &analysis.columns).expect("a sum"),
        "0 = -2/9 (term 1, J=0) - 1/6 (term 1, J=1) + 1/18 (term 1, J=2) + 1/3 (term 2, J=2)"
    );
    assert_eq!(analysis.whole(), Whole::Zero);
}

#[test]
fn spin_spin_leaves_the_tensor_part() {
    let analysis = analysed(&response(&triplet_s(), 0, vec![spin_spin()]), Electrons::TWO);
    let chain = only(&analysis);
    assert_eq!(chain.verdict, Verdict::CancelsMAverageOnly { also: vec![], ranks: vec![2] });
    // -(3M^2-2)/45
    assert_eq!(chain.sums, ["-1/45", "2/45", "-1/45"].map(rational));
    assert_eq!(residual(&analysis, Where::Average), "1/162 (d[^3P_2] - 3 d[^3P_1] + 2 d[^3P_0])");
}

#[test]
fn second_orders_survive() {
    for middle in [[orbit_dot_spin(), orbit_dot_spin()], [spin_spin(), spin_spin()]] {
        let sum = response(&triplet_s(), 0, middle.to_vec());
        let analysis = analyse(&sum, &s_and_p(), None, &Effort::new()).expect("a valid sum");
        assert!(matches!(only(&analysis).verdict, Verdict::Survives { .. }));
        assert_eq!(analysis.whole(), Whole::NotZero);
    }
    // by way of singlets only J = 1 is passed, which linear light does not reach from M = 0
    let sum = response(&triplet_s(), 0, vec![mixing(), mixing()]);
    let analysis = analyse(&sum, &s_and_p(), None, &Effort::new()).expect("a valid sum");
    let zero = HalfInteger::whole(0);
    assert_eq!(only(&analysis).verdict, Verdict::CancelsForTheseM { projections: vec![zero] });
    assert_eq!(analysis.whole(), Whole::NotZero);
}

#[test]
fn mixing_with_singlets_has_no_path_in_first_order() {
    let first = analysed(&response(&triplet_s(), 0, vec![mixing()]), Electrons::TWO);
    assert!(first.chains.is_empty());
    assert_eq!(first.whole(), Whole::NoPath);
    assert_eq!(first.closed.len(), 1);
    let rules: Vec<SelectionRule> = first.closed[0].broken.iter().flat_map(|broken| broken.rules.clone()).collect();
    assert!(
        rules == [SelectionRule::SpinTriangle] || rules == [SelectionRule::SpinExchange],
        "{:?}",
        first.closed[0].broken
    );
    // outside, and as a spin-dependent dipole
    for operators in [
        vec![mixing(), dipole(&light(0)), dipole(&light(0))],
        vec![
            Operator::new(
                Tensor::new("D-", 1, 1, 1).expect("ranks").odd().with_exchange(SpinExchange::Antisymmetric),
                Component::Spherical(0),
            ),
            dipole(&light(0)),
        ],
    ] {
        let bracket = Bracket::with_resolvent(triplet_s(), operators, &Resolvent::new("G"), triplet_s());
        assert_eq!(analysed(&ChainSum::from(bracket), Electrons::TWO).whole(), Whole::NoPath);
    }
    let sum = response(&triplet_s(), 0, vec![mixing(), mixing()]);
    let second = analyse(&sum, &s_and_p(), None, &Effort::new()).expect("a valid sum");
    let singlets = second.chains.iter().filter(|chain| chain.key.brackets[0].blocks[1].term.s.twice() == 0);
    for chain in singlets {
        for path in chain.paths.iter().filter(|path| path.factors.iter().any(|factor| !factor.is_zero())) {
            let levels: Vec<String> = path.levels[0].iter().map(Level::to_string).collect();
            assert_eq!(levels, ["^3P_1", "^1P_1", "^3P_1"]);
        }
    }
}

#[test]
fn doublet_cancels_in_linear_light() {
    let analysis = analysed(&response(&doublet_s(), 0, vec![orbit_dot_spin()]), Electrons::ONE);
    assert_eq!(only(&analysis).verdict, Verdict::CancelsExactly);
    assert_eq!(residual(&analysis, Where::Projection(half(1))), "1/9 (d[^2P_3/2] - d[^2P_1/2])");
    let circular = analysed(&response(&doublet_s(), 1, vec![orbit_dot_spin()]), Electrons::ONE);
    assert_eq!(only(&circular).verdict, Verdict::CancelsMAverageOnly { also: vec![], ranks: vec![1] });
    assert_eq!(only(&circular).sums, ["-1/6", "1/6"].map(rational));
}

/// With the J told apart a chain and its reverse are different unless tau is known; then they cancel for every splitting.
#[test]
fn odd_rank_between_different_levels_vanishes_by_hermiticity() {
    let build = |tau: Option<Sign>, depends_on_j: bool| {
        let mut tensor = Tensor::new("AB", 1, 1, 1).expect("ranks").with_exchange(SpinExchange::Symmetric);
        tensor.element.adjoint = tau;
        let operators = vec![dipole(&light(0)), Operator::new(tensor, Component::Spherical(0)), dipole(&light(0))];
        let resolvent = Resolvent { depends_on_j, ..Resolvent::new("G") };
        ChainSum::from(Bracket::with_resolvent(triplet_s(), operators, &resolvent, triplet_s()))
    };
    let unknown = analysed(&build(None, true), Electrons::TWO);
    assert_eq!(unknown.whole(), Whole::ZeroOnAverage);
    let known = analysed(&build(Some(Sign::Plus), true), Electrons::TWO);
    assert_eq!(known.whole(), Whole::Zero);
    assert!(
        known.chains.iter().any(|chain| matches!(chain.verdict, Verdict::VanishesByHermiticity { itself: false, .. }))
    );
    // the same when the levels are not told apart: no energies have to be equal, and nothing is left when they are split
    let together = analysed(&build(Some(Sign::Plus), false), Electrons::TWO);
    let triplet_p =
        together.chains.iter().find(|chain| chain.key.brackets[0].blocks[0].term == Term::natural(1, half(2)));
    let triplet_p = triplet_p.expect("a chain over the P levels");
    assert!(matches!(triplet_p.verdict, Verdict::VanishesByHermiticity { itself: false, .. }));
    assert!(triplet_p.residuals.is_empty() && triplet_p.equal_levels.is_empty());
    // an operator of the other kind is zero between equal levels, whatever its factor
    let odd = analysed(&build(Some(Sign::Minus), true), Electrons::TWO);
    assert!(odd.chains.iter().all(|chain| {
        let blocks = &chain.key.brackets[0].blocks;
        blocks[0] != blocks[1] || !matches!(chain.verdict, Verdict::Survives { .. })
    }));
}

#[test]
fn the_same_multiple_of_every_chain_does_not_move_a_zero() {
    let alpha = analysed(&response(&triplet_s(), 0, vec![]), Electrons::TWO);
    let mut scaled = response(&triplet_s(), 0, vec![]);
    scaled.products[0].coefficient = rational("-7/3");
    let change = analysed(&scaled, Electrons::TWO).compared_with("alpha", &alpha);
    assert_eq!(only(&change).verdict, Verdict::ProportionalTo { which: "alpha".into(), factor: rational("-7/3") });
    let other = analysed(&response(&triplet_s(), 0, vec![orbit_dot_spin(), orbit_dot_spin()]), Electrons::TWO);
    assert!(other.proportional_to(&alpha).iter().all(Option::is_none));
}

/// <P R D> + <D R P> is zero: the momentum is antisymmetric where the dipole is symmetric.
#[test]
fn momentum_and_dipole_in_both_orders() {
    let z = || Component::Spherical(0);
    let p = || Operator::momentum("grad", z());
    let d = || Operator::new(Tensor::polar_vector("D"), z());
    let product =
        |operators| Product::from(Bracket::with_resolvent(triplet_s(), operators, &Resolvent::new("R"), triplet_s()));
    let both = ChainSum { products: vec![product(vec![p(), d()]), product(vec![d(), p()])] };
    let analysis = analysed(&both, Electrons::TWO);
    assert_eq!(only(&analysis).verdict, Verdict::VanishesByHermiticity { itself: false, products: vec![0, 1] });
    assert!(analysis.chains[0].equal_levels.is_empty());
    let one = ChainSum { products: vec![product(vec![p(), p()])] };
    assert_eq!(only(&analysed(&one, Electrons::TWO)).sums, ["1/3", "1/3", "1/3"].map(rational));
}

/// A scalar factor without a number keeps chains apart and takes every zero along.
#[test]
fn a_symbol_inherits_the_zero() {
    let mut sum = response(&triplet_s(), 0, vec![orbit_dot_spin()]);
    let mut with_moment = sum.products[0].clone();
    with_moment.symbol = "a".into();
    with_moment.coefficient = Surd::from(2);
    sum.products.push(with_moment);
    let analysis = analysed(&sum, Electrons::TWO);
    assert_eq!(analysis.chains.len(), 2);
    assert!(analysis.chains.iter().all(|chain| chain.verdict == Verdict::CancelsExactly));
}

/// <V> <D G G D> has no path where <V> has none: the normalisation term of a triplet S state.
#[test]
fn products_of_brackets() {
    let g = triplet_s();
    let value =
        |operator: Operator| Bracket { bra: g.clone(), operators: vec![operator], gaps: vec![], ket: g.clone() };
    let twice = Bracket {
        gaps: vec![vec![Resolvent::new("G"), Resolvent::new("G")]],
        ..Bracket::with_resolvent(
            g.clone(),
            vec![dipole(&light(0)), dipole(&light(0))],
            &Resolvent::new("G"),
            g.clone(),
        )
    };
    let product = |operator: Operator| {
        let brackets = vec![value(operator), twice.clone()];
        ChainSum { products: vec![Product { coefficient: Surd::from(-1), symbol: String::new(), brackets }] }
    };
    let spin_orbit = analysed(&product(orbit_dot_spin()), Electrons::TWO);
    assert_eq!(spin_orbit.whole(), Whole::NoPath);
    assert_eq!(spin_orbit.closed[0].bracket, 0);
    assert_eq!(spin_orbit.closed[0].broken[0].rules, [SelectionRule::OrbitalTriangle]);
    let scalar = analysed(&product(Operator::scalar(Tensor::scalar("T"))), Electrons::TWO);
    assert_eq!(only(&scalar).key.to_string(), "<g||D||^3P> G G <g||D||^3P> * <g||T||g>");
    assert!(only(&scalar).sums.iter().all(|sum| *sum == rational("-1/3")));
}

/// D_i R D_i is the sum over x, y, z: three times the scalar part for every M.
#[test]
fn summed_cartesian_indices() {
    let index = || Operator::new(Tensor::polar_vector("D"), Component::Index("i".into()));
    let bracket = |m| {
        let g = State { vector: ketwork::angular::chain::AngularVector::Coupled { j: half(2), m }, ..triplet_s() };
        Bracket::with_resolvent(g.clone(), vec![index(), index()], &Resolvent::new("G"), g)
    };
    let analysis = analysed(&ChainSum::from(bracket(None)), Electrons::TWO);
    assert!(only(&analysis).sums.iter().all(|sum| *sum == Surd::one()));
    let axes = ['x', 'y', 'z'].map(|axis| {
        let component = Component::axis(axis).expect("an axis");
        let d = || Operator::new(Tensor::polar_vector("D"), component.clone());
        Product::from(Bracket::with_resolvent(triplet_s(), vec![d(), d()], &Resolvent::new("G"), triplet_s()))
    });
    let spelled_out = analysed(&ChainSum { products: axes.to_vec() }, Electrons::TWO);
    assert_eq!(only(&spelled_out).sums, only(&analysis).sums);
}

/// The total angular momentum has the elements everybody knows, from its orbital and spin parts.
#[test]
fn total_momentum_is_diagonal() {
    let term = Term::natural(2, half(2));
    for j in term.momenta() {
        let g = State::level("g", term, j);
        let operator = Operator::total_momentum(&Component::Spherical(0));
        let bracket = Bracket { bra: g.clone(), operators: vec![operator], gaps: vec![], ket: g };
        let analysis = analysed(&ChainSum::from(bracket), Electrons::TWO);
        let mut sums = vec![Surd::zero(); analysis.columns.len()];
        for chain in &analysis.chains {
            for (sum, factor) in sums.iter_mut().zip(&chain.sums) {
                *sum += factor;
            }
        }
        for (m, sum) in analysis.columns.projections().into_iter().zip(&sums) {
            assert_eq!(*sum, Surd::from(Rational::from((m.twice(), 2))), "J = {j}");
        }
    }
}
