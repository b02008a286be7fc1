//! The corpus of `grammar/cases/`: accepted texts with their trees, rejected texts with the diagnostic a person sees.
//!
//! A file holds cases, each begun by `==== what it shows`, its text, `----`, and what is expected.
//! `\u{7}` in a text stands for the character of that number.
//! `KETWORK_REFRESH=1` writes what comes out into the files, to be read before it is committed.

use std::fmt::Write as _;
use std::fs;
use std::path::{Path, PathBuf};

use ketwork::lang::file::{Item, parse_session};
use ketwork::lang::parser::parse_entry;
use ketwork::lang::tree::{
    Argument, BudgetLabel, DigitsWanted, Entry, EntryKind, Expr, ExprKind, Label, LabelPart, Operation, StateRef,
    StateRefKind,
};
use ketwork::report::diagnostics::render;

struct Case {
    title: String,
    text: String,
    expected: String,
}

fn read(path: &Path) -> Vec<Case> {
    let content = fs::read_to_string(path).expect("a file of cases can be read");
    let blocks = content.split("==== ").skip(1);
    blocks
        .map(|block| {
            let (title, rest) = block.split_once('\n').expect("a title stands on its own line");
            let (text, expected) = rest.split_once("\n----\n").unwrap_or((rest.trim_end_matches('\n'), ""));
            Case {
                title: title.to_owned(),
                text: text.to_owned(),
                expected: expected.trim_end_matches('\n').to_owned(),
            }
        })
        .collect()
}

fn files(folder: &str) -> Vec<PathBuf> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("grammar/cases").join(folder);
    let listing = fs::read_dir(&folder).expect("the folder of cases exists");
    let mut files: Vec<PathBuf> = listing.map(|file| file.expect("a folder can be listed").path()).collect();
    files.sort();
    assert!(!files.is_empty());
    files
}

/// Puts characters that editors would hide or change in place of `\u{…}`.
fn unescaped(text: &str) -> String {
    let mut parts = text.split("\\u{");
    let mut plain = parts.next().unwrap_or_default().to_owned();
    for part in parts {
        let (number, rest) = part.split_once('}').expect("an escape is closed");
        let code = u32::from_str_radix(number, 16).expect("an escape holds a number");
        plain.push(char::from_u32(code).expect("an escape names a character"));
        plain.push_str(rest);
    }
    plain
}

/// Runs all cases of a folder; gives how many there were.
fn run(folder: &str, outcome: impl Fn(&str, bool) -> String) -> usize {
    let refresh = std::env::var_os("KETWORK_REFRESH").is_some();
    let (mut count, mut differing) = (0, Vec::new());
    for file in files(folder) {
        let whole_files = file.file_stem().is_some_and(|stem| stem == "files");
        let mut fresh = String::new();
        for case in read(&file) {
            let got = outcome(&unescaped(&case.text), whole_files);
            // Lines that end in blanks do not survive editors.
            let got = got.lines().map(str::trim_end).collect::<Vec<_>>().join("\n");
            if got != case.expected {
                differing.push(format!(
                    "{}: {}\nexpected\n{}\ngot\n{got}\n",
                    file.display(),
                    case.title,
                    case.expected
                ));
            }
            write!(fresh, "==== {}\n{}\n----\n{got}\n\n", case.title, case.text).expect("a string can be written to");
            count += 1;
        }
        if refresh {
            fs::write(&file, fresh.trim_end_matches('\n').to_owned() + "\n").expect("the file of cases can be written");
        }
    }
    assert!(refresh || differing.is_empty(), "{} cases differ\n{}", differing.len(), differing.join("\n"));
    count
}

#[test]
fn accepted_texts_become_their_trees() {
    let count = run("accepted", |text, whole_files| {
        if whole_files {
            return session_outline(text);
        }
        match parse_entry(text) {
            Ok(entry) => {
                let printed = entry.to_string();
                let again = parse_entry(&printed);
                assert!(again.is_ok_and(|again| again.same_as(&entry)), "{text} is printed as {printed}");
                format!("{printed}\n{}", outline(&entry))
            }
            Err(found) => format!("refused: {}", found[0].message),
        }
    });
    assert!(count >= 80, "only {count} cases");
}

#[test]
fn rejected_texts_are_explained() {
    let count = run("rejected", |text, whole_files| {
        let found =
            if whole_files { parse_session(text).diagnostics() } else { parse_entry(text).err().unwrap_or_default() };
        if found.is_empty() {
            return "accepted".to_owned();
        }
        for diagnostic in &found {
            assert!(diagnostic.help.is_some() || !diagnostic.label.is_empty(), "{text}");
        }
        let drawn: Vec<String> = found.iter().map(|found| render("a.ketwork", text, found, false)).collect();
        drawn.join("\n\n")
    });
    assert!(count >= 100, "only {count} cases");
}

/// One line for each piece of a session file.
fn session_outline(text: &str) -> String {
    let session = parse_session(text);
    assert_eq!(session.diagnostics(), []);
    assert_eq!(session.to_text(), text);
    let lines = session.items.iter().map(|item| match item {
        Item::Header(line) => format!("header      {}", line.text),
        Item::Provenance(line) => format!("provenance  {}", line.text),
        Item::Prose(line) => format!("prose       {}", line.text),
        Item::Blank(_) => "blank".to_owned(),
        Item::Stray(line) => format!("stray       {}", line.text),
        Item::Entry(entry) => {
            let parsed = entry.parsed.as_ref().expect("no entry is refused");
            let records: Vec<&str> = entry.records.iter().map(|record| record.text.as_str()).collect();
            let comment = entry.comment().map_or(String::new(), |comment| format!(" # {comment}"));
            format!("entry       {parsed}{comment} {records:?}")
        }
    });
    lines.collect::<Vec<_>>().join("\n")
}

// ---- trees in one line, every operation in its own brackets

fn outline(entry: &Entry) -> String {
    match &entry.kind {
        EntryKind::Digits(DigitsWanted::Exact) => "(digits exact)".to_owned(),
        EntryKind::Digits(DigitsWanted::Count(count)) => format!("(digits {})", tree(count)),
        EntryKind::Constants(name) => format!("(constants {name})"),
        EntryKind::System { name, kind, arguments } => format!("(system {name} {kind}{})", list(arguments, argument)),
        EntryKind::State { name, system, label } => format!("(state {name} {system} {})", label_outline(label)),
        EntryKind::Manifold { name, system, label } => format!("(manifold {name} {system} {})", label_outline(label)),
        EntryKind::Definition { kind, name, parameters, body } => {
            format!("({kind} {name} ({}) {})", list(parameters, |name| name.text.clone()).trim_start(), tree(body))
        }
        EntryKind::Evaluate { expression, unit: None } => format!("(evaluate {})", tree(expression)),
        EntryKind::Evaluate { expression, unit: Some(unit) } => {
            format!("(evaluate {} in {})", tree(expression), tree(unit))
        }
        EntryKind::Paths { expression, beside: None } => format!("(paths {})", tree(expression)),
        EntryKind::Paths { expression, beside: Some(beside) } => {
            format!("(paths {} {})", tree(expression), tree(beside))
        }
        EntryKind::Inspect { verb, expression } => format!("({verb} {})", tree(expression)),
        EntryKind::Compare { left, right } => format!("(compare {} {})", tree(left), tree(right)),
        EntryKind::Expect { left, right } => format!("(expect {} {})", tree(left), tree(right)),
        EntryKind::Sweep { variable, from, to, step, columns } => {
            format!("(sweep {variable} {} {} {}{})", tree(from), tree(to), tree(step), list(columns, tree))
        }
        EntryKind::Converge { expression, system, field, values } => {
            format!("(converge {} {system}.{field}{})", tree(expression), list(values, tree))
        }
        EntryKind::Budget { title, unit, lines } => {
            let unit = unit.as_ref().map_or(String::new(), |unit| format!(" in {}", tree(unit)));
            let lines = list(lines, |line| match &line.label {
                BudgetLabel::Contribution(label) => format!("({label:?} {})", tree(&line.value)),
                BudgetLabel::Measured => format!("(measured {})", tree(&line.value)),
            });
            format!("(budget {title:?}{unit}{lines})")
        }
    }
}

/// The items with a blank before each.
fn list<T>(items: &[T], show: impl Fn(&T) -> String) -> String {
    items.iter().map(|item| format!(" {}", show(item))).collect()
}

fn tree(expr: &Expr) -> String {
    match &expr.kind {
        ExprKind::Number(text) => text.clone(),
        ExprKind::Measured { value, uncertainty } => format!("(measured {value} {uncertainty})"),
        ExprKind::Name(name) => name.clone(),
        ExprKind::Member { owner, field } => format!("(member {owner} {field})"),
        ExprKind::Text(text) => format!("{text:?}"),
        ExprKind::List(elements) => format!("[{}]", list(elements, tree).trim_start()),
        ExprKind::Call { name, arguments, subscript } => {
            let subscript = subscript.as_ref().map_or(String::new(), |subscript| format!("_{subscript}"));
            format!("(call {name}{subscript}{})", list(arguments, argument))
        }
        ExprKind::Labelled { system, label } => format!("(labelled {system} {})", label_outline(label)),
        ExprKind::Negate(inner) => format!("(negate {})", tree(inner)),
        ExprKind::Primed(inner) => format!("(primed {})", tree(inner)),
        ExprKind::Without { body, manifold } => format!("(without {} {manifold})", tree(body)),
        ExprKind::Binary { operation, left, right } => {
            let sign = match operation {
                Operation::Add => "+",
                Operation::Subtract => "-",
                Operation::Multiply => "*",
                Operation::Juxtapose => "beside",
                Operation::Divide => "/",
                Operation::Power => "^",
            };
            format!("({sign} {} {})", tree(left), tree(right))
        }
        ExprKind::Bracket { bra, chain, ket } => {
            let chain = chain.as_ref().map_or(String::new(), |chain| format!(" {}", tree(chain)));
            format!("(bracket {}{chain} {})", state(bra), state(ket))
        }
        ExprKind::Ket(ket) => format!("(ket {})", state(ket)),
        ExprKind::Bra(bra) => format!("(bra {})", state(bra)),
    }
}

fn argument(argument: &Argument) -> String {
    match argument {
        Argument::Positional(value) => tree(value),
        Argument::Named { name, value } => format!("{name}={}", tree(value)),
        Argument::Range { variable, from, to } => format!("({variable} in {} {})", tree(from), tree(to)),
        Argument::At { variable, point } => format!("({variable} at {})", tree(point)),
        Argument::Level { label, value } => format!("(level {} {})", label_outline(label), tree(value)),
    }
}

fn state(state: &StateRef) -> String {
    match &state.kind {
        StateRefKind::Named { name, arguments } if arguments.is_empty() => name.text.clone(),
        StateRefKind::Named { name, arguments } => format!("({name}{})", list(arguments, tree)),
        StateRefKind::Labelled { system, label } => format!("(labelled {system} {})", label_outline(label)),
    }
}

fn label_outline(label: &Label) -> String {
    let parts = list(&label.parts, |part| match part {
        LabelPart::Text(text) => format!("{text:?}"),
        LabelPart::Computed(value) => format!("{{{}}}", tree(value)),
    });
    let options = list(&label.options, |(name, value)| format!("{name}={}", tree(value)));
    format!("[{}]", format!("{parts}{options}").trim_start())
}
