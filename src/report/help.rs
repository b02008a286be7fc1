//! Pages about the words of the language, drawn from the vocabulary.

use super::paint::Paint;
use crate::lang::vocabulary::{Status, Word, WordKind, did_you_mean, vocabulary};

/// Widest line of running text.
const WIDTH: usize = 78;

/// Names under which a group of words is found, apart from its title.
const GROUPS: [(&str, WordKind); 12] = [
    ("entries", WordKind::Entry),
    ("entry", WordKind::Entry),
    ("systems", WordKind::System),
    ("notation", WordKind::Topic),
    ("operators", WordKind::Operator),
    ("functions", WordKind::Function),
    ("constants", WordKind::Constant),
    ("units", WordKind::Unit),
    ("words", WordKind::Joining),
    ("prompt", WordKind::Command),
    ("commands", WordKind::Command),
    ("joining", WordKind::Joining),
];

/// The page about a word or a group of words.
///
/// *Errors*: what to say when there is no such page.
pub fn page(word: &str, paint: Paint) -> Result<String, String> {
    if word.is_empty() {
        return Ok(overview(paint));
    }
    // The page of a word goes first where both exist (`constants`), and names the group.
    let found = vocabulary().find(word);
    let group = GROUPS.iter().find(|(name, _)| *name == word).map(|(_, kind)| *kind);
    match (found, group) {
        (Some(found), None) => Ok(word_page(found, paint)),
        (Some(found), Some(kind)) => Ok(format!("{}\n{}", word_page(found, paint), group_page(kind, paint))),
        (None, Some(kind)) => Ok(group_page(kind, paint)),
        (None, None) => Err(unknown(word)),
    }
}

fn unknown(word: &str) -> String {
    let groups = GROUPS.iter().map(|(name, _)| *name);
    let shown: String = word.chars().take(40).collect();
    match did_you_mean(word, groups) {
        Some(near) => format!("there is no help about `{shown}`; did you mean `{near}`?"),
        None => format!("there is no help about `{shown}`; `help` lists what there is"),
    }
}

/// What can be typed, and where to read on.
fn overview(paint: Paint) -> String {
    let mut page = paragraph(
        "A session is a list of numbered entries, one a line. An entry declares something, or is an expression that is evaluated at once. \
         An entry goes on to the next line while a bracket is open or the line ends in an operator. What stands behind # is a comment. \
         Binding a name again revises the entry that bound it, and evaluates again whatever depends on it.",
        "",
    );
    for kind in [WordKind::Entry, WordKind::Command] {
        page.push('\n');
        page.push_str(&group_page(kind, paint));
    }
    page.push('\n');
    let others: Vec<&str> = ["systems", "operators", "functions", "constants", "units", "notation"]
        .into_iter()
        .filter(|name| GROUPS.iter().any(|(group, kind)| group == name && vocabulary().of_kind(*kind).next().is_some()))
        .collect();
    page.push_str(&paragraph(
        &format!("`help` with a word explains it; with {} it lists those.", others.join(", ")),
        "",
    ));
    page
}

fn group_page(kind: WordKind, paint: Paint) -> String {
    let words: Vec<&Word> = vocabulary().of_kind(kind).collect();
    let width = words.iter().map(|word| word.name.chars().count()).max().unwrap_or(0);
    let mut page = format!("{}\n", paint.heading(kind.title()));
    for word in words {
        let gap = " ".repeat(width - word.name.chars().count());
        let later = match &word.status {
            Status::Here => "",
            Status::Later(_) => " (not available yet)",
        };
        page.push_str(&format!("  {}{gap}  {}{}\n", paint.word(&word.name), word.brief, paint.faint(later)));
    }
    page
}

fn word_page(word: &Word, paint: Paint) -> String {
    let mut page = format!("{}\n  {}\n", paint.heading(&word.signature), word.brief);
    if let Status::Later(what) = &word.status {
        page.push_str(&format!("  {}\n", paint.warning(&format!("not available yet: {what}"))));
    }
    if !word.also.is_empty() {
        page.push_str(&paragraph(&format!("also here: {}", word.also.join(", ")), "  "));
    }
    for part in word.text.trim().split("\n\n") {
        page.push('\n');
        page.push_str(&paragraph(part, "  "));
    }
    for example in &word.examples {
        page.push_str(&format!("\n  {}\n", paint.faint("example")));
        for line in example.trim_end().lines() {
            page.push_str(&format!("    {line}\n"));
        }
    }
    if let Some(source) = &word.source {
        page.push('\n');
        page.push_str(&paragraph(&format!("source: {source}"), "  "));
    }
    page
}

/// Running text, wrapped; lines that begin with blanks are kept as they are.
fn paragraph(text: &str, indent: &str) -> String {
    let mut page = String::new();
    let mut line = String::new();
    let flush = |line: &mut String, page: &mut String| {
        if !line.is_empty() {
            page.push_str(&format!("{indent}{line}\n"));
            line.clear();
        }
    };
    for written in text.lines() {
        if written.starts_with([' ', '\t']) {
            flush(&mut line, &mut page);
            page.push_str(&format!("{indent}{}\n", written.trim_end()));
            continue;
        }
        for word in written.split_whitespace() {
            let reach = line.chars().count() + 1 + word.chars().count() + indent.len();
            if !line.is_empty() && reach > WIDTH {
                flush(&mut line, &mut page);
            }
            if !line.is_empty() {
                line.push(' ');
            }
            line.push_str(word);
        }
    }
    flush(&mut line, &mut page);
    page
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_word_and_group_has_a_page() {
        for (name, word) in vocabulary().names() {
            let page = page(name, Paint::PLAIN);
            assert!(page.as_ref().is_ok_and(|page| page.contains(word.brief.as_str())), "{name}: {page:?}");
        }
        for (group, kind) in GROUPS {
            let page = page(group, Paint::PLAIN);
            assert!(page.is_ok_and(|page| page.contains(kind.title())), "{group}");
        }
        assert!(page("", Paint::PLAIN).is_ok_and(|page| page.contains("resolvent")));
    }

    #[test]
    fn a_misspelt_word_is_offered() {
        assert_eq!(
            page("resolvant", Paint::PLAIN),
            Err("there is no help about `resolvant`; did you mean `resolvent`?".into())
        );
        assert_eq!(
            page("zzzzzz", Paint::PLAIN),
            Err("there is no help about `zzzzzz`; `help` lists what there is".into())
        );
    }

    #[test]
    fn running_text_is_wrapped_and_shown_lines_are_kept() {
        let text = format!("{} end\n    kept   line\nafter", "word ".repeat(30));
        let page = paragraph(&text, "  ");
        assert!(page.lines().all(|line| line.len() <= WIDTH), "{page}");
        assert!(page.contains("\n      kept   line\n  after\n"), "{page}");
    }
}
