//! Anchors grown step by step (in the spirit of the spectral upsampling of Melzi et al. 2019, ACM
//! Trans Graph 38:155): align on few axes, take mutually nearest parcels for light anchors, add an
//! axis, align again. Strong where embeddings are clean, harmful where they are noisy.

use ndarray::{concatenate, Array2, Axis};

use super::joint_distance::Positions;
use super::{Evidence, Fitted, Kind, Material, Unavailable};
use crate::align::{self, Alignment, Params};
use crate::bootstrap::Stream;
use crate::domain::{Pair, Side};
use crate::place;

/// Axes of the first alignment.
const FIRST_AXES: usize = 2;
/// Of several embeddings the first is used: a choice among them by landmarks would have to be made again
/// for every landmark that is left out.
const EMBEDDING: usize = 0;
/// Weight of all grown anchors together, as a share of that of all landmarks; a plain choice.
const GROWN_WEIGHT: f64 = 1.0;

/// Canonical distance with anchors grown up to a number of axes.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Grown {
    /// Axes of the last alignment.
    pub axes: usize,
    /// Ridge of the canonical correlation.
    pub ridge: f64,
}

impl Evidence for Grown {
    fn name(&self) -> String {
        Kind::Grown.to_string()
    }

    fn fit<'m>(
        &self,
        material: &Material<'m>,
        weights: &[f64],
        _chance: &mut Stream,
    ) -> Result<Box<dyn Fitted + 'm>, Unavailable> {
        let unavailable = |e: align::AlignError| Unavailable {
            kind: self.name(),
            why: e.to_string(),
        };
        let embedded = material.embedded_in(EMBEDDING);
        let free = Pair::from_fn(|side: Side| {
            let owners = material.landmarks.owners(side, embedded[side].nrows());
            let open = |parcel: &usize| owners[*parcel].is_none_or(|at| weights[at] == 0.0);
            (0..owners.len()).filter(open).collect::<Vec<usize>>()
        });
        let own = material.anchors_in(EMBEDDING);
        let mut anchors = own.map(Clone::clone);
        let mut all_weights = weights.to_vec();
        let mut axes = FIRST_AXES.min(self.axes);
        let mut distances = Array2::zeros((free.a.len(), free.b.len()));
        loop {
            let params = Params {
                alignment: Alignment::Canonical,
                axes,
                ridge: self.ridge,
                embedding: EMBEDDING,
            };
            let map = align::fit(params, anchors.as_ref(), &all_weights).map_err(unavailable)?;
            let positions = Positions::new(map.positions(embedded));
            if axes == self.axes {
                return Ok(Box::new(positions));
            }
            axes += 1;
            positions.dissimilarities(&free.a, &free.b, &mut distances);
            let nearest = place::nearest(&distances);
            let mutual: Vec<(usize, usize)> = nearest
                .a
                .iter()
                .enumerate()
                .filter_map(|(i, j)| Some((i, (*j)?)))
                .filter(|&(i, j)| nearest.b[j] == Some(i))
                .map(|(i, j)| (free.a[i], free.b[j]))
                .collect();
            let light = GROWN_WEIGHT * weights.iter().sum::<f64>() / mutual.len().max(1) as f64;
            let ends = Pair {
                a: mutual.iter().map(|(i, _)| *i).collect::<Vec<_>>(),
                b: mutual.iter().map(|(_, j)| *j).collect(),
            };
            anchors = Pair::from_fn(|side| {
                let grown = embedded[side].select(Axis(0), &ends[side]);
                concatenate(Axis(0), &[own[side].view(), grown.view()])
                    .expect("anchors and parcels have the same axes")
            });
            all_weights = weights.to_vec();
            all_weights.resize(weights.len() + mutual.len(), light);
        }
    }
}
