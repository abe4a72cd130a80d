//! The record of a run: what it read, every setting after defaults, what it found on the way.

use serde::Serialize;

use crate::domain::{Pair, Side};
use crate::holdout::{Choice, Curve};
use crate::locate::{Located, Rests, SetLevel};
use crate::prepare::{Embedded, Inputs, Study, Treatment};
use crate::settings::Settings;
use crate::warning::Warning;

/// What makes two runs the same run.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct Identity<'s> {
    /// The program.
    pub program: &'static str,
    /// Its version.
    pub version: &'static str,
    /// Every setting after defaults.
    pub settings: &'s Settings,
    /// What was done to each matrix.
    pub treatment: &'s Pair<Treatment>,
    /// Files read, with checksums.
    pub inputs: &'s Inputs,
}

impl<'s> Identity<'s> {
    /// The identity of a study's run.
    #[must_use]
    pub fn of(study: &'s Study) -> Identity<'s> {
        Identity {
            program: env!("CARGO_PKG_NAME"),
            version: env!("CARGO_PKG_VERSION"),
            settings: &study.settings,
            treatment: &study.treatment,
            inputs: &study.inputs,
        }
    }
}

/// How a run was executed; differs between runs of one identity.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct Wall {
    /// Worker threads.
    pub threads: usize,
    /// Seconds from start to the writing of this record.
    pub wall_seconds: f64,
}

/// One species in numbers.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
struct SpeciesCounts<'s> {
    name: &'s str,
    parcels: usize,
    #[serde(skip_serializing_if = "is_zero")]
    folded: usize,
    set_aside: &'s [String],
    not_covered: &'s [String],
    #[serde(skip_serializing_if = "Option::is_none")]
    subjects: Option<SubjectCounts<'s>>,
    eigenvalues: Vec<f64>,
}

/// The individuals of one species.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
struct SubjectCounts<'s> {
    names: &'s [String],
    /// Mean over parcels of the share of a position's variance that comes from subjects.
    mean_share_of_variance: Option<f64>,
}

/// Nothing is said of folding where nothing was folded.
fn is_zero(n: &usize) -> bool {
    *n == 0
}

/// Everything in `run.json`.
#[derive(Debug, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct Record<'s> {
    #[serde(flatten)]
    identity: Identity<'s>,
    title: &'s str,
    species: Pair<SpeciesCounts<'s>>,
    landmarks: usize,
    landmark_blocks: usize,
    embedding: &'s Embedded,
    choice: Choice,
    evidence: &'s Rests,
    candidate_sets: SetLevel,
    left_out_error: &'s [Curve],
    warnings: Vec<&'s Warning>,
    files: Vec<&'static str>,
    #[serde(flatten)]
    wall: Wall,
    caution: &'static str,
}

impl<'s> Record<'s> {
    /// The record of a finished run.
    #[must_use]
    pub fn new(study: &'s Study, located: &'s Located, wall: Wall) -> Record<'s> {
        Record {
            identity: Identity::of(study),
            title: &study.title,
            species: Pair::from_fn(|side: Side| {
                let species = &study.species[side];
                SpeciesCounts {
                    name: species.parcels.species(),
                    parcels: species.parcels.len(),
                    folded: species.parcels.folded(),
                    set_aside: species.parcels.isolated(),
                    not_covered: species.parcels.uncovered(),
                    subjects: study.cohorts[side].as_ref().map(|cohort| SubjectCounts {
                        names: cohort.names(),
                        mean_share_of_variance: located.spaces[located.choice.evidence]
                            .standard_errors
                            .mean_share_of_subjects(side),
                    }),
                    eigenvalues: species.embedding.eigenvalues.to_vec(),
                }
            }),
            landmarks: study.landmarks.len(),
            landmark_blocks: study.landmarks.blocks(),
            embedding: &study.embedded,
            choice: located.choice,
            evidence: &located.evidence,
            candidate_sets: located.set_level,
            left_out_error: &located.curves,
            warnings: study.warnings.iter().chain(&located.warnings).collect(),
            files: super::TABLES.to_vec(),
            wall,
            caution: super::CAUTION,
        }
    }

    /// The record as JSON.
    ///
    /// # Panics
    /// Never: everything in it can be written as JSON.
    #[must_use]
    pub fn json(&self) -> Vec<u8> {
        json(self)
    }
}

impl Identity<'_> {
    /// The identity as JSON.
    ///
    /// # Panics
    /// Never: everything in it can be written as JSON.
    #[must_use]
    pub fn json(&self) -> Vec<u8> {
        json(self)
    }
}

/// Any value as indented JSON.
pub(super) fn json(value: &impl Serialize) -> Vec<u8> {
    let mut bytes = serde_json::to_vec_pretty(value).expect("maps have text keys");
    bytes.push(b'\n');
    bytes
}
