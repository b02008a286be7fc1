//! Exact angular algebra: half-integers, Wigner symbols, spherical components.
