//! From files to two species ready for comparison: read, check, transform, embed.

use std::path::Path;

use serde::Serialize;

use crate::affinity::{self, Profiles};
use crate::bootstrap::{Purpose, Stream};
use crate::domain::{Connectivity, Landmarks, Pair, Parcels, Side, Transform, WeightKind};
use crate::embed::{self, DiffusionTime, Embedding};
use crate::evidence::{Evidence, Fingerprint, Material, Transport};
use crate::input::{self, InputError, InputFile, Place, Problem, Source, SpeciesFile};
use crate::settings::{Axes, Conduct, EvidenceChoice, Request, Settings};
use crate::species::Species;
use crate::transform;
use crate::transport::Mass;
use crate::warning::Warning;

mod parts;
mod raw_facts;
mod suspicion;

pub use parts::Parts;
pub use raw_facts::{Filled, RawFacts, SumsToOne};

/// Fewest parcels that make an embedding.
const FEWEST_PARCELS: usize = 4;
/// Most axes that are tried when left-out landmarks choose.
const MOST_AXES: usize = 12;

/// What was done to one species' matrix, after defaults.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Treatment {
    /// What the weights measure.
    pub weights: WeightKind,
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
    /// The matrices.
    pub matrix: Pair<InputFile>,
    /// Files of labels, where matrices have them.
    #[serde(skip_serializing_if = "none")]
    pub labels: Pair<Option<InputFile>>,
}

fn none(files: &Pair<Option<InputFile>>) -> bool {
    files.a.is_none() && files.b.is_none()
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
    /// Numbers of axes to try; one where a number was asked for.
    pub axes: Vec<usize>,
    /// What was done to the matrices.
    pub treatment: Pair<Treatment>,
    /// What the matrices held before.
    pub raw: Pair<RawFacts>,
    /// What was read.
    pub inputs: Inputs,
    /// Every choice.
    pub settings: Settings,
    /// How the run behaves.
    pub conduct: Conduct,
    /// What is legal but suspicious.
    pub warnings: Vec<Warning>,
}

/// One species' matrix as read, with what its parcels are.
struct Raw {
    file: InputFile,
    labels: Option<InputFile>,
    warnings: Vec<Warning>,
    network: Connectivity,
    parcels: Parcels,
    facts: RawFacts,
}

/// Reads a study and everything it names. `asked` wins over the study file's own settings.
///
/// # Errors
/// [`InputError`] for the first fault found.
pub fn prepare(study: &Path, asked: Request) -> Result<Study, InputError> {
    let description = input::read_study_file(study)?;
    let (settings, conduct) = asked.or(description.request.clone()).settle();
    let raw = description
        .species
        .as_ref()
        .try_map_at_once(conduct.threads, |_, described| read_species(described))?;
    let mut warnings = [&raw.a.warnings[..], &raw.b.warnings[..]].concat();

    let table = Source::read(&description.landmarks)?;
    let parcels = Pair {
        a: &raw.a.parcels,
        b: &raw.b.parcels,
    };
    let (landmarks, more) = input::read_landmarks(&table, parcels)?;
    warnings.extend(more);
    let most = most_axes(settings.axes, &landmarks, &table)?;

    let treatment = Pair::from_fn(|side| treatment(&description.species[side], &raw[side].network));
    let inputs = Inputs {
        study: description.file,
        landmarks: table.file,
        matrix: raw.as_ref().map(|raw| raw.file.clone()),
        labels: raw.as_ref().map(|raw| raw.labels.clone()),
    };
    let facts = raw.as_ref().map(|raw| raw.facts.clone());
    let species = raw.try_map_at_once(conduct.threads, |side, raw| {
        embed_species(raw, side, &treatment[side], &settings, most)
    })?;

    for side in Side::BOTH {
        if species[side].embedding.axes() == 0 {
            let place = Place::file(&inputs.matrix[side].path);
            return Err(InputError::new(place, Problem::NoAxes { side }));
        }
    }
    check_evidence(&species, &landmarks, &settings)
        .map_err(|problem| InputError::new(Place::file(&inputs.study.path), problem))?;
    let available = Side::BOTH
        .into_iter()
        .map(|side| species[side].embedding.axes())
        .min()
        .unwrap_or(0);
    let axes = match settings.axes {
        Axes::Number(axes) => {
            if let Some(side) = Side::BOTH
                .into_iter()
                .find(|side| species[*side].embedding.axes() < axes)
            {
                return Err(InputError::new(
                    Place::file(&inputs.matrix[side].path),
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
            let most = most.min(available);
            (2.min(most)..=most).collect()
        }
    };
    Ok(Study {
        title: description.title,
        species,
        landmarks,
        axes,
        treatment,
        raw: facts,
        inputs,
        settings,
        conduct,
        warnings,
    })
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

/// Reads and checks one matrix, and finds its parcels.
fn read_species(described: &SpeciesFile) -> Result<Raw, InputError> {
    let matrix = input::read_matrix_of(described)?;
    let mut network = matrix.network;
    let mut warnings = matrix.warnings;
    suspicion::look_over(&network, described, &mut warnings);
    let filled = raw_facts::filled(&network);
    if described.weights == WeightKind::Correlations {
        symmetrise(&mut network);
    }
    let connected = connected(&network, described.weights);
    let place = || Place::file(&described.matrix);
    if !connected.contains(&true) {
        return Err(InputError::new(place(), Problem::AllZero));
    }
    let parcels = Parcels::new(&described.name, network.row_labels(), &connected);
    if parcels.len() < FEWEST_PARCELS {
        return Err(InputError::new(
            place(),
            Problem::TooFewParcels {
                found: parcels.len(),
                needed: FEWEST_PARCELS,
            },
        ));
    }
    if !parcels.isolated().is_empty() {
        warnings.push(Warning::SetAside {
            species: described.name.clone(),
            parcels: parcels.isolated().to_vec(),
        });
    }
    let order: Vec<usize> = {
        let mut order: Vec<usize> = (0..connected.len()).filter(|&i| connected[i]).collect();
        let labels = network.row_labels();
        order.sort_by(|&i, &j| labels[i].as_bytes().cmp(labels[j].as_bytes()));
        order
    };
    let network = network.select(&order, &order);
    Ok(Raw {
        file: matrix.file,
        labels: matrix.labels,
        warnings,
        facts: RawFacts::of(&network, described.weights, filled),
        network,
        parcels,
    })
}

/// Which parcels have a connection in either direction.
fn connected(network: &Connectivity, weights: WeightKind) -> Vec<bool> {
    let mut connected = vec![false; network.row_labels().len()];
    for ((i, j), &w) in network.weights().indexed_iter() {
        // Every finite logarithm stands for a connection.
        if i != j && (w != 0.0 || weights == WeightKind::Log10) {
            connected[i] = true;
            connected[j] = true;
        }
    }
    connected
}

/// The mean of both halves: a correlation has no direction.
fn symmetrise(network: &mut Connectivity) {
    let mut weights = network.weights_mut();
    for i in 0..weights.nrows() {
        for j in 0..i {
            let mean = (weights[(i, j)] + weights[(j, i)]) / 2.0;
            weights[(i, j)] = mean;
            weights[(j, i)] = mean;
        }
    }
}

fn treatment(described: &SpeciesFile, network: &Connectivity) -> Treatment {
    let default = affinity::Params::default_for(described.weights);
    Treatment {
        weights: described.weights,
        transform: described
            .transform
            .unwrap_or_else(|| transform::default_for(network, described.weights)),
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
        // Two blocks are left out at a time, and the rest must still span the axes.
        Axes::Auto => Ok(blocks.saturating_sub(3).clamp(1, MOST_AXES)),
    }
}

fn embed_species(
    raw: Raw,
    side: Side,
    treatment: &Treatment,
    settings: &Settings,
    axes: usize,
) -> Result<Species, InputError> {
    let network = transform::apply(raw.network, treatment.weights, treatment.transform);
    let profiles = Profiles::of(&network, treatment.affinity.strongest);
    let embedding: Embedding = match settings.embedding {
        embed::Method::Components => {
            embed::components(&profiles.standardised(treatment.affinity.likeness), axes)
        }
        embed::Method::Diffusion => {
            let affinity = profiles.affinity(treatment.affinity.likeness);
            drop(profiles);
            embed::diffusion_map(
                affinity,
                settings.density_exponent,
                DiffusionTime::from_number(settings.diffusion_time),
                axes,
            )
            .map_err(|embed::DiffusionError::Disconnected| {
                InputError::new(Place::file(&raw.file.path), Problem::Disconnected { side })
            })?
        }
    };
    Ok(Species {
        parcels: raw.parcels,
        network,
        profiles: treatment.affinity,
        embedding,
        areas: None,
    })
}
