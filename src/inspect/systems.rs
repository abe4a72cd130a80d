//! Communities of parcels by modularity (Newman 2006, Proc Natl Acad Sci USA 103:8577-8582).

use ndarray::{Array1, Array2};

use crate::linalg::largest_eigenpairs;

/// A split must raise the modularity by more than this; less is rounding.
const SMALLEST_GAIN: f64 = 1e-9;

/// Divides a symmetric affinity `(parcels, parcels)` into communities: groups whose members are more
/// alike than the parcels' total affinities would make them.
///
/// A group is divided in two by the signs of the leading eigenvector of its modularity matrix, single
/// parcels then change sides as long as that helps, and both halves are divided again until no
/// division raises the modularity. Nothing is drawn at random and nothing is to be set. Groups come
/// in decreasing size, members in order; the diagonal is not used.
#[must_use]
pub fn systems(affinity: &Array2<f64>) -> Vec<Vec<usize>> {
    let n = affinity.nrows();
    let mut links = affinity.clone();
    links.diag_mut().fill(0.0);
    let degree: Array1<f64> = links.rows().into_iter().map(|row| row.sum()).collect();
    let total = degree.sum();
    let mut done = Vec::new();
    let mut waiting = vec![(0..n).collect::<Vec<usize>>()];
    while let Some(group) = waiting.pop() {
        match split(&group, &links, &degree, total) {
            Some((one, other)) => waiting.extend([other, one]),
            None if group.is_empty() => {}
            None => done.push(group),
        }
    }
    done.sort_by(|x, y| y.len().cmp(&x.len()).then(x.cmp(y)));
    done
}

/// The better of two halves and the whole; `None` for the whole.
fn split(
    group: &[usize],
    links: &Array2<f64>,
    degree: &Array1<f64>,
    total: f64,
) -> Option<(Vec<usize>, Vec<usize>)> {
    let n = group.len();
    if n < 2 || total <= 0.0 {
        return None;
    }
    let mut excess = Array2::from_shape_fn((n, n), |(i, j)| {
        let (i, j) = (group[i], group[j]);
        (links[(i, j)] - degree[i] * degree[j] / total) / total
    });
    for i in 0..n {
        let within = excess.row(i).sum();
        excess[(i, i)] -= within;
    }
    // No eigenvalue exceeds the largest sum of sizes in a row; the solver wants them within 1.
    let bound = excess
        .rows()
        .into_iter()
        .map(|row| row.iter().map(|x| x.abs()).sum::<f64>())
        .fold(0.0, f64::max);
    if bound <= SMALLEST_GAIN {
        return None;
    }
    let (_, vectors) = largest_eigenpairs(&excess / bound, 1);
    let mut side: Array1<f64> = vectors.column(0).mapv(|x| if x < 0.0 { -1.0 } else { 1.0 });
    settle(&excess, &mut side);
    let gain = side.dot(&excess.dot(&side)) / 2.0;
    let half = |sign: f64| -> Vec<usize> {
        let kept = (0..n).filter(|&i| side[i] == sign);
        kept.map(|i| group[i]).collect()
    };
    let halves = (half(1.0), half(-1.0));
    (gain > SMALLEST_GAIN && !halves.0.is_empty() && !halves.1.is_empty()).then_some(halves)
}

/// Lets parcels change sides, the most useful first, as long as the modularity rises.
fn settle(excess: &Array2<f64>, side: &mut Array1<f64>) {
    let n = side.len();
    let mut pull = excess.dot(side);
    // Each change raises the modularity, so it ends by itself; the bound is for rounding.
    for _ in 0..4 * n {
        let gain = |i: usize| 2.0 * (excess[(i, i)] - side[i] * pull[i]);
        let Some(best) = (0..n).max_by(|&i, &j| gain(i).total_cmp(&gain(j)).then(j.cmp(&i))) else {
            return;
        };
        if gain(best) <= SMALLEST_GAIN {
            return;
        }
        let step = -2.0 * side[best];
        pull.scaled_add(step, &excess.column(best));
        side[best] = -side[best];
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Groups of the given sizes, alike within and hardly between.
    fn groups(sizes: &[usize], within: f64, between: f64) -> Array2<f64> {
        let of: Vec<usize> = sizes
            .iter()
            .enumerate()
            .flat_map(|(g, n)| std::iter::repeat_n(g, *n))
            .collect();
        Array2::from_shape_fn((of.len(), of.len()), |(i, j)| {
            match (i == j, of[i] == of[j]) {
                (true, _) => 1.0,
                (_, true) => within,
                _ => between,
            }
        })
    }

    #[test]
    fn planted_groups_are_found() {
        let found = systems(&groups(&[3, 6, 4], 0.8, 0.1));
        assert_eq!(
            found,
            [
                (3..9).collect::<Vec<_>>(),
                (9..13).collect(),
                (0..3).collect()
            ]
        );
    }

    #[test]
    fn what_has_no_groups_stays_together() {
        assert_eq!(
            systems(&groups(&[7], 0.5, 0.0)),
            [(0..7).collect::<Vec<_>>()]
        );
        assert_eq!(systems(&Array2::eye(3)), [[0, 1, 2]]);
    }

    #[test]
    fn parts_without_any_likeness_are_groups() {
        let found = systems(&groups(&[5, 5], 0.4, 0.0));
        assert_eq!(found, [(0..5).collect::<Vec<_>>(), (5..10).collect()]);
    }
}
