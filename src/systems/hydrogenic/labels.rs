//! Spectroscopic labels: `2p`, or n, l and m by name.

use crate::systems::{Manifold, Omitted, State, StateLabel, SystemError};
use rug::Rational;

/// Letters for l = 0, 1, 2, …
const LETTERS: &[u8] = b"spdfghiklmnoqrtuvwxyz";

/// Largest principal quantum number a label may name.
pub(super) const LARGEST_N: u32 = 200;

/// The quantum numbers a label fixes.
#[derive(Clone, Copy, Default, Debug)]
struct Named {
    n: Option<u32>,
    l: Option<u32>,
    m: Option<i32>,
}

fn refused(message: String, help: impl Into<String>) -> SystemError {
    SystemError::Refused { message, help: help.into() }
}

/// The eigenstate a label names; m is zero where it is not given.
pub(super) fn state(label: &StateLabel) -> Result<State, SystemError> {
    let named = read(label)?;
    let (Some(n), l) = (named.n, named.l) else {
        return Err(refused("this label names no state: n is missing".into(), "write the state as 1s, or as n=1, l=0"));
    };
    let Some(l) = l.or(if n == 1 { Some(0) } else { None }) else {
        return Err(refused(
            format!("n={n} is a level of {} states: l is missing", u64::from(n) * u64::from(n)),
            format!("name one state, as {n}s or n={n}, l=0; a whole level is a manifold"),
        ));
    };
    let m = named.m.unwrap_or(0);
    if m.unsigned_abs() > l {
        return Err(refused(
            format!("m={m} does not exist for l={l}: m runs from {} to {l}", -i64::from(l)),
            format!(
                "write {}, m={} or another m between",
                short(n, l),
                if m < 0 { -i64::from(l) } else { i64::from(l) }
            ),
        ));
    }
    Ok(named_state(n, l, m))
}

/// A state by its numbers.
pub(super) fn named_state(n: u32, l: u32, m: i32) -> State {
    let label = if l == 0 { short(n, l) } else { format!("{}, m={m}", short(n, l)) };
    State { label, numbers: vec![i64::from(n), i64::from(l), i64::from(m)] }
}

/// The states with n and l (`2p`), or with n (`n=2`).
pub(super) fn manifold(label: &StateLabel) -> Result<Manifold, SystemError> {
    let named = read(label)?;
    if let Some(m) = named.m {
        return Err(refused(
            format!("a manifold holds all m; this one names m={m}"),
            "leave m out, or declare a state",
        ));
    }
    match (named.n, named.l) {
        (Some(n), Some(l)) => Ok(Manifold { label: short(n, l), numbers: vec![i64::from(n), i64::from(l)] }),
        (Some(n), None) => Ok(Manifold { label: format!("n={n}"), numbers: vec![i64::from(n)] }),
        (None, _) => Err(refused(
            "this label names no level: n is missing".into(),
            "write the manifold as 2p, or as n=2 for all l",
        )),
    }
}

/// `2p`; by name where there is no letter.
pub(super) fn short(n: u32, l: u32) -> String {
    match LETTERS.get(usize::try_from(l).unwrap_or(usize::MAX)) {
        Some(&letter) => format!("{n}{}", char::from(letter)),
        None => format!("n={n}, l={l}"),
    }
}

/// n, l, m of a state made here.
pub(super) fn quantum_numbers(state: &State) -> Option<(u32, u32, i32)> {
    match state.numbers[..] {
        [n, l, m] => Some((u32::try_from(n).ok()?, u32::try_from(l).ok()?, i32::try_from(m).ok()?)),
        _ => None,
    }
}

/// The principal quantum numbers that are left out of block l, ascending.
pub(super) fn omitted_levels(omitted: &[Omitted], l: u32) -> Vec<u32> {
    let mut levels: Vec<u32> = omitted
        .iter()
        .filter_map(|one| {
            let numbers = match one {
                Omitted::LevelOf(state) => state.numbers.get(..1)?,
                Omitted::Manifold(manifold) => &manifold.numbers[..],
            };
            let n = u32::try_from(*numbers.first()?).ok()?;
            let here = numbers.get(1).is_none_or(|&of| of == i64::from(l));
            (here && n > l).then_some(n)
        })
        .collect();
    levels.sort_unstable();
    levels.dedup();
    levels
}

fn read(label: &StateLabel) -> Result<Named, SystemError> {
    let mut named = spectroscopic(label.text.trim())?;
    for (name, value) in &label.options {
        let whole = whole_number(name, value)?;
        match name.as_str() {
            "n" => put(&mut named.n, positive(name, whole)?, name)?,
            "l" => put(&mut named.l, positive(name, whole)?, name)?,
            "m" => put(&mut named.m, whole, name)?,
            _ => {
                return Err(refused(
                    format!("a state of a hydrogen-like atom has no quantum number {name}"),
                    "it has n, l and m; the electron has no spin here",
                ));
            }
        }
    }
    if let Some(n) = named.n {
        if n == 0 {
            return Err(refused("there is no level n=0".into(), "n starts at 1"));
        }
        if n > LARGEST_N {
            return Err(refused(
                format!("n={n} is beyond n={LARGEST_N}, the highest level with a label"),
                "choose a lower n",
            ));
        }
        if let Some(l) = named.l.filter(|&l| l >= n) {
            let letter = short(n, l);
            return Err(refused(
                format!("there is no {letter} state: l={l} needs n >= {}", l + 1),
                format!("the lowest state with this l is {}", short(l + 1, l)),
            ));
        }
    }
    Ok(named)
}

fn put<T: PartialEq>(slot: &mut Option<T>, value: T, name: &str) -> Result<(), SystemError> {
    if slot.as_ref().is_some_and(|old| *old != value) {
        return Err(refused(format!("this label gives {name} twice, with two values"), format!("give {name} once")));
    }
    *slot = Some(value);
    Ok(())
}

fn whole_number(name: &str, value: &Rational) -> Result<i32, SystemError> {
    let whole = if *value.denom() == 1 { value.numer().to_i32() } else { None };
    whole.ok_or_else(|| {
        refused(
            format!("{name}={value} is not possible: {name} is a whole number, for the electron has no spin here"),
            format!("give {name} a whole number"),
        )
    })
}

fn positive(name: &str, value: i32) -> Result<u32, SystemError> {
    u32::try_from(value).map_err(|_| refused(format!("{name}={value} is negative"), format!("{name} starts at zero")))
}

fn spectroscopic(text: &str) -> Result<Named, SystemError> {
    let digits = text.bytes().take_while(u8::is_ascii_digit).count();
    let (number, letters) = text.split_at(digits);
    let form = "write n and a letter for l, as 1s, 2p, 3d, or name them: n=3, l=2";
    if text.is_empty() {
        return Ok(Named::default());
    }
    if number.is_empty() {
        return Err(refused(format!("`{}` names no state: it does not start with n", shown(text)), form));
    }
    let n = number.parse().unwrap_or(u32::MAX);
    let l = match letters.as_bytes() {
        [] => None,
        [letter] => match LETTERS.iter().position(|l| l == letter) {
            Some(l) => u32::try_from(l).ok(),
            None => {
                return Err(refused(
                    format!("{letters} stands for no l"),
                    "the letters are s p d f g h i k l m n o q r t u v w x y z, for l = 0, 1, 2, …",
                ));
            }
        },
        _ => return Err(refused(format!("`{}` names no state of a hydrogen-like atom", shown(text)), form)),
    };
    Ok(Named { n: Some(n), l, m: None })
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

    fn label(text: &str, options: &[(&str, (i32, i32))]) -> StateLabel {
        let options = options.iter().map(|(name, q)| ((*name).into(), Rational::from(*q))).collect();
        StateLabel { text: text.into(), options }
    }

    #[test]
    fn labels_and_names_agree() {
        for (text, numbers) in [("1s", [1, 0, 0]), ("3d", [3, 2, 0]), ("8k", [8, 7, 0]), (" 10m ", [10, 9, 0])] {
            assert_eq!(state(&label(text, &[])).expect("a state").numbers, numbers);
        }
        let by_name = state(&label("", &[("n", (3, 1)), ("l", (2, 1)), ("m", (-2, 1))])).expect("a state");
        assert_eq!(by_name, state(&label("3d", &[("m", (-2, 1))])).expect("a state"));
        assert_eq!(by_name.label, "3d, m=-2");
        assert_eq!(state(&label("", &[("n", (200, 1)), ("l", (150, 1))])).expect("a state").label, "n=200, l=150, m=0");
    }

    #[test]
    fn manifolds() {
        assert_eq!(manifold(&label("2p", &[])).expect("a manifold").numbers, [2, 1]);
        let level = manifold(&label("", &[("n", (2, 1))])).expect("a level");
        assert_eq!((level.label.as_str(), &level.numbers[..]), ("n=2", &[2][..]));
        assert!(manifold(&label("2p", &[("m", (1, 1))])).is_err());
        let p3 = Omitted::Manifold(manifold(&label("3p", &[])).expect("a manifold"));
        let two = Omitted::LevelOf(named_state(2, 0, 0));
        assert_eq!(omitted_levels(&[p3.clone(), two.clone(), Omitted::Manifold(level)], 1), [2, 3]);
        assert_eq!(omitted_levels(&[p3, two], 0), [2]);
    }

    #[test]
    fn mistakes_are_explained() {
        for (text, options, part) in [
            ("2d", &[][..], "l=2 needs n >= 3"),
            ("2p", &[("m", (2, 1))], "m runs from -1 to 1"),
            ("2p", &[("m", (1, 2))], "m is a whole number"),
            ("2j", &[], "j stands for no l"),
            ("0s", &[], "there is no level n=0"),
            ("999999999999s", &[], "is beyond n=200"),
            ("s", &[], "does not start with n"),
            ("2", &[], "l is missing"),
            ("", &[("l", (1, 1))], "n is missing"),
            ("2p", &[("l", (0, 1))], "gives l twice"),
            ("2p", &[("j", (1, 2))], "no spin here"),
            ("2p", &[("j", (1, 1))], "no quantum number j"),
            ("2p_1/2", &[], "names no state of a hydrogen-like atom"),
            ("", &[("n", (2, 1)), ("l", (-1, 1))], "l=-1 is negative"),
        ] {
            match state(&label(text, options)) {
                Err(SystemError::Refused { message, help }) => {
                    assert!(message.contains(part), "{message}");
                    assert!(!help.is_empty());
                }
                other => panic!("{text} {options:?}: {other:?}"),
            }
        }
    }
}
