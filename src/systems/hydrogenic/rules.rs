//! Selection rules of the operators in the words of the trade.

use super::operators::{Piece, Setting, read, written};
use crate::angular::polarization::Component;
use crate::angular::tensor::AngularPart;
use crate::systems::Atom;

/// The rule behind an operator that leads nowhere.
pub(super) fn selection_rule(atom: &Atom, setting: Setting<'_>) -> String {
    let name = written(atom);
    let spin = setting.electrons.spin;
    let Ok(Some(pieces)) = read(atom, setting) else { return format!("{name} {}", kept(spin)) };
    let Some(first) = pieces.first() else { return format!("{name} {}", kept(spin)) };
    let element = &first.part.tensor.element;
    match element.angular_part {
        AngularPart::Contact => format!("{name} acts on s waves only: all others vanish at the nucleus"),
        AngularPart::OrbitalSquare if pieces.len() == 1 => format!("{name} is zero in s waves"),
        AngularPart::OrbitalMomentumAndSpin => format!("{name} {} and is zero in s waves", kept(spin)),
        AngularPart::Harmonic if element.orbital > 0 => {
            let k = element.orbital;
            let steps: Vec<String> = (0..=k).rev().step_by(2).map(|s| s.to_string()).collect();
            let change = match k {
                1 => "changes l by one".to_string(),
                _ => format!("changes l by {}", steps.join(" or ")),
            };
            sentence(&name, &change, spin.then_some(k), spin, first)
        }
        AngularPart::OrbitalMomentum | AngularPart::Spin if pieces.len() > 1 => {
            format!("{name} keeps l and j and {}", projection(first, spin))
        }
        AngularPart::OrbitalMomentum | AngularPart::Spin => {
            let change = if spin { "keeps l, changes j by at most one" } else { "keeps l" };
            format!("{name} {change} and {}", projection(first, spin))
        }
        _ => format!("{name} {}", kept(spin)),
    }
}

fn kept(spin: bool) -> &'static str {
    if spin { "keeps l, j and M" } else { "keeps l and m" }
}

fn sentence(name: &str, change: &str, most: Option<u32>, spin: bool, piece: &Piece) -> String {
    let projection = projection(piece, spin);
    match most {
        None => format!("{name} {change} and {projection}"),
        Some(1) => format!("{name} {change}, j by at most one, and {projection}"),
        Some(most) => format!("{name} {change}, j by at most {most}, and {projection}"),
    }
}

fn projection(piece: &Piece, spin: bool) -> String {
    let m = if spin { "M" } else { "m" };
    match &piece.part.component {
        Component::Spherical(0) => format!("keeps {m}"),
        Component::Spherical(q) => format!("changes {m} by {q:+}"),
        along if Component::axis('z').as_ref() == Some(along) => format!("keeps {m}"),
        _ => format!("changes {m} by one"),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::angular::Electrons;
    use rug::Rational;

    fn rule(name: &str, component: &str, power: i64, electrons: Electrons) -> String {
        let component = (!component.is_empty()).then(|| component.to_string());
        let (name, arguments) = match name.strip_prefix("C") {
            Some(rank) => ("C", vec![Rational::from(rank.parse::<i64>().expect("a rank"))]),
            None => (name, vec![]),
        };
        let atom = Atom { name: name.into(), component, arguments, power };
        selection_rule(&atom, Setting { charge: &Rational::from(1), electrons })
    }

    #[test]
    fn rules_in_words() {
        let spinless = |name, component, power| rule(name, component, power, Electrons::ONE_WITHOUT_SPIN);
        assert_eq!(spinless("D", "z", 1), "D_z changes l by one and keeps m");
        assert_eq!(spinless("P", "+1", 1), "P_+1 changes l by one and changes m by +1");
        assert_eq!(spinless("C2", "0", 1), "C(2)_0 changes l by 2 or 0 and keeps m");
        assert_eq!(spinless("r", "", -2), "r^-2 keeps l and m");
        assert_eq!(spinless("L", "x", 1), "L_x keeps l and changes m by one");
        assert_eq!(spinless("L", "", 2), "L^2 is zero in s waves");
        assert_eq!(spinless("darwin", "", 1), "darwin acts on s waves only: all others vanish at the nucleus");
    }

    #[test]
    fn rules_with_spin() {
        let spin = |name, component, power| rule(name, component, power, Electrons::ONE);
        assert_eq!(spin("D", "z", 1), "D_z changes l by one, j by at most one, and keeps M");
        assert_eq!(spin("C2", "+1", 1), "C(2)_+1 changes l by 2 or 0, j by at most 2, and changes M by +1");
        assert_eq!(spin("S", "x", 1), "S_x keeps l, changes j by at most one and changes M by one");
        assert_eq!(spin("J", "z", 1), "J_z keeps l and j and keeps M");
        assert_eq!(spin("spin_orbit", "", 1), "spin_orbit keeps l, j and M and is zero in s waves");
        assert_eq!(spin("r", "", 1), "r keeps l, j and M");
        assert_eq!(spin("J", "", 2), "J^2 keeps l, j and M");
    }
}
