//! What a table is by its looks: a matrix, a landmark table, a table of parcels or none. For guesses only; the
//! readers judge.

use std::collections::{HashMap, HashSet};

use super::delimited::{self, Table};
use super::error::InputError;
use super::matrix;
use super::parcel_table;
use super::source::Source;
use crate::domain::{Connectivity, WeightKind};

/// Rows below which a table of numbers is not taken for a matrix.
const FEWEST_ROWS: usize = 3;
/// Share of row labels that must be column labels as well.
const SHARED_LABELS: f64 = 0.5;

/// What a table looks like.
#[derive(Debug, Clone, PartialEq)]
pub enum Looks {
    /// A labelled square matrix.
    Matrix(Box<MatrixLooks>),
    /// A landmark table.
    Landmarks(LandmarkLooks),
    /// A table of parcels.
    Parcels(ParcelLooks),
    /// None of them; the reason in words.
    Neither(String),
}

/// A table that looks like a matrix.
#[derive(Debug, Clone, PartialEq)]
pub struct MatrixLooks {
    /// Labels of its rows.
    pub labels: Vec<String>,
    /// Every finite number off the diagonal.
    pub off_diagonal: Vec<f64>,
    /// Whether the diagonal holds ones and nothing else.
    pub ones_on_diagonal: bool,
    /// The matrix, or what keeps it from being read.
    pub read: Result<Connectivity, InputError>,
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

/// Looks at a table.
#[must_use]
pub fn recognise(source: &Source) -> Looks {
    let table = match delimited::parse(source) {
        Ok(table) => table,
        Err(fault) => return Looks::Neither(fault.problem.to_string()),
    };
    if let Some(landmarks) = landmark_table(&table) {
        return Looks::Landmarks(landmarks);
    }
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
        // Only what is no matrix: parcels may be called x, y and z.
        if let Some(labels) = parcel_table::looks(&table) {
            return Looks::Parcels(ParcelLooks { labels });
        }
        return Looks::Neither("its rows and columns do not name the same parcels".to_owned());
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
    Looks::Matrix(Box::new(MatrixLooks {
        labels,
        off_diagonal,
        ones_on_diagonal: !diagonal.is_empty() && diagonal.iter().all(|w| *w == 1.0),
        read: matrix::read(source, WeightKind::Other, "").map(|(network, _)| network),
    }))
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
