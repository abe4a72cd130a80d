//! Ridge canonical correlation (Hotelling 1936, Biometrika 28:321-377; Vinod 1976, J Econometrics
//! 4:147-166).

use linfa::dataset::DatasetBase;
use linfa::traits::{Fit, Transformer};
use linfa::ParamGuard;
use nalgebra::DMatrix;
use ndarray::{Array1, Array2};

use super::joint::{Affine, JointMap};
use super::weighted::{check_weights, AlignError, Centred};
use crate::domain::Pair;
use crate::linalg::{from_small, principal_root_inverse, small_svd};

/// Canonical correlations below this fix no direction.
const RANK_TOLERANCE: f64 = 1e-10;

/// Checked parameters of a ridge canonical correlation.
#[derive(Debug, Clone, PartialEq)]
pub struct RidgeCcaValidParams {
    ridge: f64,
    weights: Option<Vec<f64>>,
}

/// What a ridge canonical correlation is asked for.
#[derive(Debug, Clone, PartialEq)]
pub struct RidgeCcaParams(RidgeCcaValidParams);

impl RidgeCcaParams {
    /// With k axes on a side and S their covariance at the landmarks, `ridge * trace(S) / k` is
    /// added to each variance; 0 gives the classical canonical correlation.
    #[must_use]
    pub fn new(ridge: f64) -> Self {
        RidgeCcaParams(RidgeCcaValidParams {
            ridge,
            weights: None,
        })
    }

    /// One weight of zero or more for each landmark; only their ratios matter.
    #[must_use]
    pub fn weights(mut self, weights: Vec<f64>) -> Self {
        self.0.weights = Some(weights);
        self
    }
}

impl ParamGuard for RidgeCcaParams {
    type Checked = RidgeCcaValidParams;
    type Error = AlignError;

    fn check_ref(&self) -> Result<&Self::Checked, Self::Error> {
        if !(self.0.ridge.is_finite() && self.0.ridge >= 0.0) {
            return Err(AlignError::BadRidge(self.0.ridge));
        }
        check_weights(self.0.weights.as_deref())?;
        Ok(&self.0)
    }

    fn check(self) -> Result<Self::Checked, Self::Error> {
        self.check_ref()?;
        Ok(self.0)
    }
}

/// Fitted canonical variates, in decreasing order of the regularised correlations.
#[derive(Debug, Clone, PartialEq)]
pub struct RidgeCca {
    /// Weighted mean of the records.
    pub mean_x: Array1<f64>,
    /// Weighted mean of the targets.
    pub mean_y: Array1<f64>,
    /// Canonical weights of the records `(axes, variates)`, of unit regularised variance.
    pub weights_x: Array2<f64>,
    /// Canonical weights of the targets `(axes, variates)`.
    pub weights_y: Array2<f64>,
    /// Correlations of the variates under the regularised variances, each in [0, 1].
    pub regularised: Array1<f64>,
    /// Plain weighted correlations of the variates at the landmarks.
    pub correlations: Array1<f64>,
    /// Variates the landmarks fix.
    pub fixed: usize,
}

/// Finds the pairs of directions that correlate most at the landmarks. Records and targets are
/// `(landmarks, axes)`, row by row the same landmark; the numbers of axes may differ.
impl Fit<Array2<f64>, Array2<f64>, AlignError> for RidgeCcaValidParams {
    type Object = RidgeCca;

    fn fit(&self, dataset: &DatasetBase<Array2<f64>, Array2<f64>>) -> Result<RidgeCca, AlignError> {
        let centred = Centred::new(
            dataset.records().view(),
            dataset.targets().view(),
            self.weights.as_deref(),
        )?;
        let own_x = centred.products(&centred.x, &centred.x);
        let own_y = centred.products(&centred.y, &centred.y);
        let cross = centred.products(&centred.x, &centred.y);
        let whiten = |own: &DMatrix<f64>| {
            let axes = own.nrows();
            let extra = self.ridge * own.trace() / axes.max(1) as f64;
            principal_root_inverse(own + DMatrix::identity(axes, axes) * extra)
        };
        let (whiten_x, whiten_y) = (whiten(&own_x), whiten(&own_y));
        let svd = small_svd(&(&whiten_x * &cross * &whiten_y));
        let mut weights_x = whiten_x * svd.u;
        let mut weights_y = whiten_y * svd.v;
        for k in 0..svd.values.len() {
            if weights_x.column(k)[weights_x.column(k).icamax()] < 0.0 {
                weights_x.column_mut(k).neg_mut();
                weights_y.column_mut(k).neg_mut();
            }
        }
        let variance = |own: &DMatrix<f64>, weights: &DMatrix<f64>, k: usize| {
            (weights.column(k).transpose() * own * weights.column(k))[(0, 0)]
        };
        let correlations = (0..svd.values.len())
            .map(|k| {
                let shared =
                    (weights_x.column(k).transpose() * &cross * weights_y.column(k))[(0, 0)];
                let own = variance(&own_x, &weights_x, k) * variance(&own_y, &weights_y, k);
                if own > 0.0 {
                    (shared / own.sqrt()).clamp(-1.0, 1.0)
                } else {
                    0.0
                }
            })
            .collect();
        Ok(RidgeCca {
            fixed: svd.values.iter().filter(|s| **s > RANK_TOLERANCE).count(),
            regularised: svd.values.iter().map(|s| s.clamp(0.0, 1.0)).collect(),
            correlations,
            weights_x: from_small(&weights_x),
            weights_y: from_small(&weights_y),
            mean_x: centred.mean_x,
            mean_y: centred.mean_y,
        })
    }
}

impl RidgeCca {
    /// The joint space: each variate weighted by its regularised correlation, so that a direction
    /// on which the landmarks hardly agree hardly counts in a distance.
    #[must_use]
    pub fn joint(self) -> JointMap {
        JointMap {
            maps: Pair {
                a: Affine::centred(self.mean_x, &self.weights_x * &self.regularised),
                b: Affine::centred(self.mean_y, &self.weights_y * &self.regularised),
            },
            agreement: self.regularised,
            fixed: self.fixed,
        }
    }
}

/// Canonical variates of new records and targets, `(parcels, variates)` each.
impl Transformer<DatasetBase<Array2<f64>, Array2<f64>>, DatasetBase<Array2<f64>, Array2<f64>>>
    for RidgeCca
{
    fn transform(
        &self,
        dataset: DatasetBase<Array2<f64>, Array2<f64>>,
    ) -> DatasetBase<Array2<f64>, Array2<f64>> {
        DatasetBase::new(
            (dataset.records() - &self.mean_x).dot(&self.weights_x),
            (dataset.targets() - &self.mean_y).dot(&self.weights_y),
        )
    }
}
