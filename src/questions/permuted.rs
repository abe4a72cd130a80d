//! Landmark pairings permuted: how well left-out landmarks would do if the pairing meant nothing.

use rand::seq::SliceRandom;
use rayon::prelude::*;
use serde::Serialize;

use crate::align::{Alignment, Params};
use crate::bootstrap::{Purpose, Stream};
use crate::domain::{Landmark, Landmarks, Pair, Side};
use crate::evidence::{Evidence, Fingerprint, Grown, JointDistance, Kind, Material};
use crate::holdout::{place_each, Asked, Placed, Questions};
use crate::settings::{EvidenceChoice, Settings};
use crate::watch::{Interrupted, Watch};

/// Draws of a pairing that is admissible before one is given up.
const TRIES: usize = 200;

/// Left-out landmarks under their pairing and under permuted ones.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct Permuted {
    /// The kinds that rank, each on its own.
    pub kinds: Vec<Kind>,
    /// Axes of those that have axes; fixed before a look at the landmarks.
    pub axes: usize,
    /// Mean reciprocal rank: over these kinds, both directions and all blocks.
    pub observed: f64,
    /// Its mean over permuted pairings.
    pub mean: f64,
    /// Permuted pairings.
    pub permutations: usize,
    /// Share of pairings, the true one counted among them, that do as well.
    pub p: f64,
    /// The smallest p that so many permutations can give.
    pub least_p: f64,
}

/// Pairs landmarks with others' counterparts and leaves each block out again. Blocks change partners
/// as a whole, with blocks of as many landmarks. The same kinds, on as many axes as are tried at
/// most, judge every pairing: nothing is chosen by landmarks, so the test needs no nesting, and under
/// exchangeable pairings p is at most x with probability at most x.
///
/// Transport is left out: it would have to be fitted again for every pairing and every block.
///
/// # Errors
/// [`Interrupted`] where the watch says so.
pub fn permute(
    settings: &Settings,
    axes: usize,
    material: &Material<'_>,
    questions: &Questions<'_>,
    permutations: usize,
    watch: &dyn Watch,
) -> Result<Option<Permuted>, Interrupted> {
    let kinds: Vec<(Kind, Box<dyn Evidence>)> = judges(settings, axes)
        .into_iter()
        .filter(|(_, evidence)| {
            let mut chance = Stream::new(questions.seed, Purpose::Evidence, u64::MAX);
            let weights = material.weights(|_| 1.0);
            evidence.fit(material, &weights, &mut chance).is_ok()
        })
        .collect();
    if kinds.is_empty() || permutations == 0 {
        return Ok(None);
    }
    // Made once, before every pairing takes a copy.
    let _ = material.links();
    let observed = statistic(material, &kinds, questions);
    watch.begin("permuted pairings", permutations);
    let found: Vec<Option<f64>> = (0..permutations)
        .into_par_iter()
        .map(|index| {
            if watch.interrupted() {
                return None;
            }
            let mut chance = Stream::new(questions.seed, Purpose::PermutedPairs, index as u64);
            let value = shuffled(material.landmarks, questions, &mut chance).map(|landmarks| {
                let asked = Asked::draw(&landmarks, questions.candidates, questions.seed);
                let questions = Questions {
                    asked: &asked,
                    ..*questions
                };
                statistic(&material.with_landmarks(&landmarks), &kinds, &questions)
            });
            watch.advance(1);
            value
        })
        .collect();
    watch.end();
    if watch.interrupted() {
        return Err(Interrupted);
    }
    let found: Vec<f64> = found.into_iter().flatten().collect();
    if found.is_empty() {
        return Ok(None);
    }
    // What differs by rounding only is a tie.
    let as_good = found.iter().filter(|x| **x >= observed - 1e-12).count();
    let all = found.len() as f64;
    Ok(Some(Permuted {
        kinds: kinds.iter().map(|(kind, _)| *kind).collect(),
        axes,
        observed,
        mean: found.iter().sum::<f64>() / all,
        permutations: found.len(),
        p: (1.0 + as_good as f64) / (1.0 + all),
        least_p: 1.0 / (1.0 + all),
    }))
}

/// The kinds that judge a pairing: the one asked for, or of a mixture the fingerprint and canonical
/// distances, which stand for both of its cheap families.
fn judges(settings: &Settings, axes: usize) -> Vec<(Kind, Box<dyn Evidence>)> {
    let joint = |alignment| {
        JointDistance(Params {
            alignment,
            axes,
            ridge: settings.ridge,
            // The first of those that were tried: the landmarks have had no say in it.
            embedding: 0,
        })
    };
    match settings.evidence {
        EvidenceChoice::Procrustes => {
            vec![(Kind::Procrustes, Box::new(joint(Alignment::Procrustes)))]
        }
        EvidenceChoice::Canonical => vec![(Kind::Canonical, Box::new(joint(Alignment::Canonical)))],
        EvidenceChoice::Fingerprint => vec![(Kind::Fingerprint, Box::new(Fingerprint))],
        EvidenceChoice::Grown => vec![(
            Kind::Grown,
            Box::new(Grown {
                axes,
                ridge: settings.ridge,
            }),
        )],
        EvidenceChoice::Mixture | EvidenceChoice::Transport => vec![
            (Kind::Canonical, Box::new(joint(Alignment::Canonical))),
            (Kind::Fingerprint, Box::new(Fingerprint)),
        ],
    }
}

fn statistic(
    material: &Material<'_>,
    kinds: &[(Kind, Box<dyn Evidence>)],
    questions: &Questions<'_>,
) -> f64 {
    let blocks = material.landmarks.blocks();
    let mut sums = vec![(0.0, 0.0); blocks];
    for (_, evidence) in kinds {
        let placed = place_each(material, &**evidence, questions);
        for (landmark, placed) in material.landmarks.list().iter().zip(placed) {
            let reciprocal = |p: Placed| 1.0 / p.rank as f64;
            sums[landmark.block].0 += (reciprocal(placed.a) + reciprocal(placed.b)) / 2.0;
            sums[landmark.block].1 += 1.0;
        }
    }
    sums.iter().map(|(sum, count)| sum / count).sum::<f64>() / blocks as f64
}

/// The landmarks with their parcels of b exchanged between blocks of equal size; `None` where no
/// admissible pairing was found.
fn shuffled(
    landmarks: &Landmarks,
    questions: &Questions<'_>,
    chance: &mut Stream,
) -> Option<Landmarks> {
    let list = landmarks.list();
    let blocks: Vec<Vec<usize>> = (0..landmarks.blocks())
        .map(|block| {
            (0..list.len())
                .filter(|&at| list[at].block == block)
                .collect()
        })
        .collect();
    let largest = blocks.iter().map(Vec::len).max().unwrap_or(0);
    for _ in 0..TRIES {
        let mut partner: Vec<usize> = (0..list.len()).collect();
        for size in 1..=largest {
            let alike: Vec<&Vec<usize>> = blocks.iter().filter(|b| b.len() == size).collect();
            let mut order: Vec<usize> = (0..alike.len()).collect();
            order.shuffle(chance);
            for (own, &other) in alike.iter().zip(&order) {
                for (&at, &with) in own.iter().zip(alike[other]) {
                    partner[at] = with;
                }
            }
        }
        let paired: Vec<Landmark> = list
            .iter()
            .zip(&partner)
            .map(|(landmark, &with)| Landmark {
                parcels: Pair {
                    a: landmark.parcels.a.clone(),
                    b: list[with].parcels.b.clone(),
                },
                ..landmark.clone()
            })
            .collect();
        let is_admissible = |l: &Landmark| {
            let Pair { a, b } = &l.parcels;
            a.iter()
                .any(|&a| b.iter().any(|&b| questions.candidates.admit(Side::A, a, b)))
        };
        if paired.iter().all(is_admissible) {
            let names = (0..landmarks.blocks()).map(|b| landmarks.block_name(b).to_owned());
            let checked = Landmarks::new(paired, names.collect());
            return Some(checked.expect("the parcels are the same as before"));
        }
    }
    None
}
