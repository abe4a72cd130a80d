//! Matrices of a dozen rows: the sizes of axes and landmarks.

use faer::MatRef;
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

/// Singular value decomposition, with as many singular vectors as the smaller side even where the
/// matrix is singular. By faer: nalgebra's (0.35) does not give the matrix back where singular values
/// are equal or zero, which few landmarks on many axes make them.
///
/// # Panics
/// If an entry is not finite.
#[must_use]
pub fn small_svd(matrix: &DMatrix<f64>) -> SmallSvd {
    let (rows, columns) = matrix.shape();
    let svd = MatRef::from_column_major_slice(matrix.as_slice(), rows, columns)
        .thin_svd()
        .expect("a finite matrix has singular values");
    let (u, values, v) = (svd.U(), svd.S().column_vector(), svd.V());
    SmallSvd {
        u: DMatrix::from_fn(rows, u.ncols(), |i, j| u[(i, j)]),
        values: values.iter().copied().collect(),
        v: DMatrix::from_fn(columns, v.ncols(), |i, j| v[(i, j)]),
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
