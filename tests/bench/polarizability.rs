//! The dynamic polarizability of hydrogen 1s at w = 1/10, as a session gives it.
//!
//! `cargo bench --bench polarizability -- DIGITS REPEATS` prints the seconds and the value of each run, one line each;
//! tests/bench/reference_polarizability.py runs it beside the same job in Python. Every run is a new session: nothing is kept from
//! the one before.

use ketwork::session::{NoFiles, Outcome, Session};
use std::sync::Arc;
use std::time::Instant;

fn main() {
    let numbers: Vec<u32> = std::env::args().filter_map(|arg| arg.parse().ok()).collect();
    let (digits, repeats) = (numbers.first().copied().unwrap_or(50), numbers.get(1).copied().unwrap_or(5));
    let text = format!(
        "ketwork session 1\ndigits {digits}\nsystem h = hydrogenic(Z=1)\nstate g = h[1s]\nresolvent R(w) = 1/(E(g) + w - H)\n\
         -<g| D_z (R(1/10) + R(-1/10)) D_z |g>\n"
    );
    for _ in 0..repeats {
        let begin = Instant::now();
        let mut session = Session::open(&text, Arc::new(NoFiles)).expect("a session");
        session.evaluate(&mut |_, _| {});
        let seconds = begin.elapsed().as_secs_f64();
        let Some(Outcome::Result(answer)) = session.entry(5).and_then(|entry| entry.outcome) else {
            panic!("no value")
        };
        println!("{seconds:.6} {}", answer.value.as_deref().unwrap_or_default());
    }
}
