//! Named pairs of parcels, followed through the replicates.

use ndarray::Array2;

use crate::align::{self, Params};
use crate::domain::Pair;
use crate::evidence::Material;
use crate::place;

/// What becomes of watched pairs, replicate by replicate.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Watched {
    /// For each replicate the distance of every pair in the joint space that shows distances, in that
    /// replicate's own standard units.
    pub distances: Vec<Vec<f64>>,
    /// For each replicate that ranks: the rank of b's parcel among the candidates of a's, and the other
    /// way round.
    pub ranks: Vec<Vec<Pair<u32>>>,
}

impl Watched {
    pub(super) fn append(&mut self, mut other: Watched) {
        self.distances.append(&mut other.distances);
        self.ranks.append(&mut other.ranks);
    }

    /// Ranks of pairs in `dissimilarities` between open parcels.
    pub(super) fn ranks(
        dissimilarities: &Array2<f64>,
        open: &Pair<Vec<usize>>,
        pairs: &[Pair<usize>],
    ) -> Vec<Pair<u32>> {
        let at = |open: &[usize], parcel: usize| {
            open.binary_search(&parcel)
                .expect("watched parcels are open")
        };
        pairs
            .iter()
            .map(|pair| {
                let (i, j) = (at(&open.a, pair.a), at(&open.b, pair.b));
                Pair {
                    a: place::rank(&dissimilarities.row(i).to_vec(), j) as u32,
                    b: place::rank(&dissimilarities.column(j).to_vec(), i) as u32,
                }
            })
            .collect()
    }
}

/// Distances of pairs in the joint space of these landmark weights, in standard units.
///
/// # Panics
/// If the space cannot be fitted.
pub fn gaps(
    params: Params,
    material: &Material<'_>,
    weights: &[f64],
    pairs: &[Pair<usize>],
) -> Vec<f64> {
    let embedded = material.embedded_in(params.embedding);
    let positions = align::fit(params, material.anchors_in(params.embedding), weights)
        .expect("landmarks were counted before")
        .in_standard_units(embedded)
        .positions(embedded);
    pairs
        .iter()
        .map(|pair| {
            let gap = &positions.a.row(pair.a) - &positions.b.row(pair.b);
            gap.dot(&gap).sqrt()
        })
        .collect()
}
