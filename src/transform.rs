//! From raw weights to strengths that can be compared: logarithms, ranks, Fisher's z.

use crate::domain::{Connectivity, Transform, WeightKind};
use crate::linalg::median;

/// Correlations are cut to this before Fisher's z, which is infinite at 1.
pub const LARGEST_CORRELATION: f64 = 0.999;

/// Orders of magnitude between the smallest and the largest positive weight from which
/// `log-floor` is the default: below the median `log1p` is linear, so that weak links vanish.
pub const WIDE_SPAN: f64 = 3.0;

/// The transform for these weights where none was asked for.
#[must_use]
pub fn default_for(connectivity: &Connectivity, weights: WeightKind) -> Transform {
    match weights {
        WeightKind::Counts | WeightKind::Fractions => {
            let positive = observed(connectivity).filter(|w| *w > 0.0);
            let (low, high) = positive.fold((f64::INFINITY, 0.0_f64), |(low, high), w| {
                (low.min(w), high.max(w))
            });
            if (high / low).log10() > WIDE_SPAN {
                Transform::LogFloor
            } else {
                Transform::Log1p
            }
        }
        WeightKind::Log10 => Transform::LogFloor,
        WeightKind::Ordinal => Transform::Ranks,
        WeightKind::Correlations => Transform::FisherZ,
        WeightKind::Other => Transform::None,
    }
}

/// Turns weights into strengths, in place; zero on the diagonal and where an entry is missing.
///
/// Scaling all weights of counts or fractions changes nothing, save under [`Transform::None`].
#[must_use]
pub fn apply(
    mut connectivity: Connectivity,
    weights: WeightKind,
    transform: Transform,
) -> Connectivity {
    let strength = scale(&connectivity, weights, transform);
    connectivity.weights_mut().mapv_inplace(strength);
    connectivity.clear_what_is_no_data();
    connectivity
}

/// The function from weight to strength that suits the data.
fn scale(
    connectivity: &Connectivity,
    weights: WeightKind,
    transform: Transform,
) -> Box<dyn Fn(f64) -> f64> {
    let positive = || observed(connectivity).filter(|w| *w > 0.0);
    match (weights, transform) {
        // Weights in logarithms already are what `log-floor` makes of others.
        (WeightKind::Log10, Transform::LogFloor) => {
            let smallest = observed(connectivity).fold(f64::INFINITY, f64::min);
            Box::new(move |w| 1.0 + w - smallest)
        }
        (WeightKind::Log10, Transform::Log1p) => {
            let median = median_or_one(observed(connectivity).map(|w| 10.0_f64.powf(w)));
            Box::new(move |w| (10.0_f64.powf(w) / median).ln_1p())
        }
        (_, Transform::Log1p) => {
            let median = median_or_one(positive());
            Box::new(move |w| (w / median).ln_1p())
        }
        (_, Transform::LogFloor) => {
            let smallest = positive().fold(f64::INFINITY, f64::min);
            Box::new(move |w| {
                if w > 0.0 {
                    1.0 + (w / smallest).log10()
                } else {
                    0.0
                }
            })
        }
        (_, Transform::Ranks) => ranks(observed(connectivity).collect()),
        (_, Transform::FisherZ) => {
            Box::new(|r| r.clamp(-LARGEST_CORRELATION, LARGEST_CORRELATION).atanh())
        }
        (_, Transform::None) => Box::new(|w| w),
    }
}

/// The weights that are data: observed and off the diagonal.
pub(crate) fn observed(connectivity: &Connectivity) -> impl Iterator<Item = f64> + '_ {
    connectivity
        .weights()
        .indexed_iter()
        .filter(|((i, j), _)| !connectivity.is_self(*i, *j) && !connectivity.is_missing(*i, *j))
        .map(|(_, w)| *w)
}

/// The median weight; 1 where there is none, so that dividing by it is harmless.
fn median_or_one(weights: impl Iterator<Item = f64>) -> f64 {
    median(weights.collect()).unwrap_or(1.0)
}

/// Average ranks as a share of all entries; where zero means no connection, zero stays zero.
fn ranks(mut sorted: Vec<f64>) -> Box<dyn Fn(f64) -> f64> {
    sorted.sort_by(f64::total_cmp);
    let zero_is_least = sorted.first() == Some(&0.0);
    let share = move |w: f64| {
        let below = sorted.partition_point(|x| *x < w);
        let up_to = sorted.partition_point(|x| *x <= w);
        (below + up_to + 1) as f64 / 2.0 / sorted.len() as f64
    };
    let no_connection = if zero_is_least { share(0.0) } else { 0.0 };
    Box::new(move |w| share(w) - no_connection)
}

#[cfg(test)]
mod tests {
    use super::*;
    use ndarray::Array2;

    /// Fractions from one in a million to all, as tracer studies find them, ten parcels that each send
    /// one weak link to another: under the default transform the weakest link is no closer to no link
    /// than to one of ten times its weight, and every one keeps its place in the order.
    #[test]
    fn fractions_over_six_orders_keep_their_weak_connections() {
        let n = 10;
        let labels: Vec<String> = (0..n).map(|i| format!("p{i}")).collect();
        let fraction = |i: usize, j: usize| match (i + 2 * j) % 9 {
            0..=1 => 0.0,
            order => 10.0_f64.powi(order as i32 - 8),
        };
        let weights =
            Array2::from_shape_fn((n, n), |(i, j)| if i == j { 0.0 } else { fraction(i, j) });
        let network = Connectivity::new(labels.clone(), labels, weights.clone(), None).unwrap();
        let transform = default_for(&network, WeightKind::Fractions);
        assert_eq!(transform, Transform::LogFloor);
        let strengths = apply(network, WeightKind::Fractions, transform);
        for (at, strength) in strengths.weights().indexed_iter() {
            let expected = if weights[at] > 0.0 {
                weights[at].log10() + 7.0
            } else {
                0.0
            };
            assert!((strength - expected).abs() < 1e-9, "{at:?}: {strength}");
        }
        // What `log1p` would have made of the same weakest link, for comparison.
        let lost = (1e-6_f64 / 1e-3).ln_1p() / (1.0_f64 / 1e-3).ln_1p();
        assert!(lost < 1e-3 && 1.0 / 7.0 > 100.0 * lost);
    }
}
