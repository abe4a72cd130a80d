//! Kinds of evidence for homology, behind one trait: from two species and their landmarks to how
//! unlike any two parcels are.

mod fingerprint;
mod grown;
mod joint_distance;
mod kind;
mod links;
mod transport;

pub use fingerprint::Fingerprint;
pub use grown::Grown;
pub use joint_distance::JointDistance;
pub use kind::Kind;
pub use links::{Expression, Links};
pub use transport::{Transport, MOST_PAIRS};

use std::sync::OnceLock;

use ndarray::{Array2, Axis};
use thiserror::Error;

use crate::bootstrap::Stream;
use crate::domain::{Landmarks, Pair};
use crate::species::Species;
use crate::transport::{Structure, Structures};

/// What every kind of evidence may use.
#[derive(Debug, Clone)]
pub struct Material<'m> {
    /// Both species.
    pub species: Pair<&'m Species>,
    /// The landmarks.
    pub landmarks: &'m Landmarks,
    /// Coordinates of the landmarks in each embedding `(landmarks, axes)`; a landmark of several
    /// parcels stands at their centroid.
    pub anchors: Pair<Array2<f64>>,
    /// The same in each embedding that was tried.
    tried: Vec<Pair<Array2<f64>>>,
    /// Links and affinities, made when a kind first asks for them.
    links: OnceLock<Pair<Links>>,
    /// What transport compares, under each expression.
    compared: [OnceLock<Compared>; Expression::ALL.len()],
}

/// Both networks under one expression.
#[derive(Debug, Clone)]
pub struct Compared {
    /// Links of each species.
    pub links: Pair<Structure>,
    /// The same, ready for transport.
    pub structures: Structures,
}

impl<'m> Material<'m> {
    /// Finds where the landmarks lie in each embedding.
    #[must_use]
    pub fn new(species: Pair<&'m Species>, landmarks: &'m Landmarks) -> Material<'m> {
        let anchors = |side, coordinates: &Array2<f64>| {
            let mut anchors = Array2::zeros((landmarks.len(), coordinates.ncols()));
            for (mut anchor, landmark) in anchors.rows_mut().into_iter().zip(landmarks.list()) {
                let members = coordinates.select(Axis(0), &landmark.parcels[side]);
                anchor.assign(
                    &members
                        .mean_axis(Axis(0))
                        .expect("a landmark has at least one parcel on each side"),
                );
            }
            anchors
        };
        let tried = species.a.tried.len().min(species.b.tried.len());
        Material {
            species,
            landmarks,
            anchors: Pair::from_fn(|side| anchors(side, &species[side].embedding.coordinates)),
            tried: (0..tried)
                .map(|at| Pair::from_fn(|side| anchors(side, &species[side].tried[at].coordinates)))
                .collect(),
            links: OnceLock::new(),
            compared: std::array::from_fn(|_| OnceLock::new()),
        }
    }

    /// The same species with other landmarks; links that were made already are kept.
    #[must_use]
    pub fn with_landmarks(&self, landmarks: &'m Landmarks) -> Material<'m> {
        Material {
            links: self.links.clone(),
            ..Material::new(self.species, landmarks)
        }
    }

    /// Links and affinities of both species.
    #[must_use]
    pub fn links(&self) -> &Pair<Links> {
        self.links.get_or_init(|| self.species.map(Links::of))
    }

    /// What transport compares under an expression. Where one network is not square both are compared
    /// by their affinities.
    #[must_use]
    pub fn compared(&self, expression: Expression) -> &Compared {
        self.compared[expression as usize].get_or_init(|| {
            let links = self.links();
            let by_affinity = !(links.a.is_square && links.b.is_square);
            let links = links
                .as_ref()
                .map(|links| links.structure(expression, by_affinity));
            Compared {
                structures: Structures::new(&links.a, &links.b),
                links,
            }
        })
    }

    /// Number of parcels of both species.
    #[must_use]
    pub fn sizes(&self) -> Pair<usize> {
        self.species.map(|species| species.parcels.len())
    }

    /// Coordinates of both species' parcels, `(parcels, axes)` each.
    #[must_use]
    pub fn embedded(&self) -> Pair<&'m Array2<f64>> {
        self.species.map(|species| &species.embedding.coordinates)
    }

    /// Number of embeddings among which landmarks choose; 1 where there is no choice.
    #[must_use]
    pub fn embeddings(&self) -> usize {
        self.tried.len().max(1)
    }

    /// [`Material::anchors`] in one of the embeddings that were tried; where none were, in the only one.
    #[must_use]
    pub fn anchors_in(&self, embedding: usize) -> Pair<&Array2<f64>> {
        self.tried.get(embedding).unwrap_or(&self.anchors).as_ref()
    }

    /// [`Material::embedded`] in one of the embeddings that were tried; where none were, in the only one.
    #[must_use]
    pub fn embedded_in(&self, embedding: usize) -> Pair<&'m Array2<f64>> {
        self.species.map(|species| {
            let embedding = species.tried.get(embedding);
            &embedding.unwrap_or(&species.embedding).coordinates
        })
    }

    /// The landmarks' own weights, with some blocks counting more or less: `block(b)` times the
    /// weight from the table, 0 for left out.
    #[must_use]
    pub fn weights(&self, block: impl Fn(usize) -> f64) -> Vec<f64> {
        self.landmarks
            .list()
            .iter()
            .map(|landmark| landmark.weight.get() * block(landmark.block))
            .collect()
    }
}

/// Why a kind of evidence has nothing to say about a study.
#[derive(Debug, Clone, PartialEq, Eq, Error)]
#[error("evidence {kind} is unavailable: {why}")]
pub struct Unavailable {
    /// The kind.
    pub kind: String,
    /// The reason.
    pub why: String,
}

/// A kind of evidence.
pub trait Evidence: Send + Sync {
    /// Its name in settings and tables.
    fn name(&self) -> String;

    /// Learns from the landmarks. `weights` holds one number for each, 0 meaning that the landmark
    /// is left out and nothing about its pairing may be used. Fitting again without a landmark must
    /// be cheap: left-out figures repeat it for every one.
    ///
    /// # Errors
    /// [`Unavailable`] where this study does not have what the kind needs.
    fn fit<'m>(
        &self,
        material: &Material<'m>,
        weights: &[f64],
        chance: &mut Stream,
    ) -> Result<Box<dyn Fitted + 'm>, Unavailable>;
}

/// Evidence that has learnt from the landmarks.
pub trait Fitted: Send + Sync {
    /// Fills `out[(i, j)]` with how unlike parcel `a[i]` of species a and parcel `b[j]` of species b
    /// are. Only the order within one fit means anything: less is more alike.
    fn dissimilarities(&self, a: &[usize], b: &[usize], out: &mut Array2<f64>);

    /// Of evidence that carries mass: where the mass of each parcel goes `(parcels of a, parcels of
    /// b)`, as a share of what the parcel of a has, and of what the parcel of b has.
    fn shares(&self) -> Option<Pair<&Array2<f64>>> {
        None
    }
}
