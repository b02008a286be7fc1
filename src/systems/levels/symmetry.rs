//! What the angular algebra knows of a level table: J and the parity of its levels, the rank of its operators.

use super::LevelSystem;
use super::labels;
use super::operators::{self, Operator, component_number};
use super::table::Shape;
use crate::angular::chain;
use crate::angular::label::Electrons;
use crate::angular::polarization::Component;
use crate::angular::selection::BlockRules;
use crate::angular::tensor::{Sign, Tensor};
use crate::angular::{HalfInteger, Level, Parity, Term};
use crate::systems::{Atom, Block, Manifold, State, Symmetry, SystemError};

impl Symmetry for LevelSystem {
    /// The J and parities of the levels: nothing else is known, not even of levels with an LS label, since elements depend on J one by one.
    fn rules(&self) -> BlockRules {
        let terms = self.table.shape.levels.iter().map(|level| term_of(level.block)).collect();
        BlockRules { terms: Some(terms), ..BlockRules::of(Electrons::ANY) }
    }

    fn end(&self, state: &State) -> Result<chain::State, SystemError> {
        let shape = &self.table.shape;
        let Some(entry) = labels::level_of(state).and_then(|level| shape.levels.get(level)) else {
            return Err(SystemError::Refused {
                message: format!("{} is no level here", state.label),
                help: String::new(),
            });
        };
        let (term, j) = (term_of(entry.block), HalfInteger::from_twice(entry.twice_j()));
        Ok(match labels::twice_m_of(state) {
            Some(twice_m) => chain::State::coupled(&entry.name, term, j, HalfInteger::from_twice(twice_m)),
            None => chain::State::level(&entry.name, term, j),
        })
    }

    fn tensors(&self, atom: &Atom) -> Result<chain::Operator, SystemError> {
        let shape = &self.table.shape;
        // a summed index is not a component the system has, but every vector has it
        let index = atom.component.as_deref().filter(|component| matches!(*component, "i" | "j" | "k"));
        let known = match index {
            Some(_) => operators::read(shape, &Atom { component: Some("z".into()), ..atom.clone() })?,
            None => operators::read(shape, atom)?,
        };
        let component = match (index, atom.component.as_deref()) {
            (Some(index), _) => Component::Index(index.to_string()),
            (None, Some(text)) => match component_number(text) {
                Some(q) => Component::Spherical(q),
                None => text.chars().next().and_then(Component::axis).unwrap_or(Component::Spherical(0)),
            },
            (None, None) => Component::Spherical(0),
        };
        match known {
            Some(Operator::Hamiltonian) => Ok(chain::Operator::scalar(Tensor::scalar("H"))),
            Some(Operator::Tensor { index, .. }) => Ok(chain::Operator::new(tensor(shape, index)?, component)),
            Some(Operator::Momentum { .. }) => Ok(chain::Operator::total_momentum(&component)),
            Some(Operator::MomentumSquared) | None => Err(SystemError::Refused {
                message: format!("{}^{} is a product of operators", atom.name, atom.power),
                help: format!("write the factors one by one, as {0}_z {0}_z", atom.name),
            }),
        }
    }

    fn levels(&self, manifold: &Manifold) -> Vec<Level> {
        let shape = &self.table.shape;
        let found = manifold.numbers.iter().filter_map(|index| shape.levels.get(usize::try_from(*index).ok()?));
        found.map(|entry| Level::new(term_of(entry.block), HalfInteger::from_twice(entry.twice_j()))).collect()
    }
}

/// A block as the engine sees it.
pub fn term_of(block: Block) -> Term {
    match block {
        Block::Level { twice_j, odd } => {
            let parity = if odd { Parity::Odd } else { Parity::Even };
            Term::of_momentum(HalfInteger::from_twice(i32::try_from(twice_j).unwrap_or(0)), parity)
        }
        _ => Term::of_momentum(HalfInteger::whole(0), Parity::Even),
    }
}

/// A tensor of the table: of its rank on J alone.
fn tensor(shape: &Shape, index: usize) -> Result<Tensor, SystemError> {
    let entry = &shape.operators[index];
    let tensor = Tensor::of_momentum(&entry.name, entry.rank)
        .map_err(|error| SystemError::Refused { message: error.to_string(), help: error.help() })?
        .with_adjoint(Sign::Plus);
    Ok(if entry.odd { tensor.odd() } else { tensor })
}
