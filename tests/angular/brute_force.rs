//! Random chains of random tensors: every path, and the sum of all, against explicit sums in the uncoupled basis.

use crate::brute;
use crate::random::{Random, cases};
use crate::words::{as_written, half};
use ketwork::angular::Electrons;
use ketwork::angular::chain::{AngularVector, Bracket, ChainSum, Operator, Resolvent, State};
use ketwork::angular::polarization::Component;
use ketwork::angular::selection::BlockRules;
use ketwork::angular::tensor::{SpinExchange, Tensor};
use ketwork::angular::term::{Parity, Term, projections};
use ketwork::num::Surd;
use rug::Rational;
use std::collections::{BTreeMap, BTreeSet};

struct Case {
    bra: State,
    ket: State,
    tensors: Vec<(Tensor, i32)>,
    terms: Vec<Term>,
    electrons: Electrons,
}

/// The reduced element of an operator between two terms: a fixed, odd-looking rational.
fn reduced(place: usize, bra: Term, ket: Term) -> Surd {
    let number =
        |term: Term| 7 * i64::from(term.l) + 3 * i64::from(term.s.twice()) + i64::from(term.parity == Parity::Odd);
    let place = i64::try_from(place).expect("small");
    Surd::from(Rational::from((2 * number(bra) + 5 * number(ket) + place + 1, 3 + place)))
}

fn allowed(tensor: &Tensor, electrons: Electrons, bra: Term, ket: Term) -> bool {
    let parity = (bra.parity != ket.parity) == tensor.element.odd_parity;
    let exchange = electrons.count != Some(2)
        || match tensor.element.exchange {
            SpinExchange::Symmetric => bra.s == ket.s,
            SpinExchange::Antisymmetric => bra.s != ket.s,
            SpinExchange::Unknown => true,
        };
    parity && exchange
}

fn random_term(random: &mut Random, electrons: Electrons) -> Term {
    let l = u32::try_from(random.between(0, 3)).expect("not negative");
    let s = if electrons.count == Some(1) { half(1) } else { half(2 * random.between(0, 1)) };
    if electrons.count == Some(2) && l > 0 && random.below(4) == 0 {
        return Term::new(l, s, Parity::natural(l).flipped());
    }
    Term::natural(l, s)
}

fn random_state(random: &mut Random, name: &str, term: Term) -> State {
    let l = half(2 * i32::try_from(term.l).expect("small"));
    if random.below(3) == 0 {
        let ml = random.pick(&projections(l).collect::<Vec<_>>());
        let ms = random.pick(&projections(term.s).collect::<Vec<_>>());
        return State::product(name, term, ml, ms);
    }
    let j = random.pick(&term.momenta().collect::<Vec<_>>());
    let m = random.pick(&projections(j).collect::<Vec<_>>());
    State::coupled(name, term, j, m)
}

fn random_tensor(random: &mut Random, electrons: Electrons, place: usize) -> (Tensor, i32) {
    let orbital = u32::try_from(random.pick(&[0, 1, 1, 1, 2, 2, 3])).expect("not negative");
    let spins: &[i32] = if electrons.count == Some(1) { &[0, 0, 1] } else { &[0, 0, 1, 1, 2] };
    let spin = u32::try_from(random.pick(spins)).expect("not negative");
    let (low, high) = (orbital.abs_diff(spin), orbital + spin);
    let total = low + u32::try_from(random.below(u64::from(high - low) + 1)).expect("small");
    let tensor = Tensor::new(&format!("T{place}"), orbital, spin, total).expect("ranks");
    let tensor = if random.below(2) == 0 { tensor.odd() } else { tensor };
    let exchange = match (spin, random.below(3)) {
        (1, 0) => SpinExchange::Antisymmetric,
        (0, _) | (_, 1) => SpinExchange::Symmetric,
        _ => SpinExchange::Unknown,
    };
    let reach = i32::try_from(total.min(2)).expect("small");
    let q = random.between(-reach, reach);
    (tensor.with_exchange(exchange), q)
}

/// Ends, ranks and components at random, so that parity and M at least can add up.
fn random_case(random: &mut Random, count: usize) -> Case {
    let electrons = random.pick(&[Electrons::ONE, Electrons::TWO, Electrons::TWO]);
    let terms: BTreeSet<Term> = (0..4).map(|_| random_term(random, electrons)).collect();
    let terms: Vec<Term> = terms.into_iter().collect();
    let mut tensors: Vec<(Tensor, i32)> = (0..count).map(|place| random_tensor(random, electrons, place)).collect();
    let bra_term = random.pick(&terms);
    let ket_term = random.pick(&terms);
    let bra = random_state(random, "a", bra_term);
    let ket = random_state(random, "b", ket_term);
    let odd = tensors.iter().filter(|(tensor, _)| tensor.element.odd_parity).count() % 2 == 1;
    if odd != (bra_term.parity != ket_term.parity) {
        tensors[0].0.element.odd_parity = !tensors[0].0.element.odd_parity;
    }
    let mut missing = twice_m(&bra) - twice_m(&ket) - tensors.iter().map(|(_, q)| 2 * q).sum::<i32>();
    for (tensor, q) in &mut tensors {
        let rank = i32::try_from(tensor.total).expect("small");
        let step = (missing / 2).clamp(-rank - *q, rank - *q);
        *q += step;
        missing -= 2 * step;
    }
    Case { bra, ket, tensors, terms, electrons }
}

fn twice_m(state: &State) -> i32 {
    match state.vector {
        AngularVector::Coupled { m, .. } => m.expect("M is given").twice(),
        AngularVector::Product { ml, ms } => ml.twice() + ms.twice(),
    }
}

/// Returns how many paths with a factor other than zero the case had.
fn check(case: &Case, seed: u64) -> usize {
    let operators = case.tensors.iter().map(|(tensor, q)| Operator::new(tensor.clone(), Component::Spherical(*q)));
    let bracket =
        Bracket::with_resolvent(case.bra.clone(), operators.collect(), &Resolvent::new("G"), case.ket.clone());
    let rules = BlockRules { terms: Some(case.terms.iter().copied().collect()), ..BlockRules::of(case.electrons) };
    let decomposition = as_written(&ChainSum::from(bracket), rules);
    let ket = brute::state(&case.ket);
    let bra = brute::state(&case.bra);

    // the whole sum, with numbers for the reduced elements
    let mut vector = ket.clone();
    for (place, (tensor, q)) in case.tensors.iter().enumerate().rev() {
        let element = |a: Term, b: Term| {
            if allowed(tensor, case.electrons, a, b) { reduced(place, a, b) } else { Surd::zero() }
        };
        let ends = [case.bra.term];
        let into: &[Term] = if place == 0 { &ends } else { &case.terms };
        vector = brute::apply(tensor, *q, into, &element, &vector);
    }
    let whole = brute::overlap(&bra, &vector);
    let mut sum = Surd::zero();
    let mut by_key: BTreeMap<_, Surd> = BTreeMap::new();
    for path in &decomposition.contributions {
        let terms = path.key.brackets[0].terms();
        let mut value = path.factors[0].clone();
        for (place, sides) in terms.windows(2).enumerate() {
            value = &value * &reduced(place, sides[0], sides[1]);
        }
        sum += &value;
        *by_key.entry(path.key.clone()).or_default() += &path.factors[0];
    }
    assert_eq!(sum, whole, "sum of all paths, seed {seed}");

    // every path by itself, up to a few
    let live: Vec<_> = decomposition.contributions.iter().filter(|path| !path.factors[0].is_zero()).collect();
    let dead = decomposition.contributions.iter().filter(|path| path.factors[0].is_zero());
    for path in live.iter().copied().take(6).chain(dead.take(2)) {
        let terms = path.key.brackets[0].terms();
        let mut vector = ket.clone();
        for (place, (tensor, q)) in case.tensors.iter().enumerate().rev() {
            vector = brute::apply(tensor, *q, &[terms[place]], &|_, _| Surd::one(), &vector);
            if place > 0 {
                vector = brute::project(path.levels[0][place - 1], &vector);
            }
        }
        assert_eq!(brute::overlap(&bra, &vector), path.factors[0], "path {:?}, seed {seed}", path.levels);
    }

    // the J of one radial chain together: no projection on levels
    for (key, sum) in by_key.into_iter().take(3) {
        let terms = key.brackets[0].terms();
        let mut vector = ket.clone();
        for (place, (tensor, q)) in case.tensors.iter().enumerate().rev() {
            vector = brute::apply(tensor, *q, &[terms[place]], &|_, _| Surd::one(), &vector);
        }
        assert_eq!(brute::overlap(&bra, &vector), sum, "chain {key}, seed {seed}");
    }
    live.len()
}

/// At least so many chains of every length must have a path, so that the comparison is of more than zeros.
#[test]
fn paths_equal_uncoupled_sums() {
    let mut seed = 0;
    for (count, usual) in [(1, 60), (2, 120), (3, 150), (4, 150), (5, 120)] {
        let (wanted, begin) = (cases(usual), seed);
        let mut alive = 0;
        while alive < wanted {
            seed += 1;
            assert!(seed - begin < 200 * wanted, "random chains have too few paths");
            let case = random_case(&mut Random::new(seed), count);
            alive += u64::from(check(&case, seed) > 0);
        }
        println!("{count} operators: {alive} chains with paths among {}", seed - begin);
    }
}
