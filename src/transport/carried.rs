//! How well single parcels agree once a plan has said which partners correspond.
//!
//! A plan with given marginals cannot send one parcel's mass to three that each want as much as it has,
//! so that where one parcel answers to several the plan finds one of them at best. But the plan is
//! mostly right about everyone else. Carry the links of a candidate over by it and compare them with a
//! parcel's own: every pair is judged by itself, and a part of an area looks like the area whatever its
//! share of the connections, since a correlation does not ask how strong they are.

use ndarray::{Array2, ArrayView2, Axis, Zip};

use super::Structure;
use crate::domain::Pair;

/// Least weight of a carried link: a partner that has gone to the candidate itself says nothing.
const LEAST_WEIGHT: f64 = 1e-9;

/// Correlation of every parcel of a with every parcel of b `(parcels of a, parcels of b)` between its
/// own links and the other's, carried over by shares: `shares.a` has rows and `shares.b` columns that
/// sum to 1, both `(parcels of a, parcels of b)`. The mean of what is seen among a's parcels,
///
/// ```text
/// correlation over k of (A_ik, A_ki) with (C_jk, C'_jk),   C_jk = sum_l S_kl B_jl / sum_l S_kl,   k != i, l != j
/// ```
///
/// in which k counts with weight sum_l S_kl, and of the same among b's. Links that were not observed are
/// left out of either sum. 0 where nothing varies.
///
/// # Panics
/// If the shares do not have the shape of the links.
#[must_use]
pub fn agreement(links: Pair<&Structure>, shares: Pair<&Array2<f64>>) -> Array2<f64> {
    let (n, m) = (links.a.len(), links.b.len());
    assert_eq!(shares.a.dim(), (n, m), "one share for each pair");
    assert_eq!(shares.b.dim(), (n, m), "one share for each pair");
    let own = links.map(Directed::of);
    let among_a = among(&own.a, &own.b, shares.a.view());
    let among_b = among(&own.b, &own.a, shares.b.t());
    (among_a + among_b.t()) / 2.0
}

/// Links as their sources and as their targets see them, with zero in a parcel's own place.
struct Directed {
    /// Row = parcel, column = partner; once where links are symmetric, else sent and received.
    links: Vec<Array2<f64>>,
    /// For each of these one where a link was observed, a parcel's own place counting as not observed;
    /// `None` where all others were.
    observed: Option<Vec<Array2<f64>>>,
}

impl Directed {
    fn of(structure: &Structure) -> Directed {
        let directions = |x: &Array2<f64>| {
            let mut sent = x.clone();
            sent.diag_mut().fill(0.0);
            let received = sent.t().as_standard_layout().into_owned();
            [sent, received]
        };
        let mut links = Vec::from(directions(structure.links()));
        let mut observed = structure.observed().map(|mask| Vec::from(directions(mask)));
        if structure.is_symmetric() {
            links.truncate(1);
            if let Some(masks) = &mut observed {
                masks.truncate(1);
            }
        }
        Directed { links, observed }
    }

    fn links(&self, direction: usize) -> &Array2<f64> {
        &self.links[direction.min(self.links.len() - 1)]
    }

    /// Sums over the partners of each parcel that were observed, of what each partner counts in `of`
    /// `(partners, any)`.
    fn over_observed(&self, direction: usize, of: &Array2<f64>) -> Array2<f64> {
        match &self.observed {
            Some(masks) => masks[direction.min(masks.len() - 1)].dot(of),
            None => &of.sum_axis(Axis(0)).insert_axis(Axis(0)) - of,
        }
    }

    /// Sums of shares `(others, parcels)` over the partners of each parcel that were observed.
    fn shares_observed(&self, direction: usize, shares: ArrayView2<'_, f64>) -> Array2<f64> {
        match &self.observed {
            Some(masks) => shares.dot(&masks[direction.min(masks.len() - 1)].t()),
            None => &shares.sum_axis(Axis(1)).insert_axis(Axis(1)) - &shares,
        }
    }
}

/// Weighted correlations `(own parcels, other parcels)`; shares `(own parcels, other parcels)`.
fn among(own: &Directed, other: &Directed, shares: ArrayView2<'_, f64>) -> Array2<f64> {
    let shape = shares.dim();
    let sums = || Array2::<f64>::zeros(shape);
    let (mut w, mut x, mut y) = (sums(), sums(), sums());
    let (mut xx, mut yy, mut xy) = (sums(), sums(), sums());
    for direction in 0..own.links.len().max(other.links.len()) {
        let links = own.links(direction);
        // Weighted carried links: weight times value is the plain sum of shares times links.
        let carried = shares.dot(&other.links(direction).t());
        let weight = other.shares_observed(direction, shares);
        let squares = Zip::from(&carried).and(&weight).map_collect(|c, w| {
            if *w > LEAST_WEIGHT {
                c * c / w
            } else {
                0.0
            }
        });
        w += &own.over_observed(direction, &weight);
        y += &own.over_observed(direction, &carried);
        yy += &own.over_observed(direction, &squares);
        x += &links.dot(&weight);
        xx += &links.mapv(|v| v * v).dot(&weight);
        xy += &links.dot(&carried);
    }
    let mut found = sums();
    Zip::indexed(&mut found).for_each(|at, found| {
        let w = w[at];
        if w <= LEAST_WEIGHT {
            return;
        }
        let (mean_x, mean_y) = (x[at] / w, y[at] / w);
        let square_x = xx[at] / w - mean_x * mean_x;
        let square_y = yy[at] / w - mean_y * mean_y;
        // Rounding leaves a trace of variance where there is none.
        let tiny = |square: f64, sum: f64| square <= 1e-12 * (sum / w).abs();
        if tiny(square_x, xx[at]) || tiny(square_y, yy[at]) {
            return;
        }
        *found = ((xy[at] / w - mean_x * mean_y) / (square_x * square_y).sqrt()).clamp(-1.0, 1.0);
    });
    found
}

/// Shares in proportion to exp(sharpness · agreement): of each row, and of each column.
#[must_use]
pub fn shares_of(agreement: &Array2<f64>, sharpness: f64) -> Pair<Array2<f64>> {
    let soft = |axis: Axis| {
        let mut shares = agreement.clone();
        for mut lane in shares.lanes_mut(axis) {
            let most = lane.fold(f64::NEG_INFINITY, |most: f64, x| most.max(*x));
            lane.mapv_inplace(|x| (sharpness * (x - most)).exp());
            let sum = lane.sum();
            lane.mapv_inplace(|x| x / sum);
        }
        shares
    };
    Pair {
        a: soft(Axis(1)),
        b: soft(Axis(0)),
    }
}
