//! How much each landmark block counts in a replicate.

use rand::Rng;
use rand_distr::{Distribution, Exp1};

use crate::domain::choices;

choices! {
    /// How landmark blocks are drawn in a replicate.
    pub enum Resampling {
        /// Bayesian bootstrap (Rubin 1981): Dirichlet(1) weights, no block ever quite absent.
        Bayesian = "bayesian",
        /// Ordinary bootstrap (Efron 1979): as many draws as blocks, with replacement. A draw of one
        /// block alone fixes nothing and is drawn again.
        Ordinary = "ordinary",
    }
}

impl Resampling {
    /// Weights of `blocks` blocks, summing to their number.
    pub fn draw(self, blocks: usize, rng: &mut impl Rng) -> Vec<f64> {
        match self {
            Resampling::Bayesian => {
                let waits: Vec<f64> = (0..blocks).map(|_| Exp1.sample(rng)).collect();
                let total: f64 = waits.iter().sum();
                waits
                    .into_iter()
                    .map(|wait| wait * blocks as f64 / total)
                    .collect()
            }
            Resampling::Ordinary => {
                let mut weights = vec![0.0; blocks];
                while weights.iter().filter(|w| **w > 0.0).count() < 2.min(blocks) {
                    weights.fill(0.0);
                    for _ in 0..blocks {
                        weights[rng.gen_range(0..blocks)] += 1.0;
                    }
                }
                weights
            }
        }
    }
}

/// Weights of `blocks` blocks, Dirichlet(2), summing to their number: half the variance of the
/// Bayesian bootstrap, for replicates that are averaged.
pub fn steady(blocks: usize, rng: &mut impl Rng) -> Vec<f64> {
    let waits: Vec<f64> = (0..blocks)
        .map(|_| {
            let (first, second): (f64, f64) = (Exp1.sample(rng), Exp1.sample(rng));
            first + second
        })
        .collect();
    let total: f64 = waits.iter().sum();
    waits
        .into_iter()
        .map(|wait| wait * blocks as f64 / total)
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::bootstrap::{Purpose, Stream};
    use crate::domain::Seed;

    /// Dirichlet(1) weights over n blocks, times n, have mean 1 and variance (n - 1) / (n + 1);
    /// multinomial counts have mean 1 and variance (n - 1) / n (both textbook results). 4 000 draws
    /// of 10 blocks: the tolerance is four standard errors of the estimates.
    #[test]
    fn draws_have_the_moments_of_their_distribution() {
        let (draws, blocks) = (4000_u64, 10_usize);
        for (resampling, variance) in [
            (Resampling::Bayesian, 9.0 / 11.0),
            (Resampling::Ordinary, 9.0 / 10.0),
        ] {
            let mut squares = 0.0;
            let mut first = 0.0;
            for r in 0..draws {
                let mut rng = Stream::new(Seed(5), Purpose::LandmarkWeights, r);
                let weights = resampling.draw(blocks, &mut rng);
                assert!((weights.iter().sum::<f64>() - blocks as f64).abs() < 1e-9);
                squares += weights.iter().map(|w| (w - 1.0).powi(2)).sum::<f64>();
                first += weights[0];
            }
            let found = squares / (draws as f64 * blocks as f64);
            assert!((found - variance).abs() < 0.06, "{resampling}: {found}");
            assert!((first / draws as f64 - 1.0).abs() < 0.06);
        }
    }

    /// Dirichlet(2) weights over n blocks, times n, have variance (n - 1) / (2 n + 1) (textbook
    /// result). 4 000 draws of 10 blocks; the tolerance is four standard errors.
    #[test]
    fn steady_weights_have_the_moments_of_their_distribution() {
        let (draws, blocks) = (4000_u64, 10_usize);
        let mut squares = 0.0;
        for r in 0..draws {
            let mut rng = Stream::new(Seed(5), Purpose::OutOfBagWeights, r);
            let weights = steady(blocks, &mut rng);
            assert!((weights.iter().sum::<f64>() - blocks as f64).abs() < 1e-9);
            squares += weights.iter().map(|w| (w - 1.0).powi(2)).sum::<f64>();
        }
        let found = squares / (draws as f64 * blocks as f64);
        assert!((found - 9.0 / 21.0).abs() < 0.02, "{found}");
    }
}
