//! Affinities of profiles cut to few links: what is zero is neither stored nor multiplied.

use ndarray::{Array1, Array2, ArrayView2};

use super::{is_directed, keep_strongest, likenesses, Likeness};
use crate::domain::Share;

/// Up to this share of links kept the sparse way is faster and smaller than the dense one.
pub const FEW: f64 = 0.25;

/// Links that are not zero, row by row.
struct Rows {
    /// Where each row starts; one more at the end.
    starts: Vec<usize>,
    /// Column of each link, and its strength; apart, since together they would be padded.
    ends: Vec<u32>,
    links: Vec<f64>,
    columns: usize,
}

impl Rows {
    /// The strongest share of each row of `strengths`.
    fn of(strengths: ArrayView2<'_, f64>, share: Share) -> Rows {
        let mut starts = vec![0];
        let (mut ends, mut links) = (Vec::new(), Vec::new());
        for row in strengths.rows() {
            let mut row = row.to_owned();
            keep_strongest(row.view_mut(), share);
            let kept = row.iter().enumerate().filter(|(_, x)| **x != 0.0);
            for (j, x) in kept {
                ends.push(j as u32);
                links.push(*x);
            }
            starts.push(links.len());
        }
        ends.shrink_to_fit();
        links.shrink_to_fit();
        Rows {
            starts,
            ends,
            links,
            columns: strengths.ncols(),
        }
    }

    fn row(&self, i: usize) -> impl Iterator<Item = (usize, f64)> + '_ {
        let row = self.starts[i]..self.starts[i + 1];
        let ends = self.ends[row.clone()].iter().map(|j| *j as usize);
        ends.zip(self.links[row].iter().copied())
    }

    fn transposed(&self) -> Rows {
        let mut starts = vec![0; self.columns + 1];
        for j in &self.ends {
            starts[*j as usize + 1] += 1;
        }
        for at in 0..self.columns {
            starts[at + 1] += starts[at];
        }
        let mut next = starts.clone();
        let (mut ends, mut links) = (vec![0; self.ends.len()], vec![0.0; self.links.len()]);
        let rows = self.starts.len() - 1;
        for i in 0..rows {
            for (j, x) in self.row(i) {
                ends[next[j]] = i as u32;
                links[next[j]] = x;
                next[j] += 1;
            }
        }
        Rows {
            starts,
            ends,
            links,
            columns: rows,
        }
    }

    /// Adds the products of all pairs of rows to `gram`.
    fn add_products(&self, gram: &mut Array2<f64>) {
        let by_column = self.transposed();
        for (i, mut products) in gram.rows_mut().into_iter().enumerate() {
            let products = products.as_slice_mut().expect("a new array is in rows");
            for (k, x) in self.row(i) {
                for (j, y) in by_column.row(k) {
                    products[j] += x * y;
                }
            }
        }
    }
}

/// Affinities `(parcels, parcels)` of a complete square network whose profiles keep the strongest
/// `share` of their links; equal to [`Profiles::affinity`](super::Profiles::affinity) but for rounding.
#[must_use]
pub fn affinity_of_cut(
    strengths: ArrayView2<'_, f64>,
    share: Share,
    likeness: Likeness,
) -> Array2<f64> {
    let n = strengths.nrows();
    let mut halves = vec![Rows::of(strengths, share)];
    if is_directed(strengths) {
        halves.push(Rows::of(strengths.reversed_axes(), share));
    }
    let mut gram = Array2::zeros((n, n));
    for half in &halves {
        half.add_products(&mut gram);
    }
    let means: Array1<f64> = (0..n)
        .map(|i| {
            let sums = halves
                .iter()
                .map(|half| half.row(i).map(|(_, x)| x).sum::<f64>());
            sums.sum::<f64>() / (n * halves.len()) as f64
        })
        .collect();
    likenesses(gram, likeness, (n * halves.len()) as f64, &means)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::affinity::Profiles;

    /// Whatever the direction of links, the likeness and the share kept, the sparse way gives what the
    /// dense one does.
    #[test]
    fn what_is_cut_need_not_be_stored() {
        let n = 40;
        let directed = Array2::from_shape_fn((n, n), |(i, j)| {
            let wave = ((i * 31 + j * 17 + i * j) as f64).sin();
            if i == j {
                0.0
            } else {
                wave
            }
        });
        let symmetric = &directed + &directed.t();
        for strengths in [directed, symmetric] {
            for share in [0.05, 0.25] {
                for likeness in [Likeness::Cosine, Likeness::Pearson] {
                    let share = Share::new(share).unwrap();
                    let dense = Profiles::new(strengths.view(), share).affinity(likeness);
                    let sparse = affinity_of_cut(strengths.view(), share, likeness);
                    approx::assert_abs_diff_eq!(dense, sparse, epsilon = 1e-12);
                }
            }
        }
    }
}
