//! Two embeddings and their landmarks to one joint space.

mod canonical;
mod joint;
mod procrustes;
mod weighted;

pub use canonical::{RidgeCca, RidgeCcaParams, RidgeCcaValidParams};
pub use joint::{Affine, Anchorage, JointMap, Similarity};
pub use procrustes::{Procrustes, ProcrustesParams, ProcrustesValidParams, Scaling};
pub use weighted::AlignError;

use linfa::prelude::*;
use ndarray::{s, Array2};
use serde::Serialize;

use crate::domain::{choices, Pair};

choices! {
    /// How two embeddings are brought together at the landmarks.
    pub enum Alignment {
        /// Weighted Procrustes: rotation or reflection, translation, one scale.
        Procrustes = "procrustes",
        /// Ridge canonical correlation.
        Canonical = "canonical",
    }
}

impl Alignment {
    /// Both, in the order of the tables.
    pub const BOTH: [Alignment; 2] = [Alignment::Procrustes, Alignment::Canonical];

    /// Its name in a sentence.
    #[must_use]
    pub fn in_words(self) -> &'static str {
        match self {
            Alignment::Procrustes => "Procrustes",
            Alignment::Canonical => "canonical",
        }
    }
}

/// A value for each alignment.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
pub struct PerAlignment<T> {
    /// For weighted Procrustes.
    pub procrustes: T,
    /// For ridge canonical correlation.
    pub canonical: T,
}

impl<T> PerAlignment<T> {
    /// Calls `make` for Procrustes, then for canonical correlation.
    pub fn from_fn(mut make: impl FnMut(Alignment) -> T) -> Self {
        let procrustes = make(Alignment::Procrustes);
        let canonical = make(Alignment::Canonical);
        PerAlignment {
            procrustes,
            canonical,
        }
    }

    /// Like [`PerAlignment::from_fn`], stopping at the first error.
    ///
    /// # Errors
    /// The first error `make` returns.
    pub fn try_from_fn<E>(mut make: impl FnMut(Alignment) -> Result<T, E>) -> Result<Self, E> {
        let procrustes = make(Alignment::Procrustes)?;
        let canonical = make(Alignment::Canonical)?;
        Ok(PerAlignment {
            procrustes,
            canonical,
        })
    }
}

impl<T> std::ops::Index<Alignment> for PerAlignment<T> {
    type Output = T;

    fn index(&self, alignment: Alignment) -> &T {
        match alignment {
            Alignment::Procrustes => &self.procrustes,
            Alignment::Canonical => &self.canonical,
        }
    }
}

impl<T> std::ops::IndexMut<Alignment> for PerAlignment<T> {
    fn index_mut(&mut self, alignment: Alignment) -> &mut T {
        match alignment {
            Alignment::Procrustes => &mut self.procrustes,
            Alignment::Canonical => &mut self.canonical,
        }
    }
}

/// Everything that defines a joint space besides the landmarks' weights.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Params {
    /// The alignment.
    pub alignment: Alignment,
    /// Leading axes of each embedding that enter, and axes of the joint space.
    pub axes: usize,
    /// Ridge of the canonical correlation, in units of the landmarks' mean variance.
    pub ridge: f64,
    /// Which of the embeddings that were tried, where there were several.
    #[serde(skip)]
    pub embedding: usize,
}

/// Aligns at the landmarks. `anchors` are the landmarks' coordinates `(landmarks, axes or more)` in
/// each species' embedding, `weights` one number of zero or more each, zero meaning left out.
///
/// # Errors
/// [`AlignError`] for weights or shapes that cannot be used.
pub fn fit(
    params: Params,
    anchors: Pair<&Array2<f64>>,
    weights: &[f64],
) -> Result<JointMap, AlignError> {
    let leading = |all: &Array2<f64>| all.slice(s![.., ..params.axes.min(all.ncols())]).to_owned();
    let dataset = DatasetBase::new(leading(anchors.a), leading(anchors.b));
    match params.alignment {
        Alignment::Procrustes => Ok(ProcrustesParams::new()
            .weights(weights.to_vec())
            .fit(&dataset)?
            .joint()),
        Alignment::Canonical => Ok(RidgeCcaParams::new(params.ridge)
            .weights(weights.to_vec())
            .fit(&dataset)?
            .joint()),
    }
}
