//! The words of the vocabulary as the names every session starts with.

use crate::lang::vocabulary::{Status, WordKind, is_reserved, vocabulary};
use crate::theory::Names;

/// Names in scope before the first entry.
pub fn names() -> Names {
    let mut names = Names::default();
    for (name, word) in vocabulary().names() {
        match (&word.status, word.kind) {
            (Status::Later(what), WordKind::Function | WordKind::Operator | WordKind::System) => {
                names.later.insert(base(name).to_string(), format!("`{name}`, {what}"));
            }
            (Status::Here, WordKind::Operator) => {
                names.operators.insert(base(name).to_string());
            }
            _ => {}
        }
    }
    // A word that is partly here (`p^2` of one electron, `p1^2` of two) is here.
    let here = names.operators.clone();
    names.later.retain(|name, _| !here.contains(name));
    names
}

/// The name before component and argument: `D` of `D_z`, `delta` of `delta(r)`, all of `spin_orbit`.
fn base(name: &str) -> &str {
    let name = name.split(['(', '^']).next().unwrap_or(name);
    match name.split_once('_') {
        Some((base, component)) if component.len() <= 2 => base,
        _ => name,
    }
}

/// Tells whether a word cannot be bound by an entry, since expressions could not tell it from its meaning in the language.
pub fn reserved(name: &str) -> bool {
    matches!(name, "H" | "E" | "i" | "pi" | "inf") || is_reserved(name)
}
