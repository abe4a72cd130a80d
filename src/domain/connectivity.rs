//! One species' connectivity: who connects to whom, how strongly, and what was not observed.

use std::collections::HashMap;

use ndarray::Array2;
use thiserror::Error;

/// Labels, weights or mask of a connectivity that do not fit together.
#[derive(Debug, Clone, PartialEq, Eq, Error)]
pub enum ShapeError {
    /// Another number of labels than rows or columns.
    #[error("{labels} labels for {entries} {axis}")]
    Labels {
        /// `rows` or `columns`.
        axis: &'static str,
        /// Labels given.
        labels: usize,
        /// Rows or columns of the matrix.
        entries: usize,
    },
    /// A mask of another shape than the weights.
    #[error("the mask is {found:?}, the matrix {expected:?}")]
    Mask {
        /// Shape of the weights.
        expected: (usize, usize),
        /// Shape of the mask.
        found: (usize, usize),
    },
}

/// Connection weights between rows and columns, each with labels of its own: sources and targets as
/// read, parcels and the entries of their profiles once arranged.
///
/// Row labels and column labels are kept apart because tracer data are rectangular, and a mask
/// tells entries that were never observed from absent connections. A row and a column of one label
/// are one parcel.
#[derive(Debug, Clone, PartialEq)]
pub struct Connectivity {
    row_labels: Vec<String>,
    column_labels: Vec<String>,
    weights: Array2<f64>,
    missing: Option<Array2<bool>>,
    /// For each column the row with the same label: the same parcel.
    row_of_column: Vec<Option<usize>>,
}

impl Connectivity {
    /// Puts labels, weights `(rows, columns)` and the mask of missing entries together; `None`
    /// means that every entry was observed.
    ///
    /// # Errors
    /// [`ShapeError`] where the sizes disagree.
    pub fn new(
        row_labels: Vec<String>,
        column_labels: Vec<String>,
        weights: Array2<f64>,
        missing: Option<Array2<bool>>,
    ) -> Result<Self, ShapeError> {
        for (axis, labels, entries) in [
            ("rows", row_labels.len(), weights.nrows()),
            ("columns", column_labels.len(), weights.ncols()),
        ] {
            if labels != entries {
                return Err(ShapeError::Labels {
                    axis,
                    labels,
                    entries,
                });
            }
        }
        if let Some(mask) = &missing {
            if mask.dim() != weights.dim() {
                return Err(ShapeError::Mask {
                    expected: weights.dim(),
                    found: mask.dim(),
                });
            }
        }
        Ok(Connectivity {
            row_of_column: same_label(&row_labels, &column_labels),
            row_labels,
            column_labels,
            weights,
            missing: missing.filter(|mask| mask.iter().any(|missing| *missing)),
        })
    }

    /// Labels of the rows.
    #[must_use]
    pub fn row_labels(&self) -> &[String] {
        &self.row_labels
    }

    /// Labels of the columns.
    #[must_use]
    pub fn column_labels(&self) -> &[String] {
        &self.column_labels
    }

    /// Weights `(rows, columns)`; entries that are missing hold no meaning.
    #[must_use]
    pub fn weights(&self) -> &Array2<f64> {
        &self.weights
    }

    /// The weights, to be changed in place; their shape stays.
    pub(crate) fn weights_mut(&mut self) -> ndarray::ArrayViewMut2<'_, f64> {
        self.weights.view_mut()
    }

    /// Whether the entry was never observed, so that its weight must not be read.
    #[must_use]
    pub fn is_missing(&self, row: usize, column: usize) -> bool {
        self.missing.as_ref().is_some_and(|m| m[(row, column)])
    }

    /// Whether any entry was never observed.
    #[must_use]
    pub fn has_missing(&self) -> bool {
        self.missing.is_some()
    }

    /// Whether rows and columns are the same parcels in the same order.
    #[must_use]
    pub fn is_square(&self) -> bool {
        self.row_labels.len() == self.column_labels.len()
            && (0..)
                .zip(&self.row_of_column)
                .all(|(at, row)| *row == Some(at))
    }

    /// The row that is the same parcel as a column, where there is one.
    #[must_use]
    pub fn row_of_column(&self, column: usize) -> Option<usize> {
        self.row_of_column[column]
    }

    /// Whether the entry is the diagonal, which is not data: a parcel's link with itself.
    #[must_use]
    pub fn is_self(&self, row: usize, column: usize) -> bool {
        self.row_of_column[column] == Some(row)
    }

    /// Whether the entry is data: observed, and not a parcel's link with itself.
    #[must_use]
    pub fn is_data(&self, row: usize, column: usize) -> bool {
        !self.is_self(row, column) && !self.is_missing(row, column)
    }

    /// Number of entries that were never observed.
    #[must_use]
    pub fn missing(&self) -> usize {
        self.missing
            .as_ref()
            .map_or(0, |mask| mask.iter().filter(|missing| **missing).count())
    }

    /// The same data with rows and columns exchanged.
    #[must_use]
    pub fn transposed(self) -> Connectivity {
        let weights = self.weights.reversed_axes();
        let missing = self.missing.map(|mask| mask.reversed_axes());
        Connectivity {
            row_of_column: same_label(&self.column_labels, &self.row_labels),
            row_labels: self.column_labels,
            column_labels: self.row_labels,
            weights: weights.as_standard_layout().into_owned(),
            missing: missing.map(|mask| mask.as_standard_layout().into_owned()),
        }
    }

    /// Fills in a missing entry.
    pub(crate) fn observe(&mut self, row: usize, column: usize, weight: f64) {
        self.weights[(row, column)] = weight;
        if let Some(mask) = &mut self.missing {
            mask[(row, column)] = false;
        }
    }

    /// Forgets the mask once nothing is missing any more.
    pub(crate) fn settle_mask(&mut self) {
        self.missing = self
            .missing
            .take()
            .filter(|mask| mask.iter().any(|missing| *missing));
    }

    /// Sets every entry that is no data to zero: missing ones and the diagonal.
    pub(crate) fn clear_what_is_no_data(&mut self) {
        let (rows, columns) = self.weights.dim();
        for i in 0..rows {
            for j in 0..columns {
                if !self.is_data(i, j) {
                    self.weights[(i, j)] = 0.0;
                }
            }
        }
    }

    /// The same data with the named rows and columns only, in the order given.
    #[must_use]
    pub fn select(&self, rows: &[usize], columns: &[usize]) -> Connectivity {
        let pick =
            |labels: &[String], at: &[usize]| at.iter().map(|&i| labels[i].clone()).collect();
        let (row_labels, column_labels): (Vec<String>, Vec<String>) = (
            pick(&self.row_labels, rows),
            pick(&self.column_labels, columns),
        );
        Connectivity {
            row_of_column: same_label(&row_labels, &column_labels),
            row_labels,
            column_labels,
            weights: Array2::from_shape_fn((rows.len(), columns.len()), |(i, j)| {
                self.weights[(rows[i], columns[j])]
            }),
            missing: self
                .missing
                .as_ref()
                .map(|mask| {
                    Array2::from_shape_fn((rows.len(), columns.len()), |(i, j)| {
                        mask[(rows[i], columns[j])]
                    })
                })
                .filter(|mask| mask.iter().any(|missing| *missing)),
        }
    }
}

/// For each column the row with the same label.
fn same_label(rows: &[String], columns: &[String]) -> Vec<Option<usize>> {
    let at: HashMap<&str, usize> = rows.iter().map(String::as_str).zip(0..).collect();
    columns
        .iter()
        .map(|label| at.get(label.as_str()).copied())
        .collect()
}
