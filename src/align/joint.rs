//! The joint space: one affine map from each species' embedding.

use nalgebra::DMatrix;
use ndarray::{s, Array1, Array2, ArrayView2, Axis};

use crate::domain::{Pair, Side};
use crate::linalg::{from_small, leading_entry, small_svd};

/// A map of row vectors: `x -> (x - origin) matrix + offset`.
#[derive(Debug, Clone, PartialEq)]
pub struct Affine {
    /// Point of the embedding that maps to the offset.
    pub origin: Array1<f64>,
    /// `(embedding axes, joint axes)`.
    pub matrix: Array2<f64>,
    /// Where the origin lands.
    pub offset: Array1<f64>,
}

impl Affine {
    /// A map that sends `origin` to zero.
    #[must_use]
    pub fn centred(origin: Array1<f64>, matrix: Array2<f64>) -> Affine {
        Affine {
            offset: Array1::zeros(matrix.ncols()),
            origin,
            matrix,
        }
    }

    /// Positions `(points, joint axes)` of points with the map's embedding axes or more, of which
    /// the leading ones count.
    #[must_use]
    pub fn apply(&self, points: ArrayView2<'_, f64>) -> Array2<f64> {
        let leading = points.slice(s![.., ..self.matrix.nrows()]);
        let shift = &self.offset - &self.origin.dot(&self.matrix);
        let mut moved = leading.dot(&self.matrix);
        moved += &shift;
        moved
    }

    /// This map followed by a similarity of the joint space.
    #[must_use]
    pub fn then(&self, move_by: &Similarity) -> Affine {
        Affine {
            origin: self.origin.clone(),
            matrix: self.matrix.dot(&move_by.turn) * move_by.scale,
            offset: self.offset.dot(&move_by.turn) * move_by.scale + &move_by.shift,
        }
    }
}

/// A rotation or reflection, a scale and a shift of the joint space: `z -> scale z turn + shift`.
#[derive(Debug, Clone, PartialEq)]
pub struct Similarity {
    turn: Array2<f64>,
    scale: f64,
    shift: Array1<f64>,
}

impl Similarity {
    /// The one that brings points as close as possible (least squares) onto others, from the sums of
    /// products `(axes, axes)` of the centred points with the centred others, the points' sum of
    /// squares about their mean, and both means.
    pub(super) fn least_squares(
        cross: &Array2<f64>,
        spread: f64,
        mean_from: Array1<f64>,
        mean_onto: Array1<f64>,
    ) -> Similarity {
        let svd = small_svd(&DMatrix::from_fn(cross.nrows(), cross.ncols(), |i, j| {
            cross[(i, j)]
        }));
        let scale = if spread > 0.0 {
            svd.values.iter().sum::<f64>() / spread
        } else {
            1.0
        };
        let turn = from_small(&(&svd.u * svd.v.transpose()));
        Similarity {
            shift: mean_onto - mean_from.dot(&turn) * scale,
            turn,
            scale,
        }
    }
}

/// Points of an embedding and where a joint space has them, reduced to what superimposing other maps
/// of the same points needs: moments, whatever the number of points.
#[derive(Debug, Clone, PartialEq)]
pub struct Anchorage {
    mean: Array1<f64>,
    mean_onto: Array1<f64>,
    own: Array2<f64>,
    cross: Array2<f64>,
}

impl Anchorage {
    /// Takes the points' embedding coordinates and their positions, `(points, axes)` each.
    #[must_use]
    pub fn new(points: ArrayView2<'_, f64>, onto: &Array2<f64>) -> Anchorage {
        let mean = points.mean_axis(Axis(0)).unwrap_or_default();
        let mean_onto = onto.mean_axis(Axis(0)).unwrap_or_default();
        let centred = &points - &mean;
        Anchorage {
            own: centred.t().dot(&centred),
            cross: centred.t().dot(&(onto - &mean_onto)),
            mean,
            mean_onto,
        }
    }

    /// The similarity that brings the points, as `map` places them, as close as possible (least
    /// squares) to their anchored positions.
    #[must_use]
    pub fn similarity(&self, map: &Affine) -> Similarity {
        let cross = map.matrix.t().dot(&self.cross);
        let spread = (&map.matrix * &self.own.dot(&map.matrix)).sum();
        let mean_from = (&self.mean - &map.origin).dot(&map.matrix) + &map.offset;
        Similarity::least_squares(&cross, spread, mean_from, self.mean_onto.clone())
    }
}

/// A fitted joint space.
#[derive(Debug, Clone, PartialEq)]
pub struct JointMap {
    /// How each species enters.
    pub maps: Pair<Affine>,
    /// Per joint axis how strongly the landmarks of both species agree on it: singular value of
    /// their cross-covariance (Procrustes) or regularised canonical correlation.
    pub agreement: Array1<f64>,
    /// Joint axes the landmarks fix; along the others the space is arbitrary.
    pub fixed: usize,
}

impl JointMap {
    /// Number of joint axes.
    #[must_use]
    pub fn axes(&self) -> usize {
        self.agreement.len()
    }

    /// Positions of both species' parcels, `(parcels, joint axes)` each.
    #[must_use]
    pub fn positions(&self, embedded: Pair<&Array2<f64>>) -> Pair<Array2<f64>> {
        Pair::from_fn(|side| self.maps[side].apply(embedded[side].view()))
    }

    /// The same space in units in which the root mean square distance between a parcel of a and a
    /// parcel of b is 1, each axis turned so that the largest coordinate on it is positive.
    #[must_use]
    pub fn in_standard_units(&self, embedded: Pair<&Array2<f64>>) -> JointMap {
        let positions = self.positions(embedded);
        let unit = root_mean_square_distance(positions.as_ref());
        let scale = if unit > 0.0 { unit.recip() } else { 1.0 };
        let mut turn = Array2::zeros((self.axes(), self.axes()));
        for axis in 0..self.axes() {
            let largest = Side::BOTH
                .into_iter()
                .map(|side| leading_entry(positions[side].column(axis)))
                .fold(
                    0.0,
                    |best: f64, x| if x.abs() > best.abs() { x } else { best },
                );
            turn[(axis, axis)] = if largest < 0.0 { -1.0 } else { 1.0 };
        }
        self.moved(&Similarity {
            turn,
            scale,
            shift: Array1::zeros(self.axes()),
        })
    }

    /// The same space after a similarity, which changes no relation between parcels.
    #[must_use]
    pub fn moved(&self, by: &Similarity) -> JointMap {
        JointMap {
            maps: self.maps.as_ref().map(|map| map.then(by)),
            agreement: self.agreement.clone(),
            fixed: self.fixed,
        }
    }

    /// The similarity that brings points as close as possible (least squares) to where another space
    /// has them. Both `(points, axes)`.
    #[must_use]
    pub fn superimpose(from: &Array2<f64>, onto: &Array2<f64>) -> Similarity {
        let identity = Affine::centred(Array1::zeros(from.ncols()), Array2::eye(from.ncols()));
        Anchorage::new(from.view(), onto).similarity(&identity)
    }

    /// Share of the variance of a species' embedding (over its parcels, on the axes that enter)
    /// that each joint axis predicts on its own: the redundancy of Stewart & Love (1968, Psychol
    /// Bull 70:160-163). Shares of axes that correlate over the parcels overlap.
    #[must_use]
    pub fn shares(&self, side: Side, embedded: &Array2<f64>) -> Array1<f64> {
        let map = &self.maps[side];
        let leading = embedded.slice(s![.., ..map.matrix.nrows()]);
        let mean = leading.mean_axis(Axis(0)).unwrap_or_default();
        let centred = &leading - &mean;
        let covariance = centred.t().dot(&centred);
        let total = covariance.diag().sum();
        (0..self.axes())
            .map(|axis| {
                let direction = map.matrix.column(axis);
                let with_each = covariance.dot(&direction);
                let own = direction.dot(&with_each);
                if own > 0.0 && total > 0.0 {
                    with_each.dot(&with_each) / own / total
                } else {
                    0.0
                }
            })
            .collect()
    }
}

/// Root mean square distance over all pairs of a point of a and a point of b.
fn root_mean_square_distance(positions: Pair<&Array2<f64>>) -> f64 {
    let moments = positions.map(|points| {
        let mean = points.mean_axis(Axis(0)).unwrap_or_default();
        let variance = (points - &mean).mapv(|x| x * x).sum() / points.nrows() as f64;
        (mean, variance)
    });
    let gap = &moments.a.0 - &moments.b.0;
    (moments.a.1 + moments.b.1 + gap.dot(&gap)).sqrt()
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_abs_diff_eq;
    use ndarray::array;

    #[test]
    fn superimposing_undoes_a_similarity() {
        let points = array![[0.0, 1.0], [2.0, 0.5], [1.0, -1.0], [3.0, 3.0]];
        let moved = points.dot(&array![[0.6, 0.8], [0.8, -0.6]]) * 2.5 + array![1.0, -4.0];
        let back = JointMap::superimpose(&moved, &points);
        let identity = Affine::centred(Array1::zeros(2), Array2::eye(2));
        assert_abs_diff_eq!(
            identity.then(&back).apply(moved.view()),
            points,
            epsilon = 1e-12
        );
    }

    #[test]
    fn distances_are_measured_against_random_pairs() {
        let a = array![[0.0, 0.0], [1.0, 0.0], [5.0, 2.0]];
        let b = array![[1.0, 1.0], [0.0, 3.0]];
        let mut sum = 0.0;
        for p in a.rows() {
            for q in b.rows() {
                sum += (&p - &q).mapv(|x| x * x).sum();
            }
        }
        let found = root_mean_square_distance(Pair { a: &a, b: &b });
        assert_abs_diff_eq!(found, (sum / 6.0).sqrt(), epsilon = 1e-12);
    }
}
