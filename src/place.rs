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
