//! NumPy's `.npz`: a zip archive with an array in each file.

use std::io::Cursor;

use zip::read::ZipFile;
use zip::ZipArchive;

use super::choose::{self, Listed};
use super::npy::Header;
use super::{Fault, Inflated, Wanted};
use crate::input::error::Place;
use crate::input::grid::{Grid, Origin};

type Archive<'b> = ZipArchive<Cursor<&'b [u8]>>;

/// Reads an archive of arrays.
///
/// # Errors
/// [`Fault`] where the archive is damaged or does not hold what is wanted.
pub fn read(bytes: &[u8], place: &Place, wanted: &Wanted<'_>) -> Result<Grid, Fault> {
    let mut archive = ZipArchive::new(Cursor::new(bytes)).map_err(damaged)?;
    let (entries, listed) = list(&mut archive)?;
    let matrix = choose::matrix(&listed, wanted)?;
    let values = {
        let mut array = open(&mut archive, entries[matrix])?;
        array.header.matrix(&mut array.from, array.there)?
    };
    let (row_labels, column_labels) =
        choose::labels(&listed, wanted, values.dim(), place, |labels| {
            let mut array = open(&mut archive, entries[labels])?;
            array.header.texts(&mut array.from, array.there)
        })?;
    Ok(Grid {
        file: place.file.clone(),
        row_labels,
        column_labels,
        values,
        origin: Origin::Array(place.clone().array(&listed[matrix].name)),
    })
}

/// The arrays of an archive.
///
/// # Errors
/// [`Fault`] where the archive is damaged or holds none.
pub fn arrays(bytes: &[u8]) -> Result<Vec<Listed>, Fault> {
    let mut archive = ZipArchive::new(Cursor::new(bytes)).map_err(damaged)?;
    list(&mut archive).map(|(_, listed)| listed)
}

/// All arrays: their places in the archive and what they can be.
fn list(archive: &mut Archive<'_>) -> Result<(Vec<usize>, Vec<Listed>), Fault> {
    let (mut entries, mut listed, mut others) = (Vec::new(), Vec::new(), Vec::new());
    for at in 0..archive.len() {
        let mut file = archive.by_index(at).map_err(damaged)?;
        let name = file.name().map_err(damaged)?.into_owned();
        let Some(name) = name.strip_suffix(".npy") else {
            others.push(name);
            continue;
        };
        listed.push(Listed {
            name: name.to_owned(),
            content: Header::read(&mut file)?.content(),
        });
        entries.push(at);
    }
    if entries.is_empty() {
        return Err(Fault::ZipWithoutArrays { names: others });
    }
    Ok((entries, listed))
}

/// An array at its first element, and how many bytes follow.
struct Opened<'a, 'b> {
    header: Header,
    from: ZipFile<'a, Cursor<&'b [u8]>>,
    there: u64,
}

fn open<'a, 'b>(archive: &'a mut Archive<'b>, at: usize) -> Result<Opened<'a, 'b>, Fault> {
    let mut from = archive.by_index(at).map_err(damaged)?;
    let allowed = Inflated::of(usize::try_from(from.compressed_size()).unwrap_or(usize::MAX));
    if from.size() > allowed.most {
        return Err(Fault::InflatesBeyond(allowed));
    }
    let header = Header::read(&mut from)?;
    let there = from.size().saturating_sub(header.length);
    Ok(Opened {
        header,
        from,
        there,
    })
}

fn damaged(error: impl std::fmt::Display) -> Fault {
    Fault::Damaged(error.to_string())
}
