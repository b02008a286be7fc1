//! The exact factor an operator contributes between two levels.

use crate::angular::half_integer::{AngularError, HalfInteger};
use crate::angular::recoupling::ninej;
use crate::angular::tensor::Tensor;
use crate::angular::term::Level;
use crate::angular::wigner::threej;
use crate::num::Surd;
use rug::Rational;
use std::collections::{BTreeMap, HashMap};

/// Amplitudes by doubled M.
pub(in crate::angular) type Amplitudes = BTreeMap<i32, Surd>;

/// Keeps the symbols that were computed: few different ones occur many times.
#[derive(Default)]
pub(in crate::angular) struct Coefficients {
    reduced: HashMap<[i32; 9], Surd>,
    projected: HashMap<[i32; 5], Surd>,
}

impl Coefficients {
    /// sqrt((2J+1)(2K+1)(2J'+1)) {L L' k; S S' s; J J' K}, times the known part of the element.
    ///
    /// Source: Edmonds, eq. 7.1.5, with the doubly reduced element as one number.
    pub(in crate::angular) fn reduced(
        &mut self,
        tensor: &Tensor,
        bra: Level,
        ket: Level,
    ) -> Result<Surd, AngularError> {
        let rank = |rank: u32| HalfInteger::whole(i32::try_from(rank).unwrap_or(i32::MAX / 8));
        let momentum = |level: Level| HalfInteger::from_twice(level.term.twice_l());
        let (k, s, total) = (rank(tensor.element.orbital), rank(tensor.element.spin), rank(tensor.total));
        let symbol = [[momentum(bra), momentum(ket), k], [bra.term.s, ket.term.s, s], [bra.j, ket.j, total]];
        let key: [i32; 9] = std::array::from_fn(|i| symbol[i / 3][i % 3].twice());
        let recoupling = match self.reduced.get(&key) {
            Some(known) => known.clone(),
            None => {
                let dimensions = [bra.j, ket.j, total].map(|j| i64::from(j.twice()) + 1);
                let product = dimensions.into_iter().fold(Rational::from(1), |product, d| product * d);
                let value = &ninej(symbol)? * &Surd::sqrt_of(&product).unwrap_or_default();
                self.reduced.insert(key, value.clone());
                value
            }
        };
        Ok(&recoupling * &tensor.element.known_factor(bra.term, ket.term))
    }

    /// Carries amplitudes of |J' M'> through components of an operator to |J M>, without the reduced factor.
    ///
    /// Source: the Wigner-Eckart theorem, (-1)^{J-M} (J K J'; -M Q M'), M = Q + M'.
    pub(in crate::angular) fn carry(
        &mut self,
        total: u32,
        weights: &[(i32, Surd)],
        bra: HalfInteger,
        ket: HalfInteger,
        from: &Amplitudes,
    ) -> Result<Amplitudes, AngularError> {
        let mut to = Amplitudes::new();
        let rank = i32::try_from(total).unwrap_or(i32::MAX / 8);
        for (mp, amplitude) in from {
            for (q, weight) in weights {
                let m = mp + 2 * q;
                if m.abs() > bra.twice() {
                    continue;
                }
                let key = [bra.twice(), rank, ket.twice(), m, *mp];
                let element = match self.projected.get(&key) {
                    Some(known) => known.clone(),
                    None => {
                        let h = HalfInteger::from_twice;
                        let symbol = threej(bra, HalfInteger::whole(rank), ket, h(-m), h(2 * q), h(*mp))?;
                        let value = if (bra.twice() - m) / 2 % 2 == 0 { symbol } else { -&symbol };
                        self.projected.insert(key, value.clone());
                        value
                    }
                };
                if !element.is_zero() {
                    *to.entry(m).or_default() += &(&(&element * weight) * amplitude);
                }
            }
        }
        to.retain(|_, amplitude| !amplitude.is_zero());
        Ok(to)
    }
}
