//! One species from its files: matrices, tables of parcels, distances; checked, folded where asked for,
//! and cut to the parcels that take part.

use std::collections::{BTreeMap, HashMap};
use std::path::PathBuf;

use super::arrange::{standing, Arranged};
use super::cohort::Cohort;
use super::fold::Folding;
use super::measured::Measured;
use super::raw_facts::{self, RawFacts};
use super::suspicion;
use crate::domain::{Attributes, Connectivity, Geometry, Hemispheres, Parcels, Standing};
use crate::input::{self, InputError, InputFile, ParcelFault, Place, Problem, Source, SpeciesFile};
use crate::warning::Warning;

/// Fewest parcels that make an embedding.
const FEWEST_PARCELS: usize = 4;
/// Fewest entries of a profile by which parcels can be compared.
const FEWEST_COLUMNS: usize = 3;

/// One species' matrix as read, with what its parcels are.
pub struct Raw {
    /// The file, or one of the files, the network was read from.
    pub place: PathBuf,
    /// The matrix, where there is one.
    pub matrix: Option<InputFile>,
    /// The matrices of individuals.
    pub subjects: Vec<InputFile>,
    /// Individuals, with the rows and columns of the network.
    pub cohort: Option<Cohort>,
    pub labels: Vec<InputFile>,
    pub table: Option<InputFile>,
    pub distances: Option<InputFile>,
    pub warnings: Vec<Warning>,
    pub network: Connectivity,
    pub parcels: Parcels,
    pub attributes: Vec<Attributes>,
    pub geometry: Geometry,
    pub facts: RawFacts,
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
pub fn read_species(described: &SpeciesFile, hemispheres: Hemispheres) -> Result<Raw, InputError> {
    let measured = Measured::read(described)?;
    let mut warnings = measured.warnings;
    let fail = |problem| Err(InputError::new(Place::file(described.source()), problem));
    suspicion::look_over(&measured.network, described, &mut warnings);
    let filled = raw_facts::filled(&measured.network);
    let arranged = Arranged::of(measured.network, measured.rows_are, described.weights);
    let turned = arranged.rows_are != measured.rows_are;
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
    if let Some(folding) = &folding {
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
    // Every individual goes the way of the group.
    let cohort = measured.cohort.map(|cohort| {
        cohort.map(|mut network| {
            if turned {
                network = network.transposed();
            }
            if let Some(folding) = &folding {
                network = folding.network(&network, described.weights);
            }
            let at = |labels: &[String], wanted: &[String]| -> Vec<usize> {
                let place: HashMap<&str, usize> =
                    labels.iter().map(String::as_str).zip(0..).collect();
                wanted.iter().map(|label| place[label.as_str()]).collect()
            };
            network.select(
                &at(network.row_labels(), selected.row_labels()),
                &at(network.column_labels(), selected.column_labels()),
            )
        })
    });
    Ok(Raw {
        place: described.source().to_path_buf(),
        matrix: measured.matrix,
        subjects: measured.subjects,
        cohort,
        labels: measured.labels,
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
