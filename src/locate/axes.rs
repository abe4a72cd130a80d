//! A joint space and what its axes carry.

use ndarray::{s, Array1, Array2};

use super::agreement::{correlation, left_out};
use crate::align::{self, Anchorage, JointMap, Moments, Params};
use crate::domain::{Pair, Side};
use crate::evidence::Material;
use crate::holdout::Asked;

/// Parcels named at each end of an axis.
pub const ENDS: usize = 3;

/// A fitted joint space with everything reported about it.
#[derive(Debug, Clone)]
pub struct Space {
    /// Alignment, axes and ridge.
    pub params: Params,
    /// The maps, in standard units.
    pub map: JointMap,
    /// Positions `(parcels, axes)` of each species.
    pub positions: Pair<Array2<f64>>,
    /// What brings replicates of the space to these positions, by the parcels of one species.
    pub(super) anchorage: Pair<Anchorage>,
    /// Bootstrap standard errors of the positions relative to the other species' parcels.
    pub standard_errors: StandardErrors,
    /// Share of each embedding's variance that an axis predicts.
    pub shares: Pair<Array1<f64>>,
    /// Correlation of both species' landmark coordinates on an axis, in sample.
    pub correlations: Array1<f64>,
    /// The same with every landmark placed by a fit that does without it; `None` where a side does
    /// not vary.
    pub correlations_left_out: Vec<Option<f64>>,
    /// p-value of the latter against the highest of all axes under permuted pairings of the landmarks;
    /// `None` where it is undefined.
    pub p: Vec<Option<f64>>,
    /// Mean, over replicates that draw landmarks again, of the absolute correlation of all parcels'
    /// coordinates with those on the replicate's axis of the same number.
    pub reliability: Vec<f64>,
    /// Moments of the embeddings on the axes that enter.
    pub(super) moments: Moments,
}

/// Largest p-value of an axis that replicates. Common practice, no source: an axis is looked into, not
/// acted upon.
pub const REPLICATES_UP_TO_P: f64 = 0.1;

/// Least reliability of an axis that replicates: half the variance in common (0.7 squared). Common
/// practice, no source.
pub const REPLICATES_FROM_RELIABILITY: f64 = 0.7;

/// Standard errors of positions `(parcels, axes)`, by what was drawn again.
#[derive(Debug, Clone)]
pub struct StandardErrors {
    /// Landmarks alone.
    pub landmarks: Pair<Array2<f64>>,
    /// Subjects, where any were given.
    pub subjects: Option<SubjectErrors>,
}

/// Standard errors that subjects are part of.
#[derive(Debug, Clone)]
pub struct SubjectErrors {
    /// Subjects alone.
    pub alone: Pair<Array2<f64>>,
    /// Subjects and landmarks.
    pub both: Pair<Array2<f64>>,
}

impl StandardErrors {
    /// Share of a parcel's variance that comes from subjects, of what subjects alone and landmarks
    /// alone make together, over all axes; `None` without subjects, or where nothing varies.
    #[must_use]
    pub fn share_of_subjects(&self, side: Side, parcel: usize) -> Option<f64> {
        let variance = |errors: &Array2<f64>| -> f64 {
            let errors = errors.row(parcel);
            errors.dot(&errors)
        };
        let subjects = variance(&self.subjects.as_ref()?.alone[side]);
        let total = subjects + variance(&self.landmarks[side]);
        (total > 0.0).then(|| subjects / total)
    }
}

impl StandardErrors {
    /// Mean share over the parcels of a side; `None` without subjects.
    #[must_use]
    pub fn mean_share_of_subjects(&self, side: Side) -> Option<f64> {
        let shares: Vec<f64> = (0..self.landmarks[side].nrows())
            .filter_map(|parcel| self.share_of_subjects(side, parcel))
            .collect();
        (!shares.is_empty()).then(|| shares.iter().sum::<f64>() / shares.len() as f64)
    }
}

/// The parcels at both ends of an axis, outermost first.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct AxisEnds {
    /// Lowest coordinates.
    pub low: Vec<usize>,
    /// Highest coordinates.
    pub high: Vec<usize>,
}

impl Space {
    /// Fits the full sample. Standard errors and reliabilities are zero until the bootstrap has run,
    /// p-values missing until pairings were permuted.
    pub(super) fn fit(material: &Material<'_>, params: Params, asked: &Asked) -> Space {
        let weights = material.weights(|_| 1.0);
        let embedded = material.embedded();
        let map = align::fit(params, material.anchors.as_ref(), &weights)
            .expect("a checked study has landmarks enough")
            .in_standard_units(embedded);
        let positions = map.positions(embedded);
        let landmarks = map.positions(material.anchors.as_ref());
        let weights = Array1::from(weights);
        let moments = Moments::new(embedded, params.axes);
        Space {
            params,
            shares: Pair::from_fn(|side| map.shares(side, embedded[side])),
            correlations: (0..map.axes())
                .map(|axis| {
                    correlation(landmarks.a.column(axis), landmarks.b.column(axis), &weights)
                        .unwrap_or(0.0)
                })
                .collect(),
            correlations_left_out: left_out(material, &moments, params, asked),
            p: vec![None; map.axes()],
            reliability: vec![0.0; map.axes()],
            moments,
            standard_errors: StandardErrors {
                landmarks: positions.as_ref().map(|p| Array2::zeros(p.dim())),
                subjects: None,
            },
            anchorage: Pair::from_fn(|side| {
                let leading = embedded[side].slice(s![.., ..params.axes]);
                Anchorage::new(leading, &positions[side])
            }),
            positions,
            map,
        }
    }

    /// Whether an axis replicates: landmarks agree on it, and beyond chance, when left out, and it
    /// stays under other weights of the landmarks. Any other is not told from noise, and not to be
    /// interpreted.
    #[must_use]
    pub fn replicates(&self, axis: usize) -> bool {
        self.correlations_left_out[axis].is_some_and(|r| r > 0.0)
            && self.p[axis].is_some_and(|p| p <= REPLICATES_UP_TO_P)
            && self.reliability[axis] >= REPLICATES_FROM_RELIABILITY
    }

    /// Distance between a parcel of one side and a parcel of the other.
    #[must_use]
    pub fn distance(&self, side: Side, parcel: usize, other: usize) -> f64 {
        let from = self.positions[side].row(parcel);
        let to = self.positions[side.opposite()].row(other);
        from.iter()
            .zip(to)
            .map(|(x, y)| (x - y) * (x - y))
            .sum::<f64>()
            .sqrt()
    }

    /// The parcels at both ends of an axis.
    #[must_use]
    pub fn ends(&self, side: Side, axis: usize) -> AxisEnds {
        let order = crate::place::order(self.positions[side].column(axis));
        let ends = ENDS.min(order.len());
        AxisEnds {
            low: order[..ends].to_vec(),
            high: order.iter().rev().take(ends).copied().collect(),
        }
    }
}
