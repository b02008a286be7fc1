//! The reference page of the language, drawn from the vocabulary like `help`.

use crate::lang::vocabulary::{Status, WordKind, vocabulary};
use std::fmt::Write;

/// The reference as Markdown; `grammar/reference.md` is this text, and a test keeps it fresh.
pub fn markdown() -> String {
    let mut page = String::from(
        "# Reference of the session language\n\n\
         Written from `grammar/vocabulary.toml`; `ketwork help WORD` shows the same pages. The grammar is `session.ebnf`.\n",
    );
    for kind in WordKind::ALL {
        // Writing into a string does not fail.
        let _ = write!(page, "\n## {}\n", kind.title());
        for word in vocabulary().of_kind(kind) {
            let _ = write!(page, "\n### `{}`\n\n{}.\n", word.signature, word.brief.trim_end_matches('.'));
            if let Status::Later(what) = &word.status {
                let _ = write!(page, "\nNot available yet: {what}.\n");
            }
            if !word.also.is_empty() {
                let list: Vec<String> = word.also.iter().map(|name| format!("`{name}`")).collect();
                let _ = write!(page, "\nAlso here: {}.\n", list.join(", "));
            }
            if !word.text.trim().is_empty() {
                let _ = write!(page, "\n{}\n", word.text.trim());
            }
            for example in &word.examples {
                let _ = write!(page, "\n```text\n{}\n```\n", example.trim());
            }
            if let Some(source) = &word.source {
                let _ = write!(page, "\nSource: {}.\n", source.trim().trim_end_matches('.'));
            }
        }
    }
    page
}
