//! The house keeps its rules: arrows between the rooms, silence below the top floor, sizes, words, what stands at the top level.

use std::fs;
use std::path::{Path, PathBuf};
use std::process::Command;

/// The rooms of src/ and, for each, those that it may use: the ones on the floors below. Theory and systems do not see each other;
/// session and report share a floor, and a report shows what a session holds.
const ROOMS: [(&str, &[&str]); 10] = [
    ("num", &[]),
    ("lang", &["num"]),
    ("linalg", &["num"]),
    ("angular", &["num"]),
    ("theory", &["num", "lang", "linalg", "angular"]),
    ("systems", &["num", "lang", "linalg", "angular"]),
    ("sums", &["num", "lang", "linalg", "angular", "theory", "systems"]),
    ("session", &["num", "lang", "linalg", "angular", "theory", "systems", "sums", "report"]),
    ("report", &["num", "lang", "linalg", "angular", "theory", "systems", "sums", "session"]),
    ("app", &["num", "lang", "linalg", "angular", "theory", "systems", "sums", "session", "report"]),
];

/// What only the top floor may do: print, and look at clock, environment and files.
const OUTSIDE: [&str; 13] = [
    "println!",
    "eprintln!",
    "print!(",
    "eprint!(",
    "std::env",
    "std::fs",
    "std::io",
    "std::net",
    "std::process",
    "Instant",
    "SystemTime",
    "temp_dir",
    "File::open",
];

/// Lines a file of src/ may have, its unit tests not counted: one file is one idea.
const LONGEST_FILE: usize = 600;

/// A file below src/: its room, its path from there, its text.
struct Source {
    room: String,
    path: PathBuf,
    text: String,
}

impl Source {
    /// The lines with their numbers, without comments and without unit tests.
    fn code(&self) -> impl Iterator<Item = (usize, &str)> {
        let is_test = self.path.components().any(|part| part.as_os_str() == "tests");
        self.text
            .lines()
            .enumerate()
            .take_while(move |(_, line)| !is_test && *line != "#[cfg(test)]")
            .map(|(at, line)| (at + 1, line.split("//").next().unwrap_or_default()))
    }
}

fn root() -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR"))
}

/// Every file below a folder, in the order of their names.
fn files(folder: &Path) -> Vec<PathBuf> {
    let mut entries: Vec<PathBuf> =
        fs::read_dir(folder).expect("a folder").map(|entry| entry.expect("an entry").path()).collect();
    entries.sort();
    entries.into_iter().flat_map(|path| if path.is_dir() { files(&path) } else { vec![path] }).collect()
}

fn sources() -> Vec<Source> {
    let src = root().join("src");
    let sources: Vec<Source> = files(&src)
        .into_iter()
        .filter(|path| path.extension().is_some_and(|ending| ending == "rs"))
        .map(|file| {
            let path = file.strip_prefix(&src).expect("below src").to_path_buf();
            let room = path.iter().next().expect("a name").to_string_lossy().into_owned();
            Source { room, path, text: fs::read_to_string(&file).expect("text") }
        })
        .collect();
    assert!(sources.len() > 50, "the sources were not found");
    sources
}

/// The rooms a line names behind `crate::`, in braces as well: `crate::num::Effort`, `crate::{lang, num::Ball}`.
fn rooms_named(line: &str) -> Vec<String> {
    let mut named = Vec::new();
    for part in line.split("crate::").skip(1) {
        let list = part.strip_prefix('{').map(|inner| inner.split('}').next().unwrap_or(inner));
        for path in list.unwrap_or(part).split(',').take(if list.is_some() { usize::MAX } else { 1 }) {
            named.push(path.trim().chars().take_while(|c| c.is_ascii_lowercase() || *c == '_').collect());
        }
    }
    named
}

#[test]
fn arrows_run_down() {
    assert_eq!(rooms_named("use crate::{lang, num::Ball};"), ["lang", "num"]);
    assert_eq!(rooms_named("fn f(a: crate::num::Ball, b: crate::sums::Value)"), ["num", "sums"]);
    let mut seen = 0;
    for source in sources() {
        // lib.rs and main.rs stand above the rooms.
        let Some((room, below)) = ROOMS.iter().find(|(room, _)| *room == source.room) else { continue };
        for (at, line) in source.code() {
            for used in rooms_named(line) {
                if ROOMS.iter().any(|(known, _)| *known == used) && used != *room {
                    seen += 1;
                    assert!(
                        below.contains(&used.as_str()),
                        "{}:{at}: {room} may not use {used}",
                        source.path.display()
                    );
                }
            }
        }
    }
    assert!(seen > 100, "no arrows were read");
}

#[test]
fn every_room_is_on_the_map() {
    let map = fs::read_to_string(root().join("src/lib.rs")).expect("text");
    for (room, _) in ROOMS {
        assert!(map.contains(&format!("pub mod {room};")), "{room} is not in lib.rs");
    }
    for source in sources() {
        let known = ROOMS.iter().any(|(room, _)| *room == source.room);
        assert!(
            known || ["lib.rs", "main.rs"].contains(&source.room.as_str()),
            "{} is in no room",
            source.path.display()
        );
    }
}

#[test]
fn nothing_below_the_top_floor_speaks_or_looks_outside() {
    for source in sources().iter().filter(|source| source.room != "app" && source.room != "main.rs") {
        for (at, line) in source.code() {
            for word in OUTSIDE {
                assert!(!line.contains(word), "{}:{at}: {word}", source.path.display());
            }
        }
    }
}

#[test]
fn files_hold_one_idea() {
    for source in sources() {
        let lines = source.code().count();
        assert!(lines <= LONGEST_FILE, "{} has {lines} lines", source.path.display());
    }
}

#[test]
fn nothing_is_left_unfinished() {
    for source in sources() {
        for word in ["todo!", "unimplemented!", "dbg!", "#[ignore"] {
            assert!(!source.text.contains(word), "{} holds {word}", source.path.display());
        }
    }
}

/// Where the project is read, nothing depends on the machine it was written on, and no address leads out of it.
#[test]
fn no_text_names_a_machine() {
    // In pieces, so that this file does not hold them.
    let machine = [["/ho", "me/"], ["/ro", "ot/"], ["/tm", "p/"], ["C:", "\\\\"], ["http", "://"], ["http", "s://"]]
        .map(|word| word.concat());
    let unfinished = [["TO", "DO"], ["FIX", "ME"], ["XX", "X"]].map(|word| word.concat());
    let places =
        ["src", "grammar", "sessions", "tests", ".ci", "README.md", "DEVELOPERS.md", "Cargo.toml", ".clippy.toml"];
    let mut read = 0;
    for place in places.map(|place| root().join(place)) {
        for file in if place.is_dir() { files(&place) } else { vec![place] } {
            // Files of bytes, such as those that hostile input is tested with, are no text.
            let Ok(text) = fs::read_to_string(&file) else { continue };
            read += 1;
            for (at, line) in text.lines().enumerate() {
                for word in machine.iter().chain(&unfinished) {
                    assert!(!line.contains(word), "{}:{}: {word}", file.display(), at + 1);
                }
            }
        }
    }
    assert!(read > 100, "the files were not found");
}

/// The session that the README shows is a real one: it replays to the records it shows.
#[test]
fn the_tour_of_the_readme_replays() {
    let readme = fs::read_to_string(root().join("README.md")).expect("text");
    let tour = readme.split("<!-- tour -->").nth(1).and_then(|rest| rest.split("```").nth(1)).expect("a tour");
    let folder = tempfile::tempdir().expect("a folder");
    let file = folder.path().join("tour.ketwork");
    fs::write(&file, tour.strip_prefix("text\n").expect("a block of text")).expect("written");
    let run = Command::new(env!("CARGO_BIN_EXE_ketwork")).arg("replay").arg(&file).output().expect("ketwork runs");
    let told = String::from_utf8_lossy(&run.stdout);
    assert!(run.status.success() && told.contains(": 8 agree"), "{told}{}", String::from_utf8_lossy(&run.stderr));
}

#[test]
fn the_top_level_is_the_one_agreed_on() {
    let agreed = [
        "Cargo.lock",
        "Cargo.toml",
        "DEVELOPERS.md",
        "LICENSE",
        "README.md",
        "grammar",
        "sessions",
        "src",
        "target",
        "tests",
    ];
    let hidden = [".ci", ".clippy.toml", ".config", ".git", ".gitignore", ".rustfmt.toml"];
    for entry in fs::read_dir(root()).expect("the checkout") {
        let name = entry.expect("an entry").file_name().to_string_lossy().into_owned();
        assert!(agreed.contains(&name.as_str()) || hidden.contains(&name.as_str()), "{name} stands at the top level");
    }
}
