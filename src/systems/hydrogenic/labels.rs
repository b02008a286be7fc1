//! Labels of states: `2p`, `2p_3/2`, or quantum numbers by name.

use super::numbers::{Numbers, Vector, half};
use crate::angular::{Coupling, Electrons, HalfInteger, Label, LabelError, Projections, Term};
use crate::systems::{Manifold, State, StateLabel, SystemError};
use rug::Rational;

/// Largest principal quantum number a label may name.
pub(super) const LARGEST_N: u32 = 200;

/// The quantum numbers a label gives.
#[derive(Clone, Copy, Default, Debug)]
struct Named {
    n: Option<u32>,
    l: Option<u32>,
    j: Option<HalfInteger>,
    projections: Projections,
}

fn refused(message: String, help: impl Into<String>) -> SystemError {
    SystemError::Refused { message, help: help.into() }
}

/// The eigenstate a label names; the projections stay open where they are not given and there is more than one.
pub(super) fn state(label: &StateLabel, electrons: Electrons) -> Result<State, SystemError> {
    let named = read(label, electrons)?;
    let Some(n) = named.n else {
        return Err(refused("this label names no state: n is missing".into(), "write the state as 1s, or as n=1, l=0"));
    };
    let Some(l) = named.l.or(if n == 1 { Some(0) } else { None }) else {
        let count = u64::from(n) * u64::from(n) * if electrons.spin { 2 } else { 1 };
        return Err(refused(
            format!("n={n} is a level of {count} states: l is missing"),
            format!("name one state, as {n}s or n={n}, l=0; a whole level is a manifold"),
        ));
    };
    let term = Term::natural(l, half(electrons));
    let label = Label::of_numbers(Some(n), term, named.j, named.projections, electrons);
    let vector = match label.map_err(|error| broken(&error, electrons))?.coupling {
        Coupling::State { m, .. } if !electrons.spin => Vector::Orbital { m: m.twice() / 2 },
        Coupling::Product { ml, .. } if !electrons.spin => Vector::Orbital { m: ml.twice() / 2 },
        Coupling::Term | Coupling::Level { .. } if !electrons.spin && l == 0 => Vector::Orbital { m: 0 },
        Coupling::Term | Coupling::Level { .. } if !electrons.spin => Vector::Term,
        Coupling::Term if l == 0 => Vector::Level { twice_j: 1 },
        Coupling::Term => Vector::Term,
        Coupling::Level { j } => Vector::Level { twice_j: momentum(j) },
        Coupling::State { j, m } => Vector::Coupled { twice_j: momentum(j), twice_m: m.twice() },
        Coupling::Product { ml, ms } => Vector::Product { ml: ml.twice() / 2, twice_ms: ms.twice() },
    };
    Ok(Numbers { n, l, vector }.state())
}

/// The states with n and l (`2p`), of one j of them (`2p_3/2`), or with n (`n=2`).
pub(super) fn manifold(label: &StateLabel, electrons: Electrons) -> Result<Manifold, SystemError> {
    let named = read(label, electrons)?;
    if let Some((name, m)) = given(named.projections) {
        return Err(refused(
            format!("a manifold holds all {name}; this one names {name}={m}"),
            format!("leave {name} out, or declare a state"),
        ));
    }
    let (Some(n), l) = (named.n, named.l) else {
        return Err(refused(
            "this label names no level: n is missing".into(),
            "write the manifold as 2p, or as n=2 for all l",
        ));
    };
    let Some(l) = l else {
        return match named.j {
            None => Ok(Manifold { label: format!("n={n}"), numbers: vec![i64::from(n)] }),
            Some(j) => Err(refused(
                format!("j={j} belongs to an l, and l is missing"),
                format!("write n={n}, l=1, j={j}, or n={n} for the whole level"),
            )),
        };
    };
    let term = Term::natural(l, half(electrons));
    let label = Label::of_numbers(Some(n), term, named.j, Projections::default(), electrons);
    label.map_err(|error| broken(&error, electrons))?;
    let twice_j = named.j.filter(|_| electrons.spin).map(momentum);
    Ok(level(n, l, twice_j))
}

/// A manifold by its numbers.
pub(super) fn level(n: u32, l: u32, twice_j: Option<u32>) -> Manifold {
    let mut numbers = vec![i64::from(n), i64::from(l)];
    numbers.extend(twice_j.map(i64::from));
    let vector = twice_j.map_or(Vector::Term, |twice_j| Vector::Level { twice_j });
    Manifold { label: Numbers { n, l, vector }.label(), numbers }
}

fn momentum(j: HalfInteger) -> u32 {
    u32::try_from(j.twice()).unwrap_or(0)
}

fn given(projections: Projections) -> Option<(&'static str, HalfInteger)> {
    let Projections { m, ml, ms } = projections;
    m.map(|m| ("M", m)).or(ml.map(|ml| ("ML", ml))).or(ms.map(|ms| ("MS", ms)))
}

fn read(label: &StateLabel, electrons: Electrons) -> Result<Named, SystemError> {
    let mut named = spectroscopic(label.text.trim(), electrons)?;
    for (name, value) in &label.options {
        match name.as_str() {
            "n" => put(&mut named.n, whole_number(name, value)?, name)?,
            "l" => put(&mut named.l, whole_number(name, value)?, name)?,
            "j" | "J" => put(&mut named.j, multiple_of_half(name, value)?, name)?,
            "m" | "M" => put(&mut named.projections.m, multiple_of_half(name, value)?, name)?,
            "ml" | "ML" => put(&mut named.projections.ml, multiple_of_half(name, value)?, name)?,
            "ms" | "MS" => put(&mut named.projections.ms, multiple_of_half(name, value)?, name)?,
            _ => {
                let help = if electrons.spin {
                    "it has n, l, j and M, or n, l, ML and MS"
                } else {
                    "it has n, l and m; the electron has no spin here"
                };
                return Err(refused(format!("a state of a hydrogen-like atom has no quantum number {name}"), help));
            }
        }
    }
    if let Some(n) = named.n {
        if n == 0 {
            return Err(refused("there is no level n=0".into(), "n starts at 1"));
        }
        if n > LARGEST_N {
            return Err(beyond(n));
        }
    }
    Ok(named)
}

fn beyond(n: impl std::fmt::Display) -> SystemError {
    refused(format!("n={n} is beyond n={LARGEST_N}, the highest level with a label"), "choose a lower n")
}

/// The rule a label breaks, with what to write for an electron that has no spin yet.
fn broken(error: &LabelError, electrons: Electrons) -> SystemError {
    let help = match error {
        LabelError::NoSpin { .. } | LabelError::MomentumKind { .. } if !electrons.spin => {
            "declare the system with spin, as in `hydrogenic(Z=1, spin=1/2)`".into()
        }
        LabelError::ProjectionKind { value, .. } if !electrons.spin && !value.is_whole() => {
            "declare the system with spin, as in `hydrogenic(Z=1, spin=1/2)`".into()
        }
        LabelError::WhichMomentum { .. } => "write J behind the term, as in 2p_3/2, or give ML and MS".into(),
        LabelError::MixedProjections => "write 2p_3/2 with M=1/2, or 2p with ML=0 and MS=1/2".into(),
        LabelError::HalfProduct { missing: "MS" } => "add MS=1/2 or MS=-1/2".into(),
        _ => error.help(),
    };
    refused(error.to_string(), help)
}

fn put<T: PartialEq>(slot: &mut Option<T>, value: T, name: &str) -> Result<(), SystemError> {
    if slot.as_ref().is_some_and(|old| *old != value) {
        return Err(refused(format!("this label gives {name} twice, with two values"), format!("give {name} once")));
    }
    *slot = Some(value);
    Ok(())
}

fn whole_number(name: &str, value: &Rational) -> Result<u32, SystemError> {
    let whole = if *value.denom() == 1 { value.numer().to_i32() } else { None };
    let Some(whole) = whole else {
        return Err(refused(
            format!("{name}={value} is not possible: {name} is a whole number"),
            format!("give {name} a whole number"),
        ));
    };
    u32::try_from(whole).map_err(|_| refused(format!("{name}={value} is negative"), format!("{name} starts at zero")))
}

fn multiple_of_half(name: &str, value: &Rational) -> Result<HalfInteger, SystemError> {
    HalfInteger::from_rational(value).map_err(|error| {
        refused(format!("{name}={value} is not possible: {error}"), format!("give {name} a multiple of 1/2"))
    })
}

fn spectroscopic(text: &str, electrons: Electrons) -> Result<Named, SystemError> {
    let form = "write n and a letter for l, as 1s, 2p, 3d, or name them: n=3, l=2";
    if text.is_empty() {
        return Ok(Named::default());
    }
    let letters = text.trim_start_matches(|c: char| c.is_ascii_digit());
    let number = &text[..text.len() - letters.len()];
    if number.is_empty() {
        return Err(refused(format!("`{}` names no state: it does not start with n", shown(text)), form));
    }
    let Some(n) = number.parse().ok().filter(|n| *n <= LARGEST_N) else { return Err(beyond(shown(number))) };
    if letters.is_empty() {
        return Ok(Named { n: Some(n), ..Named::default() });
    }
    let label = Label::parse(text, Projections::default(), electrons).map_err(|error| match error {
        LabelError::Unreadable { .. } | LabelError::NoLetter { .. } => {
            refused(format!("`{}` names no state of a hydrogen-like atom", shown(text)), form)
        }
        error => broken(&error, electrons),
    })?;
    let j = match label.coupling {
        Coupling::Level { j } => Some(j),
        _ => None,
    };
    Ok(Named { n: label.n, l: Some(label.term.l), j, projections: Projections::default() })
}

/// A text as it is quoted in a message: not too long.
fn shown(text: &str) -> String {
    let mut out: String = text.chars().take(20).collect();
    if out.len() < text.len() {
        out.push('…');
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    const SPINLESS: Electrons = Electrons::ONE_WITHOUT_SPIN;
    const SPIN: Electrons = Electrons::ONE;

    fn label(text: &str, options: &[(&str, (i32, i32))]) -> StateLabel {
        let options = options.iter().map(|(name, q)| ((*name).into(), Rational::from(*q))).collect();
        StateLabel { text: text.into(), options }
    }

    #[test]
    fn labels_and_names_agree() {
        for (text, numbers) in [("1s", &[1, 0, 0][..]), ("3d", &[3, 2]), ("8k", &[8, 7]), (" 10m ", &[10, 9])] {
            assert_eq!(state(&label(text, &[]), SPINLESS).expect("a state").numbers, numbers);
        }
        let by_name = state(&label("", &[("n", (3, 1)), ("l", (2, 1)), ("m", (-2, 1))]), SPINLESS).expect("a state");
        for name in ["m", "M", "ML"] {
            assert_eq!(by_name, state(&label("3d", &[(name, (-2, 1))]), SPINLESS).expect("a state"));
        }
        assert_eq!(by_name.label, "3d, m=-2");
        let high = state(&label("", &[("n", (200, 1)), ("l", (150, 1)), ("m", (0, 1))]), SPINLESS).expect("a state");
        assert_eq!(high.label, "n=200, l=150, m=0");
    }

    #[test]
    fn labels_with_spin() {
        for (text, options, shown) in [
            ("2p_3/2", &[("M", (1, 2))][..], "2p_3/2, M=1/2"),
            ("2p", &[("j", (3, 2)), ("m", (-3, 2))], "2p_3/2, M=-3/2"),
            ("2^2P_1/2", &[("M", (1, 2))], "2p_1/2, M=1/2"),
            ("1s", &[("M", (-1, 2))], "1s_1/2, M=-1/2"),
            ("2p", &[("ML", (1, 1)), ("MS", (1, 2))], "2p, ML=1, MS=1/2"),
            ("1s", &[("MS", (1, 2))], "1s, ML=0, MS=1/2"),
            ("2p_3/2", &[], "2p_3/2"),
            ("1s", &[], "1s_1/2"),
            ("2p", &[], "2p"),
            ("", &[("n", (90, 1)), ("l", (60, 1)), ("j", (121, 2))], "n=90, l=60, j=121/2"),
        ] {
            let found = state(&label(text, options), SPIN).expect("a state");
            assert_eq!(found.label, shown);
            assert_eq!(Numbers::of(&found).map(|numbers| numbers.state()), Some(found));
        }
        assert_eq!(manifold(&label("2p_3/2", &[]), SPIN).expect("a level").numbers, [2, 1, 3]);
        assert_eq!(manifold(&label("2p", &[]), SPIN).expect("a term").numbers, [2, 1]);
    }

    #[test]
    fn manifolds() {
        assert_eq!(manifold(&label("2p", &[]), SPINLESS).expect("a manifold").numbers, [2, 1]);
        let level = manifold(&label("", &[("n", (2, 1))]), SPINLESS).expect("a level");
        assert_eq!((level.label.as_str(), &level.numbers[..]), ("n=2", &[2][..]));
        assert!(manifold(&label("2p", &[("m", (1, 1))]), SPINLESS).is_err());
        assert!(manifold(&label("", &[("n", (2, 1)), ("j", (1, 2))]), SPIN).is_err());
    }

    #[test]
    fn mistakes_are_explained() {
        for (text, options, electrons, part) in [
            ("2d", &[][..], SPINLESS, "l is at most n - 1"),
            ("2p", &[("m", (2, 1))], SPINLESS, "outside -1 to 1"),
            ("2p", &[("m", (1, 2))], SPINLESS, "they differ by a whole number"),
            ("2p", &[("m", (1, 3))], SPINLESS, "not a whole or half-integer number"),
            ("2j", &[], SPINLESS, "no L is called `j`"),
            ("0s", &[], SPINLESS, "n counts from 1"),
            ("0", &[("l", (0, 1))], SPINLESS, "there is no level n=0"),
            ("999999999999s", &[], SPINLESS, "is beyond n=200"),
            ("201s", &[], SPINLESS, "is beyond n=200"),
            ("s", &[], SPINLESS, "does not start with n"),
            ("2", &[], SPINLESS, "l is missing"),
            ("", &[("l", (1, 1))], SPINLESS, "n is missing"),
            ("2p", &[("l", (0, 1))], SPINLESS, "gives l twice"),
            ("2p", &[("k", (1, 1))], SPINLESS, "no quantum number k"),
            ("2p_1/2", &[], SPINLESS, "does not go with L = 1 and S = 0"),
            ("2^2P", &[], SPINLESS, "spin is left out here"),
            ("2p p", &[], SPINLESS, "names no state of a hydrogen-like atom"),
            ("", &[("n", (2, 1)), ("l", (-1, 1))], SPINLESS, "l=-1 is negative"),
            ("2p_5/2", &[("M", (1, 2))], SPIN, "do not couple to J = 5/2"),
            ("2p", &[("M", (1, 2))], SPIN, "the term has several: 1/2, 3/2"),
            ("2p_3/2", &[("M", (1, 1))], SPIN, "they differ by a whole number"),
            ("2p_3/2", &[("ML", (1, 1)), ("MS", (1, 2))], SPIN, "either J and M, or ML and MS"),
            ("2p", &[("ML", (1, 1))], SPIN, "MS is missing"),
            ("2^3P", &[], SPIN, "2S+1 can be 2"),
        ] {
            match state(&label(text, options), electrons) {
                Err(SystemError::Refused { message, help }) => {
                    assert!(message.contains(part), "{message}");
                    assert!(!help.is_empty());
                }
                other => panic!("{text} {options:?}: {other:?}"),
            }
        }
    }
}
