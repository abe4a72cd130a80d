//! One species' connectivity as coordinates: a diffusion map or principal components.

mod components;
mod diffusion;
mod matching;

pub use components::components;
pub use diffusion::{diffusion_map, DiffusionError, DiffusionTime};
pub use matching::matched;

use ndarray::{Array1, Array2};

use crate::domain::choices;

choices! {
    /// How a species' connectivity becomes coordinates.
    pub enum Method {
        /// Diffusion map of the affinity (Coifman & Lafon 2006).
        Diffusion = "diffusion",
        /// Principal components of the profiles (Hotelling 1933).
        Components = "components",
    }
}

impl Method {
    /// The default.
    pub const OF_SQUARE: Method = Method::Diffusion;
    /// The default where a network is rectangular: short profiles leave many pairs of parcels without
    /// any common partner, and a diffusion map spends its first axes on the pieces that fall off
    /// (measured, docs/method.md).
    pub const OF_RECTANGULAR: Method = Method::Components;
}

/// Coordinates of one species' parcels.
#[derive(Debug, Clone, PartialEq)]
pub struct Embedding {
    /// `(parcels, axes)`, axes in decreasing importance.
    pub coordinates: Array2<f64>,
    /// What each axis carries: eigenvalues of the diffusion operator, or variances of the
    /// components.
    pub eigenvalues: Array1<f64>,
    /// The same as a share of the sum over all axes there are, kept or not.
    pub shares: Array1<f64>,
}

impl Embedding {
    /// Number of axes.
    #[must_use]
    pub fn axes(&self) -> usize {
        self.coordinates.ncols()
    }
}
