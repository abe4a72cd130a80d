//! From files to two species ready for comparison: read, check, transform, embed.

use std::collections::BTreeMap;
use std::path::Path;

use serde::Serialize;

use crate::affinity::{self, Profiles};
use crate::bootstrap::{Purpose, Stream};
use crate::domain::{
    Attributes, Connectivity, Geometry, Hemispheres, Landmarks, Pair, Parcels, RowsAre, Side,
    Standing, Tracer, Transform, WeightKind,
};
use crate::embed::{self, DiffusionTime, Embedding};
use crate::evidence::{Evidence, Fingerprint, Material, Transport};
use crate::input::{self, InputError, InputFile, ParcelFault, Place, Problem, Source, SpeciesFile};
use crate::place::Candidates;
use crate::settings::{Axes, Conduct, EvidenceChoice, Request, Settings};
use crate::species::Species;
use crate::transform;
use crate::transport::Mass;
use crate::warning::Warning;

mod arrange;
mod fold;
mod parts;
mod raw_facts;
mod sides;
mod suspicion;

use arrange::{standing, Arranged};
use fold::Folding;
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

/// One species' matrix as read, with what its parcels are.
struct Raw {
    file: InputFile,
    labels: Vec<InputFile>,
    table: Option<InputFile>,
    distances: Option<InputFile>,
    warnings: Vec<Warning>,
    network: Connectivity,
    parcels: Parcels,
    attributes: Vec<Attributes>,
    geometry: Geometry,
    facts: RawFacts,
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
        matrix: raw.as_ref().map(|raw| raw.file.clone()),
        labels: raw.as_ref().map(|raw| raw.labels.clone()),
        parcels: raw.as_ref().map(|raw| raw.table.clone()),
        distances: raw.as_ref().map(|raw| raw.distances.clone()),
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
        candidates,
        asked,
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

/// What is known of a species besides its connections, for the labels of its matrix.
struct Known {
    attributes: Vec<Attributes>,
    geometry: Geometry,
    table: Option<InputFile>,
    distances: Option<InputFile>,
}

fn read_known(
    described: &SpeciesFile,
    labels: &[String],
    warnings: &mut Vec<Warning>,
) -> Result<Known, InputError> {
    let table = match &described.parcels {
        None => None,
        Some(path) => {
            let source = Source::read(path)?;
            let table = input::read_parcels(&source, labels, &described.name)?;
            warnings.extend(table.warnings);
            Some((table.file, table.attributes))
        }
    };
    let distances = match &described.distances {
        None => None,
        Some(path) => {
            let own = described.labels.as_deref();
            let read = input::read_distances(path, own, labels, &described.name)?;
            warnings.extend(read.warnings);
            Some((read.file, read.values))
        }
    };
    let (table, attributes) = table.unzip();
    let (file, distances) = distances.unzip();
    let attributes: Vec<Attributes> =
        attributes.unwrap_or_else(|| vec![Attributes::default(); labels.len()]);
    let coordinates = attributes.iter().map(|a| a.coordinates).collect();
    Ok(Known {
        geometry: Geometry::new(coordinates, distances),
        attributes,
        table,
        distances: file,
    })
}

/// Reads and checks one matrix and what is said of its parcels, folds it where that is asked for, and
/// finds the parcels that take part.
fn read_species(described: &SpeciesFile, hemispheres: Hemispheres) -> Result<Raw, InputError> {
    let matrix = input::read_matrix_of(described)?;
    let mut warnings = matrix.warnings;
    let fail = |problem| Err(InputError::new(Place::file(&described.matrix), problem));
    suspicion::look_over(&matrix.network, described, &mut warnings);
    let filled = raw_facts::filled(&matrix.network);
    let arranged = Arranged::of(matrix.network, matrix.rows_are, described.weights);
    if arranged.missing > 0 {
        warnings.push(Warning::MissingEntries {
            species: described.name.clone(),
            entries: arranged.missing,
            mirrored: arranged.mirrored,
            columns: arranged.unobserved_columns,
        });
    }
    let mut network = arranged.network;
    let mut labels = network.row_labels().to_vec();
    let mut known = read_known(described, &labels, &mut warnings)?;
    let mut copies = BTreeMap::new();
    let folding = (hemispheres == Hemispheres::Fold)
        .then(|| Folding::of(&labels, &known.attributes))
        .flatten();
    if let Some(folding) = folding {
        network = folding.network(&network, described.weights);
        if !network.weights().iter().all(|w| w.is_finite()) {
            return fail(ParcelFault::FoldOverflows.into());
        }
        let attributes = folding.attributes(&known.attributes);
        known.geometry = folding.geometry(&known.geometry, &attributes);
        known.attributes = attributes;
        labels = folding.labels();
        copies = folding.copies();
        let alone = folding.without_copy();
        if !alone.is_empty() {
            warnings.push(Warning::NoCopy {
                species: described.name.clone(),
                parcels: alone,
            });
        }
    }
    suspicion::components(&network, described, &mut warnings);
    let standing = standing(&network, described.weights, arranged.missing > 0);
    if standing.iter().all(|s| *s == Standing::Uncovered) {
        return fail(Problem::AllMissing);
    }
    if !standing.contains(&Standing::Placed) {
        return fail(Problem::AllZero);
    }
    let parcels = Parcels::new(&described.name, &labels, &standing).made_of(copies);
    if parcels.len() < FEWEST_PARCELS {
        return fail(Problem::TooFewParcels {
            found: parcels.len(),
            needed: FEWEST_PARCELS,
        });
    }
    let (rows, columns) = in_order(&network, &standing);
    if columns.len() < FEWEST_COLUMNS {
        return fail(Problem::TooFewColumns {
            found: columns.len(),
            needed: FEWEST_COLUMNS,
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
    let selected = network.select(&rows, &columns);
    // A large network is dear to keep twice.
    drop(network);
    Ok(Raw {
        file: matrix.file,
        labels: matrix.labels,
        table: known.table,
        distances: known.distances,
        attributes: rows.iter().map(|&i| known.attributes[i].clone()).collect(),
        geometry: known.geometry.select(&rows),
        warnings,
        facts: RawFacts::of(&selected, arranged.rows_are, described.weights, filled),
        network: selected,
        parcels,
    })
}

/// The rows that take part, in bytewise order of their labels, and the columns likewise, without those
/// of parcels that do not take part.
fn in_order(network: &Connectivity, standing: &[Standing]) -> (Vec<usize>, Vec<usize>) {
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
    (rows, columns)
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
    let areas = raw.attributes.iter().map(|a| a.extent?.area()).collect();
    Ok(Species {
        areas,
        parcels: raw.parcels,
        attributes: raw.attributes,
        geometry: raw.geometry,
        network,
        profiles: treatment.affinity,
        embedding,
    })
}
