//! Text to tree and back. Parsing is a pure function of the text and never panics; `lang` knows no physics.

pub mod diagnostic;
pub mod extent;
pub mod fault;
pub mod file;
pub mod parser;
pub mod printer;
pub mod tree;
pub mod trouble;
pub mod vocabulary;

mod argument;
mod dirac;
mod entry;
mod expression;
mod lexis;
mod lone;
mod sentences;
mod spans;
mod spelling;

pub use lexis::{DEEPEST_NESTING, LARGEST_EXPONENT, LONGEST_ENTRY, LONGEST_NUMBER, TALLEST_TREE};
