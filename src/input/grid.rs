//! A table of numbers as its file gives it, whatever the format: the one thing all readers return
//! and all checks start from.

use std::collections::HashMap;
use std::path::PathBuf;

use ndarray::Array2;

use super::delimited::Row;
use super::error::Place;

/// A label and where it stands.
#[derive(Debug, Clone)]
pub struct Label {
    /// The label.
    pub text: String,
    /// Where it stands.
    pub place: Place,
}

impl Label {
    /// Labels from an array of a file.
    #[must_use]
    pub fn of_array(texts: Vec<String>, file: &Place, array: &str) -> Vec<Label> {
        let place = file.clone().array(array);
        Label::in_rows(texts, &place)
    }

    /// Labels of which each stands in a row of its own.
    #[must_use]
    pub fn in_rows(texts: Vec<String>, place: &Place) -> Vec<Label> {
        texts
            .into_iter()
            .enumerate()
            .map(|(at, text)| Label {
                text: text.trim().to_owned(),
                place: place.clone().row(at + 1),
            })
            .collect()
    }
}

/// Numbers in rows and columns, nothing about them checked.
#[derive(Debug)]
pub struct Grid {
    /// The file.
    pub file: PathBuf,
    /// Labels of the rows, where the file holds them.
    pub row_labels: Option<Vec<Label>>,
    /// Labels of the columns, where the file holds them.
    pub column_labels: Option<Vec<Label>>,
    /// The numbers `(rows, columns)`; missing ones are NaN.
    pub values: Array2<f64>,
    /// Where each number stands.
    pub origin: Origin,
}

/// Where the numbers of a grid stand in its file.
#[derive(Debug)]
pub enum Origin {
    /// In lines of a text.
    Lines {
        /// The lines that hold numbers.
        rows: Vec<Row>,
        /// Cells of each before the first number.
        skip: usize,
    },
    /// Each pair on a line of its own.
    Pairs {
        /// The lines.
        rows: Vec<Row>,
        /// Cell of a line that holds the number.
        cell: usize,
        /// The line of each pair, by row and column of the grid.
        at: HashMap<(usize, usize), usize>,
    },
    /// In an array without lines.
    Array(Place),
}

impl Grid {
    /// Where an entry stands.
    #[must_use]
    pub fn place(&self, row: usize, column: usize) -> Place {
        match &self.origin {
            Origin::Lines { rows, skip } => {
                Place::line(&self.file, rows[row].line).column(skip + column + 1)
            }
            Origin::Pairs { rows, cell, at } => match at.get(&(row, column)) {
                Some(&line) => Place::line(&self.file, rows[line].line).column(cell + 1),
                None => Place::file(&self.file),
            },
            Origin::Array(place) => place.clone().row(row + 1).column(column + 1),
        }
    }

    /// An entry as it is spelt in the file.
    #[must_use]
    pub fn spelling(&self, row: usize, column: usize) -> String {
        let cell = match &self.origin {
            Origin::Lines { rows, skip } => rows[row].cells.get(skip + column),
            Origin::Pairs { rows, cell, at } => at
                .get(&(row, column))
                .and_then(|line| rows[*line].cells.get(*cell)),
            Origin::Array(_) => None,
        };
        cell.map_or_else(|| self.values[(row, column)].to_string(), str::to_owned)
    }
}
