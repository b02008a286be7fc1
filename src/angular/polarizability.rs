//! Scalar, vector and tensor parts of the response of a level to light.
//!
//! alpha(M) = a_s + C M/(2J) a_v - D (3M^2 - J(J+1))/(2J(2J-1)) a_t with C = 2 Im(e_x* e_y) and D = 1 - 3 |e_z|^2;
//! the energy shift is -(1/4) alpha |E0|^2 in a field Re(E0 e exp(-i w t)).

use super::chain::ChainSum;
use super::half_integer::{AngularError, HalfInteger};
use super::paths::{ChainKey, Decomposition, PathError, Setting, decompose};
use super::polarization::Polarization;
use super::recoupling::sixj;
use super::term::{Level, projections};
use crate::num::{Effort, Surd};
use rug::Rational;
use std::collections::BTreeMap;

/// Weights of the three parts.
#[derive(Clone, PartialEq, Eq, Debug, Default)]
pub struct Parts {
    pub scalar: Surd,
    pub vector: Surd,
    pub tensor: Surd,
}

impl Parts {
    pub fn is_zero(&self) -> bool {
        self.scalar.is_zero() && self.vector.is_zero() && self.tensor.is_zero()
    }

    /// The diagonal element for a state M of a level J in light of a polarization.
    pub fn at(&self, j: HalfInteger, m: HalfInteger, light: &Polarization) -> Surd {
        let (tj, tm) = (i64::from(j.twice()), i64::from(m.twice()));
        let mut sum = self.scalar.clone();
        if tj > 0 {
            sum += &(&light.circularity() * &self.vector).scaled(&Rational::from((tm, 2 * tj)));
        }
        if tj > 1 {
            // (3M^2 - J(J+1))/(2J(2J-1)) in doubled numbers
            let shape = Rational::from((3 * tm * tm - tj * (tj + 2), 4 * tj * (tj - 1)));
            sum -= &(&light.alignment() * &self.tensor).scaled(&shape);
        }
        sum
    }
}

/// The weights a_s, a_v, a_t with which |<J||D||J'>|^2 enters the polarizability of a level J through J'.
///
/// alpha_s and alpha_t take -(f+ + f-), alpha_v takes -(f+ - f-), with f+- = 1/(E_J +- w - E_J').
/// Zero where 1, J and J' do not close a triangle.
/// Errors: angular momenta that are negative or too large.
/// Source: derived here by recoupling the two dipole operators (compare Manakov, Ovsiannikov, Rapoport, Phys. Rep. 141, 319 (1986), from memory).
pub fn parts_of_level(j: HalfInteger, other: HalfInteger) -> Result<Parts, AngularError> {
    let one = HalfInteger::whole(1);
    let (tj, tp) = (i64::from(j.twice()), i64::from(other.twice()));
    if (tj - tp) % 2 != 0 {
        return Ok(Parts::default());
    }
    let coupled = |rank: i32| -> Result<Surd, AngularError> {
        let symbol = sixj([one, HalfInteger::whole(rank), one, j, other, j])?;
        let root = root(Rational::from(2 * rank + 1));
        let value = &symbol * &root;
        Ok(if (i64::from(rank) + (tj + tp) / 2 + 1) % 2 == 0 { value } else { -&value })
    };
    let scalar = &coupled(0)? * &root(Rational::from((1, 3 * (tj + 1))));
    let vector = if tj == 0 {
        Surd::zero()
    } else {
        // sqrt(2J/((J+1)(2J+1))) in doubled numbers
        -&(&coupled(1)? * &root(Rational::from((2 * tj, (tj + 2) * (tj + 1)))))
    };
    let tensor = if tj < 2 {
        Surd::zero()
    } else {
        // sqrt(2J(2J-1)/(3(J+1)(2J+1)(2J+3))) in doubled numbers
        let square = Rational::from((2 * tj * (tj - 1), 3 * (tj + 2) * (tj + 1) * (tj + 3)));
        -&(&coupled(2)? * &root(square))
    };
    Ok(Parts { scalar, vector, tensor })
}

fn root(square: Rational) -> Surd {
    Surd::sqrt_of(&square).unwrap_or_default()
}

/// The three parts of one path of a radial chain.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct PathParts {
    pub product: usize,
    pub key: ChainKey,
    pub levels: Vec<Vec<Level>>,
    pub parts: Parts,
}

/// Takes a sum with the light left open apart into scalar, vector and tensor parts, path by path.
///
/// The sum is one of <g| … D.e* … D.e … |g> over one level, bilinear in e and e*; anything may stand between and outside.
/// Errors: as for [`decompose`].
/// Source: for linear light along z the dependence on M has even ranks and gives a_s and a_t, for circular light rank 1 gives a_v.
pub fn parts_of_sum(sum: &ChainSum, setting: &Setting, effort: &Effort) -> Result<Vec<PathParts>, PathError> {
    let linear = decompose(&sum.in_light(&Polarization::z()), setting, effort)?;
    let circular = decompose(&sum.in_light(&Polarization::sigma_plus()), setting, effort)?;
    let Some(j) = common_level(&linear) else { return Ok(Vec::new()) };
    let tj = i64::from(j.twice());
    let mut out: BTreeMap<(usize, ChainKey, Vec<Vec<Level>>), Parts> = BTreeMap::new();
    for path in linear.contributions {
        let parts = out.entry((path.product, path.key, path.levels)).or_default();
        parts.scalar = moment(j, &path.factors, |_| 1);
        // (3M^2 - J(J+1))/(J(2J-1)) in doubled numbers
        let unit = Rational::from(2 * tj * (tj - 1));
        parts.tensor = moment(j, &path.factors, |tm| 3 * tm * tm - tj * (tj + 2)).scaled(&unit);
    }
    for path in circular.contributions {
        // M/(2J) in doubled numbers
        let vector = moment(j, &path.factors, |tm| tm).scaled(&Rational::from(2 * tj));
        out.entry((path.product, path.key, path.levels)).or_default().vector = vector;
    }
    let path_parts = |((product, key, levels), parts)| PathParts { product, key, levels, parts };
    Ok(out.into_iter().map(path_parts).collect())
}

fn common_level(decomposition: &Decomposition) -> Option<HalfInteger> {
    match decomposition.columns {
        super::paths::Columns::EveryM { j, .. } => Some(j),
        super::paths::Columns::AsWritten => None,
    }
}

/// The coefficient of a polynomial in 2M in values by M, given that the rest is orthogonal to it.
fn moment(j: HalfInteger, values: &[Surd], shape: impl Fn(i64) -> i64) -> Surd {
    let (mut overlap, mut norm) = (Surd::zero(), 0_i64);
    for (m, value) in projections(j).zip(values) {
        let weight = shape(i64::from(m.twice()));
        overlap += &value.scaled(&Rational::from(weight));
        norm += weight * weight;
    }
    if norm == 0 { Surd::zero() } else { overlap.scaled(&Rational::from((1, norm))) }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::angular::wigner::threej;

    /// Weights for all J up to 5/2, computed independently for this project with exact arithmetic.
    #[test]
    fn tabulated_weights() {
        for (tj, tp, scalar, vector, tensor) in [
            (1, 1, "1/6", "-1/3", "0"),
            (1, 3, "1/6", "1/6", "0"),
            (2, 0, "1/9", "-1/3", "-1/9"),
            (2, 2, "1/9", "-1/6", "1/18"),
            (2, 4, "1/9", "1/6", "-1/90"),
            (3, 1, "1/12", "-1/4", "-1/12"),
            (3, 5, "1/12", "3/20", "-1/60"),
            (4, 2, "1/15", "-1/5", "-1/15"),
            (4, 4, "1/15", "-1/15", "1/15"),
            (4, 6, "1/15", "2/15", "-2/105"),
            (5, 3, "1/18", "-1/6", "-1/18"),
        ] {
            let parts = parts_of_level(HalfInteger::from_twice(tj), HalfInteger::from_twice(tp)).expect("valid");
            let found = [parts.scalar, parts.vector, parts.tensor].map(|part| part.to_string());
            assert_eq!(found, [scalar, vector, tensor], "{tj} {tp}");
        }
    }

    /// sum over M' of |(J 1 J'; -M q M')|^2 for J up to 7/2, all M and three polarizations.
    #[test]
    fn weights_are_squares_of_symbols() {
        let h = HalfInteger::from_twice;
        for tj in 0..=7 {
            for tp in [tj - 2, tj, tj + 2].into_iter().filter(|tp| *tp >= 0 && tp + tj >= 2) {
                let parts = parts_of_level(h(tj), h(tp)).expect("valid");
                for (q, light) in
                    [(0, Polarization::z()), (1, Polarization::sigma_plus()), (-1, Polarization::sigma_minus())]
                {
                    for tm in (-tj..=tj).step_by(2) {
                        let other = tm + 2 * q;
                        let symbol = if other.abs() <= tp {
                            threej(h(tp), h(2), h(tj), h(-other), h(2 * q), h(tm)).expect("valid")
                        } else {
                            Surd::zero()
                        };
                        assert_eq!(parts.at(h(tj), h(tm), &light), &symbol * &symbol, "{tj} {tp} {q} {tm}");
                    }
                }
            }
        }
    }
}
