//! What the Tab key offers: words of the vocabulary, the session's names, files.

use super::command::WORDS;
use crate::lang::vocabulary::{WordKind, vocabulary};
use std::fs;
use std::path::Path;

/// Candidates, and the bytes of the line that the chosen one replaces.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Offer {
    pub start: usize,
    pub end: usize,
    pub candidates: Vec<String>,
}

/// Finds what could stand at the cursor.
///
/// Words that begin like the part before the cursor go first; if there are none, words that contain it: `velocity` offers `mass_velocity`.
pub fn offer(line: &str, cursor: usize, names: &[String]) -> Offer {
    let (first, rest_at) = first_word(line);
    if matches!(first, "open" | "save") && cursor >= rest_at {
        return files(line, rest_at);
    }
    let (start, end) = word_at(line, cursor);
    let typed = &line[start..cursor];
    let at_beginning = line[..start].trim().is_empty();
    let known: Vec<&str> = if first == "help" && !at_beginning {
        let groups = ["entries", "systems", "operators", "functions", "units", "notation", "prompt"];
        vocabulary().names().map(|(name, _)| name).chain(groups).collect()
    } else {
        let fits = |kind: WordKind| match kind {
            WordKind::Entry => at_beginning,
            WordKind::Joining => !at_beginning,
            WordKind::Command | WordKind::Topic => false,
            _ => true,
        };
        let commands = WORDS.into_iter().filter(|_| at_beginning);
        let words = vocabulary().names().filter(|(_, word)| fits(word.kind)).map(|(name, _)| name);
        names.iter().map(String::as_str).chain(commands).chain(words).collect()
    };
    Offer { start, end, candidates: matching(typed, &known) }
}

fn matching(typed: &str, known: &[&str]) -> Vec<String> {
    let pick = |fits: &dyn Fn(&str) -> bool| {
        let mut picked: Vec<String> = known.iter().filter(|name| fits(name)).map(|name| (*name).to_string()).collect();
        picked.sort();
        picked.dedup();
        picked
    };
    let begin = pick(&|name| name.starts_with(typed));
    if !begin.is_empty() || typed.is_empty() {
        return begin;
    }
    let lower = typed.to_lowercase();
    let similar = pick(&|name| name.to_lowercase().starts_with(&lower));
    if similar.is_empty() { pick(&|name| name.to_lowercase().contains(&lower)) } else { similar }
}

/// The first word of a line and where what follows it begins.
fn first_word(line: &str) -> (&str, usize) {
    let trimmed = line.trim_start();
    let lead = line.len() - trimmed.len();
    let length = trimmed.find(char::is_whitespace).unwrap_or(trimmed.len());
    let rest = &trimmed[length..];
    let rest_at = lead + length + (rest.len() - rest.trim_start().len()).max(1);
    (&trimmed[..length], rest_at)
}

/// The word around the cursor; `D_+1` and `codata.alpha` are words.
pub fn word_at(line: &str, cursor: usize) -> (usize, usize) {
    let belongs = |at: usize, character: char| {
        character.is_alphanumeric()
            || character == '_'
            || (matches!(character, '+' | '-') && line[..at].ends_with('_'))
            || (character == '.' && !line[..at].ends_with('.') && !line[at + 1..].starts_with('.'))
    };
    let start = line[..cursor]
        .char_indices()
        .rev()
        .take_while(|(at, character)| belongs(*at, *character))
        .last()
        .map_or(cursor, |(at, _)| at);
    let end = line[cursor..]
        .char_indices()
        .find(|(at, character)| !belongs(cursor + at, *character))
        .map_or(line.len(), |(at, _)| cursor + at);
    (start, end)
}

/// Session files and folders that continue what is typed.
fn files(line: &str, rest_at: usize) -> Offer {
    let start = rest_at.min(line.len());
    let typed = &line[start..];
    let (folder, stem) = typed.rsplit_once('/').map_or(("", typed), |(folder, stem)| (folder, stem));
    let place = match (folder, typed.starts_with('/')) {
        ("", true) => Path::new("/"),
        ("", false) => Path::new("."),
        (folder, _) => Path::new(folder),
    };
    let prefix = &typed[..typed.len() - stem.len()];
    let mut candidates: Vec<String> = fs::read_dir(place)
        .into_iter()
        .flatten()
        .filter_map(Result::ok)
        .filter_map(|entry| {
            let name = entry.file_name().into_string().ok()?;
            let fits = name.starts_with(stem) && (!name.starts_with('.') || stem.starts_with('.'));
            let folder = entry.file_type().ok()?.is_dir();
            let session = name.ends_with(".ketwork");
            (fits && (folder || session)).then(|| format!("{prefix}{name}{}", if folder { "/" } else { "" }))
        })
        .collect();
    candidates.sort();
    Offer { start, end: line.len(), candidates }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn offered(line: &str, cursor: usize) -> Vec<String> {
        offer(line, cursor, &["pol".to_string(), "polar_x".to_string()]).candidates
    }

    #[test]
    fn names_and_words_are_offered_where_they_fit() {
        assert_eq!(offered("resol", 5), ["resolvent"]);
        assert!(offered("1 + resol", 9).is_empty(), "entries begin lines");
        assert_eq!(offered("1/po", 4), ["pol", "polar_x"]);
        assert_eq!(offered("<g|D_", 5).first().map(String::as_str), Some("D_+1"));
        assert_eq!(offered("qui", 3), ["quit"]);
        assert_eq!(offered("help hydro", 10), ["hydrogenic"]);
    }

    #[test]
    fn a_word_is_found_by_its_inside() {
        assert!(offered("1 + velocity", 12).contains(&"mass_velocity".to_string()));
        assert_eq!(offered("RESOL", 5), ["resolvent"]);
    }

    #[test]
    fn the_whole_word_around_the_cursor_is_replaced() {
        assert_eq!(word_at("<g|D_+1|g>", 5), (3, 7));
        assert_eq!(word_at("a + codata.al", 13), (4, 13));
        assert_eq!(word_at("0..inf", 6), (3, 6));
        assert_eq!(word_at("ω+", 2), (0, 2));
        assert_eq!(word_at("", 0), (0, 0));
        let offer = offer("2 pol(w)", 4, &["pol".to_string()]);
        assert_eq!((offer.start, offer.end, offer.candidates), (2, 5, vec!["pol".to_string()]));
    }
}
