//! Units of the numbers in a level table, as exact multiples of atomic units.
//!
//! Energies are E = h c sigma = h nu. One measured constant stands behind all of them, the Rydberg constant; c, h and e are exact, so that tables
//! in different units agree with each other exactly. The uncertainty of the constant is no datum of a table.

use rug::Rational;
use rug::ops::Pow;

/// 2 R_infinity in units of 10^-8 cm^-1: the hartree as a wavenumber.
///
/// Source: CODATA recommended values, 2022 adjustment: R_infinity = 10 973 731.568 157(12) m^-1.
const HARTREE_IN_1E8_PER_CM: i64 = 21_947_463_136_314;

/// The names of energy units that are offered in messages.
pub const ENERGY_UNITS: [&str; 13] =
    ["cm^-1", "m^-1", "Hz", "kHz", "MHz", "GHz", "THz", "PHz", "meV", "eV", "Ry", "hartree", "J"];

/// The names of dipole units that are offered in messages.
pub const DIPOLE_UNITS: [&str; 3] = ["e a0", "au", "debye"];

/// The size of a unit of energy in hartree; `None` for a word that is none.
///
/// Source: SI Brochure, 9th edition: c = 299 792 458 m/s, h = 6.626 070 15e-34 J s, e = 1.602 176 634e-19 C, all exact.
pub fn energy_in_hartree(unit: &str) -> Option<Rational> {
    let per_cm = || Rational::from((100_000_000, HARTREE_IN_1E8_PER_CM));
    // 1 Hz is 1/c as a wavenumber, c in cm/s
    let hertz = || per_cm() / 29_979_245_800_i64;
    let joule = || hertz() / decimal(662_607_015, -42);
    let electronvolt = || joule() * decimal(1_602_176_634, -28);
    Some(match unit {
        "cm^-1" | "cm-1" | "1/cm" | "/cm" => per_cm(),
        "m^-1" | "m-1" | "1/m" | "/m" => per_cm() / 100,
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
            let debye = decimal(1, -21) / 299_792_458;
            debye / (decimal(1_602_176_634, -28) * decimal(529_177_210_544, -22))
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
        let inverse = |unit: &str| energy_in_hartree(unit).expect(unit).recip();
        assert!(close(inverse("cm^-1"), 219_474.631_363_14, 14));
        assert!(close(inverse("Hz"), 6.579_683_920_499_9e15, 13));
        assert!(close(inverse("eV"), 27.211_386_245_981, 12));
        assert!(close(inverse("J"), 4.359_744_722_206_0e-18, 12));
        assert!(close(dipole_in_atomic("debye").expect("a unit").recip(), 2.541_746_473, 9));
        assert_eq!(energy_in_hartree("mhz"), None);
    }

    #[test]
    fn units_offered_are_known() {
        assert!(ENERGY_UNITS.iter().all(|unit| energy_in_hartree(unit).is_some()));
        assert!(DIPOLE_UNITS.iter().all(|unit| dipole_in_atomic(unit).is_some()));
    }
}
