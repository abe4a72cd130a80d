//! Whether landmarks agree on an axis that was fitted without them, and whether as well as that
//! happens where their pairing means nothing.

use ndarray::{s, Array1, Array2, ArrayView1};
use rayon::prelude::*;

use super::Space;
use crate::align::{self, JointMap, Moments, Params, PerAlignment};
use crate::bootstrap::{Purpose, Stream};
use crate::domain::{Pair, Side};
use crate::evidence::Material;
use crate::holdout::{shuffled, Asked, Questions};
use crate::watch::{Interrupted, Watch};

/// Permuted pairings that the axes are judged by. They give p-values down to 1/200, far below the
/// level at which axes are told from noise.
pub const PERMUTATIONS: usize = 199;

/// What differs by rounding only is a tie.
const TIE: f64 = 1e-9;

/// Per axis of one joint space, the weighted correlation over landmarks of coordinates that each
/// landmark's asked member gets from a fit without its block, brought to the axes of all landmarks by
/// the parcels of both species; `None` where a side does not vary. `moments` are those of the
/// embedding, on as many axes or more.
pub fn left_out(
    material: &Material<'_>,
    moments: &Moments,
    params: Params,
    asked: &Asked,
) -> Vec<Option<f64>> {
    let landmarks = material.landmarks.list();
    let anchors = material.anchors_in(params.embedding);
    let embedded = material.embedded_in(params.embedding);
    let without = |block: Option<usize>| -> JointMap {
        let weights = material.weights(|b| if Some(b) == block { 0.0 } else { 1.0 });
        align::fit(params, anchors, &weights).expect("two landmarks or more remain, with weights")
    };
    let full = without(None);
    let members = Pair::from_fn(|side: Side| {
        let mut points = Array2::zeros((landmarks.len(), params.axes));
        for (at, mut point) in points.rows_mut().into_iter().enumerate() {
            let row = embedded[side].row(asked.of(at)[side]);
            point.assign(&row.slice(s![..params.axes]));
        }
        points
    });
    let mut placed = Pair::from_fn(|_| Array2::zeros((landmarks.len(), params.axes)));
    for block in 0..material.landmarks.blocks() {
        let map = without(Some(block));
        let there = map
            .moved(&moments.superimpose(&map, &full))
            .positions(members.as_ref());
        for (at, landmark) in landmarks.iter().enumerate() {
            if landmark.block == block {
                for side in Side::BOTH {
                    placed[side].row_mut(at).assign(&there[side].row(at));
                }
            }
        }
    }
    let weights: Array1<f64> = landmarks.iter().map(|l| l.weight.get()).collect();
    (0..params.axes)
        .map(|axis| correlation(placed.a.column(axis), placed.b.column(axis), &weights))
        .collect()
}

/// Per axis of either joint space, on as many axes as landmarks chose, the share of pairings, the true
/// one counted among them, that have an axis with a left-out correlation as high; `None` where that of
/// the true one is undefined, or no other pairing is admissible.
///
/// The highest over axes, not the axis of the same number (Westfall & Young 1993, Resampling-Based
/// Multiple Testing, Wiley): what comes first among the axes beside a shared one behaves as the first
/// does where nothing is shared, whatever its number.
///
/// # Errors
/// [`Interrupted`] where the watch says so.
pub fn p_values(
    material: &Material<'_>,
    questions: &Questions<'_>,
    spaces: &PerAlignment<Space>,
    watch: &dyn Watch,
) -> Result<PerAlignment<Vec<Option<f64>>>, Interrupted> {
    let found: Vec<Option<PerAlignment<f64>>> = (0..PERMUTATIONS)
        .into_par_iter()
        .map(|index| {
            if watch.interrupted() {
                return None;
            }
            let mut chance = Stream::new(questions.seed, Purpose::PermutedAxes, index as u64);
            let landmarks = shuffled(material.landmarks, questions.candidates, &mut chance)?;
            let asked = Asked::draw(&landmarks, questions.candidates, questions.seed);
            let material = Material::new(material.species, &landmarks);
            Some(PerAlignment::from_fn(|alignment| {
                let space = &spaces[alignment];
                let found = left_out(&material, &space.moments, space.params, &asked);
                // A pairing that cannot be told is no reason to believe in an axis.
                let highest = found.into_iter().flatten().max_by(f64::total_cmp);
                highest.unwrap_or(f64::INFINITY)
            }))
        })
        .collect();
    if watch.interrupted() {
        return Err(Interrupted);
    }
    let found: Vec<PerAlignment<f64>> = found.into_iter().flatten().collect();
    Ok(PerAlignment::from_fn(|alignment| {
        let p = |observed: &Option<f64>| {
            let observed = observed.filter(|_| !found.is_empty())?;
            let as_high = found
                .iter()
                .filter(|highest| highest[alignment] >= observed - TIE)
                .count();
            Some((1.0 + as_high as f64) / (1.0 + found.len() as f64))
        };
        let observed = spaces[alignment].correlations_left_out.iter();
        observed.map(p).collect()
    }))
}

/// Weighted Pearson correlation; `None` where a side does not vary.
pub fn correlation(
    x: ArrayView1<'_, f64>,
    y: ArrayView1<'_, f64>,
    weights: &Array1<f64>,
) -> Option<f64> {
    let total = weights.sum();
    let mean = |z: ArrayView1<'_, f64>| z.dot(weights) / total;
    let (x, y) = (&x - mean(x), &y - mean(y));
    let products = |u: &Array1<f64>, v: &Array1<f64>| (u * v).dot(weights);
    let own = products(&x, &x) * products(&y, &y);
    (own > 0.0).then(|| (products(&x, &y) / own.sqrt()).clamp(-1.0, 1.0))
}
