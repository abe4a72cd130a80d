//! Distance in a joint space, Procrustes or canonical.

use ndarray::Array2;

use super::{Evidence, Fitted, Material, Unavailable};
use crate::align::{self, Params};
use crate::bootstrap::Stream;
use crate::domain::Pair;
use crate::linalg::squared_distances;

/// Squared distance between positions in a joint space.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct JointDistance(pub Params);

impl Evidence for JointDistance {
    fn name(&self) -> String {
        format!("{} on {} axes", self.0.alignment, self.0.axes)
    }

    fn fit<'m>(
        &self,
        material: &Material<'m>,
        weights: &[f64],
        _chance: &mut Stream,
    ) -> Result<Box<dyn Fitted + 'm>, Unavailable> {
        let map =
            align::fit(self.0, material.anchors_in(self.0.embedding), weights).map_err(|e| {
                Unavailable {
                    kind: self.name(),
                    why: e.to_string(),
                }
            })?;
        let embedded = material.embedded_in(self.0.embedding);
        Ok(Box::new(Positions::new(map.positions(embedded))))
    }
}

/// Positions of both species; those of b axis by axis, so that one parcel of a is compared with many
/// of b in step.
pub(super) struct Positions {
    a: Array2<f64>,
    b_by_axis: Array2<f64>,
    /// Squared lengths of b's positions.
    b_norms: Vec<f64>,
}

impl Positions {
    /// Takes positions `(parcels, axes)` of both species.
    pub(super) fn new(positions: Pair<Array2<f64>>) -> Positions {
        Positions {
            a: positions.a,
            b_norms: positions.b.rows().into_iter().map(|y| y.dot(&y)).collect(),
            b_by_axis: positions
                .b
                .reversed_axes()
                .as_standard_layout()
                .into_owned(),
        }
    }
}

impl Fitted for Positions {
    fn dissimilarities(&self, a: &[usize], b: &[usize], out: &mut Array2<f64>) {
        let others = Array2::from_shape_fn((self.b_by_axis.nrows(), b.len()), |(axis, j)| {
            self.b_by_axis[(axis, b[j])]
        });
        let others = others.as_slice().expect("gathered row by row above");
        let norms: Vec<f64> = b.iter().map(|&parcel| self.b_norms[parcel]).collect();
        for (mut row, &parcel) in out.rows_mut().into_iter().zip(a) {
            let row = row.as_slice_mut().expect("rows of `out` are contiguous");
            let own = self.a.row(parcel);
            let own = own.as_slice().expect("positions are stored row by row");
            squared_distances(own, others, &norms, row);
        }
    }
}
