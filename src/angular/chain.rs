//! Sums of products of brackets <g| O1 G O2 … On |g'>: what the path decomposition works on.

use super::half_integer::HalfInteger;
use super::polarization::{Component, Polarization};
use super::tensor::{Sign, Tensor};
use super::term::Term;
use crate::num::Surd;

/// A state at the end of a bracket.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct State {
    /// Names the radial function.
    pub name: String,
    pub term: Term,
    pub vector: AngularVector,
}

/// The angular part of a state.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum AngularVector {
    /// |(L S) J M>; without M every M of the level is looked at.
    Coupled { j: HalfInteger, m: Option<HalfInteger> },
    /// |L ML> |S MS>.
    Product { ml: HalfInteger, ms: HalfInteger },
}

impl State {
    /// The level |(L S) J> with every M.
    pub fn level(name: &str, term: Term, j: HalfInteger) -> Self {
        State { name: name.to_string(), term, vector: AngularVector::Coupled { j, m: None } }
    }

    pub fn coupled(name: &str, term: Term, j: HalfInteger, m: HalfInteger) -> Self {
        State { name: name.to_string(), term, vector: AngularVector::Coupled { j, m: Some(m) } }
    }

    pub fn product(name: &str, term: Term, ml: HalfInteger, ms: HalfInteger) -> Self {
        State { name: name.to_string(), term, vector: AngularVector::Product { ml, ms } }
    }
}

/// A function of H between two operators, diagonal in the blocks.
#[derive(Clone, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub struct Resolvent {
    /// Two resolvents with one label are one function of H.
    pub label: String,
    /// Plus for 1/(z - H), minus for 1/(H - z): the sign of its change when a level is moved up.
    pub sign: Sign,
    /// Whether levels of one term and different J are told apart.
    pub depends_on_j: bool,
}

impl Resolvent {
    /// 1/(z - H) of the given label, the same for all J of a term.
    pub fn new(label: &str) -> Self {
        Resolvent { label: label.to_string(), sign: Sign::Plus, depends_on_j: false }
    }
}

/// One tensor operator with its component and coefficient.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Part {
    pub coefficient: Surd,
    pub tensor: Tensor,
    pub component: Component,
}

/// An operator in a chain: a sum of tensor components, as L_z + g_S S_z.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Operator {
    pub parts: Vec<Part>,
}

impl Operator {
    pub fn new(tensor: Tensor, component: Component) -> Self {
        Operator { parts: vec![Part { coefficient: Surd::one(), tensor, component }] }
    }

    /// A scalar product A^k.B^k: the tensor [A B]^0 with its factor.
    pub fn dot(tensor: Tensor) -> Self {
        let coefficient = Tensor::dot_weight(tensor.element.orbital);
        Operator { parts: vec![Part { coefficient, tensor, component: Component::Spherical(0) }] }
    }

    pub fn scalar(tensor: Tensor) -> Self {
        Self::new(tensor, Component::Spherical(0))
    }

    #[must_use]
    pub fn times(mut self, factor: &Surd) -> Self {
        for part in &mut self.parts {
            part.coefficient = &part.coefficient * factor;
        }
        self
    }

    #[must_use]
    pub fn plus(mut self, other: Operator) -> Self {
        self.parts.extend(other.parts);
        self
    }

    /// -i times the gradient of the given name: the momentum, with real radial elements.
    pub fn momentum(name: &str, component: Component) -> Self {
        Self::new(Tensor::gradient(name), component).times(&-&Surd::i())
    }

    /// The total J = L + S.
    pub fn total_momentum(component: &Component) -> Self {
        Self::magnetic_moment(component, &Surd::one(), &Surd::one())
    }

    /// g_L L + g_S S.
    pub fn magnetic_moment(component: &Component, g_l: &Surd, g_s: &Surd) -> Self {
        let orbital = Self::new(Tensor::orbital_momentum("1"), component.clone()).times(g_l);
        orbital.plus(Self::new(Tensor::total_spin("1"), component.clone()).times(g_s))
    }
}

/// <bra| O1 (gap 1) O2 … (gap n-1) On |ket>; a gap holds the resolvents that stand there, none where the operators touch.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Bracket {
    pub bra: State,
    pub operators: Vec<Operator>,
    /// One fewer than operators.
    pub gaps: Vec<Vec<Resolvent>>,
    pub ket: State,
}

impl Bracket {
    /// A bracket with one and the same resolvent in every gap.
    pub fn with_resolvent(bra: State, operators: Vec<Operator>, resolvent: &Resolvent, ket: State) -> Self {
        let gaps = vec![vec![resolvent.clone()]; operators.len().saturating_sub(1)];
        Bracket { bra, operators, gaps, ket }
    }
}

/// A product of brackets with an exact coefficient.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Product {
    pub coefficient: Surd,
    /// A scalar factor without a number, as `a` or `E(g)`; empty for none.
    pub symbol: String,
    pub brackets: Vec<Bracket>,
}

impl From<Bracket> for Product {
    fn from(bracket: Bracket) -> Self {
        Product { coefficient: Surd::one(), symbol: String::new(), brackets: vec![bracket] }
    }
}

/// A sum of products of brackets: the expression whose paths are asked for.
#[derive(Clone, PartialEq, Eq, Debug, Default)]
pub struct ChainSum {
    pub products: Vec<Product>,
}

impl From<Bracket> for ChainSum {
    fn from(bracket: Bracket) -> Self {
        ChainSum { products: vec![Product::from(bracket)] }
    }
}

impl ChainSum {
    /// The sum with the light's polarization put in where it was left open.
    #[must_use]
    pub fn in_light(&self, light: &Polarization) -> Self {
        let mut sum = self.clone();
        for bracket in sum.products.iter_mut().flat_map(|product| &mut product.brackets) {
            for part in bracket.operators.iter_mut().flat_map(|operator| &mut operator.parts) {
                part.component = part.component.in_light(light);
            }
        }
        sum
    }

    pub(crate) fn states(&self) -> impl Iterator<Item = &State> {
        self.products.iter().flat_map(|product| &product.brackets).flat_map(|bracket| [&bracket.bra, &bracket.ket])
    }
}
