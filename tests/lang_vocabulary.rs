//! Holds that the vocabulary and the grammar belong together: every example is read, every word has its rule, every rule its parser.

use std::collections::{BTreeMap, BTreeSet};

use ketwork::lang::file::{HEADER, Item, parse_session};
use ketwork::lang::parser::{parse_entry, parse_expression};
use ketwork::lang::tree::{
    Argument, BudgetLabel, DigitsWanted, EntryKind, Expr, ExprKind, LabelPart, Operation, StateRefKind,
};
use ketwork::lang::vocabulary::{Status, WordKind, vocabulary};

const GRAMMAR: &str = include_str!("../grammar/session.ebnf");

#[test]
fn every_example_of_the_vocabulary_is_read() {
    for word in vocabulary().words() {
        for example in &word.examples {
            let session = parse_session(&format!("{HEADER}\n{example}"));
            assert_eq!(session.diagnostics(), [], "help {}:\n{example}", word.name);
            assert!(session.entries().count() > 0, "help {}", word.name);
        }
    }
}

#[test]
fn every_word_that_can_be_evaluated_has_an_example_that_uses_it() {
    for word in vocabulary().words() {
        let evaluable = !matches!(word.kind, WordKind::Joining | WordKind::Command | WordKind::Topic);
        if word.status != Status::Here || !evaluable {
            continue;
        }
        let used = word.examples.iter().any(|example| example.contains(word.name.as_str()));
        assert!(used, "{} has no example", word.name);
        let recorded = word.examples.iter().any(|e| ["\n  = ", "\n  ~ ", "\n  : "].iter().any(|mark| e.contains(mark)));
        assert!(recorded || word.name == "expect", "{} shows no result", word.name);
    }
}

/// The rules of the grammar: name, right side, example.
fn rules() -> BTreeMap<&'static str, (String, &'static str)> {
    let body = GRAMMAR.split_once("(* The file *)").expect("the rules begin there").1;
    let mut rules: BTreeMap<&'static str, (String, &'static str)> = BTreeMap::new();
    let mut name = "";
    for line in body.lines() {
        let (code, comment) = line.split_once("(*").unwrap_or((line, ""));
        let mut right = code;
        if let Some((left, rest)) = code.split_once(" = ").filter(|(left, _)| !left.trim().contains([' ', '"'])) {
            (name, right) = (left.trim(), rest);
            rules.insert(name, (String::new(), ""));
        }
        if let Some(rule) = rules.get_mut(name) {
            rule.0.push_str(right.trim());
            rule.0.push(' ');
            if let Some((_, example)) = comment.split_once("e.g. ") {
                rule.1 = example.trim_end().trim_end_matches("*)").trim();
            }
        }
    }
    rules
}

/// The literals of a right side.
fn literals(right: &str) -> Vec<&str> {
    right.split('"').skip(1).step_by(2).collect()
}

/// The rule of quoted texts, whose right side holds a quote as a literal.
const QUOTING: &str = "text";

#[test]
fn every_word_has_its_rule_and_every_literal_its_word() {
    let rules = rules();
    let right_sides = rules.iter().filter(|(name, _)| **name != QUOTING).map(|(_, (right, _))| right.as_str());
    let literal_words: BTreeSet<&str> = right_sides.flat_map(literals).filter(|word| word.len() > 1).collect();
    for word in vocabulary().words() {
        if matches!(word.kind, WordKind::Entry | WordKind::Joining) {
            assert!(literal_words.contains(word.name.as_str()), "{} has no rule in session.ebnf", word.name);
        }
    }
    let apart = ["ketwork session 1", "exact", "measured", "#@ ", "..", "+-"];
    for word in literal_words {
        let known =
            vocabulary().find(word).is_some_and(|page| matches!(page.kind, WordKind::Entry | WordKind::Joining));
        assert!(known || apart.contains(&word), "{word} stands in session.ebnf and not in the vocabulary");
    }
}

#[test]
fn every_rule_is_used_and_every_name_is_a_rule() {
    let rules = rules();
    let mut used = BTreeSet::new();
    for (_, (right, _)) in rules.iter().filter(|(name, _)| **name != QUOTING) {
        let unquoted = right.split('"').step_by(2).collect::<Vec<_>>().join(" ");
        let names = unquoted.split('?').step_by(2).collect::<Vec<_>>().join(" ");
        let words = names.split(|c: char| !c.is_ascii_alphanumeric() && c != '_').filter(|word| !word.is_empty());
        used.extend(words.map(str::to_owned));
    }
    for name in rules.keys() {
        assert!(used.contains(*name) || *name == "session", "{name} is used by no rule");
    }
    for name in used {
        assert!(rules.contains_key(name.as_str()) || name == "blank", "{name} has no rule");
    }
}

#[test]
fn every_rule_reads_its_example() {
    let rules = rules();
    assert!(rules.len() > 40, "{:?}", rules.keys());
    for (name, (_, example)) in rules {
        assert!(!example.is_empty(), "rule {name} has no example");
        assert!(reads(name, example), "rule {name} does not read its example {example}");
    }
}

fn entry(text: &str) -> EntryKind {
    parse_entry(text).unwrap_or_else(|found| panic!("{text}: {}", found[0].message)).kind
}

fn expression(text: &str) -> ExprKind {
    parse_expression(text).unwrap_or_else(|found| panic!("{text}: {}", found[0].message)).kind
}

/// The one item of a session below its header.
fn item(line: &str) -> Item {
    let session = parse_session(&format!("{HEADER}\n{line}\n"));
    assert_eq!(session.diagnostics(), [], "{line}");
    session.items.into_iter().nth(1).expect("one line below the header")
}

fn argument(text: &str) -> Argument {
    match expression(&format!("f({text})")) {
        ExprKind::Call { mut arguments, .. } if arguments.len() == 1 => arguments.remove(0),
        other => panic!("{text}: {other:?}"),
    }
}

fn is_operation(kind: &ExprKind, wanted: Operation) -> bool {
    matches!(kind, ExprKind::Binary { operation, .. } if *operation == wanted)
}

fn right_of(kind: ExprKind) -> ExprKind {
    match kind {
        ExprKind::Binary { right, .. } => right.kind,
        other => panic!("{other:?} has no right side"),
    }
}

/// Reads an example the way its rule says, and looks at the tree that comes out.
fn reads(rule: &str, example: &str) -> bool {
    match rule {
        "session" | "header" => {
            let session = parse_session(example);
            session.diagnostics().is_empty() && matches!(session.items[..], [Item::Header(_)])
        }
        "provenance" => matches!(item(example), Item::Provenance(line) if line.text == example),
        "prose" => matches!(item(example), Item::Prose(line) if line.text == example),
        "stored" => matches!(item(example), Item::Entry(entry) if entry.comment() == Some("four")),
        "record" => {
            matches!(item(&format!("9/2\n  {example}")), Item::Entry(entry) if entry.records[0].text == example)
        }
        "entry" | "digits" | "constants" | "system" | "level" | "definition" | "parameters" | "paths"
        | "inspection" | "compare" | "expect" | "sweep" | "converge" | "budget" | "budget_line" | "evaluation"
        | "unit" => reads_entry(rule, example),
        "argument" => matches!(argument(example), Argument::Range { .. }),
        "value" | "text" => matches!(argument(example), Argument::Positional(Expr { kind: ExprKind::Text(_), .. })),
        "list" => matches!(argument(example), Argument::Positional(Expr { kind: ExprKind::List(_), .. })),
        "label" | "label_text" | "label_sign" | "computed" | "option" => reads_label(rule, example),
        _ => reads_expression(rule, example),
    }
}

fn reads_entry(rule: &str, example: &str) -> bool {
    match (rule, entry(&in_entry(rule, example))) {
        ("entry", EntryKind::Digits(DigitsWanted::Exact))
        | ("digits", EntryKind::Digits(DigitsWanted::Count(_)))
        | ("constants", EntryKind::Constants(_))
        | ("system", EntryKind::System { .. })
        | ("level", EntryKind::State { .. })
        | ("definition", EntryKind::Definition { .. })
        | ("paths", EntryKind::Paths { .. })
        | ("inspection", EntryKind::Inspect { .. })
        | ("compare", EntryKind::Compare { .. })
        | ("expect", EntryKind::Expect { .. })
        | ("sweep", EntryKind::Sweep { .. })
        | ("converge", EntryKind::Converge { .. })
        | ("budget", EntryKind::Budget { unit: Some(_), .. })
        | ("evaluation" | "unit", EntryKind::Evaluate { unit: Some(_), .. }) => true,
        ("parameters", EntryKind::Definition { parameters, .. }) => parameters.len() == 2,
        ("budget_line", EntryKind::Budget { lines, .. }) => lines[0].label == BudgetLabel::Measured,
        _ => false,
    }
}

fn in_entry(rule: &str, example: &str) -> String {
    match rule {
        "parameters" => format!("define f{example} = 1"),
        "budget_line" => format!("budget \"b\" {{ {example} }}"),
        "unit" => format!("E(g) {example}"),
        _ => example.to_owned(),
    }
}

fn reads_label(rule: &str, example: &str) -> bool {
    let text = match rule {
        "label" => format!("h{example}"),
        "option" => format!("h[2p, {example}]"),
        _ => format!("h[{example}]"),
    };
    let ExprKind::Labelled { label, .. } = expression(&text) else { return false };
    match rule {
        "label" => label.options.len() == 3,
        "option" => label.options.len() == 1,
        "computed" => matches!(label.parts[..], [LabelPart::Computed(_)]),
        _ => label.parts == [LabelPart::Text(example.to_owned())],
    }
}

fn reads_expression(rule: &str, example: &str) -> bool {
    match rule {
        "sum" | "group" => is_operation(&expression(example), Operation::Subtract),
        "term" => matches!(expression(example), ExprKind::Without { .. }),
        "product" => is_operation(&expression(example), Operation::Juxtapose),
        "signed" => matches!(right_of(expression(&format!("a * {example}"))), ExprKind::Negate(_)),
        "power" => is_operation(&expression(example), Operation::Power),
        "exponent" => matches!(right_of(expression(&format!("a^{example}"))), ExprKind::Negate(_)),
        "primed" => matches!(expression(example), ExprKind::Primed(_)),
        "primary" | "name" | "word" | "letter" => {
            matches!(expression(example), ExprKind::Name(name) if name == example)
        }
        "member" => matches!(expression(example), ExprKind::Member { .. }),
        "call" => matches!(expression(example), ExprKind::Call { subscript: Some(_), .. }),
        "component" => matches!(expression(&format!("C(2){example}")), ExprKind::Call { subscript: Some(_), .. }),
        "arguments" => {
            matches!(expression(&format!("f{example}")), ExprKind::Call { arguments, .. } if arguments.len() == 2)
        }
        "bracket" => matches!(expression(example), ExprKind::Bracket { chain: Some(_), .. }),
        "ket" => matches!(expression(example), ExprKind::Ket(_)),
        "bra" => matches!(right_of(expression(example)), ExprKind::Bra(_)),
        "state" => matches!(expression(&format!("|{example}>")), ExprKind::Ket(state)
            if matches!(&state.kind, StateRefKind::Named { arguments, .. } if arguments.len() == 1)),
        "labelled" => matches!(expression(example), ExprKind::Labelled { .. }),
        "number" | "whole" | "digit" => matches!(expression(example), ExprKind::Number(_)),
        "ten_power" => matches!(expression(&format!("1{example}")), ExprKind::Number(_)),
        "measured" => matches!(expression(example), ExprKind::Measured { .. }),
        _ => panic!("rule {rule} has no check here"),
    }
}
