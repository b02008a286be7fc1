//! Units of the numbers in a level table, as exact multiples of atomic units.
//!
//! Energies are E = h c sigma = h nu. One measured constant stands behind all of them, the Rydberg constant; c, h and e are exact, so that tables
//! in different units agree with each other exactly. The uncertainty of the constant is no datum of a table.

use crate::num::units::{ConstantSet, ELEMENTARY_CHARGE, PLANCK, SPEED_OF_LIGHT};
use rug::Rational;
use rug::ops::Pow;

/// The names of energy units that are offered in messages.
pub const ENERGY_UNITS: [&str; 13] =
    ["cm^-1", "m^-1", "Hz", "kHz", "MHz", "GHz", "THz", "PHz", "meV", "eV", "Ry", "hartree", "J"];

/// The names of dipole units that are offered in messages.
pub const DIPOLE_UNITS: [&str; 3] = ["e a0", "au", "debye"];

/// The size of a unit of energy in hartree, E_h = 2 h c R_infinity; `None` for a word that is none.
///
/// Source: the Rydberg constant of the set; c, h and e are exact.
pub fn energy_in_hartree(unit: &str, constants: ConstantSet) -> Option<Rational> {
    let [_, rydberg, _] = constants.behind_units();
    let per_metre = Rational::from(1) / (rydberg?.value * 2);
    let hertz = || &per_metre / exact(SPEED_OF_LIGHT);
    let joule = || hertz() / exact(PLANCK);
    let electronvolt = || joule() * exact(ELEMENTARY_CHARGE);
    Some(match unit {
        "cm^-1" | "cm-1" | "1/cm" | "/cm" => per_metre * 100,
        "m^-1" | "m-1" | "1/m" | "/m" => per_metre,
        "Hz" => hertz(),
        "kHz" => hertz() * decimal(1, 3),
        "MHz" => hertz() * decimal(1, 6),
        "GHz" => hertz() * decimal(1, 9),
        "THz" => hertz() * decimal(1, 12),
        "PHz" => hertz() * decimal(1, 15),
        "eV" => electronvolt(),
        "meV" => electronvolt() * decimal(1, -3),
        "J" => joule(),
        "Ry" => Rational::from((1, 2)),
        "hartree" | "Hartree" | "Eh" | "E_h" | "au" | "a.u." => Rational::from(1),
        _ => return None,
    })
}

/// The size of a unit of a dipole element in e a0; without a word it is e a0.
///
/// Source: debye = 10^-21 C m^2 s^-1 / c exactly; a0 = 5.291 772 105 44(82)e-11 m (CODATA 2022).
pub fn dipole_in_atomic(unit: &str) -> Option<Rational> {
    Some(match unit {
        "" | "e a0" | "ea0" | "e*a0" | "e a_0" | "au" | "a.u." => Rational::from(1),
        "debye" | "Debye" => {
            let debye = decimal(1, -21) / exact(SPEED_OF_LIGHT);
            debye / (exact(ELEMENTARY_CHARGE) * decimal(529_177_210_544, -22))
        }
        _ => return None,
    })
}

/// The size of a unit of a line strength of the dipole in (e a0)^2.
pub fn dipole_strength_in_atomic(unit: &str) -> Option<Rational> {
    let base = match unit {
        "e^2 a0^2" | "(e a0)^2" | "e2a02" => "e a0",
        "debye^2" | "Debye^2" => "debye",
        "" | "au" | "a.u." => "au",
        _ => return None,
    };
    dipole_in_atomic(base).map(|size| size.pow(2))
}

fn exact((digits, power): (u64, i32)) -> Rational {
    Rational::from(digits) * Rational::from(10).pow(power)
}

fn decimal(digits: i64, power: i32) -> Rational {
    Rational::from(digits) * Rational::from(10).pow(power)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn close(value: Rational, expected: f64, digits: i32) -> bool {
        (value.to_f64() / expected - 1.0).abs() < 10f64.powi(-digits)
    }

    /// Source: CODATA 2022, the hartree in other units; the debye from its definition.
    #[test]
    fn the_hartree_in_other_units() {
        let inverse = |unit: &str| energy_in_hartree(unit, ConstantSet::Codata2022).expect(unit).recip();
        assert!(close(inverse("cm^-1"), 219_474.631_363_14, 14));
        assert!(close(inverse("Hz"), 6.579_683_920_499_9e15, 13));
        assert!(close(inverse("eV"), 27.211_386_245_981, 12));
        assert!(close(inverse("J"), 4.359_744_722_206_0e-18, 12));
        assert!(close(dipole_in_atomic("debye").expect("a unit").recip(), 2.541_746_473, 9));
        let older = energy_in_hartree("cm^-1", ConstantSet::Codata2018).expect("a unit").recip();
        assert_eq!(older, Rational::from((21_947_463_136_320_i64, 100_000_000)));
        assert_eq!(energy_in_hartree("mhz", ConstantSet::Codata2022), None);
    }

    #[test]
    fn units_offered_are_known() {
        assert!(ENERGY_UNITS.iter().all(|unit| energy_in_hartree(unit, ConstantSet::Codata2022).is_some()));
        assert!(DIPOLE_UNITS.iter().all(|unit| dipole_in_atomic(unit).is_some()));
    }
}
