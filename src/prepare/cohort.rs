//! Individuals of one species: their mean, and the mean of individuals drawn again.

use std::collections::{BTreeSet, HashMap};

use ndarray::{Array2, Zip};
use rand::Rng;

use crate::bootstrap::Stream;
use crate::domain::{Connectivity, WeightKind};
use crate::transform::LARGEST_CORRELATION;

/// Fewest individuals that say anything about how much they differ.
pub const FEWEST_SUBJECTS: usize = 2;

/// Individuals with the same parcels, their matrices on the scale on which they are averaged:
/// Fisher's z for correlations, else the weights.
#[derive(Debug, Clone)]
pub struct Cohort {
    names: Vec<String>,
    networks: Vec<Connectivity>,
    kind: WeightKind,
}

/// An individual that cannot be used, and why.
pub type SetAside = (String, String);

impl Cohort {
    /// Brings individuals to the rows and columns of one of them, or of a group matrix where there
    /// is one. Individuals with other parcels than most are set aside.
    #[must_use]
    pub fn gather(
        individuals: Vec<(String, Connectivity)>,
        group: Option<&Connectivity>,
        kind: WeightKind,
    ) -> (Cohort, Vec<SetAside>) {
        let own = most_common(&individuals);
        let Some(reference) = group.cloned().or(own) else {
            let none = Cohort {
                names: Vec::new(),
                networks: Vec::new(),
                kind,
            };
            return (none, Vec::new());
        };
        let (mut names, mut networks, mut aside) = (Vec::new(), Vec::new(), Vec::new());
        for (name, network) in individuals {
            match like(&network, &reference) {
                Ok(network) => {
                    names.push(name);
                    networks.push(network);
                }
                Err(why) => aside.push((name, why)),
            }
        }
        let cohort = Cohort {
            names,
            networks: networks
                .into_iter()
                .map(|network| to_scale(network, kind))
                .collect(),
            kind,
        };
        (cohort, aside)
    }

    /// How many individuals.
    #[must_use]
    pub fn len(&self) -> usize {
        self.networks.len()
    }

    /// Whether there are none.
    #[must_use]
    pub fn is_empty(&self) -> bool {
        self.networks.is_empty()
    }

    /// Their names.
    #[must_use]
    pub fn names(&self) -> &[String] {
        &self.names
    }

    /// The same individuals with each matrix changed.
    #[must_use]
    pub fn map(self, change: impl Fn(Connectivity) -> Connectivity) -> Cohort {
        let kind = self.kind;
        Cohort {
            networks: self
                .networks
                .into_iter()
                .map(|network| to_scale(change(to_weights(network, kind)), kind))
                .collect(),
            ..self
        }
    }

    /// How often each individual comes in a draw: one less than there are, with replacement. The mean
    /// of so many varies as the mean of all does from sample to sample, which with as many as there
    /// are would come out too small by a factor of (n - 1) / n (McCarthy & Snowden 1985; with two
    /// individuals by a half).
    #[must_use]
    pub fn draw(&self, chance: &mut Stream) -> Vec<f64> {
        let mut times = vec![0.0; self.len()];
        for _ in 0..self.len().saturating_sub(1).max(1) {
            times[chance.gen_range(0..self.networks.len())] += 1.0;
        }
        times
    }

    /// The mean of all.
    #[must_use]
    pub fn mean(&self) -> Connectivity {
        self.weighted_mean(&vec![1.0; self.len()])
    }

    /// The mean with each individual counting so many times; where an entry was observed in none of
    /// those that count, it is missing. Of correlations the mean is that of Fisher's z.
    ///
    /// # Panics
    /// If there is another number of weights than of individuals.
    #[must_use]
    pub fn weighted_mean(&self, times: &[f64]) -> Connectivity {
        assert_eq!(times.len(), self.len(), "one weight for each individual");
        let shape = self.networks[0].weights().dim();
        let counting = || self.networks.iter().zip(times).filter(|(_, t)| **t > 0.0);
        let mut sum = Array2::<f64>::zeros(shape);
        for (network, &times) in counting() {
            sum.scaled_add(times, network.weights());
        }
        let mut missing = None;
        if counting().any(|(network, _)| network.has_missing()) {
            // Weights are zero where an entry is missing, so that only the count must be mended.
            let mut count = Array2::<f64>::zeros(shape);
            for (network, &times) in counting() {
                for ((i, j), c) in count.indexed_iter_mut() {
                    *c += if network.is_missing(i, j) { 0.0 } else { times };
                }
            }
            missing = Some(count.mapv(|c| c == 0.0));
            Zip::from(&mut sum)
                .and(&count)
                .for_each(|s, &c| *s /= c.max(f64::MIN_POSITIVE));
        } else {
            sum /= times.iter().sum::<f64>();
        }
        let first = &self.networks[0];
        let mean = Connectivity::new(
            first.row_labels().to_vec(),
            first.column_labels().to_vec(),
            sum,
            missing,
        )
        .expect("all individuals have the same rows and columns");
        to_weights(mean, self.kind)
    }
}

/// The individual whose parcels most others have; the first of equals.
fn most_common(individuals: &[(String, Connectivity)]) -> Option<Connectivity> {
    let key = |network: &Connectivity| {
        let set = |labels: &[String]| -> BTreeSet<String> { labels.iter().cloned().collect() };
        (set(network.row_labels()), set(network.column_labels()))
    };
    let mut times: HashMap<_, (usize, usize)> = HashMap::new();
    for (at, (_, network)) in individuals.iter().enumerate() {
        times.entry(key(network)).or_insert((0, at)).0 += 1;
    }
    times
        .into_values()
        .max_by_key(|(times, at)| (*times, std::cmp::Reverse(*at)))
        .map(|(_, at)| individuals[at].1.clone())
}

/// The network with rows and columns in the order of the reference; else how they differ.
fn like(network: &Connectivity, reference: &Connectivity) -> Result<Connectivity, String> {
    let order = |own: &[String], wanted: &[String], what: &str| -> Result<Vec<usize>, String> {
        let at: HashMap<&str, usize> = own.iter().map(String::as_str).zip(0..).collect();
        if own.len() != wanted.len() {
            return Err(format!(
                "{} {what} where the others have {}{}",
                own.len(),
                wanted.len(),
                wanted
                    .iter()
                    .find(|label| !at.contains_key(label.as_str()))
                    .map_or_else(String::new, |label| format!(", without {label:?}"))
            ));
        }
        wanted
            .iter()
            .map(|label| {
                at.get(label.as_str())
                    .copied()
                    .ok_or_else(|| format!("no {what} {label:?}"))
            })
            .collect()
    };
    let rows = order(network.row_labels(), reference.row_labels(), "rows")?;
    let columns = order(
        network.column_labels(),
        reference.column_labels(),
        "columns",
    )?;
    Ok(network.select(&rows, &columns))
}

fn to_scale(mut network: Connectivity, kind: WeightKind) -> Connectivity {
    if kind == WeightKind::Correlations {
        network
            .weights_mut()
            .mapv_inplace(|r| r.clamp(-LARGEST_CORRELATION, LARGEST_CORRELATION).atanh());
    }
    network
}

fn to_weights(mut network: Connectivity, kind: WeightKind) -> Connectivity {
    if kind == WeightKind::Correlations {
        network.weights_mut().mapv_inplace(f64::tanh);
    }
    network
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::bootstrap::Purpose;
    use crate::domain::Seed;
    use ndarray::array;

    fn network(labels: &[&str], weights: Array2<f64>) -> Connectivity {
        let labels: Vec<String> = labels.iter().map(|l| (*l).to_owned()).collect();
        let missing = weights.mapv(f64::is_nan);
        let weights = weights.mapv(|w| if w.is_nan() { 0.0 } else { w });
        Connectivity::new(labels.clone(), labels, weights, Some(missing)).unwrap()
    }

    fn cohort(networks: Vec<Connectivity>, kind: WeightKind) -> (Cohort, Vec<SetAside>) {
        let named = networks.into_iter().zip(1..);
        let named = named.map(|(n, at)| (at.to_string(), n)).collect();
        Cohort::gather(named, None, kind)
    }

    #[test]
    fn the_mean_is_over_those_in_which_an_entry_was_observed() {
        let (group, aside) = cohort(
            vec![
                network(&["a", "b"], array![[0.0, 2.0], [f64::NAN, 0.0]]),
                network(&["b", "a"], array![[0.0, 9.0], [4.0, 0.0]]),
                network(&["a", "c"], array![[0.0, 1.0], [1.0, 0.0]]),
            ],
            WeightKind::Counts,
        );
        assert_eq!(aside, [("3".to_owned(), "no rows \"b\"".to_owned())]);
        assert_eq!(group.mean().weights(), array![[0.0, 3.0], [9.0, 0.0]]);
        let one = group.weighted_mean(&[1.0, 0.0]);
        assert!(one.is_missing(1, 0) && !one.is_missing(0, 1));
    }

    /// Fisher's z of 0.2 and 0.8 is 0.202733 and 1.098612; the tangent of their mean 0.572122
    /// (by hand, tables of the inverse hyperbolic tangent).
    #[test]
    fn correlations_are_averaged_as_fishers_z() {
        let of = |r: f64| network(&["a", "b"], array![[1.0, r], [r, 1.0]]);
        let (group, _) = cohort(vec![of(0.2), of(0.8)], WeightKind::Correlations);
        let expected = ((0.2_f64.atanh() + 0.8_f64.atanh()) / 2.0).tanh();
        approx::assert_relative_eq!(group.mean().weights()[(0, 1)], expected, epsilon = 1e-12);
        approx::assert_relative_eq!(expected, 0.572_122, epsilon = 1e-5);
    }

    /// The mean of a draw must vary as the mean of n individuals does: variance s^2 / n, s^2 with
    /// divisor n - 1. 20 000 draws; the tolerance is four standard errors (of a variance, about
    /// sqrt(2 / 20 000) = 1 % of it).
    #[test]
    fn the_mean_of_a_draw_varies_as_the_mean_of_a_sample() {
        for values in [vec![1.0, 3.0], vec![2.0, 5.0, 11.0, 4.0, 3.0]] {
            let n = values.len() as f64;
            let networks = values
                .iter()
                .map(|v| network(&["a", "b"], array![[0.0, *v], [*v, 0.0]]));
            let (group, _) = cohort(networks.collect(), WeightKind::Other);
            let mean = values.iter().sum::<f64>() / n;
            let s2 = values.iter().map(|v| (v - mean).powi(2)).sum::<f64>() / (n - 1.0);
            let draws = 20_000_u64;
            let mut squares = 0.0;
            for r in 0..draws {
                let mut chance = Stream::new(Seed(3), Purpose::Subjects, r);
                let drawn = group.weighted_mean(&group.draw(&mut chance));
                squares += (drawn.weights()[(0, 1)] - mean).powi(2);
            }
            let ratio = squares / draws as f64 / (s2 / n);
            assert!((ratio - 1.0).abs() < 0.04, "{n}: {ratio}");
        }
    }
}
