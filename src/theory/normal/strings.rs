//! Multiplies chains of operators out: strings of pieces between bras and kets.

use super::expand::{Arguments, Expanded, Expander, Strings};
use super::pieces::{
    FunctionPiece, NamedOperator, NamedState, NormalAtom, NormalBracket, NormalTensor, Piece, adjoint, pieces_key,
};
use super::{NormalSum, NormalTerm};
use crate::angular::tensor::Sign;
use crate::num::Surd;
use crate::theory::dimensions::as_written;
use crate::theory::resolve::has_function_of_h;
use crate::theory::terms::*;
use rug::Rational;

impl Expander<'_> {
    pub(super) fn bracket(&mut self, bracket: &Bracket, arguments: &Arguments, place: Place) -> Expanded<NormalSum> {
        let kets = self.ket(&bracket.ket, arguments)?;
        let mut strings = match &bracket.operator {
            None => kets,
            Some(operator) => {
                let operators = self.operator(operator, arguments)?;
                self.joined(operators, kets, place)?
            }
        };
        let bras = {
            let kets = self.ket(&bracket.bra, arguments)?;
            self.adjoints(kets)
        };
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

    /// The adjoint of every string, with a note of what is taken for real.
    fn adjoints(&mut self, strings: Strings) -> Strings {
        for (term, pieces) in &strings {
            self.note_conjugate(&NormalSum { terms: vec![term.clone()] });
            for piece in pieces {
                if let Piece::Function(function) = piece {
                    self.note_conjugate(&function.constant);
                }
            }
        }
        adjoints(strings)
    }

    fn numbers(&mut self, scalar: &ScalarTerm, arguments: &Arguments) -> Expanded<Strings> {
        Ok(self.scalar(scalar, arguments)?.terms.into_iter().map(|term| (term, Vec::new())).collect())
    }

    fn ket(&mut self, term: &KetTerm, arguments: &Arguments) -> Expanded<Strings> {
        match &*term.node {
            KetNode::State(state) => {
                let mut named = self.state(state, arguments)?;
                // what is computed in a label is shown computed
                let written = as_written(&term.text);
                if !written.contains('{') {
                    named.shown = self.states.entry(named.name.clone()).or_insert(written.to_string()).clone();
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
            OperatorNode::Adjoint(inner) => {
                let strings = self.operator(inner, arguments)?;
                Ok(self.adjoints(strings))
            }
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
                let right = self.ket(bra, arguments)?;
                let right = self.adjoints(right);
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
                call.arguments.iter().map(|a| Ok(bare(self.scalar(a, arguments)?.to_string()))).collect();
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
                    call.arguments.iter().map(|a| Ok(bare(self.scalar(a, arguments)?.to_string()))).collect();
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

/// A text without a pair of parentheses around all of it.
fn bare(text: String) -> String {
    match text.strip_prefix('(').and_then(|rest| rest.strip_suffix(')')) {
        Some(inner) if !inner.contains(['(', ')']) => inner.to_string(),
        _ => text,
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
