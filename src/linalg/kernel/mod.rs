//! The kernels of the dense factorisations, chosen by precision.

use super::factor::{Balanced, Factorisation, Failure};
use super::plain::PlainLu;
use crate::num::Effort;

/// Factorises a balanced matrix at about the given precision and returns the precision that was used.
pub(super) fn factorise(
    a: Balanced,
    precision: u32,
    _pivoted: bool,
    effort: &Effort,
) -> Result<(Box<dyn Factorisation>, u32), Failure> {
    Ok((Box::new(PlainLu::new(a, precision, effort)?), precision))
}
