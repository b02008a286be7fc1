//! Chains of operators and resolvents through the backends, against known values and operator identities.

mod chain;
mod exact_values;
mod laws;
mod numeric_values;
mod spin;
