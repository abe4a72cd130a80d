//! What comparing joint spaces over all parcels needs of the embeddings: moments, whatever the number
//! of parcels.

use ndarray::{s, Array1, Array2, Axis};

use super::joint::{Affine, JointMap, Similarity};
use crate::domain::{Pair, Side};

/// Number, mean and centred products of the parcels of both species, on leading axes.
#[derive(Debug, Clone, PartialEq)]
pub struct Moments(Pair<OfOne>);

/// The same of one species.
#[derive(Debug, Clone, PartialEq)]
struct OfOne {
    parcels: f64,
    mean: Array1<f64>,
    /// `(axes, axes)`: sums over parcels, not means.
    products: Array2<f64>,
}

impl Moments {
    /// Of the leading `axes` of two embeddings `(parcels, axes or more)`.
    #[must_use]
    pub fn new(embedded: Pair<&Array2<f64>>, axes: usize) -> Moments {
        Moments(embedded.map(|points| {
            let points = points.slice(s![.., ..axes.min(points.ncols())]);
            let mean = points.mean_axis(Axis(0)).unwrap_or_default();
            let centred = &points - &mean;
            OfOne {
                parcels: points.nrows() as f64,
                products: centred.t().dot(&centred),
                mean,
            }
        }))
    }

    /// The similarity that brings the parcels of both species, where `from` has them, as close as
    /// possible (least squares) to where `onto` has them. Maps from at most as many embedding axes
    /// as there are moments of.
    #[must_use]
    pub fn superimpose(&self, from: &JointMap, onto: &JointMap) -> Similarity {
        let (from, onto) = (from.maps.as_ref(), onto.maps.as_ref());
        let (mean_from, mean_onto) = (self.mean(from), self.mean(onto));
        let mut cross = Array2::zeros((mean_from.len(), mean_onto.len()));
        let mut spread = 0.0;
        for side in Side::BOTH {
            let one = &self.0[side];
            let (near, far) = (from[side], onto[side]);
            let moved = one.leading(near).dot(&near.matrix);
            spread += (&near.matrix * &moved).sum();
            let products = one.between(near, far);
            cross += &near.matrix.t().dot(&products.dot(&far.matrix));
            let gap = one.lands(near) - &mean_from;
            let gap_onto = one.lands(far) - &mean_onto;
            spread += one.parcels * gap.dot(&gap);
            for (mut row, x) in cross.rows_mut().into_iter().zip(&gap) {
                row.scaled_add(one.parcels * x, &gap_onto);
            }
        }
        Similarity::least_squares(&cross, spread, mean_from, mean_onto)
    }

    /// Correlation, over the parcels of both species together, of their coordinates on one axis of
    /// `x` and on one of `y`; `None` where either does not vary.
    #[must_use]
    pub fn correlation(&self, x: (&JointMap, usize), y: (&JointMap, usize)) -> Option<f64> {
        let total = self.0.a.parcels + self.0.b.parcels;
        let lands = |(map, axis): (&JointMap, usize)| {
            let each = Pair::from_fn(|side: Side| self.0[side].lands(&map.maps[side])[axis]);
            let sum = self.0.a.parcels * each.a + self.0.b.parcels * each.b;
            each.map(|at| at - sum / total)
        };
        let products = |x: (&JointMap, usize), y: (&JointMap, usize)| -> f64 {
            let (at_x, at_y) = (lands(x), lands(y));
            Side::BOTH
                .into_iter()
                .map(|side| {
                    let one = &self.0[side];
                    let (near, far) = (&x.0.maps[side], &y.0.maps[side]);
                    let within = one.between(near, far).dot(&far.matrix.column(y.1));
                    near.matrix.column(x.1).dot(&within) + one.parcels * at_x[side] * at_y[side]
                })
                .sum()
        };
        let own = products(x, x) * products(y, y);
        (own > 0.0).then(|| (products(x, y) / own.sqrt()).clamp(-1.0, 1.0))
    }

    /// Mean position of all parcels of both species.
    fn mean(&self, maps: Pair<&Affine>) -> Array1<f64> {
        let total = self.0.a.parcels + self.0.b.parcels;
        let sum =
            self.0.a.lands(maps.a) * self.0.a.parcels + self.0.b.lands(maps.b) * self.0.b.parcels;
        sum / total
    }
}

impl OfOne {
    /// Where a map puts the mean.
    fn lands(&self, map: &Affine) -> Array1<f64> {
        let mean = self.mean.slice(s![..map.origin.len()]);
        (&mean - &map.origin).dot(&map.matrix) + &map.offset
    }

    /// Products of the axes that enter a map.
    fn leading(&self, map: &Affine) -> Array2<f64> {
        self.between(map, map)
    }

    /// Products of the axes that enter one map with those that enter another.
    fn between(&self, one: &Affine, other: &Affine) -> Array2<f64> {
        self.products
            .slice(s![..one.matrix.nrows(), ..other.matrix.nrows()])
            .to_owned()
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_abs_diff_eq;
    use ndarray::{array, concatenate};

    fn space(a: Array2<f64>, b: Array2<f64>) -> JointMap {
        JointMap {
            agreement: Array1::ones(a.ncols()),
            fixed: a.ncols(),
            maps: Pair {
                a: Affine::centred(array![0.3, -0.2], a),
                b: Affine::centred(array![-0.5, 0.1], b),
            },
        }
    }

    /// From moments comes the same as from all positions.
    #[test]
    fn moments_stand_for_all_parcels() {
        let a = array![
            [0.0, 1.0, 9.0],
            [2.0, 0.5, 9.0],
            [1.0, -1.0, 9.0],
            [3.0, 3.0, 9.0]
        ];
        let b = array![[1.0, 0.4], [-2.0, 0.7], [0.3, 2.0]];
        let embedded = Pair { a: &a, b: &b };
        let moments = Moments::new(embedded, 2);
        let one = space(
            array![[1.0, 0.2], [-0.3, 0.8]],
            array![[0.5, -0.6], [0.7, 0.1]],
        );
        let two = space(
            array![[0.9, 0.4], [-0.5, 1.1]],
            array![[0.4, -0.2], [0.9, 0.3]],
        );
        let pooled = |map: &JointMap| {
            let p = map.positions(embedded);
            concatenate(Axis(0), &[p.a.view(), p.b.view()]).unwrap()
        };
        let expected = JointMap::superimpose(&pooled(&one), &pooled(&two));
        let found = moments.superimpose(&one, &two);
        assert_abs_diff_eq!(
            pooled(&one.moved(&found)),
            pooled(&one.moved(&expected)),
            epsilon = 1e-12
        );
        let (x, y) = (pooled(&one), pooled(&two));
        let centred = |z: &Array2<f64>, axis: usize| {
            let z = z.column(axis).to_owned();
            let mean = z.mean().unwrap();
            z - mean
        };
        for (i, j) in [(0, 0), (0, 1), (1, 0), (1, 1)] {
            let (u, v) = (centred(&x, i), centred(&y, j));
            assert_abs_diff_eq!(
                moments.correlation((&one, i), (&two, j)).unwrap(),
                u.dot(&v) / (u.dot(&u) * v.dot(&v)).sqrt(),
                epsilon = 1e-12
            );
        }
        let flat = space(
            array![[0.0, 0.2], [0.0, 0.8]],
            array![[0.0, -0.6], [0.0, 0.1]],
        );
        assert_eq!(moments.correlation((&flat, 0), (&one, 0)), None);
    }
}
