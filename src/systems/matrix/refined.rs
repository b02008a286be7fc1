//! Eigenvalues and eigenvectors of one component to a precision, kept for what asks again.
//!
//! Precisions are rounded up to a ladder, so that an energy, its state and the next precision of a chain share the work; what is found does not
//! depend on what was asked before.

use super::{MatrixSystem, obstacle};
use crate::linalg::eigen::{EigenCluster, refine_cluster};
use crate::num::Effort;
use crate::systems::Obstacle;
use std::ops::Range;
use std::sync::{Arc, Mutex, PoisonError};

/// Steps of the ladder of precisions, in bits.
const STEP: u32 = 256;

/// Bits of entries beyond those of the eigenvalues, enough for vectors that lose half of them to the nearness of a neighbour.
const ENTRY_GUARD: u32 = 128;

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
        let key = Key { component, places: places.clone(), bits, entry_bits: bits + ENTRY_GUARD + more };
        if let Some(known) = self.clusters.find(&key) {
            return Ok(known);
        }
        let h = self.hermitian(component, key.entry_bits)?;
        let cluster = Arc::new(refine_cluster(&h, places, bits, effort).map_err(obstacle)?);
        let numbers = 2 * (cluster.vectors.len() * h.order()) as u64;
        self.clusters.keep(key, cluster.clone(), numbers * (u64::from(bits) / 8 + 64));
        Ok(cluster)
    }
}
