//! Multiplies expressions out.

use super::derive::{Degeneracy, Derivation, Unknown};
use super::pieces::{
    FunctionPiece, NamedOperator, NamedState, NormalAtom, NormalBracket, NormalTensor, Piece, adjoint, function_name,
    pieces_key,
};
use super::{NormalSum, NormalTerm, SymbolMeaning};
use crate::angular::HalfInteger;
use crate::angular::tensor::Sign;
use crate::lang::tree::DefinitionKind;
use crate::num::{Effort, Scalar, Surd};
use crate::theory::names::{Binding, Names};
use crate::theory::problem::{Fault, Problem};
use crate::theory::quantities::is_fixed;
use crate::theory::resolve::has_function_of_h;
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
    states: HashMap<String, String>,
    functions: HashMap<String, String>,
    /// What every symbol stands for.
    meanings: HashMap<String, SymbolMeaning>,
    pub(super) degeneracy: Box<dyn Degeneracy + 'e>,
    /// Whether named operators that are their own adjoints stand for themselves.
    keep_names: bool,
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

    fn scalar(&mut self, term: &ScalarTerm, arguments: &Arguments) -> Expanded<NormalSum> {
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
                if let Some(shown) = term.text.strip_prefix("E(").and_then(|rest| rest.strip_suffix(')'))
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
                let mut sum = self.scalar(&variation.body, arguments)?;
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
        let mut symbol = term.text.to_string();
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
    fn inside<T>(
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
    fn state(&mut self, state: &StateTerm, arguments: &Arguments) -> Expanded<NamedState> {
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

    fn bracket(&mut self, bracket: &Bracket, arguments: &Arguments, place: Place) -> Expanded<NormalSum> {
        let kets = self.ket(&bracket.ket, arguments)?;
        let mut strings = match &bracket.operator {
            None => kets,
            Some(operator) => {
                let operators = self.operator(operator, arguments)?;
                self.joined(operators, kets, place)?
            }
        };
        let bras = adjoints(self.ket(&bracket.bra, arguments)?);
        strings = self.joined(bras, strings, place)?;
        let mut sum = NormalSum::default();
        for (term, pieces) in strings {
            let brackets = self.closed(pieces, place)?;
            sum.terms.extend(self.product(&NormalSum { terms: vec![term] }, &brackets, place)?.terms);
        }
        Ok(sum.joined())
    }

    /// The product of brackets a string stands for, with the functions of H that act on eigenstates as numbers.
    pub(super) fn closed(&mut self, pieces: Vec<Piece>, place: Place) -> Expanded<NormalSum> {
        let mut product = NormalSum::number(Surd::one());
        for mut bracket in bracketed(pieces, place) {
            while let Some(last) = bracket.pieces.last() {
                let Some(number) = self.on_eigenstate(last.clone(), &bracket.ket, place)? else { break };
                bracket.pieces.pop();
                product = self.product(&product, &number, place)?;
            }
            while let Some(first) = bracket.pieces.first() {
                let Some(number) = self.on_eigenstate(first.clone(), &bracket.bra, place)? else { break };
                bracket.pieces.remove(0);
                product = self.product(&product, &number, place)?;
            }
            // eigenstates are normalised
            if !(bracket.pieces.is_empty() && bracket.bra == bracket.ket) {
                for term in &mut product.terms {
                    term.brackets.push(bracket.clone());
                }
            }
        }
        Ok(product)
    }

    /// The number that H or a fraction of H is on an eigenstate; `None` where that is not known.
    fn on_eigenstate(&mut self, piece: Piece, state: &NamedState, place: Place) -> Expanded<Option<NormalSum>> {
        match piece {
            Piece::Hamiltonian => Ok(Some(self.energy(state))),
            Piece::Function(function) if function.function.is_none() => {
                match function.omitted.as_slice() {
                    [] => {}
                    [OmittedTerm::LevelOf(left_out)] if self.named_state(left_out)? == *state => {
                        return Ok(Some(NormalSum::default()));
                    }
                    // another state may be degenerate with this one
                    _ => return Ok(None),
                }
                let sign = if function.slope == Sign::Plus { 1 } else { -1 };
                let energy = self.energy(state).scaled(&Surd::from(sign));
                let denominator = function.constant.clone().plus(energy);
                // at its own energy a resolvent is singular, which is said when it is evaluated
                if denominator.terms.is_empty() { Ok(None) } else { Ok(Some(self.inverse(&denominator, place)?)) }
            }
            _ => Ok(None),
        }
    }

    /// Every string of the one followed by every string of the other.
    fn joined(&self, left: Strings, right: Strings, place: Place) -> Expanded<Strings> {
        self.check(left.len().saturating_mul(right.len()), place)?;
        let mut out = Strings::with_capacity(left.len() * right.len());
        for (a, first) in &left {
            for (b, second) in &right {
                out.push((a.times(b), first.iter().chain(second).cloned().collect()));
            }
        }
        Ok(out)
    }

    fn numbers(&mut self, scalar: &ScalarTerm, arguments: &Arguments) -> Expanded<Strings> {
        Ok(self.scalar(scalar, arguments)?.terms.into_iter().map(|term| (term, Vec::new())).collect())
    }

    fn ket(&mut self, term: &KetTerm, arguments: &Arguments) -> Expanded<Strings> {
        match &*term.node {
            KetNode::State(state) => {
                let mut named = self.state(state, arguments)?;
                // what is computed in a label is shown computed
                if !term.text.contains('{') {
                    named.shown = self.states.entry(named.name.clone()).or_insert(term.text.to_string()).clone();
                }
                Ok(vec![(NormalTerm::number(Surd::one()), vec![Piece::Ket(named)])])
            }
            KetNode::Applied(operator, inner) => {
                let left = self.operator(operator, arguments)?;
                let right = self.ket(inner, arguments)?;
                self.joined(left, right, term.place)
            }
            KetNode::Sum(terms) => {
                let mut sum = Strings::new();
                for inner in terms {
                    sum.extend(self.ket(inner, arguments)?);
                }
                self.check(sum.len(), term.place)?;
                Ok(sum)
            }
            KetNode::Scaled(scalar, inner) => {
                let left = self.numbers(scalar, arguments)?;
                let right = self.ket(inner, arguments)?;
                self.joined(left, right, term.place)
            }
            KetNode::Call(call) => match &call.definition.body {
                Meaning::Ket(body) => self.inside(call, arguments, term.place, |this, inner| this.ket(body, inner)),
                _ => self.refuse(term.place, "a ket is needed here".into(), ""),
            },
        }
    }

    pub(super) fn operator(&mut self, term: &OperatorTerm, arguments: &Arguments) -> Expanded<Strings> {
        let place = term.place;
        self.check(0, place)?;
        let alone = |piece: Piece| Ok(vec![(NormalTerm::number(Surd::one()), vec![piece])]);
        match &*term.node {
            OperatorNode::Scalar(scalar) => self.numbers(scalar, arguments),
            OperatorNode::Atom(atom) => alone(Piece::Atom(self.atom(atom, arguments)?)),
            OperatorNode::Tensor(tensor) => alone(Piece::Tensor(NormalTensor { term: tensor.clone(), adjoint: false })),
            OperatorNode::Hamiltonian => alone(Piece::Hamiltonian),
            OperatorNode::Adjoint(inner) => Ok(adjoints(self.operator(inner, arguments)?)),
            OperatorNode::Sum(terms) => {
                let mut sum = Strings::new();
                for inner in terms {
                    sum.extend(self.operator(inner, arguments)?);
                    self.check(sum.len(), place)?;
                }
                Ok(sum)
            }
            OperatorNode::Product(factors) => {
                let mut product = vec![(NormalTerm::number(Surd::one()), Vec::new())];
                for inner in factors {
                    let factor = self.operator(inner, arguments)?;
                    product = self.joined(product, factor, place)?;
                }
                Ok(product)
            }
            OperatorNode::Power(inner, power) => {
                let base = self.operator(inner, arguments)?;
                let mut product = vec![(NormalTerm::number(Surd::one()), Vec::new())];
                for _ in 0..*power {
                    product = self.joined(product, base.clone(), place)?;
                }
                Ok(product)
            }
            OperatorNode::Dyad(ket, bra) => {
                let left = self.ket(ket, arguments)?;
                let right = adjoints(self.ket(bra, arguments)?);
                self.joined(left, right, place)
            }
            OperatorNode::Resolvent(linear) => self.function_of_h(None, linear, arguments, place),
            OperatorNode::Function(function, linear) => self.function_of_h(Some(*function), linear, arguments, place),
            OperatorNode::Call(call) => self.called(call, arguments, place),
        }
    }

    /// A named operator; one that is a single function of H keeps its name.
    fn called(&mut self, call: &Call, arguments: &Arguments, place: Place) -> Expanded<Strings> {
        let Meaning::Operator(body) = &call.definition.body else {
            return self.refuse(place, "an operator is needed here".into(), "");
        };
        let mut strings = self.inside(call, arguments, place, |this, inner| this.operator(body, inner))?;
        if self.keep_names && !has_function_of_h(body) && is_self_adjoint(&strings) {
            let shown: Expanded<Vec<String>> =
                call.arguments.iter().map(|a| Ok(self.scalar(a, arguments)?.to_string())).collect();
            let shown = shown?.join(", ");
            let text = if shown.is_empty() {
                call.definition.name.clone()
            } else {
                format!("{}({shown})", call.definition.name)
            };
            // a single operator with another name gains nothing; brackets inside must be seen by `vary`
            let plain = strings
                .iter()
                .all(|(term, pieces)| term.brackets.is_empty() && !pieces.is_empty() && term.symbols.is_one());
            if plain && strings.len() > 1 {
                let named = Piece::Named(NamedOperator { text, expanded: strings });
                return Ok(vec![(NormalTerm::number(Surd::one()), vec![named])]);
            }
        }
        if let [(term, pieces)] = strings.as_mut_slice()
            && let [Piece::Function(function)] = pieces.as_mut_slice()
            && *term == NormalTerm::number(Surd::one())
        {
            let mut label = call.definition.name.clone();
            if !call.arguments.is_empty() {
                let shown: Expanded<Vec<String>> =
                    call.arguments.iter().map(|a| Ok(self.scalar(a, arguments)?.to_string())).collect();
                label += &format!("({})", shown?.join(", "));
            }
            let plain = FunctionPiece::written(
                function.function,
                function.constant.clone(),
                function.slope,
                function.omitted.clone(),
            );
            // a name replaces the written form, and the first name stays
            let known = self.functions.entry(function.key.clone()).or_insert_with(|| plain.label.clone());
            if *known == plain.label {
                known.clone_from(&label);
            }
            function.label.clone_from(known);
        }
        Ok(strings)
    }

    fn atom(&mut self, atom: &AtomTerm, arguments: &Arguments) -> Expanded<NormalAtom> {
        let mut numbers = Vec::with_capacity(atom.arguments.len());
        for argument in &atom.arguments {
            match self.scalar(argument, arguments)?.as_number().as_ref().and_then(Surd::as_rational) {
                Some(q) => numbers.push(q.into_owned()),
                None => {
                    let message = format!("`{}` takes whole numbers in its parentheses", atom.name);
                    return self.refuse(argument.place, message, "write for instance `C(2)_0`");
                }
            }
        }
        Ok(NormalAtom {
            name: atom.name.clone(),
            component: atom.component.clone(),
            along: atom.along.clone(),
            arguments: numbers,
            power: atom.power,
        })
    }

    fn function_of_h(
        &mut self,
        function: Option<ScalarFunction>,
        linear: &LinearInH,
        arguments: &Arguments,
        place: Place,
    ) -> Expanded<Strings> {
        let constant = self.scalar(&linear.constant, arguments)?;
        let slope = self.scalar(&linear.slope, arguments)?;
        let real = slope.as_number().and_then(|s| s.as_rational().map(std::borrow::Cow::into_owned));
        let Some(slope) = real.filter(|s| *s != 0) else {
            return self.refuse(
                place,
                "H is multiplied by something that is no plain number here".into(),
                "write the fraction with H itself, as 1/(E(g) + w - H)",
            );
        };
        let sign = if slope > 0 { Sign::Plus } else { Sign::Minus };
        // 1/(a + b H) = (1/|b|) 1/(a/|b| +- H); other functions keep their argument
        let size = Rational::from(slope.abs_ref());
        if function.is_some() && size != 1 {
            return self.refuse(
                place,
                "H has a factor in this function".into(),
                "take the factor out: ln(2 H) = ln(2) + ln(H)",
            );
        }
        let scale = Surd::from(Rational::from(size.recip_ref()));
        let mut omitted = Vec::with_capacity(linear.omitted.len());
        for state in &linear.omitted {
            omitted.push(match state {
                OmittedTerm::LevelOf(state) => OmittedTerm::LevelOf(self.state(state, arguments)?.term),
                OmittedTerm::Manifold(manifold) => OmittedTerm::Manifold(manifold.clone()),
            });
        }
        let piece = FunctionPiece::written(function, constant.scaled(&scale), sign, omitted);
        let piece = self.named_function(piece);
        Ok(vec![(NormalTerm::number(scale), vec![Piece::Function(piece)])])
    }
}

/// Whether the adjoint of a sum of strings is the same sum, whatever the order of its terms.
fn is_self_adjoint(strings: &Strings) -> bool {
    let key = |strings: &Strings| {
        let mut keys: Vec<String> = strings
            .iter()
            .map(|(term, pieces)| format!("{} {} {}", term.coefficient, term.symbols, pieces_key(pieces)))
            .collect();
        keys.sort();
        keys
    };
    key(strings) == key(&adjoints(strings.clone()))
}

/// The adjoint of every string.
fn adjoints(strings: Strings) -> Strings {
    let turned = strings.into_iter().map(|(term, pieces)| {
        let (sign, pieces) = adjoint(&pieces);
        let term = term.conj();
        let coefficient = if sign == Sign::Minus { -&term.coefficient } else { term.coefficient.clone() };
        (NormalTerm { coefficient, ..term }, pieces)
    });
    turned.collect()
}

/// Takes a string that begins with a bra and ends with a ket apart into brackets.
fn bracketed(pieces: Vec<Piece>, place: Place) -> Vec<NormalBracket> {
    let mut brackets = Vec::new();
    let mut open: Option<NamedState> = None;
    let mut inner = Vec::new();
    for piece in pieces {
        match piece {
            Piece::Bra(state) => open = Some(state),
            Piece::Ket(ket) => {
                if let Some(bra) = open.take() {
                    brackets.push(NormalBracket { bra, pieces: std::mem::take(&mut inner), ket, place });
                }
            }
            other => inner.push(other),
        }
    }
    brackets
}
