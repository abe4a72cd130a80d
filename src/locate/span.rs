//! How far outside the landmarks' span a parcel lies: placing it there is extrapolation.

use nalgebra::{DMatrix, DVector};
use ndarray::{s, Array2, ArrayView1, Axis};

use crate::domain::Pair;
use crate::evidence::Material;
use crate::linalg::principal_root_inverse;

/// Added to each variance, in units of their mean, so that a few landmarks on many axes do not
/// declare every direction they happen to miss infinitely far.
const RIDGE: f64 = 0.1;

/// Mahalanobis distance of every parcel from the landmarks' mean, in its own species' embedding on
/// the leading `axes`, as a multiple of the largest such distance of a landmark.
pub fn beyond_landmarks(material: &Material<'_>, axes: usize) -> Pair<Vec<f64>> {
    Pair::from_fn(|side| {
        let leading = |all: &Array2<f64>| all.slice(s![.., ..axes]).to_owned();
        let anchors = leading(&material.anchors[side]);
        let mean = anchors.mean_axis(Axis(0)).unwrap_or_default();
        let centred = &anchors - &mean;
        let covariance = DMatrix::from_fn(axes, axes, |i, j| {
            centred.column(i).dot(&centred.column(j)) / anchors.nrows() as f64
        });
        let extra = RIDGE * covariance.trace() / axes.max(1) as f64;
        let root = principal_root_inverse(covariance + DMatrix::identity(axes, axes) * extra);
        let distance = |point: ArrayView1<'_, f64>| {
            let gap = DVector::from_iterator(axes, point.iter().zip(&mean).map(|(x, m)| x - m));
            (&root * gap).norm()
        };
        let furthest = anchors
            .rows()
            .into_iter()
            .map(distance)
            .fold(0.0, f64::max)
            .max(f64::MIN_POSITIVE);
        leading(material.embedded()[side])
            .rows()
            .into_iter()
            .map(|parcel| distance(parcel) / furthest)
            .collect()
    })
}
