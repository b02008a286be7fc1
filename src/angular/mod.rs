//! Exact angular algebra: half-integers, Wigner symbols, spherical components.
//!
//! Phases are those of Condon and Shortley; a reduced element is defined by
//! `<J M|T^K_Q|J' M'> = (-1)^(J-M) (J K J'; -M Q M') <J||T^K||J'>`, with no further factor.

pub mod factorials;
pub mod half_integer;
pub mod recoupling;
pub mod spherical;
pub mod wigner;

pub use half_integer::{AngularError, HalfInteger};
pub use recoupling::{ninej, sixj};
pub use spherical::{SphericalWeight, cartesian_components, reduced_c};
pub use wigner::{clebsch_gordan, threej};
