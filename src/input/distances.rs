//! Distances between the parcels of one species: geodesic, along tracts or straight, in a matrix of
//! any format.

use std::collections::HashMap;
use std::path::Path;

use ndarray::Array2;

use super::error::{InputError, Place, Problem};
use super::formats::{self, Fault, Wanted};
use super::label_file;
use super::matrix;
use super::parcel_fault::ParcelFault;
use super::source::{Bytes, InputFile};
use crate::domain::{Connectivity, WeightKind};
use crate::warning::Warning;

/// Halves may differ by this share of the distance before it is worth a word: single precision.
const ASYMMETRY: f64 = 1e-6;

/// Distances as read.
#[derive(Debug, Clone)]
pub struct Distances {
    /// The file.
    pub file: InputFile,
    /// Between the parcels of the matrix, in the order of its labels: symmetric, 0 or more, 0 on the
    /// diagonal, NaN where not known.
    pub values: Array2<f64>,
    /// What is legal but suspicious.
    pub warnings: Vec<Warning>,
}

/// Reads the distances of the parcels that a matrix names by `labels`. A file that carries no labels
/// takes those of `label_file`, where there is one.
///
/// # Errors
/// [`InputError`] for anything that is no square matrix of numbers of 0 or more with every parcel.
pub fn read(
    path: &Path,
    label_file: Option<&Path>,
    labels: &[String],
    species: &str,
) -> Result<Distances, InputError> {
    let (file, network, mut warnings) = match read_grid(path, None, species) {
        Err(e) if matches!(*e.problem, Problem::Format(Fault::NoLabels { .. })) => match label_file
        {
            Some(labels) => read_grid(path, Some(labels), species)?,
            None => return Err(e),
        },
        other => other?,
    };
    let at: HashMap<&str, usize> = network
        .row_labels()
        .iter()
        .enumerate()
        .map(|(at, label)| (label.as_str(), at))
        .collect();
    let missing: Vec<String> = labels
        .iter()
        .filter(|label| !at.contains_key(label.as_str()))
        .cloned()
        .collect();
    if !missing.is_empty() {
        let parcels = missing;
        return Err(InputError::new(
            Place::file(path),
            ParcelFault::DistancesLack { parcels }.into(),
        ));
    }
    let order: Vec<usize> = labels.iter().map(|label| at[label.as_str()]).collect();
    let mut values = network.select(&order, &order).weights().clone();
    for (i, &from) in order.iter().enumerate() {
        for (j, &to) in order.iter().enumerate() {
            if network.is_missing(from, to) {
                values[(i, j)] = f64::NAN;
            }
        }
        values[(i, i)] = 0.0;
    }
    symmetrise(&mut values, species, &mut warnings);
    let n = values.nrows();
    let zeros = (0..n)
        .flat_map(|i| (0..i).map(move |j| (i, j)))
        .filter(|at| values[*at] == 0.0)
        .count();
    if zeros > 0 {
        warnings.push(Warning::DistancesZero {
            species: species.to_owned(),
            pairs: zeros,
        });
    }
    Ok(Distances {
        file,
        values,
        warnings,
    })
}

fn read_grid(
    path: &Path,
    label_file: Option<&Path>,
    species: &str,
) -> Result<(InputFile, Connectivity, Vec<Warning>), InputError> {
    let bytes = Bytes::read(path)?;
    let file = bytes.file.clone();
    let labels = label_file.map(label_file::read).transpose()?;
    let wanted = Wanted {
        weights: WeightKind::Other,
        variable: None,
        label_variable: None,
        labels: labels.as_ref().map(|l| l.labels.as_slice()),
    };
    let grid = formats::read(bytes, &wanted).map_err(|error| match *error.problem {
        // No key of the study file chooses here.
        Problem::Format(Fault::SeveralArrays { names, .. }) => {
            InputError::new(*error.place, ParcelFault::SeveralDistances { names }.into())
        }
        problem => InputError::new(*error.place, problem),
    })?;
    if let Some(((i, j), &found)) = grid.values.indexed_iter().find(|(_, d)| **d < 0.0) {
        let name = |labels: &Option<Vec<super::grid::Label>>, at: usize| {
            let labels = labels.as_ref().or(grid.row_labels.as_ref());
            labels.and_then(|l| l.get(at)).map(|l| l.text.clone())
        };
        let mut place = grid.place(i, j);
        if let (Some(from), Some(to)) = (name(&grid.row_labels, i), name(&grid.column_labels, j)) {
            place = place.parcel(&format!("{from} to {to}"));
        }
        return Err(InputError::new(
            place,
            ParcelFault::NegativeDistance { found }.into(),
        ));
    }
    // The columns may stand in another order; for distances that is no matter to warn about.
    let network = matrix::square(grid, labels.as_ref(), species)?.ok_or_else(|| {
        InputError::new(Place::file(path), ParcelFault::DistancesNotSquare.into())
    })?;
    Ok((file, network, Vec::new()))
}

/// A distance has no direction: the mean of both halves, or the one that is filled.
fn symmetrise(values: &mut Array2<f64>, species: &str, warnings: &mut Vec<Warning>) {
    let n = values.nrows();
    let empty = |values: &Array2<f64>, above: bool| {
        (0..n).all(|i| (0..i).all(|j| values[if above { (j, i) } else { (i, j) }] == 0.0))
    };
    let (above, below) = (empty(values, true), empty(values, false));
    let one_half = above != below;
    let mut largest: f64 = 0.0;
    for i in 0..n {
        for j in 0..i {
            let (x, y) = (values[(i, j)], values[(j, i)]);
            let settled = match (one_half, x.is_nan(), y.is_nan()) {
                (true, ..) if above => x,
                (true, ..) => y,
                (false, true, _) => y,
                (false, _, true) => x,
                _ => {
                    if (x - y).abs() > ASYMMETRY * x.max(y) {
                        largest = largest.max((x - y).abs());
                    }
                    (x + y) / 2.0
                }
            };
            values[(i, j)] = settled;
            values[(j, i)] = settled;
        }
    }
    if one_half {
        warnings.push(Warning::DistancesOneHalf {
            species: species.to_owned(),
        });
    } else if largest > 0.0 {
        warnings.push(Warning::DistancesAsymmetric {
            species: species.to_owned(),
            largest,
        });
    }
}
