//! Expressions as sums of chains for the angular algebra: the normal form of theory joined with the symmetry of a system.

use super::environment::Environment;
use super::evaluator::{Evaluated, Evaluator};
use super::problem::{Failure, Trouble};
use crate::angular::chain::{Bracket, ChainSum, Operator, Part, Product, Resolvent, State};
use crate::angular::paths::Setting;
use crate::angular::polarization::Component;
use crate::angular::tensor::{Sign, Tensor};
use crate::num::Surd;
use crate::systems::{Atom, LevelShift, Symmetry, System, SystemError};
use crate::theory::indices::is_index;
use crate::theory::normal::{
    FunctionPiece, NamedState, NormalAtom, NormalBracket, NormalSum, NormalTensor, NormalTerm, Piece, Symbols,
};
use crate::theory::terms::{Direction, OmittedTerm, Place};
use std::sync::Arc;

/// An expression for the angular algebra.
pub struct AngularSum {
    pub sum: ChainSum,
    pub setting: Setting,
    /// The products as they are written, in the order of the sum.
    pub shown: Vec<String>,
    /// Products that are zero because a reduced resolvent stands next to a state of the level it leaves out.
    pub annihilated: Vec<String>,
    /// Functions of H other than fractions stand somewhere: shifts of levels are not expanded.
    pub beyond_fractions: bool,
}

/// What became of a bracket.
enum Turned {
    /// A chain, with numbers without a value that stand in front.
    Chain(Bracket, Symbols),
    Zero,
}

impl Evaluator<'_> {
    /// The chains of a normal form.
    ///
    /// Errors: brackets of several systems, of a system without symmetry, or none at all; operators the system does not have.
    pub fn angular_sum(&mut self, normal: &NormalSum, place: Place) -> Evaluated<AngularSum> {
        let refuse = |message: &str, help: &str| {
            Failure::new(place, Trouble::Refused { message: message.into(), help: help.into() })
        };
        let mut names: Vec<&str> = Vec::new();
        for bracket in normal.terms.iter().flat_map(|term| &term.brackets) {
            let system = bracket.ket.term.system.as_str();
            if !names.contains(&system) {
                names.push(system);
            }
        }
        let name = match names.as_slice() {
            [name] => *name,
            [] if normal.terms.is_empty() => {
                return Err(refuse(
                    "the expression is zero before any angular algebra: its terms cancel",
                    "`formula` in front of a part of it shows the terms",
                ));
            }
            [] => return Err(refuse("there is no bracket <…|…> in the expression", "write a sum of brackets")),
            _ => return Err(refuse("brackets of several systems stand in one expression", "take them one by one")),
        };
        let system = self.system(name, place)?;
        let Some(symmetry) = system.symmetry() else {
            let message = format!("`{name}` has no angular momenta: a {} is a space without symmetry", system.kind());
            return Err(refuse(&message, "take states of an atom, or of `symbolic(electrons=2)`"));
        };
        let mut turning = Turning { evaluator: self, system: &system, symmetry, beyond_fractions: false, brackets: 0 };
        let (mut sum, mut shown, mut annihilated) = (ChainSum::default(), Vec::new(), Vec::new());
        for term in &normal.terms {
            let text = NormalSum { terms: vec![term.clone()] }.to_string();
            match turning.product(term)? {
                Some(product) => {
                    sum.products.push(product);
                    shown.push(text);
                }
                None => annihilated.push(text),
            }
        }
        let beyond_fractions = turning.beyond_fractions;
        Ok(AngularSum { sum, setting: Setting::new(symmetry.rules()), shown, annihilated, beyond_fractions })
    }
}

impl Evaluator<'_> {
    /// The levels that are moved in the system of a normal form.
    pub fn level_shifts(&mut self, normal: &NormalSum, place: Place) -> Evaluated<Vec<LevelShift>> {
        let Some(bracket) = normal.terms.iter().flat_map(|term| &term.brackets).next() else { return Ok(Vec::new()) };
        let system = self.system(&bracket.ket.term.system, place)?;
        Ok(system.symmetry().map(Symmetry::shifts).unwrap_or_default())
    }
}

struct Turning<'t, 's> {
    evaluator: &'t mut Evaluator<'s>,
    system: &'t Arc<dyn System>,
    symmetry: &'t dyn Symmetry,
    beyond_fractions: bool,
    /// Brackets so far; summed indices of different brackets are different.
    brackets: usize,
}

impl Turning<'_, '_> {
    fn product(&mut self, term: &NormalTerm) -> Evaluated<Option<Product>> {
        let mut symbols = term.symbols.clone();
        let mut brackets = Vec::with_capacity(term.brackets.len());
        for bracket in &term.brackets {
            match self.bracket(bracket)? {
                Turned::Zero => return Ok(None),
                Turned::Chain(chain, in_front) => {
                    symbols = symbols.times(&in_front);
                    brackets.push(chain);
                }
            }
        }
        Ok(Some(Product { coefficient: term.coefficient.clone(), symbol: symbols.to_string(), brackets }))
    }

    fn end(&mut self, state: &NamedState) -> Evaluated<State> {
        let found = self.evaluator.state(&state.term, &Environment::default())?;
        self.symmetry.end(&found).map_err(|error| Failure::new(state.term.place, error))
    }

    fn bracket(&mut self, bracket: &NormalBracket) -> Evaluated<Turned> {
        self.brackets += 1;
        let (bra, ket) = (self.end(&bracket.bra)?, self.end(&bracket.ket)?);
        let mut symbols = Symbols::one();
        let mut operators: Vec<Operator> = Vec::new();
        let mut gaps: Vec<Vec<Resolvent>> = Vec::new();
        let mut waiting: Vec<&FunctionPiece> = Vec::new();
        let place = bracket.place;
        for piece in &bracket.pieces {
            let found = match piece {
                Piece::Function(function) => {
                    waiting.push(function);
                    continue;
                }
                Piece::Atom(atom) => self.atom(atom, place)?,
                Piece::Tensor(tensor) => vec![self.tensor(tensor, place)?],
                Piece::Named(named) => {
                    let message = format!("`{}` is not multiplied out", named.text);
                    return Err(Failure::new(place, Trouble::Refused { message, help: String::new() }));
                }
                Piece::Hamiltonian => {
                    let atom = Atom { name: "H".into(), component: None, arguments: Vec::new(), power: 1 };
                    vec![self.tensors(&atom, place)?]
                }
                // brackets were taken apart at bras and kets
                Piece::Bra(_) | Piece::Ket(_) => continue,
            };
            for operator in found {
                if operators.is_empty() {
                    // functions of H on the bra are numbers
                    for function in waiting.drain(..) {
                        match self.on_state(function, &bracket.bra)? {
                            None => return Ok(Turned::Zero),
                            Some(number) => symbols = symbols.times(&number),
                        }
                    }
                } else {
                    gaps.push(waiting.drain(..).map(|function| self.resolvent(function)).collect());
                }
                operators.push(operator);
            }
        }
        for function in waiting {
            match self.on_state(function, &bracket.ket)? {
                None => return Ok(Turned::Zero),
                Some(number) => symbols = symbols.times(&number),
            }
        }
        Ok(Turned::Chain(Bracket { bra, operators, gaps, ket }, symbols))
    }

    fn resolvent(&mut self, function: &FunctionPiece) -> Resolvent {
        self.beyond_fractions |= function.function.is_some();
        // 1/(z - H) changes by + G d G when a level moves up by d
        let sign = if function.slope == Sign::Minus { Sign::Plus } else { Sign::Minus };
        Resolvent { label: function.label.clone(), sign, depends_on_j: false }
    }

    /// A function of H next to a state is a number; `None` where the state is left out.
    fn on_state(&mut self, function: &FunctionPiece, state: &NamedState) -> Evaluated<Option<Symbols>> {
        let found = self.evaluator.state(&state.term, &Environment::default())?;
        for omitted in &function.omitted {
            if let OmittedTerm::LevelOf(left_out) = omitted {
                let left_out = self.evaluator.state(left_out, &Environment::default())?;
                if self.system.degenerate(&found, &left_out) {
                    return Ok(None);
                }
            }
        }
        Ok(Some(Symbols::of(format!("{} on {}", function.label, state.name))))
    }

    fn tensors(&self, atom: &Atom, place: Place) -> Evaluated<Operator> {
        self.symmetry.tensors(atom).map_err(|error| Failure::new(place, error))
    }

    /// An operator of the vocabulary, as often as its power says.
    fn atom(&mut self, atom: &NormalAtom, place: Place) -> Evaluated<Vec<Operator>> {
        // directions and indices stand for all components; the tensor is that of any of them
        let open = match (&atom.along, &atom.component) {
            (Some(Direction::Fixed(fixed)), _) => Some(Component::Along(fixed.clone())),
            (Some(Direction::Light), _) => Some(Component::Light),
            (Some(Direction::LightConjugate), _) => Some(Component::LightConjugate),
            (None, Some(index)) if is_index(index) => Some(Component::Index(format!("{index}{}", self.brackets))),
            _ => None,
        };
        let component = if open.is_some() { Some("z".to_string()) } else { atom.component.clone() };
        let mut plain =
            Atom { name: atom.name.clone(), component, arguments: atom.arguments.clone(), power: atom.power };
        let known = self.system.knows(&plain).map_err(|error| Failure::new(place, error))?;
        let count = if known { 1 } else { plain.power };
        if !known {
            plain.power = 1;
        }
        let mut operator = self.tensors(&plain, place)?;
        if let Some(open) = open {
            for part in &mut operator.parts {
                part.component = open.clone();
            }
        }
        let count = usize::try_from(count).unwrap_or(0);
        Ok(vec![operator; count])
    }

    fn tensor(&mut self, tensor: &NormalTensor, place: Place) -> Evaluated<Operator> {
        let term = &tensor.term;
        let refuse =
            |message: String, help: &str| Failure::new(place, SystemError::Refused { message, help: help.to_string() });
        let Tensor { element, total } = &term.tensor;
        let shown = if element.name.is_empty() { "the tensor".to_string() } else { format!("`{}`", element.name) };
        let named = if element.name.is_empty() {
            let name = format!("tensor({},{},{total})", element.orbital, element.spin);
            Tensor { element: crate::angular::tensor::Element { name, ..element.clone() }, total: *total }
        } else {
            term.tensor.clone()
        };
        let mut component = match (&term.along, term.component.as_deref()) {
            (Some(Direction::Fixed(fixed)), _) => Component::Along(fixed.clone()),
            (Some(Direction::Light), _) => Component::Light,
            (Some(Direction::LightConjugate), _) => Component::LightConjugate,
            (None, Some(index)) if is_index(index) => Component::Index(format!("{index}{}", self.brackets)),
            (None, Some(axis @ ("x" | "y" | "z"))) => {
                axis.chars().next().and_then(Component::axis).unwrap_or(Component::Spherical(0))
            }
            (None, Some(number)) => Component::Spherical(number.parse().unwrap_or(0)),
            (None, None) if *total == 0 => Component::Spherical(0),
            (None, None) => {
                let message = format!("{shown} has rank {total} and needs a component");
                return Err(refuse(message, "write _0, _+1 or another component behind it"));
            }
        };
        let mut coefficient = Surd::one();
        if *total == 0 && element.orbital == element.spin {
            coefficient = Tensor::dot_weight(element.orbital);
        }
        if tensor.adjoint {
            let Some(adjoint) = element.adjoint else {
                let message = format!("the adjoint of {shown} is needed here, and it is not said what that is");
                return Err(refuse(message, "add adjoint=hermitian or adjoint=antihermitian to its ranks"));
            };
            // (T^K_Q)^+ = tau (-1)^(k+s-K) (-1)^Q T_-Q; a direction is conjugated instead
            let mut odd = (element.orbital + element.spin + total) % 2 == 1;
            odd ^= adjoint == Sign::Minus;
            component = match component {
                Component::Spherical(q) => {
                    odd ^= q % 2 != 0;
                    Component::Spherical(-q)
                }
                Component::Along(direction) => Component::Along(direction.conj()),
                Component::Light => Component::LightConjugate,
                Component::LightConjugate => Component::Light,
                index @ Component::Index(_) => index,
            };
            if odd {
                coefficient = -&coefficient;
            }
        }
        Ok(Operator { parts: vec![Part { coefficient, tensor: named, component }] })
    }
}
