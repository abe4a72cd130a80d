//! Formats of matrices, recognised by what the file holds. Each reader gives a [`Grid`]; nothing is
//! checked here but the format itself.

use std::io::Read;
use std::path::Path;

use super::error::{InputError, Place};
use super::grid::{Grid, Label};
use super::source::{Bytes, Source};
use crate::domain::WeightKind;

mod choose;
mod cifti;
mod cifti_labels;
pub(super) mod edges;
mod fault;
mod gzip;
mod magic;
mod mat;
mod mat_array;
mod npy;
mod npz;
pub(super) mod numbers;
pub mod stack;
mod text;

pub use choose::{Content, Listed};
pub use fault::Fault;
pub use gzip::Inflated;
pub use magic::Kind;
pub use text::read as text;

/// What a study says about a matrix, as far as a reader must know it.
#[derive(Debug, Clone, Copy)]
pub struct Wanted<'k> {
    /// What the weights measure.
    pub weights: WeightKind,
    /// Array that is the matrix.
    pub variable: Option<&'k str>,
    /// Array that holds the labels.
    pub label_variable: Option<&'k str>,
    /// Labels from a file of their own.
    pub labels: Option<&'k [Label]>,
}

impl Wanted<'_> {
    /// Refuses keys that name an array where there is only one table.
    fn no_arrays(&self, format: &'static str) -> Result<(), Fault> {
        for (key, value) in [
            ("variable", self.variable),
            ("label-variable", self.label_variable),
        ] {
            if value.is_some() {
                return Err(Fault::UselessKey { key, format });
            }
        }
        Ok(())
    }
}

/// Reads a matrix of any format.
///
/// # Errors
/// [`InputError`] where the file is damaged, of an unknown kind, or does not hold what is wanted.
pub fn read(file: Bytes, wanted: &Wanted<'_>) -> Result<Grid, InputError> {
    let (kind, file) = plain(file)?;
    read_plain(kind, file, wanted)
}

/// The kind of a file, and its bytes without compression by gzip.
///
/// # Errors
/// [`InputError`] where it cannot be inflated, or is compressed twice.
pub fn plain(file: Bytes) -> Result<(Kind, Bytes), InputError> {
    let kind = Kind::of(&file.bytes);
    if kind != Kind::Gzip {
        return Ok((kind, file));
    }
    let file = gzip::inflate(file)?;
    match Kind::of(&file.bytes) {
        Kind::Gzip => Err(refuse(&file, Fault::GzipTwice)),
        kind => Ok((kind, file)),
    }
}

/// The kind of a file by its first bytes, inside gzip if need be; `None` where it cannot be read.
#[must_use]
pub fn kind_of_file(path: &Path) -> Option<Kind> {
    // The magic bytes that stand furthest behind are those of HDF5 in MATLAB files.
    const ENOUGH: u64 = 1024;
    let mut start = Vec::new();
    let file = std::fs::File::open(path).ok()?;
    (&file).take(ENOUGH).read_to_end(&mut start).ok()?;
    let kind = Kind::of(&start);
    if kind != Kind::Gzip {
        return Some(kind);
    }
    let file = std::fs::File::open(path).ok()?;
    let mut inside = Vec::new();
    let mut inflated =
        flate2::read::MultiGzDecoder::new(std::io::BufReader::new(file)).take(ENOUGH);
    inflated.read_to_end(&mut inside).ok()?;
    Some(Kind::of(&inside))
}

/// The arrays of a file that holds several; none for other kinds.
///
/// # Errors
/// [`Fault`] where the file is damaged.
pub fn arrays(kind: Kind, bytes: &[u8]) -> Result<Vec<Listed>, Fault> {
    match kind {
        Kind::Zip => npz::arrays(bytes),
        Kind::Mat => mat::arrays(bytes),
        _ => Ok(Vec::new()),
    }
}

fn read_plain(kind: Kind, file: Bytes, wanted: &Wanted<'_>) -> Result<Grid, InputError> {
    let reader = match kind {
        Kind::Text | Kind::Gzip => return text(&Source::of(file)?, wanted),
        Kind::Npy => npy::read,
        Kind::Zip => npz::read,
        Kind::Nifti2 => cifti::read,
        Kind::Mat => mat::read,
        Kind::Hdf5 => return Err(refuse(&file, Fault::Hdf5)),
        Kind::Nifti1 => return Err(refuse(&file, Fault::Nifti1)),
    };
    let place = Place::file(&file.file.path);
    reader(&file.bytes, &place, wanted).map_err(|fault| InputError::new(place, fault.into()))
}

fn refuse(file: &Bytes, fault: Fault) -> InputError {
    InputError::new(Place::file(&file.file.path), fault.into())
}
