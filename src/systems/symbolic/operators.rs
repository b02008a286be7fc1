//! The operators of a system without numbers, as tensors.

use crate::angular::Electrons;
use crate::angular::chain::Operator;
use crate::angular::polarization::Component;
use crate::angular::tensor::{LARGEST_RANK, SpinExchange, Tensor};
use crate::systems::{Atom, SystemError};

/// Names for a message about an operator that does not exist.
const NAMES: [&str; 14] = [
    "D_z",
    "P_z",
    "L_z",
    "S_z",
    "J_z",
    "C(2)_0",
    "r",
    "p^2",
    "p^4",
    "mass_velocity",
    "darwin",
    "spin_orbit",
    "spin_other_orbit",
    "spin_spin",
];

/// Scalars without spin.
const SCALARS: [&str; 11] =
    ["r", "r1", "r2", "r12", "p", "p1", "p2", "mass_velocity", "darwin", "orbit_orbit", "contact"];

/// Tells whether an operator exists as written; `Ok(false)` where it is a power to be multiplied out.
pub(super) fn knows(atom: &Atom, electrons: Electrons) -> Result<bool, SystemError> {
    let own_powers = matches!(atom.name.as_str(), "r" | "r1" | "r2" | "r12" | "p" | "p1" | "p2");
    if atom.power < 1 && !own_powers {
        return Err(refused(format!("{} has no power {}", atom.name, atom.power), "only r has negative powers"));
    }
    tensors(&Atom { power: if own_powers { atom.power } else { 1 }, ..atom.clone() }, electrons)?;
    Ok(own_powers || atom.power == 1)
}

/// An operator as a sum of components of tensors.
///
/// Source: ranks and symmetries of the Breit-Pauli operators as in Bethe and Salpeter, sections 39 and 40; the operators that act on the spin of
/// one electron alone join singlets with triplets too, so they have a part antisymmetric in the spins.
pub(super) fn tensors(atom: &Atom, electrons: Electrons) -> Result<Operator, SystemError> {
    let one = electrons.count == Some(1);
    let name = atom.name.as_str();
    if name != "C" && !atom.arguments.is_empty() {
        return Err(refused(format!("{name} takes nothing in parentheses"), format!("write {name} alone")));
    }
    let vector = |tensor: Tensor| Ok(Operator::new(tensor, component(atom, 1)?));
    match name {
        "D" => vector(Tensor::polar_vector("D")),
        "P" => Ok(Operator::momentum("grad", component(atom, 1)?)),
        "L" => vector(Tensor::orbital_momentum("1")),
        "S" => vector(Tensor::total_spin("1")),
        "J" => Ok(Operator::total_momentum(&component(atom, 1)?)),
        "C" => {
            let k = rank(atom)?;
            let shown = format!("C({k})");
            let harmonic = if one {
                Tensor::harmonic(&shown, k)
            } else {
                // sum over electrons: not a number times an integral over one r
                Tensor::new(&shown, k, 0, k)
                    .map(|tensor| if k % 2 == 1 { tensor.odd() } else { tensor })
                    .map(real_spin_free)
            };
            let tensor = harmonic.map_err(|error| refused(error.to_string(), error.help()))?;
            Ok(Operator::new(tensor, component(atom, i32::try_from(k).unwrap_or(0))?))
        }
        "H" => scalar(atom, "H".into()),
        "spin_other_orbit" if one => {
            Err(refused("one electron has no other electron's orbit".into(), "use spin_orbit, or electrons=2"))
        }
        "spin_orbit" if one => scalar_product(atom, Tensor::orbit_dot_spin("spin_orbit")),
        "spin_orbit" | "spin_other_orbit" => {
            let dot = |exchange| Tensor::dot(name, 1).map(|tensor| tensor.with_exchange(exchange));
            let same = dot(SpinExchange::Symmetric).map_err(|error| refused(error.to_string(), error.help()))?;
            let mixing = dot(SpinExchange::Antisymmetric).map_err(|error| refused(error.to_string(), error.help()))?;
            let joined = scalar_product(atom, same)?;
            Ok(if electrons.count == Some(2) { joined.plus(scalar_product(atom, mixing)?) } else { joined })
        }
        "spin_spin" if one => Err(refused("one electron has no other spin".into(), "use electrons=2 or more")),
        "spin_spin" => {
            let tensor = Tensor::dot(name, 2).map_err(|error| refused(error.to_string(), error.help()))?;
            scalar_product(atom, tensor)
        }
        _ if SCALARS.contains(&name) || name.starts_with("delta(") => {
            let shown = if atom.power == 1 { name.to_string() } else { format!("{name}^{}", atom.power) };
            scalar(atom, shown)
        }
        _ => Err(SystemError::UnknownOperator {
            name: name.to_string(),
            known: NAMES.iter().map(|&known| known.to_string()).collect(),
        }),
    }
}

/// (-1)^q T_-q for a spherical component; every other operator here is its own adjoint.
pub(super) fn adjoint(atom: &Atom) -> (i32, Atom) {
    match atom.component.as_deref().and_then(|text| text.parse::<i32>().ok()) {
        Some(q) => {
            let component = if q == 0 { "0".to_string() } else { format!("{:+}", -q) };
            (if q % 2 == 0 { 1 } else { -1 }, Atom { component: Some(component), ..atom.clone() })
        }
        None => (1, atom.clone()),
    }
}

fn refused(message: String, help: impl Into<String>) -> SystemError {
    SystemError::Refused { message, help: help.into() }
}

fn real_spin_free(tensor: Tensor) -> Tensor {
    use crate::angular::tensor::{AngularPart, Sign};
    tensor.with_adjoint(Sign::Plus).with_angular_part(AngularPart::SpinFree)
}

fn no_component(atom: &Atom) -> Result<(), SystemError> {
    match &atom.component {
        None => Ok(()),
        Some(component) => Err(refused(
            format!("{} is a scalar: it has no component {component}", atom.name),
            "D_z, P_z and L_z are the components of position, momentum and angular momentum",
        )),
    }
}

fn scalar(atom: &Atom, name: String) -> Result<Operator, SystemError> {
    no_component(atom)?;
    Ok(Operator::scalar(Tensor::scalar(&name)))
}

fn scalar_product(atom: &Atom, tensor: Tensor) -> Result<Operator, SystemError> {
    no_component(atom)?;
    Ok(Operator::dot(tensor))
}

fn rank(atom: &Atom) -> Result<u32, SystemError> {
    let number = match &atom.arguments[..] {
        [rank] if rank.is_integer() => rank.numer().to_u32(),
        _ => None,
    };
    number.filter(|k| *k <= LARGEST_RANK).ok_or_else(|| {
        let message = format!("C needs its rank, a whole number from 0 to {LARGEST_RANK}, in parentheses");
        refused(message, "write it as C(2)_0: the rank in parentheses, then the component")
    })
}

/// The component as the angular algebra knows it.
fn component(atom: &Atom, rank: i32) -> Result<Component, SystemError> {
    let Some(text) = atom.component.as_deref() else {
        return Err(refused(format!("{} needs a component", atom.name), format!("write {}_0 or another", atom.name)));
    };
    let numbered = text.parse::<i32>().ok().filter(|q| q.abs() <= rank).map(Component::Spherical);
    let axis =
        || (rank == 1 && text.chars().count() == 1).then(|| text.chars().next().and_then(Component::axis)).flatten();
    numbered.or_else(axis).ok_or_else(|| {
        let message = format!("{} has no component {text}", atom.name);
        refused(message, format!("write _0 or another component from -{rank} to {rank}, of a vector also _x, _y, _z"))
    })
}
