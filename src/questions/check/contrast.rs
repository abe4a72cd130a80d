//! The one candidate or the other?

use super::ground::Ground;
use super::spot::logarithm;
use crate::bootstrap::interval_of;
use crate::domain::{Pair, Side};
use crate::questions::rate::{wilson, Estimate};

/// Rivals that stand for the other candidate at each left-out landmark.
const RIVALS: usize = 5;

/// Two candidates of one parcel compared.
#[derive(Debug, Clone, PartialEq)]
pub struct Contrast {
    /// The candidate that is nearer in the joint space.
    pub nearer: usize,
    /// The other.
    pub other: usize,
    /// How many times as far the other is, and its 90 % interval over replicates.
    pub ratio: f64,
    /// That interval.
    pub interval: (f64, f64),
    /// Share of replicates in which the first is nearer.
    pub share_nearer: f64,
    /// Share of the replicates that rank in which it ranks before the other.
    pub share_before: f64,
    /// How often left-out landmarks rank their counterpart before a rival that is as far from it as the
    /// two candidates are from each other.
    pub landmarks: Estimate,
}

/// Compares two candidates of `parcel`, a parcel of species `from`.
#[must_use]
pub fn contrast(ground: &Ground, from: Side, parcel: usize, candidates: [usize; 2]) -> Contrast {
    let pairs = candidates.map(|candidate| pair_of(from, parcel, candidate));
    let index = pairs.map(|pair| ground.index(pair));
    let space = &ground.located.spaces[ground.located.choice.evidence];
    let own = pairs.map(|pair| {
        let gap = &space.positions.a.row(pair.a) - &space.positions.b.row(pair.b);
        logarithm(gap.dot(&gap).sqrt())
    });
    let [first, second] = if own[0] <= own[1] { [0, 1] } else { [1, 0] };
    let ratios: Vec<f64> = ground
        .watched
        .distances
        .iter()
        .map(|all| logarithm(all[index[second]]) - logarithm(all[index[first]]))
        .collect();
    let share = |hits: usize, of: usize| hits as f64 / of.max(1) as f64;
    let share_nearer = share(ratios.iter().filter(|r| **r > 0.0).count(), ratios.len());
    let ranks = &ground.watched.ranks;
    let before = ranks
        .iter()
        .filter(|all| all[index[first]][from] < all[index[second]][from])
        .count();
    let ratio = own[second] - own[first];
    let interval = interval_of(ratios).unwrap_or((ratio, ratio));
    Contrast {
        nearer: candidates[first],
        other: candidates[second],
        ratio: ratio.exp(),
        interval: (interval.0.exp(), interval.1.exp()),
        share_nearer,
        share_before: share(before, ranks.len()),
        landmarks: right_choices(ground, from, candidates),
    }
}

/// A pair from a parcel of one species and one of the other.
#[must_use]
pub fn pair_of(from: Side, parcel: usize, candidate: usize) -> Pair<usize> {
    match from {
        Side::A => Pair {
            a: parcel,
            b: candidate,
        },
        Side::B => Pair {
            a: candidate,
            b: parcel,
        },
    }
}

fn right_choices(ground: &Ground, from: Side, candidates: [usize; 2]) -> Estimate {
    let to = from.opposite();
    let positions = &ground.located.spaces[ground.located.choice.evidence].positions[to];
    let apart = |x: usize, y: usize| {
        let gap = &positions.row(x) - &positions.row(y);
        gap.dot(&gap).sqrt()
    };
    let wanted = apart(candidates[0], candidates[1]);
    let rates: Vec<f64> = ground
        .view
        .without
        .iter()
        .map(|(at, compared)| {
            let own = &ground.study.landmarks.list()[*at].parcels[to];
            let asked = ground.asked.of(*at);
            let row = compared.row(from, asked[from]);
            let counterpart = asked[to];
            let mut rivals: Vec<(f64, usize)> = compared.candidates[to]
                .iter()
                .enumerate()
                .filter(|(place, rival)| !own.contains(rival) && row[*place] < f64::INFINITY)
                .map(|(place, &rival)| ((apart(rival, counterpart) - wanted).abs(), place))
                .collect();
            rivals.sort_by(|x, y| x.0.total_cmp(&y.0).then(x.1.cmp(&y.1)));
            rivals.truncate(RIVALS);
            let best = (0..row.len())
                .filter(|&place| own.contains(&compared.candidates[to][place]))
                .map(|place| row[place])
                .fold(f64::INFINITY, f64::min);
            let right = rivals
                .iter()
                .filter(|(_, rival)| best < row[*rival])
                .count();
            right as f64 / rivals.len().max(1) as f64
        })
        .collect();
    let count = rates.len() as f64;
    wilson(rates.iter().sum::<f64>() / count, count)
}
