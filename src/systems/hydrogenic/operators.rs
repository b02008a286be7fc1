//! The operators of the atom: what may be written, where each leads, and with which exact factor.

use super::radial::Radial;
use crate::angular::spherical::c_element;
use crate::angular::{SphericalWeight, cartesian_components};
use crate::num::Surd;
use crate::systems::{Atom, Block, Coupling, Sector, SystemError};
use rug::Rational;

/// Largest power of r, and largest rank of a spherical tensor, that may be written.
const LARGEST: i64 = 200;

/// Names for a message about an operator that does not exist.
const NAMES: [&str; 11] =
    ["D_z", "P_z", "L_z", "L^2", "r", "p^2", "p^4", "delta(r)", "C(1)_0", "mass_velocity", "darwin"];

/// An operator that exists, taken apart.
#[derive(Clone, PartialEq, Debug)]
enum Operator {
    /// A vector by its spherical components.
    Vector {
        kind: Vector,
        parts: Vec<SphericalWeight>,
    },
    /// C^k by its spherical components.
    Tensor {
        k: u32,
        parts: Vec<SphericalWeight>,
    },
    LSquared,
    /// A multiple of a radial operator.
    Scalar(Radial, Rational),
    /// A multiple of pi delta(r), which keeps to s waves.
    Contact(Surd),
}

#[derive(Clone, Copy, PartialEq, Eq, Debug)]
enum Vector {
    Position,
    Momentum,
    Orbital,
}

/// Tells whether an operator exists as written; `Ok(false)` where it is a power to be multiplied out.
pub(super) fn knows(atom: &Atom) -> Result<bool, SystemError> {
    Ok(read(atom, &Rational::from(1))?.is_some())
}

/// Where an operator leads from a sector of the atom with a nuclear charge.
pub(super) fn couple(atom: &Atom, from: Sector, charge: &Rational) -> Vec<Coupling> {
    let Block::Orbital { l } = from.block else {
        return Vec::new();
    };
    let Ok(Some(operator)) = read(atom, charge) else {
        return Vec::new();
    };
    let m = from.twice_m / 2;
    let stay = |factor: Surd, radial: Radial| vec![Coupling { to: from, factor, radial: radial.operator() }];
    match operator {
        Operator::Scalar(radial, factor) => stay(Surd::from(factor), radial),
        Operator::Contact(factor) if l == 0 => stay(factor, Radial::DeltaTimesPi),
        Operator::Contact(_) => Vec::new(),
        Operator::LSquared if l == 0 => Vec::new(),
        Operator::LSquared => stay(Surd::from(i64::from(l) * (i64::from(l) + 1)), Radial::Power(0)),
        Operator::Vector { kind: Vector::Orbital, parts } => orbital(l, m, &parts),
        Operator::Vector { kind, parts } => tensor(l, m, 1, &parts, kind == Vector::Momentum),
        Operator::Tensor { k, parts } => {
            let mut out = tensor(l, m, k, &parts, false);
            for coupling in &mut out {
                coupling.radial = Radial::Power(0).operator();
            }
            out
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

/// The rule behind an operator that leads nowhere.
pub(super) fn selection_rule(atom: &Atom) -> String {
    let name = written(atom);
    let change = |parts: &[SphericalWeight]| match parts {
        [one] if one.q == 0 => "keeps m".to_string(),
        [one] => format!("changes m by {:+}", one.q),
        _ => "changes m by one".to_string(),
    };
    match read(atom, &Rational::from(1)) {
        Ok(Some(Operator::Vector { kind: Vector::Orbital, parts })) => format!("{name} keeps l and {}", change(&parts)),
        Ok(Some(Operator::Vector { parts, .. })) => format!("{name} changes l by one and {}", change(&parts)),
        Ok(Some(Operator::Tensor { k, parts })) if k > 1 => {
            let steps: Vec<String> = (0..=k).rev().step_by(2).map(|s| s.to_string()).collect();
            format!("{name} changes l by {} and {}", steps.join(" or "), change(&parts))
        }
        Ok(Some(Operator::Tensor { k: 1, parts })) => format!("{name} changes l by one and {}", change(&parts)),
        Ok(Some(Operator::Contact(_))) => format!("{name} acts on s waves only: all others vanish at the nucleus"),
        Ok(Some(Operator::LSquared)) => format!("{name} is zero in s waves"),
        _ => format!("{name} keeps l and m"),
    }
}

/// The operator as the session writes it.
fn written(atom: &Atom) -> String {
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

fn read(atom: &Atom, charge: &Rational) -> Result<Option<Operator>, SystemError> {
    let name = atom.name.as_str();
    let one = Rational::from(1);
    if name != "C" && !atom.arguments.is_empty() {
        return Err(refused(
            format!("{} takes nothing in parentheses", atom.name),
            format!("write {} alone", atom.name),
        ));
    }
    match name {
        "D" => vector(atom, Vector::Position),
        "P" => vector(atom, Vector::Momentum),
        "L" if atom.component.is_none() => match atom.power {
            2 => Ok(Some(Operator::LSquared)),
            _ => Err(refused(
                format!("{} is not a scalar this atom has", written(atom)),
                "write a component, as L_z, or the square L^2; products of these give the rest",
            )),
        },
        "L" => vector(atom, Vector::Orbital),
        "C" => spherical_tensor(atom),
        "r" => {
            no_component(atom)?;
            if atom.power.abs() > LARGEST {
                return Err(refused(format!("{} is beyond r^{LARGEST}", written(atom)), "choose a lower power"));
            }
            Ok(Some(Operator::Scalar(Radial::Power(atom.power), one)))
        }
        "p" => {
            no_component(atom)?;
            match atom.power {
                2 => Ok(Some(Operator::Scalar(Radial::PSquared, one))),
                4 => Ok(Some(Operator::Scalar(Radial::PFourth, one))),
                1 => Err(refused(
                    "p without a component is a vector, not a number".into(),
                    "write a component, as P_z, or an even power: p^2, p^4",
                )),
                power if power > 0 && power % 2 == 0 => Err(refused(
                    format!("{} is not an operator of its own here", written(atom)),
                    "write it as a product: p^2 p^4",
                )),
                _ => Err(refused(
                    format!("{} does not exist here", written(atom)),
                    "the powers that exist are p^2 and p^4",
                )),
            }
        }
        "delta(r)" => {
            no_component(atom)?;
            match atom.power {
                1 => Ok(Some(Operator::Contact(Surd::pi_to(-1)))),
                _ => Err(refused(
                    format!("{} does not exist: a delta function has no powers", written(atom)),
                    "write delta(r) to the first power",
                )),
            }
        }
        "H" => {
            no_component(atom)?;
            power_of(atom, Operator::Scalar(Radial::Hamiltonian, one))
        }
        "mass_velocity" => {
            no_component(atom)?;
            power_of(atom, Operator::Scalar(Radial::PFourth, Rational::from((-1, 8))))
        }
        "darwin" => {
            no_component(atom)?;
            power_of(atom, Operator::Contact(Surd::from(Rational::from(charge / 2))))
        }
        _ => Err(SystemError::UnknownOperator {
            name: atom.name.clone(),
            known: NAMES.iter().map(|&known| known.to_string()).collect(),
        }),
    }
}

/// Powers beyond the first are for the caller to multiply out; negative ones do not exist.
fn power_of(atom: &Atom, operator: Operator) -> Result<Option<Operator>, SystemError> {
    match atom.power {
        1 => Ok(Some(operator)),
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

fn vector(atom: &Atom, kind: Vector) -> Result<Option<Operator>, SystemError> {
    let parts = components(atom, 1)?;
    power_of(atom, Operator::Vector { kind, parts })
}

fn spherical_tensor(atom: &Atom) -> Result<Option<Operator>, SystemError> {
    let form = "write it as C(2)_0: the rank in parentheses, then the component";
    let [rank] = &atom.arguments[..] else {
        return Err(refused("C needs its rank, and nothing else, in parentheses".into(), form));
    };
    let k = if *rank.denom() == 1 { rank.numer().to_i64() } else { None };
    let Some(k) = k.filter(|k| (0..=LARGEST).contains(k)).and_then(|k| u32::try_from(k).ok()) else {
        return Err(refused(format!("the rank of C is a whole number from 0 to {LARGEST}, not {rank}"), form));
    };
    let parts = components(atom, k)?;
    power_of(atom, Operator::Tensor { k, parts })
}

/// The number a spherical component is.
fn component_number(text: &str) -> Option<i32> {
    let digits = text.strip_prefix(['+', '-']).unwrap_or(text);
    let plain = !digits.is_empty() && digits.bytes().all(|b| b.is_ascii_digit());
    if plain { text.parse().ok() } else { None }
}

fn components(atom: &Atom, k: u32) -> Result<Vec<SphericalWeight>, SystemError> {
    let choices = if k == 1 {
        format!("{0}_x, {0}_y, {0}_z, {0}_+1, {0}_0 or {0}_-1", bare(atom))
    } else {
        format!("{0}_0 or another component from -{k} to {k}", bare(atom))
    };
    let Some(component) = atom.component.as_deref() else {
        return Err(refused(format!("{} needs a component", bare(atom)), format!("write {choices}")));
    };
    if let Some(q) = component_number(component).filter(|q| q.unsigned_abs() <= k) {
        return Ok(vec![SphericalWeight { q, weight: Surd::one() }]);
    }
    cartesian_components(component)
        .filter(|_| k == 1)
        .ok_or_else(|| refused(format!("{} has no component {component}", bare(atom)), format!("write {choices}")))
}

fn bare(atom: &Atom) -> String {
    written(&Atom { component: None, power: 1, ..atom.clone() })
}

fn sector(l: u32, m: i32) -> Sector {
    Sector { block: Block::Orbital { l }, twice_m: 2 * m }
}

/// Vectors and tensors that act on the angles as C^k; a momentum has the factor -i of -i grad.
fn tensor(l: u32, m: i32, k: u32, parts: &[SphericalWeight], momentum: bool) -> Vec<Coupling> {
    let radial = if momentum { Radial::Gradient } else { Radial::Power(1) };
    let mut out = Vec::new();
    for lp in (l.abs_diff(k)..=l + k).step_by(2) {
        for part in parts {
            let element = c_element(lp, k, part.q, l, m);
            if element.is_zero() {
                continue;
            }
            let mut factor = &element * &part.weight;
            if momentum {
                factor = -&(&factor * &Surd::i());
            }
            out.push(Coupling { to: sector(lp, m + part.q), factor, radial: radial.operator() });
        }
    }
    out
}

/// L_0 |m> = m |m>, L_+-1 |m> = -+ sqrt((l -+ m)(l +- m + 1)/2) |m +- 1>.
fn orbital(l: u32, m: i32, parts: &[SphericalWeight]) -> Vec<Coupling> {
    let (li, mi) = (i64::from(l), i64::from(m));
    let mut out = Vec::new();
    for part in parts {
        let q = i64::from(part.q);
        let element = if q == 0 {
            Surd::from(mi)
        } else {
            let square = Rational::from(((li - q * mi) * (li + q * mi + 1), 2));
            Surd::sqrt_of(&square).unwrap_or_default().scaled(&Rational::from(-q))
        };
        if !element.is_zero() {
            let radial = Radial::Power(0).operator();
            out.push(Coupling { to: sector(l, m + part.q), factor: &element * &part.weight, radial });
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::collections::BTreeMap;

    fn atom(name: &str, component: &str, power: i64) -> Atom {
        let component = (!component.is_empty()).then(|| component.to_string());
        Atom { name: name.into(), component, arguments: vec![], power }
    }

    fn tensor_atom(k: i64, component: &str) -> Atom {
        Atom { name: "C".into(), component: Some(component.into()), arguments: vec![Rational::from(k)], power: 1 }
    }

    fn couple_one(operator: &Atom, l: u32, m: i32) -> Vec<Coupling> {
        couple(operator, sector(l, m), &Rational::from(1))
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
        assert!(matches!(knows(&atom("S", "z", 1)), Err(SystemError::UnknownOperator { .. })));
    }

    #[test]
    fn adjoints() {
        assert_eq!(adjoint(&atom("D", "+1", 1)), (-1, atom("D", "-1", 1)));
        assert_eq!(adjoint(&atom("D", "-1", 1)), (-1, atom("D", "+1", 1)));
        assert_eq!(adjoint(&atom("D", "x", 1)), (1, atom("D", "x", 1)));
        assert_eq!(adjoint(&tensor_atom(3, "2")), (1, tensor_atom(3, "-2")));
        assert_eq!(adjoint(&atom("P", "0", 1)), (1, atom("P", "0", 1)));
    }

    /// The elements of an operator between all m of two blocks obey <a|T|b> = conj(<b|T^+|a>).
    #[test]
    fn factors_of_adjoints_are_conjugate() {
        let mut operators: Vec<Atom> =
            ["x", "y", "z", "+1", "0", "-1"].iter().flat_map(|c| [atom("D", c, 1), atom("L", c, 1)]).collect();
        operators.extend((-2..=2).map(|q: i32| tensor_atom(2, &q.to_string())));
        for operator in operators {
            let (sign, other) = adjoint(&operator);
            for l in 0..4_u32 {
                let reach = i32::try_from(l).expect("small");
                for m in -reach..=reach {
                    for step in couple_one(&operator, l, m) {
                        let mut back = Surd::zero();
                        for coupling in couple(&other, step.to, &Rational::from(1)) {
                            if coupling.to == sector(l, m) {
                                back += &coupling.factor;
                            }
                        }
                        assert_eq!(step.factor, back.conj().scaled(&Rational::from(sign)), "{operator:?} {l} {m}");
                    }
                }
            }
        }
    }

    /// L x L = i L, as L_x L_y - L_y L_x = i L_z on every state.
    #[test]
    fn angular_momentum_algebra() {
        let walk = |first: &str, second: &str, l: u32, m: i32| {
            let mut out: BTreeMap<Sector, Surd> = BTreeMap::new();
            for one in couple_one(&atom("L", first, 1), l, m) {
                for two in couple(&atom("L", second, 1), one.to, &Rational::from(1)) {
                    *out.entry(two.to).or_default() += &(&one.factor * &two.factor);
                }
            }
            out
        };
        for l in 0..4_u32 {
            let reach = i32::try_from(l).expect("small");
            for m in -reach..=reach {
                let mut commutator = walk("y", "x", l, m);
                for (to, factor) in walk("x", "y", l, m) {
                    *commutator.entry(to).or_default() -= &factor;
                }
                commutator.retain(|_, factor| !factor.is_zero());
                let expected: BTreeMap<Sector, Surd> =
                    couple_one(&atom("L", "z", 1), l, m).into_iter().map(|c| (c.to, &c.factor * &Surd::i())).collect();
                assert_eq!(commutator, expected);
            }
        }
    }

    #[test]
    fn rules_in_words() {
        assert_eq!(selection_rule(&atom("D", "z", 1)), "D_z changes l by one and keeps m");
        assert_eq!(selection_rule(&atom("P", "+1", 1)), "P_+1 changes l by one and changes m by +1");
        assert_eq!(selection_rule(&tensor_atom(2, "0")), "C(2)_0 changes l by 2 or 0 and keeps m");
        assert_eq!(selection_rule(&atom("r", "", -2)), "r^-2 keeps l and m");
    }
}
