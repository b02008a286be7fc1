//! The Hilbert spaces a session can declare, a folder each, behind one trait.
