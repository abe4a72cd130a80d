//! Diffusion maps (Coifman & Lafon 2006, Appl Comput Harmon Anal 21:5-30).

use ndarray::{Array1, Array2, Axis};
use thiserror::Error;

use super::Embedding;
use crate::linalg::{fix_signs, largest_eigenpairs};

/// Eigenvalues up to this are rounding, not structure.
const SMALLEST_EIGENVALUE: f64 = 1e-10;

/// How far the walk goes.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum DiffusionTime {
    /// Coordinates are weighted by eigenvalue^t.
    Steps(f64),
    /// All times summed: eigenvalue / (1 - eigenvalue).
    AllScales,
}

impl DiffusionTime {
    /// Zero stands for all scales.
    #[must_use]
    pub fn from_number(t: f64) -> Self {
        if t == 0.0 {
            DiffusionTime::AllScales
        } else {
            DiffusionTime::Steps(t)
        }
    }

    fn weight(self, eigenvalue: f64) -> f64 {
        match self {
            DiffusionTime::Steps(t) => eigenvalue.powf(t),
            DiffusionTime::AllScales => eigenvalue / (1.0 - eigenvalue),
        }
    }
}

/// Why there is no diffusion map.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Error)]
pub enum DiffusionError {
    /// All scales were asked of a disconnected affinity, whose slowest scale is endless.
    #[error("the affinity is disconnected, so that all scales cannot be weighed together")]
    Disconnected,
}

/// Diffusion map of a symmetric affinity `(parcels, parcels)` with a positive diagonal.
///
/// With q the row sums of the affinity K, the walk runs on K' = K / (q_i q_j)^a, a the density
/// exponent. With d the row sums of K', the symmetric D^-1/2 K' D^-1/2 has eigenvalues 1 = l_0 >=
/// l_1 >= ... and unit eigenvectors v_k; coordinate k of parcel i is `w(l_k) v_k(i) / v_0(i)`. Axes
/// with eigenvalues of zero or below carry no structure and are left out, so there may be fewer
/// than `axes`.
///
/// # Errors
/// [`DiffusionError::Disconnected`] for [`DiffusionTime::AllScales`] on a disconnected affinity.
pub fn diffusion_map(
    mut affinity: Array2<f64>,
    density_exponent: f64,
    time: DiffusionTime,
    axes: usize,
) -> Result<Embedding, DiffusionError> {
    let n = affinity.nrows();
    let axes = axes.min(n.saturating_sub(1));
    let density = affinity
        .sum_axis(Axis(1))
        .mapv(|q| q.powf(-density_exponent));
    scale_both_sides(&mut affinity, &density);
    let degree = affinity.sum_axis(Axis(1));
    scale_both_sides(&mut affinity, &degree.mapv(|d| d.sqrt().recip()));
    let total = degree.sum();
    let trivial = degree.mapv(|d| (d / total).sqrt());
    let structure = affinity.diag().sum() - 1.0;
    // The trivial pair is known exactly. Taking it out, rather than the first one found, holds for
    // disconnected affinities too, where several eigenvalues are 1.
    for ((i, j), a) in affinity.indexed_iter_mut() {
        *a -= trivial[i] * trivial[j];
    }
    let (eigenvalues, vectors) = largest_eigenpairs(affinity, axes);
    let kept = eigenvalues
        .iter()
        .take_while(|l| **l > SMALLEST_EIGENVALUE)
        .count();
    let eigenvalues = Array1::from_iter(eigenvalues.iter().take(kept).map(|l| l.min(1.0)));
    if time == DiffusionTime::AllScales && eigenvalues.iter().any(|l| 1.0 - l < SMALLEST_EIGENVALUE)
    {
        return Err(DiffusionError::Disconnected);
    }
    let mut coordinates = Array2::from_shape_fn((n, kept), |(i, k)| vectors[(i, k)] / trivial[i]);
    fix_signs(&mut coordinates);
    for (mut column, l) in coordinates.columns_mut().into_iter().zip(&eigenvalues) {
        let weight = time.weight(*l);
        column.mapv_inplace(|x| x * weight);
    }
    Ok(Embedding {
        shares: eigenvalues.mapv(|l| l / structure),
        eigenvalues,
        coordinates,
    })
}

fn scale_both_sides(matrix: &mut Array2<f64>, scale: &Array1<f64>) {
    for ((i, j), x) in matrix.indexed_iter_mut() {
        *x *= scale[i] * scale[j];
    }
}
