//! What can be wrong with a file of labels of a surface, in words.

use thiserror::Error;

use crate::input::formats::Inflated;

/// A fault of a GIFTI file.
#[derive(Debug, Clone, PartialEq, Eq, Error)]
pub enum GiftiFault {
    /// Something else than GIFTI.
    #[error("expected a GIFTI label file (.label.gii), found {found}; give the file that names the parcel of each vertex")]
    NotGifti {
        /// What came.
        found: String,
    },
    /// XML that does not follow its rules, or GIFTI's.
    #[error("the GIFTI file is damaged: {0}; copy it or save it again")]
    Damaged(String),
    /// Declarations that could make a small file large.
    #[error("the GIFTI file has {found}, which no GIFTI file needs; it is not read. Save the file again by a current library such as nibabel")]
    Declares {
        /// What it has.
        found: String,
    },
    /// No array of labels.
    #[error("expected an array of labels (NIFTI_INTENT_LABEL), found {}; give the label file of the parcellation, not a surface or a map", listed(.found))]
    NoLabelArray {
        /// The intents there are.
        found: Vec<String>,
    },
    /// No names.
    #[error("the GIFTI file has no table of labels (LabelTable), so its keys name no parcel; save it with its names")]
    NoTable,
    /// A label without a key.
    #[error("expected a whole number as the key of a label, found {found:?}; save the file again")]
    BadKey {
        /// What came.
        found: String,
    },
    /// One key for two labels.
    #[error(
        "the key {key} stands for {first:?} and for {second:?}; give each label a key of its own"
    )]
    KeyTwice {
        /// The key.
        key: i64,
        /// One name.
        first: String,
        /// The other.
        second: String,
    },
    /// A key that is no whole number.
    #[error("vertex {vertex} (counted from 0) has the key {found}; expected whole numbers, so is this a label file?")]
    KeyNotWhole {
        /// The vertex, counted from 0.
        vertex: usize,
        /// Its key.
        found: String,
    },
    /// An array that is not one key a vertex.
    #[error("expected one key for each vertex, found {found}; save the labels as a list")]
    Shape {
        /// The shape.
        found: String,
    },
    /// Numbers of a type that is not read.
    #[error("unknown type of numbers {found:?}; save the labels as NIFTI_TYPE_INT32")]
    DataType {
        /// The type.
        found: String,
    },
    /// An unknown way of writing numbers.
    #[error("unknown {attribute} {found:?}; known are {known}")]
    Coding {
        /// `Encoding` or `Endian`.
        attribute: &'static str,
        /// What came.
        found: String,
        /// What is read.
        known: &'static str,
    },
    /// Numbers in a file of their own.
    #[error("the labels stand in another file (ExternalFileBinary), which is not read; save the GIFTI file with its data inside, as GZipBase64Binary")]
    External,
    /// More or fewer numbers than the file says.
    #[error("the array is said to hold {expected} keys, which take {needed} bytes, but {found} are there; copy the file or save it again")]
    Length {
        /// Keys that should be there.
        expected: u64,
        /// Bytes they take.
        needed: u128,
        /// What is there, in words.
        found: String,
    },
    /// More or fewer numbers written out than the file says.
    #[error("the array is said to hold {expected} keys, but {found} are there; copy the file or save it again")]
    Count {
        /// Keys that should be there.
        expected: u64,
        /// Keys there are.
        found: usize,
    },
    /// Compressed numbers that would grow beyond measure.
    #[error("the array is said to hold {expected} keys, more than kinmark inflates ({} bytes from so small a file); copy the file or save it again", .allowed.most)]
    InflatesBeyond {
        /// Keys that should be there.
        expected: u64,
        /// The most that is inflated.
        allowed: Inflated,
    },
}

impl GiftiFault {
    /// Something else came.
    pub(super) fn not_gifti(found: &str) -> GiftiFault {
        GiftiFault::NotGifti {
            found: found.to_owned(),
        }
    }
}

fn listed(intents: &[String]) -> String {
    if intents.is_empty() {
        return "no array at all".to_owned();
    }
    intents.join(", ")
}
