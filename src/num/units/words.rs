//! The words for units, with the prefixes of the SI.

use super::dimension::Dimension;
use super::factor::{AtomicFactor, BOLTZMANN, ELEMENTARY_CHARGE, PLANCK, SPEED_OF_LIGHT, exact, ten_to};
use rug::Rational;

/// A word for a unit, such as `MHz`.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct UnitWord {
    pub name: String,
    /// How many atomic units it is.
    pub factor: AtomicFactor,
    pub dimension: Dimension,
    pub role: Role,
}

/// What a word does beside standing for a number of atomic units.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Role {
    Plain,
    /// A multiple of the metre: its inverse alone is a wavenumber, and stands for an energy.
    Metre,
    /// A multiple of the second.
    Second,
    /// A unit of a system, an atomic unit with another mass.
    OfSystem,
    /// The radian: in rad/s it stands for hbar, otherwise for 1.
    Radian,
}

/// What a word is, looked up as a unit.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum Lookup {
    Word(UnitWord),
    /// A prefix before a unit that takes none.
    NoPrefix {
        prefix: &'static str,
        power: i32,
        unit: &'static str,
    },
    Unknown,
}

/// Prefixes with their powers of ten; `mu` is how the Greek letter is read, `c` stands only before the metre.
const PREFIXES: [(&str, i32); 12] = [
    ("a", -18),
    ("f", -15),
    ("p", -12),
    ("n", -9),
    ("u", -6),
    ("mu", -6),
    ("m", -3),
    ("k", 3),
    ("M", 6),
    ("G", 9),
    ("T", 12),
    ("P", 15),
];

/// How a unit is defined.
enum Definition {
    /// A rational number of SI units of these powers of kg, m, s, A.
    Si(fn() -> Rational, [i32; 4]),
    /// An atomic unit, times a rational.
    Atomic(fn() -> Rational, [i32; 4]),
    /// m_e over the electron's relative atomic mass.
    AtomicMass,
}

use Definition::{Atomic, AtomicMass, Si};

/// A unit: its names, whether it takes prefixes, its definition.
struct Listed {
    names: &'static [&'static str],
    prefixes: bool,
    definition: Definition,
    role: Role,
}

const fn listed(names: &'static [&'static str], prefixes: bool, definition: Definition) -> Listed {
    Listed { names, prefixes, definition, role: Role::Plain }
}

const ENERGY: [i32; 4] = [1, 2, -2, 0];

fn one() -> Rational {
    Rational::from(1)
}

/// All units. Frequency and temperature stand for the energies h f and k T.
///
/// Source: SI Brochure (2019); debye: 1e-18 statC cm, which is 1e-21/c C m; gauss: 1e-4 T.
const UNITS: [Listed; 25] = [
    listed(&["Hz", "hertz"], true, Si(|| exact(PLANCK), ENERGY)),
    listed(&["eV", "electronvolt"], true, Si(|| exact(ELEMENTARY_CHARGE), ENERGY)),
    listed(&["J", "joule"], true, Si(one, ENERGY)),
    listed(&["K", "kelvin"], true, Si(|| exact(BOLTZMANN), ENERGY)),
    listed(&["hartree", "E_h"], false, Atomic(one, ENERGY)),
    listed(&["rydberg"], false, Atomic(|| Rational::from((1, 2)), ENERGY)),
    Listed { names: &["m", "meter", "metre"], prefixes: true, definition: Si(one, [0, 1, 0, 0]), role: Role::Metre },
    listed(&["angstrom"], false, Si(|| ten_to(-10), [0, 1, 0, 0])),
    listed(&["bohr", "a0"], false, Atomic(one, [0, 1, 0, 0])),
    Listed { names: &["s", "second"], prefixes: true, definition: Si(one, [0, 0, 1, 0]), role: Role::Second },
    Listed { names: &["rad", "radian"], prefixes: true, definition: Atomic(one, [0, 0, 0, 0]), role: Role::Radian },
    listed(&["g", "gram"], true, Si(|| ten_to(-3), [1, 0, 0, 0])),
    listed(&["u", "dalton"], false, AtomicMass),
    listed(&["m_e"], false, Atomic(one, [1, 0, 0, 0])),
    listed(&["e"], false, Atomic(one, [0, 0, 1, 1])),
    listed(&["hbar"], false, Atomic(one, [1, 2, -1, 0])),
    listed(&["C", "coulomb"], true, Si(one, [0, 0, 1, 1])),
    listed(&["A", "ampere"], true, Si(one, [0, 0, 0, 1])),
    listed(&["V", "volt"], true, Si(one, [1, 2, -3, -1])),
    listed(&["W", "watt"], true, Si(one, [1, 2, -3, 0])),
    listed(&["T", "tesla"], true, Si(one, [1, 0, -2, -1])),
    listed(&["G", "gauss"], true, Si(|| ten_to(-4), [1, 0, -2, -1])),
    listed(&["debye"], false, Si(|| ten_to(-21) / exact(SPEED_OF_LIGHT), [0, 1, 1, 1])),
    listed(&["N", "newton"], true, Si(one, [1, 1, -2, 0])),
    listed(&["F", "farad"], true, Si(one, [-1, -2, 4, 2])),
];

impl Listed {
    fn word(&self, name: &str, power: i32) -> UnitWord {
        let scale = ten_to(power);
        let (factor, exponents) = match &self.definition {
            Si(number, exponents) => (AtomicFactor::of_si(number() * scale, *exponents), *exponents),
            Atomic(number, exponents) => (AtomicFactor::rational(number() * scale), *exponents),
            AtomicMass => (AtomicFactor { electron_mass: -1, ..AtomicFactor::rational(scale) }, [1, 0, 0, 0]),
        };
        UnitWord { name: name.to_string(), factor, dimension: Dimension::new(exponents), role: self.role }
    }

    /// The name before which a prefix stands.
    fn symbol(&self) -> &'static str {
        self.names[0]
    }
}

/// Looks a word up as a unit, with or without a prefix.
pub fn look_up(name: &str) -> Lookup {
    if let Some(listed) = UNITS.iter().find(|listed| listed.names.contains(&name)) {
        return Lookup::Word(listed.word(name, 0));
    }
    if name == "cm" {
        let metre = UNITS.iter().find(|listed| listed.role == Role::Metre);
        return metre.map_or(Lookup::Unknown, |metre| Lookup::Word(metre.word(name, -2)));
    }
    for (prefix, power) in PREFIXES {
        let Some(rest) = name.strip_prefix(prefix) else { continue };
        for listed in &UNITS {
            if listed.prefixes && rest == listed.symbol() {
                return Lookup::Word(listed.word(name, power));
            }
            // Of one letter it is more likely another name altogether.
            if let Some(unit) = listed.names.iter().find(|unit| unit.len() > 1 && **unit == rest) {
                return Lookup::NoPrefix { prefix, power, unit };
            }
        }
    }
    Lookup::Unknown
}

/// All words for units without prefixes, and `cm`.
pub fn names() -> impl Iterator<Item = &'static str> {
    UNITS.iter().flat_map(|listed| listed.names.iter().copied()).chain(["cm"])
}

/// The unit meant by a misspelt word: another case (`Mhz`), or a letter more or less.
pub fn near(name: &str) -> Option<String> {
    if name.is_empty() || name.len() > 20 || !name.is_ascii() {
        return None;
    }
    let prefixed = UNITS
        .iter()
        .filter(|listed| listed.prefixes)
        .flat_map(|listed| PREFIXES.iter().map(|(prefix, _)| format!("{prefix}{}", listed.symbol())));
    let known: Vec<String> = names().map(str::to_string).chain(prefixed).collect();
    let lower = name.to_lowercase();
    // of `mHz` and `MHz` the one that differs in fewer letters, then the larger unit, which is the commoner in a spectrum
    let differing = |known: &str| known.chars().zip(name.chars()).filter(|(a, b)| a != b).count();
    let other_case = known.iter().filter(|known| known.to_lowercase() == lower);
    if let Some(found) = other_case.min_by_key(|known| (differing(known), known.starts_with('m'))) {
        return Some(found.clone());
    }
    if name.len() < 3 {
        return None;
    }
    let distance = |known: &String| strsim::osa_distance(&lower, &known.to_lowercase());
    let allowed = if name.len() < 5 { 1 } else { 2 };
    known
        .iter()
        .filter(|known| known.len() > 2)
        .map(|known| (distance(known), known))
        .filter(|(distance, _)| *distance <= allowed)
        .min_by_key(|(distance, _)| *distance)
        .map(|(_, known)| known.clone())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn prefixes_stand_where_they_may() {
        for name in ["Hz", "MHz", "kg", "cm", "nm", "um", "meV", "hartree", "a0", "E_h", "as", "kV", "mG", "uK", "fs"] {
            assert!(matches!(look_up(name), Lookup::Word(_)), "{name}");
        }
        assert_eq!(look_up("mhartree"), Lookup::NoPrefix { prefix: "m", power: -3, unit: "hartree" });
        for name in ["cHz", "kkHz", "Ghz", "h", "km/s", "ka0b", ""] {
            assert_eq!(look_up(name), Lookup::Unknown, "{name}");
        }
    }

    #[test]
    fn no_name_is_listed_twice() {
        let mut seen = std::collections::BTreeSet::new();
        assert!(names().all(|name| seen.insert(name)));
    }

    #[test]
    fn misspelt_units_are_found() {
        assert_eq!(near("Mhz").as_deref(), Some("MHz"));
        assert_eq!(near("hartre").as_deref(), Some("hartree"));
        assert_eq!(near("hartrees").as_deref(), Some("hartree"));
        assert_eq!(near("angström").as_deref(), None);
        assert_eq!(near("xq"), None);
        assert_eq!(near("volts").as_deref(), Some("volt"));
    }
}
