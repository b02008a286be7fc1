//! The operators of a level table: the tensors of its file, the total angular momentum, and H.

use super::backend::{HAMILTONIAN, IDENTITY, REDUCED};
use super::table::{OperatorEntry, Shape, twice_j_of};
use crate::angular::{HalfInteger, SphericalWeight, cartesian_components, threej};
use crate::num::Surd;
use crate::systems::{Atom, Coupling, RadialOperator, Sector, SystemError};
use rug::Rational;

/// An operator as this system understands it.
#[derive(Clone, PartialEq, Debug)]
pub enum Operator {
    Hamiltonian,
    /// A tensor of the file and its component.
    Tensor {
        index: usize,
        parts: Vec<SphericalWeight>,
    },
    /// A component of the total J.
    Momentum {
        parts: Vec<SphericalWeight>,
    },
    MomentumSquared,
}

fn refused(message: String, help: impl Into<String>) -> SystemError {
    SystemError::Refused { message, help: help.into() }
}

/// The operator an atom of an expression is; `None` for a power that is to be multiplied out.
pub fn read(shape: &Shape, atom: &Atom) -> Result<Option<Operator>, SystemError> {
    let name = atom.name.as_str();
    let table = shape.operator(name);
    if table.is_none() && !matches!(name, "H" | "J") {
        let tensors = shape.operators.iter().map(|operator| operator.name.clone());
        let known = tensors.chain(["H".to_string(), "J".to_string()]).collect();
        return Err(SystemError::UnknownOperator { name: atom.name.clone(), known });
    }
    if !atom.arguments.is_empty() {
        return Err(refused(format!("{name} takes nothing in parentheses"), format!("write {name} alone")));
    }
    let operator = match (name, table) {
        ("H", None) => match &atom.component {
            None => Operator::Hamiltonian,
            Some(component) => {
                return Err(refused(format!("H is a scalar: it has no component {component}"), "write H alone"));
            }
        },
        (_, Some(index)) => Operator::Tensor { index, parts: components(atom, shape.operators[index].rank)? },
        (_, None) if atom.component.is_none() => {
            if atom.power == 2 {
                return Ok(Some(Operator::MomentumSquared));
            }
            return Err(refused(
                "J without a component is a vector".into(),
                "write a component, as J_z, or the square J^2",
            ));
        }
        (_, None) => Operator::Momentum { parts: components(atom, 1)? },
    };
    match atom.power {
        1 => Ok(Some(operator)),
        0.. => Ok(None),
        _ => Err(refused(
            format!("{name}^{} does not exist: the operators of a table have no inverse", atom.power),
            "a resolvent is written as 1/(E - H)",
        )),
    }
}

/// The number a spherical component is.
pub fn component_number(text: &str) -> Option<i32> {
    let digits = text.strip_prefix(['+', '-']).unwrap_or(text);
    let plain = !digits.is_empty() && digits.bytes().all(|b| b.is_ascii_digit());
    if plain { text.parse().ok() } else { None }
}

fn components(atom: &Atom, rank: u32) -> Result<Vec<SphericalWeight>, SystemError> {
    let name = &atom.name;
    let form = match rank {
        0 => format!("{name} has rank 0: write it without a component"),
        1 => format!("write {name}_x, {name}_y, {name}_z, {name}_+1, {name}_0 or {name}_-1"),
        _ => format!("{name} has rank {rank}: write {name}_0 or another component from -{rank} to {rank}"),
    };
    let Some(component) = atom.component.as_deref() else {
        if rank == 0 {
            return Ok(vec![SphericalWeight { q: 0, weight: Surd::one() }]);
        }
        return Err(refused(format!("{name} needs a component"), form));
    };
    if let Some(q) = component_number(component).filter(|q| q.unsigned_abs() <= rank) {
        return Ok(vec![SphericalWeight { q, weight: Surd::one() }]);
    }
    cartesian_components(component)
        .filter(|_| rank == 1)
        .ok_or_else(|| refused(format!("{name} has no component {component}"), form))
}

/// Where an operator leads, by the Wigner-Eckart theorem:
/// <J M|T_q|J' M'> = (-1)^(J-M) (J K J'; -M q M') <J||T||J'>.
pub fn couple(shape: &Shape, operator: &Operator, from: Sector) -> Vec<Coupling> {
    let here = |factor: Surd, kind: &'static str| {
        let radial = RadialOperator { kind, index: 0 };
        if factor.is_zero() { Vec::new() } else { vec![Coupling { to: from, factor, radial }] }
    };
    let twice_j = twice_j_of(from.block);
    // j(j+1)
    let square = || Rational::from((i64::from(twice_j) * i64::from(twice_j + 2), 4));
    match operator {
        Operator::Hamiltonian => here(Surd::one(), HAMILTONIAN),
        Operator::MomentumSquared => here(Surd::from(square()), IDENTITY),
        Operator::Momentum { parts } => {
            // <J||J||J> = sqrt(J(J+1)(2J+1)) (Edmonds, eq. 5.4.3)
            let reduced = Surd::sqrt_of(&(square() * (twice_j + 1))).unwrap_or_default();
            let steps = steps(1, parts, from, from);
            let radial = RadialOperator { kind: IDENTITY, index: 0 };
            let couplings = steps.into_iter().map(|(to, factor)| Coupling {
                to,
                factor: &factor * &reduced,
                radial: radial.clone(),
            });
            couplings.filter(|coupling| !coupling.factor.is_zero()).collect()
        }
        Operator::Tensor { index, parts } => {
            let radial = RadialOperator { kind: REDUCED, index: i64::try_from(*index).unwrap_or(0) };
            let rank = shape.operators[*index].rank;
            let steps = shape
                .reach(*index, from.block)
                .flat_map(|block| steps(rank, parts, from, Sector { block, twice_m: 0 }));
            steps.map(|(to, factor)| Coupling { to, factor, radial: radial.clone() }).collect()
        }
    }
}

/// The sectors of a block that components of a tensor lead to, with the angular factors that are not zero.
fn steps(rank: u32, parts: &[SphericalWeight], from: Sector, to: Sector) -> Vec<(Sector, Surd)> {
    let half = HalfInteger::from_twice;
    let (twice_j, twice_k) = (twice_j_of(from.block), 2 * i32::try_from(rank).unwrap_or(0));
    let twice_other = twice_j_of(to.block);
    let mut out = Vec::new();
    for part in parts {
        let twice_m = from.twice_m + 2 * part.q;
        if twice_m.abs() > twice_other {
            continue;
        }
        let symbol = threej(
            half(twice_other),
            half(twice_k),
            half(twice_j),
            half(-twice_m),
            HalfInteger::whole(part.q),
            half(from.twice_m),
        );
        let Ok(symbol) = symbol else { continue };
        let factor = &symbol * &part.weight;
        if !factor.is_zero() {
            let odd = (twice_other - twice_m) / 2 % 2 != 0;
            out.push((Sector { block: to.block, twice_m }, if odd { -&factor } else { factor }));
        }
    }
    out
}

/// The adjoint: (T_q)^+ = (-1)^q T_-q, so that Cartesian components and scalars are their own.
pub fn adjoint(atom: &Atom) -> (i32, Atom) {
    match atom.component.as_deref().and_then(component_number) {
        Some(q) => {
            let component = if q == 0 { "0".to_string() } else { format!("{:+}", -q) };
            (if q % 2 == 0 { 1 } else { -1 }, Atom { component: Some(component), ..atom.clone() })
        }
        None => (1, atom.clone()),
    }
}

/// The rule behind an operator that leads nowhere.
pub fn selection_rule(shape: &Shape, atom: &Atom) -> String {
    let component = atom.component.as_ref().map_or(String::new(), |component| format!("_{component}"));
    let name = format!("{}{component}", atom.name);
    match read(shape, atom) {
        Ok(Some(Operator::Tensor { index, parts })) => {
            let OperatorEntry { rank, odd, .. } = shape.operators[index];
            let parity = if odd { "changes the parity" } else { "keeps the parity" };
            format!("{name} has rank {rank}, {parity} and {}; what the table does not list is zero", change(&parts))
        }
        Ok(Some(Operator::Momentum { parts })) => format!("{name} keeps the level and {}", change(&parts)),
        _ => format!("{name} keeps the level and M"),
    }
}

fn change(parts: &[SphericalWeight]) -> String {
    match parts {
        [one] if one.q == 0 => "keeps M".to_string(),
        [one] => format!("changes M by {:+}", one.q),
        _ => "changes M by one".to_string(),
    }
}
