//! Every way of ranking, fitted without each block of landmarks and without each pair of blocks.

use ndarray::Array2;
use rand::Rng;
use rayon::prelude::*;

use crate::align::{Alignment, Params};
use crate::bootstrap::{Purpose, Stream};
use crate::domain::{Landmark, Landmarks, Pair, Seed, Side};
use crate::evidence::{Evidence, Fingerprint, Fitted, Grown, JointDistance, Kind, Material};
use crate::place::{self, Candidates};
use crate::watch::{Interrupted, Watch};

/// One way of ranking that left-out landmarks are to judge.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Way {
    /// Distance in a joint space.
    Joint(Params),
    /// Connections with the landmarks.
    Fingerprint,
    /// Distance in a joint space with anchors grown.
    Grown(Grown),
    /// Transport averaged over replicates, which judge it themselves.
    Transport,
}

impl Way {
    /// The kind of evidence.
    #[must_use]
    pub fn kind(&self) -> Kind {
        match self {
            Way::Joint(params) => match params.alignment {
                Alignment::Procrustes => Kind::Procrustes,
                Alignment::Canonical => Kind::Canonical,
            },
            Way::Fingerprint => Kind::Fingerprint,
            Way::Grown(_) => Kind::Grown,
            Way::Transport => Kind::Transport,
        }
    }

    /// The joint space whose distances rank, if any do.
    #[must_use]
    pub fn joint(&self) -> Option<Params> {
        match self {
            Way::Joint(params) => Some(*params),
            _ => None,
        }
    }

    /// The evidence itself; `None` where fitting it again without every landmark is too dear.
    #[must_use]
    pub fn evidence(&self) -> Option<Box<dyn Evidence>> {
        match self {
            Way::Joint(params) => Some(Box::new(JointDistance(*params))),
            Way::Fingerprint => Some(Box::new(Fingerprint)),
            Way::Grown(grown) => Some(Box::new(*grown)),
            Way::Transport => None,
        }
    }

    /// Whether it is fitted without each pair of blocks too. Only the joint spaces need that: among
    /// them a choice is made.
    fn is_nested(&self) -> bool {
        matches!(self, Way::Joint(_))
    }
}

/// Distance in a joint space, in either alignment on each of these numbers of axes in each embedding.
#[must_use]
pub fn joint_ways(axes: &[usize], ridge: f64, embeddings: usize) -> Vec<Way> {
    let mut ways = Vec::with_capacity(2 * axes.len() * embeddings);
    for embedding in 0..embeddings {
        for alignment in Alignment::BOTH {
            ways.extend(axes.iter().map(|&axes| {
                Way::Joint(Params {
                    alignment,
                    axes,
                    ridge,
                    embedding,
                })
            }));
        }
    }
    ways
}

/// The member of each landmark that is asked for when the landmark is left out, drawn by the seed. A
/// landmark of several parcels is asked by one of them, since a centroid is less noisy than the
/// single parcels that users ask about.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Asked(Vec<Pair<usize>>);

impl Asked {
    /// Draws the members, such that those of one landmark may be counterparts.
    ///
    /// # Panics
    /// If a landmark has no such members, which a checked study rules out.
    #[must_use]
    pub fn draw(landmarks: &Landmarks, candidates: &Candidates, seed: Seed) -> Asked {
        Asked(
            landmarks
                .list()
                .iter()
                .enumerate()
                .map(|(at, landmark)| {
                    let mut chance = Stream::new(seed, Purpose::AskedMember, at as u64);
                    let Pair { a, b } = &landmark.parcels;
                    let mut one_of = |members: &[usize], admissible: &dyn Fn(usize) -> bool| {
                        let members: Vec<usize> =
                            members.iter().copied().filter(|&m| admissible(m)).collect();
                        members[chance.gen_range(0..members.len())]
                    };
                    let a = one_of(a, &|a| b.iter().any(|&b| candidates.admit(Side::A, a, b)));
                    let b = one_of(b, &|b| candidates.admit(Side::A, a, b));
                    Pair { a, b }
                })
                .collect(),
        )
    }

    /// The member of a landmark that is asked, on each side.
    #[must_use]
    pub fn of(&self, landmark: usize) -> Pair<usize> {
        self.0[landmark]
    }
}

/// What left-out landmarks are asked, and what may be answered.
#[derive(Debug, Clone, Copy)]
pub struct Questions<'q> {
    /// Parcels that are no landmark.
    pub open: &'q Pair<Vec<usize>>,
    /// Which parcels may be counterparts.
    pub candidates: &'q Candidates,
    /// The member of each landmark that is asked for.
    pub asked: &'q Asked,
    /// Seed of every draw.
    pub seed: Seed,
}

/// Where the counterpart of a left-out landmark comes, seen from one species.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Placed {
    /// Rank of the best member opposite, 1 being right.
    pub rank: usize,
    /// Candidates: the other species' open parcels and the landmark's own, as far as admissible.
    pub candidates: usize,
}

impl Placed {
    /// Error of the rank on a logarithmic scale: 0 for the first of all, 1 for the last. The log
    /// makes first against fifth count as much as tenth against fiftieth.
    #[must_use]
    pub fn error(self) -> f64 {
        if self.candidates < 2 {
            return 0.0;
        }
        (self.rank as f64).ln() / (self.candidates as f64).ln()
    }

    /// Error to expect of ranks that are pure chance, where any of `members` counterparts would be
    /// right: the mean of ln r over the rank r of the best of them, over ln c for c candidates.
    #[must_use]
    pub fn error_by_chance(self, members: usize) -> f64 {
        let candidates = self.candidates;
        if candidates < 2 {
            return 0.0;
        }
        let members = members.clamp(1, candidates);
        // Chance that no member has come among the ranks before this one.
        let mut none_yet = 1.0;
        let mut mean = 0.0;
        for rank in 1..=candidates - members + 1 {
            let here = members as f64 / (candidates - rank + 1) as f64;
            mean += none_yet * here * (rank as f64).ln();
            none_yet *= 1.0 - here;
        }
        mean / (candidates as f64).ln()
    }

    /// Where the best of `members` comes among candidates; `dissimilarities` has one number for each,
    /// infinite where a parcel may not be a counterpart.
    ///
    /// # Panics
    /// If no member is among the candidates.
    #[must_use]
    pub fn of(dissimilarities: &[f64], candidates: &[usize], members: &[usize]) -> Placed {
        Placed {
            rank: candidates
                .iter()
                .enumerate()
                .filter(|(_, candidate)| members.contains(candidate))
                .map(|(at, _)| place::rank(dissimilarities, at))
                .min()
                .expect("a landmark has at least one parcel on each side"),
            candidates: dissimilarities.iter().filter(|d| d.is_finite()).count(),
        }
    }

    /// Share of the candidates that are no better placed than the counterpart, in (0, 1].
    #[must_use]
    pub fn percentile(self) -> f64 {
        1.0 - (self.rank as f64 - 1.0) / self.candidates as f64
    }
}

/// The landmarks left out in one fit, and where their counterparts came.
type Found = Vec<(usize, Pair<Placed>)>;

/// Error of a landmark: the mean of both directions.
fn error(placed: Pair<Placed>) -> f64 {
    (placed.a.error() + placed.b.error()) / 2.0
}

/// What left-out landmarks say about every way of ranking.
#[derive(Debug, Clone)]
pub struct Trials {
    /// `[way][landmark]`, its block left out.
    pub single: Vec<Vec<Pair<Placed>>>,
    /// `[way][outer block][landmark]`: with two blocks left out, the landmark's and the outer one. The
    /// landmark's own block holds what `single` says.
    pub nested: Vec<Vec<Vec<Pair<Placed>>>>,
    /// Block of each landmark.
    pub blocks: Vec<usize>,
}

impl Trials {
    /// Adds a way that was judged elsewhere, and returns its index. What is said of a landmark then
    /// holds whatever else is left out.
    pub fn add(&mut self, placed: Vec<Pair<Placed>>) -> usize {
        let blocks = self.blocks.iter().max().map_or(0, |b| b + 1);
        self.nested.push(vec![placed.clone(); blocks]);
        self.single.push(placed);
        self.single.len() - 1
    }

    /// Mean error of each block under a way of ranking, `without` one block altogether where asked.
    #[must_use]
    pub fn errors(&self, way: usize, without: Option<usize>) -> Vec<f64> {
        let blocks = self.blocks.iter().max().map_or(0, |b| b + 1);
        let mut sums = vec![(0.0, 0.0); blocks];
        for (landmark, &block) in self.blocks.iter().enumerate() {
            let error = match without {
                None => error(self.single[way][landmark]),
                Some(outer) => error(self.nested[way][outer][landmark]),
            };
            sums[block].0 += error;
            sums[block].1 += 1.0;
        }
        sums.iter()
            .enumerate()
            .filter(|(block, _)| without != Some(*block))
            .map(|(_, (sum, count))| sum / count)
            .collect()
    }
}

/// Fits every way without every block and without every pair of blocks, so that a choice can be
/// repeated without the landmark it is judged by.
///
/// # Errors
/// [`Interrupted`] where the watch says so.
///
pub fn run(
    material: &Material<'_>,
    ways: &[Way],
    questions: &Questions<'_>,
    watch: &dyn Watch,
) -> Result<Trials, Interrupted> {
    let landmarks = material.landmarks;
    let blocks = landmarks.blocks();
    let needs_nesting = blocks > 3;
    let pairs: Vec<(usize, usize)> = (0..blocks)
        .flat_map(|i| (i..blocks).map(move |j| (i, j)))
        .filter(|(i, j)| i == j || needs_nesting)
        .collect();
    watch.begin("left-out landmarks", pairs.len());
    let placed: Vec<Vec<Found>> = pairs
        .par_iter()
        .map(|&(i, j)| {
            let found = if watch.interrupted() {
                Vec::new()
            } else {
                let weights = material.weights(|b| if b == i || b == j { 0.0 } else { 1.0 });
                ways.iter()
                    .map(|way| {
                        let evidence = way.evidence();
                        let Some(evidence) = evidence.filter(|_| i == j || way.is_nested()) else {
                            return Found::new();
                        };
                        let index = (i * blocks + j) as u64;
                        let mut chance =
                            Stream::new(questions.seed, Purpose::EvidenceLeftOut, index);
                        let fitted = evidence.fit(material, &weights, &mut chance);
                        landmarks
                            .list()
                            .iter()
                            .enumerate()
                            .filter(|(_, l)| l.block == i || l.block == j)
                            .map(|(at, l)| match &fitted {
                                Ok(fitted) => (at, place_one(&**fitted, l, at, questions)),
                                // Without the landmark there is nothing to go by.
                                Err(_) => (at, last_of_all(l, at, questions)),
                            })
                            .collect()
                    })
                    .collect()
            };
            watch.advance(1);
            found
        })
        .collect();
    watch.end();
    if watch.interrupted() {
        return Err(Interrupted);
    }

    let nobody = Pair::from_fn(|_| Placed {
        rank: 1,
        candidates: 1,
    });
    let mut single = vec![vec![nobody; landmarks.len()]; ways.len()];
    let mut nested = vec![vec![vec![nobody; landmarks.len()]; blocks]; ways.len()];
    for (&(i, j), by_way) in pairs.iter().zip(&placed) {
        for (way, found) in by_way.iter().enumerate() {
            for &(landmark, placed) in found {
                if i == j {
                    single[way][landmark] = placed;
                }
                let own = landmarks.list()[landmark].block;
                let outer = if own == i { j } else { i };
                nested[way][outer][landmark] = placed;
            }
        }
    }
    // With three blocks no second one can be spared, so the choice is judged as it was made.
    for ((way, by_outer), single) in ways.iter().zip(&mut nested).zip(&single) {
        if !needs_nesting || !way.is_nested() {
            by_outer.fill(single.clone());
        }
    }
    Ok(Trials {
        single,
        nested,
        blocks: landmarks.list().iter().map(|l| l.block).collect(),
    })
}

/// Rank of a left-out landmark's counterpart, both ways; `at` is its place in the list.
pub fn place_one(
    fitted: &dyn Fitted,
    landmark: &Landmark,
    at: usize,
    questions: &Questions<'_>,
) -> Pair<Placed> {
    let (asked, open, admissible) = (questions.asked.of(at), questions.open, questions.candidates);
    Pair::from_fn(|from| {
        let to = from.opposite();
        let mut candidates = [&open[to][..], &landmark.parcels[to][..]].concat();
        candidates.retain(|&candidate| admissible.admit(from, asked[from], candidate));
        candidates.sort_unstable();
        let question = [asked[from]];
        let dissimilarities: Vec<f64> = match from {
            Side::A => {
                let mut out = Array2::zeros((1, candidates.len()));
                fitted.dissimilarities(&question, &candidates, &mut out);
                out.into_iter().collect()
            }
            Side::B => {
                let mut out = Array2::zeros((candidates.len(), 1));
                fitted.dissimilarities(&candidates, &question, &mut out);
                out.into_iter().collect()
            }
        };
        Placed::of(&dissimilarities, &candidates, &landmark.parcels[to])
    })
}

/// Every landmark placed by one kind that is cheap to fit, without its block.
#[must_use]
pub fn place_each(
    material: &Material<'_>,
    evidence: &dyn Evidence,
    questions: &Questions<'_>,
) -> Vec<Pair<Placed>> {
    let landmarks = material.landmarks;
    let blocks = landmarks.blocks();
    let mut placed = vec![None; landmarks.len()];
    for block in 0..blocks {
        let weights = material.weights(|b| if b == block { 0.0 } else { 1.0 });
        let index = (block * blocks + block) as u64;
        let mut chance = Stream::new(questions.seed, Purpose::EvidenceLeftOut, index);
        let fitted = evidence.fit(material, &weights, &mut chance);
        for (at, landmark) in landmarks.list().iter().enumerate() {
            if landmark.block == block {
                placed[at] = Some(match &fitted {
                    Ok(fitted) => place_one(&**fitted, landmark, at, questions),
                    Err(_) => last_of_all(landmark, at, questions),
                });
            }
        }
    }
    let all: Option<Vec<Pair<Placed>>> = placed.into_iter().collect();
    all.expect("every landmark has a block")
}

/// The worst rank that a landmark's counterpart can have.
fn last_of_all(landmark: &Landmark, at: usize, questions: &Questions<'_>) -> Pair<Placed> {
    let (asked, open, admissible) = (questions.asked.of(at), questions.open, questions.candidates);
    Pair::from_fn(|from| {
        let to = from.opposite();
        let admitted = |parcels: &[usize]| {
            parcels
                .iter()
                .filter(|&&candidate| admissible.admit(from, asked[from], candidate))
                .count()
        };
        let (others, own) = (admitted(&open[to]), admitted(&landmark.parcels[to]));
        Placed {
            rank: others + 1,
            candidates: others + own,
        }
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn random_ranks_err_as_much_as_they_do_on_average() {
        let placed = |candidates| Placed {
            rank: 1,
            candidates,
        };
        // One member: ln(c!) / (c ln c), the mean of ln r over equally likely ranks.
        let log_factorial: f64 = (1..=24).map(|r| f64::from(r).ln()).sum();
        let expected = log_factorial / (24.0 * 24.0_f64.ln());
        assert!((placed(24).error_by_chance(1) - expected).abs() < 1e-12);
        // Two members among four: the better one is first, second, third in 3, 2, 1 of 6 pairs.
        let expected = (2.0 * 2.0_f64.ln() + 3.0_f64.ln()) / (6.0 * 4.0_f64.ln());
        assert!((placed(4).error_by_chance(2) - expected).abs() < 1e-12);
        assert_eq!(placed(3).error_by_chance(3), 0.0);
        assert_eq!(placed(1).error_by_chance(1), 0.0);
    }
}
