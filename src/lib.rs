//! ketwork: perturbation sums at the prompt.

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
