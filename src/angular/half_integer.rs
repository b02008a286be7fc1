//! Angular momenta: multiples of one half.

use rug::Rational;
use std::fmt;

/// Largest angular momentum the exact symbols accept; larger ones are long integers that nobody reads.
pub const LARGEST_J: i32 = 5000;

/// A multiple of one half, kept as its double.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub struct HalfInteger {
    twice: i32,
}

/// Why an argument is not an angular momentum, or arguments do not go together.
#[derive(Clone, PartialEq, Eq, Debug, thiserror::Error)]
pub enum AngularError {
    #[error("{value} is not a whole or half-integer number")]
    NotHalfInteger { value: Rational },
    #[error("an angular momentum is not negative; this one is {value}")]
    Negative { value: HalfInteger },
    #[error("the angular momentum {value} is larger than {LARGEST_J}, the most the exact symbols accept")]
    TooLarge { value: Rational },
    #[error("j = {j} does not go with m = {m}: they differ by a whole number or not at all")]
    Projection { j: HalfInteger, m: HalfInteger },
    #[error("{a}, {b} and {c} never couple: their sum is not a whole number")]
    Sum { a: HalfInteger, b: HalfInteger, c: HalfInteger },
    #[error("this sum has {terms} long terms, more than the {limit} that are done exactly")]
    TooLong { terms: u64, limit: u64 },
}

impl HalfInteger {
    pub const fn from_twice(twice: i32) -> Self {
        HalfInteger { twice }
    }

    pub const fn whole(n: i32) -> Self {
        HalfInteger { twice: 2 * n }
    }

    pub const fn twice(self) -> i32 {
        self.twice
    }

    pub const fn is_whole(self) -> bool {
        self.twice % 2 == 0
    }

    /// The half-integer a rational is.
    ///
    /// Errors: `NotHalfInteger`, `TooLarge` (also for a size no machine integer holds).
    pub fn from_rational(value: &Rational) -> Result<Self, AngularError> {
        let twice = Rational::from(value * 2);
        if *twice.denom() != 1 {
            return Err(AngularError::NotHalfInteger { value: value.clone() });
        }
        let limit = 2 * LARGEST_J;
        match twice.numer().to_i32() {
            Some(twice) if twice.abs() <= limit => Ok(HalfInteger { twice }),
            _ => Err(AngularError::TooLarge { value: value.clone() }),
        }
    }

    /// Checks that this can be an angular momentum.
    pub(crate) fn as_momentum(self) -> Result<i32, AngularError> {
        if self.twice < 0 {
            Err(AngularError::Negative { value: self })
        } else if self.twice > 2 * LARGEST_J {
            Err(AngularError::TooLarge { value: Rational::from((self.twice, 2)) })
        } else {
            Ok(self.twice)
        }
    }
}

impl From<i32> for HalfInteger {
    fn from(n: i32) -> Self {
        Self::whole(n)
    }
}

impl fmt::Display for HalfInteger {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if self.is_whole() { write!(f, "{}", self.twice / 2) } else { write!(f, "{}/2", self.twice) }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn only_multiples_of_one_half() {
        assert_eq!(HalfInteger::from_rational(&Rational::from((3, 2))), Ok(HalfInteger::from_twice(3)));
        assert_eq!(HalfInteger::from_rational(&Rational::from(-2)), Ok(HalfInteger::whole(-2)));
        let third = Rational::from((1, 3));
        assert_eq!(HalfInteger::from_rational(&third), Err(AngularError::NotHalfInteger { value: third }));
        assert!(HalfInteger::from_rational(&Rational::from(1u64 << 60)).is_err());
    }

    #[test]
    fn shown_as_on_paper() {
        assert_eq!(HalfInteger::from_twice(-3).to_string(), "-3/2");
        assert_eq!(HalfInteger::whole(2).to_string(), "2");
    }
}
