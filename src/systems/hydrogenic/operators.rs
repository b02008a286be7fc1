//! The operators of the atom: what may be written, and which components of tensors it is made of.

use super::radial::Radial;
use crate::angular::Electrons;
use crate::angular::chain::{self, Part};
use crate::angular::polarization::Component;
use crate::angular::tensor::{LARGEST_RANK, Sign, Tensor};
use crate::num::Surd;
use crate::systems::{Atom, SystemError};
use rug::Rational;

/// Largest power of r that may be written.
const LARGEST_POWER: i64 = 200;

/// Names for a message about an operator that does not exist.
const NAMES: [&str; 11] =
    ["D_z", "P_z", "L_z", "L^2", "r", "p^2", "p^4", "delta(r)", "C(1)_0", "mass_velocity", "darwin"];

/// Those that ask for spin.
const SPIN_NAMES: [&str; 5] = ["S_z", "J_z", "S^2", "J^2", "spin_orbit"];

/// The name of an element that leaves the radial function as it is.
const IDENTITY: &str = "1";

/// A component of a tensor with the radial operator its element is.
#[derive(Clone, PartialEq, Debug)]
pub(super) struct Piece {
    pub(super) part: Part,
    pub(super) radial: Radial,
}

/// What an atom offers its operators.
#[derive(Clone, Copy, Debug)]
pub(super) struct Setting<'a> {
    pub(super) charge: &'a Rational,
    pub(super) electrons: Electrons,
}

/// Tells whether an operator exists as written; `Ok(false)` where it is a power to be multiplied out.
pub(super) fn knows(atom: &Atom, setting: Setting<'_>) -> Result<bool, SystemError> {
    Ok(read(atom, setting)?.is_some())
}

/// An operator as a sum of components of tensors, their elements by name.
pub(super) fn tensors(atom: &Atom, setting: Setting<'_>) -> Result<chain::Operator, SystemError> {
    match read(atom, setting)? {
        Some(pieces) => Ok(chain::Operator { parts: pieces.into_iter().map(|piece| piece.part).collect() }),
        None => {
            let factor = written(&Atom { power: 1, ..atom.clone() });
            Err(refused(
                format!("{} is a product of operators", written(atom)),
                format!("write its factors side by side, as {factor} {factor}"),
            ))
        }
    }
}

/// (-1)^q T_-q for a spherical component; every other operator here is its own adjoint.
pub(super) fn adjoint(atom: &Atom) -> (i32, Atom) {
    match atom.component.as_deref().and_then(component_number) {
        Some(q) => {
            let component = if q == 0 { "0".to_string() } else { format!("{:+}", -q) };
            (if q % 2 == 0 { 1 } else { -1 }, Atom { component: Some(component), ..atom.clone() })
        }
        None => (1, atom.clone()),
    }
}

/// The operator as the session writes it.
pub(super) fn written(atom: &Atom) -> String {
    let mut out = atom.name.clone();
    if !atom.arguments.is_empty() {
        let arguments: Vec<String> = atom.arguments.iter().map(Rational::to_string).collect();
        out += &format!("({})", arguments.join(", "));
    }
    if let Some(component) = &atom.component {
        out += &format!("_{component}");
    }
    if atom.power != 1 {
        out += &format!("^{}", atom.power);
    }
    out
}

fn refused(message: String, help: impl Into<String>) -> SystemError {
    SystemError::Refused { message, help: help.into() }
}

type Read = Result<Option<Vec<Piece>>, SystemError>;

/// The pieces of an operator; `None` where it is a power to be multiplied out.
pub(super) fn read(atom: &Atom, setting: Setting<'_>) -> Read {
    let name = atom.name.as_str();
    if name != "C" && !atom.arguments.is_empty() {
        return Err(refused(
            format!("{} takes nothing in parentheses", atom.name),
            format!("write {} alone", atom.name),
        ));
    }
    if matches!(name, "S" | "J" | "spin_orbit") && !setting.electrons.spin {
        return Err(refused(
            format!("{} acts on a spin, and the electron of this atom has none", written(atom)),
            "declare the system with spin, as in `hydrogenic(Z=1, spin=1/2)`; L_z is the whole angular momentum here",
        ));
    }
    match name {
        "D" => vector(atom, |component| of_tensor(position(), component, Radial::Power(1))),
        "P" => vector(atom, |component| times(&-&Surd::i(), of_tensor(gradient(), component, Radial::Gradient))),
        "L" | "S" | "J" if atom.component.is_none() => square(atom),
        "L" => vector(atom, orbital),
        "S" => vector(atom, spin),
        "J" => vector(atom, |component| [orbital(component.clone()), spin(component)].concat()),
        "C" => spherical_tensor(atom),
        "r" => {
            no_component(atom)?;
            if atom.power.abs() > LARGEST_POWER {
                return Err(refused(format!("{} is beyond r^{LARGEST_POWER}", written(atom)), "choose a lower power"));
            }
            Ok(Some(scalar(Radial::Power(atom.power))))
        }
        "p" => momentum_power(atom),
        "delta(r)" => {
            no_component(atom)?;
            match atom.power {
                1 => Ok(Some(contact())),
                _ => Err(refused(
                    format!("{} does not exist: a delta function has no powers", written(atom)),
                    "write delta(r) to the first power",
                )),
            }
        }
        "H" => whole(atom, || scalar(Radial::Hamiltonian)),
        "mass_velocity" => whole(atom, || times(&rational(-1, 8), scalar(Radial::PFourth))),
        "darwin" => {
            let strength = &Surd::pi_to(1) * &Surd::from(Rational::from(setting.charge / 2));
            whole(atom, || times(&strength, contact()))
        }
        "spin_orbit" => {
            let strength = Surd::from(Rational::from(setting.charge / 2));
            whole(atom, || times(&strength, orbit_dot_spin(Radial::Power(-3))))
        }
        _ => {
            let spin_names = if setting.electrons.spin { &SPIN_NAMES[..] } else { &[] };
            let known = NAMES.iter().chain(spin_names).map(|&known| known.to_string()).collect();
            Err(SystemError::UnknownOperator { name: atom.name.clone(), known })
        }
    }
}

fn rational(n: i64, d: i64) -> Surd {
    Surd::from(Rational::from((n, d)))
}

fn of_tensor(tensor: Tensor, component: Component, radial: Radial) -> Vec<Piece> {
    pieces(chain::Operator::new(tensor, component), radial)
}

fn pieces(operator: chain::Operator, radial: Radial) -> Vec<Piece> {
    operator.parts.into_iter().map(|part| Piece { part, radial }).collect()
}

fn times(factor: &Surd, mut pieces: Vec<Piece>) -> Vec<Piece> {
    for piece in &mut pieces {
        piece.part.coefficient = &piece.part.coefficient * factor;
    }
    pieces
}

/// The name of an element in `<2p||r||3d>`.
fn element_name(radial: Radial) -> String {
    if radial == Radial::Power(0) { IDENTITY.into() } else { radial.name() }
}

/// A function of r, p^2 or H: its element is an integral over r, as that of C^0.
fn scalar(radial: Radial) -> Vec<Piece> {
    pieces(chain::Operator::scalar(harmonic(&element_name(radial), 0)), radial)
}

fn contact() -> Vec<Piece> {
    let radial = Radial::DeltaTimesPi;
    pieces(chain::Operator::scalar(Tensor::contact(&element_name(radial))), radial)
}

fn orbit_dot_spin(radial: Radial) -> Vec<Piece> {
    pieces(chain::Operator::dot(Tensor::orbit_dot_spin(&element_name(radial))), radial)
}

fn orbital(component: Component) -> Vec<Piece> {
    of_tensor(Tensor::orbital_momentum(IDENTITY), component, Radial::Power(0))
}

fn spin(component: Component) -> Vec<Piece> {
    of_tensor(Tensor::total_spin(IDENTITY), component, Radial::Power(0))
}

/// f(r) C^k; the rank is in range.
fn harmonic(name: &str, k: u32) -> Tensor {
    Tensor::harmonic(name, k).unwrap_or_else(|_| Tensor::scalar(name))
}

fn position() -> Tensor {
    harmonic("r", 1)
}

/// The gradient, with C^1 taken out: its radial part changes sign when bra and ket change places.
fn gradient() -> Tensor {
    harmonic("grad", 1).with_adjoint(Sign::Minus)
}

/// L^2, S^2 = 3/4 and J^2 = L^2 + S^2 + 2 L.S.
fn square(atom: &Atom) -> Read {
    if atom.power != 2 {
        return Err(refused(
            format!("{} is not a scalar this atom has", written(atom)),
            format!("write a component, as {0}_z, or the square {0}^2; products of these give the rest", atom.name),
        ));
    }
    let orbital = pieces(chain::Operator::scalar(Tensor::orbital_square(IDENTITY)), Radial::Power(0));
    let spin = times(&rational(3, 4), scalar(Radial::Power(0)));
    let product = times(&Surd::from(2), orbit_dot_spin(Radial::Power(0)));
    Ok(Some(match atom.name.as_str() {
        "L" => orbital,
        "S" => spin,
        _ => [orbital, spin, product].concat(),
    }))
}

fn momentum_power(atom: &Atom) -> Read {
    no_component(atom)?;
    match atom.power {
        2 => Ok(Some(scalar(Radial::PSquared))),
        4 => Ok(Some(scalar(Radial::PFourth))),
        1 => Err(refused(
            "p without a component is a vector, not a number".into(),
            "write a component, as P_z, or an even power: p^2, p^4",
        )),
        power if power > 0 && power % 2 == 0 => Err(refused(
            format!("{} is not an operator of its own here", written(atom)),
            "write it as a product: p^2 p^4",
        )),
        _ => Err(refused(format!("{} does not exist here", written(atom)), "the powers that exist are p^2 and p^4")),
    }
}

/// A scalar without powers of its own.
fn whole(atom: &Atom, pieces: impl FnOnce() -> Vec<Piece>) -> Read {
    no_component(atom)?;
    power_of(atom, pieces)
}

/// Powers beyond the first are for the caller to multiply out; negative ones do not exist.
fn power_of(atom: &Atom, pieces: impl FnOnce() -> Vec<Piece>) -> Read {
    match atom.power {
        1 => Ok(Some(pieces())),
        0.. => Ok(None),
        _ => Err(refused(
            format!("{} does not exist: only r has negative powers", written(atom)),
            "a resolvent is written as 1/(E - H)",
        )),
    }
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

fn vector(atom: &Atom, pieces: impl FnOnce(Component) -> Vec<Piece>) -> Read {
    let component = component(atom, 1)?;
    power_of(atom, || pieces(component))
}

fn spherical_tensor(atom: &Atom) -> Read {
    let form = "write it as C(2)_0: the rank in parentheses, then the component";
    let [rank] = &atom.arguments[..] else {
        return Err(refused("C needs its rank, and nothing else, in parentheses".into(), form));
    };
    let k = if *rank.denom() == 1 { rank.numer().to_u32() } else { None };
    let Some(k) = k.filter(|k| *k <= LARGEST_RANK) else {
        return Err(refused(format!("the rank of C is a whole number from 0 to {LARGEST_RANK}, not {rank}"), form));
    };
    let component = component(atom, k)?;
    power_of(atom, || of_tensor(harmonic(&format!("C({k})"), k), component, Radial::Power(0)))
}

/// The number a spherical component is.
fn component_number(text: &str) -> Option<i32> {
    let digits = text.strip_prefix(['+', '-']).unwrap_or(text);
    let plain = !digits.is_empty() && digits.bytes().all(|b| b.is_ascii_digit());
    if plain { text.parse().ok() } else { None }
}

fn component(atom: &Atom, k: u32) -> Result<Component, SystemError> {
    let choices = if k == 1 {
        format!("{0}_x, {0}_y, {0}_z, {0}_+1, {0}_0 or {0}_-1", bare(atom))
    } else {
        format!("{0}_0 or another component from -{k} to {k}", bare(atom))
    };
    let Some(component) = atom.component.as_deref() else {
        return Err(refused(format!("{} needs a component", bare(atom)), format!("write {choices}")));
    };
    if let Some(q) = component_number(component).filter(|q| q.unsigned_abs() <= k) {
        return Ok(Component::Spherical(q));
    }
    let mut letters = component.chars();
    let axis = letters.next().filter(|_| k == 1 && letters.next().is_none()).and_then(Component::axis);
    axis.ok_or_else(|| refused(format!("{} has no component {component}", bare(atom)), format!("write {choices}")))
}

fn bare(atom: &Atom) -> String {
    written(&Atom { component: None, power: 1, ..atom.clone() })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn atom(name: &str, component: &str, power: i64) -> Atom {
        let component = (!component.is_empty()).then(|| component.to_string());
        Atom { name: name.into(), component, arguments: vec![], power }
    }

    fn tensor_atom(k: i64, component: &str) -> Atom {
        Atom { name: "C".into(), component: Some(component.into()), arguments: vec![Rational::from(k)], power: 1 }
    }

    fn knows_with(operator: &Atom, electrons: Electrons) -> Result<bool, SystemError> {
        super::knows(operator, Setting { charge: &Rational::from(1), electrons })
    }

    fn knows(operator: &Atom) -> Result<bool, SystemError> {
        knows_with(operator, Electrons::ONE_WITHOUT_SPIN)
    }

    #[test]
    fn powers() {
        assert_eq!(knows(&atom("r", "", -3)), Ok(true));
        assert_eq!(knows(&atom("p", "", 4)), Ok(true));
        assert_eq!(knows(&atom("D", "z", 2)), Ok(false));
        assert_eq!(knows(&atom("H", "", 3)), Ok(false));
        assert_eq!(knows(&atom("L", "", 2)), Ok(true));
    }

    #[test]
    fn refusals() {
        for (operator, part) in [
            (atom("p", "", 1), "is a vector"),
            (atom("p", "", 3), "p^3 does not exist"),
            (atom("p", "", 6), "not an operator of its own"),
            (atom("p", "z", 2), "p is a scalar"),
            (atom("D", "", 1), "D needs a component"),
            (atom("D", "w", 1), "D has no component w"),
            (atom("D", "2", 1), "D has no component 2"),
            (atom("D", "z", -1), "only r has negative powers"),
            (atom("delta(r)", "", 2), "a delta function has no powers"),
            (atom("r", "", 100_000), "beyond r^200"),
            (atom("L", "", 1), "not a scalar"),
            (tensor_atom(2, "3"), "C(2) has no component 3"),
            (tensor_atom(2, "z"), "C(2) has no component z"),
            (tensor_atom(-1, "0"), "not -1"),
        ] {
            match knows(&operator) {
                Err(SystemError::Refused { message, .. }) => assert!(message.contains(part), "{message}"),
                other => panic!("{operator:?}: {other:?}"),
            }
        }
        for operator in [atom("S", "z", 1), atom("J", "", 2), atom("spin_orbit", "", 1)] {
            assert!(matches!(knows(&operator), Err(SystemError::Refused { .. })));
            assert_eq!(knows_with(&operator, Electrons::ONE), Ok(true));
        }
        match knows_with(&atom("K", "", 1), Electrons::ONE) {
            Err(SystemError::UnknownOperator { known, .. }) => assert!(known.contains(&"S_z".to_string())),
            other => panic!("{other:?}"),
        }
    }

    #[test]
    fn adjoints() {
        assert_eq!(adjoint(&atom("D", "+1", 1)), (-1, atom("D", "-1", 1)));
        assert_eq!(adjoint(&atom("D", "-1", 1)), (-1, atom("D", "+1", 1)));
        assert_eq!(adjoint(&atom("D", "x", 1)), (1, atom("D", "x", 1)));
        assert_eq!(adjoint(&tensor_atom(3, "2")), (1, tensor_atom(3, "-2")));
        assert_eq!(adjoint(&atom("P", "0", 1)), (1, atom("P", "0", 1)));
    }
}
