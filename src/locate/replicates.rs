//! Bootstrap replicates: align again under other landmark weights, and where there are subjects with
//! embeddings of subjects drawn again, and see what stays.

use ndarray::{Array2, ArrayView2, Axis};

use super::ranking::{Ranker, Ranking};
use super::watched::{gaps, Watched};
use super::{intervals, Space, StandardErrors, SubjectErrors};
use crate::align::{self, Alignment, JointMap, PerAlignment};
use crate::bootstrap::{accumulate, Purpose, Spread, Stream};
use crate::domain::{Landmark, Landmarks, Pair, Side};
use crate::evidence::Material;
use crate::place;
use crate::prepare::{drawn_again, Study};
use crate::watch::{Interrupted, Watch};

/// What is counted over replicates.
#[derive(Debug, Clone)]
pub struct Tally {
    /// How often each candidate came first: `(open parcels, open parcels of the other side)`.
    firsts: Pair<Array2<u32>>,
    /// Stray of every parcel in both joint spaces, by what was drawn again.
    spreads: [PerAlignment<Pair<Spread>>; Again::ALL.len()],
    /// Ranks of all listed pairs, for each replicate that ranks.
    ranks: Pair<Vec<Vec<u32>>>,
    /// What becomes of the watched pairs.
    watched: Watched,
    /// Replicates with too few distinct landmarks.
    pub(super) degenerate: usize,
    /// Replicates that found nearest candidates.
    pub(super) ranking: usize,
    /// Whether subjects were drawn at all.
    pub(super) drawn: bool,
    /// Replicates that drew subjects again.
    pub(super) drawn_again: usize,
    /// Draws of subjects that could not be used.
    pub(super) unusable: usize,
}

/// What is drawn again.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Again {
    Landmarks,
    Subjects,
    Both,
}

impl Again {
    const ALL: [Again; 3] = [Again::Landmarks, Again::Subjects, Again::Both];
}

impl Tally {
    fn new(open: &Pair<Vec<usize>>, spaces: &PerAlignment<Space>) -> Tally {
        let firsts = Array2::zeros((open.a.len(), open.b.len()));
        Tally {
            firsts: Pair {
                b: Array2::zeros((open.b.len(), open.a.len())),
                a: firsts,
            },
            spreads: Again::ALL.map(|_| {
                PerAlignment::from_fn(|alignment| {
                    spaces[alignment]
                        .positions
                        .as_ref()
                        .map(|p| Spread::new(p.nrows(), p.ncols()))
                })
            }),
            ranks: Pair::default(),
            watched: Watched::default(),
            degenerate: 0,
            ranking: 0,
            drawn: false,
            drawn_again: 0,
            unusable: 0,
        }
    }

    fn add(&mut self, mut block: Tally) {
        for side in Side::BOTH {
            self.firsts[side] += &block.firsts[side];
            self.ranks[side].append(&mut block.ranks[side]);
            for alignment in Alignment::BOTH {
                for (all, own) in self.spreads.iter_mut().zip(&block.spreads) {
                    all[alignment][side].add(&own[alignment][side]);
                }
            }
        }
        self.watched.append(block.watched);
        self.degenerate += block.degenerate;
        self.ranking += block.ranking;
        self.drawn |= block.drawn;
        self.drawn_again += block.drawn_again;
        self.unusable += block.unusable;
    }

    /// What became of the watched pairs.
    pub(super) fn take_watched(&mut self) -> Watched {
        std::mem::take(&mut self.watched)
    }

    /// Share of replicates in which a candidate came first, both as places among the open parcels.
    pub(super) fn support(&self, side: Side, parcel: usize, candidate: usize) -> f64 {
        f64::from(self.firsts[side][(parcel, candidate)]) / self.ranking as f64
    }

    /// Standard errors of positions in one joint space.
    pub(super) fn standard_errors(&self, alignment: Alignment) -> StandardErrors {
        let of = |again: Again| {
            self.spreads[again as usize][alignment]
                .as_ref()
                .map(Spread::standard_errors)
        };
        StandardErrors {
            landmarks: of(Again::Landmarks),
            // A standard deviation takes two.
            subjects: (self.drawn_again > 1).then(|| SubjectErrors {
                alone: of(Again::Subjects),
                both: of(Again::Both),
            }),
        }
    }

    /// Rank intervals of all listed pairs of a side, in order.
    pub(super) fn rank_intervals(&self, side: Side) -> std::vec::IntoIter<(u32, u32)> {
        let pairs = self.ranks[side].first().map_or(0, Vec::len);
        intervals(&self.ranks[side], pairs).into_iter()
    }
}

/// What every replicate works from.
#[derive(Clone, Copy)]
pub struct Job<'j, 'm> {
    /// The study.
    pub study: &'j Study,
    /// The full sample.
    pub material: &'j Material<'m>,
    /// Its joint spaces.
    pub spaces: &'j PerAlignment<Space>,
    /// The one that shows distances.
    pub shown: Alignment,
    /// What ranks.
    pub ranking: &'j Ranking,
    /// Pairs of open parcels to follow.
    pub watched: &'j [Pair<usize>],
}

/// Runs all replicates. Where no draw of subjects can be used, they are run without subjects, so that
/// what is said of landmarks stands; the tally tells.
pub fn run(job: Job<'_, '_>, watch: &dyn Watch) -> Result<Tally, Interrupted> {
    let has_subjects = job.study.cohorts.a.is_some() || job.study.cohorts.b.is_some();
    let tally = all(job, has_subjects, watch)?;
    if has_subjects && tally.ranking == 0 {
        let without = all(job, false, watch)?;
        return Ok(Tally {
            drawn: true,
            unusable: tally.unusable,
            ..without
        });
    }
    Ok(tally)
}

fn all(job: Job<'_, '_>, draw_subjects: bool, watch: &dyn Watch) -> Result<Tally, Interrupted> {
    let Job {
        study,
        spaces,
        ranking,
        ..
    } = job;
    watch.begin("bootstrap replicates", study.settings.replicates);
    let tally = accumulate(
        study.settings.replicates,
        watch,
        || Tally::new(&ranking.open, spaces),
        || Array2::zeros((ranking.open.a.len(), ranking.open.b.len())),
        |tally, dissimilarities, replicate| {
            one(tally, dissimilarities, replicate, job, draw_subjects);
        },
        Tally::add,
    );
    watch.end();
    tally
}

fn one(
    tally: &mut Tally,
    dissimilarities: &mut Array2<f64>,
    replicate: usize,
    job: Job<'_, '_>,
    draw_subjects: bool,
) {
    let Job {
        study,
        material,
        spaces,
        shown,
        ranking,
        watched,
    } = job;
    let settings = &study.settings;
    let index = replicate as u64;
    let mut chance = Stream::new(settings.seed, Purpose::LandmarkWeights, index);
    let blocks = material.landmarks.blocks();
    let by_block = settings.resampling.draw(blocks, &mut chance);
    let weights = material.weights(|block| by_block[block]);

    let distinct = by_block.iter().filter(|w| **w > 0.0).count();
    let axes = match &ranking.ranker {
        Ranker::One(way) => way.joint().map_or(0, |params| params.axes),
        Ranker::Mixture { .. } => spaces
            .procrustes
            .params
            .axes
            .max(spaces.canonical.params.axes),
    };
    if distinct <= axes {
        tally.degenerate += 1;
    }
    for alignment in Alignment::BOTH {
        stray(
            &mut tally.spreads[Again::Landmarks as usize][alignment],
            &spaces[alignment],
            material,
            &weights,
        );
    }

    if !watched.is_empty() && !draw_subjects {
        let found = gaps(spaces[shown].params, material, &weights, watched);
        tally.watched.distances.push(found);
    }
    let ranks_here = replicate < ranking.ranker.replicates(settings.replicates);
    if draw_subjects {
        tally.drawn = true;
        if replicate >= settings.subject_replicates {
            return;
        }
        let Some(drawn) = drawn_again(study, replicate) else {
            tally.unusable += 1;
            return;
        };
        let species = Pair {
            a: &*drawn.species.a,
            b: &*drawn.species.b,
        };
        let material = Material::new(species, material.landmarks);
        // Nothing can be anchored to parcels that lost all their connections in this draw.
        let kept = |weights: &[f64]| -> Vec<f64> {
            let landmarks = material.landmarks.list();
            let stands = |l: &Landmark| {
                Side::BOTH
                    .into_iter()
                    .all(|side| l.parcels[side].iter().any(|&p| drawn.connected[side][p]))
            };
            let kept = landmarks.iter().zip(weights);
            kept.map(|(l, w)| if stands(l) { *w } else { 0.0 })
                .collect()
        };
        let (alone, both) = (kept(&material.weights(|_| 1.0)), kept(&weights));
        let anchored = both.iter().filter(|w| **w > 0.0).count();
        if anchored < Landmarks::FEWEST {
            tally.unusable += 1;
            return;
        }
        tally.drawn_again += 1;
        for (again, weights) in [(Again::Subjects, &alone), (Again::Both, &both)] {
            for alignment in Alignment::BOTH {
                stray_again(
                    &mut tally.spreads[again as usize][alignment],
                    &spaces[alignment],
                    &material,
                    weights,
                    &drawn.connected,
                );
            }
        }
        if !watched.is_empty() {
            let found = gaps(spaces[shown].params, &material, &both, watched);
            tally.watched.distances.push(found);
        }
        if !ranks_here {
            return;
        }
        ranking.replicate(
            &material,
            &both,
            replicate,
            Some(settings.mass),
            dissimilarities,
        );
    } else if ranks_here {
        ranking.replicate(material, &weights, replicate, None, dissimilarities);
    } else {
        return;
    }
    tally.ranking += 1;
    if !watched.is_empty() {
        let found = Watched::ranks(dissimilarities, &ranking.open, watched);
        tally.watched.ranks.push(found);
    }
    let nearest = place::nearest(dissimilarities);
    for side in Side::BOTH {
        for (parcel, first) in nearest[side].iter().enumerate() {
            if let Some(first) = first {
                tally.firsts[side][(parcel, *first)] += 1;
            }
        }
    }
    if replicate < settings.rank_replicates {
        for side in Side::BOTH {
            let rows = match side {
                Side::A => dissimilarities.view(),
                Side::B => dissimilarities.t(),
            };
            tally.ranks[side].push(ranks(rows, &ranking.listed[side]));
        }
    }
}

/// Ranks of the listed candidates of every row, one row after the other.
fn ranks(rows: ArrayView2<'_, f64>, listed: &[Vec<usize>]) -> Vec<u32> {
    let rows = rows.as_standard_layout();
    let mut all = Vec::with_capacity(listed.iter().map(Vec::len).sum());
    for (row, listed) in rows.rows().into_iter().zip(listed) {
        // Sorting once is dearer than counting for a few candidates, and cheaper for many.
        if listed.len() * SORT_FROM < row.len() {
            let row = row.as_slice().expect("rows in standard layout");
            all.extend(listed.iter().map(|&c| place::rank(row, c) as u32));
        } else {
            let mut rank = vec![0_u32; row.len()];
            for (place, candidate) in place::order(row).into_iter().enumerate() {
                rank[candidate] = place as u32 + 1;
            }
            all.extend(listed.iter().map(|&c| rank[c]));
        }
    }
    all
}

/// Counting ranks is used while it takes fewer than one in this many of a row's candidates.
const SORT_FROM: usize = 10;

/// How far every parcel strays from its full-sample position relative to the other species: each
/// replicate is first superimposed on the full sample by the *other* species' parcels. So neither
/// species is the fixed one, and no error is zero by construction.
fn stray(spreads: &mut Pair<Spread>, space: &Space, material: &Material<'_>, weights: &[f64]) {
    let map = align::fit(space.params, material.anchors.as_ref(), weights)
        .expect("every draw has two landmarks or more");
    for side in Side::BOTH {
        let other = side.opposite();
        let back = space.anchorage[other].similarity(&map.maps[other]);
        let there = map.maps[side].then(&back);
        spreads[side].record(
            &there.apply(material.embedded()[side].view()),
            &space.positions[side],
        );
    }
}

/// The same for embeddings of subjects drawn again, which must be superimposed by positions, since
/// their coordinates are others; by those of parcels that kept a connection.
fn stray_again(
    spreads: &mut Pair<Spread>,
    space: &Space,
    material: &Material<'_>,
    weights: &[f64],
    connected: &Pair<Vec<bool>>,
) {
    let map = align::fit(space.params, material.anchors.as_ref(), weights)
        .expect("landmarks were counted before");
    let positions = map.positions(material.embedded());
    for side in Side::BOTH {
        let other = side.opposite();
        let kept: Vec<usize> = (0..connected[other].len())
            .filter(|&parcel| connected[other][parcel])
            .collect();
        let back = JointMap::superimpose(
            &positions[other].select(Axis(0), &kept),
            &space.positions[other].select(Axis(0), &kept),
        );
        let there = map.maps[side].then(&back);
        spreads[side].record(
            &there.apply(material.embedded()[side].view()),
            &space.positions[side],
        );
    }
}
