//! Landmarks that the others contradict.

use super::trials::{Placed, Trials};
use crate::domain::Pair;
use crate::linalg::median;

/// Makes the median absolute deviation estimate the standard deviation of normal data.
const MAD_TO_DEVIATION: f64 = 1.4826;
/// Robust deviations beyond which a left-out landmark is out of line. Chosen in simulations of 12
/// and 24 landmarks (docs/method.md): any flag in about 5 % of clean studies.
const OUT_OF_LINE: f64 = 3.5;
/// Deviations are not taken for smaller than this (log odds): landmarks that agree closely must not
/// condemn one that agrees a little less.
const LEAST_DEVIATION: f64 = 0.5;
/// A landmark is not contradicted while its counterpart is, on average over both directions, among
/// this share of the candidates.
const PLAUSIBLE_SHARE: f64 = 0.05;

/// Which landmarks lie out of line with the rest under one way of ranking: left out, the counterpart
/// ranks far worse than those of the other landmarks do in fits that this one has no part in either,
/// so that a wrong landmark cannot hide behind the damage it does. Ranks are compared as log odds,
/// by median and median absolute deviation.
#[must_use]
pub fn contradicted(trials: &Trials, way: usize) -> Vec<bool> {
    let landmarks = trials.blocks.len();
    (0..landmarks)
        .map(|landmark| {
            let own = trials.blocks[landmark];
            let placed = trials.single[way][landmark];
            let others: Vec<f64> = (0..landmarks)
                .filter(|other| trials.blocks[*other] != own)
                .map(|other| log_odds(trials.nested[way][own][other]))
                .collect();
            let centre = median(others.clone()).unwrap_or(0.0);
            let deviation = median(others.iter().map(|x| (x - centre).abs()).collect())
                .unwrap_or(0.0)
                * MAD_TO_DEVIATION;
            let limit = centre + OUT_OF_LINE * deviation.max(LEAST_DEVIATION);
            log_odds(placed) > limit && share_ahead(placed) > PLAUSIBLE_SHARE
        })
        .collect()
}

/// Log odds of a candidate being ahead of the counterpart, mean of both directions.
fn log_odds(placed: Pair<Placed>) -> f64 {
    let odds = |p: Placed| {
        let (rank, candidates) = (p.rank as f64, p.candidates as f64);
        ((rank - 0.5) / (candidates - rank + 0.5)).ln()
    };
    (odds(placed.a) + odds(placed.b)) / 2.0
}

/// Share of the candidates ahead of the counterpart, mean of both directions.
fn share_ahead(placed: Pair<Placed>) -> f64 {
    1.0 - (placed.a.percentile() + placed.b.percentile()) / 2.0
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Trials of one way in which each landmark is a block and has the same rank both ways.
    fn trials(ranks: &[usize]) -> Trials {
        let single: Vec<Pair<Placed>> = ranks
            .iter()
            .map(|&rank| {
                Pair::from_fn(|_| Placed {
                    rank,
                    candidates: 100,
                })
            })
            .collect();
        Trials {
            nested: vec![vec![single.clone(); ranks.len()]],
            single: vec![single],
            blocks: (0..ranks.len()).collect(),
        }
    }

    #[test]
    fn only_what_is_out_of_line_is_flagged() {
        let one_off = contradicted(&trials(&[1, 2, 1, 3, 1, 2, 60, 1, 2, 4]), 0);
        assert_eq!(one_off.iter().position(|flag| *flag), Some(6));
        assert_eq!(one_off.iter().filter(|flag| **flag).count(), 1);
        // Where all are poor, none stands out; where all are good, a fourth rank is no contradiction.
        assert!(!contradicted(&trials(&[20, 70, 5, 40, 60, 33, 90, 12]), 0).contains(&true));
        assert!(!contradicted(&trials(&[1, 1, 1, 1, 1, 1, 4]), 0).contains(&true));
    }
}
