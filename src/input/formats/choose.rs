//! Which array of a file is the matrix, and which holds its labels.

use super::{Fault, Wanted};
use crate::input::error::Place;
use crate::input::grid::Label;
use crate::input::nearest::nearest_few;

/// An array as its header describes it.
#[derive(Debug, Clone)]
pub struct Listed {
    /// Its name.
    pub name: String,
    /// What it can be.
    pub content: Content,
}

/// What an array can be.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Content {
    /// Real numbers in rows and columns.
    Matrix {
        /// Rows.
        rows: u64,
        /// Columns.
        columns: u64,
    },
    /// So many labels.
    Labels(u64),
    /// Neither; what, in words.
    Other(String),
}

impl Content {
    fn describe(&self) -> String {
        match self {
            Content::Matrix { rows, columns } => format!("{rows} x {columns} numbers"),
            Content::Labels(1) => "1 text".to_owned(),
            Content::Labels(labels) => format!("{labels} texts"),
            Content::Other(what) => what.clone(),
        }
    }
}

/// The array that is the matrix: the one named, else the only matrix.
///
/// # Errors
/// [`Fault`] where there is none, or more than one.
pub fn matrix(arrays: &[Listed], wanted: &Wanted<'_>) -> Result<usize, Fault> {
    if let Some(name) = wanted.variable {
        let at = named(arrays, "variable", name)?;
        return match &arrays[at].content {
            Content::Matrix { .. } => Ok(at),
            other => Err(Fault::WrongArray {
                key: "variable",
                name: name.to_owned(),
                found: other.describe(),
                expected: "real numbers in rows and columns",
            }),
        };
    }
    // Single numbers and lists are often stored with two axes.
    let matrices: Vec<usize> = all(
        arrays,
        |c| matches!(c, Content::Matrix { rows, columns } if *rows > 1 && *columns > 1),
    );
    match matrices[..] {
        [] => Err(Fault::NoMatrix {
            known: known(arrays),
        }),
        [at] => Ok(at),
        _ => Err(Fault::SeveralArrays {
            what: "matrices",
            key: "variable",
            names: matrices.iter().map(|&i| arrays[i].name.clone()).collect(),
        }),
    }
}

/// Labels of rows and of columns, where a file holds them.
pub type Found = (Option<Vec<Label>>, Option<Vec<Label>>);

/// Labels of the rows and of the columns, as far as the file holds them: the array named, else the
/// only one of the right length. `read` gives the texts of an array.
///
/// # Errors
/// [`Fault`] where the one named does not fit, several fit, or the texts cannot be read.
pub fn labels(
    arrays: &[Listed],
    wanted: &Wanted<'_>,
    (rows, columns): (usize, usize),
    place: &Place,
    mut read: impl FnMut(usize) -> Result<Vec<String>, Fault>,
) -> Result<Found, Fault> {
    let named = match wanted.label_variable {
        None => None,
        Some(name) => Some(labels_named(arrays, name, (rows, columns))?),
    };
    let fits = |length: usize| -> Result<Option<usize>, Fault> {
        let wanted_length = Content::Labels(length as u64);
        if named.is_some_and(|at| arrays[at].content == wanted_length) {
            return Ok(named);
        }
        let fitting = all(arrays, |c| *c == wanted_length);
        match fitting[..] {
            [] => Ok(None),
            [at] => Ok(Some(at)),
            _ if wanted.labels.is_some() => Ok(None),
            _ => Err(Fault::SeveralArrays {
                what: "lists of labels that fit",
                key: "label-variable",
                names: fitting.iter().map(|&i| arrays[i].name.clone()).collect(),
            }),
        }
    };
    let mut take = |length: usize| -> Result<Option<Vec<Label>>, Fault> {
        let Some(at) = fits(length)? else {
            return Ok(None);
        };
        Ok(Some(Label::of_array(read(at)?, place, &arrays[at].name)))
    };
    let of_rows = take(rows)?;
    // Of a square matrix rows and columns are the same parcels.
    let of_columns = if rows == columns {
        None
    } else {
        take(columns)?
    };
    Ok((of_rows, of_columns))
}

/// The array of labels that is named, if it fits rows or columns.
fn labels_named(
    arrays: &[Listed],
    name: &str,
    (rows, columns): (usize, usize),
) -> Result<usize, Fault> {
    let at = named(arrays, "label-variable", name)?;
    match &arrays[at].content {
        Content::Labels(found) if [rows as u64, columns as u64].contains(found) => Ok(at),
        Content::Labels(found) => Err(Fault::LabelArrayCount {
            name: name.to_owned(),
            found: usize::try_from(*found).unwrap_or(usize::MAX),
            rows,
        }),
        other => Err(Fault::WrongArray {
            key: "label-variable",
            name: name.to_owned(),
            found: other.describe(),
            expected: "a list of texts",
        }),
    }
}

fn all(arrays: &[Listed], is: impl Fn(&Content) -> bool) -> Vec<usize> {
    (0..arrays.len())
        .filter(|&i| is(&arrays[i].content))
        .collect()
}

fn named(arrays: &[Listed], key: &'static str, name: &str) -> Result<usize, Fault> {
    arrays
        .iter()
        .position(|a| a.name == name)
        .ok_or_else(|| Fault::NoSuchArray {
            key,
            found: name.to_owned(),
            near: nearest_few(name, arrays.iter().map(|a| a.name.as_str()))
                .into_iter()
                .map(str::to_owned)
                .collect(),
            known: known(arrays),
        })
}

fn known(arrays: &[Listed]) -> Vec<String> {
    arrays
        .iter()
        .map(|a| format!("{} ({})", a.name, a.content.describe()))
        .collect()
}
