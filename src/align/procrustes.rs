//! Weighted orthogonal Procrustes (Schönemann 1966, Psychometrika 31:1-10; Gower & Dijksterhuis
//! 2004, Procrustes Problems, Oxford University Press).

use linfa::dataset::DatasetBase;
use linfa::traits::{Fit, PredictInplace};
use linfa::ParamGuard;
use ndarray::{Array1, Array2};

use super::joint::{Affine, JointMap};
use super::weighted::{check_weights, AlignError, Centred};
use crate::domain::Pair;
use crate::linalg::{from_small, small_svd};

/// Singular values below this share of the largest fix no direction.
const RANK_TOLERANCE: f64 = 1e-10;

/// Whether sizes may differ.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Scaling {
    /// One scale factor is fitted.
    #[default]
    Fitted,
    /// The scale is 1.
    One,
}

/// Checked parameters of a weighted Procrustes fit.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct ProcrustesValidParams {
    weights: Option<Vec<f64>>,
    scaling: Scaling,
}

/// What a weighted Procrustes fit is asked for.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct ProcrustesParams(ProcrustesValidParams);

impl ProcrustesParams {
    /// All landmarks weighed alike, scale fitted.
    #[must_use]
    pub fn new() -> Self {
        Self::default()
    }

    /// One weight of zero or more for each landmark; only their ratios matter.
    #[must_use]
    pub fn weights(mut self, weights: Vec<f64>) -> Self {
        self.0.weights = Some(weights);
        self
    }

    /// Whether a scale is fitted.
    #[must_use]
    pub fn scaling(mut self, scaling: Scaling) -> Self {
        self.0.scaling = scaling;
        self
    }
}

impl ParamGuard for ProcrustesParams {
    type Checked = ProcrustesValidParams;
    type Error = AlignError;

    fn check_ref(&self) -> Result<&Self::Checked, Self::Error> {
        check_weights(self.0.weights.as_deref())?;
        Ok(&self.0)
    }

    fn check(self) -> Result<Self::Checked, Self::Error> {
        self.check_ref()?;
        Ok(self.0)
    }
}

/// A fitted Procrustes transformation `x -> scale (x - mean_x) rotation + mean_y`.
#[derive(Debug, Clone, PartialEq)]
pub struct Procrustes {
    /// Weighted mean of the records.
    pub mean_x: Array1<f64>,
    /// Weighted mean of the targets.
    pub mean_y: Array1<f64>,
    /// Orthogonal `(axes, axes)`, a rotation or a reflection.
    pub rotation: Array2<f64>,
    /// Size of the targets relative to the records.
    pub scale: f64,
    /// Weighted sum of squared distances between moved records and targets.
    pub residual: f64,
    /// Axes the landmarks fix.
    pub fixed: usize,
    /// Singular vectors of the cross-covariance: shared directions in each species' axes.
    left: Array2<f64>,
    right: Array2<f64>,
    singular_values: Array1<f64>,
    /// Root mean square spread of the targets relative to that of the records.
    spread_ratio: f64,
}

/// Minimises `sum_i w_i |scale x_i R + t - y_i|^2` over orthogonal R, translation t and scale.
/// Records and targets are `(landmarks, axes)`, row by row the same landmark.
impl Fit<Array2<f64>, Array2<f64>, AlignError> for ProcrustesValidParams {
    type Object = Procrustes;

    fn fit(
        &self,
        dataset: &DatasetBase<Array2<f64>, Array2<f64>>,
    ) -> Result<Procrustes, AlignError> {
        let (x, y) = (dataset.records(), dataset.targets());
        if x.ncols() != y.ncols() {
            return Err(AlignError::AxesDiffer {
                x: x.ncols(),
                y: y.ncols(),
            });
        }
        let centred = Centred::new(x.view(), y.view(), self.weights.as_deref())?;
        let svd = small_svd(&centred.products(&centred.x, &centred.y));
        let spread = |points: &Array2<f64>| {
            let squares = points.map_axis(ndarray::Axis(1), |row| row.dot(&row));
            centred.weights.dot(&squares)
        };
        let (spread_x, spread_y) = (spread(&centred.x), spread(&centred.y));
        let shared: f64 = svd.values.iter().sum();
        let scale = match self.scaling {
            Scaling::One => 1.0,
            Scaling::Fitted if spread_x > 0.0 => shared / spread_x,
            Scaling::Fitted => 1.0,
        };
        let largest = svd.values.first().copied().unwrap_or(0.0);
        Ok(Procrustes {
            rotation: from_small(&(&svd.u * svd.v.transpose())),
            scale,
            residual: (scale * scale * spread_x - 2.0 * scale * shared + spread_y).max(0.0),
            fixed: svd
                .values
                .iter()
                .filter(|s| **s > RANK_TOLERANCE * largest)
                .count(),
            spread_ratio: match self.scaling {
                Scaling::Fitted if spread_x > 0.0 && spread_y > 0.0 => (spread_y / spread_x).sqrt(),
                _ => 1.0,
            },
            left: from_small(&svd.u),
            right: from_small(&svd.v),
            singular_values: Array1::from(svd.values),
            mean_x: centred.mean_x,
            mean_y: centred.mean_y,
        })
    }
}

impl Procrustes {
    /// The joint space: both species on the shared directions of their landmarks, in order of the
    /// singular values, with the records scaled to the landmarks' spread in the targets. That scale,
    /// unlike the least-squares one, which shrinks the side that is moved, does not depend on which
    /// species comes first.
    #[must_use]
    pub fn joint(self) -> JointMap {
        JointMap {
            maps: Pair {
                a: Affine::centred(self.mean_x, self.left * self.spread_ratio),
                b: Affine::centred(self.mean_y, self.right),
            },
            agreement: self.singular_values,
            fixed: self.fixed,
        }
    }
}

/// Moves records `(parcels, axes)` into the frame of the targets.
impl PredictInplace<Array2<f64>, Array2<f64>> for Procrustes {
    fn predict_inplace(&self, records: &Array2<f64>, targets: &mut Array2<f64>) {
        let moved = (records - &self.mean_x).dot(&self.rotation) * self.scale + &self.mean_y;
        targets.assign(&moved);
    }

    fn default_target(&self, records: &Array2<f64>) -> Array2<f64> {
        Array2::zeros((records.nrows(), self.rotation.ncols()))
    }
}
