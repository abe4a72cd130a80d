//! The connectional fingerprint (Passingham, Stephan & Kötter 2002, Nat Rev Neurosci 3:606-616):
//! parcels are alike if they connect alike with the landmarks.

use ndarray::{concatenate, Array1, Array2, ArrayView1, Axis};

use super::{Evidence, Expression, Fitted, Kind, Links, Material, Unavailable};
use crate::bootstrap::Stream;
use crate::domain::{Pair, Side};

/// Cosine of standardised fingerprints, on strengths and on affinities; the mean of both.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Fingerprint;

impl Evidence for Fingerprint {
    fn name(&self) -> String {
        Kind::Fingerprint.to_string()
    }

    fn fit<'m>(
        &self,
        material: &Material<'m>,
        weights: &[f64],
        _chance: &mut Stream,
    ) -> Result<Box<dyn Fitted + 'm>, Unavailable> {
        let by_strengths = fingerprints(material, weights, Basis::Strengths);
        let by_affinity = fingerprints(material, weights, Basis::Affinity);
        let parts = [by_strengths, by_affinity]
            .into_iter()
            .flatten()
            .collect::<Vec<_>>();
        if parts.is_empty() {
            return Err(Unavailable {
                kind: self.name(),
                why: "no parcel's connection with a landmark was observed".to_owned(),
            });
        }
        Ok(Box::new(Fingerprints { parts }))
    }
}

/// What connections with the landmarks are measured by.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Basis {
    /// Strengths as they are.
    Strengths,
    /// The links that transport compares under an expression.
    Expressed(Expression),
    /// Affinities.
    Affinity,
}

/// Unit fingerprints `(parcels, features)` of both species, those of b transposed; `None` where no
/// connection with a landmark varies in both species.
pub(super) fn fingerprints(
    material: &Material<'_>,
    weights: &[f64],
    basis: Basis,
) -> Option<Pair<Array2<f64>>> {
    let kept: Vec<usize> = (0..weights.len()).filter(|&l| weights[l] > 0.0).collect();
    let total: f64 = kept.iter().map(|&l| weights[l]).sum();
    let roots: Vec<f64> = kept
        .iter()
        .map(|&l| (weights[l] * kept.len() as f64 / total).sqrt())
        .collect();
    let sides = Pair::from_fn(|side| features(material, side, &kept, basis));
    // A feature counts where it varies in both species: one that was observed in neither says nothing.
    let useful: Vec<usize> = (0..sides.a.ncols())
        .filter(|&f| Side::BOTH.iter().all(|&side| varies(sides[side].column(f))))
        .collect();
    if useful.is_empty() {
        return None;
    }
    Some(sides.map(|features| {
        let mut chosen = features.select(Axis(1), &useful);
        for (mut column, &feature) in chosen.columns_mut().into_iter().zip(&useful) {
            let root = roots[feature % kept.len()];
            column.mapv_inplace(|x| x * root);
        }
        for mut row in chosen.rows_mut() {
            let length = row.dot(&row).sqrt();
            if length > 0.0 {
                row.mapv_inplace(|x| x / length);
            }
        }
        chosen
    }))
}

fn varies(column: ArrayView1<'_, f64>) -> bool {
    column.iter().any(|x| *x != 0.0)
}

/// Connections with each landmark kept, sent and (unless symmetric) received, standardised over the
/// parcels that have them; zero, which is the mean, where not observed.
fn features(material: &Material<'_>, side: Side, kept: &[usize], basis: Basis) -> Array2<f64> {
    let links: &Links = &material.links()[side];
    let (values, directed) = match basis {
        Basis::Strengths => (&links.strengths, true),
        Basis::Expressed(expression) => (material.compared(expression).links[side].links(), true),
        // Affinities have no direction.
        Basis::Affinity => (&links.affinity, false),
    };
    let is_seen = |i: usize, j: usize| match basis {
        Basis::Strengths => links
            .observed
            .as_ref()
            .is_none_or(|mask| mask[(i, j)] > 0.0),
        Basis::Expressed(expression) => material.compared(expression).links[side].is_observed(i, j),
        Basis::Affinity => true,
    };
    let n = values.nrows();
    let landmarks = material.landmarks.list();
    let one = |sent: bool| {
        let mut features = Array2::zeros((n, kept.len()));
        for (mut feature, &landmark) in features.columns_mut().into_iter().zip(kept) {
            let members = &landmarks[landmark].parcels[side];
            let mut column: Array1<f64> = Array1::from_elem(n, f64::NAN);
            for parcel in 0..n {
                let (mut sum, mut count) = (0.0, 0.0);
                for &member in members {
                    let (i, j) = if sent {
                        (parcel, member)
                    } else {
                        (member, parcel)
                    };
                    if is_seen(i, j) {
                        sum += values[(i, j)];
                        count += 1.0;
                    }
                }
                if count > 0.0 {
                    column[parcel] = sum / count;
                }
            }
            feature.assign(&standardised(&column));
        }
        features
    };
    let sent = one(true);
    if !directed {
        return sent;
    }
    concatenate(Axis(1), &[sent.view(), one(false).view()]).expect("as many parcels each")
}

/// Mean 0 and variance 1 over the numbers there are; 0 for the others, and for all where none vary.
fn standardised(column: &Array1<f64>) -> Array1<f64> {
    let known = || column.iter().filter(|x| !x.is_nan());
    let count = known().count() as f64;
    let mean = known().sum::<f64>() / count.max(1.0);
    let variance = known().map(|x| (x - mean) * (x - mean)).sum::<f64>() / count.max(1.0);
    let largest = known().fold(0.0, |m: f64, x| m.max(x.abs()));
    // What is left of equal numbers is rounding, not variation.
    let scale = if variance.sqrt() > 1e-12 * largest {
        variance.sqrt().recip()
    } else {
        0.0
    };
    column.mapv(|x| if x.is_nan() { 0.0 } else { (x - mean) * scale })
}

struct Fingerprints {
    parts: Vec<Pair<Array2<f64>>>,
}

impl Fitted for Fingerprints {
    fn dissimilarities(&self, a: &[usize], b: &[usize], out: &mut Array2<f64>) {
        out.fill(0.0);
        for part in &self.parts {
            *out += &unlikeness(part, a, b);
        }
    }
}

/// One minus the cosine.
pub(super) fn unlikeness(part: &Pair<Array2<f64>>, a: &[usize], b: &[usize]) -> Array2<f64> {
    let (own, other) = (part.a.select(Axis(0), a), part.b.select(Axis(0), b));
    1.0 - own.dot(&other.t())
}
