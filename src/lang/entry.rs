//! Entries: one parser for each form, chosen by the word that begins it.

use nom::combinator::{cut, opt};
use nom::{Err, Parser};

use super::expression::{Grown, Setting};
use super::fault::Fault;
use super::lexis::{Reading, after_token, blanks, found, name_text, word_text};
use super::tree::{BudgetLabel, BudgetLine, DefinitionKind, DigitsWanted, Entry, EntryKind, Expr, InspectVerb, Name};
use super::trouble::{Parsed, Trouble, Wanted, fault};
use super::vocabulary;

impl<'a> Reading<'a> {
    /// Reads the whole text as one entry.
    pub fn entry(&self) -> Parsed<'a, Entry> {
        let start = blanks(self.text());
        if start.is_empty() {
            return fault(start, start, Fault::EmptyEntry);
        }
        let (rest, kind) = match word_text(start) {
            Ok((after, word)) if vocabulary::is_entry_word(word) => self.declared(start, after, word)?,
            Ok((after, word)) if vocabulary::is_command(word) && self.reads_as_command(after) => {
                return fault(start, after, Fault::PromptCommand(word.to_owned()));
            }
            _ => self.evaluate(start)?,
        };
        let end = self.end(rest)?;
        Ok((end, Entry { kind, span: self.span(start, rest) }))
    }

    /// Reads the whole text as one expression.
    pub fn lone_expression(&self) -> Parsed<'a, Expr> {
        let (rest, expression) = self.expression(self.text(), Setting::Open)?;
        let end = self.end(rest)?;
        Ok((end, *expression.tree))
    }

    /// A command is followed by nothing or by a word, a number or a text; `list + 1` would be an expression.
    fn reads_as_command(&self, after: &str) -> bool {
        let next = blanks(after);
        next.is_empty() || next.starts_with(|c: char| c.is_ascii_alphanumeric() || "\"./~".contains(c))
    }

    /// Checks that nothing but blanks and comments is left.
    fn end(&self, rest: &'a str) -> Result<&'a str, Err<Trouble>> {
        let place = blanks(rest);
        if place.is_empty() {
            return Ok(place);
        }
        self.refuse_unexpected(place, &[])?;
        match self.missing::<()>(place, Wanted::EndOfEntry) {
            Err(stop) => Err(stop),
            Ok(_) => Ok(place),
        }
    }

    fn declared(&self, start: &'a str, after: &'a str, word: &'a str) -> Parsed<'a, EntryKind> {
        let definition = |kind| move |rest| self.definition(rest, word, kind);
        let inspect = |verb| {
            move |rest| {
                let (rest, expression) = self.whole(rest, word)?;
                Ok((rest, EntryKind::Inspect { verb, expression }))
            }
        };
        match word {
            "digits" => self.digits(after),
            "constants" => self.constants(after),
            "system" => self.system(after, word),
            "state" => self.level(after, "state"),
            "manifold" => self.level(after, "manifold"),
            "operator" => definition(DefinitionKind::Operator)(after),
            "resolvent" => definition(DefinitionKind::Resolvent)(after),
            "ket" => definition(DefinitionKind::Ket)(after),
            "define" => definition(DefinitionKind::Define)(after),
            "polarization" => definition(DefinitionKind::Polarization)(after),
            "paths" => self.paths(after, word),
            "formula" => inspect(InspectVerb::Formula)(after),
            "crosscheck" => inspect(InspectVerb::Crosscheck)(after),
            "contributions" => inspect(InspectVerb::Contributions)(after),
            "compare" => self.compare(after, word),
            "expect" => self.expect(after, word),
            "sweep" => self.sweep(after, word),
            "converge" => self.converge(after, word),
            "budget" => self.budget(after),
            // A test holds that every entry word of the vocabulary has its line above.
            _ => fault(start, after, Fault::Reserved { word: word.to_owned(), begins_entry: true }),
        }
    }

    /// Reads the expression an entry word is followed by.
    fn whole(&self, rest: &'a str, word: &'a str) -> Parsed<'a, Expr> {
        let (rest, expression) = self.following(rest, word, |rest| self.expression(rest, Setting::Open))?;
        Ok((rest, *expression.tree))
    }

    /// Like `operand_after`, with a whole word before the operand.
    fn following<T>(
        &self,
        rest: &'a str,
        word: &'a str,
        parser: impl FnOnce(&'a str) -> Parsed<'a, T>,
    ) -> Parsed<'a, T> {
        match parser(rest) {
            Err(Err::Error(trouble)) if trouble.left == blanks(rest).len() => {
                let place = blanks(rest);
                fault(place, after_token(place), Fault::NoOperand { after: Some(word.to_owned()), found: found(place) })
            }
            Err(Err::Error(trouble)) => Err(Err::Failure(trouble)),
            answer => answer,
        }
    }

    fn digits(&self, rest: &'a str) -> Parsed<'a, EntryKind> {
        let start = blanks(rest);
        if let Ok((after, "exact")) = word_text(start) {
            return Ok((after, EntryKind::Digits(DigitsWanted::Exact)));
        }
        match self.expression(start, Setting::Open) {
            Ok((after, count)) => Ok((after, EntryKind::Digits(DigitsWanted::Count(*count.tree)))),
            Err(Err::Error(trouble)) if trouble.left == start.len() => {
                fault(start, after_token(start), Fault::Digits(found(start)))
            }
            Err(stop) => Err(stop),
        }
    }

    fn constants(&self, rest: &'a str) -> Parsed<'a, EntryKind> {
        let start = blanks(rest);
        let after = start.trim_start_matches(|c: char| c.is_ascii_alphanumeric() || "-_.".contains(c));
        if after.len() == start.len() {
            return cut(|rest| self.missing(rest, Wanted::Name)).parse(start);
        }
        let name = Name { text: self.between(start, after).to_owned(), span: self.span(start, after) };
        Ok((after, EntryKind::Constants(name)))
    }

    /// Reads the name an entry binds.
    fn bound_name(&self, rest: &'a str, word: &'a str) -> Parsed<'a, Name> {
        let start = blanks(rest);
        if start.is_empty() || start.starts_with('=') {
            return fault(start, start, Fault::NamelessDefinition { word: word.to_owned() });
        }
        cut(|rest| self.name(rest)).parse(start)
    }

    fn system(&self, rest: &'a str, word: &'a str) -> Parsed<'a, EntryKind> {
        let (rest, name) = self.bound_name(rest, word)?;
        let (rest, _) = cut(|rest| self.symbol(rest, "=", Wanted::Equals)).parse(rest)?;
        let start = blanks(rest);
        if name_text(start).is_err() {
            return cut(|rest| self.missing(rest, Wanted::SystemKind)).parse(start);
        }
        let (rest, kind) = self.name(start)?;
        if !rest.starts_with('(') {
            return fault(rest, rest, Fault::SystemArguments { kind: kind.text });
        }
        let (rest, (arguments, _)) = self.deeper(rest, |rest| self.arguments(rest))?;
        Ok((rest, EntryKind::System { name, kind, arguments }))
    }

    /// `state g = h[1s]` and `manifold P = he[2^3P]`.
    fn level(&self, rest: &'a str, word: &'static str) -> Parsed<'a, EntryKind> {
        let (rest, name) = self.bound_name(rest, word)?;
        let (rest, _) = cut(|rest| self.symbol(rest, "=", Wanted::Equals)).parse(rest)?;
        let start = blanks(rest);
        if start.starts_with(|c: char| c.is_ascii_digit()) {
            let after = start.trim_start_matches(|c: char| c.is_ascii_alphanumeric() || "^_/".contains(c));
            let label = self.between(start, after).to_owned();
            return fault(start, after, Fault::NeedsSystem { word, name: name.text, label });
        }
        let (after, system) = cut(|rest| self.name(rest)).parse(start)?;
        if !after.starts_with('[') {
            if blanks(after).starts_with('[') {
                return fault(after, blanks(after), Fault::LabelApart);
            }
            return fault(start, after, Fault::NeedsLabel { word, name: name.text, system: system.text });
        }
        let (rest, (label, _)) = self.deeper(after, |rest| self.label(rest))?;
        let kind = match word {
            "state" => EntryKind::State { name, system, label },
            _ => EntryKind::Manifold { name, system, label },
        };
        Ok((rest, kind))
    }

    fn definition(&self, rest: &'a str, word: &'a str, kind: DefinitionKind) -> Parsed<'a, EntryKind> {
        let (mut rest, name) = self.bound_name(rest, word)?;
        let mut parameters = Vec::new();
        if rest.starts_with('(') {
            let open = rest;
            rest = &rest[1..];
            loop {
                let (after, parameter) = cut(|rest| self.name(rest)).parse(rest)?;
                parameters.push(parameter);
                match blanks(after).strip_prefix(',') {
                    Some(next) => rest = next,
                    None => {
                        (rest, ()) = self.close(open, after, '(')?;
                        break;
                    }
                }
            }
        }
        let (rest, equals) = cut(|rest| self.symbol(rest, "=", Wanted::Equals)).parse(rest)?;
        let (rest, body) = self.operand_after(rest, equals, |rest| self.expression(rest, Setting::Open))?;
        Ok((rest, EntryKind::Definition { kind, name, parameters, body: *body.tree }))
    }

    /// `paths A`, and `paths A with B`.
    fn paths(&self, rest: &'a str, word: &'a str) -> Parsed<'a, EntryKind> {
        let (rest, expression) = self.whole(rest, word)?;
        match word_text(blanks(rest)) {
            Ok((after, "with")) => {
                let (rest, beside) = self.whole(after, "with")?;
                Ok((rest, EntryKind::Paths { expression, beside: Some(beside) }))
            }
            _ => Ok((rest, EntryKind::Paths { expression, beside: None })),
        }
    }

    fn compare(&self, rest: &'a str, word: &'a str) -> Parsed<'a, EntryKind> {
        let (rest, left) = self.whole(rest, word)?;
        self.refuse_unexpected(blanks(rest), b"=")?;
        let (rest, _) = cut(|rest| self.keyword(rest, "with", Wanted::With)).parse(rest)?;
        let (rest, right) = self.whole(rest, "with")?;
        Ok((rest, EntryKind::Compare { left, right }))
    }

    fn expect(&self, rest: &'a str, word: &'a str) -> Parsed<'a, EntryKind> {
        let (rest, left) = self.whole(rest, word)?;
        if !blanks(rest).starts_with("==") {
            self.refuse_unexpected(blanks(rest), b"=")?;
        } else {
            self.refuse_unexpected(blanks(rest), &[])?;
        }
        let (rest, equals) = cut(|rest| self.symbol(rest, "=", Wanted::Equals)).parse(rest)?;
        let (rest, right) = self.operand_after(rest, equals, |rest| self.expression(rest, Setting::Open))?;
        Ok((rest, EntryKind::Expect { left, right: *right.tree }))
    }

    fn sweep(&self, rest: &'a str, word: &'a str) -> Parsed<'a, EntryKind> {
        let (rest, variable) = self.bound_name(rest, word)?;
        let part = |rest, word, wanted| {
            let (rest, _) = cut(|rest| self.keyword(rest, word, wanted)).parse(rest)?;
            let (rest, value) = self.whole(rest, word)?;
            self.refuse_unexpected(blanks(rest), b":")?;
            Ok((rest, value))
        };
        let (rest, from) = part(rest, "from", Wanted::From)?;
        let (rest, to) = part(rest, "to", Wanted::To)?;
        let (rest, step) = part(rest, "step", Wanted::Step)?;
        let (rest, colon) = cut(|rest| self.symbol(rest, ":", Wanted::Colon)).parse(rest)?;
        let (rest, columns) = self.values(rest, colon)?;
        Ok((rest, EntryKind::Sweep { variable, from, to, step, columns }))
    }

    /// Reads `e1, e2, …` up to the end of an entry.
    fn values(&self, rest: &'a str, before: &'a str) -> Parsed<'a, Vec<Expr>> {
        let (mut rest, mut before, mut values) = (rest, before, Vec::new());
        loop {
            let (after, value) = self.operand_after(rest, before, |rest| self.expression(rest, Setting::Open))?;
            values.push(*value.tree);
            let comma = blanks(after);
            match comma.strip_prefix(',') {
                Some(next) => (rest, before) = (next, comma),
                None => return Ok((after, values)),
            }
        }
    }

    fn converge(&self, rest: &'a str, word: &'a str) -> Parsed<'a, EntryKind> {
        let (rest, expression) = self.whole(rest, word)?;
        self.refuse_unexpected(blanks(rest), b"=")?;
        let (rest, _) = cut(|rest| self.keyword(rest, "over", Wanted::Over)).parse(rest)?;
        let (rest, system) = cut(|rest| self.name(rest)).parse(rest)?;
        let (rest, _) = cut(|rest| self.symbol(rest, ".", Wanted::Dot)).parse(rest)?;
        let start = blanks(rest);
        let Ok((rest, field)) = word_text(start) else {
            return cut(|rest| self.missing(rest, Wanted::Name)).parse(start);
        };
        let field = Name { text: field.to_owned(), span: self.span(start, rest) };
        let (rest, equals) = cut(|rest| self.symbol(rest, "=", Wanted::Equals)).parse(rest)?;
        let (rest, values) = self.values(rest, equals)?;
        Ok((rest, EntryKind::Converge { expression, system, field, values }))
    }

    fn budget(&self, rest: &'a str) -> Parsed<'a, EntryKind> {
        let (rest, title) = cut(|rest| self.quoted(rest)).parse(rest)?;
        let (rest, unit) = self.unit(rest)?;
        let (rest, open) = match self.symbol(rest, "{", Wanted::OpenCurly) {
            Ok((after, _)) => (after, blanks(rest)),
            Err(Err::Error(trouble)) => return Err(Err::Failure(trouble)),
            Err(stop) => return Err(stop),
        };
        let (mut rest, mut lines) = (rest, Vec::new());
        loop {
            let place = blanks(rest);
            if place.starts_with('}') || place.is_empty() {
                let (rest, ()) = self.close(open, place, '{')?;
                return Ok((rest, EntryKind::Budget { title: title.to_owned(), unit, lines }));
            }
            let (after, label) = self.budget_label(place)?;
            let (after, colon) = cut(|rest| self.symbol(rest, ":", Wanted::Colon)).parse(after)?;
            let (after, value) = self.operand_after(after, colon, |rest| self.expression(rest, Setting::Open))?;
            self.refuse_unexpected(blanks(after), b"\"}")?;
            lines.push(BudgetLine { label, value: *value.tree });
            rest = blanks(after).strip_prefix(',').unwrap_or(after);
        }
    }

    fn budget_label(&self, place: &'a str) -> Parsed<'a, BudgetLabel> {
        if let Ok((after, "measured")) = word_text(place) {
            return Ok((after, BudgetLabel::Measured));
        }
        if !place.starts_with('"') {
            return cut(|rest| self.missing(rest, Wanted::BudgetLine)).parse(place);
        }
        let (after, label) = self.quoted(place)?;
        Ok((after, BudgetLabel::Contribution(label.to_owned())))
    }

    /// Reads `in UNIT`, or nothing.
    fn unit(&self, rest: &'a str) -> Parsed<'a, Option<Expr>> {
        let (after, Some("in")) = opt(word_text).parse(blanks(rest))? else { return Ok((rest, None)) };
        if blanks(after).starts_with('{') || blanks(after).is_empty() {
            return cut(|rest| self.missing(rest, Wanted::Unit)).parse(blanks(after));
        }
        let (rest, unit): (_, Grown) = self.following(after, "in", |rest| self.product_only(rest))?;
        Ok((rest, Some(*unit.tree)))
    }

    fn evaluate(&self, start: &'a str) -> Parsed<'a, EntryKind> {
        if let Some(sign) = start.strip_prefix(['=', '~', ':']) {
            return fault(start, sign, Fault::RecordNotIndented);
        }
        let read = || -> Parsed<'a, EntryKind> {
            let (rest, expression) = self.expression(start, Setting::Open)?;
            let (rest, unit) = self.unit(rest)?;
            self.end(rest)?;
            Ok((rest, EntryKind::Evaluate { expression: *expression.tree, unit }))
        };
        read().map_err(|stop| self.meant(start, stop))
    }

    /// Sees a misspelt entry word or an undeclared name behind an expression that cannot be read.
    fn meant(&self, start: &'a str, stop: Err<Trouble>) -> Err<Trouble> {
        let (Err::Error(trouble) | Err::Failure(trouble)) = &stop else { return stop };
        let (Ok((after_name, name)), Ok((after_word, word))) = (name_text(start), word_text(start)) else {
            return stop;
        };
        let place = &start[start.len() - trouble.left.min(start.len())..];
        let breaks_off = place.starts_with(['=', '"', '{', ':', ',', '[', '.'])
            || word_text(place).is_ok_and(|(_, next)| vocabulary::is_joining_word(next));
        if !breaks_off {
            return stop;
        }
        let words = vocabulary::vocabulary().of_kind(vocabulary::WordKind::Entry).map(|word| word.name.as_str());
        let next = blanks(after_word);
        let apart = next.len() < after_word.len() && next.starts_with(|c: char| c.is_ascii_alphanumeric() || c == '"');
        let reason = match super::diagnostic::did_you_mean(word, words) {
            Some(meant) if apart => (after_word, Fault::MisspeltEntry { word: word.to_owned(), meant }),
            _ if place.starts_with('=') && !place.starts_with("==") => match self.bare_left_side(after_name, place) {
                Some(call) => (after_name, Fault::NotDeclared { name: name.to_owned(), call }),
                None => return stop,
            },
            _ => return stop,
        };
        fault::<()>(start, reason.0, reason.1).map_or_else(|stop| stop, |()| stop)
    }

    /// Says whether `name =` or `name(…) =` is all that stands before the `=`; true for the latter.
    fn bare_left_side(&self, after_name: &'a str, equals: &'a str) -> Option<bool> {
        let between = self.between(after_name, equals).trim();
        match between {
            "" => Some(false),
            _ if between.starts_with('(') && between.ends_with(')') && between.matches('(').count() == 1 => Some(true),
            _ => None,
        }
    }
}
