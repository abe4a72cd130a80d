//! Strengths to coordinates, by the settings of a run.

use super::{Study, Treatment};
use crate::affinity::{self, Profiles};
use crate::domain::{Connectivity, Pair, Side};
use crate::embed::{self, DiffusionError, DiffusionTime, Embedding};
use crate::settings::Settings;
use crate::species::Species;

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

/// A study whose species are embedded by another method on as many axes; `None` where that method has
/// none for one of them. Without individuals, whose draws would have to be matched anew.
#[must_use]
pub fn embedded_by(study: &Study, method: embed::Method) -> Option<Study> {
    let settings = Settings {
        embedding: method,
        ..study.settings.clone()
    };
    let embedded = |side: Side| {
        let full = &study.species[side];
        let axes = full.embedding.axes();
        let found = embed_strengths(&full.network, &study.treatment[side], &settings, axes).ok()?;
        (found.axes() > 0).then(|| Species {
            embedding: found,
            ..full.clone()
        })
    };
    Some(Study {
        species: Pair {
            a: embedded(Side::A)?,
            b: embedded(Side::B)?,
        },
        settings,
        cohorts: Pair { a: None, b: None },
        ..study.clone()
    })
}
