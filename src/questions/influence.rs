//! How much a set of landmarks moves everyone else.

use ndarray::Array2;

use crate::align::{self, JointMap, Params};
use crate::domain::{Pair, Side};
use crate::holdout::{Compared, Ranked};
use crate::linalg::median;
use crate::locate::Weighed;
use crate::place;

/// What becomes of one parcel.
#[derive(Debug, Clone, PartialEq)]
pub struct Moved {
    /// The parcel.
    pub parcel: usize,
    /// How far it moves in the joint space, relative to the other species; 1 is the distance of random
    /// pairs.
    pub by: f64,
    /// Of open parcels with a candidate: the first before, the first after, and where the former first
    /// comes then.
    pub first: Option<(usize, usize, usize)>,
}

/// What becomes of everyone without a set of landmarks.
#[derive(Debug, Clone, PartialEq)]
pub struct Influence {
    /// Blocks of the set.
    pub blocks: Vec<usize>,
    /// Every parcel of either species that is in none of them, in the order of the input file.
    pub moved: Pair<Vec<Moved>>,
}

impl Influence {
    /// Median distance that open parcels move, and share of them whose first candidate changes.
    #[must_use]
    pub fn summary(&self) -> (f64, f64) {
        let open = || {
            let all = [&self.moved.a, &self.moved.b];
            all.into_iter().flatten().filter(|m| m.first.is_some())
        };
        let changed = open().filter(|m| m.first.is_some_and(|(was, is, _)| was != is));
        let count = open().count().max(1) as f64;
        (
            median(open().map(|m| m.by).collect()).unwrap_or(0.0),
            changed.count() as f64 / count,
        )
    }
}

/// Where everyone stands with all landmarks.
pub(super) struct Before {
    space: Params,
    positions: Pair<Array2<f64>>,
    compared: Compared,
}

/// Positions in the joint space that shows distances, and the ranking of open parcels.
pub(super) fn before(ranked: &Ranked<'_>, weighed: &Weighed) -> Before {
    let alignment = weighed.choice.evidence;
    let space = weighed.ways[weighed.choice.ways[alignment]]
        .joint()
        .expect("a choice of axes is a joint space");
    let material = ranked.material;
    let map = align::fit(space, material.anchors.as_ref(), &material.weights(|_| 1.0))
        .expect("landmarks were checked")
        .in_standard_units(material.embedded());
    Before {
        space,
        positions: map.positions(material.embedded()),
        compared: ranked.full(ranked.questions.open.clone()),
    }
}

/// Compares with a ranking without `blocks`. The joint space is fitted on the same axes without them,
/// and superimposed by the parcels of the *other* species, so that what is measured is movement
/// relative to them.
pub(super) fn influence(
    ranked: &Ranked<'_>,
    before: &Before,
    blocks: &[usize],
    after: &Compared,
) -> Influence {
    let material = ranked.material;
    let open = ranked.questions.open;
    let weights = material.weights(|b| if blocks.contains(&b) { 0.0 } else { 1.0 });
    let map = align::fit(before.space, material.anchors.as_ref(), &weights)
        .expect("two landmarks or more remain");
    let positions = map.positions(material.embedded());
    let moved = Pair::from_fn(|side: Side| {
        let other = side.opposite();
        let back = JointMap::superimpose(&positions[other], &before.positions[other]);
        let there = map.maps[side]
            .then(&back)
            .apply(material.embedded()[side].view());
        let owners = material.landmarks.owners(side, there.nrows());
        let parcels = material.species[side].parcels.as_listed();
        parcels
            .iter()
            .filter(|&&p| {
                owners[p].is_none_or(|at| !blocks.contains(&material.landmarks.list()[at].block))
            })
            .map(|&parcel| {
                let gap = &there.row(parcel) - &before.positions[side].row(parcel);
                Moved {
                    parcel,
                    by: gap.dot(&gap).sqrt(),
                    first: owners[parcel]
                        .is_none()
                        .then(|| first(before, after, side, parcel, &open[other]))
                        .flatten(),
                }
            })
            .collect()
    });
    Influence {
        blocks: blocks.to_vec(),
        moved,
    }
}

/// First before, first after among the same open candidates, and where the former comes then.
fn first(
    before: &Before,
    after: &Compared,
    side: Side,
    parcel: usize,
    open: &[usize],
) -> Option<(usize, usize, usize)> {
    let best = |row: &[f64]| {
        (0..row.len())
            .filter(|&i| row[i] < f64::INFINITY)
            .min_by(|&i, &j| row[i].total_cmp(&row[j]).then(i.cmp(&j)))
    };
    let was = best(&before.compared.row(side, parcel))?;
    let among = &after.candidates[side.opposite()];
    let all = after.row(side, parcel);
    // Without a landmark its own parcels are compared too, which are no candidates of others.
    let row: Vec<f64> = open
        .iter()
        .map(|p| all[among.binary_search(p).expect("open parcels are compared")])
        .collect();
    let is = best(&row)?;
    Some((open[was], open[is], place::rank(&row, was)))
}
