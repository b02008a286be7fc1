//! Eigenvalues and eigenvectors of one component to a precision, kept for what asks again.
//!
//! Precisions are rounded up to a ladder, so that an energy, its state and the next precision of a chain share the work. A sum over many states
//! makes it pay to find all of them at once; they are the same to the precision, whichever way.

use super::{MatrixSystem, obstacle};
use crate::linalg::eigen::{EigenCluster, refine_cluster_near};
use crate::num::Effort;
use crate::systems::Obstacle;
use std::collections::{BTreeMap, BTreeSet};
use std::ops::Range;
use std::sync::{Arc, Mutex, PoisonError};

/// Steps of the ladder of precisions, in bits.
const STEP: u32 = 256;

/// Bits of entries beyond those of the eigenvalues, enough for vectors that lose half of them to the nearness of a neighbour.
const ENTRY_GUARD: u32 = 128;

/// Clusters of one component asked for one by one before all are found at once, which costs about as much.
const ONE_BY_ONE: usize = 16;

/// Memory that kept vectors may take together, in bytes.
const MEMORY: u64 = 1 << 28;

/// What eigenvectors belong to.
#[derive(Clone, PartialEq, Eq, Debug)]
struct Key {
    component: usize,
    places: Range<usize>,
    bits: u32,
    entry_bits: u32,
}

/// Kept eigenvectors, those used last at the end.
#[derive(Default)]
pub struct Clusters {
    kept: Mutex<Vec<(Key, Arc<EigenCluster>, u64)>>,
    /// First places asked for, by component, bits and bits of entries.
    asked: Mutex<BTreeMap<(usize, u32, u32), BTreeSet<usize>>>,
}

impl Clusters {
    fn find(&self, key: &Key) -> Option<Arc<EigenCluster>> {
        let mut kept = self.kept.lock().unwrap_or_else(PoisonError::into_inner);
        let at = kept.iter().position(|(known, _, _)| known == key)?;
        let found = kept.remove(at);
        let cluster = found.1.clone();
        kept.push(found);
        Some(cluster)
    }

    fn keep(&self, key: Key, cluster: Arc<EigenCluster>, bytes: u64) {
        let mut kept = self.kept.lock().unwrap_or_else(PoisonError::into_inner);
        kept.retain(|(known, _, _)| *known != key);
        kept.push((key, cluster, bytes));
        while kept.len() > 1 && kept.iter().map(|(_, _, bytes)| bytes).sum::<u64>() > MEMORY {
            kept.remove(0);
        }
    }
}

impl Clusters {
    /// Whether so many clusters like this one were asked for that all should be found at once.
    fn asks_for_all(&self, key: &Key) -> bool {
        let mut asked = self.asked.lock().unwrap_or_else(PoisonError::into_inner);
        let places = asked.entry((key.component, key.bits, key.entry_bits)).or_default();
        places.insert(key.places.start);
        places.len() > ONE_BY_ONE
    }
}

/// The memory of eigenvectors of a component.
fn bytes(vectors: usize, order: usize, bits: u32) -> u64 {
    2 * (vectors * order) as u64 * (u64::from(bits) / 8 + 64)
}

/// The precision of the ladder that holds so many bits.
pub fn on_ladder(bits: u32) -> u32 {
    bits.div_ceil(STEP).saturating_mul(STEP)
}

impl MatrixSystem {
    /// The eigenvalues of a component with these places, and those that numbers cannot tell from them, to at least `bits` bits (those of
    /// [`on_ladder`]) of the largest; the vectors lose `gap_bits` to the rounding of H, which is made up for.
    pub(super) fn refined(
        &self,
        component: usize,
        places: Range<usize>,
        bits: u32,
        gap_bits: u32,
        effort: &Effort,
    ) -> Result<Arc<EigenCluster>, Obstacle> {
        let bits = on_ladder(bits);
        let more = on_ladder(gap_bits.saturating_sub(ENTRY_GUARD / 2));
        let order = self.components[component].order();
        let mut key = Key { component, places, bits, entry_bits: bits + ENTRY_GUARD + more };
        let all = Key { places: 0..order, ..key.clone() };
        if let Some(known) = self.clusters.find(&key).or_else(|| self.clusters.find(&all)) {
            return Ok(known);
        }
        if bytes(order, order, bits) <= MEMORY / 2 && self.clusters.asks_for_all(&key) {
            key = all;
        }
        let h = self.hermitian(component, key.entry_bits)?;
        let rough = self.rough(effort)?;
        let preview = rough.previews.get(&component);
        let cluster = Arc::new(refine_cluster_near(&h, preview, key.places.clone(), bits, effort).map_err(obstacle)?);
        self.clusters.keep(key, cluster.clone(), bytes(cluster.vectors.len(), order, bits));
        Ok(cluster)
    }
}
