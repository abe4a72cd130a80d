//! What can be wrong with a matrix because of its format, in words.

use std::path::PathBuf;

use thiserror::Error;

use super::gzip::Inflated;
use crate::input::error::hint;

/// A fault of one format.
#[derive(Debug, Clone, PartialEq, Eq, Error)]
pub enum Fault {
    /// Numbers without labels.
    #[error("the file holds {rows} rows of numbers but no labels; put the labels, one a line in the order of the rows, into a text file and add labels = \"FILE\" to the species in the study file")]
    NoLabels {
        /// Rows of the matrix.
        rows: usize,
    },
    /// Rows and columns differ in number, and nothing says which is too much.
    #[error("found {rows} rows and {columns} columns of numbers, and labels for one of the two only; in a square matrix every parcel needs a row and a column. If the table is rectangular, add rows = \"sources\" or rows = \"targets\" to the species in the study file, and column-labels = \"FILE\" if columns are parcels too")]
    NotSquare {
        /// Rows of numbers.
        rows: usize,
        /// Columns of numbers.
        columns: usize,
    },
    /// Another number of labels than rows.
    #[error("found {found} labels for the {lines} {axis} of {}; give one label a line, without a header, in the order of the {axis}", .matrix.display())]
    LabelCount {
        /// Labels found.
        found: usize,
        /// Rows or columns of the matrix.
        lines: usize,
        /// Which of the two.
        axis: &'static str,
        /// The matrix.
        matrix: PathBuf,
    },
    /// Labels that would exchange the parcels of a matrix that names them itself.
    #[error("found {given:?} where {} itself says {own:?}: both hold the same labels in another order; leave the key labels out, or bring the labels into the order of the matrix", .matrix.display())]
    LabelsReordered {
        /// The label in the file of labels.
        given: String,
        /// The label in the matrix.
        own: String,
        /// The matrix.
        matrix: PathBuf,
    },
    /// Rows are stated to be targets where each line names its own.
    #[error("a list of connections says itself which area is the source and which the target; remove rows = \"targets\", or exchange the names of the two columns in its header")]
    ListKnowsDirection,
    /// Subjects in a file that is no stack.
    #[error("expected the matrices of all subjects in one NumPy array of three axes, found {found}; name a folder, a pattern such as \"subjects/*.csv\", or a list of files")]
    NoStack {
        /// What it is.
        found: String,
    },
    /// Two keys that say where labels are.
    #[error("both labels and label-variable are given; keep the one that holds the labels")]
    TwoLabelKeys,
    /// A key that names an array, for a file that is one table.
    #[error("the key {key} names an array of a .npz or .mat file, but this file is {format}; remove the key from the study file")]
    UselessKey {
        /// The key.
        key: &'static str,
        /// What the file is.
        format: &'static str,
    },
    /// Bytes that do not follow their format.
    #[error("the file is damaged: {0}; copy it or save it again")]
    Damaged(String),
    /// Fewer bytes than the file itself says.
    #[error("the file ends too early: {what} takes {needed} bytes, {found} are there; copy it or save it again")]
    Truncated {
        /// What is cut off.
        what: String,
        /// Bytes it takes.
        needed: u128,
        /// Bytes there are.
        found: u64,
    },
    /// Compressed bytes that grow beyond measure.
    #[error("the compressed file grows beyond {} bytes, more than kinmark inflates (1000 times its size, at least 16 MiB, at most 4 GiB); save it without compression", .0.most)]
    InflatesBeyond(Inflated),
    /// Gzip in gzip.
    #[error("the file is compressed twice by gzip; unpack it once")]
    GzipTwice,
    /// HDF5.
    #[error("the file is HDF5, which is not read; in MATLAB (7.3 files are HDF5) save it again with save(FILE, 'NAME', '-v7'), elsewhere save the matrix as .npy or CSV")]
    Hdf5,
    /// An image.
    #[error("the file is a NIfTI-1 image, expected a matrix; give a parcellated CIFTI-2 file (.pconn.nii), .npy or CSV")]
    Nifti1,

    /// Numbers of a type that is not read.
    #[error("expected real numbers (float32, float64 or integers), found {found}; convert the matrix{}", remedy(.found))]
    NumberType {
        /// The type.
        found: String,
    },
    /// An array without rows and columns.
    #[error("expected a matrix with rows and columns, found {found}; save the two-dimensional matrix alone")]
    NotTwoAxes {
        /// The shape.
        found: String,
    },
    /// A zip archive without arrays.
    #[error("the file is a zip archive without NumPy arrays (.npy) in it{}; save the matrix by numpy.savez or as CSV", holds(.names))]
    ZipWithoutArrays {
        /// What is in it.
        names: Vec<String>,
    },
    /// No array of the name asked for.
    #[error("{key} names the array {found:?}, but the file has none of that name{}; it holds {}", hint(.near), listed(.known))]
    NoSuchArray {
        /// The key that names it.
        key: &'static str,
        /// The name.
        found: String,
        /// Near spellings.
        near: Vec<String>,
        /// What there is.
        known: Vec<String>,
    },
    /// An array that cannot be what it is named for.
    #[error("{key} names the array {name:?}, which is {found}; expected {expected}")]
    WrongArray {
        /// The key that names it.
        key: &'static str,
        /// The name.
        name: String,
        /// What it is.
        found: String,
        /// What it must be.
        expected: &'static str,
    },
    /// No matrix in a file of arrays.
    #[error("the file holds no matrix of real numbers; it holds {}", listed(.known))]
    NoMatrix {
        /// What there is.
        known: Vec<String>,
    },
    /// Several arrays that could be meant.
    #[error("the file holds several {what}: {}; say which by {key} = \"NAME\" for the species in the study file", listed(.names))]
    SeveralArrays {
        /// Of what.
        what: &'static str,
        /// The key that says which.
        key: &'static str,
        /// Their names.
        names: Vec<String>,
    },
    /// A label array that does not fit the matrix.
    #[error(
        "the array {name:?} holds {found} labels for {rows} rows; expected one label for each row"
    )]
    LabelArrayCount {
        /// The array.
        name: String,
        /// Labels in it.
        found: usize,
        /// Rows of the matrix.
        rows: usize,
    },

    /// A NIfTI-2 file that is no matrix of parcels.
    #[error("expected a parcellated CIFTI-2 matrix (.pconn.nii), found {found}; parcellate it first, for instance by wb_command -cifti-parcellate along both dimensions")]
    NotParcels {
        /// What came.
        found: String,
    },
    /// An XML that is refused before it is read.
    #[error("the XML of the file has {found}, which no CIFTI-2 file needs; it is not read. Save the file again by a current CIFTI library such as nibabel")]
    XmlDeclares {
        /// What it has.
        found: String,
    },
    /// Another number of parcels than rows or columns.
    #[error(
        "the XML of the file names {parcels} parcels for {entries} {axis}; save the file again"
    )]
    ParcelCount {
        /// `rows` or `columns`.
        axis: &'static str,
        /// Parcels named.
        parcels: usize,
        /// Rows or columns of the matrix.
        entries: usize,
    },

    /// A column an edge list does not have.
    #[error("unknown column {found:?} in a list of connections; its columns are source, target, weight: remove the others")]
    EdgeColumn {
        /// The column.
        found: String,
    },
    /// A parcel of an edge list that the labels lack.
    #[error("{found:?} is none of the parcels that labels names{}; mend the spelling, or add the parcel to {}", hint(.near), .labels.display())]
    UnknownEnd {
        /// The parcel.
        found: String,
        /// Near spellings.
        near: Vec<String>,
        /// The file of labels.
        labels: PathBuf,
    },
    /// A pair that came before.
    #[error(
        "the connection came before, at line {line}; give each pair of source and target one line"
    )]
    PairTwice {
        /// Line of the first.
        line: u64,
    },
    /// More parcels than fit into memory.
    #[error("the list names {found} parcels, more than the {most} that are read; are the columns source and target labels?")]
    TooManyParcels {
        /// Parcels named.
        found: usize,
        /// The most that are read.
        most: usize,
    },
    /// A list of logarithms without all pairs.
    #[error("an absent pair means no connection, which a logarithm cannot say: {from} to {to} is not in the list; give the weights themselves, or every pair")]
    AbsentLogarithm {
        /// Source of the first absent pair.
        from: String,
        /// Its target.
        to: String,
    },
}

fn remedy(found: &str) -> &'static str {
    match found {
        "bool" | "logical" => ", for instance by .astype(float) in NumPy or double() in MATLAB",
        _ => " to float64",
    }
}

fn holds(names: &[String]) -> String {
    if names.is_empty() {
        " (it is empty)".to_owned()
    } else {
        format!(" (it holds {})", listed(names))
    }
}

/// Names in words; of many only the first.
fn listed(names: &[String]) -> String {
    const SHOWN: usize = 8;
    match names.len() {
        0 => "nothing".to_owned(),
        n if n > SHOWN => format!("{} and {} more", names[..SHOWN].join(", "), n - SHOWN),
        _ => names.join(", "),
    }
}
