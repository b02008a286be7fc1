//! Every defect of a level table as a person is told it. `KETWORK_REFRESH=1` writes the file of cases anew, to be read before it is committed.

use super::session_of;
use ketwork::num::units::ConstantSet;
use ketwork::session::Outcome;
use ketwork::systems::levels::{LevelSystem, TableFault};
use std::collections::HashSet;
use std::fmt::Write as _;
use std::fs;
use std::path::PathBuf;

/// What is told of a table.
fn told(table: &str) -> String {
    let session = session_of(table);
    let Some(Outcome::Failed(reports)) = session.entry(1).and_then(|entry| entry.outcome) else {
        return "accepted".to_string();
    };
    let mut out = String::new();
    for report in reports {
        let diagnostic = &report.diagnostic;
        writeln!(out, "{}", diagnostic.message).expect("a string can be written to");
        for note in &diagnostic.notes {
            writeln!(out, "  note: {note}").expect("a string can be written to");
        }
        let help = diagnostic.help.as_deref().expect("every defect has a cure");
        writeln!(out, "  help: {help}").expect("a string can be written to");
    }
    out.trim_end().to_string()
}

fn cases() -> (PathBuf, Vec<(String, String, String)>) {
    let path = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/levels/defects.txt");
    let content = fs::read_to_string(&path).expect("the file of cases");
    let split = |block: &str| {
        let (title, rest) = block.split_once('\n').expect("a title stands on its own line");
        let (text, expected) = rest.split_once("\n----\n").expect("a case has an outcome");
        (title.to_string(), text.to_string(), expected.trim_end().to_string())
    };
    let cases = content.split("==== ").skip(1).map(split).collect();
    (path, cases)
}

#[test]
fn every_defect_is_told_by_line_and_column() {
    let (path, cases) = cases();
    let refresh = std::env::var_os("KETWORK_REFRESH").is_some();
    let (mut fresh, mut differing) = (String::new(), Vec::new());
    for (title, text, expected) in &cases {
        let got = told(text);
        if got != *expected {
            differing.push(format!("{title}\nexpected\n{expected}\ngot\n{got}"));
        }
        write!(fresh, "==== {title}\n{text}\n----\n{got}\n\n").expect("a string can be written to");
    }
    if refresh {
        fs::write(path, fresh.trim_end().to_string() + "\n").expect("the file of cases can be written");
    }
    assert!(refresh || differing.is_empty(), "{}", differing.join("\n\n"));
}

/// The tables too large to stand in the file of cases.
fn large() -> Vec<String> {
    let header = "row,name,energy,unit,J,parity\n";
    let levels: String = (0..=10_000).fold(String::from(header), |out, n| out + &format!("level,w{n},{n},Hz,0,even\n"));
    let pairs = (0..320_u32).flat_map(|a| (0..=a).map(move |b| (a, b))).take(50_001);
    let few: String = (0..320).fold(String::from(header), |out, n| out + &format!("level,w{n},{n},Hz,0,even\n"));
    let elements = pairs
        .fold(few + "row,from,to,operator,rank,value\n", |out, (a, b)| out + &format!("element,w{a},w{b},W,0,1\n"));
    vec![
        format!("{header}level,{},0,cm^-1,0,even\n", "x".repeat(1001)),
        format!("{header}level{}\n", ",".repeat(1000)),
        format!("{header}{}", "# a long story\n".repeat(100_000)),
        levels,
        elements,
    ]
}

/// No kind of defect without a case.
#[test]
fn every_kind_of_defect_has_a_case() {
    let mut seen = HashSet::new();
    let mut look = |text: &str| {
        if let Err(faults) = LevelSystem::read(text, ConstantSet::default()) {
            seen.extend(faults.iter().map(|TableFault { defect, .. }| std::mem::discriminant(defect)));
        }
    };
    cases().1.iter().for_each(|(_, text, _)| look(text));
    large().iter().for_each(|text| look(text));
    let kinds = include_str!("../../src/systems/levels/fault.rs").matches("    #[error(").count();
    assert!(kinds > 40);
    assert_eq!(seen.len(), kinds, "some kind of defect has no case");
}

#[test]
fn large_tables_are_refused_in_words() {
    let told: Vec<String> = large().iter().map(|text| told(text)).collect();
    for (text, words) in
        told.iter().zip(["1001 characters", "1001 cells", "100000 lines", "10000 levels", "50000 elements"])
    {
        assert!(text.contains(words), "{text}");
    }
}

#[test]
fn defects_are_told_up_to_a_number() {
    let rows: String = (0..100).map(|n| format!("level,w{n},?,cm^-1,0,even\n")).collect();
    let text = told(&format!("row,name,energy,unit,J,parity\n{rows}"));
    assert!(text.starts_with("\"k.csv\" has at least 20 defects\n"), "{text}");
    assert_eq!(text.matches("  note: line ").count(), 20);
}
