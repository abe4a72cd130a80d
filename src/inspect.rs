//! What was understood of a study, before anything is aligned: facts about both matrices and the
//! landmarks, and settings worth a thought.
//!
//! Computes from a [`Study`] alone, so that it says what a run would do and nothing else.

mod axes;
mod coverage;
mod hubs;
mod landmarks;
mod space;
mod suggestion;
mod systems;

pub use axes::{AxesAllowed, AxesWorth};
pub use coverage::{Beyond, Coverage, Far, System};
pub use hubs::Hub;
pub use landmarks::{BasisCount, LandmarkFacts};
pub use space::{AttributeFacts, DistanceFacts};
pub use suggestion::Suggestion;
pub use systems::systems;

use serde::Serialize;

use crate::affinity;
use crate::domain::{Pair, RowsAre, Side, Tracer, Transform, WeightKind};
use crate::evidence::Material;
use crate::locate::beyond_landmarks;
use crate::prepare::{Filled, Parts, RawFacts, Study, SumsToOne};
use crate::transform;
use crate::warning::Warning;

/// Everything that is said about a study before it is run.
#[derive(Debug, Clone, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct Inspection {
    /// Both species.
    pub species: Pair<SpeciesFacts>,
    /// The landmarks.
    pub landmarks: LandmarkFacts,
    /// Axes the joint spaces may have.
    pub axes: AxesAllowed,
    /// Settings and data worth a thought.
    pub suggestions: Vec<Suggestion>,
    /// The warnings a run would begin with.
    pub warnings: Vec<Warning>,
}

/// One species as it was understood.
#[derive(Debug, Clone, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct SpeciesFacts {
    /// Its name.
    pub name: String,
    /// Parcels that take part.
    pub parcels: usize,
    /// Parcels without any connection, in the order of the file.
    pub set_aside: Vec<String>,
    /// Parcels of which too little was observed, in the order of the file.
    pub not_covered: Vec<String>,
    /// What parcels are where the matrix is not square.
    pub rectangular: Option<RowsAre>,
    /// How injected areas were traced, as stated.
    pub tracer: Option<Tracer>,
    /// Columns: entries of a profile in one direction.
    pub columns: usize,
    /// Of these, how many are parcels themselves.
    pub columns_within: usize,
    /// Entries off the diagonal that were never observed.
    pub missing: usize,
    /// What the weights measure, as stated.
    pub weights: WeightKind,
    /// How they are transformed.
    pub transform: Transform,
    /// Why so.
    pub transform_because: TransformReason,
    /// How profiles are compared, and what they keep.
    pub affinity: affinity::Params,
    /// Whether profiles hold links in both directions.
    pub directed: bool,
    /// Halves of the matrix that hold anything.
    pub filled: Filled,
    /// Entries off the diagonal that are a connection.
    pub connections: usize,
    /// The same as a share of all observed entries off the diagonal.
    pub density: f64,
    /// Smallest weight off the diagonal.
    pub smallest: f64,
    /// Largest weight off the diagonal.
    pub largest: f64,
    /// Smallest weight above zero.
    pub least_positive: Option<f64>,
    /// Orders of magnitude from the smallest to the largest positive weight.
    pub span: Option<f64>,
    /// Whether rows or columns sum to 1.
    pub sums_to_one: SumsToOne,
    /// Parts of the network without a connection between them.
    pub parts: usize,
    /// Parcels outside the largest part.
    pub outside_largest_part: Vec<String>,
    /// Parts of the affinity: parcels that share no partner at all, even over others.
    pub affinity_parts: usize,
    /// The parcels with the largest strength.
    pub hubs: Vec<Hub>,
    /// What is known of its parcels besides.
    pub attributes: AttributeFacts,
    /// Distances between them, where known.
    pub distances: Option<DistanceFacts>,
    /// What the leading axes of its embedding carry.
    pub axes: AxesWorth,
    /// What of its connectivity the landmarks speak for.
    pub coverage: Coverage,
}

/// Why a transform is used.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum TransformReason {
    /// Positive weights span more orders of magnitude than [`transform::WIDE_SPAN`].
    WideSpan,
    /// They do not.
    NarrowSpan,
    /// It is the default for this kind of weights.
    Kind,
    /// The study file says so.
    Asked,
}

/// Looks at a study.
#[must_use]
pub fn inspect(study: &Study) -> Inspection {
    let axes = AxesAllowed::of(study);
    let material = Material::new(study.species.as_ref(), &study.landmarks);
    let beyond = beyond_landmarks(&material, axes.most);
    let species = Pair::from_fn(|side| species_facts(study, side, &beyond[side]));
    let landmarks = LandmarkFacts::of(study);
    let suggestions = suggestion::suggest(study, &species, &landmarks);
    Inspection {
        species,
        landmarks,
        axes,
        suggestions,
        warnings: study.warnings.clone(),
    }
}

fn species_facts(study: &Study, side: Side, beyond: &[f64]) -> SpeciesFacts {
    let (species, raw) = (&study.species[side], &study.raw[side]);
    let treatment = &study.treatment[side];
    let labels = species.parcels.labels();

    let affinity = affinity::of(&species.network, &treatment.affinity);
    let alike = affinity
        .indexed_iter()
        .filter(|(_, a)| **a > 0.0)
        .map(|(pair, _)| pair);
    let parts = Parts::of(labels.len(), alike);
    SpeciesFacts {
        name: species.parcels.species().to_owned(),
        parcels: labels.len(),
        set_aside: species.parcels.isolated().to_vec(),
        not_covered: species.parcels.uncovered().to_vec(),
        rectangular: raw.rectangular,
        tracer: treatment.tracer,
        columns: raw.columns,
        columns_within: raw.columns_within,
        missing: raw.missing,
        weights: treatment.weights,
        transform: treatment.transform,
        transform_because: reason(treatment.weights, treatment.transform, raw),
        affinity: treatment.affinity,
        directed: raw.directed,
        filled: raw.filled,
        connections: raw.connections,
        density: raw.density,
        smallest: raw.smallest,
        largest: raw.largest,
        least_positive: raw.least_positive,
        span: raw.span,
        sums_to_one: raw.sums_to_one,
        parts: raw.parts,
        outside_largest_part: raw.outside.iter().map(|&i| labels[i].clone()).collect(),
        affinity_parts: parts.sizes.len(),
        hubs: hubs::hubs(study, side),
        attributes: AttributeFacts::of(species),
        distances: DistanceFacts::of(study, side),
        axes: AxesWorth::of(&species.embedding),
        coverage: Coverage::of(study, side, &affinity, beyond),
    }
}

/// Why the transform is what it is: the rule of [`transform::default_for`], where it agrees.
fn reason(weights: WeightKind, used: Transform, raw: &RawFacts) -> TransformReason {
    match weights {
        WeightKind::Counts | WeightKind::Fractions => {
            let wide = raw.span.is_some_and(|span| span > transform::WIDE_SPAN);
            match (used, wide) {
                (Transform::LogFloor, true) => TransformReason::WideSpan,
                (Transform::Log1p, false) => TransformReason::NarrowSpan,
                _ => TransformReason::Asked,
            }
        }
        WeightKind::Log10 if used == Transform::LogFloor => TransformReason::Kind,
        WeightKind::Ordinal if used == Transform::Ranks => TransformReason::Kind,
        WeightKind::Correlations if used == Transform::FisherZ => TransformReason::Kind,
        WeightKind::Other if used == Transform::None => TransformReason::Kind,
        _ => TransformReason::Asked,
    }
}
