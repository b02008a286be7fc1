//! Recommended values of the fundamental constants, adjustments of 2018 and 2022.
//!
//! Source: CODATA internationally recommended values, the NIST tables of the two adjustments; compared with copies of them in
//! tests/reference/constants.py.

use super::dimension::Dimension;
use super::factor::{AtomicFactor, ten_to};
use rug::Rational;

/// A set of recommended constants.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug, Default)]
pub enum ConstantSet {
    Codata2018,
    #[default]
    Codata2022,
}

/// A measured constant of a set: its value and standard uncertainty.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct MeasuredConstant {
    /// The constant and its set, as in `alpha of CODATA-2022`.
    pub id: &'static str,
    pub value: Rational,
    pub sigma: Rational,
}

/// A constant in atomic units: offset + factor times the measured number, where there is one.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Constant {
    pub offset: Rational,
    pub factor: AtomicFactor,
    pub measured: Option<MeasuredConstant>,
    pub dimension: Dimension,
}

/// Digits, digits of the uncertainty, and the power of ten of both.
type Digits = (u64, u64, i32);

/// A measured constant: its name, its digits in the sets of 2018 and 2022, and how the two are called as sources of uncertainty.
struct Row {
    name: &'static str,
    old: Digits,
    new: Digits,
    ids: [&'static str; 2],
}

macro_rules! row {
    ($name:literal, $old:expr, $new:expr) => {
        Row {
            name: $name,
            old: $old,
            new: $new,
            ids: [concat!($name, " of CODATA-2018"), concat!($name, " of CODATA-2022")],
        }
    };
}

/// Masses are in electron masses, radii in m, R_inf in 1/m.
const MEASURED: [Row; 13] = [
    row!("alpha", (72_973_525_693, 11, -13), (72_973_525_643, 11, -13)),
    row!("R_inf", (10_973_731_568_160, 21, -6), (10_973_731_568_157, 12, -6)),
    row!("A_r_e", (548_579_909_065, 16, -15), (5_485_799_090_441, 97, -16)),
    row!("a_e", (115_965_218_128, 18, -14), (115_965_218_046, 18, -14)),
    row!("m_mu", (2_067_682_830, 46, -7), (2_067_682_827, 46, -7)),
    row!("m_tau", (347_723, 23, -2), (347_723, 23, -2)),
    row!("m_p", (183_615_267_343, 11, -8), (1_836_152_673_426, 32, -9)),
    row!("m_n", (183_868_366_173, 89, -8), (183_868_366_200, 74, -8)),
    row!("m_d", (367_048_296_788, 13, -8), (3_670_482_967_655, 63, -9)),
    row!("m_t", (549_692_153_573, 27, -8), (549_692_153_551, 21, -8)),
    row!("m_h", (549_588_528_007, 24, -8), (549_588_527_984, 16, -8)),
    row!("m_alpha", (729_429_954_142, 24, -8), (729_429_954_171, 17, -8)),
    row!("r_p", (8_414, 19, -19), (84_075, 64, -20)),
];

/// The names behind `codata.`, with what they are.
const NAMES: [(&str, &str); 27] = [
    ("alpha", "fine structure constant"),
    ("alpha_inverse", "1/alpha"),
    ("R_inf", "Rydberg constant, an inverse length"),
    ("a_e", "anomaly of the magnetic moment of the electron"),
    ("g_e", "g factor of the electron, -2 (1 + a_e)"),
    ("A_r_e", "relative atomic mass of the electron"),
    ("m_e", "mass of the electron"),
    ("m_u", "atomic mass constant"),
    ("m_mu", "mass of the muon"),
    ("m_tau", "mass of the tau"),
    ("m_p", "mass of the proton"),
    ("m_n", "mass of the neutron"),
    ("m_d", "mass of the deuteron"),
    ("m_t", "mass of the triton"),
    ("m_h", "mass of the helion, the nucleus of 3He"),
    ("m_alpha", "mass of the alpha particle, the nucleus of 4He"),
    ("r_p", "rms charge radius of the proton"),
    ("c", "speed of light"),
    ("h", "Planck constant"),
    ("hbar", "h/(2 pi)"),
    ("e", "elementary charge"),
    ("k", "Boltzmann constant"),
    ("a_0", "Bohr radius"),
    ("E_h", "Hartree energy"),
    ("mu_B", "Bohr magneton"),
    ("epsilon_0", "vacuum electric permittivity"),
    ("mu_0", "vacuum magnetic permeability"),
];

impl ConstantSet {
    pub const ALL: [ConstantSet; 2] = [ConstantSet::Codata2018, ConstantSet::Codata2022];

    /// The set of that name in the session language.
    pub fn named(name: &str) -> Option<Self> {
        Self::ALL.into_iter().find(|set| set.name().eq_ignore_ascii_case(name))
    }

    pub fn name(self) -> &'static str {
        match self {
            ConstantSet::Codata2018 => "CODATA-2018",
            ConstantSet::Codata2022 => "CODATA-2022",
        }
    }

    /// Where the values come from, for people.
    pub fn source(self) -> &'static str {
        match self {
            ConstantSet::Codata2018 => "CODATA 2018, NIST table",
            ConstantSet::Codata2022 => "CODATA 2022, NIST table",
        }
    }

    /// All names behind `codata.`, with what they are.
    pub fn names() -> impl Iterator<Item = (&'static str, &'static str)> {
        NAMES.into_iter()
    }

    fn measured(self, name: &str) -> Option<MeasuredConstant> {
        let row = MEASURED.iter().find(|row| row.name == name)?;
        let ((digits, sigma, place), id) = match self {
            ConstantSet::Codata2018 => (row.old, row.ids[0]),
            ConstantSet::Codata2022 => (row.new, row.ids[1]),
        };
        let scale = ten_to(place);
        Some(MeasuredConstant { id, value: Rational::from(digits) * &scale, sigma: Rational::from(sigma) * scale })
    }

    /// The measured constants behind units: the fine structure constant, the Rydberg constant in 1/m, the electron's relative atomic mass.
    pub fn behind_units(self) -> [Option<MeasuredConstant>; 3] {
        ["alpha", "R_inf", "A_r_e"].map(|name| self.measured(name))
    }

    /// The constant behind `codata.`. What can be written with alpha, R_inf and exact constants is.
    pub fn constant(self, name: &str) -> Option<Constant> {
        let one = AtomicFactor::one;
        let (factor, exponents) = match name {
            "alpha" => (AtomicFactor { alpha: 1, ..one() }, [0; 4]),
            "alpha_inverse" => (AtomicFactor { alpha: -1, ..one() }, [0; 4]),
            // alpha/(4 pi) in 1/a0
            "R_inf" => (AtomicFactor { alpha: 1, ..AtomicFactor::over_four_pi() }, [0, -1, 0, 0]),
            "A_r_e" => (AtomicFactor { electron_mass: 1, ..one() }, [0; 4]),
            "m_e" => (one(), [1, 0, 0, 0]),
            "m_u" => (AtomicFactor { electron_mass: -1, ..one() }, [1, 0, 0, 0]),
            "c" => (AtomicFactor { alpha: -1, ..one() }, [0, 1, -1, 0]),
            "h" => (AtomicFactor { pi: 1, ..AtomicFactor::rational(Rational::from(2)) }, [1, 2, -1, 0]),
            "hbar" => (one(), [1, 2, -1, 0]),
            "e" => (one(), [0, 0, 1, 1]),
            // The kelvin stands for an energy already.
            "k" => (one(), [0; 4]),
            "a_0" => (one(), [0, 1, 0, 0]),
            "E_h" => (one(), [1, 2, -2, 0]),
            "mu_B" => (AtomicFactor::rational(Rational::from((1, 2))), [0, 2, 0, 1]),
            "epsilon_0" => (AtomicFactor::over_four_pi(), [-1, -3, 4, 2]),
            // 1/(epsilon_0 c^2)
            "mu_0" => (AtomicFactor { alpha: 2, ..AtomicFactor::over_four_pi().power(-1) }, [1, 1, -2, -2]),
            "a_e" | "g_e" => {
                let (offset, slope) = if name == "a_e" { (0, 1) } else { (-2, -2) };
                return Some(Constant {
                    offset: Rational::from(offset),
                    factor: AtomicFactor::rational(Rational::from(slope)),
                    measured: Some(self.measured("a_e")?),
                    dimension: Dimension::none(),
                });
            }
            "r_p" => {
                return Some(Constant {
                    offset: Rational::new(),
                    factor: AtomicFactor::of_si(Rational::from(1), [0, 1, 0, 0]),
                    measured: Some(self.measured(name)?),
                    dimension: Dimension::length(),
                });
            }
            mass if mass.starts_with("m_") => {
                return Some(Constant {
                    offset: Rational::new(),
                    factor: one(),
                    measured: Some(self.measured(mass)?),
                    dimension: Dimension::mass(),
                });
            }
            _ => return None,
        };
        let dimension = Dimension::new(exponents);
        Some(Constant { offset: Rational::new(), factor, measured: None, dimension })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_name_has_a_value_in_both_sets() {
        for set in ConstantSet::ALL {
            for (name, _) in ConstantSet::names() {
                assert!(set.constant(name).is_some(), "{name} of {}", set.name());
            }
            assert!(set.behind_units().iter().all(Option::is_some));
            assert_eq!(ConstantSet::named(set.name()), Some(set));
        }
        assert_eq!(ConstantSet::Codata2022.constant("m_x"), None);
        assert_eq!(ConstantSet::named("CODATA-2014"), None);
    }
}
