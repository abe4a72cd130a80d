//! Strengths to coordinates, by the settings of a run.

use super::Treatment;
use crate::affinity::{self, Profiles};
use crate::domain::Connectivity;
use crate::embed::{self, DiffusionError, DiffusionTime, Embedding};
use crate::settings::Settings;

/// Embeds a species whose strengths are `(parcels, entries)`, on `axes` axes at most.
///
/// # Errors
/// [`DiffusionError`] where the diffusion map asked for does not exist.
pub fn embed_strengths(
    network: &Connectivity,
    treatment: &Treatment,
    settings: &Settings,
    axes: usize,
) -> Result<Embedding, DiffusionError> {
    match settings.embedding {
        embed::Method::Components => {
            let profiles = Profiles::of(network, treatment.affinity.strongest);
            let profiles = profiles.standardised(treatment.affinity.likeness);
            Ok(embed::components(&profiles, axes))
        }
        embed::Method::Diffusion => embed::diffusion_map(
            affinity::of(network, &treatment.affinity),
            settings.density_exponent,
            DiffusionTime::from_number(settings.diffusion_time),
            axes,
        ),
    }
}
