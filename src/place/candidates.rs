//! Which parcels of the other species may be a parcel's counterparts at all.

use ndarray::Array2;

use crate::domain::{Hemisphere, Pair, Side};

/// Admissible pairs of a parcel of a and a parcel of b. The one place that knows of restrictions:
/// ranking, left-out landmarks and chance ask here.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Candidates {
    /// Side of each parcel where sides are matched.
    hemispheres: Option<Pair<Vec<Option<Hemisphere>>>>,
}

impl Candidates {
    /// Every parcel of the other species.
    #[must_use]
    pub fn everywhere() -> Candidates {
        Candidates::default()
    }

    /// Parcels of the same side; the midline and parcels without a side match any. Takes the side of
    /// every parcel of both species.
    #[must_use]
    pub fn same_side(hemispheres: Pair<Vec<Option<Hemisphere>>>) -> Candidates {
        Candidates {
            hemispheres: Some(hemispheres),
        }
    }

    /// Whether a parcel of species `from` and one of the other may be counterparts.
    #[must_use]
    pub fn admit(&self, from: Side, parcel: usize, candidate: usize) -> bool {
        self.hemispheres.as_ref().is_none_or(|hemispheres| {
            match (
                hemispheres[from][parcel],
                hemispheres[from.opposite()][candidate],
            ) {
                (Some(own), Some(other)) => own.matches(other),
                _ => true,
            }
        })
    }

    /// Makes parcels that may not be counterparts infinitely unlike, so that they come after all
    /// others and are nobody's nearest. `out[(i, j)]` belongs to `a[i]` and `b[j]`, as in
    /// [`Fitted::dissimilarities`](crate::evidence::Fitted::dissimilarities).
    pub fn close(&self, a: &[usize], b: &[usize], out: &mut Array2<f64>) {
        if self.hemispheres.is_none() {
            return;
        }
        for (mut row, &parcel) in out.rows_mut().into_iter().zip(a) {
            for (entry, &candidate) in row.iter_mut().zip(b) {
                if !self.admit(Side::A, parcel, candidate) {
                    *entry = f64::INFINITY;
                }
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use Hemisphere::{Left, Midline, Right};

    #[test]
    fn only_a_known_other_side_is_closed() {
        let candidates = Candidates::same_side(Pair {
            a: vec![Some(Left), Some(Midline), None],
            b: vec![Some(Left), Some(Right), None],
        });
        let mut out = Array2::zeros((3, 3));
        candidates.close(&[0, 1, 2], &[0, 1, 2], &mut out);
        for ((i, j), unlike) in out.indexed_iter() {
            let closed = (i, j) == (0, 1);
            assert_eq!(*unlike == f64::INFINITY, closed, "{i} {j}");
            assert_eq!(candidates.admit(Side::A, i, j), !closed);
            assert_eq!(candidates.admit(Side::B, j, i), !closed);
        }
        let mut out = Array2::zeros((1, 1));
        Candidates::everywhere().close(&[0], &[1], &mut out);
        assert_eq!(out[(0, 0)], 0.0);
    }
}
