//! What a matrix holds before its weights are transformed, for people who want to see that it was
//! understood.

use std::collections::BTreeSet;

use serde::Serialize;

use super::parts::Parts;
use crate::domain::{Connectivity, RowsAre, WeightKind};
use crate::transform::observed;

/// Sums may miss 1 by this much: fractions are often written with few digits.
const SUM_TOLERANCE: f64 = 0.01;

/// Which lines of a matrix each sum to 1.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum SumsToOne {
    /// Every row: shares of what a source sends.
    Rows,
    /// Every column: shares of what a target receives.
    Columns,
    /// Both.
    Both,
    /// Neither.
    Neither,
}

/// The half of a matrix that holds something.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Filled {
    /// Entries on both sides of the diagonal.
    BothHalves,
    /// Only above the diagonal.
    Above,
    /// Only below it.
    Below,
}

/// Different weights counted before the rest is only "more".
const MOST_DISTINCT: usize = 1000;

/// Facts about the weights of one species, among the parcels that take part.
#[derive(Debug, Clone, PartialEq)]
pub struct RawFacts {
    /// What the rows are, where the network is no square of parcels by parcels.
    pub rectangular: Option<RowsAre>,
    /// Entries of a profile in one direction: columns of the network.
    pub columns: usize,
    /// Columns that are parcels themselves.
    pub columns_within: usize,
    /// Entries off the diagonal that were never observed.
    pub missing: usize,
    /// Entries off the diagonal that are a connection: not zero, or any logarithm.
    pub connections: usize,
    /// The same as a share of all observed entries off the diagonal.
    pub density: f64,
    /// Whether the profiles will hold links in both directions.
    pub directed: bool,
    /// Halves that hold something, in the order of the file.
    pub filled: Filled,
    /// Smallest weight off the diagonal.
    pub smallest: f64,
    /// Largest weight off the diagonal.
    pub largest: f64,
    /// Smallest weight above zero.
    pub least_positive: Option<f64>,
    /// Orders of magnitude from the smallest to the largest positive weight; of what the logarithms
    /// stand for. `None` where no weight is positive.
    pub span: Option<f64>,
    /// How many different weights other than zero there are; counted up to a thousand.
    pub distinct: usize,
    /// Whether every weight is a whole number.
    pub whole: bool,
    /// Whether rows or columns sum to 1.
    pub sums_to_one: SumsToOne,
    /// Parts without a connection between them.
    pub parts: usize,
    /// For each parcel the part it is in.
    pub part: Vec<usize>,
    /// Parcels outside the largest part, as indices into the parcels.
    pub outside: Vec<usize>,
    /// For each parcel how many others it is connected with, in either direction.
    pub partners: Vec<usize>,
    /// For each parcel the sum of the sizes of its weights, in and out; of the row alone where the
    /// matrix is symmetric.
    pub strength: Vec<f64>,
}

impl RawFacts {
    /// Looks at the weights of the parcels that take part: the rows. `filled` is asked in the order of
    /// the file, so it is handed in; `rows_are` counts where the network is not square.
    #[must_use]
    pub fn of(
        network: &Connectivity,
        rows_are: RowsAre,
        kind: WeightKind,
        filled: Filled,
    ) -> RawFacts {
        let (n, columns) = network.weights().dim();
        let square = network.is_square();
        let weights = network.weights();
        let size = |w: f64| match kind {
            WeightKind::Log10 => 10.0_f64.powf(w),
            _ => w.abs(),
        };
        // Links with areas that are no row count as partners, not as parcels.
        let mut elsewhere = 0;
        let end_of_column: Vec<usize> = (0..columns)
            .map(|j| {
                network.row_of_column(j).unwrap_or_else(|| {
                    elsewhere += 1;
                    n + elsewhere - 1
                })
            })
            .collect();
        let links = || {
            weights
                .indexed_iter()
                .filter(|((i, j), w)| {
                    network.is_data(*i, *j) && (**w != 0.0 || kind == WeightKind::Log10)
                })
                .map(|((i, j), _)| (i, end_of_column[j]))
        };
        let directed = square
            && (0..n).any(|i| {
                (0..i).any(|j| {
                    weights[(i, j)] != weights[(j, i)]
                        && !network.is_missing(i, j)
                        && !network.is_missing(j, i)
                })
            });

        // A pair linked both ways is met twice but counts once; nothing is stored for each link, of
        // which there may be millions.
        let mut column_of_row: Vec<Option<usize>> = vec![None; n];
        for j in 0..columns {
            if let Some(i) = network.row_of_column(j) {
                column_of_row[i] = Some(j);
            }
        }
        let is_link = |i: usize, j: usize| {
            network.is_data(i, j) && (weights[(i, j)] != 0.0 || kind == WeightKind::Log10)
        };
        let mut partners = vec![0; n];
        let mut connections = 0;
        for (i, end) in links() {
            connections += 1;
            partners[i] += 1;
            let both_ways = || column_of_row[i].is_some_and(|back| is_link(end, back));
            if end < n && !both_ways() {
                partners[end] += 1;
            }
        }
        let mut strength = vec![0.0; n];
        for ((i, j), &w) in weights.indexed_iter() {
            if network.is_data(i, j) {
                strength[i] += size(w);
                if let (true, Some(parcel)) = (directed || !square, network.row_of_column(j)) {
                    strength[parcel] += size(w);
                }
            }
        }

        let (mut smallest, mut largest) = (f64::INFINITY, f64::NEG_INFINITY);
        let (mut least_positive, mut whole, mut entries) = (f64::INFINITY, true, 0_usize);
        let mut distinct = BTreeSet::new();
        for w in observed(network) {
            entries += 1;
            smallest = smallest.min(w);
            largest = largest.max(w);
            if w > 0.0 {
                least_positive = least_positive.min(w);
            }
            if w != 0.0 {
                whole &= w.fract() == 0.0;
                if distinct.len() < MOST_DISTINCT {
                    distinct.insert(w.to_bits());
                }
            }
        }
        let least_positive = Some(least_positive).filter(|w| w.is_finite());
        let parts = Parts::of(n + elsewhere, links());
        RawFacts {
            rectangular: (!square).then_some(rows_are),
            columns,
            columns_within: columns - elsewhere,
            missing: network.missing(),
            connections,
            density: connections as f64 / entries.max(1) as f64,
            directed,
            filled,
            smallest,
            largest,
            span: match kind {
                WeightKind::Log10 => Some(largest - smallest),
                _ => least_positive.map(|least| (largest / least).log10()),
            },
            least_positive,
            distinct: distinct.len(),
            whole,
            sums_to_one: sums_to_one(network, kind),
            parts: parts.sizes.len(),
            outside: parts.outside().filter(|&i| i < n).collect(),
            part: parts.of[..n].to_vec(),
            partners,
            strength,
        }
    }
}

/// Which halves of a matrix hold something other than zero; the order of the parcels matters, so ask
/// before they are sorted.
#[must_use]
pub fn filled(network: &Connectivity) -> Filled {
    let weights = network.weights();
    let any = |in_half: fn(usize, usize) -> bool| {
        weights
            .indexed_iter()
            .any(|((i, j), w)| in_half(i, j) && *w != 0.0)
    };
    match (any(|i, j| i < j), any(|i, j| i > j)) {
        (true, false) => Filled::Above,
        (false, true) => Filled::Below,
        _ => Filled::BothHalves,
    }
}

/// Lines without any weight say nothing; with the diagonal or without it, since both are in use.
fn sums_to_one(network: &Connectivity, kind: WeightKind) -> SumsToOne {
    let (rows, columns) = network.weights().dim();
    let weights = network.weights();
    let weight = |i: usize, j: usize| match kind {
        _ if network.is_missing(i, j) => 0.0,
        WeightKind::Log10 => 10.0_f64.powf(weights[(i, j)]),
        _ => weights[(i, j)],
    };
    let by_row = |diagonal: bool| -> Vec<f64> {
        (0..rows)
            .map(|i| {
                (0..columns)
                    .filter(|&j| diagonal || !network.is_self(i, j))
                    .map(|j| weight(i, j))
                    .sum()
            })
            .collect()
    };
    let by_column = |diagonal: bool| -> Vec<f64> {
        let mut sums = vec![0.0; columns];
        for i in 0..rows {
            for (j, sum) in sums.iter_mut().enumerate() {
                if diagonal || !network.is_self(i, j) {
                    *sum += weight(i, j);
                }
            }
        }
        sums
    };
    let all_one = |sums: Vec<f64>| {
        let mut sums = sums.into_iter().filter(|sum| *sum != 0.0).peekable();
        sums.peek().is_some() && sums.all(|sum| (sum - 1.0).abs() <= SUM_TOLERANCE)
    };
    let either = |sums: &dyn Fn(bool) -> Vec<f64>| {
        all_one(sums(false)) || (kind != WeightKind::Log10 && all_one(sums(true)))
    };
    match (either(&by_row), either(&by_column)) {
        (true, true) => SumsToOne::Both,
        (true, false) => SumsToOne::Rows,
        (false, true) => SumsToOne::Columns,
        (false, false) => SumsToOne::Neither,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use ndarray::{array, Array2};

    fn network(weights: Array2<f64>) -> Connectivity {
        let labels: Vec<String> = (0..weights.nrows()).map(|i| i.to_string()).collect();
        Connectivity::new(labels.clone(), labels, weights, None).unwrap()
    }

    #[test]
    fn shares_of_a_target_are_told_from_shares_of_a_source() {
        let rows = network(array![[0.0, 0.7, 0.3], [0.4, 0.0, 0.6], [0.0, 0.0, 0.0]]);
        let facts = RawFacts::of(
            &rows,
            RowsAre::Sources,
            WeightKind::Fractions,
            filled(&rows),
        );
        assert_eq!(facts.sums_to_one, SumsToOne::Rows);
        let columns = network(rows.weights().t().to_owned());
        let facts = RawFacts::of(
            &columns,
            RowsAre::Sources,
            WeightKind::Fractions,
            filled(&columns),
        );
        assert_eq!(facts.sums_to_one, SumsToOne::Columns);
    }

    #[test]
    fn a_triangle_and_a_span_are_seen() {
        let half = network(array![[9.0, 1.0, 0.0], [0.0, 0.0, 1000.0], [0.0, 0.0, 0.0]]);
        let facts = RawFacts::of(&half, RowsAre::Sources, WeightKind::Counts, filled(&half));
        assert_eq!(facts.filled, Filled::Above);
        assert!(facts.directed && facts.whole);
        assert_eq!(facts.span, Some(3.0));
        assert_eq!((facts.connections, facts.distinct), (2, 2));
        assert_eq!(facts.partners, [1, 2, 1]);
        assert_eq!(facts.strength, [1.0, 1001.0, 1000.0]);
        let logs = network(array![[0.0, -1.0], [-3.0, 0.0]]);
        let facts = RawFacts::of(&logs, RowsAre::Sources, WeightKind::Log10, filled(&logs));
        assert_eq!((facts.span, facts.density), (Some(2.0), 1.0));
    }
}
