//! Products and powers of unit words: `MHz`, `C m^2/V`, `Hz/(V/m)^2`.

use super::dimension::Dimension;
use super::factor::{AtomicFactor, PLANCK, SPEED_OF_LIGHT, exact};
use super::words::{Lookup, Role, UnitWord, look_up, near};
use rug::Rational;

/// Largest power of a word in a unit.
pub const LARGEST_POWER: i32 = 100;

/// Why something is not a unit.
#[derive(Clone, PartialEq, Eq, Debug, thiserror::Error)]
pub enum UnitFault {
    #[error("`{name}` is not a unit")]
    Unknown { name: String, near: Option<String> },
    #[error("`{unit}` takes no prefix")]
    NoPrefix { unit: String, power: i32 },
    #[error("the unit `{name}` stands twice side by side")]
    Twice { name: String },
    #[error("a unit is raised to a power beyond {LARGEST_POWER}")]
    Power,
}

impl UnitFault {
    /// What to write instead.
    pub fn help(&self) -> String {
        match self {
            UnitFault::Unknown { near: Some(near), .. } => format!("did you mean `{near}`?"),
            UnitFault::Unknown { .. } => "`help units` lists the units".into(),
            UnitFault::NoPrefix { unit, power } => format!("write the power of ten: `1e{power} {unit}`"),
            UnitFault::Twice { name } => format!("write `{name}^2` for its square, or the unit once"),
            UnitFault::Power => "powers of units are small whole numbers, as in `cm^-1` or `a0^3`".into(),
        }
    }
}

/// A product of powers of unit words.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Unit {
    text: String,
    parts: Vec<(UnitWord, i32)>,
    /// Whether it is a single word with an exponent: `cm^-1` as a whole is a wavenumber, `1/cm` is not.
    is_power: bool,
    factor: AtomicFactor,
    dimension: Dimension,
}

impl Unit {
    /// A single word.
    pub fn word(name: &str) -> Result<Self, UnitFault> {
        match look_up(name) {
            Lookup::Word(word) => Ok(Self::of_parts(name.into(), vec![(word, 1)], false)),
            Lookup::NoPrefix { power, unit, .. } => Err(UnitFault::NoPrefix { unit: unit.into(), power }),
            Lookup::Unknown => Err(UnitFault::Unknown { name: name.into(), near: near(name) }),
        }
    }

    /// A unit that is a rational multiple of an atomic unit, such as the hartree of a reduced mass.
    pub fn of_system(text: String, number: Rational, dimension: Dimension) -> Self {
        let factor = AtomicFactor::rational(number);
        Self::of_parts(text.clone(), vec![(UnitWord { name: text, factor, dimension, role: Role::OfSystem }, 1)], false)
    }

    /// The unit of plain numbers, as the numerator of `1/cm`.
    pub fn one() -> Self {
        Self::of_parts("1".into(), Vec::new(), false)
    }

    fn of_parts(text: String, parts: Vec<(UnitWord, i32)>, is_power: bool) -> Self {
        let mut factor = AtomicFactor::one();
        let mut dimension = Dimension::none();
        for (word, power) in &parts {
            factor = factor.times(&word.factor.power(*power));
            dimension = dimension.times(&word.dimension.power(&Rational::from(*power)));
        }
        let powers_of = |role| parts.iter().filter(|(word, _)| word.role == role).map(|(_, power)| power).sum::<i32>();
        let radians = powers_of(Role::Radian);
        if radians != 0 && powers_of(Role::Second) == -radians {
            // An angular frequency omega stands for the energy hbar omega; hbar is one atomic unit.
            dimension = dimension.times(&Dimension::new([1, 2, -1, 0]).power(&Rational::from(radians)));
        }
        Unit { text, parts, is_power, factor, dimension }
    }

    /// Reads the text of a unit made of words, whole powers, blanks, `/` and parentheses; for texts of the program's own.
    pub(super) fn parse(text: &str) -> Result<Self, UnitFault> {
        let (above, below) = text.split_once('/').unwrap_or((text, ""));
        let product = |text: &str| -> Result<Unit, UnitFault> {
            let mut unit: Option<Unit> = None;
            for factor in text.trim_matches(['(', ')']).split_whitespace() {
                let (word, power) = factor.split_once('^').unwrap_or((factor, "1"));
                let next = Unit::word(word)?.power(power.parse().map_err(|_| UnitFault::Power)?)?;
                unit = Some(match unit {
                    None => next,
                    Some(unit) => unit.times(&next)?,
                });
            }
            Ok(unit.unwrap_or_else(Unit::one))
        };
        if below.is_empty() { product(above) } else { product(above)?.over(&product(below)?) }
    }

    /// A unit whose text is the expression of the atomic unit of a quantity.
    pub fn atomic(dimension: &Dimension) -> Self {
        let text = dimension.atomic_unit();
        Self::parse(&text).unwrap_or_else(|_| Self::of_system(text, Rational::from(1), dimension.clone()))
    }

    pub fn text(&self) -> &str {
        &self.text
    }

    /// Whether the unit as a whole is an inverse length that stands for an energy: a metre or multiple of it to the power -1.
    pub fn is_wavenumber(&self) -> bool {
        self.is_power && matches!(self.parts.as_slice(), [(UnitWord { role: Role::Metre, .. }, -1)])
    }

    /// How many atomic units the unit is; of a wavenumber: how many hartree.
    pub fn factor(&self) -> AtomicFactor {
        if self.is_wavenumber() {
            // h c times 1/m is an energy in joule.
            let energy = AtomicFactor::of_si(exact(PLANCK) * exact(SPEED_OF_LIGHT), [1, 2, -2, 0]);
            let inverse_metre = AtomicFactor::of_si(Rational::from(1), [0, -1, 0, 0]);
            return self.factor.times(&inverse_metre.power(-1)).times(&energy);
        }
        self.factor.clone()
    }

    /// What the unit is a unit of; of a wavenumber: energy.
    pub fn dimension(&self) -> &Dimension {
        static ENERGY: std::sync::OnceLock<Dimension> = std::sync::OnceLock::new();
        if self.is_wavenumber() { ENERGY.get_or_init(Dimension::energy) } else { &self.dimension }
    }

    /// The unit taken by its words alone: `cm^-1` as an inverse length.
    pub fn literally(&self) -> Self {
        Unit { is_power: false, ..self.clone() }
    }

    /// Whether it is an atomic unit but for a short rational, so that exact results in it are no longer than in atomic units.
    pub fn is_atomic(&self) -> bool {
        if self.parts.iter().all(|(word, _)| word.role == Role::OfSystem) {
            return true;
        }
        let AtomicFactor { rational, pi, alpha, rydberg, electron_mass } = self.factor();
        [pi, alpha, rydberg, electron_mass] == [0; 4]
            && rational.numer().significant_bits() <= 16
            && rational.denom().significant_bits() <= 16
    }

    /// Side by side.
    pub fn times(&self, other: &Self) -> Result<Self, UnitFault> {
        if let ([(word, _)], Some((last, _))) = (other.parts.as_slice(), self.parts.last())
            && last.name == word.name
        {
            return Err(UnitFault::Twice { name: word.name.clone() });
        }
        let parts = self.parts.iter().chain(&other.parts).cloned().collect();
        Ok(Self::of_parts(format!("{} {}", self.text, other.in_product()), parts, false))
    }

    /// A quotient.
    pub fn over(&self, other: &Self) -> Result<Self, UnitFault> {
        let inverse = other.parts.iter().map(|(word, power)| (word.clone(), -power));
        let parts = self.parts.iter().cloned().chain(inverse).collect();
        Ok(Self::of_parts(format!("{}/{}", self.text, other.in_denominator()), parts, false))
    }

    /// A whole power.
    pub fn power(&self, exponent: i32) -> Result<Self, UnitFault> {
        if exponent == 1 {
            return Ok(self.clone());
        }
        let mut parts = self.parts.clone();
        for (_, power) in &mut parts {
            *power = power.checked_mul(exponent).filter(|p| p.abs() <= LARGEST_POWER).ok_or(UnitFault::Power)?;
        }
        let is_word = matches!(self.parts.as_slice(), [(word, 1)] if word.name == self.text);
        let base = if is_word { self.text.clone() } else { format!("({})", self.text) };
        Ok(Self::of_parts(format!("{base}^{exponent}"), parts, is_word))
    }

    /// The text as a factor behind another: a quotient in parentheses.
    fn in_product(&self) -> String {
        if top_level(&self.text, &['/']) { format!("({})", self.text) } else { self.text.clone() }
    }

    /// The text below a fraction bar: a product or quotient in parentheses.
    fn in_denominator(&self) -> String {
        if top_level(&self.text, &[' ', '/']) { format!("({})", self.text) } else { self.text.clone() }
    }
}

/// Whether one of the signs stands outside of parentheses.
fn top_level(text: &str, signs: &[char]) -> bool {
    let mut depth = 0;
    text.chars().any(|sign| {
        match sign {
            '(' => depth += 1,
            ')' => depth -= 1,
            _ => {}
        }
        depth == 0 && signs.contains(&sign)
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn unit(text: &str) -> Unit {
        Unit::parse(text).expect(text)
    }

    #[test]
    fn an_inverse_metre_alone_is_an_energy() {
        assert_eq!(*unit("cm^-1").dimension(), Dimension::energy());
        assert_eq!(*unit("cm^-1").literally().dimension(), Dimension::inverse_length());
        assert_eq!(*Unit::one().over(&unit("cm")).expect("a unit").dimension(), Dimension::inverse_length());
        assert_eq!(*unit("bohr^-1").dimension(), Dimension::inverse_length());
        assert_eq!(*unit("V cm^-1").dimension(), *unit("V/cm").dimension());
        assert_eq!(unit("V cm^-1").factor(), unit("V/cm").factor());
        assert_eq!(unit("m^-1").factor(), unit("cm^-1").factor().times(&AtomicFactor::rational((1, 100).into())));
    }

    #[test]
    fn angular_frequencies_are_energies() {
        assert_eq!(*unit("rad/s").dimension(), Dimension::energy());
        assert!(unit("rad").dimension().is_none());
        assert_eq!(unit("rad/s").factor(), unit("hbar/s").factor());
        assert_eq!(*unit("s^-1").dimension(), Dimension::new([0, 0, -1, 0]));
    }

    #[test]
    fn quantities_come_out_by_their_units() {
        for (text, words) in [
            ("C m^2/V", "a polarizability"),
            ("V/m", "an electric field"),
            ("W/cm^2", "an intensity"),
            ("debye", "an electric dipole moment"),
            ("G", "a magnetic field"),
            ("kg", "a mass"),
        ] {
            assert_eq!(unit(text).dimension().words(), words, "{text}");
        }
        let field = Unit::word("V").and_then(|v| v.over(&unit("m"))).and_then(|f| f.power(2)).expect("a unit");
        let shift = unit("Hz").over(&field).expect("a unit");
        assert_eq!(shift.dimension().words(), "a polarizability");
        assert_eq!(shift.text(), "Hz/(V/m)^2");
    }

    #[test]
    fn what_is_no_unit_says_why() {
        assert_eq!(Unit::word("Mhz"), Err(UnitFault::Unknown { name: "Mhz".into(), near: Some("MHz".into()) }));
        assert_eq!(Unit::word("mdebye"), Err(UnitFault::NoPrefix { unit: "debye".into(), power: -3 }));
        assert_eq!(unit("nm").times(&unit("nm")), Err(UnitFault::Twice { name: "nm".into() }));
        assert_eq!(unit("nm").power(1000), Err(UnitFault::Power));
        assert_eq!(unit("nm").power(99).and_then(|u| u.power(99)), Err(UnitFault::Power));
    }
}
