//! What a matrix holds before its weights are transformed, for people who want to see that it was
//! understood.

use serde::Serialize;

use super::parts::Parts;
use crate::domain::{Connectivity, WeightKind};
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

/// Facts about the weights of one species, among the parcels that take part.
#[derive(Debug, Clone, PartialEq)]
pub struct RawFacts {
    /// Entries off the diagonal that are a connection: not zero, or any logarithm.
    pub connections: usize,
    /// The same as a share of all entries off the diagonal.
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
    /// How many different weights other than zero there are.
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
    /// Looks at the weights of the parcels that take part. `filled` is asked in the order of the
    /// file, so it is handed in.
    #[must_use]
    pub fn of(network: &Connectivity, kind: WeightKind, filled: Filled) -> RawFacts {
        let n = network.row_labels().len();
        let weights = network.weights();
        let is_link =
            |i: usize, j: usize| i != j && (weights[(i, j)] != 0.0 || kind == WeightKind::Log10);
        let size = |w: f64| match kind {
            WeightKind::Log10 => 10.0_f64.powf(w),
            _ => w.abs(),
        };
        let directed = (0..n).any(|i| (0..i).any(|j| weights[(i, j)] != weights[(j, i)]));

        let mut partners = vec![0; n];
        let mut strength = vec![0.0; n];
        let mut connections = 0;
        for i in 0..n {
            for j in 0..n {
                if i == j {
                    continue;
                }
                connections += usize::from(is_link(i, j));
                partners[i] += usize::from(is_link(i, j) || is_link(j, i));
                strength[i] += size(weights[(i, j)]);
                if directed {
                    strength[i] += size(weights[(j, i)]);
                }
            }
        }
        let (mut smallest, mut largest) = (f64::INFINITY, f64::NEG_INFINITY);
        let mut values: Vec<f64> = observed(network).filter(|w| *w != 0.0).collect();
        for w in observed(network) {
            smallest = smallest.min(w);
            largest = largest.max(w);
        }
        let whole = values.iter().all(|w| w.fract() == 0.0);
        values.sort_by(f64::total_cmp);
        values.dedup();
        let least_positive = values.iter().copied().find(|w| *w > 0.0);
        let parts = Parts::of(n, |i, j| is_link(i, j) || is_link(j, i));
        RawFacts {
            connections,
            density: connections as f64 / (n * n.saturating_sub(1)).max(1) as f64,
            directed,
            filled,
            smallest,
            largest,
            span: match kind {
                WeightKind::Log10 => Some(largest - smallest),
                _ => least_positive.map(|least| (largest / least).log10()),
            },
            least_positive,
            distinct: values.len(),
            whole,
            sums_to_one: sums_to_one(network, kind),
            parts: parts.sizes.len(),
            outside: parts.outside().collect(),
            part: parts.of,
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
    let n = network.row_labels().len();
    let weights = network.weights();
    let weight = |i: usize, j: usize| match kind {
        WeightKind::Log10 => 10.0_f64.powf(weights[(i, j)]),
        _ => weights[(i, j)],
    };
    let all_one = |entry: &dyn Fn(usize, usize) -> f64, diagonal: bool| {
        let sums: Vec<f64> = (0..n)
            .map(|line| {
                (0..n)
                    .filter(|&at| diagonal || at != line)
                    .map(|at| entry(line, at))
                    .sum()
            })
            .filter(|sum| *sum != 0.0)
            .collect();
        !sums.is_empty() && sums.iter().all(|sum| (sum - 1.0).abs() <= SUM_TOLERANCE)
    };
    let either = |entry: &dyn Fn(usize, usize) -> f64| {
        all_one(entry, false) || (kind != WeightKind::Log10 && all_one(entry, true))
    };
    match (either(&weight), either(&|i, j| weight(j, i))) {
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
        let facts = RawFacts::of(&rows, WeightKind::Fractions, filled(&rows));
        assert_eq!(facts.sums_to_one, SumsToOne::Rows);
        let columns = network(rows.weights().t().to_owned());
        let facts = RawFacts::of(&columns, WeightKind::Fractions, filled(&columns));
        assert_eq!(facts.sums_to_one, SumsToOne::Columns);
    }

    #[test]
    fn a_triangle_and_a_span_are_seen() {
        let half = network(array![[9.0, 1.0, 0.0], [0.0, 0.0, 1000.0], [0.0, 0.0, 0.0]]);
        let facts = RawFacts::of(&half, WeightKind::Counts, filled(&half));
        assert_eq!(facts.filled, Filled::Above);
        assert!(facts.directed && facts.whole);
        assert_eq!(facts.span, Some(3.0));
        assert_eq!((facts.connections, facts.distinct), (2, 2));
        assert_eq!(facts.partners, [1, 2, 1]);
        assert_eq!(facts.strength, [1.0, 1001.0, 1000.0]);
        let logs = network(array![[0.0, -1.0], [-3.0, 0.0]]);
        let facts = RawFacts::of(&logs, WeightKind::Log10, filled(&logs));
        assert_eq!((facts.span, facts.density), (Some(2.0), 1.0));
    }
}
