//! Functions of H in numbers: f(a + b H) through all eigenpairs of the components a ket reaches.

use super::levels::EnergyLevel;
use super::modular::states_at;
use super::numeric::NumericBackend;
use super::vectors::{add_numeric_multiple, dot};
use crate::systems::{FunctionKind, FunctionOfH, Number, Obstacle};
use rug::{Complex, Float};
use std::sync::Arc;

impl NumericBackend {
    /// f(a + b H) inside one component, for a vector that counts its members only.
    pub(super) fn function_in(
        &self,
        component: usize,
        function: &FunctionOfH,
        omitted: &[Arc<EnergyLevel>],
        ket: &[Complex],
    ) -> Result<Vec<Complex>, Obstacle> {
        let precision = self.precision();
        let pairs = self.eigenpairs(component)?;
        let out = |place: usize| {
            omitted
                .iter()
                .flat_map(|level| &level.parts)
                .any(|part| part.component == component && part.places.contains(&place))
        };
        let kept: Vec<usize> = (0..pairs.values.len()).filter(|place| !out(*place)).collect();
        let zeros = match function.kind {
            FunctionKind::Exp => Vec::new(),
            FunctionKind::Ln | FunctionKind::Sqrt => self.zeros(component, function, &pairs.values, &kept)?,
        };
        let mut image = vec![Complex::new(precision); ket.len()];
        for place in kept {
            self.effort.check()?;
            if zeros.contains(&place) {
                if function.kind == FunctionKind::Ln {
                    return Err(Obstacle::Refused {
                        message: format!(
                            "the logarithm of zero does not exist: its argument vanishes at the energy {}",
                            super::factored::shortened(&pairs.values[place])
                        ),
                        help: "leave the level out with a prime or with `without P`".into(),
                    });
                }
                continue;
            }
            let factor = value(function, &pairs.values[place], precision);
            if !(factor.real().is_finite() && factor.imag().is_finite()) {
                return Err(Obstacle::Refused {
                    message: "the function of H is too large for any number at one of the energies".into(),
                    help: "give H a smaller factor".into(),
                });
            }
            let amplitude = factor * dot(&pairs.vectors[place], ket, precision);
            add_numeric_multiple(&mut image, &amplitude, &pairs.vectors[place]);
        }
        Ok(image)
    }

    /// The places at which a + b E is exactly zero.
    ///
    /// Errors: `Undecided` where a number near zero is not decided.
    fn zeros(
        &self,
        component: usize,
        function: &FunctionOfH,
        values: &[Float],
        kept: &[usize],
    ) -> Result<Vec<usize>, Obstacle> {
        let precision = self.precision();
        let slope = function.slope.to_complex(precision).abs().into_real_imag().0;
        let constant = function.constant.to_complex(precision).abs().into_real_imag().0;
        let noise = (slope * self.system.error_at(component, 0) + constant) >> (self.bits - self.bits / 8);
        let near: Vec<usize> = kept
            .iter()
            .copied()
            .filter(|place| argument(function, &values[*place], precision).abs().into_real_imag().0 <= noise)
            .collect();
        if near.is_empty() {
            return Ok(near);
        }
        let (Number::Exact(a), Number::Exact(b)) = (&function.constant, &function.slope) else {
            return Err(Obstacle::Undecided);
        };
        let energy = &-a * &b.inverse().ok_or(Obstacle::Undecided)?;
        let system = &self.system;
        let count = states_at(system.hamiltonian(), &system.components[component], &energy, &self.effort)?;
        if count == near.len() { Ok(near) } else { Err(Obstacle::Undecided) }
    }
}

/// a + b E; exactly real where a and b are.
fn argument(function: &FunctionOfH, energy: &Float, precision: u32) -> Complex {
    let (constant, slope) = (function.constant.to_complex(precision), function.slope.to_complex(precision));
    if constant.imag().is_zero() && slope.imag().is_zero() {
        let real = Float::with_val(precision, slope.real() * energy) + constant.real();
        return Complex::with_val(precision, real);
    }
    Complex::with_val(precision, &slope * energy) + constant
}

/// f(a + b E); on the cut of logarithm and square root the value from above, as for numbers.
fn value(function: &FunctionOfH, energy: &Float, precision: u32) -> Complex {
    let argument = argument(function, energy, precision);
    let value = match function.kind {
        FunctionKind::Exp => argument.exp(),
        FunctionKind::Ln => argument.ln(),
        FunctionKind::Sqrt => argument.sqrt(),
    };
    if function.adjoint { value.conj() } else { value }
}
