//! Might a pair be near only because it was searched for? The best of many candidates is near by
//! selection, also where a parcel has no counterpart at all.

use ndarray::Array2;

use super::view::{Hold, View};
use crate::domain::{Landmarks, Pair, Side};
use crate::holdout::Asked;

/// A pair beside the best that a search returns for landmarks whose counterpart is taken away.
#[derive(Debug, Clone, PartialEq)]
pub struct Selected {
    /// How strongly the pair holds to each other: at most 1.
    pub strength: f64,
    /// For each block whether the best of the wrong candidates of its landmark holds as strongly, seen
    /// from a and from b; `None` of one that the others contradict: what is taken away from it may not be
    /// its counterpart.
    pub matched: Vec<Option<Pair<bool>>>,
}

/// Where parcels lie in the joint space that shows distances, fitted without each block.
pub struct Lie {
    /// With all landmarks.
    pub full: Pair<Array2<f64>>,
    /// For each block without it; `None` where the others contradict its landmark.
    pub without: Vec<Option<Pair<Array2<f64>>>>,
    /// Median distance of left-out homologous pairs.
    pub usual: f64,
    /// Distance up to which a pair lies like a homologous one.
    pub limit: f64,
}

fn distance(lie: &Pair<Array2<f64>>, pair: Pair<usize>) -> f64 {
    let gap = &lie.a.row(pair.a) - &lie.b.row(pair.b);
    gap.dot(&gap).sqrt()
}

/// How well a distance is in line with homology, as a factor in [0, 1]: the density of a normal error of
/// the size that left-out homologous pairs show.
fn likely(distance: f64, usual: f64) -> f64 {
    (-(distance / usual).powi(2) / 2.0).exp()
}

impl Selected {
    /// Compares the pair with what left-out landmarks find when their counterpart is not there. Both come
    /// from one and the same ranking without the landmark, in the manner of CV+. By whatever rule a user
    /// picked the candidate, it holds no more strongly than the best one.
    #[must_use]
    pub fn of(
        view: &View,
        lie: &Lie,
        pair: Pair<usize>,
        landmarks: &Landmarks,
        asked: &Asked,
    ) -> Selected {
        let matched = view
            .without
            .iter()
            .zip(&lie.without)
            .map(|((at, compared), positions)| {
                let positions = positions.as_ref()?;
                let own = &landmarks.list()[*at].parcels;
                // Only what would pass for near is found by a search for what is near.
                let is_near = |pair: Pair<usize>| distance(positions, pair) <= lie.limit;
                let hold = Hold::new(compared, own);
                let wanted = hold.of(pair) * likely(distance(positions, pair), lie.usual);
                let factor = |pair: Pair<usize>| match is_near(pair) {
                    true => likely(distance(positions, pair), lie.usual),
                    false => 0.0,
                };
                Some(Pair::from_fn(|from: Side| {
                    hold.most(from, asked.of(*at)[from], &factor) >= wanted
                }))
            })
            .collect();
        let nobody = Pair {
            a: Vec::new(),
            b: Vec::new(),
        };
        Selected {
            strength: Hold::new(&view.full, &nobody).of(pair)
                * likely(distance(&lie.full, pair), lie.usual),
            matched,
        }
    }

    /// p-value for "the parcel of species `from` has no counterpart among the candidates", one block
    /// excepted where asked.
    #[must_use]
    pub fn p(&self, from: Side, but: Option<usize>) -> f64 {
        let used = self
            .matched
            .iter()
            .enumerate()
            .filter(|(block, _)| Some(*block) != but)
            .filter_map(|(_, matched)| matched.as_ref());
        let count = used.clone().filter(|matched| matched[from]).count();
        (1 + count) as f64 / (1 + used.count()) as f64
    }
}
