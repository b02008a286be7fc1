//! Joins theory and systems: evaluates chains by linear solves, roots, sums over labels, and says how many digits hold.
