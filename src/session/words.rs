//! The words of the vocabulary as the names every session starts with.

use crate::lang::vocabulary::{self, Kind};
use crate::theory::Names;

/// Names in scope before the first entry.
pub fn names() -> Names {
    let mut names = Names::default();
    for word in vocabulary::entries() {
        if let Some(what) = word.later() {
            names.later.insert(word.name.clone(), format!("`{}`, {what}", word.name));
            continue;
        }
        match word.kind {
            Kind::Operator => {
                names.operators.insert(base(&word.name).to_string());
            }
            Kind::Unit => {
                names.units.insert(word.name.clone());
            }
            _ => {}
        }
    }
    names
}

/// The name before component and argument: `D` of `D_z`, `delta` of `delta(r)`.
fn base(name: &str) -> &str {
    name.split(['_', '(', '^']).next().unwrap_or(name)
}

/// Tells whether a word cannot be bound by an entry, since expressions could not tell it from its meaning in the language.
pub fn reserved(name: &str) -> bool {
    matches!(name, "H" | "E" | "i" | "pi" | "inf")
        || vocabulary::entries().iter().any(|word| {
            matches!(word.kind, Kind::Function | Kind::Entry) && word.name == name
        })
}
