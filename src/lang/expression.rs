//! Sums, products, powers and primes: from the loosest binding to the tightest.
//!
//! ```text
//! sum     = term { ("+" | "-") term }
//! term    = "-" term | product { "without" name }
//! product = power { ("*" | "/") signed | power }
//! power   = primary { "'" } [ "^" exponent ]
//! ```

use nom::combinator::{cut, opt};
use nom::{Err, Parser};

use super::fault::Fault;
use super::lexis::{Reading, TALLEST_TREE, after_token, blanks, found, name_text, word_text};
use super::tree::{Expr, ExprKind, Operation, Span};
use super::trouble::{Parsed, Trouble, Wanted, fault};
use super::vocabulary;

/// A tree with its height, so that no tree grows higher than what recursion over it can bear.
#[derive(Debug)]
pub(super) struct Grown {
    pub tree: Box<Expr>,
    pub height: usize,
}

impl Grown {
    pub fn leaf(kind: ExprKind, span: Span) -> Self {
        Grown { tree: Box::new(Expr { kind, span }), height: 1 }
    }
}

/// Where an expression stands.
#[derive(Clone, Copy, PartialEq, Eq)]
pub(super) enum Setting {
    /// Anywhere a `|` opens a ket.
    Open,
    /// Directly between the bars of a bracket, where a `|` ends the chain.
    BetweenBars,
}

impl<'a> Reading<'a> {
    /// Reads an expression; blanks before it are skipped.
    pub fn expression(&self, rest: &'a str, setting: Setting) -> Parsed<'a, Grown> {
        let (mut rest, mut sum) = self.term(rest, setting)?;
        loop {
            let start = blanks(rest);
            let operation = match start.as_bytes() {
                [b'+', b'-', ..] => return fault(start, &start[2..], Fault::PlusMinus),
                [b'+', ..] => Operation::Add,
                [b'-', ..] => Operation::Subtract,
                _ => return Ok((rest, sum)),
            };
            let (after, right) = self.operand_after(&start[1..], start, |rest| self.term(rest, setting))?;
            sum = self.joined(operation, sum, right, start)?;
            rest = after;
        }
    }

    /// Reads an expression that is a single product, such as a unit: `MHz`, `cm^-1`.
    pub fn product_only(&self, rest: &'a str) -> Parsed<'a, Grown> {
        self.product(rest, Setting::Open)
    }

    fn term(&self, rest: &'a str, setting: Setting) -> Parsed<'a, Grown> {
        let start = blanks(rest);
        if let Some(after) = start.strip_prefix('-') {
            let (end, inner) =
                self.operand_after(after, start, |rest| self.deeper(rest, |rest| self.term(rest, setting)))?;
            return self.negated(start, end, inner);
        }
        let (mut rest, mut body) = self.product(start, setting)?;
        while let (after, Some("without")) = opt(word_text).parse(blanks(rest))? {
            let (end, manifold) = cut(|rest| self.name(rest)).parse(after)?;
            let span = body.tree.span.to(manifold.span);
            body = self.raised(ExprKind::Without { body: body.tree, manifold }, span, body.height, end)?;
            rest = end;
        }
        Ok((rest, body))
    }

    fn negated(&self, start: &'a str, end: &'a str, inner: Grown) -> Parsed<'a, Grown> {
        let span = Span::new(self.span(start, end).start, inner.tree.span.end);
        Ok((end, self.raised(ExprKind::Negate(inner.tree), span, inner.height, end)?))
    }

    fn product(&self, rest: &'a str, setting: Setting) -> Parsed<'a, Grown> {
        let (mut rest, mut product) = self.power(rest, setting)?;
        loop {
            let start = blanks(rest);
            let operation = match start.as_bytes() {
                [b'*', b'*', ..] => return fault(start, &start[2..], Fault::DoubleStar),
                [b'*', ..] => Operation::Multiply,
                [b'/', ..] => Operation::Divide,
                _ if begins_factor(start, setting) => Operation::Juxtapose,
                _ => return Ok((rest, product)),
            };
            let (after, right) = if operation == Operation::Juxtapose {
                if start.starts_with(|c: char| c.is_ascii_digit()) && ends_in_number(&product.tree) {
                    return fault(start, after_token(start), Fault::NumbersSideBySide);
                }
                self.power(start, setting)?
            } else {
                self.operand_after(&start[1..], start, |rest| self.signed(rest, setting))?
            };
            product = self.joined(operation, product, right, start)?;
            rest = after;
        }
    }

    /// A factor after an explicit `*` or `/`, where a sign may stand: `a * -b`.
    fn signed(&self, rest: &'a str, setting: Setting) -> Parsed<'a, Grown> {
        let start = blanks(rest);
        let Some(after) = start.strip_prefix('-') else { return self.power(start, setting) };
        let (end, inner) =
            self.operand_after(after, start, |rest| self.deeper(rest, |rest| self.signed(rest, setting)))?;
        self.negated(start, end, inner)
    }

    fn power(&self, rest: &'a str, setting: Setting) -> Parsed<'a, Grown> {
        let start = blanks(rest);
        if setting == Setting::BetweenBars && start.starts_with('|') {
            return self.missing(start, Wanted::Operand);
        }
        let (rest, base) = self.primed(start)?;
        let caret = blanks(rest);
        let Some(after) = caret.strip_prefix('^') else { return Ok((rest, base)) };
        let (end, exponent) = self.operand_after(after, caret, |rest| self.exponent(rest))?;
        let power = self.joined(Operation::Power, base, exponent, caret)?;
        Ok((end, power))
    }

    fn primed(&self, start: &'a str) -> Parsed<'a, Grown> {
        let (mut rest, mut base) = self.primary(start)?;
        while let Some(after) = rest.strip_prefix('\'') {
            let span = self.span(start, after);
            base = self.raised(ExprKind::Primed(base.tree), span, base.height, after)?;
            rest = after;
        }
        Ok((rest, base))
    }

    /// `^` binds to the right: `a^b^c` is `a^(b^c)`; a sign belongs to the exponent: `a^-2`.
    fn exponent(&self, rest: &'a str) -> Parsed<'a, Grown> {
        let start = blanks(rest);
        if let Some(after) = start.strip_prefix('-') {
            let (end, inner) =
                self.operand_after(after, start, |rest| self.deeper(rest, |rest| self.exponent(rest)))?;
            return self.negated(start, end, inner);
        }
        let (rest, base) = if start.starts_with(|c: char| c.is_ascii_digit()) {
            let (after, number) = self.number(start, true)?;
            (after, Grown::leaf(number, self.span(start, after)))
        } else {
            self.primary(start)?
        };
        if let Some(after) = rest.strip_prefix('\'') {
            return fault(rest, after, Fault::PrimeAfterPower);
        }
        let caret = blanks(rest);
        let Some(after) = caret.strip_prefix('^') else { return Ok((rest, base)) };
        let (end, exponent) = self.operand_after(after, caret, |rest| self.deeper(rest, |rest| self.exponent(rest)))?;
        Ok((end, self.joined(Operation::Power, base, exponent, caret)?))
    }

    fn primary(&self, start: &'a str) -> Parsed<'a, Grown> {
        match start.bytes().next() {
            Some(b'0'..=b'9') => self.number_literal(start),
            Some(b'a'..=b'z' | b'A'..=b'Z') => self.named(start),
            Some(b'(') => self.parenthesised(start),
            Some(b'<') => self.bracket(start),
            Some(b'|') => self.ket(start),
            _ => self.no_operand(start),
        }
    }

    #[inline(never)]
    fn number_literal(&self, start: &'a str) -> Parsed<'a, Grown> {
        let (after, kind) = self.number(start, false)?;
        Ok((after, Grown::leaf(kind, self.span(start, after))))
    }

    #[inline(never)]
    fn named(&self, start: &'a str) -> Parsed<'a, Grown> {
        let (after, text) = name_text(start)?;
        if vocabulary::is_reserved(text) {
            let begins_entry = vocabulary::is_entry_word(text);
            return fault(start, after, Fault::Reserved { word: text.to_owned(), begins_entry });
        }
        let name = super::tree::Name { text: text.to_owned(), span: self.span(start, after) };
        match after.as_bytes() {
            [b'(', ..] => self.deeper(after, |rest| self.call(start, rest, name)),
            [b'[', ..] => {
                let (end, (label, height)) = self.deeper(after, |rest| self.label(rest))?;
                let span = self.span(start, end);
                Ok((end, self.raised(ExprKind::Labelled { system: name, label }, span, height, end)?))
            }
            [b'.', next, ..] if next.is_ascii_alphabetic() => {
                let field_start = &after[1..];
                let (end, field) = word_text(field_start)?;
                let field = super::tree::Name { text: field.to_owned(), span: self.span(field_start, end) };
                Ok((end, Grown::leaf(ExprKind::Member { owner: name, field }, self.span(start, end))))
            }
            _ => Ok((after, Grown::leaf(ExprKind::Name(name.text), name.span))),
        }
    }

    #[inline(never)]
    fn parenthesised(&self, start: &'a str) -> Parsed<'a, Grown> {
        let Some(after) = start.strip_prefix('(') else { return self.missing(start, Wanted::Operand) };
        let (rest, mut inner) =
            self.operand_after(after, start, |rest| self.deeper(rest, |rest| self.expression(rest, Setting::Open)))?;
        let (end, ()) = self.close(start, rest, '(')?;
        inner.tree.span = self.span(start, end);
        Ok((end, inner))
    }

    /// Says why no term can begin here, where that is known.
    #[inline(never)]
    fn no_operand(&self, start: &'a str) -> Parsed<'a, Grown> {
        let known = match start.as_bytes() {
            [b'.', next, ..] if next.is_ascii_digit() => Fault::DecimalPoint,
            [b'[', ..] => Fault::SquareBrackets,
            [b'{', ..] => Fault::CurlyBrackets,
            [b'\'', ..] => Fault::Prime { blank: false },
            [b'"', ..] => Fault::TextOutside,
            [b'\\', ..] => Fault::Backslash,
            [b'+', ..] => Fault::LeadingPlus,
            _ => return self.missing(start, Wanted::Operand),
        };
        fault(start, &start[1..], known)
    }

    /// Reads what must follow an operator or an opening bracket; from here on there is no other way to read the text.
    pub fn operand_after<T>(
        &self,
        rest: &'a str,
        operator: &'a str,
        parser: impl FnOnce(&'a str) -> Parsed<'a, T>,
    ) -> Parsed<'a, T> {
        match parser(rest) {
            Err(Err::Error(trouble)) if trouble.left == blanks(rest).len() => {
                let place = blanks(rest);
                let after = Some(if operator.starts_with("..") { ".." } else { &operator[..1] }.to_owned());
                fault(place, after_token(place), Fault::NoOperand { after, found: found(place) })
            }
            Err(Err::Error(trouble)) => Err(Err::Failure(trouble)),
            answer => answer,
        }
    }

    /// Joins two operands, `place` being where the operator stands.
    fn joined(&self, operation: Operation, left: Grown, right: Grown, place: &'a str) -> Result<Grown, Err<Trouble>> {
        let span = left.tree.span.to(right.tree.span);
        let height = left.height.max(right.height);
        self.raised(ExprKind::Binary { operation, left: left.tree, right: right.tree }, span, height, place)
    }

    /// Puts a node upon a tree of height `below`.
    ///
    /// *Errors*: when the tree would grow too high.
    pub fn raised(&self, kind: ExprKind, span: Span, below: usize, place: &'a str) -> Result<Grown, Err<Trouble>> {
        let height = below + 1;
        if height > TALLEST_TREE {
            return fault(place, after_token(place), Fault::TooManyTerms { limit: TALLEST_TREE });
        }
        Ok(Grown { tree: Box::new(Expr { kind, span }), height })
    }

    /// The text before a place.
    pub fn before(&self, rest: &str) -> &'a str {
        &self.text()[..self.text().len() - rest.len()]
    }
}

/// Says whether a factor begins here, side by side with what stands before.
pub(super) fn begins_factor(start: &str, setting: Setting) -> bool {
    match start.as_bytes() {
        [b'(' | b'<' | b'0'..=b'9', ..] => true,
        [b'|', ..] => setting == Setting::Open,
        [first, ..] if first.is_ascii_alphabetic() => match word_text(start) {
            Ok((after, word)) => {
                // The last line of a budget begins with `measured:`.
                let begins_line = word == "measured" && blanks(after).starts_with(':');
                !vocabulary::is_reserved(word) && !begins_line
            }
            Err(_) => false,
        },
        _ => false,
    }
}

/// Says whether the last factor of a product is a number as it stands: an exponent is none, `r^-3 1/2` is a product.
fn ends_in_number(product: &Expr) -> bool {
    match &product.kind {
        ExprKind::Number(_) | ExprKind::Measured { .. } => true,
        ExprKind::Binary { operation: Operation::Power, .. } => false,
        ExprKind::Binary { right, .. } => ends_in_number(right),
        _ => false,
    }
}
