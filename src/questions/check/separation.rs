//! How far a pair lies apart, beside landmarks that are left out and beside unrelated pairs.

use statrs::distribution::{ContinuousCDF, StudentsT};

use crate::linalg::median;

/// Makes the median absolute deviation estimate the standard deviation of normal data.
const MAD_TO_DEVIATION: f64 = 1.4826;
/// Robust deviations above the median of left-out homologous pairs up to which a pair lies like
/// them. Chosen in the simulations of docs/validity.md between true pairs that are missed and displaced
/// ones that pass.
const WITHIN: f64 = 1.15;
/// The deviation is not taken for smaller than this (log scale), so that a few landmarks that happen
/// to agree closely do not set a limit that no pair can keep.
const LEAST_DEVIATION: f64 = 0.25;

/// The limit of homologous pairs lies well below unrelated ones if at most this share of the latter lies
/// within it.
const WELL_BELOW: f64 = 0.25;

/// How far a pair lies apart on a logarithmic scale.
#[derive(Debug, Clone, PartialEq)]
pub struct Separation {
    /// The pair.
    pub own: f64,
    /// 90 % interval of the pair over replicates; the value itself where there are none.
    pub interval: (f64, f64),
    /// The landmark that stands for each block, left out.
    pub left_out: Vec<f64>,
    /// Unrelated pairs that lie as far from the landmarks.
    pub unrelated: Vec<f64>,
}

/// Centre and robust limit of left-out homologous pairs, on the same scale.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Usual {
    /// Median.
    pub centre: f64,
    /// Up to here a pair lies like a homologous one.
    pub limit: f64,
}

impl Usual {
    /// Takes the left-out values. Median and median absolute deviation, never the maximum: one wrong
    /// landmark must not widen what counts as near.
    #[must_use]
    pub fn of(left_out: &[f64]) -> Usual {
        let centre = median(left_out.to_vec()).unwrap_or(0.0);
        let gaps = left_out.iter().map(|x| (x - centre).abs()).collect();
        let deviation = MAD_TO_DEVIATION * median(gaps).unwrap_or(0.0);
        Usual {
            centre,
            limit: centre + WITHIN * deviation.max(LEAST_DEVIATION),
        }
    }
}

impl Separation {
    /// What is usual among left-out landmarks.
    #[must_use]
    pub fn usual(&self) -> Usual {
        Usual::of(&self.left_out)
    }

    /// Whether the upper end of the pair's interval lies within the limit.
    #[must_use]
    pub fn is_within(&self) -> bool {
        self.interval.1 <= self.usual().limit
    }

    /// Whether the limit of homologous pairs lies well below unrelated ones.
    #[must_use]
    pub fn limit_tells(&self) -> bool {
        self.unrelated_within() <= WELL_BELOW
    }

    /// Share of unrelated pairs that lie within the limit of homologous ones.
    #[must_use]
    pub fn unrelated_within(&self) -> f64 {
        let limit = self.usual().limit;
        let within = self.unrelated.iter().filter(|x| **x <= limit).count();
        within as f64 / self.unrelated.len().max(1) as f64
    }

    /// p-value of a t-prediction test: chance that another value of a normal sample like the left-out
    /// ones is as large. It reaches smaller p than ranks do, at the price of assuming normality.
    #[must_use]
    pub fn p_by_t(&self) -> Option<f64> {
        let n = self.left_out.len() as f64;
        if n < 3.0 {
            return None;
        }
        let mean = self.left_out.iter().sum::<f64>() / n;
        let squares: f64 = self.left_out.iter().map(|x| (x - mean).powi(2)).sum();
        let deviation = (squares / (n - 1.0)).sqrt();
        let t = (self.own - mean) / (deviation * (1.0 + 1.0 / n).sqrt());
        t.is_finite().then(|| upper_tail_of_t(t, n - 1.0))
    }
}

/// Share of left-out values, the pair's own counted as one, that are as large: a conformal p-value.
#[must_use]
pub fn conformal(own: f64, left_out: &[f64]) -> f64 {
    let as_large = left_out.iter().filter(|x| **x >= own).count();
    (1 + as_large) as f64 / (1 + left_out.len()) as f64
}

/// Chance that Student's t with so many degrees of freedom exceeds `t`.
fn upper_tail_of_t(t: f64, degrees: f64) -> f64 {
    StudentsT::new(0.0, 1.0, degrees).map_or(f64::NAN, |law| law.sf(t))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn of(own: f64, left_out: &[f64]) -> Separation {
        let own = own.ln();
        Separation {
            own,
            interval: (own, own),
            left_out: left_out.iter().map(|x| f64::ln(*x)).collect(),
            unrelated: vec![0.0, 1.0, 2.0, 3.0],
        }
    }

    /// Against `scipy.stats.t.sf` and `median_abs_deviation(scale="normal")` (version 1.17.1) on the
    /// logarithms of these numbers.
    #[test]
    fn the_t_test_and_the_robust_spread_are_scipy_s() {
        let found = of(2.4, &[0.5, 0.8, 1.0, 1.1, 1.7, 0.9]);
        assert!((found.p_by_t().unwrap() - 0.041_020_933_049_113_764).abs() < 1e-9);
        let usual = found.usual();
        assert!((usual.centre + 0.052_680_257_828_913_14).abs() < 1e-12);
        // A spread below the least counts as the least; a larger one as it is.
        assert!((usual.limit - usual.centre - WITHIN * LEAST_DEVIATION).abs() < 1e-12);
        let wide = of(1.0, &[0.1, 0.4, 1.0, 2.5, 10.0]).usual();
        let spread = MAD_TO_DEVIATION * f64::ln(2.5);
        assert!((wide.limit - WITHIN * spread).abs() < 1e-12);
    }

    #[test]
    fn one_wrong_landmark_hardly_moves_the_limit() {
        let good = [0.5, 0.8, 1.0, 1.1, 1.7, 0.9, 1.2, 0.7];
        let with = [&good[..], &[50.0]].concat();
        let gap = of(1.0, &with).usual().limit - of(1.0, &good).usual().limit;
        assert!(gap.abs() < 0.1, "{gap}");
    }

    #[test]
    fn p_counts_those_as_far_and_the_pair() {
        assert_eq!(conformal(3.0, &[1.0, 2.0, 3.0]), 0.5);
        assert_eq!(conformal(4.0, &[1.0, 2.0, 3.0]), 0.25);
        assert_eq!(conformal(0.0, &[1.0, 2.0, 3.0]), 1.0);
    }

    #[test]
    fn a_limit_above_many_unrelated_pairs_tells_nothing() {
        let mut found = of(1.0, &[1.0, 1.0, 1.0]);
        found.unrelated = vec![0.0, 1.0, 1.0, 1.0];
        assert!(found.limit_tells());
        found.unrelated = vec![0.0, 0.0, 1.0, 1.0];
        assert!(!found.limit_tells());
    }
}
