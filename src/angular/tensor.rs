//! Tensor operators, known by their symmetry.
//!
//! An operator is T^{(ks)K}: rank k on the orbits, rank s on the spins, coupled to K in this order,
//! `T^{(ks)K}_Q = sum <k q s sigma|K Q> T^{ks}_{q sigma}`. Its doubly reduced element is defined by
//! `<L ML S MS|T^{ks}_{q sigma}|L'ML'S'MS'> = (-1)^{L-ML+S-MS} (L k L';-ML q ML')(S s S';-MS sigma MS') <LS|||T^{ks}|||L'S'>`.

use super::half_integer::HalfInteger;
use super::spherical::reduced_c;
use super::term::Term;
use crate::num::Surd;
use rug::Rational;

/// The name of an element whose radial part is an overlap, that of L, S and J.
pub const IDENTITY: &str = "1";

/// Largest rank of an operator.
pub const LARGEST_RANK: u32 = 40;

/// The behaviour of a two-electron operator when the spins of the electrons are exchanged.
///
/// A symmetric one joins singlets with singlets and triplets with triplets, an antisymmetric one, like s1 - s2, singlets with triplets.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub enum SpinExchange {
    Symmetric,
    Antisymmetric,
    /// Not said: nothing is excluded.
    Unknown,
}

/// Plus or minus one.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub enum Sign {
    Plus,
    Minus,
}

impl Sign {
    pub(crate) fn of_power(exponent: i32) -> Self {
        if exponent % 2 == 0 { Sign::Plus } else { Sign::Minus }
    }

    pub(crate) fn times(self, other: Sign) -> Sign {
        if self == other { Sign::Plus } else { Sign::Minus }
    }
}

/// What is known of the doubly reduced element besides its selection rules.
///
/// The known factor goes into the exact coefficient; what remains is the radial element of the operator's name.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub enum AngularPart {
    /// Nothing: the radial element is `<LS|||T|||L'S'>` itself.
    Whole,
    /// The operator does not touch the spins (s = 0): the radial element is `<L||T||L'>`.
    SpinFree,
    /// A function of position times C^k of one electron: the radial element is an integral over r.
    Harmonic,
    /// A scalar function times the total L.
    OrbitalMomentum,
    /// A scalar function times the total S.
    Spin,
    /// A scalar function times the product of total L and total S, L first.
    OrbitalMomentumAndSpin,
    /// A scalar function times L^2.
    OrbitalSquare,
    /// A delta function of the position of the only electron: it meets s waves alone.
    Contact,
}

/// A doubly reduced element by name, with all that decides where it vanishes.
#[derive(Clone, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub struct Element {
    pub name: String,
    /// Rank k on the orbits.
    pub orbital: u32,
    /// Rank s on the spins.
    pub spin: u32,
    pub odd_parity: bool,
    /// tau in (T^{ks}_{q sigma})^+ = tau (-1)^{q+sigma} T^{ks}_{-q,-sigma}, said only of operators with real reduced elements.
    pub adjoint: Option<Sign>,
    pub exchange: SpinExchange,
    pub angular_part: AngularPart,
    /// Whether the radial element depends on the J of its two sides.
    pub depends_on_j: bool,
}

/// A tensor operator without numbers: an element and the rank K its two parts are coupled to.
#[derive(Clone, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub struct Tensor {
    pub element: Element,
    /// Total rank K.
    pub total: u32,
}

/// Why ranks do not make an operator.
#[derive(Clone, PartialEq, Eq, Debug, thiserror::Error)]
pub enum TensorError {
    #[error("an orbital rank {orbital} and a spin rank {spin} do not couple to the total rank {total}")]
    Triangle { orbital: u32, spin: u32, total: u32 },
    #[error("the rank {rank} is larger than {LARGEST_RANK}")]
    TooLarge { rank: u32 },
}

impl TensorError {
    /// What to type instead.
    pub fn help(&self) -> String {
        match self {
            TensorError::Triangle { orbital, spin, .. } => {
                format!("the total rank runs from {} to {}", orbital.abs_diff(*spin), orbital + spin)
            }
            TensorError::TooLarge { .. } => "multipole ranks are small whole numbers".into(),
        }
    }
}

impl Tensor {
    /// The operator of the given ranks with nothing more known: even parity, no adjoint, no spin exchange.
    pub fn new(name: &str, orbital: u32, spin: u32, total: u32) -> Result<Self, TensorError> {
        if let Some(rank) = [orbital, spin, total].into_iter().find(|rank| *rank > LARGEST_RANK) {
            return Err(TensorError::TooLarge { rank });
        }
        if total < orbital.abs_diff(spin) || total > orbital + spin {
            return Err(TensorError::Triangle { orbital, spin, total });
        }
        Ok(Self::of_ranks(name, orbital, spin, total))
    }

    fn of_ranks(name: &str, orbital: u32, spin: u32, total: u32) -> Self {
        let element = Element {
            name: name.to_string(),
            orbital,
            spin,
            odd_parity: false,
            adjoint: None,
            exchange: if spin == 0 { SpinExchange::Symmetric } else { SpinExchange::Unknown },
            angular_part: AngularPart::Whole,
            depends_on_j: false,
        };
        Tensor { element, total }
    }

    #[must_use]
    pub fn odd(self) -> Self {
        Tensor { element: Element { odd_parity: true, ..self.element }, ..self }
    }

    #[must_use]
    pub fn with_adjoint(self, sign: Sign) -> Self {
        Tensor { element: Element { adjoint: Some(sign), ..self.element }, ..self }
    }

    #[must_use]
    pub fn with_exchange(self, exchange: SpinExchange) -> Self {
        Tensor { element: Element { exchange, ..self.element }, ..self }
    }

    #[must_use]
    pub fn with_angular_part(self, angular_part: AngularPart) -> Self {
        Tensor { element: Element { angular_part, ..self.element }, ..self }
    }

    /// An operator of rank K on the J of levels of which no more is known; its radial element is `<J||T||J'>`.
    pub fn of_momentum(name: &str, rank: u32) -> Result<Self, TensorError> {
        Self::new(name, 0, rank, rank)
    }

    /// The electric dipole operator, or another real vector that is odd and free of spin.
    pub fn polar_vector(name: &str) -> Self {
        Self::of_ranks(name, 1, 0, 1).odd().with_adjoint(Sign::Plus).with_angular_part(AngularPart::SpinFree)
    }

    /// The gradient, real and antihermitian; the momentum is -i times it.
    pub fn gradient(name: &str) -> Self {
        Self::polar_vector(name).with_adjoint(Sign::Minus)
    }

    /// A real scalar without spin: kinetic energy, contact terms, a function of r.
    pub fn scalar(name: &str) -> Self {
        Self::of_ranks(name, 0, 0, 0).with_adjoint(Sign::Plus).with_angular_part(AngularPart::SpinFree)
    }

    /// f(r) C^k of one electron; its parity is (-1)^k.
    pub fn harmonic(name: &str, k: u32) -> Result<Self, TensorError> {
        let tensor = Self::new(name, k, 0, k)?.with_adjoint(Sign::Plus).with_angular_part(AngularPart::Harmonic);
        Ok(if k % 2 == 1 { tensor.odd() } else { tensor })
    }

    /// The total orbital angular momentum, times a scalar of the given name.
    pub fn orbital_momentum(name: &str) -> Self {
        Self::of_ranks(name, 1, 0, 1).with_adjoint(Sign::Plus).with_angular_part(AngularPart::OrbitalMomentum)
    }

    /// The total spin, times a scalar of the given name.
    pub fn total_spin(name: &str) -> Self {
        Self::of_ranks(name, 0, 1, 1)
            .with_adjoint(Sign::Plus)
            .with_exchange(SpinExchange::Symmetric)
            .with_angular_part(AngularPart::Spin)
    }

    /// A real scalar product A^k.B^k of orbits and total spin: spin-orbit for k = 1, spin-spin for k = 2.
    ///
    /// The tensor is [A B]^0; the factor of the scalar product is [`Tensor::dot_weight`].
    pub fn dot(name: &str, k: u32) -> Result<Self, TensorError> {
        Ok(Self::new(name, k, k, 0)?.with_adjoint(Sign::Plus).with_exchange(SpinExchange::Symmetric))
    }

    /// xi L.S with the total L and S, up to the factor [`Tensor::dot_weight`] of a scalar product.
    pub fn orbit_dot_spin(name: &str) -> Self {
        Self::of_ranks(name, 1, 1, 0)
            .with_adjoint(Sign::Plus)
            .with_exchange(SpinExchange::Symmetric)
            .with_angular_part(AngularPart::OrbitalMomentumAndSpin)
    }

    /// L^2 times a scalar of the given name.
    pub fn orbital_square(name: &str) -> Self {
        Self::scalar(name).with_angular_part(AngularPart::OrbitalSquare)
    }

    /// A delta function at the nucleus, for one electron.
    pub fn contact(name: &str) -> Self {
        Self::scalar(name).with_angular_part(AngularPart::Contact)
    }

    /// (-1)^k sqrt(2k+1), which makes A^k.B^k of [A B]^0.
    pub fn dot_weight(k: u32) -> Surd {
        let root = root_of(i64::from(k) * 2 + 1);
        if k.is_multiple_of(2) { root } else { -&root }
    }

    /// -i sqrt 2, which makes the vector product A x B of [A B]^1 of two vectors.
    ///
    /// Source: derived here from the spherical components of a vector.
    pub fn cross_weight() -> Surd {
        -&(&Surd::i() * &root_of(2))
    }
}

impl Element {
    /// The known factor of the doubly reduced element between two terms.
    ///
    /// Source: <L||L||L> = sqrt(L(L+1)(2L+1)) (Edmonds, eq. 5.4.3); a spin-free operator has <LS|||T|||L'S> = sqrt(2S+1) <L||T||L'>.
    pub(crate) fn known_factor(&self, bra: Term, ket: Term) -> Surd {
        let spin_dimension = || if bra.s == ket.s { root_of(i64::from(bra.s.twice()) + 1) } else { Surd::zero() };
        let orbital = || if bra.l == ket.l { reduced_momentum(bra.twice_l()) } else { Surd::zero() };
        let spin = || if bra.s == ket.s { reduced_momentum(bra.s.twice()) } else { Surd::zero() };
        match self.angular_part {
            AngularPart::Whole => Surd::one(),
            AngularPart::SpinFree => spin_dimension(),
            AngularPart::Harmonic => &spin_dimension() * &reduced_c(bra.l, self.orbital, ket.l),
            AngularPart::OrbitalMomentum => &orbital() * &spin_dimension(),
            AngularPart::Spin if bra.l == ket.l => &spin() * &root_of(i64::from(bra.twice_l()) + 1),
            AngularPart::Spin => Surd::zero(),
            AngularPart::OrbitalMomentumAndSpin => &orbital() * &spin(),
            AngularPart::OrbitalSquare if bra.l == ket.l => {
                let l = i64::from(bra.l);
                (&spin_dimension() * &root_of(2 * l + 1)).scaled(&Rational::from(l * (l + 1)))
            }
            AngularPart::OrbitalSquare => Surd::zero(),
            AngularPart::Contact if bra.l == 0 && ket.l == 0 => spin_dimension(),
            AngularPart::Contact => Surd::zero(),
        }
    }

    /// Whether the known factor is zero, without computing it.
    pub(crate) fn known_factor_vanishes(&self, bra: Term, ket: Term) -> bool {
        let (same_l, same_s) = (bra.l == ket.l, bra.s == ket.s);
        match self.angular_part {
            AngularPart::Whole => false,
            AngularPart::SpinFree => !same_s,
            // (l k l'; 0 0 0) vanishes for an odd sum, and where there is no triangle
            AngularPart::Harmonic => {
                let (low, high) = (bra.l.abs_diff(ket.l), bra.l.saturating_add(ket.l));
                !same_s || !(low..=high).contains(&self.orbital) || (low % 2 != self.orbital % 2)
            }
            AngularPart::OrbitalMomentum | AngularPart::OrbitalSquare => !same_s || !same_l || bra.l == 0,
            AngularPart::Contact => !same_s || bra.l != 0 || ket.l != 0,
            AngularPart::Spin => !same_s || !same_l || bra.s.twice() == 0,
            AngularPart::OrbitalMomentumAndSpin => !same_s || !same_l || bra.l == 0 || bra.s.twice() == 0,
        }
    }

    /// The element as far as its radial part goes: L, S and J leave the same overlap.
    pub(crate) fn radial(&self) -> Element {
        if self.name == IDENTITY { Tensor::scalar(IDENTITY).element } else { self.clone() }
    }

    /// The sign with which the radial element between two terms turns into that of the opposite order; `None` where tau is not said.
    ///
    /// Source: <LS|||T|||L'S'> = tau (-1)^{L-L'+S-S'} <L'S'|||T|||LS>, derived here from the definition of the reduced element.
    /// The known factors of L, S and C^k obey the same rule, so what remains obeys it without the phase they carry.
    pub(crate) fn reversal(&self, bra: Term, ket: Term) -> Option<Sign> {
        let exponent = (bra.twice_l() - ket.twice_l() + bra.s.twice() - ket.s.twice()) / 2;
        let whole = self.adjoint?.times(Sign::of_power(exponent));
        Some(match self.angular_part {
            // <l||C^k||l'> = (-1)^{l-l'} <l'||C^k||l>: the integral over r is left with tau alone
            AngularPart::Harmonic => whole.times(Sign::of_power(exponent)),
            _ => whole,
        })
    }
}

fn root_of(n: i64) -> Surd {
    Surd::sqrt_of(&Rational::from(n)).unwrap_or_default()
}

/// <j||J||j> = sqrt(j(j+1)(2j+1)) of a doubled j.
fn reduced_momentum(twice: i32) -> Surd {
    let twice = i64::from(twice);
    Surd::sqrt_of(&Rational::from((twice * (twice + 2) * (twice + 1), 4))).unwrap_or_default()
}

/// Two operators one after the other, coupled: [A^a B^b]^K_Q = sum <a p b q|K Q> A_p B_q, as pairs of components with their coefficients.
///
/// Errors: `Triangle` where the ranks do not couple.
pub fn coupled_components(a: u32, b: u32, total: u32, q: i32) -> Result<Vec<(i32, i32, Surd)>, TensorError> {
    if let Some(rank) = [a, b, total].into_iter().find(|rank| *rank > LARGEST_RANK) {
        return Err(TensorError::TooLarge { rank });
    }
    if total < a.abs_diff(b) || total > a + b {
        return Err(TensorError::Triangle { orbital: a, spin: b, total });
    }
    let whole = |x: u32| i32::try_from(x).unwrap_or(0);
    let (a, b, total) = (whole(a), whole(b), whole(total));
    let mut out = Vec::new();
    for p in -a..=a {
        let other = q - p;
        if other.abs() > b || q.abs() > total {
            continue;
        }
        let h = HalfInteger::whole;
        // the ranks are whole and in range, so the coefficient exists
        let coefficient = super::wigner::clebsch_gordan(h(a), h(p), h(b), h(other), h(total), h(q)).unwrap_or_default();
        if !coefficient.is_zero() {
            out.push((p, other, coefficient));
        }
    }
    Ok(out)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ranks_must_couple() {
        assert!(matches!(Tensor::new("T", 1, 1, 3), Err(TensorError::Triangle { .. })));
        assert!(matches!(Tensor::new("T", 1000, 1, 3), Err(TensorError::TooLarge { rank: 1000 })));
        assert!(Tensor::new("T", 2, 1, 3).is_ok());
    }

    #[test]
    fn known_factors_vanish_where_it_is_said() {
        let rank = |k| Tensor::harmonic("C", k).expect("a rank");
        let tensors = [
            Tensor::scalar("T"),
            Tensor::polar_vector("D"),
            rank(1),
            rank(2),
            rank(3),
            Tensor::orbital_momentum("1"),
            Tensor::total_spin("1"),
            Tensor::orbit_dot_spin("xi"),
            Tensor::orbital_square("1"),
            Tensor::contact("delta(r)"),
        ];
        for tensor in tensors {
            for code in 0..144_u32 {
                let term = |l, twice_s| Term::natural(l, HalfInteger::from_twice(twice_s));
                let spin = |digit: u32| i32::try_from(digit).expect("small");
                let (bra, ket) = (term(code % 4, spin(code / 4 % 3)), term(code / 12 % 4, spin(code / 48)));
                let element = &tensor.element;
                let zero = element.known_factor(bra, ket).is_zero();
                assert_eq!(element.known_factor_vanishes(bra, ket), zero, "{} {bra} {ket}", element.name);
            }
        }
    }

    /// The scalar product of two vectors is -sqrt 3 [A B]^0: A_+1 B_-1 enters with -1.
    #[test]
    fn scalar_product_of_two_vectors() {
        for (p, q, coefficient) in coupled_components(1, 1, 0, 0).expect("couples") {
            let weight = &coefficient * &Tensor::dot_weight(1);
            assert_eq!(weight, Surd::from(if p % 2 == 0 { 1 } else { -1 }), "{p} {q}");
        }
    }

    /// (A x B)_z = A_x B_y - A_y B_x = i (A_+1 B_-1 - A_-1 B_+1).
    #[test]
    fn vector_product() {
        for (p, _, coefficient) in coupled_components(1, 1, 1, 0).expect("couples") {
            let weight = &coefficient * &Tensor::cross_weight();
            let expected = if p == 1 { -&Surd::i() } else { Surd::i() };
            assert_eq!(weight, expected, "{p}");
        }
    }
}
