//! The leading eigenpairs of a large symmetric matrix.

use faer::dyn_stack::{MemBuffer, MemStack};
use faer::matrix_free::eigen::{
    partial_eigen_scratch, partial_self_adjoint_eigen, PartialEigenParams,
};
use faer::{Col, Mat, MatRef, Par, Side};
use ndarray::{Array1, Array2, ArrayView2};

/// Up to this size a full decomposition is as fast as a partial one.
const FULL_UP_TO: usize = 150;
/// A partial solution is believed where no pair misses by more than this share of the spectrum.
const RESIDUAL: f64 = 1e-10;
/// Tolerance asked of the iteration, in the spectrum's units.
const TOLERANCE: f64 = 1e-12;

/// The `count` algebraically largest eigenvalues of a symmetric matrix with spectrum in [-1, 1], in
/// decreasing order, and their unit eigenvectors, one a column `(n, count)`.
///
/// Runs on one thread: the same matrix gives the same bits whatever else is running.
#[must_use]
pub fn largest_eigenpairs(matrix: Array2<f64>, count: usize) -> (Array1<f64>, Array2<f64>) {
    // Symmetric: turned over, it is the same matrix in the other order of storage.
    let mut matrix = if matrix.is_standard_layout() {
        matrix
    } else {
        matrix.reversed_axes().as_standard_layout().into_owned()
    };
    let n = matrix.nrows();
    let count = count.min(n);
    if count == 0 {
        return (Array1::zeros(0), Array2::zeros((n, 0)));
    }
    if n > FULL_UP_TO && 4 * count < n {
        if let Some(found) = partial(&mut matrix, count) {
            return found;
        }
    }
    full(matrix.view(), count)
}

/// Iterative solution; `None` where it did not converge. The matrix is left as it was but for
/// rounding on its diagonal.
fn partial(matrix: &mut Array2<f64>, count: usize) -> Option<(Array1<f64>, Array2<f64>)> {
    let n = matrix.nrows();
    // The solver picks by magnitude. Moving the spectrum to [0, 2] makes that the algebraic order.
    matrix.diag_mut().mapv_inplace(|x| x + 1.0);
    let solved = {
        let view = as_faer(matrix.view());
        // A fixed vector without structure of its own, so that it is orthogonal to no eigenvector.
        let start = Col::from_fn(n, |i| {
            ((i as f64 + 1.0) * 0.618_033_988_749_895).fract() - 0.3
        });
        let start = &start * faer::Scale(1.0 / start.norm_l2());
        let mut vectors = Mat::zeros(n, count);
        let mut values = vec![0.0; count];
        let params = PartialEigenParams::default();
        let mut memory = MemBuffer::new(partial_eigen_scratch(&view, count, Par::Seq, params));
        let info = partial_self_adjoint_eigen(
            vectors.as_mut(),
            &mut values,
            &view,
            start.as_ref(),
            TOLERANCE,
            Par::Seq,
            MemStack::new(&mut memory),
            params,
        );
        let residual = (0..count)
            .map(|k| {
                let v = vectors.col(k);
                (view * v - v * faer::Scale(values[k])).norm_l2()
            })
            .fold(0.0, f64::max);
        (info.n_converged_eigen >= count && residual <= RESIDUAL).then(|| {
            (
                Array1::from_iter(values.iter().map(|x| x - 1.0)),
                Array2::from_shape_fn((n, count), |(i, k)| vectors[(i, k)]),
            )
        })
    };
    matrix.diag_mut().mapv_inplace(|x| x - 1.0);
    solved
}

fn full(matrix: ArrayView2<'_, f64>, count: usize) -> (Array1<f64>, Array2<f64>) {
    let n = matrix.nrows();
    let eigen = as_faer(matrix)
        .self_adjoint_eigen(Side::Lower)
        .expect("a finite symmetric matrix has eigenvalues");
    let (values, vectors) = (eigen.S(), eigen.U());
    // faer sorts in increasing order.
    (
        Array1::from_shape_fn(count, |k| values.column_vector()[n - 1 - k]),
        Array2::from_shape_fn((n, count), |(i, k)| vectors[(i, n - 1 - k)]),
    )
}

fn as_faer<'m>(matrix: ArrayView2<'m, f64>) -> MatRef<'m, f64> {
    let (n, m) = matrix.dim();
    MatRef::from_row_major_slice(
        matrix
            .to_slice()
            .expect("brought to standard layout at the start"),
        n,
        m,
    )
}
