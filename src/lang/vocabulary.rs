//! The words of the language, read from `grammar/vocabulary.toml`: parser, completion and help ask here, and nothing is listed twice.

use std::collections::BTreeMap;
use std::sync::OnceLock;

use serde::{Deserialize, Serialize};

use super::diagnostic;

/// What a word is.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Debug, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum WordKind {
    /// Begins an entry: `state`, `define`, `compare`
    Entry,
    /// Joins the parts of an entry: `in`, `with`, `over`
    Joining,
    /// Typed at the prompt only: `save`, `list`
    Command,
    /// Kind of a system: `hydrogenic`
    System,
    Function,
    Operator,
    Constant,
    Unit,
    /// A page of help about a notation, no word of its own: `label`, `bracket`
    Topic,
}

impl WordKind {
    /// Names the kind in a heading.
    pub fn title(self) -> &'static str {
        match self {
            WordKind::Entry => "entries",
            WordKind::Joining => "joining words",
            WordKind::Command => "commands of the prompt",
            WordKind::System => "systems",
            WordKind::Function => "functions",
            WordKind::Operator => "operators",
            WordKind::Constant => "constants",
            WordKind::Unit => "units",
            WordKind::Topic => "notation",
        }
    }

    pub const ALL: [WordKind; 9] = [
        WordKind::Entry,
        WordKind::System,
        WordKind::Topic,
        WordKind::Operator,
        WordKind::Function,
        WordKind::Constant,
        WordKind::Unit,
        WordKind::Joining,
        WordKind::Command,
    ];
}

/// Whether this version can evaluate the word, or which coming part brings it.
#[derive(Clone, PartialEq, Eq, Debug, Serialize, Deserialize)]
#[serde(from = "String", into = "String")]
pub enum Status {
    Here,
    /// What it waits for, as in `later: two-electron atoms`
    Later(String),
}

impl From<String> for Status {
    fn from(text: String) -> Self {
        match text.strip_prefix("later:") {
            Some(what) => Status::Later(what.trim().to_owned()),
            None => Status::Here,
        }
    }
}

impl From<Status> for String {
    fn from(status: Status) -> Self {
        match status {
            Status::Here => "here".to_owned(),
            Status::Later(what) => format!("later: {what}"),
        }
    }
}

/// A word of the language with its help.
#[derive(Clone, Debug, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Word {
    pub name: String,
    /// Other words the same page explains: the components of an operator, the multiples of a unit.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub also: Vec<String>,
    pub kind: WordKind,
    pub signature: String,
    /// The one-line help.
    pub brief: String,
    pub text: String,
    /// Sessions without their first line, each with its records where it can be evaluated.
    #[serde(default)]
    pub examples: Vec<String>,
    /// Where a formula or convention comes from.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub source: Option<String>,
    pub status: Status,
}

#[derive(Deserialize)]
struct Listing {
    word: Vec<Word>,
}

/// All words, in the order of the file.
#[derive(Debug)]
pub struct Vocabulary {
    words: Vec<Word>,
    by_name: BTreeMap<String, usize>,
}

const SOURCE: &str = include_str!("../../grammar/vocabulary.toml");

fn read(source: &str) -> Result<Vocabulary, toml::de::Error> {
    let listing: Listing = toml::from_str(source)?;
    let mut by_name = BTreeMap::new();
    for (index, word) in listing.word.iter().enumerate() {
        for name in std::iter::once(&word.name).chain(&word.also) {
            by_name.entry(name.clone()).or_insert(index);
        }
    }
    Ok(Vocabulary { words: listing.word, by_name })
}

/// The vocabulary of this version, read once.
///
/// *Cost*: a few milliseconds at the first call.
pub fn vocabulary() -> &'static Vocabulary {
    static VOCABULARY: OnceLock<Vocabulary> = OnceLock::new();
    // The file is part of the program; a test holds that it can be read.
    VOCABULARY.get_or_init(|| read(SOURCE).unwrap_or(Vocabulary { words: Vec::new(), by_name: BTreeMap::new() }))
}

impl Vocabulary {
    pub fn words(&self) -> &[Word] {
        &self.words
    }

    /// Finds the page that explains a word.
    pub fn find(&self, name: &str) -> Option<&Word> {
        self.by_name.get(name).map(|index| &self.words[*index])
    }

    pub fn of_kind(&self, kind: WordKind) -> impl Iterator<Item = &Word> {
        self.words.iter().filter(move |word| word.kind == kind)
    }

    /// All names of all words, for completion.
    pub fn names(&self) -> impl Iterator<Item = (&str, &Word)> {
        self.words
            .iter()
            .flat_map(|word| std::iter::once(&word.name).chain(&word.also).map(move |name| (name.as_str(), word)))
    }

    fn is(&self, name: &str, kind: WordKind) -> bool {
        self.find(name).is_some_and(|word| word.kind == kind)
    }
}

pub fn is_entry_word(word: &str) -> bool {
    vocabulary().is(word, WordKind::Entry)
}

/// Says whether a word stands between the parts of entries and therefore ends an expression.
pub fn is_joining_word(word: &str) -> bool {
    vocabulary().is(word, WordKind::Joining)
}

/// Says whether a word can be neither a name nor part of an expression.
pub fn is_reserved(word: &str) -> bool {
    vocabulary().find(word).is_some_and(|found| matches!(found.kind, WordKind::Entry | WordKind::Joining))
}

/// Says whether a word is a command of the prompt, which cannot be bound as a name.
pub fn is_command(word: &str) -> bool {
    vocabulary().is(word, WordKind::Command)
}

/// Offers the word meant by a misspelt one, from the vocabulary and from the names given.
///
/// The names given come first: they are what the session itself has declared.
pub fn did_you_mean<'a>(word: &str, names: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    let words = vocabulary().names().filter(|(_, word)| word.kind != WordKind::Topic).map(|(name, _)| name);
    diagnostic::did_you_mean(word, names.into_iter().chain(words))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_vocabulary_can_be_read() {
        let vocabulary = read(SOURCE).map_err(|error| error.to_string());
        assert!(vocabulary.as_ref().is_ok_and(|vocabulary| vocabulary.words().len() > 60), "{:?}", vocabulary.err());
    }

    #[test]
    fn no_word_is_listed_twice() {
        let mut seen = std::collections::BTreeSet::new();
        for (name, _) in vocabulary().names() {
            assert!(seen.insert(name), "{name} is listed twice");
        }
    }

    #[test]
    fn every_page_is_complete() {
        for word in vocabulary().words() {
            assert!(!word.brief.is_empty() && word.brief.len() <= 100, "{}: {}", word.name, word.brief);
            assert!(!word.brief.contains('\n') && !word.signature.is_empty() && !word.text.is_empty(), "{}", word.name);
        }
    }

    #[test]
    fn misspelt_words_are_found() {
        assert_eq!(did_you_mean("hydrogenc", []), Some("hydrogenic"));
        assert_eq!(did_you_mean("polz", ["pol"]), Some("pol"));
    }
}
