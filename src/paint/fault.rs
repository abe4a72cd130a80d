//! Why a run could not be painted, in words.

use std::path::PathBuf;

use thiserror::Error;

use crate::finished::{hint, RunError};
use crate::input::InputError;
use crate::report::MapsError;

/// Labels named in a message before the rest is only counted.
const NAMED: usize = 4;

/// Why nothing was painted.
#[derive(Debug, Error)]
pub enum PaintError {
    /// A fault in a label file, or a table that cannot be read.
    #[error(transparent)]
    Input(#[from] InputError),
    /// Maps that cannot be written.
    #[error(transparent)]
    Maps(#[from] MapsError),
    /// A run that cannot be read.
    #[error(transparent)]
    Run(#[from] RunError),
    /// A species that the run does not know.
    #[error("the run has no species {found:?}; its species are {a:?} (a) and {b:?} (b)")]
    NoSpecies {
        /// The name.
        found: String,
        /// Name of species a.
        a: String,
        /// Name of species b.
        b: String,
    },
    /// An alignment whose axes the run has not.
    #[error("the run has no axes of {found:?}; it has those of {}", .known.join(", "))]
    NoAlignment {
        /// The name.
        found: String,
        /// Those there are.
        known: Vec<String>,
    },
    /// A parcel that the other species has not.
    #[error("--parcel must name a parcel of {species}, whose counterparts are painted; {found:?} is none{}", also(.found_in, .near))]
    NoSuchParcel {
        /// The label.
        found: String,
        /// The species that is asked about.
        species: String,
        /// The painted species, where it has such a parcel.
        found_in: Option<String>,
        /// Near labels.
        near: Vec<String>,
    },
    /// A parcel whose counterpart was given.
    #[error("--parcel {found:?} of {species} belongs to the landmark {landmark:?}: its counterpart was given, not asked; name a parcel that belongs to no landmark")]
    IsLandmark {
        /// The label.
        found: String,
        /// Its species.
        species: String,
        /// The landmark.
        landmark: String,
    },
    /// A parcel without connections.
    #[error("--parcel {found:?} of {species} was set aside in the run for want of connections; name another")]
    IsSetAside {
        /// The label.
        found: String,
        /// Its species.
        species: String,
    },
    /// A surface of another parcellation.
    #[error(transparent)]
    NoParcel(Box<OtherParcellation>),
    /// Two label files whose maps would have the same names.
    #[error("{} and {} would give maps of the same names; rename one, or paint them one after the other into folders of their own (--out)", first.display(), second.display())]
    SameName {
        /// One.
        first: PathBuf,
        /// The other.
        second: PathBuf,
    },
}

/// A label file whose labels are no parcels of a species.
#[derive(Debug, Error)]
#[error("{}: none of its labels is a parcel of {species} in the run. It has {}; the run has {}{}", file.display(), listed(.labels), listed(.parcels), clue(.near, .of_other))]
pub struct OtherParcellation {
    /// The label file.
    pub file: PathBuf,
    /// The species.
    pub species: String,
    /// Labels of the file.
    pub labels: Vec<String>,
    /// Labels of the run.
    pub parcels: Vec<String>,
    /// A label of the file and a near one of the run.
    pub near: Option<(String, String)>,
    /// The other species, where the labels are its parcels.
    pub of_other: Option<String>,
}

fn also(found_in: &Option<String>, near: &[String]) -> String {
    match found_in {
        Some(species) => format!(" but one of {species}, the species that is painted"),
        None => hint(near),
    }
}

fn clue(near: &Option<(String, String)>, of_other: &Option<String>) -> String {
    match (of_other, near) {
        (Some(other), _) => format!(". Its labels are parcels of {other}: check --species"),
        (None, Some((label, parcel))) => {
            format!(". {label:?} is near {parcel:?}: labels must agree in every letter")
        }
        (None, None) => ". Give the label file of the parcellation that the matrix has".to_owned(),
    }
}

fn listed(labels: &[String]) -> String {
    let named: Vec<String> = labels
        .iter()
        .take(NAMED)
        .map(|label| format!("{label:?}"))
        .collect();
    match labels.len().saturating_sub(NAMED) {
        0 => named.join(", "),
        more => format!("{} and {more} more", named.join(", ")),
    }
}
