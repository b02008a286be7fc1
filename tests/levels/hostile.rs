//! Files that nobody would write: read in time, without a panic.

use super::random::{Random, cases};
use ketwork::num::units::ConstantSet;
use ketwork::systems::levels::LevelSystem;

const GOOD: &str = include_str!("../../grammar/level-table.csv");

/// Pieces that a mutation puts in.
const PIECES: [&str; 16] =
    [",", "\"", "\n", "\r", "#", "row", "level", "1e9", "(9)", "+-", "±", "4p_3/2", "^", "\u{feff}", "٣", "-"];

#[test]
fn mutated_tables_are_read_or_refused() {
    for seed in 0..cases(3000) {
        let mut random = Random::new(u64::from(seed));
        let mut text: Vec<char> = GOOD.chars().collect();
        for _ in 0..=random.below(6) {
            let at = random.below(text.len() as u64) as usize;
            match random.below(3) {
                0 => drop(text.drain(at..(at + 1 + random.below(20) as usize).min(text.len()))),
                1 => {
                    let piece = PIECES[random.below(PIECES.len() as u64) as usize];
                    text.splice(at..at, piece.chars());
                }
                _ => text[at] = text[random.below(text.len() as u64) as usize],
            }
        }
        let text: String = text.into_iter().collect();
        if let Err(faults) = LevelSystem::read(&text, ConstantSet::default()) {
            assert!((1..=20).contains(&faults.len()), "seed {seed}");
            for fault in faults {
                assert!(!fault.to_text().is_empty() && !fault.defect.help().is_empty(), "seed {seed}");
            }
        }
    }
}

#[test]
fn bottomless_files_are_left_in_time() {
    let header = "row,name,energy,unit,J,parity\n";
    for text in [
        ",".repeat(5_000_000),
        "\"".repeat(5_000_001),
        "level\n".repeat(1_000_000),
        format!("{header}{}", "level,4s_1/2,0,cm^-1,,\n".repeat(200_000)),
        format!("{header}level,a,1e-99999,cm^-1,0,even\n"),
        format!("row{}\n", ",name".repeat(300_000)),
        "\u{0}".repeat(1000),
    ] {
        let faults = LevelSystem::read(&text, ConstantSet::default()).err().expect("no table");
        assert!(faults.len() <= 20);
    }
    let long = format!("{header}level,a,{},cm^-1,0,even\n", "9".repeat(999));
    assert!(LevelSystem::read(&long, ConstantSet::default()).is_ok());
}
