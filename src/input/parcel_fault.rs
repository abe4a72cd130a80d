//! What can be wrong with what is said of parcels: the table of attributes, the file of distances,
//! and the use of hemispheres. The wording of every message.

use thiserror::Error;

use crate::domain::{Hemisphere, Side};

/// Parcels named before the rest is only counted.
const NAMED: usize = 6;

/// A fault in what is said of parcels.
#[derive(Debug, Clone, PartialEq, Error)]
pub enum ParcelFault {
    /// A table without labels.
    #[error(
        "the table lacks the column \"label\"; found {found}. Expected label and any of {known}"
    )]
    NoLabelColumn {
        /// Columns found.
        found: String,
        /// Columns that may be there besides.
        known: String,
    },
    /// A row without a label.
    #[error("expected a parcel label, found an empty cell; fill it in or remove the row")]
    EmptyLabel,
    /// A label that came before.
    #[error("the label {label:?} came before, at line {line}; give each parcel one row")]
    LabelTwice {
        /// The label.
        label: String,
        /// Line of the first.
        line: u64,
    },
    /// A word that is no side.
    #[error(
        "expected a hemisphere ({}), found {found:?}; leave the cell empty where it is not known",
        Hemisphere::spellings()
    )]
    Hemisphere {
        /// The word.
        found: String,
    },
    /// A cell that is no finite number.
    #[error("expected a finite number for {column}, found {found:?}; leave the cell empty where it is not known")]
    Number {
        /// The column.
        column: &'static str,
        /// The cell.
        found: String,
    },
    /// Some coordinates, not all.
    #[error("expected x, y and z, found no {missing}; give all three or none")]
    PartOfCoordinates {
        /// The first that is missing.
        missing: &'static str,
    },
    /// An area or volume of nothing.
    #[error(
        "expected {column} above 0, found {found}; leave the cell empty where it is not known"
    )]
    Extent {
        /// The column.
        column: &'static str,
        /// The number.
        found: f64,
    },
    /// Both an area and a volume.
    #[error("found both an area and a volume; the two do not compare, so keep one of the columns")]
    AreaAndVolume,
    /// A negative distance.
    #[error("expected a distance of 0 or more, found {found}; check that this is the matrix of distances")]
    NegativeDistance {
        /// The number.
        found: f64,
    },
    /// Several arrays that could be the distances or their labels.
    #[error("the file holds several arrays that could be meant: {}; save the matrix of distances alone, or with one list of labels", named(names))]
    SeveralDistances {
        /// Their names.
        names: Vec<String>,
    },
    /// Distances from parcels to some of them only.
    #[error("expected distances between all parcels, found rows and columns of different ones; give a square matrix, NaN where a distance is not known")]
    DistancesNotSquare,
    /// Parcels without a distance.
    #[error("no distances for {} of the parcels of the matrix ({}); the file must name every parcel by the label it has there", parcels.len(), named(parcels))]
    DistancesLack {
        /// The parcels.
        parcels: Vec<String>,
    },
    /// A landmark whose parcels lie on opposite sides where sides are matched.
    #[error("landmark {landmark:?} pairs no parcels of one side, but hemispheres = \"match\" allows only such counterparts; mend the landmark or the hemispheres, or say hemispheres = \"ignore\"")]
    LandmarkAcross {
        /// The landmark.
        landmark: String,
    },
    /// Sides to be matched, but not known.
    #[error("hemispheres = \"match\" needs the side of the parcels, but none of species {} has one; give it a table of parcels with a column hemisphere: parcels = \"FILE\"", side.letter())]
    NoHemispheres {
        /// The species.
        side: Side,
    },
    /// Weights whose sum over both sides no number can hold.
    #[error("the weights of both sides are too large to be added up (beyond 1.8e308); divide all weights by one number")]
    FoldOverflows,
    /// Brains to be folded that have no two sides.
    #[error("hemispheres = \"fold\" found no left and right copies of one area in either species; name copies alike but for the side (V1-L, V1-R), or give both the same long_name and their hemisphere in a table of parcels")]
    NothingToFold,
}

fn named(parcels: &[String]) -> String {
    let shown = parcels.iter().take(NAMED).cloned().collect::<Vec<_>>();
    match parcels.len().saturating_sub(NAMED) {
        0 => shown.join(", "),
        more => format!("{} and {more} more", shown.join(", ")),
    }
}
