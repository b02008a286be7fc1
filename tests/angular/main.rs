//! The angular engine against published tables, explicit sums in the uncoupled basis, laws of the symbols, and an independent reference.

mod brute;
mod brute_force;
mod parts;
mod random;
mod refusals;
mod symbols;
mod tables;
mod verdicts;
mod words;
