//! From files to two species ready for comparison: read, check, transform, embed.

use std::path::Path;

use serde::Serialize;

use crate::affinity;
use crate::bootstrap::{Purpose, Stream};
use crate::domain::{Hemispheres, Landmarks, Pair, RowsAre, Side, Tracer, Transform, WeightKind};
use crate::embed::{self, DiffusionError, Embedding, Recipe};
use crate::evidence::{Evidence, Fingerprint, Material, Transport};
use crate::holdout::{self, Asked, Questions};
use crate::input::{self, InputError, InputFile, ParcelFault, Place, Problem, Source, SpeciesFile};
use crate::place::{self, Candidates};
use crate::settings::{Axes, Conduct, EvidenceChoice, Request, Settings};
use crate::species::Species;
use crate::transform;
use crate::transport::Mass;
use crate::warning::Warning;
use crate::watch::Unwatched;

mod again;
mod arrange;
mod cohort;
mod embedding;
mod fold;
mod measured;
mod parts;
mod raw_facts;
mod reading;
mod sides;
mod suspicion;

pub use again::{drawn_again, Again};
pub use cohort::Cohort;
pub use embedding::embedded_by;
use embedding::{embed_strengths, recipes};
pub use parts::Parts;
pub use raw_facts::{Filled, RawFacts, SumsToOne};
use reading::{read_species, Raw};

/// Most axes that are tried when left-out landmarks choose.
const MOST_AXES: usize = 12;

/// What was done to one species' matrix, after defaults.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Treatment {
    /// What the weights measure.
    pub weights: WeightKind,
    /// What the parcels are where the matrix holds links from them to other areas, or to some of
    /// them, only.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub parcels_are: Option<RowsAre>,
    /// How injected areas were traced.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub tracer: Option<Tracer>,
    /// How they were transformed.
    pub transform: Transform,
    /// How profiles were compared.
    pub affinity: affinity::Params,
}

/// The files a study was read from.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct Inputs {
    /// The study file.
    pub study: InputFile,
    /// The landmark table.
    pub landmarks: InputFile,
    /// The matrices; `None` where a species' connectivity is the mean of its subjects.
    pub matrix: Pair<Option<InputFile>>,
    /// The matrices of subjects, where there are any.
    #[serde(skip_serializing_if = "none")]
    pub subjects: Pair<Vec<InputFile>>,
    /// Files of labels, where matrices have them.
    #[serde(skip_serializing_if = "none")]
    pub labels: Pair<Vec<InputFile>>,
    /// Tables of parcels, where there are any.
    #[serde(skip_serializing_if = "none")]
    pub parcels: Pair<Option<InputFile>>,
    /// Files of distances, where there are any.
    #[serde(skip_serializing_if = "none")]
    pub distances: Pair<Option<InputFile>>,
}

fn none<'f, F>(files: &'f Pair<F>) -> bool
where
    &'f F: IntoIterator<Item = &'f InputFile>,
{
    [&files.a, &files.b]
        .into_iter()
        .all(|files| files.into_iter().next().is_none())
}

/// How coordinates were made, and what left-out landmarks said about it.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct Embedded {
    /// The recipe of both species' coordinates.
    #[serde(flatten)]
    pub recipe: Recipe,
    /// What it was chosen among; empty where there was no choice.
    #[serde(skip_serializing_if = "Vec::is_empty")]
    pub tried: Vec<Tried>,
}

/// One recipe that was tried.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct Tried {
    /// The recipe.
    #[serde(flatten)]
    pub recipe: Recipe,
    /// Left-out error of the alignment that would rank, on its axes: mean over blocks.
    pub error: f64,
    /// Its standard error over blocks.
    pub standard_error: f64,
}

/// A study that has passed every check, embedded.
#[derive(Debug, Clone)]
pub struct Study {
    /// Title for people.
    pub title: String,
    /// Both species.
    pub species: Pair<Species>,
    /// The landmarks.
    pub landmarks: Landmarks,
    /// How their coordinates were made.
    pub embedded: Embedded,
    /// Numbers of axes to try; one where a number was asked for.
    pub axes: Vec<usize>,
    /// What was done to the matrices.
    pub treatment: Pair<Treatment>,
    /// What the matrices held before.
    pub raw: Pair<RawFacts>,
    /// What was read.
    pub inputs: Inputs,
    /// Individuals, where their matrices were given.
    pub cohorts: Pair<Option<Cohort>>,
    /// Which parcels may be counterparts.
    pub candidates: Candidates,
    /// What was asked for, before defaults.
    pub asked: Request,
    /// Every choice.
    pub settings: Settings,
    /// How the run behaves.
    pub conduct: Conduct,
    /// What is legal but suspicious.
    pub warnings: Vec<Warning>,
}

/// Reads a study and everything it names. `asked` wins over the study file's own settings.
///
/// # Errors
/// [`InputError`] for the first fault found.
pub fn prepare(study: &Path, asked: Request) -> Result<Study, InputError> {
    let description = input::read_study_file(study)?;
    let asked = asked.or(description.request.clone());
    let (mut settings, conduct) = asked.clone().settle();
    let raw = description
        .species
        .as_ref()
        .try_map_at_once(conduct.threads, |_, described| {
            read_species(described, settings.hemispheres)
        })?;
    let rectangular = |raw: &Raw| raw.facts.rectangular.is_some();
    if asked.embedding.is_none() && (rectangular(&raw.a) || rectangular(&raw.b)) {
        settings.embedding = embed::Method::OF_RECTANGULAR.into();
    }
    let recipes = recipes(
        settings.embedding,
        rectangular(&raw.a) || rectangular(&raw.b),
    );
    let mut warnings = [&raw.a.warnings[..], &raw.b.warnings[..]].concat();

    let table = Source::read(&description.landmarks)?;
    let parcels = Pair {
        a: &raw.a.parcels,
        b: &raw.b.parcels,
    };
    let (landmarks, more) = input::read_landmarks(&table, parcels)?;
    warnings.extend(more);
    let most = most_axes(settings.axes, &landmarks, &table)?;
    let candidates = match settings.hemispheres {
        Hemispheres::Ignore => Candidates::everywhere(),
        Hemispheres::Fold => {
            if Side::BOTH.iter().all(|side| parcels[*side].folded() == 0) {
                let place = Place::file(&description.file.path);
                return Err(InputError::new(place, ParcelFault::NothingToFold.into()));
            }
            Candidates::everywhere()
        }
        Hemispheres::Match => {
            let attributes = raw.as_ref().map(|raw| raw.attributes.as_slice());
            sides::matched(parcels, attributes, &landmarks, &mut warnings).map_err(|fault| {
                let file = match &fault {
                    ParcelFault::LandmarkAcross { .. } => table.path(),
                    _ => &description.file.path,
                };
                InputError::new(Place::file(file), fault.into())
            })?
        }
    };

    let treatment = Pair::from_fn(|side| treatment(&description.species[side], &raw[side]));
    let inputs = Inputs {
        study: description.file,
        landmarks: table.file,
        matrix: raw.as_ref().map(|raw| raw.matrix.clone()),
        subjects: raw.as_ref().map(|raw| raw.subjects.clone()),
        labels: raw.as_ref().map(|raw| raw.labels.clone()),
        parcels: raw.as_ref().map(|raw| raw.table.clone()),
        distances: raw.as_ref().map(|raw| raw.distances.clone()),
    };
    let facts = raw.as_ref().map(|raw| raw.facts.clone());
    let places = raw.as_ref().map(|raw| raw.place.clone());
    let mut raw = raw;
    let cohorts = Pair {
        a: raw.a.cohort.take(),
        b: raw.b.cohort.take(),
    };
    let mut species = raw.try_map_at_once(conduct.threads, |side, raw| {
        embed_species(raw, side, &treatment[side], &settings, &recipes, most)
    })?;
    let recipes = leave_usable(&mut species, recipes, settings.axes);

    for side in Side::BOTH {
        if species[side].embedding.axes() == 0 {
            let place = Place::file(&places[side]);
            return Err(InputError::new(place, Problem::NoAxes { side }));
        }
    }
    check_evidence(&species, &landmarks, &settings)
        .map_err(|problem| InputError::new(Place::file(&inputs.study.path), problem))?;
    let available = Side::BOTH
        .into_iter()
        .flat_map(|side| {
            [&species[side].embedding]
                .into_iter()
                .chain(&species[side].tried)
        })
        .map(Embedding::axes)
        .min()
        .unwrap_or(0);
    let axes = match settings.axes {
        Axes::Number(axes) => {
            if let Some(side) = Side::BOTH
                .into_iter()
                .find(|side| species[*side].embedding.axes() < axes)
            {
                return Err(InputError::new(
                    Place::file(&places[side]),
                    Problem::TooManyAxes {
                        side,
                        axes,
                        available: species[side].embedding.axes(),
                    },
                ));
            }
            if landmarks.blocks() <= axes + 1 {
                warnings.push(Warning::LeftOutUnderdetermined {
                    axes,
                    blocks: landmarks.blocks(),
                });
            }
            vec![axes]
        }
        Axes::Auto => {
            for side in Side::BOTH {
                let axes = species[side].embedding.axes();
                if axes < most {
                    warnings.push(Warning::FewAxes {
                        species: species[side].parcels.species().to_owned(),
                        axes,
                    });
                }
            }
            axes_to_try(settings.axes, landmarks.blocks(), available)
        }
    };
    let embedded = choose_embedding(
        &mut species,
        &recipes,
        &landmarks,
        &candidates,
        &axes,
        &settings,
    );
    Ok(Study {
        title: description.title,
        species,
        embedded,
        landmarks,
        axes,
        treatment,
        raw: facts,
        inputs,
        cohorts,
        candidates,
        asked,
        settings,
        conduct,
        warnings,
    })
}

/// Drops the recipes by which a species has too few axes, as long as one is left.
fn leave_usable(species: &mut Pair<Species>, recipes: Vec<Recipe>, axes: Axes) -> Vec<Recipe> {
    let needed = match axes {
        Axes::Number(axes) => axes,
        Axes::Auto => 1,
    };
    let has = |at: usize| {
        Side::BOTH
            .iter()
            .all(|side| species[*side].tried[at].axes() >= needed)
    };
    let keep: Vec<usize> = (0..species.a.tried.len()).filter(|&at| has(at)).collect();
    let Some(&first) = keep.first() else {
        for side in Side::BOTH {
            species[side].tried.clear();
        }
        return recipes.into_iter().take(1).collect();
    };
    for side in Side::BOTH {
        species[side].embedding = species[side].tried[first].clone();
        species[side].tried = match keep.len() {
            1 => Vec::new(),
            _ => keep
                .iter()
                .map(|&at| species[side].tried[at].clone())
                .collect(),
        };
    }
    keep.into_iter().map(|at| recipes[at]).collect()
}

/// Lets left-out landmarks choose among the embeddings that were tried and makes the chosen one that of
/// both species. The others stay, since the choice is made again without each landmark.
fn choose_embedding(
    species: &mut Pair<Species>,
    recipes: &[Recipe],
    landmarks: &Landmarks,
    candidates: &Candidates,
    axes: &[usize],
    settings: &Settings,
) -> Embedded {
    if recipes.len() < 2 {
        return Embedded {
            recipe: recipes[0],
            tried: Vec::new(),
        };
    }
    let sizes = species.as_ref().map(|s| s.parcels.len());
    let material = Material::new(species.as_ref(), landmarks);
    let questions = Questions {
        open: &place::open_parcels(landmarks, sizes),
        candidates,
        asked: &Asked::draw(landmarks, candidates, settings.seed),
        seed: settings.seed,
    };
    let ways = holdout::joint_ways(axes, settings.ridge, material.embeddings());
    let trials = holdout::run(&material, &ways, &questions, &Unwatched)
        .expect("nobody interrupts who does not watch");
    let alignment = settings.evidence.alignment();
    let chosen = holdout::choose(&ways, &trials, alignment, None).embedding;
    let errors = holdout::errors_of_embeddings(&ways, &trials, alignment);
    for side in Side::BOTH {
        species[side].embedding = species[side].tried[chosen].clone();
    }
    let tried = recipes.iter().zip(errors);
    Embedded {
        recipe: recipes[chosen],
        tried: tried
            .map(|(&recipe, (error, standard_error))| Tried {
                recipe,
                error,
                standard_error,
            })
            .collect(),
    }
}

/// Whether evidence that was asked for by name has what it needs. In a mixture a kind that lacks it
/// just takes no part.
fn check_evidence(
    species: &Pair<Species>,
    landmarks: &Landmarks,
    settings: &Settings,
) -> Result<(), Problem> {
    let carries_mass = matches!(
        settings.evidence,
        EvidenceChoice::Mixture | EvidenceChoice::Transport
    );
    if carries_mass && settings.mass == Mass::Area {
        if let Some(side) = Side::BOTH
            .into_iter()
            .find(|side| species[*side].areas.is_none())
        {
            return Err(Problem::NoAreas { side });
        }
    }
    let material = Material::new(species.as_ref(), landmarks);
    let found = match settings.evidence {
        EvidenceChoice::Fingerprint => {
            let weights = material.weights(|_| 1.0);
            let mut chance = Stream::new(settings.seed, Purpose::Evidence, u64::MAX);
            Fingerprint
                .fit(&material, &weights, &mut chance)
                .map(|_| ())
        }
        EvidenceChoice::Transport => Transport::size_allows(material.sizes()),
        _ => Ok(()),
    };
    found.map_err(|unavailable| Problem::EvidenceUnavailable {
        kind: unavailable.kind,
        why: unavailable.why,
    })
}

fn treatment(described: &SpeciesFile, raw: &Raw) -> Treatment {
    let default = affinity::Params::default_for(described.weights);
    Treatment {
        weights: described.weights,
        parcels_are: raw.facts.rectangular,
        tracer: described.tracer,
        transform: described
            .transform
            .unwrap_or_else(|| transform::default_for(&raw.network, described.weights)),
        affinity: affinity::Params {
            likeness: described.likeness.unwrap_or(default.likeness),
            strongest: described.strongest.unwrap_or(default.strongest),
        },
    }
}

/// The most axes to embed in, as the landmarks allow.
fn most_axes(axes: Axes, landmarks: &Landmarks, table: &Source) -> Result<usize, InputError> {
    let blocks = landmarks.blocks();
    let refuse = |problem| Err(InputError::new(Place::file(table.path()), problem));
    // A block is left out as a whole, and two must remain to be aligned at.
    if blocks < Landmarks::FEWEST {
        return refuse(Problem::TooFewBlocks {
            landmarks: landmarks.len(),
            found: blocks,
            needed: Landmarks::FEWEST,
        });
    }
    match axes {
        Axes::Number(axes) if blocks <= axes => refuse(Problem::FewerLandmarksThanAxes {
            found: landmarks.len(),
            in_blocks: blocks,
            axes,
        }),
        Axes::Number(axes) => Ok(axes),
        Axes::Auto => Ok(most_of(blocks)),
    }
}

/// Most axes that so many blocks of landmarks can judge: two are left out at a time, and the rest must
/// still span the axes.
fn most_of(blocks: usize) -> usize {
    blocks.saturating_sub(3).clamp(1, MOST_AXES)
}

/// Numbers of axes to try with `blocks` blocks of landmarks, where embeddings have `available`.
#[must_use]
pub fn axes_to_try(asked: Axes, blocks: usize, available: usize) -> Vec<usize> {
    match asked {
        Axes::Number(axes) => vec![axes],
        Axes::Auto => {
            let most = most_of(blocks).min(available);
            (2.min(most)..=most).collect()
        }
    }
}

fn embed_species(
    raw: Raw,
    side: Side,
    treatment: &Treatment,
    settings: &Settings,
    recipes: &[Recipe],
    axes: usize,
) -> Result<Species, InputError> {
    let network = transform::apply(raw.network, treatment.weights, treatment.transform);
    let tried: Vec<Embedding> = recipes
        .iter()
        .map(|&recipe| embed_strengths(&network, treatment, settings, recipe, axes))
        .collect::<Result<_, _>>()
        .map_err(|DiffusionError::Disconnected| {
            InputError::new(Place::file(&raw.place), Problem::Disconnected { side })
        })?;
    let areas = raw.attributes.iter().map(|a| a.extent?.area()).collect();
    Ok(Species {
        areas,
        parcels: raw.parcels,
        attributes: raw.attributes,
        geometry: raw.geometry,
        network,
        profiles: treatment.affinity,
        embedding: tried[0].clone(),
        tried,
    })
}
