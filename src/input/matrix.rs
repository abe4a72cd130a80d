//! A labelled square matrix of connection weights.

use std::collections::{HashMap, HashSet};

use ndarray::Array2;

use super::delimited::{self, Row, Separator};
use super::error::{InputError, Place, Problem};
use super::nearest::nearest_few;
use super::source::Source;
use crate::domain::{Connectivity, WeightKind};
use crate::warning::Warning;

/// Spellings of a missing entry, besides the empty cell.
const MISSING: [&str; 6] = ["na", "n/a", "nan", "null", "none", "-"];

/// Reads a matrix whose first row and first column hold labels; row = source, column = target.
///
/// # Errors
/// [`InputError`] with file, line, column and parcel for anything that is not a complete square
/// matrix of weights of the kind stated.
pub fn read(
    source: &Source,
    weights: WeightKind,
    species: &str,
) -> Result<(Connectivity, Vec<Warning>), InputError> {
    let table = delimited::parse(source)?;
    let path = source.path();
    let column_labels = labels(
        table
            .header
            .cells
            .iter()
            .enumerate()
            .skip(1)
            .map(|(at, label)| (label, Place::line(path, table.header.line).column(at + 1))),
    )?;
    let row_labels = labels(table.rows.iter().map(|row| {
        let label = row.cells.get(0).unwrap_or("");
        (label, Place::line(path, row.line).column(1))
    }))?;
    let (rows, columns) = (row_labels.len(), column_labels.len());
    if rows != columns {
        return Err(InputError::new(
            Place::file(path),
            not_square(&row_labels, &column_labels),
        ));
    }
    let order = column_order(&row_labels, &column_labels, source, &table.rows)?;

    let mut values = Vec::with_capacity(rows * columns);
    for (row, label) in table.rows.iter().zip(&row_labels) {
        for &column in &order {
            let cell = row.cells.get(column + 1).unwrap_or("");
            if column_labels[column] == *label && says_nothing(cell) {
                values.push(0.0);
                continue;
            }
            let value = number(cell, weights, table.separator).map_err(|problem| {
                let pair = format!("{label} to {}", column_labels[column]);
                InputError::new(
                    Place::line(path, row.line).column(column + 2).parcel(&pair),
                    problem,
                )
            })?;
            values.push(value);
        }
    }
    let mut warnings = Vec::new();
    if !order.iter().copied().eq(0..columns) {
        warnings.push(Warning::ColumnsReordered {
            species: species.to_owned(),
        });
    }
    let shape_holds = "rows, columns and cells were counted above";
    let matrix = Array2::from_shape_vec((rows, columns), values).expect(shape_holds);
    let connectivity =
        Connectivity::new(row_labels.clone(), row_labels, matrix, None).expect(shape_holds);
    Ok((connectivity, warnings))
}

/// Takes labels, none empty, none twice.
fn labels<'t>(cells: impl Iterator<Item = (&'t str, Place)>) -> Result<Vec<String>, InputError> {
    let mut first: HashMap<&str, Place> = HashMap::new();
    let mut labels = Vec::new();
    for (label, place) in cells {
        if label.is_empty() {
            return Err(InputError::new(place, Problem::EmptyLabel));
        }
        if let Some(before) = first.get(label) {
            let first = match (before.line, before.column) {
                (Some(line), Some(column)) => format!("line {line}, column {column}"),
                _ => before.to_string(),
            };
            return Err(InputError::new(
                place.parcel(label),
                Problem::DuplicateLabel {
                    label: label.to_owned(),
                    first,
                },
            ));
        }
        first.insert(label, place);
        labels.push(label.to_owned());
    }
    Ok(labels)
}

/// The fault of a matrix with more labels on one axis than on the other, by the first that is alone.
fn not_square(rows: &[String], columns: &[String]) -> Problem {
    let (more, fewer, lacks) = if rows.len() > columns.len() {
        (rows, columns, "column")
    } else {
        (columns, rows, "row")
    };
    let known: HashSet<&String> = fewer.iter().collect();
    Problem::NotSquare {
        rows: rows.len(),
        columns: columns.len(),
        label: more
            .iter()
            .find(|label| !known.contains(label))
            .cloned()
            .unwrap_or_default(),
        lacks,
    }
}

/// For each row label, the column that carries it.
fn column_order(
    rows: &[String],
    columns: &[String],
    source: &Source,
    lines: &[Row],
) -> Result<Vec<usize>, InputError> {
    let at: HashMap<&str, usize> = columns
        .iter()
        .enumerate()
        .map(|(i, label)| (label.as_str(), i))
        .collect();
    rows.iter()
        .zip(lines)
        .map(|(label, row)| {
            at.get(label.as_str()).copied().ok_or_else(|| {
                InputError::new(
                    Place::line(source.path(), row.line).column(1).parcel(label),
                    Problem::LabelMismatch {
                        axis: "row",
                        other: "column",
                        label: label.clone(),
                        near: nearest_few(label, columns.iter().map(String::as_str))
                            .into_iter()
                            .map(str::to_owned)
                            .collect(),
                    },
                )
            })
        })
        .collect()
}

/// Whether a cell holds no finite number, as the diagonal, which is no data, often does not.
fn says_nothing(cell: &str) -> bool {
    is_missing(cell) || cell.parse().is_ok_and(|w: f64| !w.is_finite())
}

/// Whether a cell stands for a missing entry.
fn is_missing(cell: &str) -> bool {
    cell.is_empty() || MISSING.contains(&cell.to_ascii_lowercase().as_str())
}

/// One cell as a weight.
fn number(cell: &str, weights: WeightKind, separator: Separator) -> Result<f64, Problem> {
    if cell.is_empty() {
        return Err(Problem::Missing("an empty cell".to_owned()));
    }
    let Ok(value) = cell.parse::<f64>() else {
        if is_missing(cell) {
            return Err(Problem::Missing(cell.to_owned()));
        }
        let pointed = cell.replacen(',', ".", 1);
        if separator != Separator::Comma && pointed.parse::<f64>().is_ok() {
            return Err(Problem::DecimalComma(cell.to_owned()));
        }
        return Err(Problem::NotANumber(cell.to_owned()));
    };
    if value.is_nan() {
        return Err(Problem::Missing(cell.to_owned()));
    }
    if value.is_infinite() {
        return Err(Problem::Infinite {
            found: cell.to_owned(),
            logarithm: weights == WeightKind::Log10,
        });
    }
    if value < 0.0 && weights.is_non_negative() {
        return Err(Problem::Negative {
            weights: weights.to_string(),
            found: value,
        });
    }
    Ok(value)
}
