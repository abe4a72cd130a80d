//! The main job: where every parcel of either species falls in the other's space.

mod agreement;
mod axes;
mod candidate_sets;
mod chance;
mod doubt;
mod false_discovery;
mod left_out;
mod ranking;
mod replicates;
mod span;
mod watched;
mod weighed;

pub use agreement::PERMUTATIONS;
pub use axes::{
    AxisEnds, Space, StandardErrors, SubjectErrors, REPLICATES_FROM_RELIABILITY, REPLICATES_UP_TO_P,
};
pub use candidate_sets::{stand_ins, Seen, SetLevel};
pub use doubt::{Doubt, Judged};
pub use false_discovery::q_values;
pub use left_out::{map_without, LeftOut};
use replicates::Job;
pub use replicates::Tally;
pub use span::{beyond_landmarks, strain};
pub use watched::{gaps, Watched};
pub use weighed::Weighed;

use candidate_sets::Calibration;
use chance::Support;
use ranking::{Grounds, Ranker, Ranking};

use serde::Serialize;

use crate::align::{Alignment, Params, PerAlignment};
use crate::bootstrap::interval;
use crate::domain::Pair;
use crate::evidence::{Kind, Material};
use crate::holdout::{contradicted, Asked, Choice, Compared, Curve, Member, Questions};
use crate::place;
use crate::prepare::Study;
use crate::warning::Warning;
use crate::watch::{Interrupted, Watch};

/// One candidate for the counterpart of a parcel.
#[derive(Debug, Clone, PartialEq)]
pub struct Counterpart {
    /// The candidate, a parcel of the other species.
    pub parcel: usize,
    /// Its rank, 1 being the best.
    pub rank: usize,
    /// Interval of its rank over the replicates that rank.
    pub rank_interval: (u32, u32),
    /// Distance in the joint space of the evidence; 1 is that of random pairs.
    pub distance: f64,
    /// Share of replicates in which it comes first.
    pub support: f64,
    /// Whether each is the other's first.
    pub mutual: bool,
    /// The kinds of evidence that put it first by themselves.
    pub kinds_agreeing: Vec<Kind>,
    /// Of first candidates, the estimated chance of being right.
    pub chance: Option<f64>,
    /// Whether it is in the parcel's candidate set.
    pub in_candidate_set: bool,
}

/// What the ranking rests on.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct Rests {
    /// Each kind with its weight and left-out error.
    pub kinds: Vec<Member>,
    /// Kinds that have nothing to say about this study, with the reason.
    pub unavailable: Vec<String>,
    /// Replicates of transport that were averaged; 0 where it takes no part.
    pub transport_replicates: usize,
    /// Replicates that support and rank intervals come from.
    pub ranking_replicates: usize,
    /// Replicates that drew subjects again; `None` where no subjects were given.
    pub subject_replicates: Option<usize>,
}

/// A parcel that is no landmark, and its candidates, best first.
#[derive(Debug, Clone, PartialEq)]
pub struct Placement {
    /// The parcel.
    pub parcel: usize,
    /// Its candidates.
    pub counterparts: Vec<Counterpart>,
    /// All candidates in its set, best first, listed or not.
    pub candidate_set: Vec<usize>,
    /// The same if sets are calibrated without the landmarks that the others contradict, where there are
    /// any.
    pub calm_set: Option<Vec<usize>>,
    /// How many candidates there are.
    pub candidates: usize,
    /// Share of the parcel's mass on its first candidate, of that on all candidates.
    pub strength: f64,
    /// p-value for "no counterpart among the candidates", by left-out landmarks whose counterpart is
    /// taken away.
    pub p_of_none: f64,
}

/// Everything `locate` finds.
#[derive(Debug, Clone)]
pub struct Located {
    /// Left-out error of both alignments against the number of axes.
    pub curves: Vec<Curve>,
    /// What was settled on.
    pub choice: Choice,
    /// What ranks, and how much each kind of evidence counts.
    pub evidence: Rests,
    /// Both joint spaces.
    pub spaces: PerAlignment<Space>,
    /// Level of the candidate sets.
    pub set_level: SetLevel,
    /// Every landmark, left out.
    pub left_out: Vec<LeftOut>,
    /// How far outside the landmarks' span each parcel lies; above 1 is beyond every landmark.
    pub beyond: Pair<Vec<f64>>,
    /// Placements of the parcels that are no landmark, in the order of the input file.
    pub placements: Pair<Vec<Placement>>,
    /// What is known of every parcel besides its candidates.
    pub judgements: Pair<Vec<Judged>>,
    /// What came up on the way.
    pub warnings: Vec<Warning>,
}

/// Places every parcel.
///
/// # Errors
/// [`Interrupted`] where the watch says so.
///
/// # Panics
/// If an alignment cannot be fitted, which the checks on a [`Study`] rule out.
pub fn locate(study: &Study, watch: &dyn Watch) -> Result<Located, Interrupted> {
    let settings = &study.settings;
    let material = Material::new(study.species.as_ref(), &study.landmarks);
    let open = place::open_parcels(&study.landmarks, material.sizes());
    let asked = Asked::draw(&study.landmarks, &study.candidates, settings.seed);
    let questions = Questions {
        open: &open,
        candidates: &study.candidates,
        asked: &asked,
        seed: settings.seed,
    };
    let weighed = Weighed::new(settings, &study.axes, &material, &questions, watch)?;
    let (located, _) = locate_by(
        study,
        &material,
        &questions,
        &weighed,
        &[],
        &|_, _| (),
        watch,
    )?;
    Ok(located)
}

/// Places every parcel by what was `weighed` before, and follows the `watched` pairs of open parcels
/// through the replicates. `also` looks at each ranking without a landmark before it is dropped.
///
/// # Errors
/// [`Interrupted`] where the watch says so.
///
/// # Panics
/// As [`locate`]; or if a parcel of a watched pair is a landmark's.
pub fn locate_by(
    study: &Study,
    material: &Material<'_>,
    questions: &Questions<'_>,
    weighed: &Weighed,
    watched: &[Pair<usize>],
    also: &(dyn Fn(usize, &Compared) + Sync),
    watch: &dyn Watch,
) -> Result<(Located, Watched), Interrupted> {
    let settings = &study.settings;
    let (open, asked) = (questions.open, questions.asked);
    let params = |alignment, axes, embedding| Params {
        alignment,
        axes,
        ridge: settings.ridge,
        embedding,
    };
    let choice = weighed.choice;
    let settled = PerAlignment::from_fn(|alignment| {
        params(alignment, choice.axes[alignment], choice.embedding)
    });
    let flags = contradicted(&weighed.trials, choice.way);
    let calibration = Calibration::new(&study.landmarks, questions, flags, settings.level);
    let (left_out, firsts) = weighed.leave_out(material, questions, &|at, compared| {
        calibration.look(at, compared);
        also(at, compared);
    });
    let sets = calibration.finish();
    let compared = weighed.ranked(material, questions).full(open.clone());
    let support = Support::new(&study.landmarks, firsts);
    let mut spaces =
        PerAlignment::from_fn(|alignment| Space::fit(material, settled[alignment], asked));
    let p = agreement::p_values(material, questions, &spaces, watch)?;
    spaces.procrustes.p = p.procrustes;
    spaces.canonical.p = p.canonical;

    let judgements = doubt::judgements(material, weighed.bagged.as_deref(), open, asked);

    let Weighed {
        ways,
        trials,
        members,
        bagged,
        blends,
        unavailable,
        ..
    } = weighed;
    let transport_replicates = bagged.as_ref().map_or(0, |bagged| bagged.each.len());
    let ranker = if *blends {
        Ranker::Mixture {
            members: members.iter().map(|m| (*m, ways[m.way])).collect(),
            replicates: bagged
                .as_ref()
                .map_or(settings.rank_replicates, |bagged| bagged.each.len()),
            bagged: bagged.clone(),
        }
    } else {
        Ranker::One(ways[members[0].way])
    };
    let ranking = Ranking::new(material, ranker, open, study);
    let job = Job {
        study,
        material,
        spaces: &spaces,
        shown: choice.evidence,
        ranking: &ranking,
        watched,
    };
    let mut tally = replicates::run(job, watch)?;
    let seen = tally.take_watched();
    for alignment in Alignment::BOTH {
        spaces[alignment].standard_errors = tally.standard_errors(alignment);
        spaces[alignment].reliability = tally.reliability(alignment);
    }

    let grounds = Grounds {
        tally: &tally,
        space: &spaces[choice.evidence],
        landmarks: &support,
        sets: &sets,
        compared: &compared,
    };
    let placements = Pair::from_fn(|side| ranking.placements(side, study, &grounds));
    let mut warnings = Vec::new();
    for why in unavailable {
        warnings.push(Warning::EvidenceUnavailable {
            kind: why.kind.clone(),
            why: why.why.clone(),
        });
    }
    for (landmark, found) in study.landmarks.list().iter().zip(&left_out) {
        if let Some(placed) = found.contradicted {
            warnings.push(Warning::Contradicted {
                landmark: landmark.name.clone(),
                from_a: (placed.a.rank, placed.a.candidates),
                from_b: (placed.b.rank, placed.b.candidates),
            });
        }
    }
    for alignment in Alignment::BOTH {
        let map = &spaces[alignment].map;
        if map.fixed < map.axes() {
            warnings.push(Warning::LandmarksDoNotSpan {
                alignment: alignment.in_words(),
                axes: map.axes(),
                fixed: map.fixed,
            });
        }
    }
    if tally.degenerate > 0 {
        warnings.push(Warning::DegenerateReplicates {
            replicates: tally.degenerate,
            of: settings.replicates,
        });
    }
    if tally.unusable > 0 {
        warnings.push(Warning::SubjectsNotEmbedded {
            replicates: tally.unusable,
            of: settings.subject_replicates,
        });
    }
    let located = Located {
        curves: Alignment::BOTH
            .into_iter()
            .map(|alignment| Curve::of(alignment, choice.embedding, ways, trials))
            .collect(),
        beyond: beyond_landmarks(material, settled[choice.evidence].axes),
        choice,
        evidence: Rests {
            kinds: members.clone(),
            unavailable: unavailable.iter().map(ToString::to_string).collect(),
            transport_replicates,
            ranking_replicates: tally.ranking,
            subject_replicates: tally.drawn.then_some(tally.drawn_again),
        },
        spaces,
        set_level: sets.level,
        left_out,
        placements,
        judgements,
        warnings,
    };
    Ok((located, seen))
}

/// Intervals of ranks, one for each listed pair in order.
fn intervals(ranks: &[Vec<u32>], pairs: usize) -> Vec<(u32, u32)> {
    let mut of_pair = Vec::with_capacity(ranks.len());
    (0..pairs)
        .map(|pair| {
            of_pair.clear();
            of_pair.extend(ranks.iter().map(|replicate| replicate[pair]));
            interval(&mut of_pair).expect("at least one replicate ranks")
        })
        .collect()
}
