//! From a grid of any format to a checked square connectivity; row = source, column = target.

use std::collections::{HashMap, HashSet};
use std::path::Path;

use ndarray::Array2;

use super::error::{InputError, Place, Problem};
use super::formats::{self, Fault, Wanted};
use super::grid::{Grid, Label};
use super::label_file::{self, LabelFile};
use super::nearest::nearest_few;
use super::source::{Bytes, InputFile, Source};
use super::study_file::SpeciesFile;
use crate::domain::{Connectivity, WeightKind};
use crate::warning::Warning;

/// A species' matrix as read, and the files it was read from.
#[derive(Debug, Clone)]
pub struct Matrix {
    /// The matrix.
    pub network: Connectivity,
    /// What is legal but suspicious.
    pub warnings: Vec<Warning>,
    /// The file of the matrix.
    pub file: InputFile,
    /// The file of its labels, where they have one of their own.
    pub labels: Option<InputFile>,
}

/// Reads a species' matrix in any format, recognised by what the file holds.
///
/// # Errors
/// [`InputError`] with the place and parcel for anything that is not a complete square matrix of
/// weights of the kind stated.
pub fn read_of(described: &SpeciesFile) -> Result<Matrix, InputError> {
    let bytes = Bytes::read(&described.matrix)?;
    let file = bytes.file.clone();
    let labels = described
        .labels
        .as_deref()
        .map(label_file::read)
        .transpose()?;
    let wanted = Wanted {
        weights: described.weights,
        variable: described.variable.as_deref(),
        label_variable: described.label_variable.as_deref(),
        labels: labels.as_ref().map(|l| l.labels.as_slice()),
    };
    let grid = formats::read(bytes, &wanted)?;
    let (network, warnings) = settle(grid, labels.as_ref(), described.weights, &described.name)?;
    Ok(Matrix {
        network,
        warnings,
        file,
        labels: labels.map(|l| l.file),
    })
}

/// Reads a matrix from a text that carries its labels.
///
/// # Errors
/// [`InputError`] with file, line, column and parcel for anything that is not a complete square
/// matrix of weights of the kind stated.
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
    settle(formats::text(source, &wanted)?, None, weights, species)
}

/// The parcels of a grid: a label for each row, and the column that belongs to it.
struct Axes {
    labels: Vec<String>,
    column: Vec<usize>,
}

/// Checks labels, shape and entries, and brings the columns into the order of the rows.
pub(super) fn settle(
    mut grid: Grid,
    given: Option<&LabelFile>,
    weights: WeightKind,
    species: &str,
) -> Result<(Connectivity, Vec<Warning>), InputError> {
    let Axes { labels, column } = axes(&mut grid, given)?;
    clear_diagonal(&mut grid.values, &column);
    check_entries(&grid, &labels, &column, weights)?;

    let mut warnings = Vec::new();
    let mut values = grid.values;
    if !column.iter().copied().eq(0..column.len()) {
        warnings.push(Warning::ColumnsReordered {
            species: species.to_owned(),
        });
        values = Array2::from_shape_fn(values.dim(), |(i, j)| values[(i, column[j])]);
    }
    let connectivity = Connectivity::new(labels.clone(), labels, values, None)
        .expect("rows, columns and labels were counted above");
    Ok((connectivity, warnings))
}

/// The labels a matrix carries, of its rows and of its columns.
type Own = (Option<Vec<Label>>, Option<Vec<Label>>);

/// Settles which parcels rows and columns stand for.
fn axes(grid: &mut Grid, given: Option<&LabelFile>) -> Result<Axes, InputError> {
    let (rows, columns) = grid.values.dim();
    let own = (grid.row_labels.take(), grid.column_labels.take());
    let file = grid.file.as_path();
    let square = |own: &Own| {
        if rows == columns {
            return Ok(());
        }
        Err(InputError::new(
            Place::file(file),
            match own {
                (Some(of_rows), Some(of_columns)) => not_square(of_rows, of_columns),
                _ => Fault::NotSquare { rows, columns }.into(),
            },
        ))
    };
    let Some(given) = given else {
        for labels in [&own.1, &own.0].into_iter().flatten() {
            check_labels(labels)?;
        }
        square(&own)?;
        return match own {
            (Some(of_rows), Some(of_columns)) => {
                let column = column_order(&of_rows, &of_columns)?;
                Ok(Axes {
                    labels: texts(of_rows),
                    column,
                })
            }
            (Some(labels), None) | (None, Some(labels)) => Ok(Axes {
                labels: texts(labels),
                column: (0..columns).collect(),
            }),
            (None, None) => Err(InputError::new(
                Place::file(file),
                Fault::NoLabels { rows }.into(),
            )),
        };
    };

    check_labels(&given.labels)?;
    square(&own)?;
    if given.labels.len() != rows {
        return Err(InputError::new(
            Place::file(&given.file.path),
            Fault::LabelCount {
                found: given.labels.len(),
                rows,
                matrix: file.to_path_buf(),
            }
            .into(),
        ));
    }
    // The matrix's own labels still say which column belongs to which row.
    let (own, column) = match own {
        (Some(of_rows), Some(of_columns)) if !same(&of_rows, &of_columns) => {
            check_labels(&of_columns)?;
            check_labels(&of_rows)?;
            let column = column_order(&of_rows, &of_columns)?;
            (Some(of_rows), column)
        }
        (of_rows, of_columns) => (of_rows.or(of_columns), (0..columns).collect()),
    };
    if let Some(own) = own {
        refuse_other_order(&own, given, file)?;
    }
    Ok(Axes {
        labels: texts(given.labels.clone()),
        column,
    })
}

fn texts(labels: Vec<Label>) -> Vec<String> {
    labels.into_iter().map(|label| label.text).collect()
}

fn same(one: &[Label], other: &[Label]) -> bool {
    one.iter()
        .map(|label| &label.text)
        .eq(other.iter().map(|label| &label.text))
}

/// Labels given for those of the matrix rename its parcels. The same labels in another order would
/// exchange them, which nobody means.
fn refuse_other_order(own: &[Label], given: &LabelFile, matrix: &Path) -> Result<(), InputError> {
    let Some(at) = (0..own.len()).find(|&i| own[i].text != given.labels[i].text) else {
        return Ok(());
    };
    let of = |labels| -> HashSet<String> { texts(labels).into_iter().collect() };
    if of(own.to_vec()) != of(given.labels.clone()) {
        return Ok(());
    }
    Err(InputError::new(
        given.labels[at].place.clone(),
        Fault::LabelsReordered {
            given: given.labels[at].text.clone(),
            own: own[at].text.clone(),
            matrix: matrix.to_path_buf(),
        }
        .into(),
    ))
}

/// Sees that no label is empty and none comes twice.
fn check_labels(labels: &[Label]) -> Result<(), InputError> {
    let mut first: HashMap<&str, &Place> = HashMap::new();
    for Label { text, place } in labels {
        if text.is_empty() {
            return Err(InputError::new(place.clone(), Problem::EmptyLabel));
        }
        if let Some(before) = first.insert(text, place) {
            return Err(InputError::new(
                place.clone().parcel(text),
                Problem::DuplicateLabel {
                    label: text.clone(),
                    first: before.within_file(),
                },
            ));
        }
    }
    Ok(())
}

/// The fault of a matrix with more labels on one axis than on the other, by the first that is alone.
fn not_square(rows: &[Label], columns: &[Label]) -> Problem {
    let (more, fewer, lacks) = if rows.len() > columns.len() {
        (rows, columns, "column")
    } else {
        (columns, rows, "row")
    };
    let known: HashSet<&String> = fewer.iter().map(|label| &label.text).collect();
    Problem::NotSquare {
        rows: rows.len(),
        columns: columns.len(),
        label: more
            .iter()
            .find(|label| !known.contains(&label.text))
            .map_or_else(String::new, |label| label.text.clone()),
        lacks,
    }
}

/// For each row, the column that carries its label.
fn column_order(rows: &[Label], columns: &[Label]) -> Result<Vec<usize>, InputError> {
    let at: HashMap<&str, usize> = columns
        .iter()
        .enumerate()
        .map(|(i, label)| (label.text.as_str(), i))
        .collect();
    rows.iter()
        .map(|Label { text, place }| {
            at.get(text.as_str()).copied().ok_or_else(|| {
                InputError::new(
                    place.clone().parcel(text),
                    Problem::LabelMismatch {
                        axis: "row",
                        other: "column",
                        label: text.clone(),
                        near: nearest_few(text, columns.iter().map(|c| c.text.as_str()))
                            .into_iter()
                            .map(str::to_owned)
                            .collect(),
                    },
                )
            })
        })
        .collect()
}

/// The diagonal is no data and often holds no number.
fn clear_diagonal(values: &mut Array2<f64>, column: &[usize]) {
    for (i, &j) in column.iter().enumerate() {
        if !values[(i, j)].is_finite() {
            values[(i, j)] = 0.0;
        }
    }
}

/// Sees that every entry off the diagonal is a weight.
fn check_entries(
    grid: &Grid,
    labels: &[String],
    column: &[usize],
    weights: WeightKind,
) -> Result<(), InputError> {
    for ((i, j), &value) in grid.values.indexed_iter() {
        let problem = if value.is_nan() {
            refuse_missing(grid.spelling(i, j))
        } else if value.is_infinite() {
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
        let target = column.iter().position(|&c| c == j).unwrap_or(j);
        let pair = format!("{} to {}", labels[i], labels[target]);
        return Err(InputError::new(grid.place(i, j).parcel(&pair), problem));
    }
    Ok(())
}

/// The one place that says no to entries that were never observed.
fn refuse_missing(spelling: String) -> Problem {
    Problem::Missing(if spelling.is_empty() {
        "an empty cell".to_owned()
    } else {
        spelling
    })
}
