//! From files to two species ready for comparison: read, check, transform, embed.

use std::path::Path;

use serde::Serialize;

use crate::affinity::{self, Profiles};
use crate::domain::{
    Connectivity, Landmarks, Pair, Parcels, RowsAre, Side, Standing, Tracer, Transform, WeightKind,
};
use crate::embed::{self, DiffusionTime, Embedding};
use crate::input::{self, InputError, InputFile, Place, Problem, Source, SpeciesFile};
use crate::settings::{Axes, Conduct, Request, Settings};
use crate::species::Species;
use crate::transform;
use crate::warning::Warning;

mod arrange;
mod parts;
mod raw_facts;
mod suspicion;

use arrange::Arranged;
pub use parts::Parts;
pub use raw_facts::{Filled, RawFacts, SumsToOne};

/// Fewest parcels that make an embedding.
const FEWEST_PARCELS: usize = 4;
/// Fewest entries of a profile by which parcels can be compared.
const FEWEST_COLUMNS: usize = 3;
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
    /// The matrices.
    pub matrix: Pair<InputFile>,
    /// Files of labels, where matrices have them.
    #[serde(skip_serializing_if = "none")]
    pub labels: Pair<Vec<InputFile>>,
}

fn none(files: &Pair<Vec<InputFile>>) -> bool {
    files.a.is_empty() && files.b.is_empty()
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
    labels: Vec<InputFile>,
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
    let request = asked.or(description.request.clone());
    let embedding = request.embedding;
    let (mut settings, conduct) = request.settle();
    let raw = description
        .species
        .as_ref()
        .try_map_at_once(conduct.threads, |_, described| read_species(described))?;
    let rectangular = |raw: &Raw| raw.facts.rectangular.is_some();
    if embedding.is_none() && (rectangular(&raw.a) || rectangular(&raw.b)) {
        settings.embedding = embed::Method::OF_RECTANGULAR;
    }
    let mut warnings = [&raw.a.warnings[..], &raw.b.warnings[..]].concat();

    let table = Source::read(&description.landmarks)?;
    let parcels = Pair {
        a: &raw.a.parcels,
        b: &raw.b.parcels,
    };
    let (landmarks, more) = input::read_landmarks(&table, parcels)?;
    warnings.extend(more);
    let most = most_axes(settings.axes, &landmarks, &table)?;

    let treatment = Pair::from_fn(|side| treatment(&description.species[side], &raw[side]));
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

/// Reads and checks one matrix, and finds its parcels.
fn read_species(described: &SpeciesFile) -> Result<Raw, InputError> {
    let matrix = input::read_matrix_of(described)?;
    let mut warnings = matrix.warnings;
    suspicion::look_over(&matrix.network, described, &mut warnings);
    let filled = raw_facts::filled(&matrix.network);
    let arranged = Arranged::of(matrix.network, matrix.rows_are, described.weights);
    let fail = |problem| Err(InputError::new(Place::file(&described.matrix), problem));
    if arranged.standing.iter().all(|s| *s == Standing::Uncovered) {
        return fail(Problem::AllMissing);
    }
    if !arranged.standing.contains(&Standing::Placed) {
        return fail(Problem::AllZero);
    }
    let network = arranged.network;
    let parcels = Parcels::new(&described.name, network.row_labels(), &arranged.standing);
    if parcels.len() < FEWEST_PARCELS {
        return fail(Problem::TooFewParcels {
            found: parcels.len(),
            needed: FEWEST_PARCELS,
        });
    }
    let network = parcels_in_order(network, &arranged.standing);
    if network.column_labels().len() < FEWEST_COLUMNS {
        return fail(Problem::TooFewColumns {
            found: network.column_labels().len(),
            needed: FEWEST_COLUMNS,
        });
    }
    if arranged.missing > 0 {
        warnings.push(Warning::MissingEntries {
            species: described.name.clone(),
            entries: arranged.missing,
            mirrored: arranged.mirrored,
            columns: arranged.unobserved_columns,
        });
    }
    for (parcels, observed) in [(parcels.isolated(), true), (parcels.uncovered(), false)] {
        if !parcels.is_empty() {
            warnings.push(Warning::SetAside {
                species: described.name.clone(),
                parcels: parcels.to_vec(),
                observed,
            });
        }
    }
    Ok(Raw {
        file: matrix.file,
        labels: matrix.labels,
        warnings,
        facts: RawFacts::of(&network, arranged.rows_are, described.weights, filled),
        network,
        parcels,
    })
}

/// The rows that take part, in bytewise order of their labels, and the columns likewise, without
/// those of parcels that do not take part. Takes the network, since a large one is dear to keep twice.
fn parcels_in_order(network: Connectivity, standing: &[Standing]) -> Connectivity {
    let in_order = |labels: &[String], kept: &dyn Fn(usize) -> bool| -> Vec<usize> {
        let mut order: Vec<usize> = (0..labels.len()).filter(|&at| kept(at)).collect();
        order.sort_by(|&i, &j| labels[i].as_bytes().cmp(labels[j].as_bytes()));
        order
    };
    let takes_part = |row: usize| standing[row] == Standing::Placed;
    let rows = in_order(network.row_labels(), &takes_part);
    let columns = in_order(network.column_labels(), &|column| {
        network.row_of_column(column).is_none_or(takes_part)
    });
    network.select(&rows, &columns)
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
        embedding,
    })
}
