//! Text to tree and back. Parsing is a pure function of the text and never panics; `lang` knows no physics.

pub mod tree;
