//! What a file is by what it holds: a matrix in any format, a landmark table, a table of
//! parcels, a list of labels or none of these. For guesses only; the readers judge.

use std::collections::{HashMap, HashSet};
use std::path::Path;

use super::delimited::{self, Table};
use super::error::Problem;
use super::formats::{self, edges, Content, Kind, Listed, Wanted};
use super::grid::{Grid, Label};
use super::parcel_table;
use super::source::{Bytes, Source};
use crate::domain::{Side, WeightKind};

/// Rows below which numbers are not taken for a matrix.
const FEWEST_ROWS: usize = 3;
/// Fewest rows of numbers without labels on both axes: with fewer parcels there is nothing to do.
const FEWEST_BARE_ROWS: usize = 4;
/// Share of row labels that must be column labels as well.
const SHARED_LABELS: f64 = 0.5;
/// Words in the name of the array that is the matrix, likeliest first.
const MATRIX_WORDS: [&str; 6] = [
    "connect",
    "weight",
    "matrix",
    "adjacency",
    "strength",
    "count",
];
/// Words in the name of the array that holds its labels.
const LABEL_WORDS: [&str; 5] = ["label", "name", "parcel", "region", "roi"];

/// What a file looks like.
#[derive(Debug, Clone, PartialEq)]
pub enum Looks {
    /// A square matrix.
    Matrix(Box<MatrixLooks>),
    /// A landmark table.
    Landmarks(LandmarkLooks),
    /// A table of parcels.
    Parcels(ParcelLooks),
    /// Labels, one a line.
    Labels(Vec<String>),
    /// None of these; the reason in words.
    Neither(String),
}

/// How a matrix is stored.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Form {
    /// A table of text.
    Table,
    /// A list of connections.
    Connections,
    /// One NumPy array.
    Npy,
    /// Several NumPy arrays.
    Npz,
    /// MATLAB.
    Mat,
    /// CIFTI-2 of parcels.
    Cifti,
}

/// A file that looks like a matrix.
#[derive(Debug, Clone, PartialEq)]
pub struct MatrixLooks {
    /// How it is stored.
    pub form: Form,
    /// Its rows, as far as they could be counted.
    pub rows: usize,
    /// Labels of its rows, where it carries them.
    pub labels: Option<Vec<String>>,
    /// Array that is the matrix, where the file must be told.
    pub variable: Option<Pick>,
    /// Array that holds the labels, where the file must be told.
    pub label_variable: Option<Pick>,
    /// Every finite number off the diagonal.
    pub off_diagonal: Vec<f64>,
    /// Whether the diagonal holds ones and nothing else.
    pub ones_on_diagonal: bool,
}

/// An array that was picked among several.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Pick {
    /// Its name.
    pub name: String,
    /// Names of those that might be meant as well.
    pub others: Vec<String>,
}

/// A table that looks like a landmark table.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct LandmarkLooks {
    /// Rows below the header.
    pub rows: usize,
    /// What the column of species a names.
    pub a: Vec<String>,
    /// What the column of species b names.
    pub b: Vec<String>,
}

/// A table that looks like a table of parcels.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct ParcelLooks {
    /// The labels it describes.
    pub labels: Vec<String>,
}

impl LandmarkLooks {
    /// What the column of a species names.
    #[must_use]
    pub fn column(&self, side: Side) -> &[String] {
        match side {
            Side::A => &self.a,
            Side::B => &self.b,
        }
    }
}

/// Whether a file is binary in a format of matrices, by its first bytes; those of text say nothing.
/// `None` where it cannot be read.
#[must_use]
pub fn is_binary(path: &Path) -> Option<bool> {
    formats::kind_of_file(path).map(|kind| kind != Kind::Text)
}

/// Looks at a file of any format.
#[must_use]
pub fn recognise(path: &Path) -> Looks {
    match look(path) {
        Ok(looks) => looks,
        Err(problem) => Looks::Neither(problem.to_string()),
    }
}

fn look(path: &Path) -> Result<Looks, Problem> {
    // Images are large, and their first bytes say that they are images.
    match formats::kind_of_file(path) {
        Some(Kind::Hdf5) => return Err(formats::Fault::Hdf5.into()),
        Some(Kind::Nifti1) => return Err(formats::Fault::Nifti1.into()),
        _ => {}
    }
    let (kind, bytes) = Bytes::read(path)
        .and_then(formats::plain)
        .map_err(|e| *e.problem)?;
    let form = match kind {
        Kind::Npy => Form::Npy,
        Kind::Zip => Form::Npz,
        Kind::Mat => Form::Mat,
        Kind::Nifti2 => Form::Cifti,
        Kind::Text | Kind::Gzip | Kind::Hdf5 | Kind::Nifti1 => {
            return Ok(text(&Source::of(bytes).map_err(|e| *e.problem)?));
        }
    };
    let arrays = formats::arrays(kind, &bytes.bytes)?;
    let (variable, label_variable) = picks(&arrays);
    let wanted = Wanted {
        variable: variable.as_ref().map(|pick| pick.name.as_str()),
        label_variable: label_variable.as_ref().map(|pick| pick.name.as_str()),
        ..NOTHING
    };
    let grid = formats::read(bytes, &wanted).map_err(|e| *e.problem)?;
    Ok(of_grid(form, grid, variable, label_variable))
}

/// Nothing is known yet of a file that is looked at.
const NOTHING: Wanted<'static> = Wanted {
    weights: WeightKind::Other,
    variable: None,
    label_variable: None,
    labels: None,
};

/// The array that is the matrix, and the one that holds its labels, where there are several that a
/// reader would not choose among.
fn picks(arrays: &[Listed]) -> (Option<Pick>, Option<Pick>) {
    let size = |array: &Listed| match array.content {
        Content::Matrix { rows, columns } if rows > 1 && columns > 1 => Some((rows, columns)),
        _ => None,
    };
    let matrices: Vec<&Listed> = arrays.iter().filter(|a| size(a).is_some()).collect();
    let square: Vec<&Listed> = matrices
        .iter()
        .copied()
        .filter(|a| size(a).is_some_and(|(rows, columns)| rows == columns))
        .collect();
    let Some(matrix) = likeliest(&square, &MATRIX_WORDS) else {
        return (None, None);
    };
    let rows = size(matrix).map_or(0, |(rows, _)| rows);
    let lists: Vec<&Listed> = arrays
        .iter()
        .filter(|a| a.content == Content::Labels(rows))
        .collect();
    let pick = |among: &[&Listed], chosen: &Listed| Pick {
        name: chosen.name.clone(),
        others: among
            .iter()
            .filter(|a| a.name != chosen.name)
            .map(|a| a.name.clone())
            .collect(),
    };
    let variable = (matrices.len() > 1).then(|| pick(&square, matrix));
    let label_variable = likeliest(&lists, &LABEL_WORDS)
        .filter(|_| lists.len() > 1)
        .map(|list| pick(&lists, list));
    (variable, label_variable)
}

/// The array whose name has the earliest of these words; else the first.
fn likeliest<'a>(arrays: &[&'a Listed], words: &[&str]) -> Option<&'a Listed> {
    let place = |array: &Listed| {
        let name = array.name.to_lowercase();
        let at = words.iter().position(|word| name.contains(word));
        at.unwrap_or(words.len())
    };
    arrays.iter().copied().min_by_key(|array| place(array))
}

fn of_grid(form: Form, grid: Grid, variable: Option<Pick>, label_variable: Option<Pick>) -> Looks {
    let (rows, columns) = grid.values.dim();
    if rows != columns || rows < FEWEST_BARE_ROWS {
        return Looks::Neither(format!(
            "it holds {rows} rows and {columns} columns of numbers, no square matrix of parcels"
        ));
    }
    let texts = |labels: &Vec<Label>| -> Vec<String> {
        labels.iter().map(|label| label.text.clone()).collect()
    };
    let of_rows = grid.row_labels.as_ref().map(texts);
    let of_columns = grid.column_labels.as_ref().map(texts);
    let is_diagonal = |i: usize, j: usize| match (&of_rows, &of_columns) {
        (Some(rows), Some(columns)) => rows[i] == columns[j],
        _ => i == j,
    };
    let (mut off_diagonal, mut diagonal) = (Vec::new(), Vec::new());
    for ((i, j), &value) in grid.values.indexed_iter() {
        if !value.is_finite() {
            continue;
        }
        if is_diagonal(i, j) {
            diagonal.push(value);
        } else {
            off_diagonal.push(value);
        }
    }
    Looks::Matrix(Box::new(MatrixLooks {
        form,
        rows,
        labels: of_rows.or(of_columns),
        variable,
        label_variable,
        off_diagonal,
        ones_on_diagonal: all_ones(&diagonal),
    }))
}

fn all_ones(diagonal: &[f64]) -> bool {
    !diagonal.is_empty() && diagonal.iter().all(|w| *w == 1.0)
}

/// Looks at a text.
fn text(source: &Source) -> Looks {
    let table = match delimited::parse(source) {
        Ok(table) => table,
        Err(fault) if *fault.problem == Problem::OneColumn => return label_list(source),
        // Labels may hold the separators of tables, and then not all as many.
        Err(fault) => {
            return match label_list(source) {
                Looks::Labels(labels) if are_words(&labels) => Looks::Labels(labels),
                _ => Looks::Neither(fault.problem.to_string()),
            }
        }
    };
    if let Some(landmarks) = landmark_table(&table) {
        return Looks::Landmarks(landmarks);
    }
    if edges::is_list(&table.header) {
        return connections(source);
    }
    if let Some(looks) = labelled(&table) {
        return Looks::Matrix(Box::new(looks));
    }
    // Only what is no matrix: parcels may be called x, y and z.
    if let Some(labels) = parcel_table::looks(&table) {
        return Looks::Parcels(ParcelLooks { labels });
    }
    let not_both = "its rows and columns do not name the same parcels";
    match formats::text(source, &NOTHING) {
        Ok(grid) if grid.row_labels.is_none() || grid.column_labels.is_none() => {
            of_grid(Form::Table, grid, None, None)
        }
        _ => Looks::Neither(not_both.to_owned()),
    }
}

/// A list of connections; its parcels are those that occur. A fault in it is for the reader to tell.
fn connections(source: &Source) -> Looks {
    let Ok(grid) = formats::text(source, &NOTHING) else {
        return Looks::Matrix(Box::new(MatrixLooks {
            form: Form::Connections,
            rows: 0,
            labels: Some(Vec::new()),
            variable: None,
            label_variable: None,
            off_diagonal: Vec::new(),
            ones_on_diagonal: false,
        }));
    };
    of_grid(Form::Connections, grid, None, None)
}

/// A table whose rows and columns name the same parcels, for the most part; its cells may hold faults.
fn labelled(table: &Table) -> Option<MatrixLooks> {
    let columns: HashSet<&str> = table.header.cells.iter().skip(1).collect();
    let labels: Vec<String> = table
        .rows
        .iter()
        .map(|row| row.cells.get(0).unwrap_or("").to_owned())
        .collect();
    let shared = labels
        .iter()
        .filter(|l| columns.contains(l.as_str()))
        .count();
    if labels.len() < FEWEST_ROWS || (shared as f64) < SHARED_LABELS * labels.len() as f64 {
        return None;
    }
    let (mut off_diagonal, mut diagonal) = (Vec::new(), Vec::new());
    for row in &table.rows {
        let label = row.cells.get(0).unwrap_or("");
        for (column, cell) in table.header.cells.iter().zip(&row.cells).skip(1) {
            if let Some(w) = cell.parse::<f64>().ok().filter(|w| w.is_finite()) {
                if column == label {
                    diagonal.push(w);
                } else {
                    off_diagonal.push(w);
                }
            }
        }
    }
    Some(MatrixLooks {
        form: Form::Table,
        rows: labels.len(),
        labels: Some(labels),
        variable: None,
        label_variable: None,
        off_diagonal,
        ones_on_diagonal: all_ones(&diagonal),
    })
}

/// Different words, one a line; a column of measures is none.
fn label_list(source: &Source) -> Looks {
    let labels = super::label_file::labels_of(source);
    let distinct: HashSet<&str> = labels.iter().map(|l| l.text.as_str()).collect();
    let is_measure = |text: &str| text.parse::<f64>().is_ok_and(|x| x.fract() != 0.0);
    if labels.len() < FEWEST_ROWS
        || distinct.len() < labels.len()
        || distinct.contains("")
        || labels.iter().any(|l| is_measure(&l.text))
    {
        return Looks::Neither("neither a table nor different labels, one a line".to_owned());
    }
    Looks::Labels(labels.into_iter().map(|l| l.text).collect())
}

/// Whether no part of any label is a number, as the cells of a table would be.
fn are_words(labels: &[String]) -> bool {
    let is_number = |cell: &str| cell.trim().parse::<f64>().is_ok();
    let mut cells = labels
        .iter()
        .flat_map(|label| label.split([',', ';', '\t']));
    !cells.any(is_number)
}

/// The columns landmark, a and b, in any spelling: the reader will say if it is the wrong one.
fn landmark_table(table: &Table) -> Option<LandmarkLooks> {
    let columns: HashMap<String, usize> = table
        .header
        .cells
        .iter()
        .enumerate()
        .map(|(at, name)| (name.to_lowercase(), at))
        .collect();
    columns.get("landmark")?;
    let parcels = |column: &str| -> Option<Vec<String>> {
        let at = *columns.get(column)?;
        let cells = table.rows.iter().filter_map(|row| row.cells.get(at));
        let names = cells.flat_map(|cell| cell.split(';').map(str::trim));
        Some(names.filter(|n| !n.is_empty()).map(str::to_owned).collect())
    };
    Some(LandmarkLooks {
        rows: table.rows.len(),
        a: parcels("a")?,
        b: parcels("b")?,
    })
}
