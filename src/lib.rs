//! ketwork: perturbation sums at the prompt.
//!
//! A session is a list of entries in Dirac notation. Each entry is parsed ([`lang`]), given its meaning ([`theory`]), and evaluated ([`sums`])
//! on the Hilbert spaces the session declares ([`systems`]), exactly or to as many digits as are asked for ([`num`], [`linalg`], [`angular`]).
//! [`session`] keeps entries, records and dependencies, [`report`] shows them, [`app`] is what a person runs.
//!
//! Rooms use only those below them: `num` < `lang`, `linalg`, `angular` < `theory`, `systems` < `sums` < `report`, `session` < `app`.
//!
//! Invariants, each with a test:
//! parsing is a pure function of the text and never panics; the same session gives the same bytes whatever the number of threads; number code
//! never sees a span; no hash-map order in anything printed; no f64 decides a printed digit; a resolvent's sign is the user's; nothing is
//! called zero that is only small.
//!
//! ```
//! use ketwork::session::{NoFiles, Outcome, Session};
//! use std::sync::Arc;
//!
//! let mut session = Session::new(Arc::new(NoFiles));
//! for entry in ["system h = hydrogenic(Z=1)", "state g = h[1s]", "-2 <g| D_z 1/(E(g) - H)' D_z |g>"] {
//!     session.enter(entry).expect("the entry parses");
//! }
//! let Some(Outcome::Result(answer)) = session.entry(3).and_then(|entry| entry.outcome) else { panic!("no value") };
//! assert_eq!(answer.lines, ["= 9/2"]);
//! ```

pub mod angular;
pub mod app;
pub mod lang;
pub mod linalg;
pub mod num;
pub mod report;
pub mod session;
pub mod sums;
pub mod systems;
pub mod theory;
