//! Candidate sets by conformal prediction (Vovk, Gammerman & Shafer 2005), calibrated by left-out
//! landmarks in the manner of CV+ (Barber, Candès, Ramdas & Tibshirani 2021).
//!
//! The score of a candidate is the share of the parcel's mass that lies on it and on better candidates:
//! where one candidate takes nearly all, sets are small; where many are alike, large. Each landmark's score
//! and that of the candidates compared with it come from one and the same ranking, without the
//! landmark.

use std::sync::Mutex;

use ndarray::{Array2, ArrayView1, ArrayView2};
use rand::Rng;
use serde::Serialize;

use crate::bootstrap::{Purpose, Stream};
use crate::domain::{Landmarks, Pair, Seed, Side};
use crate::evidence::Kind;
use crate::holdout::{Compared, Questions};
use crate::linalg::median;
use crate::place;

/// Where no kind carries mass, how fast the share falls with unlikeness: by e to this power from the
/// best candidate to the middle one. A plain choice; it shapes sets, not their coverage.
const FALL: f64 = 8.0;
/// Part of the score that is the bare share of candidates that are better. Most candidates carry no
/// mass at all; without it they would all tie, and one landmark whose counterpart carries none would
/// let every candidate in.
const BY_RANK: f64 = 0.1;

/// What the sets of a study hold, and at which level.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct SetLevel {
    /// The level asked for.
    pub asked: f64,
    /// The level used: the one asked for, or the highest that so many landmark blocks allow.
    pub used: f64,
    /// Landmark blocks that calibrate.
    pub blocks: usize,
    /// A candidate is left out if at least so many of them have smaller scores.
    #[serde(skip)]
    needed: usize,
}

impl SetLevel {
    /// The level that `blocks` blocks allow: at most blocks / (blocks + 1).
    #[must_use]
    pub fn new(asked: f64, blocks: usize) -> SetLevel {
        // The slack keeps .9 times 10 from being more than 9.
        let needed = (asked * (blocks + 1) as f64 - 1e-9).ceil() as usize;
        let is_reachable = needed <= blocks;
        SetLevel {
            asked,
            used: match is_reachable {
                true => asked,
                false => blocks as f64 / (blocks + 1) as f64,
            },
            blocks,
            needed: needed.min(blocks),
        }
    }

    /// Whether the landmarks are too few for the level asked for.
    #[must_use]
    pub fn is_lowered(&self) -> bool {
        self.used < self.asked
    }
}

/// Calibration of one study, filled while its landmarks are left out.
pub struct Calibration<'c> {
    questions: Questions<'c>,
    landmarks: &'c Landmarks,
    level: SetLevel,
    /// The landmark that stands for each block.
    stands: Vec<usize>,
    /// Whether the others contradict each landmark.
    contradicted: Vec<bool>,
    counts: Mutex<Both>,
}

/// Counts over all landmarks, and over those that are not contradicted.
struct Both {
    all: Counts,
    calm: Counts,
}

/// The landmark that stands for each block where blocks are counted, drawn by the seed: two sides of
/// one area are not two landmarks.
#[must_use]
pub fn stand_ins(landmarks: &Landmarks, seed: Seed) -> Vec<usize> {
    (0..landmarks.blocks())
        .map(|block| {
            let own: Vec<usize> = (0..landmarks.len())
                .filter(|&at| landmarks.list()[at].block == block)
                .collect();
            let mut chance = Stream::new(seed, Purpose::StandsForBlock, block as u64);
            own[chance.gen_range(0..own.len())]
        })
        .collect()
}

/// Counts over landmarks; sums of whole numbers, so that the order of additions does not matter.
struct Counts {
    /// Landmarks with a smaller score than a candidate `(open parcels, open parcels opposite)`.
    smaller: Pair<Array2<u32>>,
    /// Landmarks whose best wrong candidate takes at least the share of a parcel's best candidate.
    at_least: Pair<Vec<u32>>,
}

impl Counts {
    fn none(open: &Pair<usize>) -> Counts {
        Counts {
            smaller: Pair {
                a: Array2::zeros((open.a, open.b)),
                b: Array2::zeros((open.b, open.a)),
            },
            at_least: open.map(|n| vec![0; n]),
        }
    }

    /// Adds what one landmark says, seen from one species.
    fn add(&mut self, from: Side, smaller: &[Vec<bool>], at_least: &[bool]) {
        for (mut counted, row) in self.smaller[from].rows_mut().into_iter().zip(smaller) {
            for (count, is_smaller) in counted.iter_mut().zip(row) {
                *count += u32::from(*is_smaller);
            }
        }
        for (count, is_more) in self.at_least[from].iter_mut().zip(at_least) {
            *count += u32::from(*is_more);
        }
    }
}

impl<'c> Calibration<'c> {
    /// Nothing yet. `contradicted` tells of each landmark whether the others contradict it.
    pub fn new(
        landmarks: &'c Landmarks,
        questions: &Questions<'c>,
        contradicted: Vec<bool>,
        level: f64,
    ) -> Calibration<'c> {
        let open = questions.open.as_ref().map(Vec::len);
        Calibration {
            questions: *questions,
            landmarks,
            level: SetLevel::new(level, landmarks.blocks()),
            stands: stand_ins(landmarks, questions.seed),
            contradicted,
            counts: Mutex::new(Both {
                all: Counts::none(&open),
                calm: Counts::none(&open),
            }),
        }
    }

    /// Takes in the ranking without landmark `at`.
    pub fn look(&self, at: usize, compared: &Compared) {
        let landmark = &self.landmarks.list()[at];
        if self.stands[landmark.block] != at {
            return;
        }
        for from in Side::BOTH {
            let to = from.opposite();
            let seen = Seen::new(compared, from);
            let own = &landmark.parcels[to];
            let is_own: Vec<bool> = compared.candidates[to]
                .iter()
                .map(|p| own.contains(p))
                .collect();
            let row = place_of(
                &compared.candidates[from],
                self.questions.asked.of(at)[from],
            );
            let score = {
                let scores = seen.down_to(row, |_| true);
                (0..scores.len())
                    .filter(|&c| is_own[c])
                    .map(|c| scores[c])
                    .fold(f64::INFINITY, f64::min)
            };
            let lone = seen.first_share(row, |c| !is_own[c]);
            let open = &self.questions.open[from];
            let mut smaller = Vec::with_capacity(open.len());
            let mut at_least = Vec::with_capacity(open.len());
            for &parcel in open {
                let row = place_of(&compared.candidates[from], parcel);
                let scores = seen.down_to(row, |c| !is_own[c]);
                smaller.push(
                    (0..scores.len())
                        .filter(|&c| !is_own[c])
                        .map(|c| score < scores[c])
                        .collect::<Vec<bool>>(),
                );
                at_least.push(lone >= seen.first_share(row, |c| !is_own[c]));
            }
            let mut counts = self.counts.lock().expect("no one panics while counting");
            counts.all.add(from, &smaller, &at_least);
            if !self.contradicted[at] {
                counts.calm.add(from, &smaller, &at_least);
            }
        }
    }

    /// What was calibrated.
    pub fn finish(self) -> CandidateSets {
        let Both { all, calm } = self
            .counts
            .into_inner()
            .expect("no one panics while counting");
        let flagged = self.stands.iter().filter(|at| self.contradicted[**at]);
        let (flagged, blocks) = (flagged.count(), self.stands.len());
        CandidateSets {
            level: self.level,
            counts: all,
            calm: (flagged > 0 && flagged < blocks)
                .then(|| (SetLevel::new(self.level.asked, blocks - flagged), calm)),
        }
    }
}

/// Sets of candidates for every open parcel.
pub struct CandidateSets {
    /// Their level.
    pub level: SetLevel,
    counts: Counts,
    /// The same by the landmarks that are not contradicted, where some are.
    calm: Option<(SetLevel, Counts)>,
}

impl CandidateSets {
    /// Whether a candidate is in a parcel's set, both as places among the open parcels. The best
    /// candidate always is (`is_first`): that only adds to coverage.
    pub fn holds(&self, side: Side, parcel: usize, candidate: usize, is_first: bool) -> bool {
        is_first || (self.counts.smaller[side][(parcel, candidate)] as usize) < self.level.needed
    }

    /// The same by the landmarks that the others do not contradict; `None` where none is contradicted.
    pub fn holds_calmly(
        &self,
        side: Side,
        parcel: usize,
        candidate: usize,
        is_first: bool,
    ) -> Option<bool> {
        let (level, counts) = self.calm.as_ref()?;
        let smaller = counts.smaller[side][(parcel, candidate)] as usize;
        Some(is_first || smaller < level.needed)
    }

    /// How rarely left-out landmarks whose counterpart is taken away have a best candidate that takes
    /// such a share: a p-value for "this parcel has no counterpart among the candidates".
    pub fn p_of_none(&self, side: Side, parcel: usize) -> f64 {
        let blocks = self.level.blocks as f64;
        (1.0 + f64::from(self.counts.at_least[side][parcel])) / (1.0 + blocks)
    }
}

fn place_of(parcels: &[usize], parcel: usize) -> usize {
    parcels
        .binary_search(&parcel)
        .expect("the parcel is compared")
}

/// Ranking scores and shares of mass, rows being the parcels that ask.
pub struct Seen<'s> {
    scores: ArrayView2<'s, f64>,
    mass: Option<ArrayView2<'s, f64>>,
}

impl<'s> Seen<'s> {
    /// What is seen from one species.
    pub fn new(compared: &'s Compared, from: Side) -> Seen<'s> {
        let turned = |all: &'s Array2<f64>| match from {
            Side::A => all.view(),
            Side::B => all.t(),
        };
        let carries = compared
            .kinds
            .iter()
            .find(|(kind, _)| *kind == Kind::Transport);
        Seen {
            scores: turned(&compared.score),
            mass: carries.map(|(_, all)| turned(all)),
        }
    }

    /// For each candidate the share of a row's mass on those that count down to itself, and in a small
    /// part the bare number of better ones.
    fn down_to(&self, row: usize, counts: impl Fn(usize) -> bool) -> Vec<f64> {
        let shares = self.shares(row, &counts);
        let each = BY_RANK / (0..shares.len()).filter(|&c| counts(c)).count().max(1) as f64;
        let mut above = 0.0;
        let mut down_to = vec![0.0; shares.len()];
        for candidate in place::order(self.scores.row(row)) {
            above += (1.0 - BY_RANK) * shares[candidate];
            down_to[candidate] = above;
            if counts(candidate) {
                above += each;
            }
        }
        // What may not be a counterpart is in no set.
        for (down_to, score) in down_to.iter_mut().zip(self.scores.row(row)) {
            if *score == f64::INFINITY {
                *down_to = f64::INFINITY;
            }
        }
        down_to
    }

    /// Share of a row's mass on the best candidate that counts; 0 where there is none.
    pub fn first_share(&self, row: usize, counts: impl Fn(usize) -> bool) -> f64 {
        let scores = self.scores.row(row);
        let first = (0..scores.len())
            .filter(|&c| counts(c) && scores[c] < f64::INFINITY)
            .min_by(|&i, &j| scores[i].total_cmp(&scores[j]).then(i.cmp(&j)));
        first.map_or(0.0, |first| self.shares(row, &counts)[first])
    }

    /// Shares of a row's mass over the admissible candidates that count: those that transport carries,
    /// or else falling exponentially with unlikeness.
    #[must_use]
    pub fn shares(&self, row: usize, counts: impl Fn(usize) -> bool) -> Vec<f64> {
        let scores = self.scores.row(row);
        let takes = |c: usize| counts(c) && scores[c] < f64::INFINITY;
        let mut shares: Vec<f64> = match &self.mass {
            // Transport is as unlike as its mean share is small (see the kind's own file); what its
            // cost adds to that may leave a little below nothing.
            Some(mass) => mass.row(row).iter().map(|d| (-d).max(0.0)).collect(),
            None => falling(scores, &takes),
        };
        for (c, share) in shares.iter_mut().enumerate() {
            if !takes(c) {
                *share = 0.0;
            }
        }
        let sum: f64 = shares.iter().sum();
        let count = (0..shares.len()).filter(|&c| takes(c)).count() as f64;
        for (c, share) in shares.iter_mut().enumerate() {
            if sum > 0.0 {
                *share /= sum;
            } else if takes(c) {
                *share = 1.0 / count;
            }
        }
        shares
    }
}

fn falling(scores: ArrayView1<'_, f64>, takes: &impl Fn(usize) -> bool) -> Vec<f64> {
    let admitted: Vec<f64> = (0..scores.len())
        .filter(|&c| takes(c))
        .map(|c| scores[c])
        .collect();
    let least = admitted.iter().copied().fold(f64::INFINITY, f64::min);
    let middle = median(admitted).unwrap_or(least);
    let unit = (middle - least) / FALL;
    scores
        .iter()
        .map(|score| match unit > 0.0 {
            true => (-(score - least) / unit).exp(),
            false => f64::from(u8::from(*score <= least)),
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use ndarray::array;

    #[test]
    fn levels_are_what_the_landmarks_allow() {
        // With nine blocks the ninth of nine scores bounds a 90 % set; with eight none does.
        let (nine, eight) = (SetLevel::new(0.9, 9), SetLevel::new(0.9, 8));
        assert_eq!((nine.needed, nine.is_lowered()), (9, false));
        assert_eq!((eight.needed, eight.is_lowered()), (8, true));
        assert!((eight.used - 8.0 / 9.0).abs() < 1e-12);
        assert_eq!(SetLevel::new(0.8, 12).needed, 11);
    }

    #[test]
    fn scores_are_the_mass_down_to_a_candidate() {
        let compared = Compared {
            candidates: Pair {
                a: vec![0, 1],
                b: vec![0, 1, 2],
            },
            kinds: vec![(
                Kind::Transport,
                array![[-0.5, -0.3, -0.2], [0.01, -0.1, -0.4]],
            )],
            score: array![[0.0, 0.5, 0.2], [0.1, f64::INFINITY, 0.0]],
        };
        let seen = Seen::new(&compared, Side::A);
        let close = |found: &[f64], expected: &[f64]| {
            for (x, y) in found.iter().zip(expected) {
                assert!(x == y || (x - y).abs() < 1e-12, "{found:?}");
            }
        };
        // Order 0, 2, 1 with shares .5, .2, .3.
        let scored = |mass: f64, rank: f64| (1.0 - BY_RANK) * mass + BY_RANK * rank;
        close(
            &seen.down_to(0, |_| true),
            &[
                scored(0.5, 0.0),
                scored(1.0, 2.0 / 3.0),
                scored(0.7, 1.0 / 3.0),
            ],
        );
        // The first taken away: shares .4 of 2 and .6 of 1.
        close(
            &seen.down_to(0, |c| c != 0)[1..],
            &[scored(1.0, 0.5), scored(0.4, 0.0)],
        );
        assert!((seen.first_share(0, |c| c != 0) - 0.4).abs() < 1e-12);
        // An inadmissible candidate takes nothing and is in no set.
        close(
            &seen.down_to(1, |_| true),
            &[scored(1.0, 1.0 / 3.0), f64::INFINITY, scored(1.0, 0.0)],
        );
        let from_b = Seen::new(&compared, Side::B);
        close(
            &from_b.down_to(0, |_| true),
            &[scored(1.0, 0.0), scored(1.0, 0.5)],
        );
    }
}
