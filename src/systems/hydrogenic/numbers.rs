//! Quantum numbers of the states, in the order in which a state carries them.

use crate::angular::term::{letter, projections};
use crate::angular::{Electrons, HalfInteger, Term};
use crate::systems::{Block, Manifold, Omitted, Sector, State};

/// n, l and the angular vector of a state.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(super) struct Numbers {
    pub(super) n: u32,
    pub(super) l: u32,
    pub(super) vector: Vector,
}

/// The angular vector, or what is fixed of it.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(super) enum Vector {
    /// All states of n and l.
    Term,
    /// All M of one j.
    Level { twice_j: u32 },
    /// |l m> of an electron without spin.
    Orbital { m: i32 },
    /// |(l 1/2) j M>.
    Coupled { twice_j: u32, twice_m: i32 },
    /// |l ml> |1/2 ms>.
    Product { ml: i32, twice_ms: i32 },
}

/// Marks of the vectors that have spin, behind n and l.
const LEVEL: i64 = 0;
const COUPLED: i64 = 1;
const PRODUCT: i64 = 2;

impl Numbers {
    /// The state of |n l m> without spin.
    pub(super) fn orbital(n: u32, l: u32, m: i32) -> Self {
        Numbers { n, l, vector: Vector::Orbital { m } }
    }

    /// The numbers of a state made here.
    pub(super) fn of(state: &State) -> Option<Self> {
        let (&[n, l], rest) = state.numbers.split_first_chunk::<2>()?;
        let size = |number: i64| u32::try_from(number).ok();
        let sign = |number: i64| i32::try_from(number).ok();
        let vector = match *rest {
            [] => Vector::Term,
            [m] => Vector::Orbital { m: sign(m)? },
            [LEVEL, twice_j] => Vector::Level { twice_j: size(twice_j)? },
            [COUPLED, twice_j, twice_m] => Vector::Coupled { twice_j: size(twice_j)?, twice_m: sign(twice_m)? },
            [PRODUCT, ml, twice_ms] => Vector::Product { ml: sign(ml)?, twice_ms: sign(twice_ms)? },
            _ => return None,
        };
        Some(Numbers { n: size(n)?, l: size(l)?, vector })
    }

    /// The state with these numbers.
    pub(super) fn state(self) -> State {
        let mut numbers = vec![i64::from(self.n), i64::from(self.l)];
        match self.vector {
            Vector::Term => {}
            Vector::Level { twice_j } => numbers.extend([LEVEL, i64::from(twice_j)]),
            Vector::Orbital { m } => numbers.push(i64::from(m)),
            Vector::Coupled { twice_j, twice_m } => numbers.extend([COUPLED, i64::from(twice_j), i64::from(twice_m)]),
            Vector::Product { ml, twice_ms } => numbers.extend([PRODUCT, i64::from(ml), i64::from(twice_ms)]),
        }
        State { label: self.label(), numbers }
    }

    /// `2p, m=1`, `2p_3/2, M=1/2`, `2p, ML=1, MS=1/2`, `2p_3/2`, `2p`.
    pub(super) fn label(self) -> String {
        let level = |twice_j: u32| self.level_name(twice_j);
        let term = short(self.n, self.l);
        match self.vector {
            Vector::Term => term,
            Vector::Orbital { .. } if self.l == 0 => term,
            Vector::Orbital { m } => format!("{term}, m={m}"),
            Vector::Level { twice_j } => level(twice_j),
            Vector::Coupled { twice_j, twice_m } => {
                format!("{}, M={}", level(twice_j), HalfInteger::from_twice(twice_m))
            }
            Vector::Product { ml, twice_ms } => {
                format!("{term}, ML={ml}, MS={}", HalfInteger::from_twice(twice_ms))
            }
        }
    }

    fn level_name(self, twice_j: u32) -> String {
        let (term, j) = (short(self.n, self.l), momentum(twice_j));
        if letter(self.l).is_some() { format!("{term}_{j}") } else { format!("{term}, j={j}") }
    }

    /// How many states carry these numbers; `None` where it is one.
    pub(super) fn count(self, electrons: Electrons) -> Option<u64> {
        let states = 2 * u64::from(self.l) + 1;
        match self.vector {
            Vector::Term if electrons.spin => Some(2 * states),
            Vector::Term => Some(states),
            Vector::Level { twice_j } => Some(u64::from(twice_j) + 1),
            Vector::Orbital { .. } | Vector::Coupled { .. } | Vector::Product { .. } => None,
        }
    }

    /// The states of a level that have a part in a sector.
    ///
    /// A product state belongs to a basis of product states; other states with spin to one of coupled states.
    pub(super) fn level_in(self, sector: Sector) -> Vec<Numbers> {
        let n = self.n;
        match sector.block {
            Block::Orbital { l } if l < n => vec![Numbers::orbital(n, l, sector.twice_m / 2)],
            Block::Coupled { l, .. } if l < n && matches!(self.vector, Vector::Product { .. }) => {
                let reach = i32::try_from(l).unwrap_or(i32::MAX);
                let products =
                    [1, -1].map(|twice_ms| Vector::Product { ml: (sector.twice_m - twice_ms) / 2, twice_ms });
                let inside = |vector: &Vector| matches!(vector, Vector::Product { ml, .. } if ml.abs() <= reach);
                products.into_iter().filter(inside).map(|vector| Numbers { n, l, vector }).collect()
            }
            Block::Coupled { l, twice_j } if l < n => {
                vec![Numbers { n, l, vector: Vector::Coupled { twice_j, twice_m: sector.twice_m } }]
            }
            _ => Vec::new(),
        }
    }
}

/// All states of n and l, or of one j of them.
pub(super) fn states_of(n: u32, l: u32, twice_j: Option<u32>, electrons: Electrons) -> Vec<State> {
    if !electrons.spin {
        let reach = i32::try_from(l).unwrap_or(i32::MAX);
        return (-reach..=reach).map(|m| Numbers::orbital(n, l, m).state()).collect();
    }
    let wanted = |j: &HalfInteger| twice_j.is_none_or(|twice_j| u32::try_from(j.twice()) == Ok(twice_j));
    let mut states = Vec::new();
    for j in Term::natural(l, half(electrons)).momenta().filter(wanted) {
        let twice_j = u32::try_from(j.twice()).unwrap_or(0);
        for m in projections(j) {
            let vector = Vector::Coupled { twice_j, twice_m: m.twice() };
            states.push(Numbers { n, l, vector }.state());
        }
    }
    states
}

/// The spin of the electron.
pub(super) const fn half(electrons: Electrons) -> HalfInteger {
    HalfInteger::from_twice(if electrons.spin { 1 } else { 0 })
}

/// The j of its double.
pub(super) fn momentum(twice_j: u32) -> HalfInteger {
    HalfInteger::from_twice(i32::try_from(twice_j).unwrap_or(0))
}

/// `2p`; by name where there is no letter.
fn short(n: u32, l: u32) -> String {
    match letter(l) {
        Some(letter) => format!("{n}{}", letter.to_ascii_lowercase()),
        None => format!("n={n}, l={l}"),
    }
}

/// The name of the states of n in a block.
pub(super) fn level_name(n: u32, block: Block) -> String {
    match block {
        Block::Coupled { l, twice_j } => Numbers { n, l, vector: Vector::Level { twice_j } }.label(),
        Block::Orbital { l } => short(n, l),
        Block::Whole | Block::Level { .. } => format!("n={n}"),
    }
}

/// Whether a manifold holds the states of n in a block.
pub(super) fn in_manifold(manifold: &Manifold, n: u32, block: Block) -> bool {
    let (l, twice_j) = match block {
        Block::Coupled { l, twice_j } => (l, Some(twice_j)),
        Block::Orbital { l } => (l, None),
        Block::Whole | Block::Level { .. } => return false,
    };
    let same = |index: usize, number: u32| manifold.numbers.get(index).is_none_or(|&of| of == i64::from(number));
    same(0, n) && same(1, l) && twice_j.is_none_or(|twice_j| same(2, twice_j)) && n > l
}

/// The principal quantum numbers that are left out of a block, ascending.
pub(super) fn omitted_levels(omitted: &[Omitted], block: Block) -> Vec<u32> {
    let mut levels: Vec<u32> = omitted
        .iter()
        .filter_map(|one| {
            let whole;
            let manifold = match one {
                // the whole level of n
                Omitted::LevelOf(state) => {
                    whole = Manifold { label: String::new(), numbers: state.numbers.get(..1)?.to_vec() };
                    &whole
                }
                Omitted::Manifold(manifold) => manifold,
            };
            let n = u32::try_from(*manifold.numbers.first()?).ok()?;
            in_manifold(manifold, n, block).then_some(n)
        })
        .collect();
    levels.sort_unstable();
    levels.dedup();
    levels
}

#[cfg(test)]
mod tests {
    use super::super::labels::level;
    use super::*;

    #[test]
    fn levels_left_out_of_blocks() {
        let p3 = Omitted::Manifold(level(3, 1, None));
        let whole = Omitted::Manifold(Manifold { label: "n=2".into(), numbers: vec![2] });
        let two = Omitted::LevelOf(Numbers::orbital(2, 0, 0).state());
        let one_j = Omitted::Manifold(level(2, 1, Some(3)));
        let p = Block::Orbital { l: 1 };
        assert_eq!(omitted_levels(&[p3.clone(), two.clone(), whole], p), [2, 3]);
        assert_eq!(omitted_levels(&[p3, two], Block::Orbital { l: 0 }), [2]);
        assert_eq!(omitted_levels(std::slice::from_ref(&one_j), Block::Coupled { l: 1, twice_j: 3 }), [2]);
        assert!(omitted_levels(&[one_j], Block::Coupled { l: 1, twice_j: 1 }).is_empty());
    }

    #[test]
    fn product_states_of_a_sector() {
        let up = Numbers { n: 2, l: 1, vector: Vector::Product { ml: 1, twice_ms: 1 } };
        let sector = |twice_m| Sector { block: Block::Coupled { l: 1, twice_j: 3 }, twice_m };
        assert_eq!(up.level_in(sector(3)), [up]);
        let names: Vec<String> = up.level_in(sector(1)).iter().map(|numbers| numbers.label()).collect();
        assert_eq!(names, ["2p, ML=0, MS=1/2", "2p, ML=1, MS=-1/2"]);
    }

    #[test]
    fn counts() {
        let term = Numbers { n: 3, l: 2, vector: Vector::Term };
        assert_eq!(term.count(Electrons::ONE), Some(10));
        assert_eq!(term.count(Electrons::ONE_WITHOUT_SPIN), Some(5));
        assert_eq!(states_of(3, 2, None, Electrons::ONE).len(), 10);
        assert_eq!(states_of(3, 2, Some(5), Electrons::ONE).len(), 6);
    }
}
