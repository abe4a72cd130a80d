//! Parcels that may have no counterpart: their mass goes everywhere, and what the other network would
//! make of them does not look like them. Left-out landmarks, which have a counterpart, say how much
//! of either is usual.

use ndarray::{Array1, Array2, ArrayView1};

use crate::domain::{Connectivity, Pair, Side};
use crate::evidence::{Expression, Material};
use crate::holdout::{Asked, OutOfBag};
use crate::linalg::median;
use crate::transport::Structure;

/// What speaks against a counterpart.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Doubt {
    /// Spread of the parcel's mass plus misfit of what it predicts; larger is more doubtful.
    pub score: f64,
    /// Small where few left-out landmarks, and few parcels of its species, are as doubtful: the larger
    /// of a conformal p-value and a robust normal tail.
    pub p: f64,
}

/// What is known of one parcel besides its candidates.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Judged {
    /// Doubt about a counterpart, of open parcels where transport takes part.
    pub doubt: Option<Doubt>,
    /// Whether it has fewer connections than every landmark, so that left-out figures do not speak for
    /// it: few connections scatter mass whether or not there is a counterpart.
    pub too_little_data: bool,
}

/// Judges every parcel of both species.
pub fn judgements(
    material: &Material<'_>,
    bagged: Option<&OutOfBag>,
    open: &Pair<Vec<usize>>,
    asked: &Asked,
) -> Pair<Vec<Judged>> {
    Pair::from_fn(|side| {
        let connections = connections(&material.species[side].network);
        let members = material.landmarks.list().iter();
        let least = members
            .flat_map(|landmark| &landmark.parcels[side])
            .map(|&parcel| connections[parcel])
            .min()
            .unwrap_or(0);
        let mut judgements: Vec<Judged> = connections
            .iter()
            .map(|&count| Judged {
                doubt: None,
                too_little_data: count < least,
            })
            .collect();
        let Some((bagged, shares)) = bagged.and_then(|all| Some((all, all.shares.as_ref()?)))
        else {
            return judgements;
        };
        let carried = Carried::new(material, side, shares);
        let landmarks: Vec<f64> = (0..material.landmarks.len())
            .map(|at| {
                let row = Array1::from(bagged.asked[at][side].clone());
                carried.score(asked.of(at)[side], row.view())
            })
            .collect();
        let scores: Vec<f64> = open[side]
            .iter()
            .map(|&parcel| carried.score(parcel, carried.shares.row(parcel)))
            .collect();
        let usual = Usual::of(&scores);
        for (&parcel, &score) in open[side].iter().zip(&scores) {
            judgements[parcel].doubt = Some(Doubt {
                score,
                p: conformal(&landmarks, score).max(usual.tail(score)),
            });
        }
        judgements
    })
}

/// Share of landmarks, the parcel itself counted as one, that are at least as doubtful.
fn conformal(landmarks: &[f64], score: f64) -> f64 {
    let as_doubtful = landmarks.iter().filter(|x| **x >= score).count();
    (1 + as_doubtful) as f64 / (1 + landmarks.len()) as f64
}

/// Makes the median absolute deviation estimate the standard deviation of normal data.
const MAD_TO_DEVIATION: f64 = 1.4826;

/// What is usual among the parcels of a species, most of which have a counterpart. Landmarks alone
/// are no measure: they are often well connected, and easier than other parcels.
struct Usual {
    centre: f64,
    deviation: f64,
}

impl Usual {
    fn of(scores: &[f64]) -> Usual {
        let centre = median(scores.to_vec()).unwrap_or(0.0);
        let gaps = scores.iter().map(|x| (x - centre).abs()).collect();
        Usual {
            centre,
            deviation: median(gaps).unwrap_or(0.0) * MAD_TO_DEVIATION,
        }
    }

    /// Chance that a normal variable of this median and median absolute deviation is as large.
    fn tail(&self, score: f64) -> f64 {
        if self.deviation > 0.0 {
            let z = (score - self.centre) / self.deviation;
            libm::erfc(z * std::f64::consts::FRAC_1_SQRT_2) / 2.0
        } else {
            1.0
        }
    }
}

/// Connections of every parcel, both directions. Read off the network itself: the links that kinds of
/// evidence share are not made for this alone.
fn connections(network: &Connectivity) -> Vec<usize> {
    let mut count = vec![0; network.row_labels().len()];
    for ((row, column), strength) in network.weights().indexed_iter() {
        if *strength != 0.0 {
            count[row] += 1;
            if let Some(parcel) = network.row_of_column(column) {
                count[parcel] += 1;
            }
        }
    }
    count
}

/// One species' network and what the other one makes of it through the mean shares.
struct Carried<'m> {
    own: &'m Structure,
    /// Mean shares of the parcel's mass `(own parcels, other parcels)`.
    shares: Array2<f64>,
    /// What a parcel of the other species sends to, and receives from, each own parcel through the
    /// shares: `(other parcels, own parcels)`.
    sent: Array2<f64>,
    received: Array2<f64>,
}

impl<'m> Carried<'m> {
    fn new(material: &'m Material<'_>, side: Side, shares: &Pair<Array2<f64>>) -> Carried<'m> {
        let links = &material.compared(Expression::Scores).links;
        let other = links[side.opposite()].links();
        let shares = match side {
            Side::A => shares.a.clone(),
            Side::B => shares.b.t().as_standard_layout().into_owned(),
        };
        Carried {
            own: &links[side],
            sent: other.dot(&shares.t()),
            received: other.t().dot(&shares.t()),
            shares,
        }
    }

    /// Entropy of a parcel's shares, as a share of the largest possible, plus one minus the
    /// correlation of its connectivity with what the other network predicts through the shares.
    fn score(&self, parcel: usize, shares: ArrayView1<'_, f64>) -> f64 {
        let total = shares.sum();
        let entropy: f64 = shares
            .iter()
            .map(|x| x / total)
            .filter(|x| *x > 0.0)
            .map(|x| -x * x.ln())
            .sum();
        let (sent, received) = (shares.dot(&self.sent), shares.dot(&self.received));
        let links = self.own.links();
        let mut pairs = Vec::with_capacity(2 * links.nrows());
        for k in (0..links.nrows()).filter(|&k| k != parcel) {
            if self.own.is_observed(parcel, k) {
                pairs.push((links[(parcel, k)], sent[k]));
            }
            if self.own.is_observed(k, parcel) {
                pairs.push((links[(k, parcel)], received[k]));
            }
        }
        entropy / (shares.len().max(2) as f64).ln() + 1.0 - correlation(&pairs)
    }
}

/// Pearson correlation; 0 where a side does not vary.
fn correlation(pairs: &[(f64, f64)]) -> f64 {
    let n = pairs.len().max(1) as f64;
    let mean_x = pairs.iter().map(|p| p.0).sum::<f64>() / n;
    let mean_y = pairs.iter().map(|p| p.1).sum::<f64>() / n;
    let (mut products, mut squares_x, mut squares_y) = (0.0, 0.0, 0.0);
    for (x, y) in pairs {
        let (x, y) = (x - mean_x, y - mean_y);
        products += x * y;
        squares_x += x * x;
        squares_y += y * y;
    }
    let scale = (squares_x * squares_y).sqrt();
    if scale > 0.0 {
        products / scale
    } else {
        0.0
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn p_counts_the_landmarks_that_are_as_doubtful() {
        let landmarks = [0.2, 0.5, 0.5, 0.9];
        assert_eq!(conformal(&landmarks, 1.0), 0.2);
        assert_eq!(conformal(&landmarks, 0.5), 0.8);
        assert_eq!(conformal(&landmarks, 0.1), 1.0);
    }

    /// The upper tail of the standard normal at 1.6448536 is 0.05 (any table).
    #[test]
    fn what_is_usual_is_measured_robustly() {
        let usual = Usual::of(&[1.0, 2.0, 3.0, 4.0, 500.0]);
        assert_eq!(usual.tail(3.0), 0.5);
        let five_percent = 3.0 + 1.644_853_626_951 * MAD_TO_DEVIATION;
        assert!((usual.tail(five_percent) - 0.05).abs() < 1e-9);
        assert_eq!(Usual::of(&[1.0; 5]).tail(9.0), 1.0);
    }

    /// Against `numpy.corrcoef([1, 2, 4, 8], [2, 1, 5, 5])` (version 2.4.6).
    #[test]
    fn the_correlation_is_pearsons() {
        let pairs = [(1.0, 2.0), (2.0, 1.0), (4.0, 5.0), (8.0, 5.0)];
        assert!((correlation(&pairs) - 0.7965184258559546).abs() < 1e-12);
        assert_eq!(correlation(&[(1.0, 2.0), (1.0, 3.0)]), 0.0);
    }
}
