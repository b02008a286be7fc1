//! Bras, kets and brackets.

use nom::Err;

use super::expression::{Grown, Setting, begins_factor};
use super::fault::Fault;
use super::lexis::{Reading, after_token, blanks, found, name_text};
use super::tree::{Argument, Expr, ExprKind, Name, StateRef, StateRefKind};
use super::trouble::{Parsed, Wanted, fault};

impl<'a> Reading<'a> {
    /// Reads `<a| X |b>`, `<a|b>`, or a lone bra where nothing that belongs to a chain follows.
    #[inline(never)]
    pub fn bracket(&self, start: &'a str) -> Parsed<'a, Grown> {
        let Some(after) = start.strip_prefix('<') else { return self.missing(start, Wanted::Operand) };
        let (rest, (bra, bra_height)) = self.deeper(after, |rest| self.state(rest, false))?;
        let bar = blanks(rest);
        let Some(inside) = bar.strip_prefix('|') else {
            let bra = self.between(blanks(after), rest).to_owned();
            return fault(bar, after_token(bar), Fault::BraWithoutBar { bra, found: found(bar) });
        };
        let chain_start = blanks(inside);
        if let Some(after_bar) = chain_start.strip_prefix('|') {
            return self.finish(start, bra, None, bra_height, after_bar);
        }
        if !begins_factor(chain_start, Setting::Open) && !chain_start.starts_with(['-', '[', '"', '{', '\'', '^']) {
            let span = self.span(start, inside);
            return Ok((inside, self.raised(ExprKind::Bra(bra), span, bra_height, inside)?));
        }
        let (rest, chain) = self
            .operand_after(inside, bar, |rest| self.deeper(rest, |rest| self.expression(rest, Setting::BetweenBars)))?;
        let height = bra_height.max(chain.height);
        let end = blanks(rest);
        match end.as_bytes() {
            [b'|', ..] => self.finish(start, bra, Some(chain.tree), height, &end[1..]),
            [b'>', ..] => {
                let Some(ket) = as_state(*chain.tree) else {
                    return fault(chain_start, rest, Fault::NotAState);
                };
                let span = self.span(start, &end[1..]);
                let bracket = ExprKind::Bracket { bra, chain: None, ket };
                Ok((&end[1..], self.raised(bracket, span, height, end)?))
            }
            _ => {
                self.refuse_unexpected(end, b")]},:")?;
                let bra_text = self.between(start, inside).to_owned();
                let behind_ket = self.before(start).trim_end().ends_with('>');
                fault(
                    end,
                    after_token(end),
                    Fault::MissingKet { bra: self.span(start, inside), bra_text, behind_ket, found: found(end) },
                )
            }
        }
    }

    /// Reads the ket of a bracket, behind its last bar.
    fn finish(
        &self,
        start: &'a str,
        bra: StateRef,
        chain: Option<Box<Expr>>,
        height: usize,
        after_bar: &'a str,
    ) -> Parsed<'a, Grown> {
        let place = blanks(after_bar);
        if place.is_empty() || place.starts_with(['>', '|', ')', ',']) {
            return fault(place, after_token(place), Fault::EmptyKet);
        }
        let (end, (ket, ket_height)) = self.ket_state(after_bar)?;
        let span = self.span(start, end);
        Ok((end, self.raised(ExprKind::Bracket { bra, chain, ket }, span, height.max(ket_height), end)?))
    }

    /// Reads a lone `|g>`.
    #[inline(never)]
    pub fn ket(&self, start: &'a str) -> Parsed<'a, Grown> {
        let Some(after) = start.strip_prefix('|') else { return self.missing(start, Wanted::Operand) };
        let place = blanks(after);
        if !place.starts_with(|c: char| c.is_ascii_alphanumeric()) {
            return fault(start, after, Fault::StrayBar);
        }
        let (end, (state, height)) = self.ket_state(after)?;
        Ok((end, self.raised(ExprKind::Ket(state), self.span(start, end), height, end)?))
    }

    /// Reads a state and the `>` behind it.
    fn ket_state(&self, after_bar: &'a str) -> Parsed<'a, (StateRef, usize)> {
        let (rest, state) = self.deeper(after_bar, |rest| self.state(rest, true))?;
        let close = blanks(rest);
        match close.strip_prefix('>') {
            Some(end) => Ok((end, state)),
            None => {
                let ket = self.between(blanks(after_bar), rest).to_owned();
                fault(close, after_token(close), Fault::KetUnclosed { ket, found: found(close) })
            }
        }
    }

    /// Reads what stands inside a bra or ket, with the height of the tree below it.
    fn state(&self, rest: &'a str, ket: bool) -> Parsed<'a, (StateRef, usize)> {
        let start = blanks(rest);
        if start.starts_with(|c: char| c.is_ascii_digit()) {
            let label_end = start.trim_start_matches(|c: char| c.is_ascii_alphanumeric() || "^_/".contains(c));
            let label = self.between(start, label_end).to_owned();
            if ket || blanks(label_end).starts_with('|') {
                return fault(start, label_end, Fault::BareLabel { label, ket });
            }
        }
        if name_text(start).is_err() {
            return fault(start, after_token(start), Fault::NotABra(found(start)));
        }
        let (after, name) = self.name(start)?;
        let (end, kind, height) = match after.as_bytes() {
            [b'(', ..] => {
                let (end, (arguments, height)) = self.state_arguments(after)?;
                (end, StateRefKind::Named { name, arguments }, height)
            }
            [b'[', ..] => {
                let (end, (label, height)) = self.label(after)?;
                (end, StateRefKind::Labelled { system: name, label }, height)
            }
            _ => (after, StateRefKind::Named { name, arguments: Vec::new() }, 0),
        };
        Ok((end, (StateRef { kind, span: self.span(start, end) }, height)))
    }

    fn state_arguments(&self, open: &'a str) -> Parsed<'a, (Vec<Expr>, usize)> {
        let mut rest = &open[1..];
        let (mut arguments, mut height) = (Vec::new(), 0);
        loop {
            let before = if arguments.is_empty() { open } else { "," };
            let (after, argument) = self.operand_after(rest, before, |rest| self.expression(rest, Setting::Open))?;
            height = height.max(argument.height);
            arguments.push(*argument.tree);
            match blanks(after).strip_prefix(',') {
                Some(next) => rest = next,
                None => {
                    let (end, ()) = self.close(open, after, '(')?;
                    return Ok((end, (arguments, height)));
                }
            }
        }
    }

    /// Reads the closing partner of the bracket that stands at `open`.
    ///
    /// *Errors*: names the bracket that stays open, unless what stands here is a mistake of its own.
    pub fn close(&self, open: &'a str, rest: &'a str, bracket: char) -> Parsed<'a, ()> {
        let close = match bracket {
            '(' => ')',
            '[' => ']',
            _ => '}',
        };
        let place = blanks(rest);
        if let Some(end) = place.strip_prefix(close) {
            return Ok((end, ()));
        }
        self.refuse_unexpected(place, b")]},>|:")?;
        let opened = self.span(open, &open[1..]);
        fault(place, after_token(place), Fault::Unclosed { bracket, opened, found: found(place) })
    }

    /// Fails with the sentence for what stands at `place` when it could follow no expression at all,
    /// unless it is one of the `known` signs the caller speaks about itself.
    pub fn refuse_unexpected(&self, place: &'a str, known: &[u8]) -> Result<(), Err<super::trouble::Trouble>> {
        let Some(first) = place.bytes().next() else { return Ok(()) };
        if known.contains(&first) {
            return Ok(());
        }
        match self.after_expression(place) {
            Some((end, reason)) => fault(place, end, reason),
            None => Ok(()),
        }
    }

    /// The sentence for a sign that can follow no expression.
    pub fn after_expression(&self, place: &'a str) -> Option<(&'a str, Fault)> {
        let fault = match place.as_bytes() {
            [b'=', b'=', ..] => return Some((&place[2..], Fault::Relation("==".to_owned()))),
            [b'!', b'=', ..] => return Some((&place[2..], Fault::Relation("!=".to_owned()))),
            [sign @ (b'&' | b'%' | b'~' | b'@' | b'$' | b'?' | b'`' | b'#'), ..] => Fault::Sign(char::from(*sign)),
            [b'!', ..] => Fault::Factorial,
            [b'=', ..] => Fault::StrayEquals,
            [b';', ..] => Fault::Semicolon,
            [b'\\', ..] => Fault::Backslash,
            [b'\'', ..] => Fault::Prime { blank: true },
            [b'"', ..] => Fault::TextOutside,
            [b'>', ..] => Fault::StrayAngle,
            [b'|', ..] => Fault::StrayBar,
            [b'.', next, ..] if next.is_ascii_digit() => Fault::DecimalPoint,
            [b'[', ..] => {
                let before = self.before(place).trim_end();
                let word = before.trim_end_matches(|c: char| c.is_ascii_alphanumeric() || c == '_').len();
                let name_before = before[word..].starts_with(|c: char| c.is_ascii_alphabetic());
                if name_before { Fault::LabelApart } else { Fault::SquareBrackets }
            }
            [b'{', ..] => Fault::CurlyBrackets,
            [bracket @ (b')' | b']' | b'}'), ..] => Fault::NothingToClose(char::from(*bracket)),
            _ => return None,
        };
        Some((&place[1..], fault))
    }
}

/// The state an expression names, as in `<a|b>` and `<a|u(w)>`.
fn as_state(expression: Expr) -> Option<StateRef> {
    let span = expression.span;
    let kind = match expression.kind {
        ExprKind::Name(text) => StateRefKind::Named { name: Name { text, span }, arguments: Vec::new() },
        ExprKind::Labelled { system, label } => StateRefKind::Labelled { system, label },
        ExprKind::Call { name, arguments, subscript: None } => {
            let positional = arguments.into_iter().map(|argument| match argument {
                Argument::Positional(value) if !matches!(value.kind, ExprKind::Text(_) | ExprKind::List(_)) => {
                    Some(value)
                }
                _ => None,
            });
            StateRefKind::Named { name, arguments: positional.collect::<Option<Vec<Expr>>>()? }
        }
        _ => return None,
    };
    Some(StateRef { kind, span })
}
