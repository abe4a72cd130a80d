//! Is a pair nearer than unrelated pairs?

use super::view::{worse_ranks, View};
use crate::domain::{Pair, Side};
use crate::place::Candidates;

/// Unrelated parcels that are compared with, of each species: those as far from the landmarks, a third
/// of all but no fewer than this.
const FEWEST: usize = 20;
const SHARE: f64 = 1.0 / 3.0;

/// How a pair compares with unrelated ones.
#[derive(Debug, Clone, PartialEq)]
pub struct Nearer {
    /// The worse of the pair's two ranks, as a share of the candidates.
    pub worse: f64,
    /// Share of the unrelated pairs, the pair itself counted among them, that do as well.
    pub p: f64,
    /// The unrelated pairs.
    pub pairs: Vec<Pair<usize>>,
}

/// Ranks a pair against unrelated pairs as far from the landmarks. Both parcels are exchanged: pairs of
/// a's parcels like the pair's with b's parcels like the pair's, neither of the pair's among them. A few
/// of these pairs are homologous, which makes p larger, never smaller. `beyond` has the distance of
/// every parcel from the landmarks.
#[must_use]
pub fn nearer(
    view: &View,
    pair: Pair<usize>,
    beyond: &Pair<Vec<f64>>,
    candidates: &Candidates,
) -> Nearer {
    let score = &view.full.score;
    let open = &view.full.candidates;
    let own = Pair::from_fn(|side| {
        open[side]
            .binary_search(&pair[side])
            .expect("the pair is compared")
    });
    let like = Pair::from_fn(|side: Side| {
        let gap = |at: usize| (beyond[side][open[side][at]] - beyond[side][pair[side]]).abs();
        let mut others: Vec<usize> = (0..open[side].len())
            .filter(|&at| at != own[side])
            .collect();
        others.sort_by(|&x, &y| gap(x).total_cmp(&gap(y)).then(x.cmp(&y)));
        let count = (SHARE * others.len() as f64).ceil() as usize;
        others.truncate(count.max(FEWEST));
        others
    });
    let worse = worse_ranks(score, &[own.a], &[own.b])[(0, 0)];
    let others = worse_ranks(score, &like.a, &like.b);
    let mut pairs = Vec::with_capacity(others.len());
    let mut as_near = 0;
    for ((r, c), other) in others.indexed_iter() {
        let (a, b) = (open.a[like.a[r]], open.b[like.b[c]]);
        if candidates.admit(Side::A, a, b) {
            pairs.push(Pair { a, b });
            as_near += usize::from(*other <= worse);
        }
    }
    Nearer {
        worse,
        p: (1 + as_near) as f64 / (1 + pairs.len()) as f64,
        pairs,
    }
}
