//! The smallest pieces: blanks, names, numbers, quoted texts; and the state of one reading of a text.

use std::cell::Cell;

use nom::branch::alt;
use nom::bytes::complete::{tag, take_while, take_while1};
use nom::character::complete::{anychar, digit1, one_of, satisfy};
use nom::combinator::{opt, recognize, verify};
use nom::sequence::{pair, preceded, terminated};
use nom::{Err, Parser};

use super::fault::{Fault, Found};
use super::tree::{ExprKind, Name, Span};
use super::trouble::{Parsed, Trouble, Wanted, WantedSet, fault};
use super::vocabulary;

/// The longest entry that is read, in bytes.
pub const LONGEST_ENTRY: usize = 256 << 10;
/// The most digits of one number.
pub const LONGEST_NUMBER: usize = 100_000;
/// The largest power of ten in a number's `e` part.
pub const LARGEST_EXPONENT: u32 = 100_000;
/// How deep brackets, signs, powers and labels may be nested.
pub const DEEPEST_NESTING: usize = 100;
/// How high the tree of an expression may grow: bounds the recursion of everything that walks it.
pub const TALLEST_TREE: usize = 500;

/// One reading of one text: knows places, counts nesting, remembers what was wanted where reading got furthest.
pub(super) struct Reading<'a> {
    text: &'a str,
    depth: Cell<usize>,
    furthest: Cell<(usize, WantedSet)>,
}

impl<'a> Reading<'a> {
    pub fn new(text: &'a str) -> Self {
        Reading { text, depth: Cell::new(0), furthest: Cell::new((text.len(), WantedSet::default())) }
    }

    pub fn text(&self) -> &'a str {
        self.text
    }

    fn place(&self, rest: &str) -> usize {
        self.text.len() - rest.len()
    }

    /// The span from one rest of the text to a later one.
    pub fn span(&self, from: &str, to: &str) -> Span {
        Span::new(self.place(from), self.place(to))
    }

    /// The text from one rest to a later one.
    pub fn between(&self, from: &'a str, to: &str) -> &'a str {
        &from[..from.len() - to.len()]
    }

    /// What was wanted at the place, if reading got nowhere beyond it.
    pub fn wanted_at(&self, left: usize) -> WantedSet {
        let (furthest, wanted) = self.furthest.get();
        if furthest == left { wanted } else { WantedSet::default() }
    }

    /// Fails for lack of something; the want is remembered even when a caller goes on without it.
    pub fn missing<T>(&self, rest: &'a str, wanted: Wanted) -> Parsed<'a, T> {
        let (left, known) = self.furthest.get();
        if rest.len() < left {
            self.furthest.set((rest.len(), wanted.into()));
        } else if rest.len() == left {
            self.furthest.set((left, known.joined(wanted.into())));
        }
        Err(Err::Error(Trouble::wanted(rest, wanted)))
    }

    /// Reads blanks, then a symbol.
    pub fn symbol(&self, rest: &'a str, symbol: &'static str, wanted: Wanted) -> Parsed<'a, &'a str> {
        let start = blanks(rest);
        match tag::<_, _, Trouble>(symbol).parse(start) {
            Ok(found) => Ok(found),
            Err(_) => self.missing(start, wanted),
        }
    }

    /// Reads blanks, then a whole word.
    pub fn keyword(&self, rest: &'a str, word: &'static str, wanted: Wanted) -> Parsed<'a, &'a str> {
        let start = blanks(rest);
        match verify(word_text, |found: &str| found == word).parse(start) {
            Ok(found) => Ok(found),
            Err(_) => self.missing(start, wanted),
        }
    }

    /// Runs a parser one level of nesting deeper.
    ///
    /// *Errors*: beyond the deepest nesting, before any further recursion.
    pub fn deeper<T>(&self, rest: &'a str, parser: impl FnOnce(&'a str) -> Parsed<'a, T>) -> Parsed<'a, T> {
        if self.depth.get() >= DEEPEST_NESTING {
            let start = blanks(rest);
            return fault(start, after_token(start), Fault::TooDeep { limit: DEEPEST_NESTING });
        }
        self.depth.set(self.depth.get() + 1);
        let answer = parser(rest);
        self.depth.set(self.depth.get() - 1);
        answer
    }

    /// Reads blanks, then a name that is not a word of the language.
    pub fn name(&self, rest: &'a str) -> Parsed<'a, Name> {
        let start = blanks(rest);
        let Ok((after, text)) = name_text(start) else { return self.missing(start, Wanted::Name) };
        if vocabulary::is_reserved(text) || vocabulary::is_command(text) {
            let begins_entry = vocabulary::is_entry_word(text);
            if vocabulary::is_command(text) {
                return fault(start, after, Fault::CommandAsName(text.to_owned()));
            }
            return fault(start, after, Fault::Reserved { word: text.to_owned(), begins_entry });
        }
        Ok((after, Name { text: text.to_owned(), span: self.span(start, after) }))
    }

    /// Reads blanks, then a text in quotes; gives what stands between them.
    pub fn quoted(&self, rest: &'a str) -> Parsed<'a, &'a str> {
        let start = blanks(rest);
        let Some(inside) = start.strip_prefix('"') else { return self.missing(start, Wanted::QuotedText) };
        let (after, text) = take_while(|c| c != '"' && c != '\n').parse(inside)?;
        match after.strip_prefix('"') {
            Some(after) => Ok((after, text)),
            None => fault(start, after, Fault::UnclosedText),
        }
    }

    /// Reads a number directly at `rest`; with `plain` no uncertainty is looked for (as in an exponent).
    pub fn number(&self, rest: &'a str, plain: bool) -> Parsed<'a, ExprKind> {
        let (after, mantissa) = self.mantissa(rest)?;
        let (after, concise) = if plain { (after, None) } else { opt(concise_digits).parse(after)? };
        let (after, exponent) = self.exponent_part(after)?;
        if let Some(digits) = concise {
            let uncertainty = format!("{}{exponent}", in_last_digits(mantissa, digits));
            return Ok((after, ExprKind::Measured { value: format!("{mantissa}{exponent}"), uncertainty }));
        }
        let value = self.between(rest, after);
        if plain {
            return Ok((after, ExprKind::Number(value.to_owned())));
        }
        self.refuse_doubtful_brackets(rest, after, mantissa, exponent)?;
        if let Ok((sign_after, _)) = tag::<_, _, Trouble>("+-").parse(blanks(after)) {
            let start = blanks(sign_after);
            if !start.starts_with(|c: char| c.is_ascii_digit()) {
                return fault(blanks(after), sign_after, Fault::PlusMinus);
            }
            let (after, _) = self.mantissa(start)?;
            let (after, _) = self.exponent_part(after)?;
            let uncertainty = self.between(start, after).to_owned();
            return Ok((after, ExprKind::Measured { value: value.to_owned(), uncertainty }));
        }
        Ok((after, ExprKind::Number(value.to_owned())))
    }

    fn mantissa(&self, rest: &'a str) -> Parsed<'a, &'a str> {
        let fraction = preceded(tag("."), digit1);
        let (after, text) = recognize(pair(digit1, opt(fraction))).parse(rest)?;
        if after.starts_with('.') && !after.starts_with("..") {
            return fault(after, &after[1..], Fault::DecimalPoint);
        }
        if text.len() > LONGEST_NUMBER {
            return fault(rest, after, Fault::LiteralTooLong { digits: text.len(), limit: LONGEST_NUMBER });
        }
        Ok((after, text))
    }

    /// Reads `e-3` directly at `rest`, or nothing.
    fn exponent_part(&self, rest: &'a str) -> Parsed<'a, &'a str> {
        let part = recognize((one_of("eE"), opt(one_of("+-")), digit1::<&str, Trouble>));
        let (after, text) = opt(part).parse(rest)?;
        let Some(text) = text else { return Ok((rest, "")) };
        let digits = text.trim_start_matches(['e', 'E', '+', '-']).trim_start_matches('0');
        let small = digits.is_empty() || digits.parse::<u32>().is_ok_and(|power| power <= LARGEST_EXPONENT);
        if !small {
            return fault(rest, after, Fault::ExponentTooLarge { limit: LARGEST_EXPONENT });
        }
        Ok((after, text))
    }

    /// `1.5(1.2)` and `1.5e3(2)` could be read two ways.
    fn refuse_doubtful_brackets(
        &self,
        rest: &'a str,
        after: &'a str,
        mantissa: &str,
        exponent: &str,
    ) -> Result<(), Err<Trouble>> {
        let Ok((end, inside)) = bracketed_number(after) else { return Ok(()) };
        let uncertainty = inside.to_owned();
        if exponent.is_empty() || uncertainty.contains('.') {
            return fault(
                rest,
                end,
                Fault::ConciseWithPoint { value: self.between(rest, after).to_owned(), uncertainty },
            );
        }
        let (mantissa, exponent) = (mantissa.to_owned(), exponent.to_owned());
        fault(rest, end, Fault::ConciseAfterExponent { mantissa, exponent, uncertainty })
    }
}

/// Skips blanks, line ends and comments.
pub(super) fn blanks(rest: &str) -> &str {
    let mut rest = rest.trim_start_matches([' ', '\t', '\r', '\n']);
    while rest.starts_with('#') {
        rest = rest.find('\n').map_or("", |end| &rest[end..]);
        rest = rest.trim_start_matches([' ', '\t', '\r', '\n']);
    }
    rest
}

fn is_word_part(character: char) -> bool {
    character.is_ascii_alphanumeric() || character == '_'
}

/// Letters, digits and underscores, beginning with a letter.
pub(super) fn word_text(rest: &str) -> Parsed<'_, &str> {
    recognize(pair(satisfy(|c| c.is_ascii_alphabetic()), take_while(is_word_part))).parse(rest)
}

/// A word, with a signed component where it ends in `_`: `D_z`, `D_+1`.
pub(super) fn name_text(rest: &str) -> Parsed<'_, &str> {
    let (after, text) = word_text(rest)?;
    if !text.ends_with('_') {
        return Ok((after, text));
    }
    match recognize(pair(one_of("+-"), digit1::<&str, Trouble>)).parse(after) {
        Ok((end, _)) => Ok((end, &rest[..rest.len() - end.len()])),
        Err(_) => Ok((after, text)),
    }
}

/// The component after a call, as in `C(2)_0`, `C(1)_+1`, `C(k)_q`.
pub(super) fn subscript_text(rest: &str) -> Parsed<'_, &str> {
    let signed = recognize(pair(opt(one_of("+-")), take_while1(|c: char| c.is_ascii_alphanumeric())));
    preceded(tag("_"), signed).parse(rest)
}

fn concise_digits(rest: &str) -> Parsed<'_, &str> {
    preceded(tag("("), terminated(digit1, tag(")"))).parse(rest)
}

fn bracketed_number(rest: &str) -> Parsed<'_, &str> {
    let number = recognize(pair(digit1, opt(preceded(tag("."), digit1))));
    preceded(tag("("), terminated(number, tag(")"))).parse(rest)
}

/// Spells an uncertainty given in the last digits of a decimal: `2` in the last digit of `1.5` is `0.2`.
fn in_last_digits(decimal: &str, digits: &str) -> String {
    let places = decimal.split_once('.').map_or(0, |(_, fraction)| fraction.len());
    if places == 0 {
        return digits.to_owned();
    }
    let padded = format!("{digits:0>width$}", width = places + 1);
    let (whole, fraction) = padded.split_at(padded.len() - places);
    format!("{whole}.{fraction}")
}

/// The rest of the text after the token that begins `rest`: a word, a number, or one character.
pub(super) fn after_token(rest: &str) -> &str {
    token(rest).map_or(rest, |(after, _)| after)
}

fn token(rest: &str) -> Parsed<'_, &str> {
    alt((take_while1(is_word_part), recognize(anychar))).parse(rest)
}

/// Names what stands at the beginning of `rest`.
pub(super) fn found(rest: &str) -> Found {
    let after = after_token(rest);
    match &rest[..rest.len() - after.len()] {
        "" => Found::EndOfEntry,
        token => Found::Token(token.to_owned()),
    }
}
