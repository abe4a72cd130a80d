//! Matrices of a dozen rows: the sizes of axes and landmarks, left to nalgebra.

use nalgebra::DMatrix;
use ndarray::Array2;

/// Eigenvalues below this share of the largest count as zero.
const RANK_TOLERANCE: f64 = 1e-12;

/// A singular value decomposition with values in decreasing order.
#[derive(Debug, Clone)]
pub struct SmallSvd {
    /// Left singular vectors, one a column.
    pub u: DMatrix<f64>,
    /// Singular values.
    pub values: Vec<f64>,
    /// Right singular vectors, one a column.
    pub v: DMatrix<f64>,
}

/// Singular value decomposition of a square matrix, complete even where it is singular.
#[must_use]
pub fn small_svd(matrix: DMatrix<f64>) -> SmallSvd {
    let svd = matrix.svd(true, true);
    let u = svd.u.expect("left singular vectors were asked for");
    let v_t = svd.v_t.expect("right singular vectors were asked for");
    let mut order: Vec<usize> = (0..svd.singular_values.len()).collect();
    order.sort_by(|&i, &j| svd.singular_values[j].total_cmp(&svd.singular_values[i]));
    SmallSvd {
        u: u.select_columns(&order),
        values: order.iter().map(|&i| svd.singular_values[i]).collect(),
        v: v_t.select_rows(&order).transpose(),
    }
}

/// Inverse square root of a symmetric positive semi-definite matrix; directions without variance
/// map to zero.
#[must_use]
pub fn principal_root_inverse(matrix: DMatrix<f64>) -> DMatrix<f64> {
    let eigen = matrix.symmetric_eigen();
    let floor = eigen.eigenvalues.max() * RANK_TOLERANCE;
    let mut scaled = eigen.eigenvectors.clone();
    for (mut column, &value) in scaled.column_iter_mut().zip(eigen.eigenvalues.iter()) {
        column *= if value > floor {
            value.sqrt().recip()
        } else {
            0.0
        };
    }
    scaled * eigen.eigenvectors.transpose()
}

/// Copies into ndarray's form.
#[must_use]
pub fn from_small(matrix: &DMatrix<f64>) -> Array2<f64> {
    Array2::from_shape_fn((matrix.nrows(), matrix.ncols()), |at| matrix[at])
}
