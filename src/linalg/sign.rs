//! The sign of an eigenvector is arbitrary; one rule fixes it everywhere.

use ndarray::{Array2, ArrayView1};

/// Turns every column so that its entry of largest magnitude is positive; of equals the first counts.
pub fn fix_signs(columns: &mut Array2<f64>) {
    for mut column in columns.columns_mut() {
        if leading_entry(column.view()) < 0.0 {
            column.mapv_inplace(|x| -x);
        }
    }
}

/// The entry of largest magnitude; 0 for an empty column.
pub fn leading_entry(column: ArrayView1<'_, f64>) -> f64 {
    column.iter().fold(
        0.0,
        |best: f64, x| if x.abs() > best.abs() { *x } else { best },
    )
}
