//! What can go wrong with a number, as data.

use std::fmt;

/// Why an operation on numbers has no answer.
#[derive(Clone, PartialEq, Eq, Debug, thiserror::Error)]
pub enum NumberError {
    #[error("division by zero")]
    DivisionByZero,
    /// The value is known only to lie in a region that contains a zero, or touches a branch cut, where the answer hangs on it.
    #[error("{question} cannot be decided at this precision")]
    Undecided { question: Question },
    #[error("the logarithm of zero does not exist")]
    LogarithmOfZero,
    /// A real answer was needed and the argument has none.
    #[error("{function} of a negative number is not a real number")]
    NotReal { function: &'static str },
    /// A magnitude was compared where the number has an imaginary part.
    #[error("a complex number is neither positive nor negative; a real number is wanted here")]
    NotOrdered,
    #[error("the number would have {decimal_digits} digits, more than can be worked with")]
    TooLarge { decimal_digits: DigitCount },
}

/// What a wider working precision would have to tell.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Question {
    /// Is the divisor zero?
    DivisorIsZero,
    /// Is the argument of the logarithm zero?
    LogarithmOfZero,
    /// On which side of the negative real axis does the argument of a root, a logarithm or a power lie?
    SideOfCut,
    /// Is the number positive or negative?
    Sign,
    /// Is the base of a power zero?
    BaseIsZero,
}

impl fmt::Display for Question {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(match self {
            Question::DivisorIsZero => "whether the divisor is zero",
            Question::LogarithmOfZero => "whether the argument of the logarithm is zero",
            Question::SideOfCut => {
                "on which side of the negative real axis, the cut of roots, logarithms and powers, the argument lies"
            }
            Question::Sign => "whether the number is positive or negative",
            Question::BaseIsZero => "whether the base of the power is zero",
        })
    }
}

/// How many decimal digits a number would have that is not built.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Debug)]
pub enum DigitCount {
    About(u64),
    MoreThan(u64),
}

impl fmt::Display for DigitCount {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let (word, count) = match self {
            DigitCount::About(n) => ("about", *n),
            DigitCount::MoreThan(n) => ("more than", *n),
        };
        // A power of ten this large says more than its zeros.
        if count >= 1_000_000_000_000_000_000 {
            write!(f, "{word} 10^{}", count.ilog10())
        } else {
            write!(f, "{word} {count}")
        }
    }
}

impl NumberError {
    /// A floating-point result left the range of exponents.
    pub(crate) fn beyond_exponent_range() -> Self {
        // 2^(2^30 - 1) in decimal
        NumberError::TooLarge { decimal_digits: DigitCount::MoreThan(323_228_496) }
    }

    /// Tells whether more working precision may give an answer.
    pub fn is_undecided(&self) -> bool {
        matches!(self, NumberError::Undecided { .. })
    }

    /// What to do about it, in the words of the person who typed the expression.
    pub fn help(&self) -> Option<&'static str> {
        match self {
            NumberError::DivisionByZero => Some("check the denominator: it is exactly zero"),
            NumberError::Undecided { question: Question::SideOfCut } => {
                Some("move the argument off the negative real axis, or give it as an exact number")
            }
            NumberError::Undecided { .. } => Some("ask for more digits, or write the number so that it is exact"),
            NumberError::LogarithmOfZero => Some("check the argument: it is exactly zero"),
            NumberError::NotReal { .. } => Some("put a minus sign in front, or write the imaginary unit i yourself"),
            NumberError::NotOrdered => Some("take re(...), im(...) or abs(...) of it"),
            NumberError::TooLarge { .. } => Some("work with its logarithm, or with a smaller exponent"),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn messages_say_what_and_how_long() {
        let error = |decimal_digits| NumberError::TooLarge { decimal_digits }.to_string();
        assert_eq!(
            error(DigitCount::About(301_029_995_664)),
            "the number would have about 301029995664 digits, more than can be worked with"
        );
        assert_eq!(
            error(DigitCount::MoreThan(1_000_000_000_000_000_000)),
            "the number would have more than 10^18 digits, more than can be worked with"
        );
        let undecided = NumberError::Undecided { question: Question::DivisorIsZero };
        assert_eq!(undecided.to_string(), "whether the divisor is zero cannot be decided at this precision");
        assert!(undecided.is_undecided() && undecided.help().is_some());
    }
}
