//! One embedding's axes brought to those of another of the same parcels: which axis is which, their
//! signs, and rotations among axes that carry nearly the same.

use nalgebra::DMatrix;
use ndarray::{s, Array2, ArrayView2};

use super::Embedding;
use crate::linalg::{from_small, small_svd};

/// Neighbouring axes carry nearly the same where the smaller eigenvalue is at least this share of the
/// larger: within such a group a sample fixes the plane, not the axes in it.
const NEARLY_THE_SAME: f64 = 0.9;

/// Brings `found` to the axes of `full`: for each axis of `full`, in order of likeness, the axis of
/// `found` most like it (cosine of coordinates over parcels, whatever its sign) that is not yet taken,
/// with its sign; then, within every group of nearly equal eigenvalues of `full`, the rotation that
/// brings them closest (orthogonal Procrustes, Schönemann 1966). Both have coordinates
/// `(parcels, axes)` of the same parcels; the result has as many axes as `full`, an axis that `found`
/// lacks being zero.
///
/// An axis of `found` that is like none of `full`, such as one that tells a parcel that lost its links
/// from all others, is so left out, wherever it stands.
#[must_use]
pub fn matched(full: &Embedding, found: &Embedding) -> Array2<f64> {
    let (wanted, there) = (&full.coordinates, &found.coordinates);
    let (axes, others) = (wanted.ncols(), there.ncols());
    let mut products = wanted.t().dot(there);
    let lengths = |c: &Array2<f64>| -> Vec<f64> {
        c.columns()
            .into_iter()
            .map(|axis| axis.dot(&axis).sqrt().max(f64::MIN_POSITIVE))
            .collect()
    };
    let (own, other) = (lengths(wanted), lengths(there));
    for ((i, j), product) in products.indexed_iter_mut() {
        *product /= own[i] * other[j];
    }
    let mut pairs: Vec<(usize, usize)> = (0..axes)
        .flat_map(|i| (0..others).map(move |j| (i, j)))
        .collect();
    pairs.sort_by(|x, y| products[*y].abs().total_cmp(&products[*x].abs()));
    let mut taken = vec![false; others];
    let mut done = vec![false; axes];
    let mut coordinates = Array2::zeros(wanted.dim());
    for (i, j) in pairs {
        if done[i] || taken[j] {
            continue;
        }
        (done[i], taken[j]) = (true, true);
        let sign = if products[(i, j)] < 0.0 { -1.0 } else { 1.0 };
        let axis = there.column(j);
        coordinates.column_mut(i).assign(&(&axis * sign));
    }
    let mut first = 0;
    while first < axes {
        let mut end = first + 1;
        while end < axes && full.eigenvalues[end] >= NEARLY_THE_SAME * full.eigenvalues[end - 1] {
            end += 1;
        }
        if end - first > 1 {
            let group = s![.., first..end];
            let rotated = coordinates
                .slice(group)
                .dot(&rotation(coordinates.slice(group), wanted.slice(group)));
            coordinates.slice_mut(group).assign(&rotated);
        }
        first = end;
    }
    coordinates
}

/// The orthogonal matrix that brings `from` closest to `to`.
fn rotation(from: ArrayView2<'_, f64>, to: ArrayView2<'_, f64>) -> Array2<f64> {
    let products = from.t().dot(&to);
    let svd = small_svd(&DMatrix::from_fn(
        products.nrows(),
        products.ncols(),
        |i, j| products[(i, j)],
    ));
    from_small(&(svd.u * svd.v.transpose()))
}

#[cfg(test)]
mod tests {
    use super::*;
    use ndarray::{array, Array1};

    fn embedding(coordinates: Array2<f64>, eigenvalues: Array1<f64>) -> Embedding {
        Embedding {
            shares: eigenvalues.clone(),
            coordinates,
            eigenvalues,
        }
    }

    fn full() -> Embedding {
        embedding(
            array![
                [0.9, 0.2, 0.1],
                [-0.8, 0.3, -0.2],
                [0.1, -0.7, 0.3],
                [-0.2, 0.2, 0.6],
                [0.0, 0.0, -0.8]
            ],
            array![0.9, 0.5, 0.48],
        )
    }

    #[test]
    fn order_and_signs_are_undone_and_a_foreign_axis_is_left_out() {
        let full = full();
        let c = &full.coordinates;
        let mut found = Array2::zeros((5, 4));
        found.column_mut(0).assign(&array![0.0, 0.0, 0.0, 1.0, 0.0]);
        found.column_mut(1).assign(&(&c.column(1) * -1.0));
        found.column_mut(2).assign(&c.column(2));
        found.column_mut(3).assign(&(&c.column(0) * -1.0));
        let found = embedding(found, array![1.0, 0.9, 0.8, 0.7]);
        approx::assert_abs_diff_eq!(matched(&full, &found), c, epsilon = 1e-12);
    }

    #[test]
    fn a_rotation_is_undone_among_nearly_equal_axes_only() {
        let full = full();
        let c = &full.coordinates;
        let (sin, cos) = 0.5_f64.sin_cos();
        let rotate = |i: usize, j: usize| {
            let mut turned = c.clone();
            let (x, y) = (c.column(i), c.column(j));
            turned.column_mut(i).assign(&(&x * cos + &y * sin));
            turned.column_mut(j).assign(&(&y * cos - &x * sin));
            embedding(turned, full.eigenvalues.clone())
        };
        approx::assert_abs_diff_eq!(matched(&full, &rotate(1, 2)), c, epsilon = 1e-12);
        let far = matched(&full, &rotate(0, 1));
        assert!((&far - c).iter().any(|gap| gap.abs() > 0.1));
    }

    #[test]
    fn what_is_lacking_is_zero() {
        let full = full();
        let one = embedding(full.coordinates.slice(s![.., 1..2]).to_owned(), array![0.5]);
        let found = matched(&full, &one);
        assert_eq!(found.column(0).to_vec(), vec![0.0; 5]);
    }
}
