//! What kinds of evidence beyond the joint space read off a species: links and affinities, made once
//! for each material.

use std::collections::HashMap;

use ndarray::Array2;

use crate::affinity;
use crate::species::Species;
use crate::transport::Structure;

/// How strengths become the links that transport compares. No single way is best on all real pairs,
/// so replicates take turns (docs/method.md).
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Expression {
    /// Strengths as they are.
    Plain,
    /// Exponential scores of their ranks (Savage 1956): both species' links then have one and the
    /// same distribution, whatever the weights measure.
    Scores,
    /// Their squares, signs kept: strong links count more.
    Squared,
}

impl Expression {
    /// All of them, in the order in which replicates take turns.
    pub const ALL: [Expression; 3] = [Expression::Plain, Expression::Scores, Expression::Squared];
}

/// Links of one species between its parcels.
#[derive(Debug, Clone)]
pub struct Links {
    /// Strengths `(parcels, parcels)`, row = source, zero on the diagonal and where not observed. In
    /// a network whose columns are not its rows, those between parcels that are both.
    pub strengths: Array2<f64>,
    /// One where a link was observed, zero elsewhere; `None` where all were. The diagonal counts as
    /// observed: it is known to be no link.
    pub observed: Option<Array2<f64>>,
    /// Affinities `(parcels, parcels)`, one on the diagonal.
    pub affinity: Array2<f64>,
    /// Whether every parcel is source and target.
    pub is_square: bool,
}

impl Links {
    /// Reads them off a species.
    #[must_use]
    pub fn of(species: &Species) -> Links {
        let network = &species.network;
        let n = species.parcels.len();
        let column_of: HashMap<&str, usize> = network
            .column_labels()
            .iter()
            .enumerate()
            .map(|(column, label)| (label.as_str(), column))
            .collect();
        let columns: Vec<Option<usize>> = network
            .row_labels()
            .iter()
            .map(|label| column_of.get(label.as_str()).copied())
            .collect();
        let mut strengths = Array2::zeros((n, n));
        let mut observed = Array2::ones((n, n));
        for (target, column) in columns.iter().enumerate() {
            for source in 0..n {
                let known = column.filter(|&c| !network.is_missing(source, c));
                match known {
                    _ if source == target => {}
                    Some(column) => {
                        strengths[(source, target)] = network.weights()[(source, column)]
                    }
                    None => observed[(source, target)] = 0.0,
                }
            }
        }
        let complete = observed.iter().all(|seen| *seen > 0.0);
        Links {
            strengths,
            observed: (!complete).then_some(observed),
            affinity: affinity::of(network, &species.profiles),
            is_square: network.is_square(),
        }
    }

    /// The structure that transport compares: strengths where every parcel is source and target, else
    /// affinities; of mean magnitude 1.
    #[must_use]
    pub fn structure(&self, expression: Expression, by_affinity: bool) -> Structure {
        let (mut links, observed) = if by_affinity {
            let mut affinity = self.affinity.clone();
            affinity.diag_mut().fill(0.0);
            (affinity, None)
        } else {
            (self.strengths.clone(), self.observed.clone())
        };
        let counts = |(i, j): (usize, usize)| {
            i != j && observed.as_ref().is_none_or(|mask| mask[(i, j)] > 0.0)
        };
        match expression {
            Expression::Plain => {}
            Expression::Squared => links.mapv_inplace(|x| x * x.abs()),
            Expression::Scores => {
                let at: Vec<(usize, usize)> = links
                    .indexed_iter()
                    .map(|(at, _)| at)
                    .filter(|at| counts(*at))
                    .collect();
                let values: Vec<f64> = at.iter().map(|at| links[*at]).collect();
                for (at, score) in at.into_iter().zip(exponential_scores(&values)) {
                    links[at] = score;
                }
            }
        }
        let (mut sum, mut count) = (0.0, 0.0);
        for (at, link) in links.indexed_iter() {
            if counts(at) {
                sum += link.abs();
                count += 1.0;
            }
        }
        if sum > 0.0 {
            let unit = sum / count;
            links.mapv_inplace(|x| x / unit);
        }
        Structure::new(links, observed)
    }
}

/// Scores -ln(1 - r) of average ranks r = (rank - 1/2) / count; where nothing is below zero, less the
/// score of zero, so that no link stays no link.
fn exponential_scores(values: &[f64]) -> Vec<f64> {
    let count = values.len() as f64;
    let mut order: Vec<usize> = (0..values.len()).collect();
    order.sort_by(|&i, &j| values[i].total_cmp(&values[j]));
    let mut scores = vec![0.0; values.len()];
    let mut of_zero = None;
    let mut first = 0;
    while first < order.len() {
        let value = values[order[first]];
        let ties = order[first..]
            .iter()
            .take_while(|&&at| values[at] == value)
            .count();
        let rank = first as f64 + (ties as f64 + 1.0) / 2.0;
        let score = -(1.0 - (rank - 0.5) / count).ln();
        if value == 0.0 && first == 0 {
            of_zero = Some(score);
        }
        for &at in &order[first..first + ties] {
            scores[at] = score - of_zero.unwrap_or(0.0);
        }
        first += ties;
    }
    scores
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn scores_depend_on_order_alone_and_leave_no_link_at_zero() {
        let scores = exponential_scores(&[0.0, 3.0, 0.0, 8.0]);
        assert_eq!(scores, exponential_scores(&[0.0, 1.0, 0.0, 900.0]));
        assert_eq!((scores[0], scores[2]), (0.0, 0.0));
        // Ranks 1.5, 3 and 4 of 4: r = 1/4, 5/8, 7/8.
        let plain = [0.25_f64, 0.625, 0.875].map(|r| -(1.0 - r).ln());
        assert!((scores[1] - (plain[1] - plain[0])).abs() < 1e-15);
        assert!((scores[3] - (plain[2] - plain[0])).abs() < 1e-15);
        // With values below zero nothing is subtracted.
        let signed = exponential_scores(&[-1.0, 0.0, 2.0, 3.0]);
        assert!((signed[0] - -(1.0 - 0.125_f64).ln()).abs() < 1e-15);
    }
}
