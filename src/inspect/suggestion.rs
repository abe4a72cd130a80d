//! What a careful user would try or mend before a run: every suggestion, worded in one place.

use std::fmt;

use serde::{Serialize, Serializer};

use super::{LandmarkFacts, SpeciesFacts, TransformReason};
use crate::domain::{Hemispheres, Pair, Side, Transform, WeightKind};
use crate::prepare::{Filled, Study, SumsToOne};
use crate::transform::WIDE_SPAN;
use crate::warning::Warning;

/// Fewest blocks that studies usually have.
const USUAL_BLOCKS: usize = 6;
/// Share of entries that are connections from which a matrix counts as full.
const DENSE: f64 = 0.9;
/// A share of links worth trying on a full matrix.
const FEWER_LINKS: f64 = 0.2;
/// More different classes than anyone grades connections in.
const MOST_CLASSES: usize = 12;
/// Parcels named of a system.
const NAMED: usize = 4;

/// Something worth a thought, with its reason.
#[derive(Debug, Clone, PartialEq)]
pub enum Suggestion {
    /// Only one half of the matrix is filled.
    OneHalf {
        /// The species.
        species: String,
        /// The half that is filled.
        above: bool,
    },
    /// Rows of fractions sum to 1, which is unusual for tracers.
    RowsSumToOne {
        /// The species.
        species: String,
    },
    /// A wide span under a transform that loses weak links.
    WideSpan {
        /// The species.
        species: String,
        /// Orders of magnitude.
        span: f64,
        /// The transform in use.
        transform: Transform,
    },
    /// Weights called `other` that are never negative.
    NameTheKind {
        /// The species.
        species: String,
        /// Whether all are whole numbers.
        whole: bool,
    },
    /// Classes in such number that they are hardly classes.
    ManyClasses {
        /// The species.
        species: String,
        /// Different weights.
        classes: usize,
    },
    /// A full matrix whose profiles keep everything.
    CutWeakLinks {
        /// The species.
        species: String,
        /// Share of entries that are connections.
        density: f64,
    },
    /// Parts of the network without a landmark.
    PartWithoutLandmark {
        /// The species.
        species: String,
        /// Parcels in such parts.
        parcels: Vec<String>,
    },
    /// A community without a landmark.
    SystemWithoutLandmark {
        /// The species.
        species: String,
        /// Its parcels.
        parcels: Vec<String>,
    },
    /// Parcels without any likeness to a landmark.
    UnlikeAnyLandmark {
        /// The species.
        species: String,
        /// The parcels.
        parcels: Vec<String>,
    },
    /// One map has one hemisphere, the other both.
    FoldHemispheres {
        /// The species with one.
        one: String,
        /// The species with two.
        two: String,
        /// Whether the one hemisphere is known, or only nothing says that there are two.
        certain: bool,
    },
    /// Both maps have both hemispheres, and nothing was said about them.
    ChooseHemispheres {
        /// Whether sides are known, as matching needs.
        known: bool,
    },
    /// Left and right copies that are left out one at a time.
    BlockSides {
        /// Pairs of landmarks.
        pairs: usize,
    },
    /// Few blocks.
    FewBlocks {
        /// Blocks.
        blocks: usize,
    },
    /// No word on what the homologies rest on.
    StateBasis,
}

/// Suggestions for a study, data first.
pub fn suggest(
    study: &Study,
    species: &Pair<SpeciesFacts>,
    landmarks: &LandmarkFacts,
) -> Vec<Suggestion> {
    let mut found = Vec::new();
    for side in Side::BOTH {
        matrix(study, side, &species[side], &mut found);
    }
    for side in Side::BOTH {
        coverage(study, side, &species[side], &mut found);
    }
    found.extend(hemispheres(study, species));
    let pairs = study
        .warnings
        .iter()
        .filter(|w| matches!(w, Warning::SidesNotBlocked { .. }))
        .count();
    if pairs > 0 {
        found.push(Suggestion::BlockSides { pairs });
    }
    if landmarks.blocks < USUAL_BLOCKS {
        found.push(Suggestion::FewBlocks {
            blocks: landmarks.blocks,
        });
    }
    if landmarks.bases.is_empty() {
        found.push(Suggestion::StateBasis);
    }
    found
}

/// Asks what hemispheres mean, where nobody said so and it matters.
fn hemispheres(study: &Study, species: &Pair<SpeciesFacts>) -> Option<Suggestion> {
    let two = species.as_ref().map(|s| s.attributes.hemispheres());
    let folds = |one: &SpeciesFacts, two: &SpeciesFacts| Suggestion::FoldHemispheres {
        one: one.name.clone(),
        two: two.name.clone(),
        certain: one.attributes.hemispheres().is_some(),
    };
    // Who matched sides of which one map has only one has hardly meant that.
    let asked = study.asked.hemispheres;
    let open = asked.is_none() || asked == Some(Hemispheres::Match);
    match (two.a, two.b) {
        (Some(2), Some(2)) if asked.is_none() => Some(Suggestion::ChooseHemispheres {
            known: Side::BOTH
                .into_iter()
                .all(|side| species[side].attributes.left > 0),
        }),
        (Some(2), Some(1) | None) if open => Some(folds(&species.b, &species.a)),
        (Some(1) | None, Some(2)) if open => Some(folds(&species.a, &species.b)),
        _ => None,
    }
}

/// What the weights of one species suggest.
fn matrix(study: &Study, side: Side, facts: &SpeciesFacts, found: &mut Vec<Suggestion>) {
    let raw = &study.raw[side];
    let species = || facts.name.clone();
    if raw.filled != Filled::BothHalves {
        found.push(Suggestion::OneHalf {
            species: species(),
            above: raw.filled == Filled::Above,
        });
    }
    if facts.weights == WeightKind::Fractions && raw.sums_to_one == SumsToOne::Rows {
        found.push(Suggestion::RowsSumToOne { species: species() });
    }
    let loses_weak = matches!(facts.transform, Transform::Log1p | Transform::None);
    if let (true, Some(span)) = (facts.weights.is_non_negative() && loses_weak, raw.span) {
        if span > WIDE_SPAN && facts.transform_because == TransformReason::Asked {
            found.push(Suggestion::WideSpan {
                species: species(),
                span,
                transform: facts.transform,
            });
        }
    }
    if facts.weights == WeightKind::Other && raw.smallest >= 0.0 {
        found.push(Suggestion::NameTheKind {
            species: species(),
            whole: raw.whole,
        });
    }
    if facts.weights == WeightKind::Ordinal && raw.distinct > MOST_CLASSES {
        found.push(Suggestion::ManyClasses {
            species: species(),
            classes: raw.distinct,
        });
    }
    if raw.density > DENSE && facts.affinity.strongest.get() == 1.0 {
        found.push(Suggestion::CutWeakLinks {
            species: species(),
            density: raw.density,
        });
    }
}

/// Where one species lacks landmarks.
fn coverage(study: &Study, side: Side, facts: &SpeciesFacts, found: &mut Vec<Suggestion>) {
    let labels = study.species[side].parcels.labels();
    let owners = study.landmarks.owners(side, labels.len());
    let raw = &study.raw[side];
    let mut marked = vec![false; raw.parts];
    for (at, _) in owners.iter().enumerate().filter(|(_, o)| o.is_some()) {
        marked[raw.part[at]] = true;
    }
    let adrift: Vec<String> = (0..labels.len())
        .filter(|&i| !marked[raw.part[i]])
        .map(|i| labels[i].clone())
        .collect();
    if !adrift.is_empty() {
        found.push(Suggestion::PartWithoutLandmark {
            species: facts.name.clone(),
            parcels: adrift,
        });
    }
    if !facts.coverage.unlike_any.is_empty() {
        found.push(Suggestion::UnlikeAnyLandmark {
            species: facts.name.clone(),
            parcels: facts.coverage.unlike_any.clone(),
        });
    }
    for system in facts.coverage.uncovered() {
        found.push(Suggestion::SystemWithoutLandmark {
            species: facts.name.clone(),
            parcels: system.parcels.clone(),
        });
    }
}

impl fmt::Display for Suggestion {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Suggestion::OneHalf { species, above } => {
                let (full, empty) = if *above { ("above", "below") } else { ("below", "above") };
                write!(
                    f,
                    "{species}: only the half {full} the diagonal holds weights; if they have no direction, fill in the half {empty} it too"
                )
            }
            Suggestion::RowsSumToOne { species } => write!(
                f,
                "{species}: the rows sum to 1, so each is taken for the shares of one source; if each is one injection of a retrograde tracer, rows are targets: transpose the table"
            ),
            Suggestion::WideSpan {
                species,
                span,
                transform,
            } => write!(
                f,
                "{species}: weights span {span:.1} orders of magnitude and transform {transform} all but loses the weak ones; try transform = \"log-floor\", or leave the key out"
            ),
            Suggestion::NameTheKind { species, whole } => {
                let kind = if *whole { "counts" } else { "fractions" };
                write!(
                    f,
                    "{species}: no weight is negative, but \"other\" takes them as they are, so that the largest decide; if they are amounts, say weights = \"{kind}\""
                )
            }
            Suggestion::ManyClasses { species, classes } => write!(
                f,
                "{species}: {classes} different weights are many for classes; if they are amounts, say weights = \"counts\" or \"fractions\""
            ),
            Suggestion::CutWeakLinks { species, density } => write!(
                f,
                "{species}: {:.0} % of all pairs are connected; if the weakest are noise, try strongest = {FEWER_LINKS} and compare the left-out figures",
                100.0 * density
            ),
            Suggestion::PartWithoutLandmark { species, parcels } => write!(
                f,
                "{species}: {} parcels in parts of the network without a landmark ({}); nothing ties them to the other species: add a landmark there, or leave them out",
                parcels.len(),
                few(parcels)
            ),
            Suggestion::SystemWithoutLandmark { species, parcels } => write!(
                f,
                "{species}: no landmark in the system of {} parcels around {}; add one, or read their placements as extrapolation",
                parcels.len(),
                few(parcels)
            ),
            Suggestion::UnlikeAnyLandmark { species, parcels } => write!(
                f,
                "{species}: {} parcels have no likeness to any landmark parcel ({}); landmarks that share partners with them would help",
                parcels.len(),
                few(parcels)
            ),
            Suggestion::FoldHemispheres { one, two, certain } => {
                let seems = if *certain { "has" } else { "seems to have" };
                write!(
                    f,
                    "hemispheres: {one} {seems} one and {two} two; say what is meant: hemispheres = \"fold\" makes one parcel of both copies of an area, so that like is compared with like; \"ignore\" ranks the copies one by one"
                )
            }
            Suggestion::ChooseHemispheres { known } => {
                let needs = if *known { "" } else { " (needs a column hemisphere in a table of parcels)" };
                write!(
                    f,
                    "hemispheres: both maps have two; say what is meant: hemispheres = \"match\"{needs} seeks counterparts on the same side only, which halves the candidates; \"fold\" makes one parcel of both copies of an area; \"ignore\" ranks across sides"
                )
            }
            Suggestion::BlockSides { pairs } => {
                let look = if *pairs == 1 { "1 pair looks" } else { &format!("{pairs} pairs look") };
                write!(
                    f,
                    "landmarks: {look} like left and right copies of one area; give the two a word of their own in the column block (see the warnings)"
                )
            }
            Suggestion::FewBlocks { blocks } => write!(
                f,
                "landmarks: {blocks} blocks are few, {USUAL_BLOCKS} to 30 are usual; with more, more axes can be tried and the left-out figures say more"
            ),
            Suggestion::StateBasis => write!(
                f,
                "landmarks: the table does not say what the homologies rest on; add a column basis, so that readers can judge how far the result is put in by hand"
            ),
        }
    }
}

impl Serialize for Suggestion {
    fn serialize<S: Serializer>(&self, to: S) -> Result<S::Ok, S::Error> {
        to.collect_str(self)
    }
}

/// The first few names.
fn few(names: &[String]) -> String {
    let shown: Vec<&str> = names.iter().take(NAMED).map(String::as_str).collect();
    match names.len().saturating_sub(NAMED) {
        0 => shown.join(", "),
        _ => format!("{}, …", shown.join(", ")),
    }
}
