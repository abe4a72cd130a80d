//! What ranks, with all landmarks and without each, ready for questions about pairs.

use ndarray::{Array2, ArrayView1};

use crate::bootstrap::{Purpose, Stream};
use crate::domain::{Landmarks, Pair, Side};
use crate::evidence::{Evidence, Kind, Material};
use crate::holdout::{Asked, Compared, Placed, Questions};
use crate::locate::Seen;
use crate::place;

/// A ranking of the open parcels, and the same without each block of landmarks.
#[derive(Debug, Clone)]
pub struct View {
    /// Open parcels, all landmarks told.
    pub full: Compared,
    /// For each block the landmark that stands for it, and open and own parcels without it.
    pub without: Vec<(usize, Compared)>,
}

impl View {
    /// By one kind of evidence that is cheap to fit; `None` where it has nothing to say. `stands` has the
    /// landmark that stands for each block.
    #[must_use]
    pub fn of(
        material: &Material<'_>,
        evidence: &dyn Evidence,
        kind: Kind,
        questions: &Questions<'_>,
        stands: &[usize],
    ) -> Option<View> {
        let compare = |candidates: Pair<Vec<usize>>, weights: &[f64]| {
            let mut chance = Stream::new(questions.seed, Purpose::Evidence, u64::MAX);
            let fitted = evidence.fit(material, weights, &mut chance).ok()?;
            let mut score = Array2::zeros((candidates.a.len(), candidates.b.len()));
            fitted.dissimilarities(&candidates.a, &candidates.b, &mut score);
            questions
                .candidates
                .close(&candidates.a, &candidates.b, &mut score);
            Some(Compared {
                candidates,
                kinds: vec![(kind, score.clone())],
                score,
            })
        };
        let without = stands
            .iter()
            .map(|&at| {
                let landmark = &material.landmarks.list()[at];
                let weights = material.weights(|b| if b == landmark.block { 0.0 } else { 1.0 });
                let candidates = Pair::from_fn(|side| {
                    let own = &landmark.parcels[side][..];
                    let mut all = [&questions.open[side][..], own].concat();
                    all.sort_unstable();
                    all
                });
                Some((at, compare(candidates, &weights)?))
            })
            .collect::<Option<_>>()?;
        Some(View {
            full: compare(questions.open.clone(), &material.weights(|_| 1.0))?,
            without,
        })
    }

    /// The same view by one of its kinds alone; `None` if a kind takes no part everywhere.
    #[must_use]
    pub fn by(&self, kind: Kind) -> Option<View> {
        let alone = |compared: &Compared| {
            let (_, score) = compared.kinds.iter().find(|(k, _)| *k == kind)?;
            Some(Compared {
                candidates: compared.candidates.clone(),
                kinds: vec![(kind, score.clone())],
                score: score.clone(),
            })
        };
        Some(View {
            full: alone(&self.full)?,
            without: self
                .without
                .iter()
                .map(|(at, compared)| Some((*at, alone(compared)?)))
                .collect::<Option<_>>()?,
        })
    }

    /// Where each parcel of a pair puts the other.
    #[must_use]
    pub fn placed(&self, pair: Pair<usize>) -> Pair<Placed> {
        Pair::from_fn(|from: Side| self.full.placed(from, pair[from], &[pair[from.opposite()]]))
    }

    /// How far left-out counterparts come from first, for each block (see `log_rank`).
    #[must_use]
    pub fn left_out_ranks(&self, landmarks: &Landmarks, asked: &Asked) -> Vec<f64> {
        self.without
            .iter()
            .map(|(at, compared)| {
                let members = &landmarks.list()[*at].parcels;
                log_rank(Pair::from_fn(|from: Side| {
                    compared.placed(from, asked.of(*at)[from], &members[from.opposite()])
                }))
            })
            .collect()
    }
}

/// Mean logarithm of both ranks. Whatever the number of candidates, first is first.
#[must_use]
pub fn log_rank(placed: Pair<Placed>) -> f64 {
    ((placed.a.rank as f64).ln() + (placed.b.rank as f64).ln()) / 2.0
}

/// How strongly both parcels of a pair take each other alone: the geometric mean of the share of the
/// one's mass on the other and of the other's on the one, landmark `at`'s own parcels counting for
/// nobody.
pub struct Hold<'c> {
    compared: &'c Compared,
    seen: Pair<Seen<'c>>,
    is_own: Pair<Vec<bool>>,
}

impl<'c> Hold<'c> {
    /// In a ranking, with the parcels of a landmark set aside.
    #[must_use]
    pub fn new(compared: &'c Compared, own: &Pair<Vec<usize>>) -> Hold<'c> {
        Hold {
            compared,
            seen: Pair::from_fn(|from| Seen::new(compared, from)),
            is_own: Pair::from_fn(|side: Side| {
                let all = compared.candidates[side].iter();
                all.map(|p| own[side].contains(p)).collect()
            }),
        }
    }

    fn at(&self, side: Side, parcel: usize) -> usize {
        self.compared.candidates[side]
            .binary_search(&parcel)
            .expect("the parcel is compared")
    }

    /// Shares of a parcel's mass over the other species' candidates, own parcels excepted.
    fn shares(&self, from: Side, row: usize) -> Vec<f64> {
        let own = &self.is_own[from.opposite()];
        self.seen[from].shares(row, |c| !own[c])
    }

    /// Of a pair of open parcels.
    #[must_use]
    pub fn of(&self, pair: Pair<usize>) -> f64 {
        let (i, j) = (self.at(Side::A, pair.a), self.at(Side::B, pair.b));
        (self.shares(Side::A, i)[j] * self.shares(Side::B, j)[i]).sqrt()
    }

    /// The most that any candidate has with `parcel` times a `factor` of at most 1, own parcels excepted.
    #[must_use]
    pub fn most(&self, from: Side, parcel: usize, factor: &dyn Fn(Pair<usize>) -> f64) -> f64 {
        let row = self.at(from, parcel);
        let other = from.opposite();
        let shares = self.shares(from, row);
        let negated: Vec<f64> = shares.iter().map(|s| -s).collect();
        let mut best: f64 = 0.0;
        for candidate in place::order(ArrayView1::from(&negated)) {
            // What comes back is at most all.
            if shares[candidate] <= best * best {
                break;
            }
            let own = &self.is_own[from];
            // The parcel that asks counts, though it is the landmark's own.
            let back = self.seen[other].shares(candidate, |c| c == row || !own[c]);
            let mut pair = Pair {
                a: parcel,
                b: parcel,
            };
            pair[other] = self.compared.candidates[other][candidate];
            best = best.max((shares[candidate] * back[row]).sqrt() * factor(pair));
        }
        best
    }
}

/// Ranks of some pairs both ways: `(rows, columns)`, each as a share of the candidates, the worse of
/// the two directions.
#[must_use]
pub fn worse_ranks(score: &Array2<f64>, rows: &[usize], columns: &[usize]) -> Array2<f64> {
    let mut worse = Array2::zeros((rows.len(), columns.len()));
    for (r, &i) in rows.iter().enumerate() {
        let place = shares_of_rank(score.row(i));
        for (c, &j) in columns.iter().enumerate() {
            worse[(r, c)] = place[j];
        }
    }
    for (c, &j) in columns.iter().enumerate() {
        let place = shares_of_rank(score.column(j));
        for (r, &i) in rows.iter().enumerate() {
            worse[(r, c)] = place[i].max(worse[(r, c)]);
        }
    }
    worse
}

/// Rank of every candidate over the number of admissible ones; 1 or more where inadmissible.
fn shares_of_rank(row: ArrayView1<'_, f64>) -> Vec<f64> {
    let admissible = row.iter().filter(|d| **d < f64::INFINITY).count().max(1) as f64;
    let mut share = vec![0.0; row.len()];
    for (place, candidate) in place::order(row).into_iter().enumerate() {
        share[candidate] = (place + 1) as f64 / admissible;
    }
    share
}

#[cfg(test)]
mod tests {
    use super::*;
    use ndarray::array;

    /// Two parcels of a and three of b: order from a's first 0, 2, 1; its mass .5, .3, .2.
    fn compared() -> Compared {
        Compared {
            candidates: Pair {
                a: vec![4, 7],
                b: vec![1, 2, 3],
            },
            kinds: vec![(
                Kind::Transport,
                array![[-0.5, -0.3, -0.2], [-0.1, -0.1, -0.6]],
            )],
            score: array![[0.0, 0.5, 0.2], [0.3, 0.4, 0.1]],
        }
    }

    #[test]
    fn a_hold_is_mutual() {
        let compared = compared();
        let nobody = Pair {
            a: vec![],
            b: vec![],
        };
        let hold = Hold::new(&compared, &nobody);
        // .5 of .5 + .3 + .2 there, .5 of .5 + .1 back.
        let expected = (0.5_f64 * (0.5 / 0.6)).sqrt();
        assert!((hold.of(Pair { a: 4, b: 1 }) - expected).abs() < 1e-12);
        // The most is that of the best pair, and less where that one is ruled out.
        assert!((hold.most(Side::A, 4, &|_| 1.0) - expected).abs() < 1e-12);
        let second = hold.most(Side::A, 4, &|pair| f64::from(u8::from(pair.b != 1)));
        assert!((second - (0.3_f64 * (0.3 / 0.4)).sqrt()).abs() < 1e-12);
        // Own parcels count for nobody but the one that asks.
        let own = Pair {
            a: vec![4],
            b: vec![1],
        };
        let bereft = Hold::new(&compared, &own).most(Side::A, 4, &|_| 1.0);
        assert!((bereft - (0.6_f64 * (0.3 / 0.4)).sqrt()).abs() < 1e-12);
    }

    #[test]
    fn the_worse_of_both_ranks_counts() {
        let found = worse_ranks(&compared().score, &[0, 1], &[0, 2]);
        // First of three from a's first, first of two back; third of three, second of two.
        assert!((found[(0, 0)] - 0.5).abs() < 1e-12);
        assert!((found[(0, 1)] - 1.0).abs() < 1e-12);
        assert!((found[(1, 1)] - 0.5).abs() < 1e-12);
    }
}
