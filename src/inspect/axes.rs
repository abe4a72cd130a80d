//! How many axes there are, how many carry anything, how many the landmarks allow.

use serde::Serialize;

use crate::embed::Embedding;
use crate::prepare::Study;

/// Numbers of axes that a run will try.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct AxesAllowed {
    /// The fewest.
    pub fewest: usize,
    /// The most.
    pub most: usize,
}

impl AxesAllowed {
    /// What a study's landmarks, embeddings and settings allow.
    #[must_use]
    pub fn of(study: &Study) -> AxesAllowed {
        AxesAllowed {
            fewest: study.axes.first().copied().unwrap_or(1),
            most: study.axes.last().copied().unwrap_or(1),
        }
    }
}

/// What the leading axes of an embedding carry.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct AxesWorth {
    /// Eigenvalues of the leading axes.
    pub eigenvalues: Vec<f64>,
    /// The same as shares of the sum over all axes there are.
    pub shares: Vec<f64>,
    /// How many leading axes carry more than the broken stick would give them; a lower bound where
    /// it is all that were computed.
    pub above_broken_stick: usize,
}

impl AxesWorth {
    /// Judges the axes of an embedding.
    #[must_use]
    pub fn of(embedding: &Embedding) -> AxesWorth {
        let shares = embedding.shares.to_vec();
        AxesWorth {
            above_broken_stick: above_broken_stick(
                &shares,
                embedding.coordinates.nrows().saturating_sub(1),
            ),
            eigenvalues: embedding.eigenvalues.to_vec(),
            shares,
        }
    }
}

/// The broken-stick rule (Frontier 1976; Jackson 1993): a stick broken at random into `pieces` has a
/// k-th longest piece of 1/p (1/k + 1/(k+1) + … + 1/p) on average; leading axes count as long as
/// they carry more.
fn above_broken_stick(shares: &[f64], pieces: usize) -> usize {
    let expected = |k: usize| (k..=pieces).map(|i| 1.0 / i as f64).sum::<f64>() / pieces as f64;
    shares
        .iter()
        .enumerate()
        .take_while(|(at, share)| **share > expected(at + 1))
        .count()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_dominant_axis_counts_and_even_ones_do_not() {
        assert_eq!(above_broken_stick(&[0.7, 0.2, 0.1], 3), 1);
        // Expected for four pieces: .521, .271, .146, .063.
        assert_eq!(above_broken_stick(&[0.55, 0.3, 0.1, 0.05], 4), 2);
        assert_eq!(above_broken_stick(&[0.25; 4], 4), 0);
    }
}
