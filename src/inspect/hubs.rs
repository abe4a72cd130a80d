//! The parcels that connect most.

use serde::Serialize;

use crate::domain::Side;
use crate::prepare::Study;

/// Hubs named for a species.
const HUBS: usize = 5;

/// A parcel with much connection.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct Hub {
    /// Its label.
    pub parcel: String,
    /// Parcels it is connected with, in either direction.
    pub partners: usize,
    /// Sum of the sizes of its weights, in and out.
    pub strength: f64,
}

/// The strongest parcels, strongest first; equals by label.
pub fn hubs(study: &Study, side: Side) -> Vec<Hub> {
    let (raw, labels) = (&study.raw[side], study.species[side].parcels.labels());
    let mut order: Vec<usize> = (0..labels.len()).collect();
    order.sort_by(|&i, &j| raw.strength[j].total_cmp(&raw.strength[i]));
    order
        .into_iter()
        .take(HUBS)
        .map(|i| Hub {
            parcel: labels[i].clone(),
            partners: raw.partners[i],
            strength: raw.strength[i],
        })
        .collect()
}
