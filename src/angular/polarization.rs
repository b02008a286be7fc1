//! Directions and polarizations, and the components of operators.

use super::spherical::cartesian_components;
use super::tensor::Tensor;
use crate::num::Surd;
use rug::Rational;
use std::collections::BTreeMap;

/// A unit vector with complex components: a direction, or the polarization of light.
///
/// The field is Re(E0 e exp(-i w t)), so light of helicity +1 along z has e = -(x + i y)/sqrt 2.
#[derive(Clone, PartialEq, Eq, Debug, Hash)]
pub struct Polarization {
    cartesian: [Surd; 3],
}

/// Why a vector is no polarization.
#[derive(Clone, PartialEq, Eq, Debug, thiserror::Error)]
pub enum PolarizationError {
    #[error("a polarization of length zero has no direction")]
    Zero,
    #[error("the length of this polarization, the root of {square}, cannot be divided out exactly")]
    Length { square: Surd },
}

impl Polarization {
    /// The unit vector along the given components.
    ///
    /// Errors: a zero vector; a length whose square is not rational.
    pub fn new(cartesian: [Surd; 3]) -> Result<Self, PolarizationError> {
        let mut square = Surd::zero();
        for component in &cartesian {
            square += &(component * &component.conj());
        }
        if square.is_zero() {
            return Err(PolarizationError::Zero);
        }
        let Some(scale) = square.sqrt().and_then(|length| length.inverse()) else {
            return Err(PolarizationError::Length { square });
        };
        Ok(Polarization { cartesian: cartesian.map(|component| &component * &scale) })
    }

    /// Linear polarization along a direction.
    pub fn linear(direction: [Rational; 3]) -> Result<Self, PolarizationError> {
        Self::new(direction.map(Surd::from))
    }

    pub fn z() -> Self {
        Polarization { cartesian: [Surd::zero(), Surd::zero(), Surd::one()] }
    }

    /// Light along z with the Jones vector (e_x, e_y).
    pub fn jones(x: Surd, y: Surd) -> Result<Self, PolarizationError> {
        Self::new([x, y, Surd::zero()])
    }

    /// Circular light along z that raises M by one where it is absorbed.
    pub fn sigma_plus() -> Self {
        let half = Surd::sqrt_of(&Rational::from((1, 2))).unwrap_or_default();
        Polarization { cartesian: [-&half, -&(&half * &Surd::i()), Surd::zero()] }
    }

    /// Circular light along z that lowers M by one where it is absorbed.
    pub fn sigma_minus() -> Self {
        let half = Surd::sqrt_of(&Rational::from((1, 2))).unwrap_or_default();
        Polarization { cartesian: [half.clone(), -&(&half * &Surd::i()), Surd::zero()] }
    }

    /// The complex conjugate vector, which stands where a photon is emitted.
    #[must_use]
    pub fn conj(&self) -> Self {
        Polarization { cartesian: [0, 1, 2].map(|i| self.cartesian[i].conj()) }
    }

    pub fn cartesian(&self) -> &[Surd; 3] {
        &self.cartesian
    }

    /// C = 2 Im(e_x* e_y), the degree of circular polarization about z: +1 for [`Polarization::sigma_plus`].
    pub fn circularity(&self) -> Surd {
        (&self.cartesian[0].conj() * &self.cartesian[1]).im().scaled(&Rational::from(2))
    }

    /// 1 - 3 |e_z|^2: -2 for linear light along z, 1 for light along z.
    pub fn alignment(&self) -> Surd {
        let z = &self.cartesian[2];
        &Surd::one() - &(z * &z.conj()).scaled(&Rational::from(3))
    }

    /// T.e in spherical components: the coefficient of T_q for each q where it is not zero.
    pub(crate) fn weights(&self) -> Vec<(i32, Surd)> {
        let mut weights: BTreeMap<i32, Surd> = BTreeMap::new();
        for (axis, component) in ["x", "y", "z"].into_iter().zip(&self.cartesian) {
            for part in cartesian_components(axis).unwrap_or_default() {
                *weights.entry(part.q).or_default() += &(&part.weight * component);
            }
        }
        weights.into_iter().filter(|(_, weight)| !weight.is_zero()).collect()
    }
}

/// The component of an operator that stands in a chain.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum Component {
    /// T^K_Q; Q = 0 is the only one of a scalar.
    Spherical(i32),
    /// A vector times a direction, T.e.
    Along(Polarization),
    /// A Cartesian index of a vector, summed with the other operator that carries it.
    Index(String),
    /// T.e with the light's polarization left open.
    Light,
    /// T.e* with the light's polarization left open.
    LightConjugate,
}

/// Why an operator has no such component.
#[derive(Clone, PartialEq, Eq, Debug, thiserror::Error)]
pub enum ComponentError {
    #[error("`{operator}` has rank {rank}, so its components run from -{rank} to {rank}; there is no {q}")]
    OutOfRange { operator: String, rank: u32, q: i32 },
    #[error("`{operator}` has rank {rank}; only a vector, of rank 1, has a direction or a Cartesian index")]
    NotVector { operator: String, rank: u32 },
    #[error("the polarization in `{operator}` is left open here")]
    OpenPolarization { operator: String },
    #[error("the index {index} stands at {count} operators; a summed index stands at two")]
    IndexCount { index: String, count: usize },
}

impl Component {
    /// A Cartesian axis x, y or z.
    pub fn axis(axis: char) -> Option<Self> {
        let place = ['x', 'y', 'z'].into_iter().position(|a| a == axis)?;
        let mut cartesian = [Surd::zero(), Surd::zero(), Surd::zero()];
        cartesian[place] = Surd::one();
        Some(Component::Along(Polarization { cartesian }))
    }

    /// The spherical components that make it up, with their coefficients; a summed index has its value in `indices`.
    pub(crate) fn weights(
        &self,
        tensor: &Tensor,
        indices: &BTreeMap<&str, IndexValue>,
        first: bool,
    ) -> Result<Vec<(i32, Surd)>, ComponentError> {
        let operator = || tensor.element.name.clone();
        let rank = tensor.total;
        if !matches!(self, Component::Spherical(_)) && rank != 1 {
            return Err(ComponentError::NotVector { operator: operator(), rank });
        }
        match self {
            Component::Spherical(q) if q.unsigned_abs() > rank => {
                Err(ComponentError::OutOfRange { operator: operator(), rank, q: *q })
            }
            Component::Spherical(q) => Ok(vec![(*q, Surd::one())]),
            Component::Along(direction) => Ok(direction.weights()),
            Component::Index(index) => match indices.get(index.as_str()) {
                // sum over axes of A_i B_i = sum over q of (-1)^q A_q B_-q
                Some(IndexValue { q }) if first => Ok(vec![(*q, Surd::one())]),
                Some(IndexValue { q }) => Ok(vec![(-q, Surd::from(if q % 2 == 0 { 1 } else { -1 }))]),
                None => Err(ComponentError::IndexCount { index: index.clone(), count: 1 }),
            },
            Component::Light | Component::LightConjugate => {
                Err(ComponentError::OpenPolarization { operator: operator() })
            }
        }
    }

    /// The component with the light's polarization put in.
    #[must_use]
    pub(crate) fn in_light(&self, light: &Polarization) -> Self {
        match self {
            Component::Light => Component::Along(light.clone()),
            Component::LightConjugate => Component::Along(light.conj()),
            other => other.clone(),
        }
    }
}

/// The value of a summed index: the spherical component at its first place.
#[derive(Clone, Copy, Debug)]
pub(crate) struct IndexValue {
    pub q: i32,
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn circular_light_is_one_component() {
        assert_eq!(Polarization::sigma_plus().weights(), vec![(1, Surd::one())]);
        assert_eq!(Polarization::sigma_minus().weights(), vec![(-1, Surd::one())]);
        assert!(Polarization::sigma_plus().circularity().is_one());
        assert_eq!(Polarization::sigma_minus().circularity(), Surd::from(-1));
        assert_eq!(Polarization::z().alignment(), Surd::from(-2));
        assert!(Polarization::sigma_plus().alignment().is_one());
        // D_q^+ = (-1)^q D_-q
        assert_eq!(Polarization::sigma_plus().conj().weights(), vec![(-1, Surd::from(-1))]);
    }

    #[test]
    fn lengths_are_divided_out() {
        let slanted = Polarization::linear([1, 1, 1].map(Rational::from)).expect("a direction");
        assert_eq!(slanted.cartesian()[0].to_string(), "1/3 sqrt(3)");
        assert!(slanted.alignment().is_zero());
        let elliptic = Polarization::jones(Surd::from(3), &Surd::from(4) * &Surd::i()).expect("a Jones vector");
        assert_eq!(elliptic.circularity(), Surd::from(Rational::from((24, 25))));
        assert_eq!(Polarization::linear([0, 0, 0].map(Rational::from)), Err(PolarizationError::Zero));
    }
}
