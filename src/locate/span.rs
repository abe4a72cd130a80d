//! How far outside the landmarks' span a parcel lies: placing it there is extrapolation.

use nalgebra::{DMatrix, DVector};
use ndarray::{s, Array1, Array2, ArrayView1, Axis};

use crate::align::Params;
use crate::domain::{Pair, Side};
use crate::evidence::Material;
use crate::linalg::principal_root_inverse;

/// Added to each variance, in units of their mean, so that a few landmarks on many axes do not
/// declare every direction they happen to miss infinitely far.
const RIDGE: f64 = 0.1;

/// Where landmarks lie in one species' embedding.
struct Span {
    mean: Array1<f64>,
    root: DMatrix<f64>,
    landmarks: f64,
}

impl Span {
    /// Of landmarks `(landmarks, axes)`.
    fn of(anchors: &Array2<f64>) -> Span {
        let (landmarks, axes) = (anchors.nrows() as f64, anchors.ncols());
        let mean = anchors.mean_axis(Axis(0)).unwrap_or_default();
        let centred = anchors - &mean;
        let covariance = DMatrix::from_fn(axes, axes, |i, j| {
            centred.column(i).dot(&centred.column(j)) / landmarks
        });
        let extra = RIDGE * covariance.trace() / axes.max(1) as f64;
        Span {
            mean,
            root: principal_root_inverse(covariance + DMatrix::identity(axes, axes) * extra),
            landmarks,
        }
    }

    /// Mahalanobis distance of a point from the landmarks' mean.
    fn distance(&self, point: ArrayView1<'_, f64>) -> f64 {
        let axes = self.mean.len();
        let gap = DVector::from_iterator(axes, point.iter().zip(&self.mean).map(|(x, m)| x - m));
        (&self.root * gap).norm()
    }

    /// Leverage of a point in a linear regression on the landmarks (with the ridge above).
    fn leverage(&self, point: ArrayView1<'_, f64>) -> f64 {
        (1.0 + self.distance(point).powi(2)) / self.landmarks
    }
}

fn leading(all: &Array2<f64>, axes: usize) -> Array2<f64> {
    all.slice(s![.., ..axes.min(all.ncols())]).to_owned()
}

/// Mahalanobis distance of every parcel from the landmarks' mean, in its own species' embedding on
/// the leading `axes`, as a multiple of the largest such distance of a landmark.
#[must_use]
pub fn beyond_landmarks(material: &Material<'_>, axes: usize) -> Pair<Vec<f64>> {
    Pair::from_fn(|side| {
        let anchors = leading(&material.anchors[side], axes);
        let span = Span::of(&anchors);
        let furthest = anchors
            .rows()
            .into_iter()
            .map(|anchor| span.distance(anchor))
            .fold(0.0, f64::max)
            .max(f64::MIN_POSITIVE);
        leading(material.embedded()[side], axes)
            .rows()
            .into_iter()
            .map(|parcel| span.distance(parcel) / furthest)
            .collect()
    })
}

/// How much larger the error of pairs is to be expected than amidst the landmarks: the square root of
/// 1 + leverage, as of predictions by a linear regression (textbook result), with the mean leverage of
/// both parcels among the landmarks of other blocks than those `without`.
///
/// A fit errs more the further it is stretched, so distances are compared after division by it.
#[must_use]
pub fn strain(
    material: &Material<'_>,
    space: Params,
    without: &[usize],
    pairs: &[Pair<usize>],
) -> Vec<f64> {
    let kept: Vec<usize> = (0..material.landmarks.len())
        .filter(|&at| !without.contains(&material.landmarks.list()[at].block))
        .collect();
    let (own, embedded) = (
        material.anchors_in(space.embedding),
        material.embedded_in(space.embedding),
    );
    let spans = Pair::from_fn(|side: Side| {
        let anchors = own[side].select(Axis(0), &kept);
        Span::of(&leading(&anchors, space.axes))
    });
    pairs
        .iter()
        .map(|pair| {
            let leverage =
                Pair::from_fn(|side: Side| spans[side].leverage(embedded[side].row(pair[side])));
            (1.0 + (leverage.a + leverage.b) / 2.0).sqrt()
        })
        .collect()
}
