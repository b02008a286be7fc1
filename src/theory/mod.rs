//! What an expression means, with no numbers: names resolved, operator algebra, expansion, formula text.
