//! One species' connectivity as coordinates: a diffusion map or principal components.

mod components;
mod diffusion;
mod matching;

pub use components::components;
pub use diffusion::{diffusion_map, DiffusionError, DiffusionTime};
pub use matching::matched;

use ndarray::{Array1, Array2};

use serde::Serialize;

use crate::domain::{choices, Share};

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

/// How coordinates are made of both species.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct Recipe {
    /// The method.
    pub method: Method,
    /// Share of each parcel's links, the strongest, that profiles keep; `None` as was set for the
    /// species.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub strongest: Option<Share>,
}

impl Recipe {
    /// A method on profiles as they were set.
    #[must_use]
    pub fn plain(method: Method) -> Recipe {
        Recipe {
            method,
            strongest: None,
        }
    }

    /// Its name in a sentence.
    #[must_use]
    pub fn in_words(self) -> String {
        let method = match self.method {
            Method::Diffusion => "diffusion map",
            Method::Components => "principal components",
        };
        match self.strongest {
            None => method.to_owned(),
            Some(share) => format!("{method} of the strongest {:.0} %", 100.0 * share.get()),
        }
    }
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
