//! Distances in the joint space, after allowance for where a pair lies.

use crate::align::Params;
use crate::domain::Pair;
use crate::evidence::Material;
use crate::locate::{gaps, strain};

/// Logarithms of the distances of pairs in the joint space of the landmarks of other blocks than those `without`,
/// each divided by its strain.
///
/// # Panics
/// If the space cannot be fitted.
#[must_use]
pub fn strained(
    material: &Material<'_>,
    space: Params,
    without: &[usize],
    pairs: &[Pair<usize>],
) -> Vec<f64> {
    let weights = material.weights(|b| if without.contains(&b) { 0.0 } else { 1.0 });
    let distances = gaps(space, material, &weights, pairs);
    let strains = strain(material, space, without, pairs);
    let each = distances.into_iter().zip(strains);
    each.map(|(distance, strain)| logarithm(distance / strain))
        .collect()
}

/// The logarithm, of nothing too: coincident parcels are very near, not infinitely.
#[must_use]
pub fn logarithm(distance: f64) -> f64 {
    distance.max(f64::MIN_POSITIVE).ln()
}
