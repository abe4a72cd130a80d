//! Fused Gromov–Wasserstein transport between the networks themselves, with the fingerprint as cost
//! and landmarks pulled together. One fit is a replicate: how much the networks count is drawn.

use ndarray::{Array2, Axis};
use rand::Rng;

use super::fingerprint::{fingerprints, unlikeness, Basis};
use super::{Evidence, Expression, Fitted, Kind, Material, Unavailable};
use crate::bootstrap::Stream;
use crate::domain::Pair;
use crate::transport::{self, Fused, Marginals, Mass, Masses, Structure};

/// Range from which the weight of the networks beside the cost is drawn.
const FUSED: std::ops::Range<f64> = 0.2..0.6;
/// How strongly landmarks are pulled together, in units of the largest cost. It is a bonus for the
/// pair alone: landmark parcels stay open to others, so that several counterparts can be reached.
const PULL: f64 = 5.0;
/// Part of the cost (of mean 1) in the ranking, which orders candidates without a share.
const COST_IN_RANKING: f64 = 0.02;
/// Part of the shares by agreement in the ranking, beside those of the plan.
const AGREEMENT_IN_RANKING: f64 = 0.6;
/// How fast a share by agreement falls with the correlation of links: by e for a sixteenth less.
const AGREEMENT_SHARPNESS: f64 = 16.0;
/// Most steps of a fit: on the real pairs 15 steps rank as well as 60 (docs/method.md).
const STEPS: usize = 15;
/// A fit ends when a step gains less than this share of the objective.
const TOLERANCE: f64 = 1e-6;
/// Most pairs of parcels for which transport is tried; beyond it a fit takes tens of seconds.
pub const MOST_PAIRS: usize = 1_000_000;

/// Transport under one expression of the links.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Transport {
    /// How strengths become links.
    pub expression: Expression,
    /// What mass parcels have.
    pub mass: Mass,
}

/// Size n m (n + m) of two species, to which the time of a fit is in proportion, up to which all
/// replicates that were asked for are run: 400 x 360 parcels.
const FULL_SIZE: usize = 400 * 360 * 760;
/// Fewest replicates at any size: every landmark block is then left out of eight.
const FEWEST: usize = 24;

impl Transport {
    /// Whether species of these sizes can be fitted in reasonable time.
    ///
    /// # Errors
    /// [`Unavailable`] beyond [`MOST_PAIRS`].
    pub fn size_allows(parcels: Pair<usize>) -> Result<(), Unavailable> {
        if parcels.a * parcels.b <= MOST_PAIRS {
            return Ok(());
        }
        Err(Unavailable {
            kind: Kind::Transport.to_string(),
            why: format!(
                "{} x {} parcels are more than {MOST_PAIRS} pairs",
                parcels.a, parcels.b
            ),
        })
    }

    /// Replicates to run where so many were asked for: fewer for large species, never below 24.
    #[must_use]
    pub fn replicates(asked: usize, parcels: Pair<usize>) -> usize {
        let size = parcels.a * parcels.b * (parcels.a + parcels.b);
        let affordable = asked * FULL_SIZE / size.max(FULL_SIZE);
        affordable.max(FEWEST)
    }
}

impl Evidence for Transport {
    fn name(&self) -> String {
        Kind::Transport.to_string()
    }

    fn fit<'m>(
        &self,
        material: &Material<'m>,
        weights: &[f64],
        chance: &mut Stream,
    ) -> Result<Box<dyn Fitted + 'm>, Unavailable> {
        let unavailable = |why: String| Unavailable {
            kind: self.name(),
            why,
        };
        let sizes = material.sizes();
        Transport::size_allows(sizes)?;
        let areas = material.species.map(|species| species.areas.as_deref());
        let masses = match (self.mass, areas.a, areas.b) {
            (Mass::Area, Some(a), Some(b)) => Masses::proportional(a, b),
            (Mass::Area, ..) => {
                return Err(unavailable(
                    "the areas of the parcels are not known".to_owned(),
                ))
            }
            (Mass::Uniform | Mass::Free, ..) => Masses::uniform(sizes.a, sizes.b),
        };
        let cost = cost(material, weights, self.expression);
        let mut pulled = cost.clone();
        let pull = -PULL * cost.fold(0.0, |m: f64, x| m.max(*x));
        for (landmark, &weight) in material.landmarks.list().iter().zip(weights) {
            if weight > 0.0 {
                for &i in &landmark.parcels.a {
                    for &j in &landmark.parcels.b {
                        pulled[(i, j)] = pull;
                    }
                }
            }
        }
        let fused = chance.gen_range(FUSED);
        let structures = &material.compared(self.expression).structures;
        let plan = |marginals: &Marginals| {
            let problem = Fused {
                structures,
                cost: &pulled,
                fused,
                marginals,
                steps: STEPS,
                tolerance: TOLERANCE,
            };
            problem.solve().plan
        };
        let shares = match self.mass {
            // Either side keeps its own marginal, so each is asked in a plan of its own.
            Mass::Free => Pair {
                a: of_rows(plan(&Marginals::Rows)),
                b: of_columns(plan(&Marginals::Columns)),
            },
            Mass::Uniform | Mass::Area => {
                let plan = plan(&Marginals::Fixed(masses));
                Pair {
                    a: of_rows(plan.clone()),
                    b: of_columns(plan),
                }
            }
        };
        let agreeing = agreeing(&material.compared(self.expression).links, &shares);
        Ok(Box::new(Carried {
            shares,
            agreeing,
            cost,
        }))
    }
}

/// Shares by how well parcels agree when their links are carried over, first by the plan, then by plan and
/// agreement together: what the plan could not send to a second and third counterpart is there then.
fn agreeing(links: &Pair<Structure>, planned: &Pair<Array2<f64>>) -> Pair<Array2<f64>> {
    let once = |shares: &Pair<Array2<f64>>| {
        let found = transport::agreement(links.as_ref(), shares.as_ref());
        transport::shares_of(&found, AGREEMENT_SHARPNESS)
    };
    let first = once(planned);
    let both = Pair::from_fn(|side| (&planned[side] + &first[side]) / 2.0);
    once(&both)
}

/// Entries as shares of their row.
fn of_rows(mut plan: Array2<f64>) -> Array2<f64> {
    for mut row in plan.rows_mut() {
        let sum = row.sum();
        if sum > 0.0 {
            row.mapv_inplace(|x| x / sum);
        }
    }
    plan
}

/// Entries as shares of their column.
fn of_columns(mut plan: Array2<f64>) -> Array2<f64> {
    let sums = plan
        .sum_axis(Axis(0))
        .mapv(|x| if x > 0.0 { x } else { 1.0 });
    plan /= &sums;
    plan
}

/// Unlikeness of fingerprints on the links that are compared; of mean 1. The same for all pairs where
/// no connection with a landmark varies.
fn cost(material: &Material<'_>, weights: &[f64], expression: Expression) -> Array2<f64> {
    let sizes = material.sizes();
    let part = fingerprints(material, weights, Basis::Expressed(expression));
    let mut cost = match part {
        Some(part) => {
            let every = |size: usize| (0..size).collect::<Vec<_>>();
            unlikeness(&part, &every(sizes.a), &every(sizes.b))
        }
        None => Array2::ones((sizes.a, sizes.b)),
    };
    let mean = cost.sum() / cost.len() as f64;
    if mean > 0.0 {
        cost /= mean;
    }
    cost
}

/// Where mass goes, as shares of what each parcel has, and what it costs.
struct Carried {
    shares: Pair<Array2<f64>>,
    /// Shares by agreement of carried links.
    agreeing: Pair<Array2<f64>>,
    cost: Array2<f64>,
}

impl Fitted for Carried {
    fn dissimilarities(&self, a: &[usize], b: &[usize], out: &mut Array2<f64>) {
        for (row, &i) in a.iter().enumerate() {
            for (column, &j) in b.iter().enumerate() {
                let planned = (self.shares.a[(i, j)] + self.shares.b[(i, j)]) / 2.0;
                let agreeing = (self.agreeing.a[(i, j)] + self.agreeing.b[(i, j)]) / 2.0;
                out[(row, column)] = COST_IN_RANKING * self.cost[(i, j)]
                    - (1.0 - AGREEMENT_IN_RANKING) * planned
                    - AGREEMENT_IN_RANKING * agreeing;
            }
        }
    }

    fn shares(&self) -> Option<Pair<&Array2<f64>>> {
        Some(self.shares.as_ref())
    }
}
