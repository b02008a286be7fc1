//! Calls with their arguments, and labels in square brackets.

use nom::Parser;
use nom::combinator::{cut, opt};

use super::expression::{Grown, Setting};
use super::fault::Fault;
use super::lexis::{Reading, after_token, blanks, found, name_text, subscript_text, word_text};
use super::tree::{Argument, Expr, ExprKind, Label, LabelPart, Name};
use super::trouble::{Parsed, Wanted, fault};

/// The signs of the text of a label: `2^3P_1`, `2p_3/2`, `5s.6p*`.
fn is_label_sign(character: char) -> bool {
    character.is_ascii_alphanumeric() || "^_/+-.*".contains(character)
}

impl<'a> Reading<'a> {
    /// Reads `(…)` at `open` and a component behind it: the call of `name`, which begins at `start`.
    #[inline(never)]
    pub fn call(&self, start: &'a str, open: &'a str, name: Name) -> Parsed<'a, Grown> {
        let (rest, (arguments, height)) = self.arguments(open)?;
        let (end, subscript) = opt(subscript_text).parse(rest)?;
        let subscript = subscript.map(str::to_owned);
        let span = self.span(start, end);
        Ok((end, self.raised(ExprKind::Call { name, arguments, subscript }, span, height, end)?))
    }

    /// Reads a list of arguments with its brackets, and the height of the tallest.
    pub fn arguments(&self, open: &'a str) -> Parsed<'a, (Vec<Argument>, usize)> {
        let mut arguments = Vec::new();
        let (end, height) = self.listed(open, '(', &mut |rest| self.argument(rest, &mut arguments))?;
        Ok((end, (arguments, height)))
    }

    fn list(&self, open: &'a str) -> Parsed<'a, Grown> {
        let mut elements = Vec::new();
        let (end, height) = self.listed(open, '[', &mut |rest| {
            let (rest, element) = self.argument_value(rest)?;
            elements.push(*element.tree);
            Ok((rest, element.height))
        })?;
        Ok((end, self.raised(ExprKind::List(elements), self.span(open, end), height, end)?))
    }

    /// Reads `item, item, …` between the bracket at `open` and its partner; `item` keeps what it reads and gives its height.
    fn listed(
        &self,
        open: &'a str,
        bracket: char,
        item: &mut dyn FnMut(&'a str) -> Parsed<'a, usize>,
    ) -> Parsed<'a, usize> {
        let mut height = 0;
        let mut rest = &open[1..];
        let close = if bracket == '(' { ')' } else { ']' };
        if let Some(end) = blanks(rest).strip_prefix(close) {
            return Ok((end, height));
        }
        let mut opener = open;
        loop {
            let (after, tall) = self.operand_after(rest, opener, &mut *item)?;
            height = height.max(tall);
            let comma = blanks(after);
            let Some(next) = comma.strip_prefix(',') else {
                if bracket == '(' && comma.starts_with('=') && !comma.starts_with("==") {
                    return fault(comma, &comma[1..], Fault::NoComma);
                }
                let (end, ()) = self.close(open, after, bracket)?;
                return Ok((end, height));
            };
            if blanks(next).starts_with(close) {
                return fault(comma, next, Fault::TrailingComma);
            }
            (rest, opener) = (next, comma);
        }
    }

    // The forms are kept out of line: their values are large, and nested calls must not carry all of them on the stack.
    fn argument(&self, rest: &'a str, arguments: &mut Vec<Argument>) -> Parsed<'a, usize> {
        let start = blanks(rest);
        if let Some((after, relation)) = relation_after_name(start) {
            let (_, name) = self.name(start)?;
            let rest = &after[relation.length()..];
            return match relation {
                Relation::Equals => self.named_argument(rest, after, name, arguments),
                Relation::In => self.range_argument(rest, name, arguments),
                Relation::At => self.point_argument(rest, name, arguments),
            };
        }
        if begins_level(start) {
            return self.level_argument(start, arguments);
        }
        let (end, value) = self.argument_value(start)?;
        arguments.push(Argument::Positional(*value.tree));
        Ok((end, value.height))
    }

    /// `Z=1`; `equals` begins with the `=`.
    #[inline(never)]
    fn named_argument(
        &self,
        rest: &'a str,
        equals: &'a str,
        name: Name,
        arguments: &mut Vec<Argument>,
    ) -> Parsed<'a, usize> {
        let (end, value) = self.operand_after(rest, equals, |rest| self.argument_value(rest))?;
        arguments.push(Argument::Named { name, value: *value.tree });
        Ok((end, value.height))
    }

    /// `w in a .. b`
    #[inline(never)]
    fn range_argument(&self, rest: &'a str, variable: Name, arguments: &mut Vec<Argument>) -> Parsed<'a, usize> {
        let (rest, from) = cut(|rest| self.expression(rest, Setting::Open)).parse(rest)?;
        let (rest, dots) = cut(|rest| self.symbol(rest, "..", Wanted::Dots)).parse(rest)?;
        let (end, to) = self.operand_after(rest, dots, |rest| self.expression(rest, Setting::Open))?;
        arguments.push(Argument::Range { variable, from: *from.tree, to: *to.tree });
        Ok((end, from.height.max(to.height)))
    }

    /// `w at w0`
    #[inline(never)]
    fn point_argument(&self, rest: &'a str, variable: Name, arguments: &mut Vec<Argument>) -> Parsed<'a, usize> {
        let (end, point) = cut(|rest| self.expression(rest, Setting::Open)).parse(rest)?;
        arguments.push(Argument::At { variable, point: *point.tree });
        Ok((end, point.height))
    }

    /// `2^3P_0: 31.9 GHz`
    #[inline(never)]
    fn level_argument(&self, start: &'a str, arguments: &mut Vec<Argument>) -> Parsed<'a, usize> {
        let (rest, (parts, below)) = self.label_parts(start)?;
        let label = Label { parts, options: Vec::new(), span: self.span(start, rest) };
        let (rest, _) = self.symbol(rest, ":", Wanted::Colon)?;
        let (end, value) = self.operand_after(rest, ":", |rest| self.expression(rest, Setting::Open))?;
        arguments.push(Argument::Level { label, value: *value.tree });
        Ok((end, below.max(value.height)))
    }

    /// Reads a value where file names and lists may stand too.
    fn argument_value(&self, rest: &'a str) -> Parsed<'a, Grown> {
        let start = blanks(rest);
        match start.as_bytes() {
            [b'"', ..] => {
                let (end, text) = self.quoted(start)?;
                Ok((end, Grown::leaf(ExprKind::Text(text.to_owned()), self.span(start, end))))
            }
            [b'[', ..] => self.deeper(start, |rest| self.list(rest)),
            _ => self.expression(start, Setting::Open),
        }
    }

    #[inline(never)]
    /// Reads `[1s]`, `[2p, m=1]`, `[{n}p]`, `[n=7, l=5, m=2]` at `open`, with the height of what is computed in it.
    pub fn label(&self, open: &'a str) -> Parsed<'a, (Label, usize)> {
        let (mut parts, mut options, mut height) = (Vec::new(), Vec::new(), 0);
        let mut rest = blanks(&open[1..]);
        if !begins_option(rest) {
            (rest, (parts, height)) = self.label_parts(rest)?;
            let next = blanks(rest);
            if next.len() < rest.len() && next.starts_with(|c: char| is_label_sign(c) || c == '{') {
                return fault(rest, next, Fault::LabelBlank);
            }
            match next.strip_prefix(',') {
                Some(after) => rest = after,
                None => return self.finished_label(open, rest, parts, options, height),
            }
        }
        loop {
            let start = blanks(rest);
            if !begins_option(start) {
                return fault(start, after_token(start), Fault::LabelOption);
            }
            let (after, name) = self.name(start)?;
            let (after, equals) = self.symbol(after, "=", Wanted::Equals)?;
            let (after, value) = self
                .operand_after(after, equals, |rest| self.deeper(rest, |rest| self.expression(rest, Setting::Open)))?;
            height = height.max(value.height);
            options.push((name, *value.tree));
            match blanks(after).strip_prefix(',') {
                Some(next) => rest = next,
                None => return self.finished_label(open, after, parts, options, height),
            }
        }
    }

    fn finished_label(
        &self,
        open: &'a str,
        rest: &'a str,
        parts: Vec<LabelPart>,
        options: Vec<(Name, Expr)>,
        height: usize,
    ) -> Parsed<'a, (Label, usize)> {
        let place = blanks(rest);
        let Some(end) = place.strip_prefix(']') else {
            let opened = self.span(open, &open[1..]);
            return fault(place, after_token(place), Fault::Unclosed { bracket: '[', opened, found: found(place) });
        };
        Ok((end, (Label { parts, options, span: self.span(open, end) }, height)))
    }

    fn label_parts(&self, start: &'a str) -> Parsed<'a, (Vec<LabelPart>, usize)> {
        let (mut parts, mut height, mut rest) = (Vec::new(), 0, start);
        loop {
            if let Some(inside) = rest.strip_prefix('{') {
                let (after, value) = self.operand_after(inside, rest, |rest| {
                    self.deeper(rest, |rest| self.expression(rest, Setting::Open))
                })?;
                let (end, ()) = self.close(rest, after, '{')?;
                height = height.max(value.height);
                parts.push(LabelPart::Computed(*value.tree));
                rest = end;
                continue;
            }
            let after = rest.trim_start_matches(is_label_sign);
            if after.len() == rest.len() {
                break;
            }
            parts.push(LabelPart::Text(self.between(rest, after).to_owned()));
            rest = after;
        }
        if parts.is_empty() {
            return fault(rest, after_token(rest), Fault::EmptyLabel);
        }
        Ok((rest, (parts, height)))
    }
}

#[derive(Clone, Copy)]
enum Relation {
    Equals,
    In,
    At,
}

impl Relation {
    fn length(self) -> usize {
        match self {
            Relation::Equals => 1,
            Relation::In | Relation::At => 2,
        }
    }
}

/// Looks for `=`, `in` or `at` behind a name; gives the text that begins with it.
fn relation_after_name(start: &str) -> Option<(&str, Relation)> {
    let (after, _) = name_text(start).ok()?;
    let place = blanks(after);
    match place.as_bytes() {
        [b'=', b'=', ..] => None,
        [b'=', ..] => Some((place, Relation::Equals)),
        _ => match word_text(place) {
            Ok((_, "in")) => Some((place, Relation::In)),
            Ok((_, "at")) => Some((place, Relation::At)),
            _ => None,
        },
    }
}

fn begins_option(start: &str) -> bool {
    matches!(relation_after_name(start), Some((_, Relation::Equals)))
}

/// Says whether a label with a colon behind it begins here: `2^3P_0: 31.9 GHz`.
fn begins_level(start: &str) -> bool {
    let mut rest = start;
    loop {
        let after = rest.trim_start_matches(is_label_sign);
        rest = match after.strip_prefix('{') {
            Some(inside) => match inside.find(['}', '(', ')', ',']) {
                Some(end) if inside[end..].starts_with('}') => &inside[end + 1..],
                _ => return false,
            },
            None if after.len() < start.len() => return blanks(after).starts_with(':'),
            None => return false,
        };
    }
}
