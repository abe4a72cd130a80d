//! What ranks: one kind of evidence or a mixture, on the full sample and in a replicate.

use std::sync::Arc;

use ndarray::{Array2, ArrayView1};

use super::candidate_sets::{CandidateSets, Seen};
use super::chance::Support;
use super::{Counterpart, Placement, Space, Tally};
use crate::bootstrap::{Purpose, Stream};
use crate::domain::{Pair, Seed, Side};
use crate::evidence::{Evidence, Expression, Kind, Material, Transport};
use crate::holdout::{Blend, Compared, Member, OutOfBag, Way};
use crate::place::{self, Candidates};
use crate::prepare::Study;
use crate::transport::Mass;

/// What ranks.
pub enum Ranker {
    /// One kind, fitted again in every replicate.
    One(Way),
    /// Several kinds with their weights, of which costly ones bring their own replicates.
    Mixture {
        /// The kinds and their ways of ranking.
        members: Vec<(Member, Way)>,
        /// Replicates of transport, if it is among them.
        bagged: Option<Arc<OutOfBag>>,
        /// Replicates that rank.
        replicates: usize,
    },
}

impl Ranker {
    /// Replicates that rank, of `all`.
    pub fn replicates(&self, all: usize) -> usize {
        match self {
            Ranker::One(_) => all,
            Ranker::Mixture { replicates, .. } => (*replicates).min(all),
        }
    }
}

/// The evidence of a way that is fitted wherever it is needed.
fn cheap(way: &Way) -> Box<dyn Evidence> {
    way.evidence()
        .expect("costly kinds bring their own replicates")
}

/// Fills `out` by one kind of evidence. Where a draw of subjects leaves it nothing to go by, all are
/// alike to it.
fn fit(
    material: &Material<'_>,
    evidence: &dyn Evidence,
    weights: &[f64],
    chance: &mut Stream,
    open: &Pair<Vec<usize>>,
    out: &mut Array2<f64>,
) {
    match evidence.fit(material, weights, chance) {
        Ok(fitted) => fitted.dissimilarities(&open.a, &open.b, out),
        Err(_) => out.fill(0.0),
    }
}

/// What is said of candidates beside their rank.
#[derive(Clone, Copy)]
pub struct Grounds<'g> {
    /// Counts over replicates.
    pub tally: &'g Tally,
    /// The joint space that shows distances.
    pub space: &'g Space,
    /// What left-out landmarks support.
    pub landmarks: &'g Support,
    /// Candidate sets.
    pub sets: &'g CandidateSets,
    /// The full-sample comparison of open parcels.
    pub compared: &'g Compared,
}

/// The full-sample ranking of open parcels against open parcels, and which of it is listed.
pub struct Ranking {
    /// What ranks.
    pub ranker: Ranker,
    /// Parcels that are no landmark.
    pub open: Pair<Vec<usize>>,
    /// For each open parcel its listed candidates, as places in `open` of the other side.
    pub listed: Pair<Vec<Vec<usize>>>,
    /// Which parcels may be counterparts.
    candidates: Candidates,
    /// Seed of every draw.
    seed: Seed,
    /// For each kind the first candidate of each open parcel.
    firsts: Vec<(Kind, Pair<Vec<Option<usize>>>)>,
}

impl Ranking {
    /// Ranks the full sample.
    pub fn new(
        material: &Material<'_>,
        ranker: Ranker,
        open: &Pair<Vec<usize>>,
        study: &Study,
    ) -> Ranking {
        let weights = material.weights(|_| 1.0);
        let shape = (open.a.len(), open.b.len());
        let mut scores = Array2::zeros(shape);
        let mut firsts = Vec::new();
        let full = |way: &Way, out: &mut Array2<f64>| {
            // The full sample comes before the first replicate, so it takes the last index.
            let mut chance = Stream::new(study.settings.seed, Purpose::Evidence, u64::MAX);
            fit(material, &*cheap(way), &weights, &mut chance, open, out);
        };
        match &ranker {
            Ranker::One(way) => {
                full(way, &mut scores);
                study.candidates.close(&open.a, &open.b, &mut scores);
                firsts.push((way.kind(), place::nearest(&scores)));
            }
            Ranker::Mixture {
                members, bagged, ..
            } => {
                let mut blend = Blend::new(shape);
                for (member, way) in members {
                    match (way, bagged) {
                        (Way::Transport, Some(bagged)) => {
                            scores = Array2::from_shape_fn(shape, |(i, j)| {
                                bagged.mean[(open.a[i], open.b[j])]
                            });
                        }
                        _ => full(way, &mut scores),
                    }
                    study.candidates.close(&open.a, &open.b, &mut scores);
                    firsts.push((member.kind, place::nearest(&scores)));
                    blend.add(member.weight, &scores);
                }
                scores = blend.score;
                study.candidates.close(&open.a, &open.b, &mut scores);
            }
        }
        let best = |row: ArrayView1<'_, f64>| {
            let mut order = place::order(row);
            let admissible = row.iter().filter(|d| **d < f64::INFINITY).count();
            order.truncate(study.settings.top.of(admissible));
            order
        };
        Ranking {
            ranker,
            open: open.clone(),
            candidates: study.candidates.clone(),
            seed: study.settings.seed,
            listed: Pair {
                a: scores.rows().into_iter().map(best).collect(),
                b: scores.columns().into_iter().map(best).collect(),
            },
            firsts,
        }
    }

    /// Fills `out` with how unlike open parcels are in a replicate with these landmark weights. Where
    /// the material is not that of the full sample, transport is fitted `again` with parcels of such
    /// mass; else its own replicates serve.
    ///
    /// # Panics
    /// If evidence cannot be fitted, which was tried on the full sample.
    pub fn replicate(
        &self,
        material: &Material<'_>,
        weights: &[f64],
        replicate: usize,
        again: Option<Mass>,
        out: &mut Array2<f64>,
    ) {
        let (open, seed) = (&self.open, self.seed);
        let fill = |way: &Way, out: &mut Array2<f64>| {
            let mut chance = Stream::new(seed, Purpose::Evidence, replicate as u64);
            fit(material, &*cheap(way), weights, &mut chance, open, out);
        };
        match &self.ranker {
            Ranker::One(way) => fill(way, out),
            Ranker::Mixture {
                members, bagged, ..
            } => {
                let mut blend = Blend::new(out.dim());
                for (member, way) in members {
                    match (way, bagged) {
                        (Way::Transport, Some(bagged)) => match again {
                            None => {
                                let own = &bagged.each[replicate];
                                out.zip_mut_with(own, |x, y| *x = f64::from(*y));
                            }
                            Some(mass) => {
                                let expressions = Expression::ALL;
                                let transport = Transport {
                                    expression: expressions[replicate % expressions.len()],
                                    mass,
                                };
                                let index = replicate as u64;
                                let mut chance = Stream::new(seed, Purpose::Evidence, index);
                                fit(material, &transport, weights, &mut chance, open, out);
                            }
                        },
                        _ => fill(way, out),
                    }
                    self.candidates.close(&open.a, &open.b, out);
                    blend.add(member.weight, out);
                }
                out.assign(&blend.score);
            }
        }
        self.candidates.close(&open.a, &open.b, out);
    }

    /// Share of a parcel's mass that averaged transport sends to a candidate, both as places among
    /// the open parcels.
    fn share(&self, side: Side, parcel: usize, candidate: usize) -> Option<f64> {
        let Ranker::Mixture {
            bagged: Some(bagged),
            ..
        } = &self.ranker
        else {
            return None;
        };
        let shares = bagged.shares.as_ref()?;
        let (own, other) = (
            self.open[side][parcel],
            self.open[side.opposite()][candidate],
        );
        Some(match side {
            Side::A => shares.a[(own, other)],
            Side::B => shares.b[(other, own)],
        })
    }

    /// Every open parcel's candidates, in the order of the input file.
    pub fn placements(&self, side: Side, study: &Study, grounds: &Grounds<'_>) -> Vec<Placement> {
        let Grounds {
            tally,
            space,
            landmarks,
            sets,
            compared,
        } = *grounds;
        let other = side.opposite();
        let seen = Seen::new(compared, side);
        let mut rank_intervals = tally.rank_intervals(side);
        let mut placements: Vec<Option<Placement>> = vec![None; study.species[side].parcels.len()];
        for (at, listed) in self.listed[side].iter().enumerate() {
            let parcel = self.open[side][at];
            let row = compared.row(side, parcel);
            let order = place::order(ArrayView1::from(&row));
            let admissible: Vec<usize> = order
                .into_iter()
                .filter(|&c| row[c] < f64::INFINITY)
                .collect();
            let in_set: Vec<usize> = admissible
                .iter()
                .enumerate()
                .filter(|(place, &c)| sets.holds(side, at, c, *place == 0))
                .map(|(_, &c)| c)
                .collect();
            let calmly = |(place, &candidate): (usize, &usize)| {
                let holds = sets.holds_calmly(side, at, candidate, place == 0)?;
                Some((candidate, holds))
            };
            let calm: Option<Vec<(usize, bool)>> =
                admissible.iter().enumerate().map(calmly).collect();
            let mut is_in_set = vec![false; row.len()];
            in_set.iter().for_each(|&c| is_in_set[c] = true);
            let counterparts = listed
                .iter()
                .enumerate()
                .map(|(place, &candidate)| {
                    let support = tally.support(side, at, candidate);
                    Counterpart {
                        parcel: self.open[other][candidate],
                        rank: place + 1,
                        rank_interval: rank_intervals.next().expect("one for each listed pair"),
                        distance: space.distance(side, parcel, self.open[other][candidate]),
                        support,
                        mutual: place == 0 && self.listed[other][candidate].first() == Some(&at),
                        kinds_agreeing: self
                            .firsts
                            .iter()
                            .filter(|(_, firsts)| firsts[side][at] == Some(candidate))
                            .map(|(kind, _)| *kind)
                            .collect(),
                        chance: (place == 0).then(|| {
                            let share = self.share(side, at, candidate);
                            landmarks.chance(share, support)
                        }),
                        in_candidate_set: is_in_set[candidate],
                    }
                })
                .collect();
            placements[parcel] = Some(Placement {
                parcel,
                counterparts,
                candidate_set: in_set.iter().map(|&c| self.open[other][c]).collect(),
                calm_set: calm.map(|calm| {
                    let held = calm.into_iter().filter(|(_, holds)| *holds);
                    held.map(|(c, _)| self.open[other][c]).collect()
                }),
                candidates: admissible.len(),
                strength: seen.first_share(at, |_| true),
                p_of_none: sets.p_of_none(side, at),
            });
        }
        let as_listed = study.species[side].parcels.as_listed();
        as_listed
            .iter()
            .filter_map(|&parcel| placements[parcel].take())
            .collect()
    }
}
