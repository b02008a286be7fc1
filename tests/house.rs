//! The house keeps its rules: arrows between the rooms, silence below the top floor, sizes, words.

use std::fs;
use std::path::{Path, PathBuf};

fn root() -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR"))
}

fn files(folder: &Path, ending: &str, found: &mut Vec<PathBuf>) {
    for entry in fs::read_dir(folder).expect("a folder").map(|entry| entry.expect("an entry").path()) {
        if entry.is_dir() {
            files(&entry, ending, found);
        } else if entry.extension().is_some_and(|extension| extension == ending) {
            found.push(entry);
        }
    }
}

fn sources() -> Vec<(String, PathBuf, String)> {
    let mut found = Vec::new();
    files(&root().join("src"), "rs", &mut found);
    assert!(found.len() > 50, "the sources were not found");
    found.sort();
    found
        .into_iter()
        .map(|path| {
            let inside = path.strip_prefix(root().join("src")).expect("below src");
            let room = inside.components().next().expect("a name").as_os_str().to_string_lossy().into_owned();
            let text = fs::read_to_string(&path).expect("text");
            (room, path, text)
        })
        .collect()
}

/// The rooms a room may use: those on the floors below it.
fn below(room: &str) -> &'static [&'static str] {
    match room {
        "num" => &[],
        "lang" | "linalg" | "angular" => &["num"],
        "theory" => &["num", "lang"],
        "systems" => &["num", "linalg", "angular"],
        "sums" => &["num", "linalg", "angular", "theory", "systems", "lang"],
        "report" | "session" => &["num", "lang", "linalg", "angular", "theory", "systems", "sums", "report", "session"],
        _ => &["num", "lang", "linalg", "angular", "theory", "systems", "sums", "report", "session", "app"],
    }
}

#[test]
fn arrows_run_down() {
    let mut seen = 0;
    for (room, path, text) in sources() {
        for (at, line) in text.lines().enumerate() {
            for part in line.split("crate::").skip(1) {
                let used: String = part.chars().take_while(|c| c.is_ascii_lowercase() || *c == '_').collect();
                if used.is_empty() || used == room {
                    continue;
                }
                seen += 1;
                assert!(
                    below(&room).contains(&used.as_str()),
                    "{}:{}: {room} may not use {used}",
                    path.display(),
                    at + 1
                );
            }
        }
    }
    assert!(seen > 100, "no arrows were read");
}

#[test]
fn nothing_below_the_top_floor_speaks_or_looks_outside() {
    let outside = ["println!", "eprintln!", "print!(", "std::env", "std::fs", "SystemTime", "Instant::now", "std::io"];
    for (room, path, text) in sources() {
        if room == "app" || room == "main.rs" {
            continue;
        }
        let code = text.split("#[cfg(test)]").next().unwrap_or_default();
        if path.to_string_lossy().contains("tests") {
            continue;
        }
        for word in outside {
            assert!(!code.contains(word), "{} uses {word}", path.display());
        }
    }
}

#[test]
fn files_hold_one_idea() {
    for (_, path, text) in sources() {
        let lines = text.lines().count();
        assert!(lines <= 750, "{} has {lines} lines", path.display());
    }
}

#[test]
fn nothing_is_left_unfinished() {
    for (_, path, text) in sources() {
        for word in ["todo!", "unimplemented!", "dbg!"] {
            assert!(!text.contains(word), "{} holds {word}", path.display());
        }
    }
}

#[test]
fn the_top_level_is_the_one_agreed_on() {
    let allowed = [
        "Cargo.toml",
        "Cargo.lock",
        "README.md",
        "DEVELOPERS.md",
        "LICENSE",
        "src",
        "grammar",
        "tests",
        "sessions",
        "target",
    ];
    for entry in fs::read_dir(root()).expect("the checkout").map(|entry| entry.expect("an entry").file_name()) {
        let name = entry.to_string_lossy().into_owned();
        assert!(name.starts_with('.') || allowed.contains(&name.as_str()), "{name} stands at the top level");
    }
}
