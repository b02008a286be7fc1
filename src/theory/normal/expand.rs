//! Multiplies expressions out.

use super::derive::{Degeneracy, Derivation, Unknown, moves_with_h};
use super::pieces::{FunctionPiece, NamedState, Piece, function_name};
use super::{NormalSum, NormalTerm, SymbolMeaning};
use crate::angular::HalfInteger;
use crate::lang::tree::DefinitionKind;
use crate::num::{Effort, Scalar, Surd};
use crate::theory::dimensions::{as_written, with_constants, without_constants};
use crate::theory::names::{Binding, Names};
use crate::theory::problem::{Fault, Problem};
use crate::theory::quantities::is_fixed;
use crate::theory::terms::*;
use rug::{Integer, Rational};
use std::collections::{BTreeMap, HashMap};

/// Most products an expression may have when it is multiplied out.
const MOST_TERMS: usize = 10_000;

/// Highest power that is multiplied out.
const HIGHEST_POWER: i64 = 100;

/// Deepest nesting of definitions.
const DEEPEST: usize = 100;

/// Precision at which exactness of a function's value is tried.
const TRIED_BITS: u32 = 64;

pub type Expanded<T> = Result<T, Problem>;

/// The normal forms that variables stand for.
pub(super) type Arguments = BTreeMap<String, NormalSum>;

/// Pieces in a row, with the product of numbers in front of them.
pub(super) type Strings = Vec<(NormalTerm, Vec<Piece>)>;

/// Brings expressions to their normal form.
pub struct Expander<'e> {
    effort: &'e Effort,
    depth: usize,
    /// The first name that was met for each energy, and for each function of H.
    energies: HashMap<String, String>,
    pub(super) states: HashMap<String, String>,
    pub(super) functions: HashMap<String, String>,
    /// What every symbol stands for.
    meanings: HashMap<String, SymbolMeaning>,
    pub(super) degeneracy: Box<dyn Degeneracy + 'e>,
    /// Whether named operators that are their own adjoints stand for themselves.
    pub(super) keep_names: bool,
    /// A variation under a perturbation that changes with H itself has been met.
    moving: bool,
    /// Symbols that need not be real were conjugated: variables, and functions.
    pub(super) conjugated: Conjugated,
}

/// What was taken for real when an adjoint was taken.
#[derive(Clone, Copy, PartialEq, Eq, Debug, Default)]
pub struct Conjugated {
    pub variables: bool,
    pub functions: bool,
}

impl<'e> Expander<'e> {
    /// An expander that knows nothing of the levels of systems.
    pub fn new(effort: &'e Effort) -> Self {
        Self::with_levels(effort, Unknown)
    }

    /// An expander that knows which states are degenerate, for changes of reduced resolvents.
    pub fn with_levels(effort: &'e Effort, degeneracy: impl Degeneracy + 'e) -> Self {
        Expander {
            effort,
            depth: 0,
            energies: HashMap::new(),
            states: HashMap::new(),
            functions: HashMap::new(),
            meanings: HashMap::new(),
            degeneracy: Box::new(degeneracy),
            keep_names: false,
            moving: false,
            conjugated: Conjugated::default(),
        }
    }

    /// Leaves named operators that are their own adjoints, and hold no function of H, as they are named.
    #[must_use]
    pub fn keeping_names(mut self) -> Self {
        self.keep_names = true;
        self
    }

    /// Calls the functions of H that the session has named, those without parameters, by their names.
    ///
    /// Errors: as for expanding them.
    pub fn name_functions(&mut self, names: &Names) -> Expanded<()> {
        for (name, binding) in &names.bound {
            if let Binding::Definition(definition) = binding
                && definition.kind == DefinitionKind::Resolvent
                && definition.parameters.is_empty()
                && let Meaning::Operator(body) = &definition.body
            {
                let call = Call { definition: definition.clone(), arguments: Vec::new() };
                let term = Term::new(OperatorNode::Call(call), body.place, name.as_str());
                self.operator(&term, &Arguments::new())?;
            }
        }
        Ok(())
    }

    /// The normal form of a number; variables that are not bound stay symbols.
    ///
    /// Errors: more than 10,000 products; definitions nested deeper than 100.
    pub fn expand(&mut self, term: &ScalarTerm) -> Expanded<NormalSum> {
        self.scalar(term, &Arguments::new())
    }

    /// What a symbol stands for.
    pub fn meaning(&self, symbol: &str) -> Option<&SymbolMeaning> {
        self.meanings.get(symbol)
    }

    /// A symbol with its meaning.
    pub(super) fn symbol(&mut self, symbol: String, meaning: SymbolMeaning) -> NormalSum {
        self.meanings.entry(symbol.clone()).or_insert(meaning);
        NormalSum::symbol(symbol)
    }

    /// A state whose label holds no variables.
    pub(super) fn named_state(&mut self, state: &StateTerm) -> Expanded<NamedState> {
        self.state(state, &Arguments::new())
    }

    /// What was taken for real when adjoints were taken.
    pub fn conjugated(&self) -> Conjugated {
        self.conjugated
    }

    /// Notes the symbols of a sum that is about to be conjugated and need not be real.
    pub(super) fn note_conjugate(&mut self, sum: &NormalSum) {
        for (symbol, _) in sum.terms.iter().flat_map(|term| term.symbols.factors()) {
            match self.meanings.get(symbol).cloned() {
                Some(SymbolMeaning::Given(term, _)) => {
                    self.conjugated.variables |= matches!(&*term.node, ScalarNode::Variable(_));
                }
                Some(SymbolMeaning::Energy(_)) => {}
                Some(SymbolMeaning::Sum(inner) | SymbolMeaning::Held(inner)) => self.note_conjugate(&inner),
                Some(SymbolMeaning::Function(..) | SymbolMeaning::Power(..)) | None => self.conjugated.functions = true,
            }
        }
    }

    /// The symbol for the energy of a state.
    pub(super) fn energy(&mut self, state: &NamedState) -> NormalSum {
        let shown = format!("E({})", state.shown);
        let symbol = self.energies.entry(state.name.clone()).or_insert(shown).clone();
        self.symbol(symbol, SymbolMeaning::Energy(state.clone()))
    }

    /// A function of H by the name it has in the session, if any.
    pub(super) fn named_function(&mut self, mut piece: FunctionPiece) -> FunctionPiece {
        let shown = self.functions.entry(piece.key.clone()).or_insert_with(|| piece.label.clone());
        piece.label.clone_from(shown);
        piece
    }

    pub(super) fn refuse<T>(&self, place: Place, message: String, help: &str) -> Expanded<T> {
        Err(Problem::new(place, Fault::Other { message, help: help.into() }))
    }

    pub(super) fn check(&self, count: usize, place: Place) -> Expanded<()> {
        if self.effort.check().is_err() {
            return Err(Problem::new(place, Fault::Interrupted));
        }
        if count > MOST_TERMS {
            return self.refuse(
                place,
                format!("multiplied out, the expression has more than {MOST_TERMS} products"),
                "take a part of it",
            );
        }
        Ok(())
    }

    pub(super) fn product(&self, a: &NormalSum, b: &NormalSum, place: Place) -> Expanded<NormalSum> {
        self.check(a.terms.len().saturating_mul(b.terms.len()), place)?;
        Ok(a.times(b))
    }

    pub(super) fn scalar(&mut self, term: &ScalarTerm, arguments: &Arguments) -> Expanded<NormalSum> {
        let place = term.place;
        self.check(0, place)?;
        Ok(match &*term.node {
            ScalarNode::Exact(value) => NormalSum::number(value.clone()),
            ScalarNode::Pi => NormalSum::number(Surd::pi_to(1)),
            ScalarNode::Measured { .. } | ScalarNode::Root { .. } => self.given(term, arguments),
            ScalarNode::Quantity { .. } if is_fixed(term) => self.given(term, arguments),
            ScalarNode::Quantity { value, .. } => self.scalar(value, arguments)?,
            ScalarNode::Variable(name) => match arguments.get(name) {
                Some(value) => value.clone(),
                None => self.symbol(name.clone(), SymbolMeaning::Given(term.clone(), Vec::new())),
            },
            ScalarNode::Sum(terms) => {
                let mut sum = NormalSum::default();
                for inner in terms {
                    sum = sum.plus(self.scalar(inner, arguments)?);
                    self.check(sum.terms.len(), place)?;
                }
                sum
            }
            ScalarNode::Product(factors) => {
                let mut product = NormalSum::number(Surd::one());
                for inner in factors {
                    let factor = self.scalar(inner, arguments)?;
                    product = self.product(&product, &factor, place)?;
                }
                product
            }
            ScalarNode::Negated(inner) => self.scalar(inner, arguments)?.scaled(&Surd::from(-1)),
            ScalarNode::Quotient(a, b) => {
                let a = self.scalar(a, arguments)?;
                let b = self.scalar(b, arguments)?;
                let inverse = self.inverse(&b, place)?;
                self.product(&a, &inverse, place)?
            }
            ScalarNode::Power(base, exponent) => {
                let base = self.scalar(base, arguments)?;
                let exponent = self.scalar(exponent, arguments)?;
                self.power(&base, &exponent, place)?
            }
            ScalarNode::Function(function, inner) => {
                let inner = self.scalar(inner, arguments)?;
                self.function(*function, &inner)
            }
            ScalarNode::Energy(state) => {
                let mut named = self.state(state, arguments)?;
                if let Some(shown) = as_written(&term.text).strip_prefix("E(").and_then(|rest| rest.strip_suffix(')'))
                    && !shown.contains('{')
                {
                    named.shown = self.states.entry(named.name.clone()).or_insert(shown.to_string()).clone();
                }
                self.energy(&named)
            }
            ScalarNode::Bracket(bracket) => self.bracket(bracket, arguments, place)?,
            ScalarNode::Call(call) => match &call.definition.body {
                Meaning::Scalar(body) => self.inside(call, arguments, place, |this, inner| this.scalar(body, inner))?,
                _ => return self.refuse(place, "a number is needed here".into(), ""),
            },
            ScalarNode::Series { variable, from, to, body } => {
                let first = self.whole(from, arguments)?;
                let last = self.whole(to, arguments)?;
                let mut sum = NormalSum::default();
                let mut n = first;
                while n <= last {
                    let mut inner = arguments.clone();
                    inner.insert(variable.clone(), NormalSum::number(Surd::from(Rational::from(&n))));
                    sum = sum.plus(self.scalar(body, &inner)?);
                    self.check(sum.terms.len(), place)?;
                    n += 1;
                }
                sum
            }
            ScalarNode::Vary(variation) => {
                let outside = std::mem::take(&mut self.moving);
                let mut sum = self.scalar(&variation.body, arguments)?;
                let moving = moves_with_h(&self.operator(&variation.perturbation, arguments)?);
                if self.moving || moving && variation.order > 1 {
                    return self.refuse(
                        place,
                        "a perturbation that holds H, a function of H or a projector is varied again here".into(),
                        "such a perturbation has a first-order change only; others may be nested and of any order",
                    );
                }
                self.moving = outside || moving;
                let mut factorial = Rational::from(1);
                let mut derivation = Derivation::new(self, &variation.perturbation, arguments)?;
                for order in 1..=variation.order {
                    sum = derivation.change(&sum)?;
                    factorial *= order;
                }
                sum.scaled(&Surd::from(factorial.recip()))
            }
            ScalarNode::LevelPart(part, _) => {
                let message = format!("`{}` stands inside, and every M is looked at here anyway", part.name());
                return self.refuse(place, message, "write the expression inside it alone");
            }
            ScalarNode::Wigner(symbol, list) => NormalSum::number(self.wigner(*symbol, list, arguments, place)?),
        })
    }

    /// A number that stays as it is written, with the arguments of the definition it stands in.
    fn given(&mut self, term: &ScalarTerm, arguments: &Arguments) -> NormalSum {
        let mut symbol = without_constants(&term.text);
        // the same unit by two sets of constants is two numbers
        if let Some(SymbolMeaning::Given(known, _)) = self.meaning(&symbol)
            && known.text != term.text
        {
            symbol = with_constants(&term.text);
        }
        let mut used = Vec::new();
        if matches!(&*term.node, ScalarNode::Root { .. }) {
            for (name, value) in arguments {
                symbol += &format!(" at {name} = {value}");
                used.push((name.clone(), value.clone()));
            }
        }
        self.symbol(symbol, SymbolMeaning::Given(term.clone(), used))
    }

    pub(super) fn inverse(&mut self, sum: &NormalSum, place: Place) -> Expanded<NormalSum> {
        if sum.terms.is_empty() {
            return self.refuse(place, "a denominator is zero".into(), "look at its terms: they cancel");
        }
        if let Some(inverse) = sum.inverse() {
            return Ok(inverse);
        }
        let symbol = self.symbol(sum.to_string(), SymbolMeaning::Sum(sum.clone()));
        symbol.inverse().map_or_else(|| self.refuse(place, "a denominator has no inverse".into(), ""), Ok)
    }

    fn power(&mut self, base: &NormalSum, exponent: &NormalSum, place: Place) -> Expanded<NormalSum> {
        let whole = exponent
            .as_number()
            .and_then(|n| n.as_rational()?.is_integer().then(|| n.as_rational()?.numer().to_i64())?);
        match whole {
            Some(n) if n.abs() <= HIGHEST_POWER => {
                let mut power = NormalSum::number(Surd::one());
                for _ in 0..n.abs() {
                    power = self.product(&power, base, place)?;
                }
                if n < 0 { self.inverse(&power, place) } else { Ok(power) }
            }
            _ => {
                if let (Some(a), Some(b)) = (base.as_number(), exponent.as_number())
                    && let Ok(Scalar::Exact(value)) = Scalar::Exact(a).pow(&Scalar::Exact(b), TRIED_BITS)
                {
                    return Ok(NormalSum::number(value));
                }
                let symbol = format!("({base})^({exponent})");
                Ok(self.symbol(symbol, SymbolMeaning::Power(base.clone(), exponent.clone())))
            }
        }
    }

    pub(super) fn function(&mut self, function: ScalarFunction, inner: &NormalSum) -> NormalSum {
        if function == ScalarFunction::Conj {
            self.note_conjugate(inner);
            return inner.conj();
        }
        match inner.as_number().map(|value| Scalar::Exact(value).apply(function, TRIED_BITS)) {
            Some(Ok(Scalar::Exact(value))) => NormalSum::number(value),
            _ => {
                let symbol = format!("{}({inner})", function_name(function));
                self.symbol(symbol, SymbolMeaning::Function(function, inner.clone()))
            }
        }
    }

    fn whole(&mut self, term: &ScalarTerm, arguments: &Arguments) -> Expanded<Integer> {
        match self.scalar(term, arguments)?.as_number().as_ref().and_then(Surd::as_rational) {
            Some(q) if q.is_integer() => Ok(q.numer().clone()),
            _ => self.refuse(
                term.place,
                format!("`{}` is no whole number when it is multiplied out", term.text),
                "write whole numbers, as in `sum(n in 1 .. 20, …)`",
            ),
        }
    }

    fn wigner(
        &mut self,
        symbol: WignerSymbol,
        list: &[ScalarTerm],
        arguments: &Arguments,
        place: Place,
    ) -> Expanded<Surd> {
        let mut j = Vec::with_capacity(list.len());
        for argument in list {
            let value = self.scalar(argument, arguments)?.as_number();
            let half = value.as_ref().and_then(Surd::as_rational).and_then(|q| HalfInteger::from_rational(&q).ok());
            match half {
                Some(half) => j.push(half),
                None => {
                    let message = format!("`{}` is no half-integer when it is multiplied out", argument.text);
                    return self.refuse(argument.place, message, "write 0, 1/2, 1, 3/2, …");
                }
            }
        }
        let Some(value) = symbol.value(&j) else {
            return self.refuse(place, format!("the symbol takes {}", symbol.arguments().1), "");
        };
        value.or_else(|error| self.refuse(place, error.to_string(), "write 0, 1/2, 1, 3/2, …"))
    }

    /// Expands the body of a definition with its arguments.
    pub(super) fn inside<T>(
        &mut self,
        call: &Call,
        arguments: &Arguments,
        place: Place,
        expand: impl FnOnce(&mut Self, &Arguments) -> Expanded<T>,
    ) -> Expanded<T> {
        if self.depth >= DEEPEST {
            return self.refuse(place, format!("definitions are nested deeper than {DEEPEST}"), "take them apart");
        }
        let mut inner = Arguments::new();
        for (name, argument) in call.definition.parameters.iter().zip(&call.arguments) {
            inner.insert(name.clone(), self.scalar(argument, arguments)?);
        }
        self.depth += 1;
        let result = expand(self, &inner);
        self.depth -= 1;
        result
    }

    /// A state with the numbers in its label computed.
    pub(super) fn state(&mut self, state: &StateTerm, arguments: &Arguments) -> Expanded<NamedState> {
        let mut text = String::new();
        for piece in &state.label.parts {
            match piece {
                LabelPiece::Text(part) => text.push_str(part),
                LabelPiece::Computed(term) => text += &self.whole(term, arguments)?.to_string(),
            }
        }
        let mut options = Vec::with_capacity(state.label.options.len());
        let mut name = format!("{}[{text}", state.system);
        for (option, term) in &state.label.options {
            let Some(value) = self.scalar(term, arguments)?.as_number() else {
                let message = format!("`{option}` is no number when it is multiplied out");
                return self.refuse(term.place, message, "quantum numbers are whole or half-integer");
            };
            name += &format!(", {option}={value}");
            let shown = value.to_string();
            options.push((option.clone(), Term::new(ScalarNode::Exact(value), term.place, shown)));
        }
        name.push(']');
        let label = LabelTerm { parts: vec![LabelPiece::Text(text)], options, text: name.as_str().into() };
        let term = StateTerm { system: state.system.clone(), label, place: state.place };
        let shown = self.states.get(&name).cloned().unwrap_or_else(|| name.clone());
        Ok(NamedState { term, shown, name })
    }
}
