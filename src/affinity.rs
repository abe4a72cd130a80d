//! How alike two parcels of one species are: by the profiles of their connections.

use ndarray::linalg::general_mat_mul;
use ndarray::{concatenate, Array1, Array2, ArrayView2, Axis};

use crate::domain::{choices, Share, WeightKind};

choices! {
    /// How two profiles are compared.
    pub enum Likeness {
        /// Cosine of the angle between them.
        Cosine = "cosine",
        /// Pearson correlation.
        Pearson = "pearson",
    }
}

/// How affinities are made from strengths.
#[derive(Debug, Clone, Copy, PartialEq, serde::Serialize)]
pub struct Params {
    /// How profiles are compared.
    pub likeness: Likeness,
    /// Share of each parcel's links, the strongest, that its profile keeps; 1 keeps all.
    pub strongest: Share,
}

/// Share of links kept by default for correlations: nearly every pair of regions correlates a
/// little, and the tail carries more noise than structure.
const STRONGEST_CORRELATIONS: f64 = 0.1;

impl Params {
    /// The default for weights of a kind.
    #[must_use]
    pub fn default_for(weights: WeightKind) -> Params {
        Params {
            likeness: Likeness::Cosine,
            strongest: match weights {
                WeightKind::Correlations => {
                    Share::new(STRONGEST_CORRELATIONS).unwrap_or(Share::ALL)
                }
                _ => Share::ALL,
            },
        }
    }
}

/// The profile of every parcel: its links to all others, and in a directed network the links it
/// receives beside them. Kept apart, so that they need not be copied side by side.
#[derive(Debug, Clone)]
pub struct Profiles {
    outgoing: Array2<f64>,
    incoming: Option<Array2<f64>>,
}

impl Profiles {
    /// Takes strengths `(parcels, parcels)`; each half of a profile is cut to its strongest links.
    #[must_use]
    pub fn new(strengths: ArrayView2<'_, f64>, strongest: Share) -> Profiles {
        let directed = is_directed(strengths);
        let half = |view: ArrayView2<'_, f64>| {
            let mut half = view.as_standard_layout().into_owned();
            keep_strongest(&mut half, strongest);
            half
        };
        Profiles {
            outgoing: half(strengths),
            incoming: directed.then(|| half(strengths.t())),
        }
    }

    /// Number of entries of a profile.
    #[must_use]
    pub fn width(&self) -> usize {
        self.halves().map(Array2::ncols).sum()
    }

    /// All profiles, one a row: `(parcels, width)`.
    #[must_use]
    pub fn matrix(&self) -> Array2<f64> {
        let halves: Vec<ArrayView2<'_, f64>> = self.halves().map(Array2::view).collect();
        concatenate(Axis(1), &halves).expect("both halves have a row for each parcel")
    }

    /// All profiles scaled so that products of rows are their likenesses: of unit length, and for
    /// Pearson of zero mean. What is compared is then the pattern of links, not their number.
    #[must_use]
    pub fn standardised(&self, likeness: Likeness) -> Array2<f64> {
        let mut profiles = self.matrix();
        for mut profile in profiles.rows_mut() {
            let before = profile.dot(&profile);
            if likeness == Likeness::Pearson {
                let mean = profile.mean().unwrap_or(0.0);
                profile.mapv_inplace(|x| x - mean);
            }
            let square = profile.dot(&profile);
            // What is left of a constant profile after centring is rounding, not a pattern.
            let is_pattern = square > before * f64::EPSILON * profile.len() as f64;
            let scale = if is_pattern {
                square.sqrt().recip()
            } else {
                0.0
            };
            profile.mapv_inplace(|x| x * scale);
        }
        profiles
    }

    fn halves(&self) -> impl Iterator<Item = &Array2<f64>> {
        std::iter::once(&self.outgoing).chain(self.incoming.as_ref())
    }

    /// Affinities `(parcels, parcels)`: symmetric, in [0, 1], one on the diagonal. Unlikeness beyond
    /// independence (a negative cosine or correlation) counts as none.
    #[must_use]
    pub fn affinity(&self, likeness: Likeness) -> Array2<f64> {
        let n = self.outgoing.nrows();
        let mut gram = Array2::zeros((n, n));
        for half in self.halves() {
            general_mat_mul(1.0, half, &half.t(), 1.0, &mut gram);
        }
        if likeness == Likeness::Pearson {
            let width = self.width() as f64;
            let means: Array1<f64> = self
                .halves()
                .fold(Array1::zeros(n), |sum, half| sum + half.sum_axis(Axis(1)))
                / width;
            for ((i, j), g) in gram.indexed_iter_mut() {
                *g -= width * means[i] * means[j];
            }
        }
        // What is left of a constant profile after centring is rounding, not likeness.
        let floor = gram.diag().iter().copied().fold(0.0, f64::max) * f64::EPSILON * n as f64;
        let inverse: Array1<f64> = gram.diag().mapv(|norm| {
            if norm > floor {
                norm.sqrt().recip()
            } else {
                0.0
            }
        });
        for i in 0..n {
            for j in 0..i {
                let likeness = (gram[(i, j)] * inverse[i] * inverse[j]).clamp(0.0, 1.0);
                gram[(i, j)] = likeness;
                gram[(j, i)] = likeness;
            }
            gram[(i, i)] = 1.0;
        }
        gram
    }
}

/// Whether links differ by direction.
#[must_use]
pub fn is_directed(strengths: ArrayView2<'_, f64>) -> bool {
    strengths != strengths.t()
}

/// Keeps in each row the strongest share of its links and every tie with the weakest kept; what is
/// cut, and everything negative, becomes zero. A share of 1 leaves the row as it is.
fn keep_strongest(rows: &mut Array2<f64>, share: Share) {
    if share == Share::ALL {
        return;
    }
    let others = rows.ncols().saturating_sub(1) as f64;
    // The slack keeps 0.55 x 100 at 55 in spite of rounding.
    let keep = ((share.get() * others - 1e-9).ceil() as usize).max(1);
    for mut row in rows.rows_mut() {
        let mut positive: Vec<f64> = row.iter().copied().filter(|x| *x > 0.0).collect();
        positive.sort_by(|x, y| y.total_cmp(x));
        let weakest = positive
            .get(keep.min(positive.len()).wrapping_sub(1))
            .copied()
            .unwrap_or(f64::INFINITY);
        row.mapv_inplace(|x| if x >= weakest { x } else { 0.0 });
    }
}
