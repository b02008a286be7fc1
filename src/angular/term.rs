//! Terms and levels: L, S, parity and J.

use super::half_integer::HalfInteger;
use std::fmt;

/// Letters of L = 0, 1, 2, …: after F alphabetical, without J and the letters already used.
const LETTERS: &[u8] = b"SPDFGHIKLMNOQRTUVWXYZ";

/// The behaviour of a wave function under inversion of all coordinates.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub enum Parity {
    Even,
    Odd,
}

impl Parity {
    /// The natural parity (-1)^L.
    pub const fn natural(l: u32) -> Self {
        if l.is_multiple_of(2) { Parity::Even } else { Parity::Odd }
    }

    pub const fn flipped(self) -> Self {
        match self {
            Parity::Even => Parity::Odd,
            Parity::Odd => Parity::Even,
        }
    }
}

/// What a spectroscopic term says: L, S and parity.
///
/// Of some levels only J and the parity are known; they enter as L = 0 and S = J, on which tensors of orbital rank 0 and spin rank K act as
/// the Wigner-Eckart theorem for J says, with no further factor.
/// The order is by L, then S, then parity.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub struct Term {
    pub l: u32,
    pub s: HalfInteger,
    pub parity: Parity,
    /// Whether L and S are not known and `s` is J.
    momentum_only: bool,
}

impl Term {
    pub const fn new(l: u32, s: HalfInteger, parity: Parity) -> Self {
        Term { l, s, parity, momentum_only: false }
    }

    /// A level of which only J and the parity are known.
    pub const fn of_momentum(j: HalfInteger, parity: Parity) -> Self {
        Term { l: 0, s: j, parity, momentum_only: true }
    }

    /// Whether only J and the parity are known.
    pub const fn is_momentum_only(self) -> bool {
        self.momentum_only
    }

    /// Another term, of which as much is known as of this one.
    pub(crate) const fn other(self, l: u32, s: HalfInteger, parity: Parity) -> Self {
        Term { l, s, parity, ..self }
    }

    /// The term of natural parity (-1)^L.
    pub const fn natural(l: u32, s: HalfInteger) -> Self {
        Term::new(l, s, Parity::natural(l))
    }

    pub(crate) fn twice_l(self) -> i32 {
        i32::try_from(self.l).unwrap_or(i32::MAX / 8).saturating_mul(2)
    }

    /// The J a term splits into, ascending: |L-S| to L+S.
    pub fn momenta(self) -> impl Iterator<Item = HalfInteger> {
        let (l, s) = (self.twice_l(), self.s.twice());
        ((l - s).abs()..=l + s).step_by(2).map(HalfInteger::from_twice)
    }

    pub fn has_momentum(self, j: HalfInteger) -> bool {
        let (l, s, j) = (self.twice_l(), self.s.twice(), j.twice());
        (l + s + j) % 2 == 0 && (l - s).abs() <= j && j <= l + s
    }

    pub fn is_natural(self) -> bool {
        self.parity == Parity::natural(self.l)
    }

    /// The letter of L; `None` beyond the alphabet.
    pub fn letter(self) -> Option<char> {
        letter(self.l)
    }
}

/// The letter of an orbital angular momentum.
pub fn letter(l: u32) -> Option<char> {
    LETTERS.get(usize::try_from(l).ok()?).map(|&b| char::from(b))
}

/// The orbital angular momentum of a letter, upper or lower case.
pub fn momentum_of_letter(letter: char) -> Option<u32> {
    let wanted = letter.to_ascii_uppercase();
    let index = LETTERS.iter().position(|&b| char::from(b) == wanted)?;
    u32::try_from(index).ok()
}

/// Writes `^3P`, `^3P^e` where the parity is not (-1)^L, and `J=3/2 odd` where no more is known.
impl fmt::Display for Term {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if self.momentum_only {
            let parity = match self.parity {
                Parity::Even => "even",
                Parity::Odd => "odd",
            };
            return write!(f, "J={} {parity}", self.s);
        }
        write!(f, "^{}", self.s.twice() + 1)?;
        match self.letter() {
            Some(letter) => write!(f, "{letter}")?,
            None => write!(f, "[L={}]", self.l)?,
        }
        match (self.is_natural(), self.parity) {
            (true, _) => Ok(()),
            (false, Parity::Even) => write!(f, "^e"),
            (false, Parity::Odd) => write!(f, "^o"),
        }
    }
}

/// A term with its J: the states |(L S) J M> of all M.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub struct Level {
    pub term: Term,
    pub j: HalfInteger,
}

impl Level {
    pub const fn new(term: Term, j: HalfInteger) -> Self {
        Level { term, j }
    }
}

/// Writes `^3P_1`.
impl fmt::Display for Level {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if self.term.is_momentum_only() {
            return write!(f, "{}", self.term);
        }
        write!(f, "{}_{}", self.term, self.j)
    }
}

/// The values of M of a level, ascending: -J to J.
pub fn projections(j: HalfInteger) -> impl Iterator<Item = HalfInteger> {
    (-j.twice()..=j.twice()).step_by(2).map(HalfInteger::from_twice)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn momenta_of_a_term() {
        let triplet_p = Term::natural(1, HalfInteger::whole(1));
        let momenta: Vec<String> = triplet_p.momenta().map(|j| j.to_string()).collect();
        assert_eq!(momenta, ["0", "1", "2"]);
        let doublet_d = Term::natural(2, HalfInteger::from_twice(1));
        let momenta: Vec<String> = doublet_d.momenta().map(|j| j.to_string()).collect();
        assert_eq!(momenta, ["3/2", "5/2"]);
        assert!(triplet_p.has_momentum(HalfInteger::whole(2)));
        assert!(!triplet_p.has_momentum(HalfInteger::whole(3)));
        assert!(!triplet_p.has_momentum(HalfInteger::from_twice(1)));
    }

    #[test]
    fn letters_leave_out_j() {
        assert_eq!(letter(6), Some('I'));
        assert_eq!(letter(7), Some('K'));
        assert_eq!(momentum_of_letter('k'), Some(7));
        assert_eq!(momentum_of_letter('j'), None);
        assert_eq!(letter(40), None);
    }

    #[test]
    fn shown_with_parity_only_where_it_is_not_natural() {
        let one = HalfInteger::whole(1);
        assert_eq!(Term::natural(1, one).to_string(), "^3P");
        assert_eq!(Term::new(1, one, Parity::Even).to_string(), "^3P^e");
        assert_eq!(Level::new(Term::natural(1, one), one).to_string(), "^3P_1");
    }

    #[test]
    fn a_level_without_a_term_shows_its_momentum_and_parity() {
        let j = HalfInteger::from_twice(3);
        let term = Term::of_momentum(j, Parity::Odd);
        assert_eq!(Level::new(term, j).to_string(), "J=3/2 odd");
        assert_eq!(term.momenta().collect::<Vec<_>>(), [j]);
        assert_ne!(term, Term::new(0, j, Parity::Odd));
    }
}
