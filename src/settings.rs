//! Every choice of a run: what was asked, and what it means after defaults and checks.

mod request;

pub use request::{BadSetting, Request};

use serde::{Serialize, Serializer};

use crate::align::Alignment;
use crate::bootstrap::Resampling;
use crate::domain::{choices, Hemispheres, Seed};
use crate::embed::Method;
use crate::transport::Mass;

choices! {
    /// What ranks the counterparts.
    pub enum EvidenceChoice {
        /// All kinds, weighed by left-out landmarks.
        Mixture = "mixture",
        /// Distance after weighted Procrustes alignment.
        Procrustes = "procrustes",
        /// Distance between canonical variates.
        Canonical = "canonical",
        /// Connections with the landmarks.
        Fingerprint = "fingerprint",
        /// Canonical distance with anchors grown step by step.
        Grown = "grown",
        /// Transport between the networks, averaged over replicates.
        Transport = "transport",
    }
}

impl EvidenceChoice {
    /// The alignment that was asked for by name.
    #[must_use]
    pub fn alignment(self) -> Option<Alignment> {
        match self {
            EvidenceChoice::Procrustes => Some(Alignment::Procrustes),
            EvidenceChoice::Canonical => Some(Alignment::Canonical),
            _ => None,
        }
    }
}

choices! {
    /// How a species' connectivity becomes coordinates.
    pub enum EmbeddingChoice {
        /// Diffusion map of the affinity.
        Diffusion = "diffusion",
        /// Principal components of the profiles.
        Components = "components",
        /// Whichever left-out landmarks favour.
        Auto = "auto",
    }
}

impl From<Method> for EmbeddingChoice {
    fn from(method: Method) -> Self {
        match method {
            Method::Diffusion => EmbeddingChoice::Diffusion,
            Method::Components => EmbeddingChoice::Components,
        }
    }
}

/// How many axes the joint spaces have.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Axes {
    /// As many as left-out landmarks favour.
    Auto,
    /// A fixed number.
    Number(usize),
}

/// How many counterparts of each parcel are listed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Top {
    /// Every candidate.
    All,
    /// The best few.
    Number(usize),
}

impl Top {
    /// Counterparts listed where there are `candidates`.
    #[must_use]
    pub fn of(self, candidates: usize) -> usize {
        match self {
            Top::All => candidates,
            Top::Number(n) => n.min(candidates),
        }
    }
}

impl Serialize for Axes {
    fn serialize<S: Serializer>(&self, to: S) -> Result<S::Ok, S::Error> {
        match self {
            Axes::Auto => to.serialize_str("auto"),
            Axes::Number(n) => to.serialize_u64(*n as u64),
        }
    }
}

impl Serialize for Top {
    fn serialize<S: Serializer>(&self, to: S) -> Result<S::Ok, S::Error> {
        match self {
            Top::All => to.serialize_str("all"),
            Top::Number(n) => to.serialize_u64(*n as u64),
        }
    }
}

/// Everything that shapes the numbers of a run.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct Settings {
    /// Bootstrap replicates.
    pub replicates: usize,
    /// How many of them also rank, for rank intervals.
    pub rank_replicates: usize,
    /// How many of them also draw subjects again, where a species has any.
    pub subject_replicates: usize,
    /// Seed of every random draw.
    pub seed: Seed,
    /// Axes of the joint spaces.
    pub axes: Axes,
    /// How a species' connectivity becomes coordinates.
    pub embedding: EmbeddingChoice,
    /// Density exponent of the diffusion map, in [0, 1].
    pub density_exponent: f64,
    /// Diffusion time; 0 weighs all scales together.
    pub diffusion_time: f64,
    /// What ranks the counterparts.
    pub evidence: EvidenceChoice,
    /// Mass of parcels in transport.
    pub mass: Mass,
    /// Replicates of transport that are averaged.
    pub transport_replicates: usize,
    /// Ridge of the canonical correlation, in units of the landmarks' mean variance.
    pub ridge: f64,
    /// How landmark blocks are drawn in a replicate.
    pub resampling: Resampling,
    /// What hemispheres mean.
    pub hemispheres: Hemispheres,
    /// Counterparts listed for each parcel.
    pub top: Top,
    /// Level of candidate sets.
    pub level: f64,
}

/// How a run behaves; nothing here changes a number.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Conduct {
    /// Worker threads; 0 means one for each processor.
    pub threads: usize,
    /// No progress on the terminal.
    pub quiet: bool,
    /// Replace a finished run.
    pub replace: bool,
    /// Write no page and no figures.
    pub no_report: bool,
}
