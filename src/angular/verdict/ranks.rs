//! The tensor ranks in the dependence of a factor on M.

use crate::angular::half_integer::HalfInteger;
use crate::angular::paths::Columns;
use crate::angular::term::projections;
use crate::angular::wigner::threej;
use crate::num::Surd;
use rug::Rational;

/// The part of rank K of a function of M: proportional to (-1)^{J-M} (J K J; -M 0 M).
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct RankPart {
    pub rank: u32,
    /// The value of the part at M = J. For K = 0 that is the average over M.
    pub at_top: Surd,
}

/// The parts of every rank that are not zero; nothing where the states are as written.
///
/// Source: the orthogonality of the 3j symbols in M (Edmonds, eq. 3.7.8).
pub fn rank_parts(columns: &Columns, values: &[Surd]) -> Vec<RankPart> {
    let Columns::EveryM { j, .. } = columns else { return Vec::new() };
    let mut out = Vec::new();
    for rank in 0..=j.twice() {
        let shape = shape(*j, rank);
        let mut overlap = Surd::zero();
        for (value, weight) in values.iter().zip(&shape) {
            overlap += &(value * weight);
        }
        let top = shape.last().cloned().unwrap_or_default();
        let at_top = (&overlap * &top).scaled(&Rational::from(2 * rank + 1));
        if !at_top.is_zero() {
            out.push(RankPart { rank: u32::try_from(rank).unwrap_or(0), at_top });
        }
    }
    out
}

/// (-1)^{J-M} (J K J; -M 0 M) for M ascending.
fn shape(j: HalfInteger, rank: i32) -> Vec<Surd> {
    let zero = HalfInteger::whole(0);
    let symbol = |m: HalfInteger| {
        let minus = HalfInteger::from_twice(-m.twice());
        let value = threej(j, HalfInteger::whole(rank), j, minus, zero, m).unwrap_or_default();
        if (j.twice() - m.twice()) / 2 % 2 == 0 { value } else { -&value }
    };
    projections(j).map(symbol).collect()
}
