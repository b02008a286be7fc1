//! No hidden state: whatever was entered, revised and dropped, the session on the screen is what a replay of its saved text gives.

use crate::random::*;
use ketwork::session::{NoFiles, Outcome, ReplayVerdict, Session};
use std::sync::Arc;

/// A random entry over a few names, some of which may be bound already, later, or not at all.
fn entry(random: &mut Random) -> String {
    let name = |random: &mut Random| ["a", "b", "c", "f", "g2"][random.below(5) as usize];
    match random.below(9) {
        0 => format!("digits {}", random.between(3, 30)),
        1 => format!("define {} = {}", name(random), random.rational()),
        2 => format!("define {} = {} + {}/3", name(random), name(random), random.between(1, 9)),
        3 => format!("define {} = sqrt({}^2 + 1)", name(random), name(random)),
        4 => format!("define f = {} - {}", name(random), name(random)),
        5 => format!("{} {}", random.between(1, 9), name(random)),
        6 => format!("exp({})", name(random)),
        7 => format!("compare {} with {}", name(random), name(random)),
        _ => format!("system m = matrix(H = [[{}, 1], [1, {}]])", random.between(-5, 5), random.between(-5, 5)),
    }
}

fn outcomes(session: &Session) -> Vec<(String, Option<Outcome>)> {
    (1..=session.len())
        .filter_map(|number| session.entry(number))
        .map(|entry| (entry.text.to_string(), entry.outcome.cloned()))
        .collect()
}

#[test]
fn the_screen_is_what_a_replay_gives() {
    for seed in 0..cases(80) {
        let random = &mut Random::new(500_000 + u64::from(seed));
        let mut session = Session::new(Arc::new(NoFiles));
        let mut done = Vec::new();
        for _ in 0..12 {
            let text = entry(random);
            let number = 1 + random.below(session.len().max(1) as u64) as usize;
            match random.below(6) {
                0 if !session.is_empty() => {
                    done.push(format!("drop {number}"));
                    let _ = session.drop_entry(number);
                }
                1 if !session.is_empty() => {
                    done.push(format!("revise {number} {text}"));
                    session.revise(number, &text).expect("the text parses");
                }
                2 => session.add_prose("# prose"),
                _ => {
                    done.push(text.clone());
                    session.enter(&text).expect("the text parses");
                }
            }
        }
        let text = session.to_text(&["a line of provenance".into()]);
        let mut fresh = Session::open(&text, Arc::new(NoFiles)).expect("the saved text is a session");
        let report = fresh.replay(&mut |_| {});
        for entry in &report.entries {
            assert!(
                !matches!(entry.verdict, ReplayVerdict::Differs { .. } | ReplayVerdict::NotRecorded),
                "seed {seed}: {entry:?}\nafter {done:#?}\n{text}"
            );
        }
        assert_eq!(outcomes(&session), outcomes(&fresh), "seed {seed}: after {done:#?}\n{text}");
        assert_eq!(fresh.to_text(&["a line of provenance".into()]), text, "seed {seed}");
    }
}
