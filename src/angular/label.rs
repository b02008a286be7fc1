//! Labels of states as they are written on paper: `2^3P_1`, `2p_3/2`, `1s`, with M or ML and MS.
//!
//! The grammar of a label, without blanks:
//!
//! ```text
//! label    = [n] letter [_J]                     one electron: 1s, 2p, 2p_3/2
//!          | [n] ^multiplicity Letter [^parity] [_J] [^parity]
//! parity   = e | o
//! ```
//!
//! A term without a parity mark has the natural parity (-1)^L; `2^3P^e` is the even one of two p electrons.
//! Everything here is about one label; whether a system has such a state is for the system to say.

use super::half_integer::HalfInteger;
use super::term::{Parity, Term, momentum_of_letter};

/// Largest L, S and n a label may name; larger ones are misprints.
const LARGEST_NUMBER: u32 = 999;

/// What a label can name depends on the number of electrons and on whether they have spin.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Electrons {
    /// `None` where any number of electrons is meant.
    pub count: Option<u32>,
    /// Without spin S is zero and J is L.
    pub spin: bool,
}

impl Electrons {
    pub const ONE: Self = Electrons { count: Some(1), spin: true };
    pub const ONE_WITHOUT_SPIN: Self = Electrons { count: Some(1), spin: false };
    pub const TWO: Self = Electrons { count: Some(2), spin: true };
    pub const ANY: Self = Electrons { count: None, spin: true };

    /// Whether this many electrons can have the total spin.
    pub fn can_have_spin(self, s: HalfInteger) -> bool {
        match (self.spin, self.count) {
            (false, _) => s.twice() == 0,
            (true, None) => s.twice() >= 0,
            (true, Some(count)) => {
                let count = i64::from(count);
                let twice = i64::from(s.twice());
                (0..=count).contains(&twice) && (count - twice) % 2 == 0
            }
        }
    }
}

/// The angular part of what a label with its options names.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Coupling {
    /// All states of the term.
    Term,
    /// All states of one J.
    Level { j: HalfInteger },
    /// |(L S) J M>.
    State { j: HalfInteger, m: HalfInteger },
    /// |L ML> |S MS>.
    Product { ml: HalfInteger, ms: HalfInteger },
}

/// A label read.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Label {
    /// Counts the states of one symmetry; `None` in a label like `^3P`.
    pub n: Option<u32>,
    pub term: Term,
    pub coupling: Coupling,
}

/// Magnetic quantum numbers written beside a label.
#[derive(Clone, Copy, PartialEq, Eq, Debug, Default)]
pub struct Projections {
    pub m: Option<HalfInteger>,
    pub ml: Option<HalfInteger>,
    pub ms: Option<HalfInteger>,
}

/// The rule a label breaks.
#[derive(Clone, PartialEq, Eq, Debug, thiserror::Error)]
pub enum LabelError {
    #[error("`{text}` is not a label: `{rest}` cannot be read here")]
    Unreadable { text: String, rest: String },
    #[error("`{text}` breaks off before the letter of L")]
    NoLetter { text: String },
    #[error("no L is called `{letter}`: the letters are S P D F G H I K L M N O Q R T U V, without J")]
    Letter { letter: char },
    #[error("the number {number} is too large for a label; the most is {LARGEST_NUMBER}")]
    TooLarge { number: String },
    #[error("a multiplicity 2S+1 is at least 1")]
    ZeroMultiplicity,
    #[error("{electrons} electrons have no term of multiplicity {multiplicity}; 2S+1 can be {}", listed(possible))]
    Multiplicity { multiplicity: u32, electrons: u32, possible: Vec<u32> },
    #[error("spin is left out here, so the multiplicity {multiplicity} has no meaning")]
    NoSpin { multiplicity: u32 },
    #[error("a term of more than one electron needs its multiplicity 2S+1")]
    MissingMultiplicity { letter: char },
    #[error("n counts from 1")]
    ZeroN,
    #[error("n = {n} has no electron of l = {l}: l is at most n - 1")]
    Principal { n: u32, l: u32 },
    #[error("one electron of l = {l} has the parity (-1)^l")]
    ParityOfOne { l: u32 },
    #[error("two electrons have no odd S term: L = 0 makes both l equal and the parity even")]
    OddS,
    #[error("the parity is given twice")]
    ParityTwice,
    #[error("J = {j} does not go with L = {l} and S = {s}: L + S is {}, so J is {} too", kind(*sum_is_whole), kind(*sum_is_whole))]
    MomentumKind { l: u32, s: HalfInteger, j: HalfInteger, sum_is_whole: bool },
    #[error("L = {l} and S = {s} do not couple to J = {j}: J is between {smallest} and {largest}")]
    Triangle { l: u32, s: HalfInteger, j: HalfInteger, smallest: HalfInteger, largest: HalfInteger },
    #[error("{name} = {value} does not go with {of} = {size}: they differ by a whole number")]
    ProjectionKind { name: &'static str, value: HalfInteger, of: &'static str, size: HalfInteger },
    #[error("{name} = {value} is outside -{size} to {size}: |{name}| is at most {of}")]
    ProjectionSize { name: &'static str, value: HalfInteger, of: &'static str, size: HalfInteger },
    #[error("M belongs to a J, and the term has several: {}", joined(momenta))]
    WhichMomentum { momenta: Vec<HalfInteger> },
    #[error("a state has either J and M, or ML and MS")]
    MixedProjections,
    #[error("a product state needs both ML and MS; {missing} is missing")]
    HalfProduct { missing: &'static str },
}

fn kind(whole: bool) -> &'static str {
    if whole { "a whole number" } else { "half an odd number" }
}

fn listed(numbers: &[u32]) -> String {
    numbers.iter().map(u32::to_string).collect::<Vec<_>>().join(", ")
}

fn joined(momenta: &[HalfInteger]) -> String {
    momenta.iter().map(HalfInteger::to_string).collect::<Vec<_>>().join(", ")
}

impl LabelError {
    /// What to type instead.
    pub fn help(&self) -> String {
        match self {
            LabelError::Unreadable { .. } | LabelError::NoLetter { .. } | LabelError::Letter { .. } => {
                "write a label like 1s, 2p_3/2 or 2^3P_1".into()
            }
            LabelError::TooLarge { .. } | LabelError::ZeroN => "write n as in 2^3P".into(),
            LabelError::ZeroMultiplicity | LabelError::Multiplicity { .. } => {
                "2S+1 stands before the letter: ^1 for S = 0, ^2 for S = 1/2, ^3 for S = 1".into()
            }
            LabelError::NoSpin { .. } => {
                "leave out the multiplicity, as in 2p, or take the spin into the system".into()
            }
            LabelError::MissingMultiplicity { letter } => {
                format!("write 2^1{letter} for the singlet, 2^3{letter} for the triplet")
            }
            LabelError::Principal { l, .. } => format!("the lowest n with this l is {}", l + 1),
            LabelError::ParityOfOne { .. } | LabelError::OddS | LabelError::ParityTwice => {
                "^e and ^o mark a parity that is not (-1)^L, as in 2^3P^e; leave the mark out otherwise".into()
            }
            LabelError::MomentumKind { l, s, .. } | LabelError::Triangle { l, s, .. } => {
                let momenta: Vec<HalfInteger> = Term::natural(*l, *s).momenta().collect();
                format!("J can be {}", joined(&momenta))
            }
            LabelError::ProjectionKind { name, size, .. } | LabelError::ProjectionSize { name, size, .. } => {
                format!("{name} runs from -{size} to {size} in steps of 1")
            }
            LabelError::WhichMomentum { .. } => "write J behind the term, as in 2^3P_1, or give ML and MS".into(),
            LabelError::MixedProjections => "write 2^3P_1 with M=0, or 2^3P with ML=0 and MS=0".into(),
            LabelError::HalfProduct { missing } => format!("add {missing}=0 or another value"),
        }
    }
}

impl Label {
    /// Reads a label with its magnetic quantum numbers.
    ///
    /// J may be left out beside M where the term has only one. Without spin M is ML.
    /// Errors: the rule the label breaks.
    pub fn parse(text: &str, projections: Projections, electrons: Electrons) -> Result<Self, LabelError> {
        let mut reader = Reader { text, rest: text };
        let n = reader.number()?;
        let multiplicity = reader.multiplicity()?;
        let letter = reader.letter()?;
        let l = momentum_of_letter(letter).ok_or(LabelError::Letter { letter })?;
        let mut mark = reader.parity();
        let j = reader.momentum()?;
        let second = reader.parity();
        if mark.is_some() && second.is_some() {
            return Err(LabelError::ParityTwice);
        }
        mark = mark.or(second);
        if !reader.rest.is_empty() {
            return Err(reader.unreadable());
        }
        let s = spin(multiplicity, letter, electrons)?;
        let parity = mark.unwrap_or(Parity::natural(l));
        Self::of_numbers(n, Term::new(l, s, parity), j, projections, electrons)
    }

    /// The label of given quantum numbers.
    ///
    /// Errors: as [`Label::parse`].
    pub fn of_numbers(
        n: Option<u32>,
        term: Term,
        j: Option<HalfInteger>,
        projections: Projections,
        electrons: Electrons,
    ) -> Result<Self, LabelError> {
        check_term(n, term, electrons)?;
        if let Some(j) = j {
            check_momentum(term, j)?;
        }
        let coupling = couple(term, j, projections)?;
        Ok(Label { n, term, coupling })
    }
}

fn spin(multiplicity: Option<u32>, letter: char, electrons: Electrons) -> Result<HalfInteger, LabelError> {
    let Some(multiplicity) = multiplicity else {
        return match electrons {
            Electrons { spin: false, .. } => Ok(HalfInteger::whole(0)),
            Electrons { count: Some(1), .. } => Ok(HalfInteger::from_twice(1)),
            _ => Err(LabelError::MissingMultiplicity { letter: letter.to_ascii_uppercase() }),
        };
    };
    if multiplicity == 0 {
        return Err(LabelError::ZeroMultiplicity);
    }
    if !electrons.spin {
        return Err(LabelError::NoSpin { multiplicity });
    }
    let s = HalfInteger::from_twice(i32::try_from(multiplicity - 1).unwrap_or(i32::MAX / 8));
    match electrons.count {
        Some(count) if !electrons.can_have_spin(s) => {
            let possible = (0..=count.min(8)).filter(|twice| (count - twice) % 2 == 0).map(|twice| twice + 1).collect();
            Err(LabelError::Multiplicity { multiplicity, electrons: count, possible })
        }
        _ => Ok(s),
    }
}

fn check_term(n: Option<u32>, term: Term, electrons: Electrons) -> Result<(), LabelError> {
    if n == Some(0) {
        return Err(LabelError::ZeroN);
    }
    match electrons.count {
        Some(1) => match n {
            Some(n) if n <= term.l => Err(LabelError::Principal { n, l: term.l }),
            _ if !term.is_natural() => Err(LabelError::ParityOfOne { l: term.l }),
            _ => Ok(()),
        },
        Some(2) if term.l == 0 && term.parity == Parity::Odd => Err(LabelError::OddS),
        _ => Ok(()),
    }
}

fn check_momentum(term: Term, j: HalfInteger) -> Result<(), LabelError> {
    if term.has_momentum(j) {
        return Ok(());
    }
    let Term { l, s, .. } = term;
    if (term.twice_l() + s.twice() + j.twice()) % 2 != 0 {
        return Err(LabelError::MomentumKind { l, s, j, sum_is_whole: s.is_whole() });
    }
    let smallest = HalfInteger::from_twice((term.twice_l() - s.twice()).abs());
    let largest = HalfInteger::from_twice(term.twice_l() + s.twice());
    Err(LabelError::Triangle { l, s, j, smallest, largest })
}

fn couple(term: Term, j: Option<HalfInteger>, projections: Projections) -> Result<Coupling, LabelError> {
    let l = HalfInteger::from_twice(term.twice_l());
    let momenta: Vec<HalfInteger> = term.momenta().collect();
    let only = match momenta[..] {
        [only] => Some(only),
        _ => None,
    };
    match projections {
        Projections { m: None, ml: None, ms: None } => Ok(j.map_or(Coupling::Term, |j| Coupling::Level { j })),
        Projections { m: Some(m), ml: None, ms: None } => {
            let j = j.or(only).ok_or(LabelError::WhichMomentum { momenta })?;
            check_projection("M", m, "J", j)?;
            Ok(Coupling::State { j, m })
        }
        Projections { m: None, ml, ms } => {
            if j.is_some() {
                return Err(LabelError::MixedProjections);
            }
            // nothing is left open for a spin or an orbital momentum of zero
            let zero = HalfInteger::whole(0);
            let ml = ml.or((l == zero).then_some(zero)).ok_or(LabelError::HalfProduct { missing: "ML" })?;
            let ms = ms.or((term.s == zero).then_some(zero)).ok_or(LabelError::HalfProduct { missing: "MS" })?;
            check_projection("ML", ml, "L", l)?;
            check_projection("MS", ms, "S", term.s)?;
            Ok(Coupling::Product { ml, ms })
        }
        _ => Err(LabelError::MixedProjections),
    }
}

fn check_projection(
    name: &'static str,
    value: HalfInteger,
    of: &'static str,
    size: HalfInteger,
) -> Result<(), LabelError> {
    if (value.twice() - size.twice()) % 2 != 0 {
        return Err(LabelError::ProjectionKind { name, value, of, size });
    }
    if value.twice().abs() > size.twice() {
        return Err(LabelError::ProjectionSize { name, value, of, size });
    }
    Ok(())
}

struct Reader<'a> {
    text: &'a str,
    rest: &'a str,
}

impl Reader<'_> {
    fn unreadable(&self) -> LabelError {
        LabelError::Unreadable { text: self.text.to_string(), rest: self.rest.to_string() }
    }

    fn skip(&mut self, wanted: char) -> bool {
        match self.rest.strip_prefix(wanted) {
            Some(rest) => {
                self.rest = rest;
                true
            }
            None => false,
        }
    }

    fn number(&mut self) -> Result<Option<u32>, LabelError> {
        let end = self.rest.find(|c: char| !c.is_ascii_digit()).unwrap_or(self.rest.len());
        let (digits, rest) = self.rest.split_at(end);
        if digits.is_empty() {
            return Ok(None);
        }
        match digits.parse::<u32>() {
            Ok(number) if number <= LARGEST_NUMBER => {
                self.rest = rest;
                Ok(Some(number))
            }
            _ => Err(LabelError::TooLarge { number: digits.to_string() }),
        }
    }

    fn multiplicity(&mut self) -> Result<Option<u32>, LabelError> {
        if !self.skip('^') {
            return Ok(None);
        }
        match self.number()? {
            Some(number) => Ok(Some(number)),
            None => Err(self.unreadable()),
        }
    }

    fn letter(&mut self) -> Result<char, LabelError> {
        let letter = self.rest.chars().next().ok_or_else(|| LabelError::NoLetter { text: self.text.to_string() })?;
        if !letter.is_ascii_alphabetic() {
            return Err(self.unreadable());
        }
        self.rest = &self.rest[1..];
        Ok(letter)
    }

    fn parity(&mut self) -> Option<Parity> {
        for (mark, parity) in [("^e", Parity::Even), ("^o", Parity::Odd)] {
            if let Some(rest) = self.rest.strip_prefix(mark) {
                self.rest = rest;
                return Some(parity);
            }
        }
        None
    }

    fn momentum(&mut self) -> Result<Option<HalfInteger>, LabelError> {
        if !self.skip('_') {
            return Ok(None);
        }
        let Some(number) = self.number()? else { return Err(self.unreadable()) };
        let number = i32::try_from(number).unwrap_or(i32::MAX / 8);
        if let Some(rest) = self.rest.strip_prefix("/2") {
            self.rest = rest;
            return Ok(Some(HalfInteger::from_twice(number)));
        }
        Ok(Some(HalfInteger::whole(number)))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn read(text: &str, electrons: Electrons) -> Result<Label, LabelError> {
        Label::parse(text, Projections::default(), electrons)
    }

    fn with_m(text: &str, twice_m: i32, electrons: Electrons) -> Result<Label, LabelError> {
        let projections = Projections { m: Some(HalfInteger::from_twice(twice_m)), ..Projections::default() };
        Label::parse(text, projections, electrons)
    }

    #[test]
    fn labels_of_one_and_two_electrons() {
        let p = read("2p_3/2", Electrons::ONE).expect("a label");
        assert_eq!((p.n, p.term.l, p.term.s.twice()), (Some(2), 1, 1));
        assert_eq!(p.coupling, Coupling::Level { j: HalfInteger::from_twice(3) });
        let spinless = with_m("2p", 2, Electrons::ONE_WITHOUT_SPIN).expect("a label");
        assert_eq!(spinless.coupling, Coupling::State { j: HalfInteger::whole(1), m: HalfInteger::whole(1) });
        let triplet = read("2^3P_1", Electrons::TWO).expect("a label");
        assert_eq!(triplet.term, Term::natural(1, HalfInteger::whole(1)));
        let even = read("2^3P^e", Electrons::TWO).expect("a label");
        assert_eq!(even.term.parity, Parity::Even);
        assert_eq!(read("2^3P_1^e", Electrons::TWO).expect("a label").term, even.term);
        let ground = with_m("2^3S", 0, Electrons::TWO).expect("only one J");
        assert_eq!(ground.coupling, Coupling::State { j: HalfInteger::whole(1), m: HalfInteger::whole(0) });
        assert_eq!(read("^3P", Electrons::ANY).expect("a label").n, None);
    }

    #[test]
    fn every_broken_rule_is_named() {
        use LabelError as E;
        let two = Electrons::TWO;
        assert!(matches!(read("2^3P_3", two), Err(E::Triangle { .. })));
        assert!(matches!(read("2^3P_1/2", two), Err(E::MomentumKind { .. })));
        assert!(matches!(read("2^2P", two), Err(E::Multiplicity { multiplicity: 2, electrons: 2, .. })));
        assert!(matches!(read("2P", two), Err(E::MissingMultiplicity { .. })));
        assert!(matches!(read("2^3J", two), Err(E::Letter { letter: 'J' })));
        assert!(matches!(read("2^3S^o", two), Err(E::OddS)));
        assert!(matches!(read("2^3P^e_1^e", two), Err(E::ParityTwice)));
        assert!(matches!(read("2^0P", two), Err(E::ZeroMultiplicity)));
        assert!(matches!(read("0^1S", two), Err(E::ZeroN)));
        assert!(matches!(read("2d", Electrons::ONE), Err(E::Principal { n: 2, l: 2 })));
        assert!(matches!(read("2p^e", Electrons::ONE), Err(E::ParityOfOne { l: 1 })));
        assert!(matches!(read("2^3P", Electrons::ONE), Err(E::Multiplicity { .. })));
        assert!(matches!(read("2^2P", Electrons::ONE_WITHOUT_SPIN), Err(E::NoSpin { .. })));
        assert!(matches!(read("1234567890123s", Electrons::ONE), Err(E::TooLarge { .. })));
        for text in ["", "2", "2^", "2^3", "2p_", "2p_x", "2p 1", "ψ", "2pé"] {
            assert!(read(text, Electrons::ONE).is_err(), "{text}");
        }
        assert!(matches!(with_m("2^3P_1", 4, two), Err(E::ProjectionSize { .. })));
        assert!(matches!(with_m("2^3P_1", 1, two), Err(E::ProjectionKind { .. })));
        assert!(matches!(with_m("2^3P", 0, two), Err(E::WhichMomentum { .. })));
        let ml = Projections { ml: Some(HalfInteger::whole(1)), ..Projections::default() };
        assert!(matches!(Label::parse("2^3P", ml, two), Err(E::HalfProduct { missing: "MS" })));
        assert!(matches!(Label::parse("2^3P_1", ml, two), Err(E::MixedProjections)));
        let both = Projections { ms: Some(HalfInteger::whole(0)), ..ml };
        assert!(matches!(Label::parse("2^3P", both, two), Ok(Label { coupling: Coupling::Product { .. }, .. })));
        let far = Projections { ml: Some(HalfInteger::whole(2)), ..both };
        assert!(matches!(Label::parse("2^3P", far, two), Err(E::ProjectionSize { name: "ML", .. })));
    }

    #[test]
    fn messages_say_rule_and_cure() {
        let error = read("2^3P_3", Electrons::TWO).expect_err("no such J");
        assert_eq!(error.to_string(), "L = 1 and S = 1 do not couple to J = 3: J is between 0 and 2");
        assert_eq!(error.help(), "J can be 0, 1, 2");
        let error = read("2^2P", Electrons::TWO).expect_err("no doublet");
        assert_eq!(error.to_string(), "2 electrons have no term of multiplicity 2; 2S+1 can be 1, 3");
    }
}
