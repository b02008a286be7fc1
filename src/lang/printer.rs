//! Tree to text: ASCII, one line, as few brackets as the reading rules allow; what is printed parses back to the same tree.

use std::fmt::{self, Display, Formatter};

use super::tree::{
    Argument, BudgetLabel, DefinitionKind, DigitsWanted, Entry, EntryKind, Expr, ExprKind, InspectVerb, Label,
    LabelPart, Name, Operation, StateRef, StateRefKind,
};

/// How tightly a piece of text holds together, loosest first.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
enum Binding {
    /// Where nothing follows that could be taken for part of a bracket: a projector `|a><b|` stands bare only there.
    Whole,
    Sum,
    /// `-a`
    Sign,
    /// `a without P`
    Without,
    Product,
    Power,
    Primed,
    Primary,
}

#[derive(Clone, Copy, PartialEq, Eq)]
enum Setting {
    Open,
    /// Directly between bars, where a ket would end the chain.
    BetweenBars,
}

struct Piece<'t> {
    expr: &'t Expr,
    at_least: Binding,
    setting: Setting,
}

fn piece(expr: &Expr, at_least: Binding, setting: Setting) -> Piece<'_> {
    Piece { expr, at_least, setting }
}

fn whole(expr: &Expr) -> Piece<'_> {
    piece(expr, Binding::Whole, Setting::Open)
}

impl Display for Expr {
    fn fmt(&self, out: &mut Formatter<'_>) -> fmt::Result {
        whole(self).fmt(out)
    }
}

fn binding(expr: &Expr) -> Binding {
    match &expr.kind {
        ExprKind::Negate(_) => Binding::Sign,
        ExprKind::Without { .. } => Binding::Without,
        ExprKind::Primed(_) => Binding::Primed,
        _ if is_projector(expr) => Binding::Whole,
        ExprKind::Binary { operation, .. } => match operation {
            Operation::Add | Operation::Subtract => Binding::Sum,
            Operation::Multiply | Operation::Juxtapose | Operation::Divide => Binding::Product,
            Operation::Power => Binding::Power,
        },
        // Written `725 +- 3` it reads loosely, though it is a single number.
        ExprKind::Measured { value, uncertainty } if concise(value, uncertainty).is_none() => Binding::Product,
        _ => Binding::Primary,
    }
}

/// Says whether an expression is `|a><b|`.
fn is_projector(expr: &Expr) -> bool {
    matches!(&expr.kind, ExprKind::Binary { operation: Operation::Juxtapose, left, right }
        if matches!(left.kind, ExprKind::Ket(_)) && matches!(right.kind, ExprKind::Bra(_)))
}

impl Display for Piece<'_> {
    fn fmt(&self, out: &mut Formatter<'_>) -> fmt::Result {
        let ket_ends_chain = self.setting == Setting::BetweenBars && matches!(self.expr.kind, ExprKind::Ket(_));
        if binding(self.expr) < self.at_least || ket_ends_chain || matches!(self.expr.kind, ExprKind::Bra(_)) {
            write!(out, "(")?;
            write_expr(out, self.expr, Setting::Open)?;
            write!(out, ")")
        } else {
            write_expr(out, self.expr, self.setting)
        }
    }
}

fn write_expr(out: &mut Formatter<'_>, expr: &Expr, setting: Setting) -> fmt::Result {
    match &expr.kind {
        ExprKind::Number(text) | ExprKind::Name(text) => write!(out, "{text}"),
        ExprKind::Measured { value, uncertainty } => match concise(value, uncertainty) {
            Some(text) => write!(out, "{text}"),
            None => write!(out, "{value} +- {uncertainty}"),
        },
        ExprKind::Member { owner, field } => write!(out, "{owner}.{field}"),
        ExprKind::Text(text) => write!(out, "\"{text}\""),
        ExprKind::List(elements) => write!(out, "[{}]", commas(elements)),
        ExprKind::Call { name, arguments, subscript } => {
            write!(out, "{name}({})", commas(arguments))?;
            subscript.iter().try_for_each(|subscript| write!(out, "_{subscript}"))
        }
        ExprKind::Labelled { system, label } => write!(out, "{system}{label}"),
        ExprKind::Negate(inner) => write!(out, "-{}", piece(inner, Binding::Without, setting)),
        ExprKind::Binary { left, right, .. } if is_projector(expr) => {
            write_expr(out, left, Setting::Open)?;
            write_expr(out, right, Setting::Open)
        }
        ExprKind::Binary { operation, left, right } => write_binary(out, *operation, left, right, setting),
        ExprKind::Primed(inner) => write!(out, "{}'", piece(inner, Binding::Primed, setting)),
        ExprKind::Without { body, manifold } => {
            write!(out, "{} without {manifold}", piece(body, Binding::Without, setting))
        }
        ExprKind::Bracket { bra, chain: Some(chain), ket } => {
            write!(out, "<{bra}| {} |{ket}>", piece(chain, Binding::Sum, Setting::BetweenBars))
        }
        ExprKind::Bracket { bra, chain: None, ket } => write!(out, "<{bra}|{ket}>"),
        ExprKind::Ket(state) => write!(out, "|{state}>"),
        ExprKind::Bra(state) => write!(out, "<{state}|"),
    }
}

fn write_binary(
    out: &mut Formatter<'_>,
    operation: Operation,
    left: &Expr,
    right: &Expr,
    setting: Setting,
) -> fmt::Result {
    let (sign, left_binding, right_binding) = match operation {
        Operation::Add => (" + ", Binding::Sum, Binding::Without),
        Operation::Subtract => (" - ", Binding::Sum, Binding::Without),
        Operation::Multiply => (" * ", Binding::Product, Binding::Power),
        Operation::Divide => ("/", Binding::Product, Binding::Power),
        Operation::Juxtapose => (" ", Binding::Product, Binding::Power),
        Operation::Power => return write_power(out, left, right, setting),
    };
    write!(out, "{}{sign}", piece(left, left_binding, setting))?;
    // Two numbers side by side would be refused: `2 (3)`.
    if operation == Operation::Juxtapose && begins_with_number(right) && ends_with_number(left) {
        return write!(out, "({})", whole(right));
    }
    write!(out, "{}", piece(right, right_binding, setting))
}

fn write_power(out: &mut Formatter<'_>, base: &Expr, exponent: &Expr, setting: Setting) -> fmt::Result {
    write!(out, "{}^", piece(base, Binding::Primed, setting))?;
    write_exponent(out, exponent, setting)
}

/// `a^-2`, `a^b^c`; everything looser than that goes into brackets.
fn write_exponent(out: &mut Formatter<'_>, exponent: &Expr, setting: Setting) -> fmt::Result {
    match &exponent.kind {
        ExprKind::Negate(inner) => {
            write!(out, "-")?;
            write_exponent(out, inner, setting)
        }
        ExprKind::Binary { operation: Operation::Power, left, right }
            if !matches!(left.kind, ExprKind::Measured { .. }) =>
        {
            write!(out, "{}^", piece(left, Binding::Primary, setting))?;
            write_exponent(out, right, setting)
        }
        ExprKind::Measured { .. } | ExprKind::Binary { .. } => write!(out, "({})", whole(exponent)),
        _ => write!(out, "{}", piece(exponent, Binding::Primary, setting)),
    }
}

fn begins_with_number(expr: &Expr) -> bool {
    match &expr.kind {
        ExprKind::Number(_) | ExprKind::Measured { .. } => true,
        ExprKind::Binary { operation: Operation::Power, left: inner, .. } | ExprKind::Primed(inner) => {
            begins_with_number(inner)
        }
        _ => false,
    }
}

/// Says whether the last thing written of an expression may be a number.
fn ends_with_number(expr: &Expr) -> bool {
    match &expr.kind {
        ExprKind::Number(_) | ExprKind::Measured { .. } => true,
        ExprKind::Binary { right: last, .. } | ExprKind::Negate(last) => ends_with_number(last),
        _ => false,
    }
}

/// The concise form `1.5(2)e3` of a value and its uncertainty, where it says exactly these two.
fn concise(value: &str, uncertainty: &str) -> Option<String> {
    let split = |text: &str| {
        let end = text.find(['e', 'E']).unwrap_or(text.len());
        (text[..end].to_owned(), text[end..].to_owned())
    };
    let ((mantissa, exponent), (spread, spread_exponent)) = (split(value), split(uncertainty));
    if exponent != spread_exponent {
        return None;
    }
    let places = |text: &str| text.split_once('.').map_or(0, |(_, fraction)| fraction.len());
    if places(&mantissa) != places(&spread) {
        return None;
    }
    let digits: String = spread.chars().filter(char::is_ascii_digit).collect();
    if places(&mantissa) == 0 {
        return Some(format!("{mantissa}({digits}){exponent}"));
    }
    // A leading zero before the point is not written in the concise form, and no other can be.
    let bare = digits.trim_start_matches('0');
    let padded = format!("{bare:0>width$}", width = places(&mantissa) + 1);
    (padded == digits && !bare.is_empty()).then(|| format!("{mantissa}({bare}){exponent}"))
}

struct Commas<'t, T>(&'t [T]);

fn commas<T>(items: &[T]) -> Commas<'_, T> {
    Commas(items)
}

impl<T: Display> Display for Commas<'_, T> {
    fn fmt(&self, out: &mut Formatter<'_>) -> fmt::Result {
        for (index, item) in self.0.iter().enumerate() {
            let comma = if index == 0 { "" } else { ", " };
            write!(out, "{comma}{item}")?;
        }
        Ok(())
    }
}

impl Display for Name {
    fn fmt(&self, out: &mut Formatter<'_>) -> fmt::Result {
        write!(out, "{}", self.text)
    }
}

impl Display for StateRef {
    fn fmt(&self, out: &mut Formatter<'_>) -> fmt::Result {
        match &self.kind {
            StateRefKind::Named { name, arguments } if arguments.is_empty() => write!(out, "{name}"),
            StateRefKind::Named { name, arguments } => write!(out, "{name}({})", commas(arguments)),
            StateRefKind::Labelled { system, label } => write!(out, "{system}{label}"),
        }
    }
}

impl Display for Label {
    fn fmt(&self, out: &mut Formatter<'_>) -> fmt::Result {
        write!(out, "[{}", Parts(&self.parts))?;
        for (index, (name, value)) in self.options.iter().enumerate() {
            let comma = if index == 0 && self.parts.is_empty() { "" } else { ", " };
            write!(out, "{comma}{name}={value}")?;
        }
        write!(out, "]")
    }
}

struct Parts<'t>(&'t [LabelPart]);

impl Display for Parts<'_> {
    fn fmt(&self, out: &mut Formatter<'_>) -> fmt::Result {
        self.0.iter().try_for_each(|part| match part {
            LabelPart::Text(text) => write!(out, "{text}"),
            LabelPart::Computed(value) => write!(out, "{{{value}}}"),
        })
    }
}

impl Display for Argument {
    fn fmt(&self, out: &mut Formatter<'_>) -> fmt::Result {
        match self {
            Argument::Positional(value) => write!(out, "{value}"),
            Argument::Named { name, value } => write!(out, "{name}={value}"),
            Argument::Range { variable, from, to } => write!(out, "{variable} in {from} .. {to}"),
            Argument::At { variable, point } => write!(out, "{variable} at {point}"),
            Argument::Level { label, value } => write!(out, "{}: {value}", Parts(&label.parts)),
        }
    }
}

impl Display for DefinitionKind {
    fn fmt(&self, out: &mut Formatter<'_>) -> fmt::Result {
        out.write_str(match self {
            DefinitionKind::Operator => "operator",
            DefinitionKind::Resolvent => "resolvent",
            DefinitionKind::Ket => "ket",
            DefinitionKind::Define => "define",
            DefinitionKind::Polarization => "polarization",
        })
    }
}

impl Display for InspectVerb {
    fn fmt(&self, out: &mut Formatter<'_>) -> fmt::Result {
        out.write_str(match self {
            InspectVerb::Formula => "formula",
            InspectVerb::Crosscheck => "crosscheck",
            InspectVerb::Contributions => "contributions",
        })
    }
}

impl Display for Entry {
    fn fmt(&self, out: &mut Formatter<'_>) -> fmt::Result {
        match &self.kind {
            EntryKind::Digits(DigitsWanted::Exact) => write!(out, "digits exact"),
            EntryKind::Digits(DigitsWanted::Count(count)) => write!(out, "digits {count}"),
            EntryKind::Constants(name) => write!(out, "constants {name}"),
            EntryKind::System { name, kind, arguments } => write!(out, "system {name} = {kind}({})", commas(arguments)),
            EntryKind::State { name, system, label } => write!(out, "state {name} = {system}{label}"),
            EntryKind::Manifold { name, system, label } => write!(out, "manifold {name} = {system}{label}"),
            EntryKind::Definition { kind, name, parameters, body } => {
                write!(out, "{kind} {name}")?;
                if !parameters.is_empty() {
                    write!(out, "({})", commas(parameters))?;
                }
                write!(out, " = {body}")
            }
            EntryKind::Evaluate { expression, unit } => {
                write!(out, "{expression}")?;
                write_unit(out, unit.as_ref())
            }
            EntryKind::Inspect { verb, expression } => write!(out, "{verb} {expression}"),
            EntryKind::Paths { expression, beside: None } => write!(out, "paths {expression}"),
            EntryKind::Paths { expression, beside: Some(beside) } => write!(out, "paths {expression} with {beside}"),
            EntryKind::Compare { left, right } => write!(out, "compare {left} with {right}"),
            EntryKind::Expect { left, right } => write!(out, "expect {left} = {right}"),
            EntryKind::Sweep { variable, from, to, step, columns } => {
                write!(out, "sweep {variable} from {from} to {to} step {step}: {}", commas(columns))
            }
            EntryKind::Converge { expression, system, field, values } => {
                write!(out, "converge {expression} over {system}.{field} = {}", commas(values))
            }
            EntryKind::Budget { title, unit, lines } => {
                write!(out, "budget \"{title}\"")?;
                write_unit(out, unit.as_ref())?;
                writeln!(out, " {{")?;
                for line in lines {
                    match &line.label {
                        BudgetLabel::Contribution(label) => writeln!(out, "  \"{label}\": {}", line.value)?,
                        BudgetLabel::Measured => writeln!(out, "  measured: {}", line.value)?,
                    }
                }
                write!(out, "}}")
            }
        }
    }
}

fn write_unit(out: &mut Formatter<'_>, unit: Option<&Expr>) -> fmt::Result {
    unit.into_iter().try_for_each(|unit| write!(out, " in {}", piece(unit, Binding::Product, Setting::Open)))
}
