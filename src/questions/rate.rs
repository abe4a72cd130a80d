//! Rates over a few landmarks, their intervals, and what chance gives.

use serde::Serialize;

/// Level of the intervals.
pub const LEVEL: f64 = 0.9;
/// Normal quantile of that level, two-sided.
const TWO_SIDED: f64 = 1.644_853_626_951_472_7;

/// A rate and its interval.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Estimate {
    /// The rate.
    pub value: f64,
    /// Lower end.
    pub low: f64,
    /// Upper end.
    pub high: f64,
}

/// Score interval for a mean of `count` independent values in [0, 1] (Wilson 1927, J Am Stat Assoc
/// 22:209-212). It is meant for values of 0 and 1; others vary less about the same mean, so it is then
/// wider than it need be.
///
/// ```
/// let found = kinmark::questions::wilson(0.3, 10.0);
/// assert!((found.low - 0.1273).abs() < 1e-3 && found.high < 0.6);
/// ```
#[must_use]
pub fn wilson(mean: f64, count: f64) -> Estimate {
    if count <= 0.0 {
        return Estimate {
            value: mean,
            low: 0.0,
            high: 1.0,
        };
    }
    let z2 = TWO_SIDED * TWO_SIDED;
    let centre = mean + z2 / (2.0 * count);
    let spread = TWO_SIDED * (mean * (1.0 - mean) / count + z2 / (4.0 * count * count)).sqrt();
    let scale = 1.0 + z2 / count;
    Estimate {
        value: mean,
        low: ((centre - spread) / scale).max(0.0),
        high: ((centre + spread) / scale).min(1.0),
    }
}

/// What a random order gives where `own` of `candidates` are right: the chance that one of them is
/// among the first `k` for each `k` asked, and the mean reciprocal rank of the best of them.
#[must_use]
pub fn by_chance<const N: usize>(own: usize, candidates: usize, k: [usize; N]) -> ([f64; N], f64) {
    // Chance that the best rank exceeds r: none of the first r is right.
    let mut beyond = 1.0;
    let mut within = [0.0; N];
    let mut reciprocal = 0.0;
    for rank in 1..=candidates {
        let left = (candidates - rank + 1) as f64;
        let before = beyond;
        beyond *= ((left - own as f64) / left).max(0.0);
        reciprocal += (before - beyond) / rank as f64;
        for (hit, &k) in within.iter_mut().zip(&k) {
            if rank <= k {
                *hit = 1.0 - beyond;
            }
        }
    }
    (within, reciprocal)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::bootstrap::{Purpose, Stream};
    use crate::domain::Seed;
    use rand::Rng;

    /// Against `statsmodels.stats.proportion.proportion_confint(x, n, alpha=0.1, method="wilson")`
    /// (version 0.15.0).
    #[test]
    fn intervals_are_wilsons() {
        for (right, count, low, high) in WILSON {
            let found = wilson(right / count, count);
            assert!((found.low - low).abs() < 1e-9, "{found:?}");
            assert!((found.high - high).abs() < 1e-9, "{found:?}");
        }
    }

    const WILSON: [(f64, f64, f64, f64); 3] = [
        (3.0, 10.0, 0.12687658390319784, 0.558300204130165),
        (0.0, 12.0, 0.0, 0.18398119474747707),
        (11.0, 14.0, 0.5679507254010006, 0.9109322287502919),
    ];

    #[test]
    fn chance_is_that_of_a_random_order() {
        let ([first, five], reciprocal) = by_chance(1, 40, [1, 5]);
        let harmonic: f64 = (1..=40).map(|r| 1.0 / f64::from(r)).sum();
        assert!((first - 1.0 / 40.0).abs() < 1e-12 && (five - 5.0 / 40.0).abs() < 1e-12);
        assert!((reciprocal - harmonic / 40.0).abs() < 1e-12);
        // Two right of three: first with 2/3, else second. Fewer candidates than five: certain.
        let ([first, five], reciprocal) = by_chance(2, 3, [1, 5]);
        assert!((first - 2.0 / 3.0).abs() < 1e-12 && (five - 1.0).abs() < 1e-12);
        assert!((reciprocal - (2.0 / 3.0 + 1.0 / 6.0)).abs() < 1e-12);
    }

    /// Reciprocal ranks of 12 landmarks drawn from a skewed law (half first, else uniform to 50), 4 000
    /// trials: the interval holds the true mean in at least 89 % (nominal 90 less two standard errors).
    #[test]
    fn the_interval_of_a_mean_reciprocal_rank_covers() {
        let truth = 0.5 + 0.5 * (1..=50).map(|r| 1.0 / f64::from(r)).sum::<f64>() / 50.0;
        let mut chance = Stream::new(Seed(2), Purpose::HeldOutSets, 0);
        let covered = (0..4000)
            .filter(|_| {
                let mean = (0..12)
                    .map(|_| match chance.gen_bool(0.5) {
                        true => 1.0,
                        false => 1.0 / f64::from(chance.gen_range(1..=50)),
                    })
                    .sum::<f64>()
                    / 12.0;
                let found = wilson(mean, 12.0);
                found.low <= truth && truth <= found.high
            })
            .count();
        assert!(covered >= 3560, "{covered} of 4000");
    }
}
