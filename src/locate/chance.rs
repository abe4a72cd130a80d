//! What a first rank is worth: what transport says, as far as the study's own left-out landmarks bear
//! it out.

use crate::domain::{Landmarks, Pair};
use crate::holdout::FirstOf;

/// One-sided 90 % point of the normal distribution.
const ONE_SIDED: f64 = 1.281_551_565_544_6;
/// One-sided 99.5 % point: the lower end of a two-sided 99 % interval. With 95 % the luckiest of many sets of
/// landmarks promised too much (docs/validity.md).
const LOWER_END: f64 = 2.575_829_303_548_9;
/// Share of the left-out questions that count as like a parcel: those nearest to it in share.
const LIKE: f64 = 0.5;

/// First candidates of left-out landmarks, how many were right, and how far above chance they rank.
#[derive(Debug, Clone, PartialEq)]
pub struct Support {
    firsts: Vec<FirstOf>,
    skill: f64,
}

impl Support {
    /// Takes the first candidates of every landmark, in the order of the list, from either side.
    pub fn new(landmarks: &Landmarks, firsts: Vec<Pair<FirstOf>>) -> Support {
        let blocks: Vec<usize> = landmarks.list().iter().map(|l| l.block).collect();
        Support {
            skill: skill(&blocks, &firsts),
            firsts: firsts.into_iter().flat_map(|f| [f.a, f.b]).collect(),
        }
    }

    /// Estimated chance that a first candidate is right: the majority of the share of mass that
    /// averaged transport sends there, else of the support, times the skill that left-out landmarks
    /// show; at most the upper limit of how often left-out landmarks like it had their counterpart
    /// first.
    pub fn chance(&self, share: Option<f64>, support: f64) -> f64 {
        let estimate = self.skill * majority(share.unwrap_or(support));
        let mut like: Vec<&FirstOf> = self.firsts.iter().collect();
        if let Some(share) = share.filter(|_| like.iter().all(|first| first.share.is_some())) {
            let gap = |first: &FirstOf| (first.share.unwrap_or(share) - share).abs();
            like.sort_by(|x, y| gap(x).total_cmp(&gap(y)));
            let count = (LIKE * like.len() as f64).ceil() as usize;
            like.truncate(count.max(1));
        }
        // The two directions of a landmark are nearly one question.
        let count = like.len() as f64 / 2.0;
        let right = like.iter().filter(|first| first.placed.rank == 1).count() as f64 / 2.0;
        estimate.min(upper_limit(right, count))
    }
}

/// Chance that at least two of three independent draws go where one goes with chance `share`. Small
/// shares are worth less than they say, since mass has to go somewhere also where there is no
/// counterpart, and large ones more (docs/validity.md).
fn majority(share: f64) -> f64 {
    share * share * (3.0 - 2.0 * share)
}

/// How far left-out ranks are above chance, at the lower end of its 99 % interval: 1 where every
/// counterpart comes first, 0 where ranks might be those of chance. `blocks` has the block of each
/// landmark.
///
/// The mean error over blocks, plus t standard errors, is set against the error of random ranks. A
/// dozen landmarks may be lucky, and landmarks are often the parcels that are easiest to find, so what
/// they show at best is not what others may rely on.
fn skill(blocks: &[usize], firsts: &[Pair<FirstOf>]) -> f64 {
    let count = blocks.iter().max().map_or(0, |block| block + 1);
    // Of each block: error, error by chance, landmarks.
    let mut sums = vec![(0.0, 0.0, 0.0); count];
    for (&block, first) in blocks.iter().zip(firsts) {
        let both = |of: &dyn Fn(&FirstOf) -> f64| (of(&first.a) + of(&first.b)) / 2.0;
        sums[block].0 += both(&|first| first.placed.error());
        sums[block].1 += both(&|first| first.placed.error_by_chance(first.members));
        sums[block].2 += 1.0;
    }
    let count = count as f64;
    let error = sums.iter().map(|(e, _, n)| e / n).sum::<f64>() / count;
    let by_chance = sums.iter().map(|(_, c, n)| c / n).sum::<f64>() / count;
    if count < 2.0 || by_chance <= 0.0 {
        return 0.0;
    }
    let squares: f64 = sums.iter().map(|(e, _, n)| (e / n - error).powi(2)).sum();
    let standard_error = (squares / (count - 1.0) / count).sqrt();
    let highest = error + t_quantile(LOWER_END, count - 1.0) * standard_error;
    (1.0 - highest / by_chance).clamp(0.0, 1.0)
}

/// Quantile of Student's t from that of the normal distribution: the first four terms of the
/// expansion in Abramowitz & Stegun (1964), 26.7.5, recalled from memory and checked below.
fn t_quantile(z: f64, degrees: f64) -> f64 {
    let (z3, z5, z7) = (z.powi(3), z.powi(5), z.powi(7));
    z + (z3 + z) / (4.0 * degrees)
        + (5.0 * z5 + 16.0 * z3 + 3.0 * z) / (96.0 * degrees.powi(2))
        + (3.0 * z7 + 19.0 * z5 + 17.0 * z3 - 15.0 * z) / (384.0 * degrees.powi(3))
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
    use crate::holdout::Placed;

    /// A left-out landmark with this share and rank of its counterpart among `candidates`, alike from
    /// either side.
    fn both(share: Option<f64>, rank: usize, candidates: usize) -> Pair<FirstOf> {
        Pair::from_fn(|_| FirstOf {
            share,
            placed: Placed { rank, candidates },
            members: 1,
        })
    }

    /// Every landmark a block of its own.
    fn support(firsts: &[Pair<FirstOf>]) -> Support {
        let blocks: Vec<usize> = (0..firsts.len()).collect();
        Support {
            skill: skill(&blocks, firsts),
            firsts: firsts.iter().flat_map(|f| [f.a, f.b]).collect(),
        }
    }

    /// Against `statsmodels.stats.proportion.proportion_confint(3, 10, alpha=0.2, method="wilson")`
    /// (version 0.15.0), whose upper end of a two-sided 80 % interval is the one-sided 90 % limit.
    #[test]
    fn the_upper_limit_is_wilsons() {
        assert!((upper_limit(3.0, 10.0) - 0.502628294760249).abs() < 1e-9);
        assert!((upper_limit(0.0, 6.0) - 0.21490368384648426).abs() < 1e-9);
        assert_eq!(upper_limit(5.0, 5.0), 1.0);
    }

    /// Against `scipy.stats.t.ppf(0.995, df)` (1.17.1); four terms fall short by 12 % at two degrees.
    #[test]
    fn t_quantiles_are_students() {
        for (degrees, expected, tolerance) in [
            (2.0, 9.924843200918287, 1.2),
            (5.0, 4.032142983555228, 0.03),
            (11.0, 3.1058065155392804, 0.001),
            (29.0, 2.756385903670605, 0.00002),
        ] {
            let found = t_quantile(LOWER_END, degrees);
            assert!((found - expected).abs() < tolerance, "{degrees}: {found}");
        }
    }

    #[test]
    fn no_parcel_is_surer_than_landmarks_like_it() {
        // Ranks so near the first that skill is high, while half of the landmarks are missed.
        let support = support(
            &[(0.9, 1), (0.8, 1), (0.85, 1), (0.3, 2), (0.2, 2), (0.25, 2)]
                .map(|(share, rank)| both(Some(share), rank, 1_000_000)),
        );
        assert!(support.skill > 0.9 && support.skill < 1.0);
        assert!((support.chance(Some(0.9), 0.1) - 0.972 * support.skill).abs() < 1e-12);
        assert!((support.chance(Some(0.45), 1.0) - upper_limit(0.0, 3.0)).abs() < 1e-12);
        assert!((support.chance(Some(0.1), 1.0) - 0.028 * support.skill).abs() < 1e-12);
        // Without shares all landmarks count.
        assert!((support.chance(None, 0.99) - upper_limit(3.0, 6.0)).abs() < 1e-12);
    }

    #[test]
    fn landmarks_that_are_all_found_take_nothing_away() {
        let support = support(&vec![both(Some(0.5), 1, 40); 8]);
        assert_eq!(support.skill, 1.0);
        assert!((support.chance(Some(0.7), 0.0) - 0.784).abs() < 1e-12);
        assert!((support.chance(Some(0.5), 0.0) - 0.5).abs() < 1e-12);
    }

    /// 2 000 studies of twelve landmarks with random ranks among 30: by definition the lower end of a
    /// 99 % interval lies above chance in 0.5 % of them. At most 1.5 % are allowed, and none by much.
    #[test]
    fn random_ranks_leave_no_chance() {
        use rand::{Rng, SeedableRng};
        let mut draws = rand_xoshiro::Xoshiro256StarStar::seed_from_u64(4);
        let mut above = 0;
        for _ in 0..2000 {
            let firsts: Vec<Pair<FirstOf>> = (0..12)
                .map(|_| both(Some(0.6), draws.gen_range(1..=30), 30))
                .collect();
            let support = support(&firsts);
            above += usize::from(support.skill > 0.0);
            assert!(support.chance(Some(0.6), 0.6) < 0.25);
        }
        assert!(above <= 30, "{above}");
    }

    /// Ranks 1, 1, 2, 2 of 16 candidates err by 0, 0, 1/4, 1/4: mean 1/8, variance 1/48; random ranks
    /// err by ln(16!) / (16 ln 16).
    #[test]
    fn skill_is_the_lower_end_of_one_minus_error_over_that_of_chance() {
        let firsts = [1, 1, 2, 2].map(|rank| both(None, rank, 16));
        let by_chance = (1..=16).map(|r| f64::from(r).ln()).sum::<f64>() / (16.0 * 16.0_f64.ln());
        let standard_error = (1.0_f64 / 48.0).sqrt() / 2.0;
        let highest = 0.125 + t_quantile(LOWER_END, 3.0) * standard_error;
        let expected = 1.0 - highest / by_chance;
        assert!(expected > 0.15 && expected < 0.3);
        assert!((skill(&[0, 1, 2, 3], &firsts) - expected).abs() < 1e-12);
        // Two landmarks of one block are one fact.
        let firsts = [1, 1, 1, 1, 2, 2, 2, 2].map(|rank| both(None, rank, 16));
        assert!((skill(&[0, 0, 1, 1, 2, 2, 3, 3], &firsts) - expected).abs() < 1e-12);
    }
}
