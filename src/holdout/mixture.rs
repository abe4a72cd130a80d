//! Kinds of evidence weighed by left-out landmarks and mixed.

use ndarray::Array2;
use rayon::prelude::*;
use serde::Serialize;

use super::out_of_bag::OutOfBag;
use super::trials::{Placed, Questions};
use super::without::{Compared, Ranked};
use crate::domain::{Pair, Side};
use crate::evidence::{Fitted, Kind, Material};
use crate::place;

/// How fast weight falls with left-out error, with very many landmarks.
const SHARPNESS: f64 = 12.0;
/// Number of blocks with which the fall is half as fast: few landmarks judge roughly, so weights are
/// shrunk towards the odds that the kinds have without them.
const HALF_SHARP: f64 = 6.0;

/// One kind in a mixture.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct Member {
    /// The kind.
    pub kind: Kind,
    /// Its weight; those of all kinds sum to 1.
    pub weight: f64,
    /// Its left-out error: mean over blocks, 0 where every counterpart comes first.
    pub error: f64,
    /// Index of its way of ranking.
    #[serde(skip)]
    pub way: usize,
}

/// Weights of kinds from the errors of each block under each kind:
///
/// ```text
/// weight = odds exp(-s (error - least error)) / sum,   s = 12 B / (B + 6),   B blocks
/// ```
#[must_use]
pub fn weigh(kinds: &[Kind], errors: &[Vec<f64>]) -> Vec<f64> {
    let means: Vec<f64> = errors
        .iter()
        .map(|errors| errors.iter().sum::<f64>() / errors.len().max(1) as f64)
        .collect();
    let least = means.iter().copied().fold(f64::INFINITY, f64::min);
    let blocks = errors.first().map_or(0, Vec::len) as f64;
    let sharpness = SHARPNESS * blocks / (blocks + HALF_SHARP);
    let raw: Vec<f64> = kinds
        .iter()
        .zip(&means)
        .map(|(kind, error)| kind.prior_odds() * (-sharpness * (error - least)).exp())
        .collect();
    let sum: f64 = raw.iter().sum();
    raw.into_iter().map(|x| x / sum).collect()
}

/// Mixes scores: for each kind the mean, over both directions, of the logarithm of a candidate's rank
/// as a share of the logarithm of their number. A kind can so rule out no candidate, and first
/// against second counts as much as tenth against twentieth.
pub struct Blend {
    /// Weighted sum of the kinds' log ranks; less is more alike.
    pub score: Array2<f64>,
}

impl Blend {
    /// Nothing yet, `(candidates of a, candidates of b)`.
    #[must_use]
    pub fn new(shape: (usize, usize)) -> Blend {
        Blend {
            score: Array2::zeros(shape),
        }
    }

    /// Adds a kind.
    pub fn add(&mut self, weight: f64, dissimilarities: &Array2<f64>) {
        self.score
            .scaled_add(weight, &place::log_ranks(dissimilarities));
    }
}

/// Where a left-out landmark's first candidate was, seen from one species.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct FirstOf {
    /// The share of mass that transport without the landmark sends there, where there is transport.
    pub share: Option<f64>,
    /// Where the counterpart came; the first candidate was right where that is rank 1.
    pub placed: Placed,
    /// How many parcels would have been right.
    pub members: usize,
}

/// A landmark left out of a mixture.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LeftOutOfMixture {
    /// Where its counterpart came.
    pub placed: Pair<Placed>,
    /// What came first.
    pub first: Pair<FirstOf>,
}

/// Every landmark left out of a mixture (see [`Ranked::without`]). `also` looks at each ranking without
/// a landmark before it is dropped.
///
/// # Panics
/// If a way cannot be fitted though the trials could.
#[must_use]
pub fn leave_out(
    ranked: &Ranked<'_>,
    also: &(dyn Fn(usize, &Compared) + Sync),
) -> Vec<LeftOutOfMixture> {
    let landmarks = ranked.material.landmarks;
    (0..landmarks.len())
        .into_par_iter()
        .map(|at| {
            let landmark = &landmarks.list()[at];
            let without = ranked.without(at);
            also(at, &without);
            let found = Pair::from_fn(|from: Side| {
                let to = from.opposite();
                let asked = ranked.questions.asked.of(at)[from];
                let row = without.row(from, asked);
                let first = (0..row.len())
                    .min_by(|&i, &j| row[i].total_cmp(&row[j]).then(i.cmp(&j)))
                    .map(|first| without.candidates[to][first])
                    .expect("the landmark itself has a parcel");
                let placed = without.placed(from, asked, &landmark.parcels[to]);
                let share = ranked
                    .bagged
                    .filter(|bagged| bagged.shares.is_some())
                    .map(|bagged| bagged.asked[at][from][first]);
                (
                    placed,
                    FirstOf {
                        share,
                        placed,
                        members: landmark.parcels[to].len(),
                    },
                )
            });
            LeftOutOfMixture {
                placed: found.map(|(placed, _)| placed),
                first: found.map(|(_, first)| first),
            }
        })
        .collect()
}

/// Where counterparts come when landmarks are left out of costly evidence.
#[must_use]
pub fn placed_out_of_bag(
    material: &Material<'_>,
    bagged: &OutOfBag,
    questions: &Questions<'_>,
) -> Vec<Pair<Placed>> {
    struct Mean<'o>(&'o Array2<f64>);
    impl Fitted for Mean<'_> {
        fn dissimilarities(&self, a: &[usize], b: &[usize], out: &mut Array2<f64>) {
            for (row, &i) in a.iter().enumerate() {
                for (column, &j) in b.iter().enumerate() {
                    out[(row, column)] = self.0[(i, j)];
                }
            }
        }
    }
    material
        .landmarks
        .list()
        .iter()
        .enumerate()
        .map(|(at, landmark)| {
            let mean = Mean(&bagged.without[landmark.block]);
            super::trials::place_one(&mean, landmark, at, questions)
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_kind_that_errs_more_weighs_less_and_few_landmarks_change_little() {
        let kinds = [Kind::Canonical, Kind::Fingerprint, Kind::Transport];
        let with = |blocks: usize| {
            let errors = [0.8, 0.2, 0.2].map(|error| vec![error; blocks]);
            weigh(&kinds, &errors)
        };
        let (few, many) = (with(6), with(60));
        for weights in [&few, &many] {
            assert!((weights.iter().sum::<f64>() - 1.0).abs() < 1e-12);
            assert!(weights[0] < weights[1] && weights[1] < weights[2]);
        }
        assert!(many[0] < few[0]);
        // Odds times exp(-12 * 6 / 12 * 0.6) = exp(-3.6), over 1 + 8 + that.
        let expected = (-3.6_f64).exp() / (9.0 + (-3.6_f64).exp());
        assert!((few[0] - expected).abs() < 1e-12);
    }
}
