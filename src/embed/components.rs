//! Principal components of profiles (Hotelling 1933, J Educ Psychol 24:417-441).

use linfa::traits::{Fit, Predict};
use linfa::DatasetBase;
use linfa_reduction::Pca;
use ndarray::{s, Array1, Array2, Axis};

use super::Embedding;
use crate::linalg::{fix_signs, largest_eigenpairs};

/// Root of the total sum of squares the profiles are scaled to before the iterative solver sees
/// them: its stopping rule is absolute (1e-10 on the squared scale), so this makes it relative.
const SOLVER_SCALE: f64 = 30.0;
/// A solution is believed where no axis misses by more than this share of the total.
const RESIDUAL: f64 = 1e-11;
/// The iterative solver needs the smaller side to be this many times the axes asked for.
const SIDE_PER_AXIS: usize = 5;
/// Components with less than this share of the total variance are rounding.
const SMALLEST_SHARE: f64 = 1e-14;

/// The leading principal components of profiles `(parcels, entries)`.
///
/// Axes come from linfa-reduction. Its variances divide by the number of components, and its ratio
/// counts the kept ones only, so both are recomputed: the variance of a component is its squared
/// singular value over the number of parcels less one, its share is of the variance of all
/// components. Where its iterative solver cannot be used or has not converged (it does not say so),
/// the axes come from a dense decomposition instead.
#[must_use]
pub fn components(profiles: &Array2<f64>, axes: usize) -> Embedding {
    let n = profiles.nrows();
    let mean = profiles.mean_axis(Axis(0)).unwrap_or_default();
    let centred = profiles - &mean;
    let total: f64 = centred.iter().map(|x| x * x).sum();
    let axes = axes.min(n.saturating_sub(1)).min(profiles.ncols());
    if total == 0.0 || axes == 0 {
        return Embedding {
            coordinates: Array2::zeros((n, 0)),
            eigenvalues: Array1::zeros(0),
            shares: Array1::zeros(0),
        };
    }
    let scale = SOLVER_SCALE / total.sqrt();
    let scaled = centred * scale;
    let mut scores = iterative(&scaled, axes).unwrap_or_else(|| dense(&scaled, axes));
    fix_signs(&mut scores);
    let squares = scores.map_axis(Axis(0), |score| score.dot(&score)) / SOLVER_SCALE.powi(2);
    let kept = squares
        .iter()
        .take_while(|share| **share > SMALLEST_SHARE)
        .count();
    let shares = squares.slice(s![..kept]).to_owned();
    Embedding {
        coordinates: scores.slice(s![.., ..kept]).to_owned() / scale,
        eigenvalues: &shares * (total / (n as f64 - 1.0)),
        shares,
    }
}

/// Scores by linfa's truncated decomposition; `None` where it is out of its depth.
fn iterative(scaled: &Array2<f64>, axes: usize) -> Option<Array2<f64>> {
    let side = scaled.nrows().min(scaled.ncols());
    if side < SIDE_PER_AXIS * axes + 1 {
        return None;
    }
    let dataset = DatasetBase::from(scaled.view());
    let fitted = Pca::params(axes).fit(&dataset).ok()?;
    if fitted.components().nrows() < axes {
        return None;
    }
    let scores: Array2<f64> = fitted.predict(&scaled.view());
    let converged = scores.columns().into_iter().all(|score| {
        let square = score.dot(&score);
        let image = scaled.dot(&scaled.t().dot(&score));
        let miss = (&image - &(&score * square)).mapv(|x| x * x).sum().sqrt();
        miss <= RESIDUAL * SOLVER_SCALE.powi(2) * square.sqrt().max(f64::MIN_POSITIVE)
    });
    converged.then_some(scores)
}

/// Scores by the dense decomposition of the products of profiles.
fn dense(scaled: &Array2<f64>, axes: usize) -> Array2<f64> {
    let products = scaled.dot(&scaled.t()) / SOLVER_SCALE.powi(2);
    let (values, mut vectors) = largest_eigenpairs(products, axes);
    for (mut vector, value) in vectors.columns_mut().into_iter().zip(&values) {
        let length = value.max(0.0).sqrt() * SOLVER_SCALE;
        vector.mapv_inplace(|x| x * length);
    }
    vectors
}
