//! The main job: where every parcel of either species falls in the other's space.

mod axes;
mod chance;
mod doubt;
mod left_out;
mod ranking;
mod replicates;
mod span;

pub use axes::{AxisEnds, Space, StandardErrors, SubjectErrors};
pub use doubt::{Doubt, Judged};
pub use left_out::LeftOut;
use replicates::Job;
pub use replicates::Tally;
pub use span::beyond_landmarks;

use chance::Support;
use ranking::{Ranker, Ranking};

use serde::Serialize;

use crate::align::{Alignment, Params, PerAlignment};
use crate::bootstrap::{interval, Purpose, Stream};
use crate::domain::Pair;
use crate::evidence::{Evidence, Expression, Grown, Kind, Material, Transport, Unavailable};
use crate::holdout::{self, Asked, Choice, Curve, Member, OutOfBag, Questions, Trials, Way};
use crate::place;
use crate::prepare::Study;
use crate::settings::EvidenceChoice;
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
    let open = place::open_parcels(
        &study.landmarks,
        study.species.as_ref().map(|s| s.parcels.len()),
    );
    let params = |alignment, axes| Params {
        alignment,
        axes,
        ridge: settings.ridge,
    };

    let mut ways: Vec<Way> = Alignment::BOTH
        .into_iter()
        .flat_map(|alignment| study.axes.iter().map(move |&axes| params(alignment, axes)))
        .map(Way::Joint)
        .collect();
    let mut unavailable = Vec::new();
    for way in further_ways(study) {
        match can_be_fitted(&way, &material, study) {
            Ok(()) => ways.push(way),
            Err(why) => unavailable.push(why),
        }
    }
    let candidates = &study.candidates;
    let asked = Asked::draw(&study.landmarks, candidates, settings.seed);
    let questions = Questions {
        open: &open,
        candidates,
        asked: &asked,
        seed: settings.seed,
    };
    let mut trials = holdout::run(&material, &ways, &questions, watch)?;
    let bagged = match transport(study, &material, &questions, watch)? {
        Some(Ok(bagged)) => {
            let placed = holdout::placed_out_of_bag(&material, &bagged, &questions);
            ways.push(Way::Transport);
            trials.add(placed);
            Some(bagged)
        }
        Some(Err(why)) => {
            unavailable.push(why);
            None
        }
        None => None,
    };
    let alignment = match settings.evidence {
        EvidenceChoice::Procrustes => Some(Alignment::Procrustes),
        EvidenceChoice::Canonical => Some(Alignment::Canonical),
        _ => None,
    };
    let choice = holdout::choose(&ways, &trials, alignment, None);
    let settled = PerAlignment::from_fn(|alignment| params(alignment, choice.axes[alignment]));

    let members = members(settings.evidence, &ways, &trials, &choice);
    let mixes = matches!(
        settings.evidence,
        EvidenceChoice::Mixture | EvidenceChoice::Transport
    );
    let mixture = mixes.then(|| {
        holdout::leave_out(
            &material,
            &ways,
            &trials,
            &members,
            bagged.as_ref(),
            &questions,
        )
    });
    let way = match &mixture {
        // To those who judge landmarks the mixture is a way of ranking like any other.
        Some(found) => trials.add(found.iter().map(|found| found.placed).collect()),
        None => members[0].way,
    };
    let left_out = left_out::summarise(&material, &ways, &trials, way, &choice, alignment, &asked);
    let firsts = match mixture {
        Some(found) => found.into_iter().map(|found| found.first).collect(),
        None => left_out::firsts(&study.landmarks, &left_out),
    };
    let support = Support::new(&study.landmarks, firsts);
    let mut spaces =
        PerAlignment::from_fn(|alignment| Space::fit(&material, settled[alignment], &asked));

    let judgements = doubt::judgements(&material, bagged.as_ref(), &open, &asked);
    let transport_replicates = bagged.as_ref().map_or(0, |bagged| bagged.each.len());
    let ranker = if mixes {
        Ranker::Mixture {
            members: members.iter().map(|m| (*m, ways[m.way])).collect(),
            replicates: bagged
                .as_ref()
                .map_or(settings.rank_replicates, |bagged| bagged.each.len()),
            bagged: bagged.map(Box::new),
        }
    } else {
        Ranker::One(ways[way])
    };
    let ranking = Ranking::new(&material, ranker, &open, study);
    let job = Job {
        study,
        material: &material,
        spaces: &spaces,
        ranking: &ranking,
    };
    let tally = replicates::run(job, watch)?;
    for alignment in Alignment::BOTH {
        spaces[alignment].standard_errors = tally.standard_errors(alignment);
    }

    let placements = Pair::from_fn(|side| {
        ranking.placements(side, study, &tally, &spaces[choice.evidence], &support)
    });
    let mut warnings = Vec::new();
    for why in &unavailable {
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
    Ok(Located {
        curves: Alignment::BOTH
            .into_iter()
            .map(|alignment| Curve::of(alignment, &ways, &trials))
            .collect(),
        beyond: beyond_landmarks(&material, settled[choice.evidence].axes),
        choice,
        evidence: Rests {
            kinds: members,
            unavailable: unavailable.iter().map(ToString::to_string).collect(),
            transport_replicates,
            ranking_replicates: tally.ranking,
            subject_replicates: tally.drawn.then_some(tally.drawn_again),
        },
        spaces,
        left_out,
        placements,
        judgements,
        warnings,
    })
}

/// Cheap ways of ranking beside distances in the joint spaces that the settings ask for.
fn further_ways(study: &Study) -> Vec<Way> {
    let grown = Way::Grown(Grown {
        axes: study.axes.iter().copied().max().unwrap_or(1),
        ridge: study.settings.ridge,
    });
    match study.settings.evidence {
        EvidenceChoice::Mixture => vec![Way::Fingerprint, grown],
        EvidenceChoice::Fingerprint => vec![Way::Fingerprint],
        EvidenceChoice::Grown => vec![grown],
        _ => Vec::new(),
    }
}

/// Whether a study has what a way of ranking needs.
fn can_be_fitted(way: &Way, material: &Material<'_>, study: &Study) -> Result<(), Unavailable> {
    let weights = material.weights(|_| 1.0);
    let mut chance = Stream::new(study.settings.seed, Purpose::Evidence, u64::MAX);
    match way.evidence() {
        Some(evidence) => evidence.fit(material, &weights, &mut chance).map(|_| ()),
        None => Ok(()),
    }
}

/// Replicates of transport, where the settings ask for it.
fn transport(
    study: &Study,
    material: &Material<'_>,
    questions: &Questions<'_>,
    watch: &dyn Watch,
) -> Result<Option<Result<OutOfBag, Unavailable>>, Interrupted> {
    let settings = &study.settings;
    if !matches!(
        settings.evidence,
        EvidenceChoice::Mixture | EvidenceChoice::Transport
    ) {
        return Ok(None);
    }
    let members = Expression::ALL.map(|expression| Transport {
        expression,
        mass: settings.mass,
    });
    let members: Vec<&dyn Evidence> = members.iter().map(|m| m as &dyn Evidence).collect();
    let parcels = study.species.as_ref().map(|s| s.parcels.len());
    let replicates = Transport::replicates(settings.transport_replicates, parcels);
    holdout::out_of_bag(material, &members, replicates, questions, watch).map(Some)
}

/// Whether a kind takes part under a setting.
fn takes(evidence: EvidenceChoice, kind: Kind) -> bool {
    let only = match evidence {
        EvidenceChoice::Mixture => return true,
        EvidenceChoice::Procrustes => Kind::Procrustes,
        EvidenceChoice::Canonical => Kind::Canonical,
        EvidenceChoice::Fingerprint => Kind::Fingerprint,
        EvidenceChoice::Grown => Kind::Grown,
        EvidenceChoice::Transport => Kind::Transport,
    };
    kind == only
}

/// The kinds that rank, with their weights.
fn members(
    evidence: EvidenceChoice,
    ways: &[Way],
    trials: &Trials,
    choice: &Choice,
) -> Vec<Member> {
    let found: Vec<(Kind, usize)> = Kind::ALL
        .into_iter()
        .filter(|kind| takes(evidence, *kind))
        .filter_map(|kind| {
            let way = match kind {
                Kind::Procrustes => Some(choice.ways.procrustes),
                Kind::Canonical => Some(choice.ways.canonical),
                _ => ways.iter().position(|way| way.kind() == kind),
            };
            Some((kind, way?))
        })
        .collect();
    let kinds: Vec<Kind> = found.iter().map(|(kind, _)| *kind).collect();
    let errors: Vec<Vec<f64>> = found
        .iter()
        .map(|(_, way)| trials.errors(*way, None))
        .collect();
    holdout::weigh(&kinds, &errors)
        .into_iter()
        .zip(found)
        .zip(errors)
        .map(|((weight, (kind, way)), errors)| Member {
            kind,
            weight,
            error: errors.iter().sum::<f64>() / errors.len() as f64,
            way,
        })
        .collect()
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
