//! The ranking repeated without a landmark: every choice that looks at landmarks made again.

use ndarray::Array2;

use super::choose::choose;
use super::mixture::{weigh, Blend, Member};
use super::out_of_bag::OutOfBag;
use super::trials::{Placed, Questions, Trials, Way};
use crate::align::Alignment;
use crate::bootstrap::{Purpose, Stream};
use crate::domain::{Pair, Side};
use crate::evidence::{Evidence, Kind, Material};

/// What ranks, and the figures by which it was chosen and weighed.
#[derive(Clone, Copy)]
pub struct Ranked<'r> {
    /// Both species and the landmarks.
    pub material: &'r Material<'r>,
    /// Every way of ranking that was judged.
    pub ways: &'r [Way],
    /// What left-out landmarks say about them.
    pub trials: &'r Trials,
    /// The kinds that rank, with their weights and ways.
    pub members: &'r [Member],
    /// The alignment that was asked for by name, if one was.
    pub alignment: Option<Alignment>,
    /// Whether ranks are blended; else the only kind ranks by its own dissimilarities.
    pub blends: bool,
    /// Replicates of costly kinds.
    pub bagged: Option<&'r OutOfBag>,
    /// What may be asked and answered.
    pub questions: Questions<'r>,
}

/// How unlike some parcels of both species are.
#[derive(Debug, Clone)]
pub struct Compared {
    /// Parcels that are compared, in ascending order.
    pub candidates: Pair<Vec<usize>>,
    /// Each kind on its own `(candidates of a, candidates of b)`; inadmissible pairs are infinite.
    pub kinds: Vec<(Kind, Array2<f64>)>,
    /// All kinds together, which ranks.
    pub score: Array2<f64>,
}

/// Landmark weights and everything else that is particular to one fit.
struct Fit<'f> {
    weights: Vec<f64>,
    chance: (Purpose, u64),
    way_of: &'f dyn Fn(&Member) -> usize,
    member_weights: Vec<f64>,
    costly: Option<&'f Array2<f64>>,
}

impl Ranked<'_> {
    /// Ranks open parcels and the parcels of landmark `at` without its block. Weights of kinds come
    /// from the errors of the other blocks, joint spaces have the axes that the other blocks favour; a
    /// kind that has nothing to say without the landmark takes no part.
    ///
    /// # Panics
    /// If costly kinds rank without replicates.
    #[must_use]
    pub fn without(&self, at: usize) -> Compared {
        let landmarks = self.material.landmarks;
        let landmark = &landmarks.list()[at];
        let block = landmark.block;
        let joint = choose(self.ways, self.trials, self.alignment, Some(block));
        let way_of = |member: &Member| match member.kind {
            Kind::Procrustes => joint.ways[Alignment::Procrustes],
            Kind::Canonical => joint.ways[Alignment::Canonical],
            _ => member.way,
        };
        let kinds: Vec<Kind> = self.members.iter().map(|member| member.kind).collect();
        let errors: Vec<Vec<f64>> = self
            .members
            .iter()
            .map(|member| self.trials.errors(way_of(member), Some(block)))
            .collect();
        let candidates = Pair::from_fn(|side| {
            let mut all = [&self.questions.open[side][..], &landmark.parcels[side][..]].concat();
            all.sort_unstable();
            all
        });
        let fit = Fit {
            weights: self
                .material
                .weights(|b| if b == block { 0.0 } else { 1.0 }),
            chance: (
                Purpose::EvidenceLeftOut,
                (block * landmarks.blocks() + block) as u64,
            ),
            way_of: &way_of,
            member_weights: weigh(&kinds, &errors),
            costly: self.bagged.map(|bagged| &bagged.without[block]),
        };
        self.compare(candidates, &fit)
    }

    /// Ranks any parcels, given in ascending order, with all landmarks.
    ///
    /// # Panics
    /// If costly kinds rank without replicates.
    #[must_use]
    pub fn full(&self, candidates: Pair<Vec<usize>>) -> Compared {
        let fit = Fit {
            weights: self.material.weights(|_| 1.0),
            // The full sample takes the last index, as everywhere.
            chance: (Purpose::Evidence, u64::MAX),
            way_of: &|member| member.way,
            member_weights: self.members.iter().map(|member| member.weight).collect(),
            costly: self.bagged.map(|bagged| &bagged.mean),
        };
        self.compare(candidates, &fit)
    }

    /// Ranks any parcels by one kind alone with all landmarks; a kind that has nothing to say finds all
    /// alike.
    #[must_use]
    pub fn alone(&self, candidates: Pair<Vec<usize>>, evidence: &dyn Evidence) -> Compared {
        let Questions {
            candidates: admissible,
            seed,
            ..
        } = self.questions;
        let mut score = Array2::zeros((candidates.a.len(), candidates.b.len()));
        let mut chance = Stream::new(seed, Purpose::Evidence, u64::MAX);
        let weights = self.material.weights(|_| 1.0);
        if let Ok(fitted) = evidence.fit(self.material, &weights, &mut chance) {
            fitted.dissimilarities(&candidates.a, &candidates.b, &mut score);
        }
        admissible.close(&candidates.a, &candidates.b, &mut score);
        Compared {
            candidates,
            kinds: Vec::new(),
            score,
        }
    }

    fn compare(&self, candidates: Pair<Vec<usize>>, fit: &Fit<'_>) -> Compared {
        let Questions {
            candidates: admissible,
            seed,
            ..
        } = self.questions;
        let shape = (candidates.a.len(), candidates.b.len());
        let mut kinds = Vec::new();
        let mut blend = Blend::new(shape);
        for (member, weight) in self.members.iter().zip(&fit.member_weights) {
            let mut scores = Array2::zeros(shape);
            match self.ways[(fit.way_of)(member)].evidence() {
                Some(evidence) => {
                    let (purpose, index) = fit.chance;
                    let mut chance = Stream::new(seed, purpose, index);
                    let fitted = evidence.fit(self.material, &fit.weights, &mut chance);
                    let Ok(fitted) = fitted else { continue };
                    fitted.dissimilarities(&candidates.a, &candidates.b, &mut scores);
                }
                None => {
                    let all = fit.costly.expect("costly kinds have replicates");
                    scores.indexed_iter_mut().for_each(|((i, j), score)| {
                        *score = all[(candidates.a[i], candidates.b[j])];
                    });
                }
            }
            admissible.close(&candidates.a, &candidates.b, &mut scores);
            if self.blends {
                blend.add(*weight, &scores);
            }
            kinds.push((member.kind, scores));
        }
        let mut score = match (self.blends, &kinds[..]) {
            (false, [(_, only)]) => only.clone(),
            _ => blend.score,
        };
        admissible.close(&candidates.a, &candidates.b, &mut score);
        Compared {
            candidates,
            kinds,
            score,
        }
    }
}

impl Compared {
    /// The scores of one parcel with all candidates of the other species; `parcel` must be among those
    /// compared.
    ///
    /// # Panics
    /// If it is not.
    #[must_use]
    pub fn row(&self, from: Side, parcel: usize) -> Vec<f64> {
        let at = self.candidates[from]
            .binary_search(&parcel)
            .expect("the parcel is compared");
        match from {
            Side::A => self.score.row(at).to_vec(),
            Side::B => self.score.column(at).to_vec(),
        }
    }

    /// Where the best of `members` comes, seen from `parcel` of species `from`.
    ///
    /// # Panics
    /// If one of them is not compared.
    #[must_use]
    pub fn placed(&self, from: Side, parcel: usize, members: &[usize]) -> Placed {
        Placed::of(
            &self.row(from, parcel),
            &self.candidates[from.opposite()],
            members,
        )
    }
}
