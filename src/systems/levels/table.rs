//! What a level table holds: levels with energies, operators with reduced elements, all with uncertainties.

use super::fault::Quantity;
use crate::angular::Label;
use crate::num::Surd;
use crate::systems::{Block, SystemError};
use rug::{Complex, Float, Rational};
use std::collections::{BTreeMap, BTreeSet};
use std::sync::{Arc, OnceLock};

/// A number with its standard uncertainty, in the unit of the file.
#[derive(Clone, PartialEq, Debug)]
pub struct Datum {
    pub value: Rational,
    pub sigma: Rational,
}

/// A level without its energy.
#[derive(Clone, Debug)]
pub struct LevelEntry {
    pub name: String,
    /// Where the name is a spectroscopic label.
    pub label: Option<Label>,
    pub block: Block,
    /// Its unit of energy in hartree.
    pub unit: Rational,
}

impl LevelEntry {
    pub fn twice_j(&self) -> i32 {
        twice_j_of(self.block)
    }
}

/// Twice the J of a block of a level table.
pub fn twice_j_of(block: Block) -> i32 {
    match block {
        Block::Level { twice_j, .. } => i32::try_from(twice_j).unwrap_or(0),
        _ => 0,
    }
}

/// A tensor operator of the table, with real reduced elements, Hermitian: (T_q)^+ = (-1)^q T_-q.
#[derive(Clone, PartialEq, Debug)]
pub struct OperatorEntry {
    pub name: String,
    pub rank: u32,
    /// Whether it changes the parity.
    pub odd: bool,
}

/// An element <from||T||to> without its value.
#[derive(Clone, Debug)]
pub struct ElementEntry {
    pub from: usize,
    pub to: usize,
    pub operator: usize,
    pub quantity: Quantity,
    /// Its unit in atomic units.
    pub unit: Rational,
}

/// A way of an operator from a level to another: the element, and the sign with which it stands for <other||T||this>.
#[derive(Clone, Debug)]
pub struct Link {
    pub other: usize,
    pub element: usize,
    pub negative: bool,
}

/// Everything but the numbers; the same for all tables that come from one by moving a datum.
pub struct Shape {
    pub levels: Vec<LevelEntry>,
    pub operators: Vec<OperatorEntry>,
    pub elements: Vec<ElementEntry>,
    /// By operator and level.
    links: Vec<Vec<Vec<Link>>>,
    /// The blocks an operator reaches from a block.
    reach: BTreeMap<(usize, Block), BTreeSet<Block>>,
    /// For each level the first level of the same energy.
    group: Vec<usize>,
}

/// A reduced element, or the square of a positive one.
#[derive(Clone, Debug)]
enum Reduced {
    Value(Rational),
    RootOf(Rational),
}

struct ReducedElement {
    value: Reduced,
    exact: OnceLock<Option<Surd>>,
}

/// A level table.
#[derive(Clone)]
pub struct Table {
    pub shape: Arc<Shape>,
    energies: Vec<Datum>,
    values: Vec<Datum>,
    hartrees: Vec<Rational>,
    reduced: Vec<Arc<ReducedElement>>,
}

impl Table {
    /// A table whose rows were checked: J and parities fit the ranks, strengths are not negative, oscillator strengths lead upwards.
    pub fn new(
        levels: Vec<(LevelEntry, Datum)>,
        operators: Vec<OperatorEntry>,
        elements: Vec<(ElementEntry, Datum)>,
    ) -> Self {
        let (levels, energies): (Vec<_>, Vec<_>) = levels.into_iter().unzip();
        let (elements, values): (Vec<_>, Vec<_>) = elements.into_iter().unzip();
        let hartrees: Vec<Rational> =
            levels.iter().zip(&energies).map(|(level, energy)| Rational::from(&energy.value * &level.unit)).collect();
        let mut first: BTreeMap<&Rational, usize> = BTreeMap::new();
        let group = hartrees.iter().enumerate().map(|(at, energy)| *first.entry(energy).or_insert(at)).collect();
        let mut links = vec![vec![Vec::new(); levels.len()]; operators.len()];
        let mut reach: BTreeMap<(usize, Block), BTreeSet<Block>> = BTreeMap::new();
        for (at, element) in elements.iter().enumerate() {
            let ElementEntry { from, to, operator, .. } = *element;
            let (a, b) = (&levels[from], &levels[to]);
            links[operator][to].push(Link { other: from, element: at, negative: false });
            reach.entry((operator, b.block)).or_default().insert(a.block);
            if from != to {
                // <J||T||J'> = (-1)^(J-J') <J'||T||J> for a Hermitian tensor with real elements
                let negative = (a.twice_j() - b.twice_j()) / 2 % 2 != 0;
                links[operator][from].push(Link { other: to, element: at, negative });
                reach.entry((operator, a.block)).or_default().insert(b.block);
            }
        }
        let shape = Arc::new(Shape { levels, operators, elements, links, reach, group });
        let mut table = Table { shape, energies, values, hartrees, reduced: Vec::new() };
        table.reduced = (0..table.values.len()).map(|at| Arc::new(table.reduced_element(at))).collect();
        table
    }

    /// Source: S = |<J||D||J'>|^2 and f = 2 (E' - E) S/(3 (2J+1)) in atomic units for absorption from J to J' (Bethe & Salpeter, section 61;
    /// Sobelman, section 9.2).
    fn reduced_element(&self, at: usize) -> ReducedElement {
        let element = &self.shape.elements[at];
        let value = Rational::from(&self.values[at].value * &element.unit);
        let value = match element.quantity {
            Quantity::Reduced => Reduced::Value(value),
            Quantity::LineStrength => Reduced::RootOf(value),
            Quantity::OscillatorStrength => {
                let gap = Rational::from(&self.hartrees[element.to] - &self.hartrees[element.from]);
                let weight = self.shape.levels[element.from].twice_j() + 1;
                Reduced::RootOf(value * (3 * weight) / (gap * 2))
            }
        };
        ReducedElement { value, exact: OnceLock::new() }
    }

    /// The energy of a level in hartree.
    pub fn energy(&self, level: usize) -> &Rational {
        &self.hartrees[level]
    }

    /// A reduced element exactly; `None` where it is the square root of a number too long to be taken apart.
    pub fn exact_element(&self, at: usize) -> Option<&Surd> {
        let element = &self.reduced[at];
        let exact = element.exact.get_or_init(|| match &element.value {
            Reduced::Value(value) => Some(Surd::from(value.clone())),
            Reduced::RootOf(square) => Surd::sqrt_of(square),
        });
        exact.as_ref()
    }

    pub fn numeric_element(&self, at: usize, bits: u32) -> Complex {
        let value = match &self.reduced[at].value {
            Reduced::Value(value) => Float::with_val(bits, value),
            Reduced::RootOf(square) => Float::with_val(bits, square).sqrt(),
        };
        Complex::with_val(bits, (value, 0))
    }

    /// The standard uncertainties: energies first, then elements, in the order and the units of the file.
    pub fn uncertainties(&self) -> Vec<Rational> {
        self.energies.iter().chain(&self.values).map(|datum| datum.sigma.clone()).collect()
    }

    /// The table with one number moved. Levels of equal energy in the file still count as one level.
    pub fn moved(&self, datum: usize, by: &Rational) -> Result<Table, SystemError> {
        let mut table = self.clone();
        let mut changed = Vec::new();
        if let Some(energy) = table.energies.get_mut(datum) {
            energy.value += by;
            table.hartrees[datum] = Rational::from(&energy.value * &self.shape.levels[datum].unit);
            let touched = self.shape.elements.iter().enumerate().filter(|(_, element)| {
                element.quantity == Quantity::OscillatorStrength && (element.from == datum || element.to == datum)
            });
            changed.extend(touched.map(|(at, _)| at));
        } else if let Some(value) = table.values.get_mut(datum - self.energies.len()) {
            value.value += by;
            changed.push(datum - self.energies.len());
        } else {
            return Err(SystemError::Refused {
                message: format!("the table has no number {datum}"),
                help: String::new(),
            });
        }
        for at in changed {
            let element = table.reduced_element(at);
            if matches!(&element.value, Reduced::RootOf(square) if *square < 0) {
                return Err(negative_strength(&self.shape, at));
            }
            table.reduced[at] = Arc::new(element);
        }
        Ok(table)
    }
}

fn negative_strength(shape: &Shape, at: usize) -> SystemError {
    let element = &shape.elements[at];
    let (from, to) = (&shape.levels[element.from].name, &shape.levels[element.to].name);
    SystemError::Refused {
        message: format!(
            "within its uncertainty the strength from {from} to {to} may be negative, so its root has no uncertainty"
        ),
        help: "give the reduced matrix element with its own uncertainty".into(),
    }
}

impl Shape {
    /// Where an operator leads from a level.
    pub fn links(&self, operator: usize, level: usize) -> &[Link] {
        self.links.get(operator).and_then(|links| links.get(level)).map_or(&[], Vec::as_slice)
    }

    /// The blocks an operator reaches from a block, ascending.
    pub fn reach(&self, operator: usize, from: Block) -> impl Iterator<Item = Block> {
        self.reach.get(&(operator, from)).into_iter().flatten().copied()
    }

    pub fn operator(&self, name: &str) -> Option<usize> {
        self.operators.iter().position(|operator| operator.name == name)
    }

    /// Tells whether two levels have the same energy in the file.
    pub fn degenerate(&self, a: usize, b: usize) -> bool {
        self.group.get(a).is_some_and(|group| self.group.get(b) == Some(group))
    }
}
