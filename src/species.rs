//! One species ready for comparison.

use crate::affinity;
use crate::domain::{Attributes, Connectivity, Geometry, Parcels};
use crate::embed::Embedding;

/// A species' parcels, the strengths of their connections, and their coordinates; all in the order
/// of [`Parcels::labels`].
#[derive(Debug, Clone)]
pub struct Species {
    /// The parcels that take part.
    pub parcels: Parcels,
    /// What is known of each besides its connections.
    pub attributes: Vec<Attributes>,
    /// Where they lie.
    pub geometry: Geometry,
    /// Their connectivity, transformed.
    pub network: Connectivity,
    /// How their affinities are made from it.
    pub profiles: affinity::Params,
    /// Their coordinates.
    pub embedding: Embedding,
    /// All embeddings among which left-out landmarks choose, the same recipes in the same order for
    /// both species; empty where there is no choice.
    pub tried: Vec<Embedding>,
    /// Their areas, all positive, where these are known.
    pub areas: Option<Vec<f64>>,
}
