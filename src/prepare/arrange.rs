//! From a matrix as read to the network that is compared: missing entries filled in where a link has
//! no direction, lines that were never observed taken out; and for every parcel whether it can be
//! placed.

use crate::affinity;
use crate::domain::{Connectivity, RowsAre, Standing, WeightKind};

/// A network whose rows are the parcels, all of them, and what became of it.
#[derive(Debug)]
pub struct Arranged {
    /// The network.
    pub network: Connectivity,
    /// What its rows are; sources where it is square.
    pub rows_are: RowsAre,
    /// Entries that were missing as read, off the diagonal.
    pub missing: usize,
    /// Of these, entries taken from the other side of the diagonal.
    pub mirrored: usize,
    /// Columns taken out because none of their entries was observed.
    pub unobserved_columns: usize,
}

impl Arranged {
    /// Arranges a matrix whose rows are parcels.
    #[must_use]
    pub fn of(mut network: Connectivity, rows_are: RowsAre, weights: WeightKind) -> Arranged {
        let missing = network.missing();
        let mirrored = directionless(&mut network, weights);
        let (network, rows_are, unobserved_columns) = without_unobserved(network, rows_are);
        Arranged {
            network,
            rows_are,
            missing,
            mirrored,
            unobserved_columns,
        }
    }
}

/// Where the links of a square network have no direction, fills in entries from the other side of the
/// diagonal, and makes correlations the mean of both; how many were filled in.
pub fn directionless(network: &mut Connectivity, weights: WeightKind) -> usize {
    let correlations = weights == WeightKind::Correlations;
    if !network.is_square() {
        return 0;
    }
    let mut mirrored = 0;
    if correlations || undirected(network) {
        mirrored = mirror(network);
    }
    if correlations {
        symmetrise(network);
    }
    mirrored
}

/// Whether the links of a square network have no direction: where both directions were observed they
/// agree, or only one half was observed at all.
fn undirected(network: &Connectivity) -> bool {
    if !network.has_missing() {
        return false;
    }
    let n = network.row_labels().len();
    let weights = network.weights();
    let (mut both, mut above, mut below) = (0_usize, 0_usize, 0_usize);
    for i in 0..n {
        for j in 0..i {
            match (network.is_missing(i, j), network.is_missing(j, i)) {
                (false, false) if weights[(i, j)] != weights[(j, i)] => return false,
                (false, false) => both += 1,
                (false, true) => below += 1,
                (true, false) => above += 1,
                (true, true) => {}
            }
        }
    }
    both > 0 || (above == 0) != (below == 0)
}

/// Fills in entries from the other side of the diagonal; how many.
fn mirror(network: &mut Connectivity) -> usize {
    let n = network.row_labels().len();
    let mut filled = 0;
    if !network.has_missing() {
        return filled;
    }
    for i in 0..n {
        for j in 0..n {
            if network.is_missing(i, j) && !network.is_missing(j, i) {
                let weight = network.weights()[(j, i)];
                network.observe(i, j, weight);
                filled += 1;
            }
        }
    }
    network.settle_mask();
    filled
}

/// The mean of both halves: a correlation has no direction. What is missing is so in both.
fn symmetrise(network: &mut Connectivity) {
    let mut weights = network.weights_mut();
    for i in 0..weights.nrows() {
        for j in 0..i {
            let mean = (weights[(i, j)] + weights[(j, i)]) / 2.0;
            weights[(i, j)] = mean;
            weights[(j, i)] = mean;
        }
    }
}

/// Takes out columns without any observed entry: areas that were never injected, written as empty
/// lines of a square table. Where rather the rows are empty, the network is turned.
fn without_unobserved(network: Connectivity, rows_are: RowsAre) -> (Connectivity, RowsAre, usize) {
    if !network.has_missing() {
        return (network, rows_are, 0);
    }
    let (rows, columns) = network.weights().dim();
    let row_seen: Vec<bool> = (0..rows)
        .map(|i| (0..columns).any(|j| network.is_data(i, j)))
        .collect();
    let column_seen: Vec<bool> = (0..columns)
        .map(|j| (0..rows).any(|i| network.is_data(i, j)))
        .collect();
    let seen = |of: &[bool]| -> Vec<usize> { (0..of.len()).filter(|&at| of[at]).collect() };
    let all: Vec<usize> = (0..rows).collect();
    let turn = network.is_square() && {
        let (rows, columns) = (seen(&row_seen), seen(&column_seen));
        rows.len() < columns.len() && rows.iter().all(|i| column_seen[*i])
    };
    if turn {
        let kept = seen(&row_seen);
        let out = rows - kept.len();
        return (
            network.select(&kept, &all).transposed(),
            rows_are.opposite(),
            out,
        );
    }
    let kept = seen(&column_seen);
    if kept.len() == columns {
        return (network, rows_are, 0);
    }
    let out = columns - kept.len();
    (network.select(&all, &kept), rows_are, out)
}

/// Which parcels have a connection, and, where any entry was missing, enough entries to be compared by.
#[must_use]
pub fn standing(network: &Connectivity, weights: WeightKind, any_missing: bool) -> Vec<Standing> {
    let (rows, columns) = network.weights().dim();
    let mut connected = vec![false; rows];
    let (mut seen, mut possible) = (vec![0_usize; rows], vec![columns; rows]);
    for ((i, j), &w) in network.weights().indexed_iter() {
        if !network.is_data(i, j) {
            continue;
        }
        // Every finite logarithm stands for a connection.
        let link = w != 0.0 || weights == WeightKind::Log10;
        for parcel in [Some(i), network.row_of_column(j)].into_iter().flatten() {
            connected[parcel] |= link;
            seen[parcel] += 1;
        }
    }
    for j in 0..columns {
        if let Some(parcel) = network.row_of_column(j) {
            // Its own row has one entry less, the diagonal; its column so many more.
            possible[parcel] += rows - 2;
        }
    }
    (0..rows)
        .map(|i| {
            if any_missing && !affinity::enough_shared(seen[i] as f64, possible[i] as f64) {
                Standing::Uncovered
            } else if connected[i] {
                Standing::Placed
            } else {
                Standing::Isolated
            }
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use ndarray::{array, Array2};

    const NO: f64 = f64::NAN;

    fn read(weights: Array2<f64>) -> Connectivity {
        let labels = |n: usize| -> Vec<String> { (0..n).map(|i| format!("p{i}")).collect() };
        let (rows, columns) = weights.dim();
        let missing = weights.mapv(f64::is_nan);
        let weights = weights.mapv(|w| if w.is_nan() { 0.0 } else { w });
        Connectivity::new(labels(rows), labels(columns), weights, Some(missing)).unwrap()
    }

    #[test]
    fn one_observed_half_of_a_network_is_both() {
        let half = read(array![
            [0.0, 1.0, 2.0, 3.0],
            [NO, 0.0, 4.0, 5.0],
            [NO, NO, 0.0, 6.0],
            [NO, NO, NO, 0.0]
        ]);
        let arranged = Arranged::of(half, RowsAre::Sources, WeightKind::Counts);
        assert_eq!((arranged.missing, arranged.mirrored), (6, 6));
        assert!(!arranged.network.has_missing());
        assert_eq!(arranged.network.weights()[(3, 1)], 5.0);
    }

    #[test]
    fn a_missing_entry_of_a_directed_network_stays_missing() {
        let directed = read(array![
            [0.0, 1.0, 2.0, 3.0],
            [7.0, 0.0, 4.0, 5.0],
            [1.0, NO, 0.0, 6.0],
            [1.0, 2.0, 3.0, 0.0]
        ]);
        let arranged = Arranged::of(directed, RowsAre::Sources, WeightKind::Counts);
        assert_eq!(arranged.mirrored, 0);
        assert!(arranged.network.is_missing(2, 1));
    }

    #[test]
    fn empty_lines_are_areas_that_were_not_injected() {
        // Columns 0 and 1 were injected; parcel 4 was never seen at all.
        let injected = read(array![
            [0.0, 1.0, NO, NO, NO],
            [2.0, 0.0, NO, NO, NO],
            [1.0, 3.0, 0.0, NO, NO],
            [5.0, 1.0, NO, 0.0, NO],
            [NO, NO, NO, NO, 0.0]
        ]);
        for turned in [false, true] {
            let network = if turned {
                injected.clone().transposed()
            } else {
                injected.clone()
            };
            let arranged = Arranged::of(network, RowsAre::Sources, WeightKind::Counts);
            assert_eq!(arranged.network.column_labels(), ["p0", "p1"]);
            assert_eq!(arranged.network.weights()[(3, 0)], 5.0);
            assert_eq!(arranged.unobserved_columns, 3);
            let standing = standing(&arranged.network, WeightKind::Counts, true);
            assert_eq!(standing[4], Standing::Uncovered);
            let rows_are = if turned {
                RowsAre::Targets
            } else {
                RowsAre::Sources
            };
            assert_eq!(arranged.rows_are, rows_are);
        }
    }
}
