//! What a first rank is worth: never more than the study's own left-out landmarks support.

use crate::domain::Pair;
use crate::holdout::FirstOf;

/// One-sided 90 % point of the normal distribution.
const ONE_SIDED: f64 = 1.281_551_565_544_6;
/// Share of the left-out questions that count as like a parcel: those nearest to it in share.
const LIKE: f64 = 0.5;

/// First candidates of left-out landmarks, and how many were right.
#[derive(Debug, Clone, PartialEq)]
pub struct Support(Vec<FirstOf>);

impl Support {
    /// Takes the first candidates of every landmark from either side.
    pub fn new(firsts: impl IntoIterator<Item = Pair<FirstOf>>) -> Support {
        Support(
            firsts
                .into_iter()
                .flat_map(|first| [first.a, first.b])
                .collect(),
        )
    }

    /// Estimated chance that a first candidate is right: the share of mass that averaged transport
    /// sends there, else the support; at most the upper limit of how often left-out landmarks like
    /// it had their counterpart first.
    pub fn chance(&self, share: Option<f64>, support: f64) -> f64 {
        let estimate = share.unwrap_or(support);
        let mut like: Vec<&FirstOf> = self.0.iter().collect();
        if let Some(share) = share.filter(|_| like.iter().all(|first| first.share.is_some())) {
            let gap = |first: &FirstOf| (first.share.unwrap_or(share) - share).abs();
            like.sort_by(|x, y| gap(x).total_cmp(&gap(y)));
            let count = (LIKE * like.len() as f64).ceil() as usize;
            like.truncate(count.max(1));
        }
        // The two directions of a landmark are nearly one question.
        let count = like.len() as f64 / 2.0;
        let right = like.iter().filter(|first| first.right).count() as f64 / 2.0;
        estimate.min(upper_limit(right, count))
    }
}

/// Upper end of Wilson's (1927, J Am Stat Assoc 22:209-212) score interval for a rate, one-sided at
/// 90 %.
fn upper_limit(right: f64, count: f64) -> f64 {
    if count <= 0.0 {
        return 1.0;
    }
    let (rate, z2) = (right / count, ONE_SIDED * ONE_SIDED);
    let centre = rate + z2 / (2.0 * count);
    let spread = ONE_SIDED * (rate * (1.0 - rate) / count + z2 / (4.0 * count * count)).sqrt();
    ((centre + spread) / (1.0 + z2 / count)).min(1.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Against `statsmodels.stats.proportion.proportion_confint(3, 10, alpha=0.2, method="wilson")`
    /// (version 0.15.0), whose upper end of a two-sided 80 % interval is the one-sided 90 % limit.
    #[test]
    fn the_upper_limit_is_wilsons() {
        assert!((upper_limit(3.0, 10.0) - 0.502628294760249).abs() < 1e-9);
        assert!((upper_limit(0.0, 6.0) - 0.21490368384648426).abs() < 1e-9);
        assert_eq!(upper_limit(5.0, 5.0), 1.0);
    }

    #[test]
    fn no_parcel_is_surer_than_landmarks_like_it() {
        let first = |share: f64, right: bool| FirstOf {
            share: Some(share),
            right,
        };
        let both = |share, right| Pair {
            a: first(share, right),
            b: first(share, right),
        };
        let support = Support::new(
            [
                (0.9, true),
                (0.8, true),
                (0.85, true),
                (0.3, false),
                (0.2, false),
                (0.25, false),
            ]
            .map(|(share, right)| both(share, right)),
        );
        assert_eq!(support.chance(Some(0.9), 0.1), 0.9);
        assert!((support.chance(Some(0.4), 1.0) - upper_limit(0.0, 3.0)).abs() < 1e-12);
        assert_eq!(support.chance(Some(0.01), 1.0), 0.01);
        // Without shares all landmarks count.
        assert_eq!(support.chance(None, 0.99), upper_limit(3.0, 6.0));
    }
}
