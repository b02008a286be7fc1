//! What the angular algebra knows of the atom.

use super::Hydrogenic;
use super::exact::foreign_state;
use super::numbers::{Numbers, Vector, half, momentum};
use super::operators;
use crate::angular::selection::BlockRules;
use crate::angular::{HalfInteger, Level, Term, chain};
use crate::systems::{Atom, Manifold, State, Symmetry, SystemError};

impl Symmetry for Hydrogenic {
    fn rules(&self) -> BlockRules {
        BlockRules::of(self.electrons)
    }

    /// Errors: `Refused` for the whole of `2p` with spin, which has two j.
    fn end(&self, state: &State) -> Result<chain::State, SystemError> {
        let Some(Numbers { n, l, vector }) = Numbers::of(state) else { return Err(foreign_state(state)) };
        let term = Term::natural(l, half(self.electrons));
        let name = Numbers { n, l, vector: Vector::Term }.label();
        let whole = HalfInteger::whole;
        // without spin j is l
        let orbital = whole(i32::try_from(l).unwrap_or(i32::MAX / 8));
        match vector {
            Vector::Term if self.electrons.spin => {
                let momenta: Vec<String> = term.momenta().map(|j| format!("{name}_{j}")).collect();
                Err(SystemError::Refused {
                    message: format!("{name} has several j: {}", momenta.join(", ")),
                    help: format!("write {}, or another of them", momenta[momenta.len() - 1]),
                })
            }
            Vector::Term => Ok(chain::State::level(&name, term, orbital)),
            Vector::Level { twice_j } => Ok(chain::State::level(&name, term, momentum(twice_j))),
            Vector::Orbital { m } => Ok(chain::State::coupled(&name, term, orbital, whole(m))),
            Vector::Coupled { twice_j, twice_m } => {
                Ok(chain::State::coupled(&name, term, momentum(twice_j), HalfInteger::from_twice(twice_m)))
            }
            Vector::Product { ml, twice_ms } => {
                Ok(chain::State::product(&name, term, whole(ml), HalfInteger::from_twice(twice_ms)))
            }
        }
    }

    fn tensors(&self, atom: &Atom) -> Result<chain::Operator, SystemError> {
        operators::tensors(atom, self.setting())
    }

    fn levels(&self, manifold: &Manifold) -> Vec<Level> {
        let number = |index: usize| manifold.numbers.get(index).and_then(|number| u32::try_from(*number).ok());
        let Some(n) = number(0) else { return Vec::new() };
        let momenta = match number(1) {
            Some(l) => l..l + 1,
            None => 0..n,
        };
        let wanted = number(2).map(momentum);
        let mut levels = Vec::new();
        for l in momenta {
            let term = Term::natural(l, half(self.electrons));
            let held = term.momenta().filter(|j| wanted.is_none_or(|wanted| wanted == *j));
            levels.extend(held.map(|j| Level::new(term, j)));
        }
        levels
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::angular::chain::AngularVector;
    use crate::num::Effort;
    use crate::systems::{StateLabel, System};
    use rug::Rational;

    fn atom() -> Hydrogenic {
        Hydrogenic::new(Rational::from(1), None).expect("hydrogen").with_spin()
    }

    fn label(text: &str, options: &[(&str, (i32, i32))]) -> StateLabel {
        let options = options.iter().map(|(name, q)| ((*name).into(), Rational::from(*q))).collect();
        StateLabel { text: text.into(), options }
    }

    #[test]
    fn ends_of_chains() {
        let end = |text: &str, options: &[(&str, (i32, i32))]| {
            let state = atom().state(&label(text, options), &Effort::new()).expect("a state");
            atom().end(&state)
        };
        let open = end("2p_3/2", &[]).expect("a level");
        assert_eq!(
            (open.name.as_str(), open.vector),
            ("2p", AngularVector::Coupled { j: HalfInteger::from_twice(3), m: None })
        );
        let product = end("3d", &[("ML", (-2, 1)), ("MS", (1, 2))]).expect("a state");
        let ms = HalfInteger::from_twice(1);
        assert_eq!(product.vector, AngularVector::Product { ml: HalfInteger::whole(-2), ms });
        match end("2p", &[]) {
            Err(SystemError::Refused { message, .. }) => assert_eq!(message, "2p has several j: 2p_1/2, 2p_3/2"),
            other => panic!("{other:?}"),
        }
    }

    #[test]
    fn operators_are_sums_of_tensors() {
        let parts = |name: &str, component: Option<&str>, power: i64| {
            let operator = Atom { name: name.into(), component: component.map(Into::into), arguments: vec![], power };
            atom().tensors(&operator).map(|operator| {
                let names = operator.parts.iter().map(|part| (part.tensor.element.name.clone(), part.tensor.total));
                names.collect::<Vec<_>>()
            })
        };
        assert_eq!(parts("D", Some("x"), 1), Ok(vec![("r".into(), 1)]));
        assert_eq!(parts("J", Some("+1"), 1), Ok(vec![("1".into(), 1), ("1".into(), 1)]));
        assert_eq!(parts("spin_orbit", None, 1), Ok(vec![("r^-3".into(), 0)]));
        assert_eq!(parts("darwin", None, 1), Ok(vec![("delta(r)".into(), 0)]));
        assert!(parts("D", Some("x"), 2).is_err());
    }

    #[test]
    fn levels_of_manifolds() {
        let count = |text: &str, options: &[(&str, (i32, i32))]| {
            let manifold = atom().manifold(&label(text, options), &Effort::new()).expect("a manifold");
            atom().levels(&manifold).len()
        };
        assert_eq!([count("2p", &[]), count("2p_1/2", &[]), count("", &[("n", (3, 1))])], [2, 1, 5]);
    }
}
