//! Questions about named parcels, answered.

use super::agreement::{variations, would_pass, Variation};
use super::ask::Question;
use super::contrast::{contrast, pair_of, Contrast};
use super::ground::{without_blocks, Ground};
use super::lean::{leans, Lean};
use super::ruling::{level_of, rule, Ruling, Verdict};
use crate::align::Params;
use crate::domain::{Pair, Side};
use crate::locate::{Judged, Placement, Rests, SetLevel};
use crate::place;
use crate::prepare::Study;
use crate::warning::Warning;
use crate::watch::{Interrupted, Watch};

/// One candidate judged.
#[derive(Debug, Clone, PartialEq)]
pub struct CheckedPair {
    /// The pair.
    pub pair: Pair<usize>,
    /// What both accounts below allow to be said.
    pub verdict: Verdict,
    /// With all landmarks.
    pub ruling: Ruling,
    /// Without the landmarks that the others contradict, where there are any and enough others.
    pub without_flagged: Option<Ruling>,
    /// Other candidates that would pass too, by position; `None` where so many pairs are checked at once
    /// that their candidates were not followed.
    pub would_pass: Option<Vec<usize>>,
    /// The verdict without each block.
    pub leans: Vec<Lean>,
    /// The verdict under other settings.
    pub variations: Vec<Variation>,
}

/// One question answered.
#[derive(Debug, Clone)]
pub struct Checked {
    /// Species of the parcel.
    pub side: Side,
    /// The parcel.
    pub parcel: usize,
    /// Blocks of landmarks left out because the question is about them, by name.
    pub aside: Vec<String>,
    /// Blocks of the landmarks that are told, by name.
    pub told: Vec<String>,
    /// Those of them that the others contradict.
    pub flagged: Vec<String>,
    /// Level of the tests.
    pub level: f64,
    /// The joint space that shows distances.
    pub space: Params,
    /// What ranks.
    pub evidence: Rests,
    /// Replicates that distances come from.
    pub replicates: usize,
    /// How far outside the landmarks' span every parcel lies; above 1 is beyond every landmark.
    pub beyond: Pair<Vec<f64>>,
    /// Where the parcel falls among all candidates.
    pub placement: Placement,
    /// Level of its candidate set.
    pub set_level: SetLevel,
    /// What is known of it besides.
    pub judged: Judged,
    /// Its named candidates.
    pub pairs: Vec<CheckedPair>,
    /// The nearest of them against each of the others.
    pub contrasts: Vec<Contrast>,
    /// What came up on the way.
    pub warnings: Vec<Warning>,
}

/// Answers questions. Those about the same landmarks share one run of everything.
///
/// # Errors
/// [`Interrupted`] where the watch says so.
pub fn check(
    study: &Study,
    questions: &[Question],
    watch: &dyn Watch,
) -> Result<Vec<Checked>, Interrupted> {
    let mut answers: Vec<Option<Checked>> = vec![None; questions.len()];
    for at in 0..questions.len() {
        if answers[at].is_some() {
            continue;
        }
        let aside = &questions[at].aside;
        let alike: Vec<usize> = (at..questions.len())
            .filter(|&other| questions[other].aside == *aside)
            .collect();
        let of = |blocks: &[usize]| without_blocks(study, blocks).ok();
        let told = of(aside).expect("questions leave enough landmarks");
        let asked: Vec<&Question> = alike.iter().map(|&other| &questions[other]).collect();
        let ground = Ground::new(told, followed(study, aside, &asked), watch)?;
        let landmarks = ground.study.landmarks.list().iter();
        let mut flagged: Vec<usize> = landmarks
            .zip(&ground.located.left_out)
            .filter(|(_, found)| found.contradicted.is_some())
            .map(|(landmark, _)| landmark.block)
            .collect();
        flagged.dedup();
        let is_named = asked.iter().any(|question| !question.against.is_empty());
        let calmer = match flagged.is_empty() || !is_named {
            true => None,
            false => without_blocks(&ground.study, &flagged).ok(),
        };
        let calmer = match calmer {
            Some(study) => Some(Ground::new(study, ground.pairs.clone(), watch)?),
            None => None,
        };
        let flagged: Vec<String> = flagged
            .iter()
            .map(|&b| ground.study.landmarks.block_name(b).to_owned())
            .collect();
        watch.begin("questions", alike.len());
        for &other in &alike {
            if watch.interrupted() {
                return Err(Interrupted);
            }
            let question = &questions[other];
            let aside = question.aside.iter();
            answers[other] = Some(Checked {
                aside: aside
                    .map(|&b| study.landmarks.block_name(b).to_owned())
                    .collect(),
                flagged: flagged.clone(),
                ..answer(&ground, calmer.as_ref(), question)
            });
            watch.advance(1);
        }
        watch.end();
    }
    let answers: Option<Vec<Checked>> = answers.into_iter().collect();
    Ok(answers.expect("every question belongs to a group"))
}

/// Most distances that are kept of followed pairs, over all replicates: 160 MB.
const MOST_KEPT: usize = 20_000_000;

/// Pairs to follow: every asked parcel with every candidate, or with those that are named where these are
/// too many.
fn followed(study: &Study, aside: &[usize], asked: &[&Question]) -> Vec<Pair<usize>> {
    let told = study.landmarks.without(aside);
    let told = told.expect("questions leave enough landmarks");
    let open = place::open_parcels(&told, study.species.as_ref().map(|s| s.parcels.len()));
    let pairs = |all: bool| {
        let mut pairs: Vec<Pair<usize>> = asked
            .iter()
            .filter(|question| !question.against.is_empty())
            .flat_map(|question| {
                let candidates = match all {
                    true => &open[question.side.opposite()],
                    false => &question.against,
                };
                let side = question.side;
                candidates
                    .iter()
                    .map(move |&candidate| pair_of(side, question.parcel, candidate))
            })
            .filter(|pair| study.candidates.admit(Side::A, pair.a, pair.b))
            .collect();
        pairs.sort_unstable_by_key(|pair| (pair.a, pair.b));
        pairs.dedup();
        pairs
    };
    let every = pairs(true);
    match every.len() * study.settings.replicates <= MOST_KEPT {
        true => every,
        false => pairs(false),
    }
}

fn answer(ground: &Ground, calmer: Option<&Ground>, question: &Question) -> Checked {
    let Question { side, parcel, .. } = *question;
    let located = &ground.located;
    let pairs: Vec<CheckedPair> = question
        .against
        .iter()
        .map(|&candidate| {
            let pair = pair_of(side, parcel, candidate);
            let ruling = rule(ground, side, pair);
            let without_flagged = calmer.map(|ground| rule(ground, side, pair));
            let verdict = match &without_flagged {
                Some(other) => ruling.verdict.and(other.verdict),
                None => ruling.verdict,
            };
            CheckedPair {
                pair,
                verdict,
                would_pass: would_pass(ground, side, parcel, candidate, &ruling),
                leans: leans(ground, side, pair, &ruling),
                variations: variations(ground, side, pair, &ruling),
                ruling,
                without_flagged,
            }
        })
        .collect();
    let nearest = pairs
        .iter()
        .min_by(|x, y| x.ruling.separation.own.total_cmp(&y.ruling.separation.own));
    let contrasts = nearest.map_or_else(Vec::new, |nearest| {
        let nearest = nearest.pair[side.opposite()];
        let others = question.against.iter().filter(|c| **c != nearest);
        others
            .map(|&other| contrast(ground, side, parcel, [nearest, other]))
            .collect()
    });
    let placement = located.placements[side]
        .iter()
        .find(|placement| placement.parcel == parcel)
        .expect("the parcel is no landmark here");
    let landmarks = &ground.study.landmarks;
    Checked {
        side,
        parcel,
        aside: Vec::new(),
        told: (0..landmarks.blocks())
            .map(|b| landmarks.block_name(b).to_owned())
            .collect(),
        flagged: Vec::new(),
        level: level_of(&ground.study.settings),
        space: located.spaces[located.choice.evidence].params,
        evidence: located.evidence.clone(),
        replicates: ground.watched.distances.len(),
        beyond: located.beyond.clone(),
        placement: placement.clone(),
        set_level: located.set_level,
        judged: located.judgements[side][parcel],
        pairs,
        contrasts,
        warnings: located.warnings.clone(),
    }
}
