//! Short ways to write operators, states and sums in tests.

use ketwork::angular::chain::{Bracket, ChainSum, Operator, Resolvent, State};
use ketwork::angular::paths::{Decomposition, Orientation, Setting, decompose};
use ketwork::angular::polarization::{Component, Polarization};
use ketwork::angular::selection::BlockRules;
use ketwork::angular::tensor::{Sign, SpinExchange, Tensor};
use ketwork::angular::term::Term;
use ketwork::angular::{Electrons, HalfInteger};
use ketwork::num::{Effort, Surd};
use rug::Rational;

pub fn half(twice: i32) -> HalfInteger {
    HalfInteger::from_twice(twice)
}

pub fn rational(text: &str) -> Surd {
    Surd::from(text.parse::<Rational>().expect("a rational"))
}

/// The dipole operator along a polarization.
pub fn dipole(light: &Polarization) -> Operator {
    Operator::new(Tensor::polar_vector("D"), Component::Along(light.clone()))
}

pub fn light(q: i32) -> Polarization {
    match q {
        1 => Polarization::sigma_plus(),
        -1 => Polarization::sigma_minus(),
        _ => Polarization::z(),
    }
}

/// L.S as an operator with nothing radial.
pub fn orbit_dot_spin() -> Operator {
    Operator::dot(Tensor::orbit_dot_spin("SO"))
}

/// A2.B2 with the doubly reduced element left open.
pub fn spin_spin() -> Operator {
    Operator::dot(Tensor::dot("SS", 2).expect("ranks"))
}

/// Orbital rank 1 times s1 - s2.
pub fn mixing() -> Operator {
    let tensor = Tensor::new("V-", 1, 1, 0).expect("ranks").with_adjoint(Sign::Plus);
    Operator::dot(tensor.with_exchange(SpinExchange::Antisymmetric))
}

/// <g| D.e* G V1 G … G D.e |g> with one resolvent everywhere, every M of g.
pub fn response(g: &State, q: i32, middle: Vec<Operator>) -> ChainSum {
    let e = light(q);
    let mut operators = vec![dipole(&e.conj())];
    operators.extend(middle);
    operators.push(dipole(&e));
    ChainSum::from(Bracket::with_resolvent(g.clone(), operators, &Resolvent::new("G"), g.clone()))
}

pub fn triplet_s() -> State {
    State::level("g", Term::natural(0, half(2)), half(2))
}

pub fn doublet_s() -> State {
    State::level("g", Term::natural(0, half(1)), half(1))
}

pub fn setting(electrons: Electrons) -> Setting {
    Setting::new(BlockRules::of(electrons))
}

pub fn paths(sum: &ChainSum, electrons: Electrons) -> Decomposition {
    decompose(sum, &setting(electrons), &Effort::new()).expect("a valid sum")
}

pub fn as_written(sum: &ChainSum, rules: BlockRules) -> Decomposition {
    let setting = Setting { rules, orientation: Orientation::AsWritten };
    decompose(sum, &setting, &Effort::new()).expect("a valid sum")
}

/// Two electrons, with the S and P terms of natural parity only.
pub fn s_and_p() -> Setting {
    let terms = [0, 1].into_iter().flat_map(|l| [0, 2].map(|s| Term::natural(l, half(s)))).collect();
    Setting::new(BlockRules { terms: Some(terms), ..BlockRules::of(Electrons::TWO) })
}
