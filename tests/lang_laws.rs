//! Laws of reading and printing, over random trees and random texts.
//!
//! `KETWORK_CASES` scales the number of cases of each law (default 300), `KETWORK_SEED` chooses other ones.

use ketwork::lang::diagnostic::Diagnostic;
use ketwork::lang::extent::is_incomplete;
use ketwork::lang::file::parse_session;
use ketwork::lang::parser::{parse_entry, parse_expression};
use ketwork::lang::tree::{
    Argument, BudgetLabel, BudgetLine, DefinitionKind, DigitsWanted, Entry, EntryKind, Expr, ExprKind, InspectVerb,
    Label, LabelPart, Name, Operation, Span, StateRef, StateRefKind,
};
use ketwork::report::diagnostics::render;
use proptest::collection::vec;
use proptest::prelude::*;
use proptest::test_runner::{Config, RngAlgorithm, TestCaseError, TestRng, TestRunner};

fn check<S: Strategy>(strategy: S, law: impl Fn(S::Value) -> Result<(), TestCaseError>) {
    let variable =
        |name: &str, default: u32| std::env::var(name).ok().and_then(|text| text.parse().ok()).unwrap_or(default);
    let seed = variable("KETWORK_SEED", 1);
    let mut bytes = [0; 32];
    bytes[..4].copy_from_slice(&seed.to_le_bytes());
    let config = Config { cases: variable("KETWORK_CASES", 300), failure_persistence: None, ..Config::default() };
    let mut runner = TestRunner::new_with_rng(config, TestRng::from_seed(RngAlgorithm::ChaCha, &bytes));
    if let Err(failure) = runner.run(&strategy, law) {
        panic!("KETWORK_SEED={seed}: {failure}");
    }
}

// ---- random trees

fn name_text() -> impl Strategy<Value = String> {
    let common = [
        "g", "h", "V", "w", "R", "E", "H", "C", "p", "r", "e2", "x1", "pi", "i", "inf", "D_z", "D_+1", "D_-1", "P_0",
        "omega_0", "E1", "delta", "sqrt", "zero", "MHz", "int", "withal", "a_", "stateful",
    ];
    prop_oneof![4 => prop::sample::select(common.to_vec()).prop_map(str::to_owned), 1 => "[A-Z][a-z0-9_]{0,6}"]
}

fn name() -> impl Strategy<Value = Name> {
    name_text().prop_map(|text| Name { text, span: Span::default() })
}

fn expr(kind: ExprKind) -> Expr {
    Expr { kind, span: Span::default() }
}

fn number() -> impl Strategy<Value = String> {
    prop_oneof![4 => "[0-9]{1,3}", 2 => "[0-9]{1,2}\\.[0-9]{1,3}", 1 => "[0-9](\\.[0-9]{1,2})?[eE][+-]?[0-9]{1,2}"]
}

fn operation() -> impl Strategy<Value = Operation> {
    prop::sample::select(vec![
        Operation::Add,
        Operation::Subtract,
        Operation::Multiply,
        Operation::Juxtapose,
        Operation::Juxtapose,
        Operation::Divide,
        Operation::Power,
    ])
}

/// A label; texts are never side by side, because they would be one text.
fn label(inner: impl Strategy<Value = Expr> + Clone) -> impl Strategy<Value = Label> {
    let text = "[0-9A-Za-z^_/+.*-]{1,5}";
    let parts = (any::<bool>(), vec((text, inner.clone()), 0..3)).prop_map(|(text_first, pairs)| {
        let mut parts = Vec::new();
        for (text, value) in pairs {
            let (text, value) = (LabelPart::Text(text), LabelPart::Computed(value));
            parts.extend(if text_first { [text, value] } else { [value, text] });
        }
        parts.truncate(3);
        parts
    });
    (parts, vec((name(), inner), 0..3))
        .prop_filter("an empty label", |(parts, options)| !parts.is_empty() || !options.is_empty())
        .prop_map(|(parts, options)| Label { parts, options, span: Span::default() })
}

fn state(inner: impl Strategy<Value = Expr> + Clone + 'static) -> impl Strategy<Value = StateRef> {
    prop_oneof![
        3 => (name(), vec(inner.clone(), 0..3)).prop_map(|(name, arguments)| StateRefKind::Named { name, arguments }),
        1 => (name(), label(inner)).prop_map(|(system, label)| StateRefKind::Labelled { system, label }),
    ]
    .prop_map(|kind| StateRef { kind, span: Span::default() })
}

fn argument(inner: impl Strategy<Value = Expr> + Clone + 'static) -> impl Strategy<Value = Argument> {
    let value = prop_oneof![
        5 => inner.clone(),
        1 => "[a-z ωé#.]{0,6}".prop_map(|text| expr(ExprKind::Text(text))),
        1 => vec(inner.clone(), 0..3).prop_map(|elements| expr(ExprKind::List(elements))),
    ];
    prop_oneof![
        4 => value.clone().prop_map(Argument::Positional),
        2 => (name(), value).prop_map(|(name, value)| Argument::Named { name, value }),
        1 => (name(), inner.clone(), inner.clone()).prop_map(|(variable, from, to)| Argument::Range { variable, from, to }),
        1 => (name(), inner.clone()).prop_map(|(variable, point)| Argument::At { variable, point }),
        1 => ("[0-9][A-Z^_0-9]{1,4}", inner).prop_map(|(text, value)| {
            let label = Label { parts: vec![LabelPart::Text(text)], options: Vec::new(), span: Span::default() };
            Argument::Level { label, value }
        }),
    ]
}

/// A random expression; with `lone` also bras and kets that belong to no bracket.
fn expression(lone: bool) -> BoxedStrategy<Expr> {
    let leaf = prop_oneof![
        3 => number().prop_map(ExprKind::Number),
        1 => (number(), number()).prop_map(|(value, uncertainty)| ExprKind::Measured { value, uncertainty }),
        4 => name_text().prop_map(ExprKind::Name),
        1 => (name(), "[a-z]{1,4}").prop_map(|(owner, text)| {
            ExprKind::Member { owner, field: Name { text, span: Span::default() } }
        }),
    ]
    .prop_filter("a signed component takes no member", |kind| {
        !matches!(kind, ExprKind::Member { owner, .. } if owner.text.contains(['+', '-']) || owner.text.ends_with('_'))
    })
    .prop_map(expr);
    leaf.prop_recursive(5, 40, 4, move |inner| {
        let subscript = prop::option::weighted(0.3, "[+-]?[0-9a-z]{1,2}");
        let lone_weight = u32::from(lone);
        prop_oneof![
            8 => (operation(), inner.clone(), inner.clone()).prop_map(|(operation, left, right)| {
                ExprKind::Binary { operation, left: Box::new(left), right: Box::new(right) }
            }),
            2 => inner.clone().prop_map(|inner| ExprKind::Negate(Box::new(inner))),
            2 => inner.clone().prop_map(|inner| ExprKind::Primed(Box::new(inner))),
            1 => (inner.clone(), name()).prop_map(|(body, manifold)| ExprKind::Without { body: Box::new(body), manifold }),
            2 => (name(), vec(argument(inner.clone()), 0..4), subscript)
                .prop_map(|(name, arguments, subscript)| ExprKind::Call { name, arguments, subscript }),
            1 => (name(), label(inner.clone())).prop_map(|(system, label)| ExprKind::Labelled { system, label }),
            3 => (state(inner.clone()), prop::option::of(inner.clone()), state(inner.clone())).prop_map(|(bra, chain, ket)| {
                ExprKind::Bracket { bra, chain: chain.map(Box::new), ket }
            }),
            lone_weight => state(inner.clone()).prop_map(ExprKind::Ket),
            lone_weight => state(inner.clone()).prop_map(ExprKind::Bra),
            lone_weight => (state(inner.clone()), state(inner)).prop_map(|(ket, bra)| ExprKind::Binary {
                operation: Operation::Juxtapose,
                left: Box::new(expr(ExprKind::Ket(ket))),
                right: Box::new(expr(ExprKind::Bra(bra))),
            }),
        ]
        .prop_map(expr)
    })
    .boxed()
}

fn entry() -> impl Strategy<Value = Entry> {
    let value = || expression(false);
    let unit = || prop::option::of(value());
    let quoted = || "[a-zA-Z ω#|<(]{0,8}";
    let definition = prop::sample::select(vec![
        DefinitionKind::Operator,
        DefinitionKind::Resolvent,
        DefinitionKind::Ket,
        DefinitionKind::Define,
        DefinitionKind::Polarization,
    ]);
    let verb = prop::sample::select(vec![InspectVerb::Formula, InspectVerb::Crosscheck, InspectVerb::Contributions]);
    let line_label = prop_oneof![
        3 => quoted().prop_map(BudgetLabel::Contribution),
        1 => Just(BudgetLabel::Measured),
    ];
    let line = (line_label, value()).prop_map(|(label, value)| BudgetLine { label, value });
    let kind = prop_oneof![
        1 => Just(EntryKind::Digits(DigitsWanted::Exact)),
        1 => value().prop_map(|count| EntryKind::Digits(DigitsWanted::Count(count))),
        1 => "[A-Z]{2,6}-[0-9]{4}".prop_map(|text| EntryKind::Constants(Name { text, span: Span::default() })),
        2 => (name(), name(), vec(argument(value()), 0..4))
            .prop_map(|(name, kind, arguments)| EntryKind::System { name, kind, arguments }),
        1 => (name(), name(), label(value())).prop_map(|(name, system, label)| EntryKind::State { name, system, label }),
        1 => (name(), name(), label(value())).prop_map(|(name, system, label)| EntryKind::Manifold { name, system, label }),
        4 => (definition, name(), vec(name(), 0..3), value())
            .prop_map(|(kind, name, parameters, body)| EntryKind::Definition { kind, name, parameters, body }),
        4 => (value(), unit()).prop_map(|(expression, unit)| EntryKind::Evaluate { expression, unit }),
        1 => (value(), proptest::option::of(value()))
            .prop_map(|(expression, beside)| EntryKind::Paths { expression, beside }),
        2 => (verb, value()).prop_map(|(verb, expression)| EntryKind::Inspect { verb, expression }),
        1 => (value(), value()).prop_map(|(left, right)| EntryKind::Compare { left, right }),
        1 => (value(), value()).prop_map(|(left, right)| EntryKind::Expect { left, right }),
        1 => (name(), value(), value(), value(), vec(value(), 1..3)).prop_map(|(variable, from, to, step, columns)| {
            EntryKind::Sweep { variable, from, to, step, columns }
        }),
        1 => (value(), name(), "[a-z]{1,5}", vec(value(), 1..3)).prop_map(|(expression, system, field, values)| {
            let field = Name { text: field, span: Span::default() };
            EntryKind::Converge { expression, system, field, values }
        }),
        1 => (quoted(), unit(), vec(line, 0..3)).prop_map(|(title, unit, lines)| EntryKind::Budget { title, unit, lines }),
    ];
    kind.prop_map(|kind| Entry { kind, span: Span::default() })
}

fn told(found: &[Diagnostic]) -> String {
    found.iter().map(|found| format!("{} at {:?}; ", found.message, found.span)).collect()
}

#[test]
fn a_printed_expression_is_read_as_the_same_tree() {
    check(expression(true), |tree| {
        let text = tree.to_string();
        let read = parse_expression(&text).map_err(|found| TestCaseError::fail(format!("{text}: {}", told(&found))))?;
        prop_assert!(read.same_as(&tree), "{text} is read as {read}\n{tree:?}\n{read:?}");
        prop_assert_eq!(read.to_string(), text);
        Ok(())
    });
}

#[test]
fn a_printed_entry_is_read_as_the_same_tree() {
    check(entry(), |tree| {
        let text = tree.to_string();
        let read = parse_entry(&text).map_err(|found| TestCaseError::fail(format!("{text}: {}", told(&found))))?;
        prop_assert!(read.same_as(&tree), "{text} is read as {read}\n{tree:?}\n{read:?}");
        prop_assert!(!is_incomplete(&text), "{text}");
        Ok(())
    });
}

#[test]
fn a_session_of_printed_entries_is_read_entry_by_entry() {
    check(vec(entry(), 0..6), |trees| {
        let text: String = std::iter::once("ketwork session 1\n".to_owned())
            .chain(trees.iter().map(|tree| format!("{tree}  # comment\n  = 1\n\n")))
            .collect();
        let session = parse_session(&text);
        prop_assert_eq!(told(&session.diagnostics()), "");
        prop_assert_eq!(session.entries().count(), trees.len());
        for (entry, tree) in session.entries().zip(&trees) {
            prop_assert!(entry.parsed.as_ref().is_ok_and(|read| read.same_as(tree)), "{}", entry.text);
            prop_assert_eq!(entry.records.len(), 1);
        }
        prop_assert_eq!(session.to_text(), text);
        Ok(())
    });
}

// ---- random texts

/// Texts that look like sessions, and break off anywhere.
fn scraps() -> impl Strategy<Value = String> {
    let pieces = [
        "digits ",
        "state ",
        "g",
        "h",
        "=",
        " = ",
        "<",
        "|",
        ">",
        "<g|",
        "|g>",
        " D_z ",
        "(",
        ")",
        "[",
        "]",
        "{",
        "}",
        "'",
        "^",
        "+",
        "-",
        "*",
        "/",
        " ",
        "\n",
        "\n  = ",
        "\n  ~ ",
        "#",
        "\"",
        ",",
        ":",
        ";",
        ".",
        "..",
        "1",
        "2.5",
        "725(3)",
        "+-",
        " in ",
        " with ",
        "compare ",
        "define ",
        "budget ",
        "sweep ",
        "h[1s]",
        "ω",
        "⟨",
        "⟩",
        "²",
        "₁",
        "π",
        "é",
        "\u{0}",
        "\t",
        "\r\n",
        "1e9",
        "_",
        "ketwork session 1\n",
        "\\",
        "$",
        "save ",
        "∞",
        "measured:",
        " without P",
    ];
    vec(prop::sample::select(pieces.to_vec()), 0..25).prop_map(|pieces| pieces.concat())
}

fn drawn_well(text: &str, found: &[Diagnostic]) -> Result<(), TestCaseError> {
    prop_assert!(!found.is_empty());
    for diagnostic in found {
        let places = std::iter::once(&diagnostic.span).chain(diagnostic.related.iter().map(|(span, _)| span));
        for span in places {
            prop_assert!(text.get(span.start..span.end).is_some(), "{} at {span:?} of {text:?}", diagnostic.message);
        }
        prop_assert!(diagnostic.message.starts_with(|c: char| !c.is_uppercase()), "{}", diagnostic.message);
        let drawn = render("text", text, diagnostic, false);
        prop_assert!(drawn.contains(&diagnostic.message), "{drawn}");
    }
    Ok(())
}

#[test]
fn any_text_is_read_or_refused_with_a_place_that_can_be_shown() {
    check(prop_oneof![3 => scraps(), 1 => any::<String>()], |text| {
        match parse_entry(&text) {
            Ok(entry) => prop_assert!(text.get(entry.span.start..entry.span.end).is_some()),
            Err(found) => drawn_well(&text, &found)?,
        }
        match parse_expression(&text) {
            Ok(tree) => prop_assert!(text.get(tree.span.start..tree.span.end).is_some()),
            Err(found) => drawn_well(&text, &found)?,
        }
        is_incomplete(&text);
        Ok(())
    });
}

#[test]
fn any_session_is_written_back_to_the_same_bytes() {
    check(prop_oneof![3 => vec(scraps(), 0..6).prop_map(|lines| lines.join("\n")), 1 => any::<String>()], |text| {
        let session = parse_session(&text);
        prop_assert_eq!(session.to_text(), text.clone());
        let found = session.diagnostics();
        if !found.is_empty() {
            drawn_well(&text, &found)?;
        }
        for entry in session.entries() {
            prop_assert_eq!(&text[entry.span.start..entry.span.end], &entry.text);
        }
        Ok(())
    });
}

#[test]
fn what_is_read_and_printed_is_read_again() {
    check(scraps(), |text| {
        if let Ok(entry) = parse_entry(&text) {
            let printed = entry.to_string();
            let again =
                parse_entry(&printed).map_err(|found| TestCaseError::fail(format!("{printed}: {}", told(&found))))?;
            prop_assert!(again.same_as(&entry), "{text:?} {printed:?}");
            prop_assert!(printed.is_ascii() || printed.contains('"'), "{printed}");
        }
        Ok(())
    });
}
