//! Where a parcel falls among the other species' parcels: candidates, order, rank, nearest.

mod candidates;

pub use candidates::Candidates;

use ndarray::{Array2, ArrayView1};

use crate::domain::{Landmarks, Pair, Side};
use crate::linalg::{count_below, first_least, keep_least};

/// The parcels that are no landmark: the questions, and the candidates of the other species'.
///
/// They stand in bytewise order of their labels, so ties decided by position are decided by label.
#[must_use]
pub fn open_parcels(landmarks: &Landmarks, parcels: Pair<usize>) -> Pair<Vec<usize>> {
    Pair::from_fn(|side: Side| {
        landmarks
            .owners(side, parcels[side])
            .iter()
            .enumerate()
            .filter(|(_, owner)| owner.is_none())
            .map(|(parcel, _)| parcel)
            .collect()
    })
}

/// Positions of the candidates, best first.
#[must_use]
pub fn order(dissimilarities: ArrayView1<'_, f64>) -> Vec<usize> {
    let mut order: Vec<usize> = (0..dissimilarities.len()).collect();
    order.sort_by(|&i, &j| {
        dissimilarities[i]
            .total_cmp(&dissimilarities[j])
            .then(i.cmp(&j))
    });
    order
}

/// Rank of one candidate, 1 being the best.
#[must_use]
pub fn rank(dissimilarities: &[f64], candidate: usize) -> usize {
    let own = dissimilarities[candidate];
    let (before, after) = dissimilarities.split_at(candidate);
    // Ties before it are ahead, ties after it are not.
    1 + count_below(before, own).1 + count_below(after, own).0
}

/// For every pair the mean, over both directions, of ln(rank) / ln(candidates): 0 where each is the
/// other's first, 1 where each is the other's last. Ties share no rank: the first label is ahead.
#[must_use]
pub fn log_ranks(dissimilarities: &Array2<f64>) -> Array2<f64> {
    let (rows, columns) = dissimilarities.dim();
    let logs = |candidates: usize| -> Vec<f64> {
        let scale = if candidates > 1 {
            0.5 / (candidates as f64).ln()
        } else {
            0.0
        };
        (1..=candidates).map(|r| (r as f64).ln() * scale).collect()
    };
    let (of_row, of_column) = (logs(columns), logs(rows));
    let mut all = Array2::zeros((rows, columns));
    for (row, mut out) in dissimilarities.rows().into_iter().zip(all.rows_mut()) {
        for (place, candidate) in order(row).into_iter().enumerate() {
            out[candidate] = of_row[place];
        }
    }
    for (column, mut out) in dissimilarities.columns().into_iter().zip(all.columns_mut()) {
        for (place, candidate) in order(column).into_iter().enumerate() {
            out[candidate] += of_column[place];
        }
    }
    all
}

/// The best candidate of every row (a's parcels) and of every column (b's parcels); `None` where
/// there is no candidate. What is infinitely unlike is none (see [`Candidates::close`]).
///
/// # Panics
/// If the rows of the matrix are not contiguous.
#[must_use]
pub fn nearest(dissimilarities: &Array2<f64>) -> Pair<Vec<Option<usize>>> {
    let columns = dissimilarities.ncols();
    let mut least = vec![f64::INFINITY; columns];
    let mut first_row = vec![0; columns];
    let by_row = dissimilarities
        .rows()
        .into_iter()
        .enumerate()
        .map(|(i, row)| {
            let row = row.as_slice().expect("rows are contiguous");
            keep_least(i as u64, row, &mut least, &mut first_row);
            first_least(row)
        })
        .collect();
    Pair {
        a: by_row,
        b: first_row
            .into_iter()
            .zip(least)
            .map(|(row, least)| (least < f64::INFINITY).then_some(row as usize))
            .collect(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use ndarray::array;

    #[test]
    fn log_ranks_are_the_mean_of_both_directions() {
        let d = array![[1.0, 2.0, 3.0], [2.0, 9.0, 1.0]];
        let found = log_ranks(&d);
        let log = |rank: f64, of: f64| rank.ln() / of.ln();
        assert_eq!(found[(0, 0)], 0.0);
        assert!((found[(1, 1)] - (log(3.0, 3.0) + log(2.0, 2.0)) / 2.0).abs() < 1e-15);
        assert!((found[(0, 2)] - (log(3.0, 3.0) + log(2.0, 2.0)) / 2.0).abs() < 1e-15);
        assert!((found[(1, 0)] - (log(2.0, 3.0) + log(2.0, 2.0)) / 2.0).abs() < 1e-15);
    }

    #[test]
    fn ties_go_to_the_first_label() {
        let d = array![[2.0, 1.0, 1.0], [1.0, 3.0, 1.0]];
        assert_eq!(order(d.row(0)), [1, 2, 0]);
        assert_eq!(rank(&[2.0, 1.0, 1.0], 1), 1);
        assert_eq!(rank(&[2.0, 1.0, 1.0], 2), 2);
        assert_eq!(rank(&[2.0, 1.0, 1.0], 0), 3);
        let nearest = nearest(&d);
        assert_eq!(nearest.a, [Some(1), Some(0)]);
        assert_eq!(nearest.b, [Some(1), Some(0), Some(0)]);
    }

    #[test]
    fn what_is_no_candidate_is_nobody_s_nearest() {
        let no = f64::INFINITY;
        let found = nearest(&array![[no, 1.0], [no, no]]);
        assert_eq!(found.a, [Some(1), None]);
        assert_eq!(found.b, [None, Some(0)]);
    }
}
