//! A look over a matrix for what is legal but odd.

use super::parts::Parts;
use crate::domain::{Connectivity, WeightKind};
use crate::input::SpeciesFile;
use crate::warning::Warning;

/// Correlations may differ this much across the diagonal before it is worth a word.
const ASYMMETRY: f64 = 1e-6;

/// Adds what a careful user would want to know about a matrix.
pub fn look_over(network: &Connectivity, described: &SpeciesFile, warnings: &mut Vec<Warning>) {
    let species = || described.name.clone();
    let weights = network.weights();
    let off_diagonal = || {
        weights
            .indexed_iter()
            .filter(|((i, j), _)| network.is_data(*i, *j))
    };

    // Correlations and logarithms of a parcel with itself are 1 and 0 by nature.
    let empty = |w: f64| match described.weights {
        WeightKind::Correlations => w == 0.0 || w == 1.0,
        _ => w == 0.0,
    };
    let diagonal = (0..weights.ncols())
        .filter_map(|j| Some(weights[(network.row_of_column(j)?, j)]))
        .filter(|w| !empty(*w))
        .count();
    if diagonal > 0 && described.weights != WeightKind::Log10 {
        warnings.push(Warning::DiagonalNotEmpty {
            species: species(),
            entries: diagonal,
        });
    }
    match described.weights {
        WeightKind::Correlations => {
            let largest = off_diagonal()
                .filter(|((i, j), _)| network.is_square() && network.is_data(*j, *i))
                .map(|((i, j), w)| (w - weights[(j, i)]).abs())
                .fold(0.0, f64::max);
            if largest > ASYMMETRY {
                warnings.push(Warning::AsymmetricCorrelations {
                    species: species(),
                    largest,
                });
            }
            let beyond: Vec<(usize, usize)> = off_diagonal()
                .filter(|(_, w)| w.abs() >= 1.0)
                .map(|(at, _)| at)
                .collect();
            if let Some(&(i, j)) = beyond.first() {
                let labels = (network.row_labels(), network.column_labels());
                warnings.push(Warning::CorrelationsBeyondOne {
                    species: species(),
                    entries: beyond.len(),
                    example: (labels.0[i].clone(), labels.1[j].clone()),
                });
            }
        }
        WeightKind::Fractions => {
            let above = off_diagonal().filter(|(_, w)| **w > 1.0).count();
            if above > 0 {
                warnings.push(Warning::FractionsAboveOne {
                    species: species(),
                    entries: above,
                });
            }
        }
        WeightKind::Log10 => {
            let zeros = off_diagonal().filter(|(_, w)| **w == 0.0).count();
            if zeros > 0 && off_diagonal().all(|(_, w)| *w <= 0.0) {
                warnings.push(Warning::ZeroLogarithms {
                    species: species(),
                    entries: zeros,
                });
            }
        }
        WeightKind::Counts | WeightKind::Ordinal | WeightKind::Other => {}
    }
}

/// Adds a warning where there are parts between which there is no connection; parcels without any are
/// reported elsewhere.
pub fn components(network: &Connectivity, described: &SpeciesFile, warnings: &mut Vec<Warning>) {
    if described.weights == WeightKind::Log10 {
        return;
    }
    let labels = network.row_labels();
    let weights = network.weights();
    let mut ends = labels.len();
    let end_of_column: Vec<usize> = (0..weights.ncols())
        .map(|j| {
            network.row_of_column(j).unwrap_or_else(|| {
                ends += 1;
                ends - 1
            })
        })
        .collect();
    let links = weights
        .indexed_iter()
        .filter(|((i, j), w)| network.is_data(*i, *j) && **w != 0.0)
        .map(|((i, j), _)| (i, end_of_column[j]));
    let parts = Parts::of(ends, links);
    if parts.real() > 1 {
        warnings.push(Warning::Components {
            species: described.name.clone(),
            components: parts.real(),
            outside: parts
                .outside()
                .filter(|&i| i < labels.len())
                .map(|i| labels[i].clone())
                .collect(),
        });
    }
}
