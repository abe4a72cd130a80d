//! From a grid of any format to a checked connectivity whose rows are parcels.

mod lines;

use std::path::Path;

use ndarray::Array2;

use super::error::{InputError, Place, Problem};
use super::formats::{self, Fault, Wanted};
use super::grid::{Grid, Origin};
use super::label_file::{self, LabelFile};
use super::source::{Bytes, InputFile, Source};
use super::study_file::SpeciesFile;
use crate::domain::{Connectivity, RowsAre, Tracer, WeightKind};
use crate::warning::Warning;
use lines::{Given, Lines, Shape};

/// A species' matrix as read, and the files it was read from.
#[derive(Debug, Clone)]
pub struct Matrix {
    /// The matrix; its rows are the parcels.
    pub network: Connectivity,
    /// What its rows are; sources where it is square.
    pub rows_are: RowsAre,
    /// What is legal but suspicious.
    pub warnings: Vec<Warning>,
    /// The file of the matrix.
    pub file: InputFile,
    /// The files of its labels, where they have one of their own.
    pub labels: Vec<InputFile>,
}

/// What the study says about the numbers of a matrix.
struct Stated<'s> {
    species: &'s str,
    weights: WeightKind,
    rows: Option<RowsAre>,
    tracer: Option<Tracer>,
}

/// Reads matrices of one species in any format, recognised by what a file holds.
pub struct Reader<'d> {
    described: &'d SpeciesFile,
    labels: Option<LabelFile>,
    column_labels: Option<LabelFile>,
}

/// Reads a species' matrix.
///
/// # Errors
/// [`InputError`] with the place and parcel for anything that is not a matrix of weights of the kind
/// stated, between parcels or from parcels to some of them.
pub fn read_of(described: &SpeciesFile, matrix: &Path) -> Result<Matrix, InputError> {
    Reader::new(described)?.file(matrix)
}

impl<'d> Reader<'d> {
    /// Reads the files of labels, where there are any.
    ///
    /// # Errors
    /// [`InputError`] where they cannot be read.
    pub fn new(described: &'d SpeciesFile) -> Result<Reader<'d>, InputError> {
        let read = |path: &Option<_>| path.as_deref().map(label_file::read).transpose();
        Ok(Reader {
            labels: read(&described.labels)?,
            column_labels: read(&described.column_labels)?,
            described,
        })
    }

    /// Reads a file.
    ///
    /// # Errors
    /// As [`read_of`].
    pub fn file(&self, path: &Path) -> Result<Matrix, InputError> {
        let described = self.described;
        let bytes = Bytes::read(path)?;
        let file = bytes.file.clone();
        let wanted = Wanted {
            weights: described.weights,
            variable: described.variable.as_deref(),
            label_variable: described.label_variable.as_deref(),
            labels: self.labels.as_ref().map(|l| l.labels.as_slice()),
        };
        self.grid(formats::read(bytes, &wanted)?, file)
    }

    /// Checks what was read from a file.
    ///
    /// # Errors
    /// As [`read_of`].
    pub fn grid(&self, grid: Grid, file: InputFile) -> Result<Matrix, InputError> {
        let described = self.described;
        let given = Given {
            labels: self.labels.as_ref(),
            column_labels: self.column_labels.as_ref(),
            orientation_stated: described.rows.is_some() || described.tracer.is_some(),
        };
        let stated = Stated {
            species: &described.name,
            weights: described.weights,
            rows: described.rows,
            tracer: described.tracer,
        };
        let (network, rows_are, warnings) = settle(grid, given, &stated)?;
        Ok(Matrix {
            network,
            rows_are,
            warnings,
            file,
            labels: [&self.labels, &self.column_labels]
                .into_iter()
                .flatten()
                .map(|l| l.file.clone())
                .collect(),
        })
    }
}

/// Reads a matrix from a text that carries its labels.
///
/// # Errors
/// [`InputError`] with file, line, column and parcel for anything that is not a matrix of weights of
/// the kind stated.
pub fn read(
    source: &Source,
    weights: WeightKind,
    species: &str,
) -> Result<(Connectivity, Vec<Warning>), InputError> {
    let wanted = Wanted {
        weights,
        variable: None,
        label_variable: None,
        labels: None,
    };
    let stated = Stated {
        species,
        weights,
        rows: None,
        tracer: None,
    };
    let grid = formats::text(source, &wanted)?;
    let (network, _, warnings) = settle(grid, Given::default(), &stated)?;
    Ok((network, warnings))
}

/// Reads a grid whose rows and columns are the same parcels and whose numbers are of any kind, such as
/// distances; `None` where they are not the same.
///
/// # Errors
/// [`InputError`] with the place for labels and entries that are none.
pub(super) fn square(
    grid: Grid,
    labels: Option<&LabelFile>,
    species: &str,
) -> Result<Option<Connectivity>, InputError> {
    let given = Given {
        labels,
        ..Given::default()
    };
    let stated = Stated {
        species,
        weights: WeightKind::Other,
        rows: None,
        tracer: None,
    };
    let (network, _, _) = settle(grid, given, &stated)?;
    Ok(Some(network).filter(Connectivity::is_square))
}

/// Checks labels and entries, brings the columns of a square matrix into the order of the rows, and
/// turns the matrix so that its rows are parcels.
fn settle(
    mut grid: Grid,
    given: Given<'_>,
    stated: &Stated<'_>,
) -> Result<(Connectivity, RowsAre, Vec<Warning>), InputError> {
    let mut lines = Lines::settle(&mut grid, given)?;
    let is_list = matches!(grid.origin, Origin::Pairs { .. });
    if let (true, Some(RowsAre::Targets)) = (is_list, stated.rows) {
        return Err(InputError::new(
            Place::file(&grid.file),
            Fault::ListKnowsDirection.into(),
        ));
    }
    clear_diagonal(&mut grid, &lines);
    check_entries(&grid, &lines, stated.weights)?;

    let mut warnings = Vec::new();
    let mut values = std::mem::take(&mut grid.values);
    if !lines.column.iter().copied().eq(0..lines.column.len()) {
        warnings.push(Warning::ColumnsReordered {
            species: stated.species.to_owned(),
        });
        values = Array2::from_shape_fn(values.dim(), |(i, j)| values[(i, lines.column[j])]);
    }
    let any_missing = values.iter().any(|w| w.is_nan());
    let missing = any_missing.then(|| values.mapv(f64::is_nan));
    if any_missing {
        values.mapv_inplace(|w| if w.is_nan() { 0.0 } else { w });
    }
    let mut network = Connectivity::new(lines.rows, lines.columns, values, missing)
        .expect("rows, columns and labels were counted above");
    if let (Some(tracer), Origin::Pairs { at, .. }) = (stated.tracer, &grid.origin) {
        (network, lines.shape) = injected_only(network, tracer, at.keys().copied());
    }

    // Injected areas are on the shorter side, so that the tracer says what that side is.
    let shorter_is_columns = !matches!(lines.shape, Shape::RowsWithin | Shape::RowsElse);
    let by_tracer = stated.tracer.map(|tracer| match shorter_is_columns {
        true => tracer.injected().opposite(),
        false => tracer.injected(),
    });
    let rows = if is_list {
        Some(RowsAre::Sources)
    } else {
        stated.rows
    };
    if lines.shape == Shape::Square {
        let turned = rows == Some(RowsAre::Targets);
        let network = if turned {
            network.transposed()
        } else {
            network
        };
        return Ok((network, RowsAre::Sources, warnings));
    }
    let rows = rows.or(by_tracer).unwrap_or(RowsAre::Sources);
    if let (Some(tracer), true) = (stated.tracer, by_tracer != Some(rows)) {
        warnings.push(Warning::TracerAgainstShape {
            species: stated.species.to_owned(),
            tracer,
            injected: tracer.injected(),
        });
    }
    let (network, rows_are) = match shorter_is_columns {
        true => (network, rows),
        false => (network.transposed(), rows.opposite()),
    };
    warnings.push(Warning::Rectangular {
        species: stated.species.to_owned(),
        parcels: network.row_labels().len(),
        parcels_are: rows_are,
        entries: network.column_labels().len(),
        elsewhere: (0..network.column_labels().len())
            .filter(|&j| network.row_of_column(j).is_none())
            .count(),
        stated: given.orientation_stated,
    });
    Ok((network, rows_are, warnings))
}

/// Of a list of connections by tracer: on the injected side only the areas that it mentions there.
/// An area that was never injected has no line, which is no zero.
fn injected_only(
    network: Connectivity,
    tracer: Tracer,
    pairs: impl Iterator<Item = (usize, usize)>,
) -> (Connectivity, Shape) {
    let all: Vec<usize> = (0..network.row_labels().len()).collect();
    let mut mentioned = vec![false; all.len()];
    for (source, target) in pairs {
        match tracer.injected() {
            RowsAre::Sources => mentioned[source] = true,
            RowsAre::Targets => mentioned[target] = true,
        }
    }
    let injected: Vec<usize> = all.iter().copied().filter(|&i| mentioned[i]).collect();
    if injected.len() == all.len() {
        return (network, Shape::Square);
    }
    match tracer.injected() {
        RowsAre::Sources => (network.select(&injected, &all), Shape::RowsWithin),
        RowsAre::Targets => (network.select(&all, &injected), Shape::ColumnsWithin),
    }
}

/// The diagonal is no data and often holds no number.
fn clear_diagonal(grid: &mut Grid, lines: &Lines) {
    let values = &mut grid.values;
    let mut clear = |i: usize, j: usize| {
        if !values[(i, j)].is_finite() {
            values[(i, j)] = 0.0;
        }
    };
    if lines.shape == Shape::Square {
        for (i, &j) in lines.column.iter().enumerate() {
            clear(i, j);
        }
        return;
    }
    let row_of: std::collections::HashMap<&str, usize> =
        lines.rows.iter().map(String::as_str).zip(0..).collect();
    for (label, &j) in lines.columns.iter().zip(&lines.column) {
        if let Some(&i) = row_of.get(label.as_str()) {
            clear(i, j);
        }
    }
}

/// Sees that every entry off the diagonal is a weight, or missing.
fn check_entries(grid: &Grid, lines: &Lines, weights: WeightKind) -> Result<(), InputError> {
    for ((i, j), &value) in grid.values.indexed_iter() {
        let problem = if value.is_infinite() {
            Problem::Infinite {
                found: grid.spelling(i, j),
                logarithm: weights == WeightKind::Log10,
            }
        } else if value < 0.0 && weights.is_non_negative() {
            Problem::Negative {
                weights: weights.to_string(),
                found: value,
            }
        } else {
            continue;
        };
        let target = lines.column.iter().position(|&c| c == j).unwrap_or(j);
        let pair = format!("{} to {}", lines.rows[i], lines.columns[target]);
        return Err(InputError::new(grid.place(i, j).parcel(&pair), problem));
    }
    Ok(())
}
