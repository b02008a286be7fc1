//! The spectrum in machine numbers: which states lie clearly apart, and which have to be looked at closely.

use super::MatrixSystem;
use super::obstacle;
use crate::linalg::eigen::{Preview, all_eigenpairs, spectrum_preview};
use crate::num::Effort;
use crate::systems::{Number, Obstacle};
use rug::Float;
use std::collections::BTreeMap;
use std::ops::Range;

/// Bits of the windows.
const BITS: u32 = 64;

/// Machine numbers place an eigenvalue within the largest of its component over two to this power.
const RESOLUTION: u32 = 40;

/// Where an eigenvalue of a component lies.
#[derive(Clone, Debug)]
pub struct RoughPlace {
    pub component: usize,
    /// Its place among the eigenvalues of the component.
    pub local: usize,
    pub low: Float,
    pub high: Float,
}

impl RoughPlace {
    pub fn middle(&self) -> Float {
        Float::with_val(BITS, &self.low + &self.high) / 2u32
    }
}

/// All eigenvalues in machine numbers.
#[derive(Clone, Debug)]
pub struct RoughSpectrum {
    /// In rising order of the middles of their windows.
    pub places: Vec<RoughPlace>,
    /// Sets of places whose windows hang together. A cluster is certain to hold the states with these places in the spectrum.
    pub clusters: Vec<Range<usize>>,
    /// By component, where there is more than one state and machine numbers settle.
    pub previews: BTreeMap<usize, Preview>,
}

impl RoughSpectrum {
    pub fn new(system: &MatrixSystem, effort: &Effort) -> Result<Self, Obstacle> {
        let mut places = Vec::with_capacity(system.order());
        let mut previews = BTreeMap::new();
        for component in 0..system.components.len() {
            effort.check()?;
            windows(system, component, effort, &mut places, &mut previews)?;
        }
        places.sort_by(|a, b| {
            a.middle().total_cmp(&b.middle()).then(a.component.cmp(&b.component)).then(a.local.cmp(&b.local))
        });
        let clusters = clusters(&places);
        Ok(RoughSpectrum { places, clusters, previews })
    }

    /// The cluster that holds the state with this place.
    pub fn cluster_of(&self, place: usize) -> Range<usize> {
        let at = self.clusters.partition_point(|cluster| cluster.end <= place);
        self.clusters.get(at).cloned().unwrap_or(place..place + 1)
    }
}

fn windows(
    system: &MatrixSystem,
    component: usize,
    effort: &Effort,
    places: &mut Vec<RoughPlace>,
    previews: &mut BTreeMap<usize, Preview>,
) -> Result<(), Obstacle> {
    let members = &system.components[component].members;
    let (values, lost) = if let [only] = members.as_slice() {
        let entry = Number::Exact(system.hamiltonian().entry(*only, *only)).to_complex(BITS);
        (vec![entry.into_real_imag().0], BITS - 2)
    } else {
        let h = system.hermitian(component, BITS)?;
        match spectrum_preview(&h, effort)? {
            Some(preview) => {
                let values = (0..members.len()).filter_map(|k| preview.value(k)).collect();
                previews.insert(component, preview);
                (values, RESOLUTION)
            }
            None => (
                all_eigenpairs(&system.hermitian(component, 4 * BITS)?, 2 * BITS, effort).map_err(obstacle)?.values,
                BITS - 8,
            ),
        }
    };
    let largest = values.iter().fold(Float::new(BITS), |a, b| a.max(&Float::with_val(BITS, b.abs_ref())));
    let error = largest >> lost;
    for (local, value) in values.iter().enumerate() {
        let (low, high) = (Float::with_val(BITS, value - &error), Float::with_val(BITS, value + &error));
        places.push(RoughPlace { component, local, low, high });
    }
    Ok(())
}

/// Cuts the places wherever everything before lies below everything behind.
fn clusters(places: &[RoughPlace]) -> Vec<Range<usize>> {
    let mut lowest_behind: Vec<&Float> = Vec::with_capacity(places.len());
    for place in places.iter().rev() {
        let lowest = lowest_behind.last().map_or(&place.low, |low| if **low < place.low { low } else { &place.low });
        lowest_behind.push(lowest);
    }
    lowest_behind.reverse();
    let mut clusters = Vec::new();
    let (mut start, mut highest) = (0, places.first().map(|place| &place.high));
    for k in 1..places.len() {
        if highest.is_some_and(|high| *high < *lowest_behind[k]) {
            clusters.push(start..k);
            start = k;
        }
        highest = highest.map(|high| if *high < places[k].high { &places[k].high } else { high });
    }
    if !places.is_empty() {
        clusters.push(start..places.len());
    }
    clusters
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn clusters_are_cut_at_clear_gaps() {
        let place = |component, low: f64, high: f64| RoughPlace {
            component,
            local: 0,
            low: Float::with_val(53, low),
            high: Float::with_val(53, high),
        };
        // A wide window spans two narrow ones.
        let places =
            [place(0, 0.0, 1.0), place(1, 2.0, 2.1), place(2, 1.5, 3.5), place(3, 3.2, 3.3), place(4, 3.6, 4.0)];
        assert_eq!(clusters(&places), [0..1, 1..4, 4..5]);
        assert!(clusters(&[]).is_empty());
    }
}
