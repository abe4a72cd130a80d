//! Weighted means and cross-products of landmark coordinates.

use nalgebra::DMatrix;
use ndarray::{Array1, Array2, ArrayView2, Axis};
use thiserror::Error;

/// Why an alignment cannot be fitted.
#[derive(Debug, Error)]
pub enum AlignError {
    /// Another number of weights than landmarks.
    #[error("{weights} weights for {landmarks} landmarks")]
    WeightCount {
        /// Weights given.
        weights: usize,
        /// Rows of coordinates.
        landmarks: usize,
    },
    /// A weight below zero, or not finite.
    #[error("weights must be finite and not negative, found {0}")]
    BadWeight(f64),
    /// Nothing to fit to.
    #[error("at least two landmarks need a weight above zero, found {0}")]
    TooFew(usize),
    /// A coordinate that is not finite.
    #[error("coordinates must be finite")]
    NotFinite,
    /// No axes to align on.
    #[error("at least one axis is needed on either side")]
    NoAxes,
    /// A ridge below zero, or not finite.
    #[error("the ridge must be finite and not negative, found {0}")]
    BadRidge(f64),
    /// Both sides must have as many axes for a rotation.
    #[error("a rotation needs as many axes on both sides, found {x} and {y}")]
    AxesDiffer {
        /// Axes of the first.
        x: usize,
        /// Axes of the second.
        y: usize,
    },
    /// Landmarks of both sides must match row by row.
    #[error("{x} landmarks on one side, {y} on the other")]
    RowsDiffer {
        /// Rows of the first.
        x: usize,
        /// Rows of the second.
        y: usize,
    },
    /// Passed on from linfa.
    #[error(transparent)]
    Linfa(#[from] linfa::error::Error),
}

/// Weights must be finite and not negative.
pub fn check_weights(weights: Option<&[f64]>) -> Result<(), AlignError> {
    match weights
        .unwrap_or_default()
        .iter()
        .find(|w| !(w.is_finite() && **w >= 0.0))
    {
        Some(bad) => Err(AlignError::BadWeight(*bad)),
        None => Ok(()),
    }
}

/// Both sides' landmarks, centred at their weighted means, with weights that sum to 1.
pub struct Centred {
    pub weights: Array1<f64>,
    pub mean_x: Array1<f64>,
    pub mean_y: Array1<f64>,
    pub x: Array2<f64>,
    pub y: Array2<f64>,
}

impl Centred {
    /// `None` weighs all landmarks alike; weights were checked by [`check_weights`].
    pub fn new(
        x: ArrayView2<'_, f64>,
        y: ArrayView2<'_, f64>,
        weights: Option<&[f64]>,
    ) -> Result<Centred, AlignError> {
        let landmarks = x.nrows();
        if y.nrows() != landmarks {
            return Err(AlignError::RowsDiffer {
                x: landmarks,
                y: y.nrows(),
            });
        }
        if x.ncols() == 0 || y.ncols() == 0 {
            return Err(AlignError::NoAxes);
        }
        if x.iter().chain(&y).any(|value| !value.is_finite()) {
            return Err(AlignError::NotFinite);
        }
        let weights = match weights {
            None => Array1::ones(landmarks),
            Some(given) if given.len() == landmarks => Array1::from(given.to_vec()),
            Some(given) => {
                return Err(AlignError::WeightCount {
                    weights: given.len(),
                    landmarks,
                })
            }
        };
        let used = weights.iter().filter(|w| **w > 0.0).count();
        if used < 2 {
            return Err(AlignError::TooFew(used));
        }
        let weights = &weights / weights.sum();
        let mean_x = weights.dot(&x);
        let mean_y = weights.dot(&y);
        Ok(Centred {
            x: &x - &mean_x,
            y: &y - &mean_y,
            weights,
            mean_x,
            mean_y,
        })
    }

    /// Weighted sum of products `(axes of left, axes of right)`.
    pub fn products(&self, left: &Array2<f64>, right: &Array2<f64>) -> DMatrix<f64> {
        let mut sum = DMatrix::zeros(left.ncols(), right.ncols());
        for ((l, r), &w) in left
            .axis_iter(Axis(0))
            .zip(right.axis_iter(Axis(0)))
            .zip(&self.weights)
        {
            for (j, &y) in r.iter().enumerate() {
                for (i, &x) in l.iter().enumerate() {
                    sum[(i, j)] += w * x * y;
                }
            }
        }
        sum
    }
}
