//! Units and recommended constants: what a quantity is, and how many atomic units it is.
//!
//! Every number of an expression is a number of atomic units. A unit is an exact rational times whole powers of pi and of three measured
//! constants: the fine structure constant, the Rydberg constant and the electron's relative atomic mass. Since 2019 h, c, e and k are exact, so
//! that nothing else is needed; what cancels between units, as in a conversion of electronvolts to hertz, cancels exactly.

mod codata;
mod dimension;
mod factor;
mod unit;
mod words;

pub use codata::{Constant, ConstantSet, MeasuredConstant};
pub use dimension::Dimension;
pub use factor::{AtomicFactor, ELEMENTARY_CHARGE, PLANCK, SPEED_OF_LIGHT};
pub use unit::{LARGEST_POWER, Unit, UnitFault};
pub use words::{Lookup, UnitWord, look_up, names, near};
