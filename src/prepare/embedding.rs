//! Strengths to coordinates, by the settings of a run.

use super::{Embedded, Study, Treatment};
use crate::affinity::{self, Profiles};
use crate::domain::{Connectivity, Pair, Share, Side};
use crate::embed::{self, DiffusionError, DiffusionTime, Embedding, Recipe};
use crate::settings::{EmbeddingChoice, Settings};
use crate::species::Species;

/// Share of links kept by the recipe that cuts: on correlations, of which the default keeps a tenth,
/// three tenths ranked better than either (docs/method.md).
const STRONGEST: f64 = 0.3;

/// The recipes among which left-out landmarks choose, the default first. The list is short since a dozen
/// landmarks choose badly among many; density exponents and diffusion times are not on it, as none
/// ranked better on several pairs (docs/method.md).
pub fn recipes(choice: EmbeddingChoice, rectangular: bool) -> Vec<Recipe> {
    let (first, second) = match rectangular {
        true => (embed::Method::OF_RECTANGULAR, embed::Method::Diffusion),
        false => (embed::Method::OF_SQUARE, embed::Method::Components),
    };
    match choice {
        EmbeddingChoice::Diffusion => vec![Recipe::plain(embed::Method::Diffusion)],
        EmbeddingChoice::Components => vec![Recipe::plain(embed::Method::Components)],
        EmbeddingChoice::Auto => vec![
            Recipe::plain(first),
            Recipe::plain(second),
            Recipe {
                method: embed::Method::Diffusion,
                strongest: Share::new(STRONGEST).ok(),
            },
        ],
    }
}

/// Embeds a species whose strengths are `(parcels, entries)`, on `axes` axes at most.
///
/// # Errors
/// [`DiffusionError`] where the diffusion map asked for does not exist.
pub fn embed_strengths(
    network: &Connectivity,
    treatment: &Treatment,
    settings: &Settings,
    recipe: Recipe,
    axes: usize,
) -> Result<Embedding, DiffusionError> {
    let profiles = affinity::Params {
        strongest: recipe.strongest.unwrap_or(treatment.affinity.strongest),
        ..treatment.affinity
    };
    match recipe.method {
        embed::Method::Components => {
            let likeness = profiles.likeness;
            let profiles = Profiles::of(network, profiles.strongest).standardised(likeness);
            Ok(embed::components(&profiles, axes))
        }
        embed::Method::Diffusion => embed::diffusion_map(
            affinity::of(network, &profiles),
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
    let recipe = Recipe::plain(method);
    let settings = Settings {
        embedding: method.into(),
        ..study.settings.clone()
    };
    let embedded = |side: Side| {
        let full = &study.species[side];
        let treatment = &study.treatment[side];
        let axes = full.embedding.axes();
        let found = embed_strengths(&full.network, treatment, &settings, recipe, axes).ok()?;
        (found.axes() > 0).then(|| Species {
            embedding: found,
            tried: Vec::new(),
            ..full.clone()
        })
    };
    Some(Study {
        species: Pair {
            a: embedded(Side::A)?,
            b: embedded(Side::B)?,
        },
        embedded: Embedded {
            recipe,
            tried: Vec::new(),
        },
        settings,
        cohorts: Pair { a: None, b: None },
        ..study.clone()
    })
}
