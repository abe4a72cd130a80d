//! Each landmark as the others see it.

use crate::align::{self, Alignment, JointMap, Params};
use crate::domain::{Landmarks, Pair, Side};
use crate::evidence::Material;
use crate::holdout::{choose, contradicted, Asked, Choice, FirstOf, Placed, Trials, Way};

/// One landmark, left out together with its block.
#[derive(Debug, Clone, PartialEq)]
pub struct LeftOut {
    /// The member asked for on each side.
    pub asked: Pair<usize>,
    /// Where its counterpart comes, seen from either side. Alignment and number of axes were chosen
    /// again without this landmark.
    pub placed: Pair<Placed>,
    /// What was chosen without it.
    pub chosen: Params,
    /// Distance between the members asked for; 1 is that of random pairs.
    pub distance: f64,
    /// Where the joint space puts its counterpart, if the other landmarks contradict it there.
    pub contradicted: Option<Pair<Placed>>,
}

/// Collects what the trials say about each landmark: placed by `way`, or where an alignment was asked
/// for by its distances on the axes that are chosen without the landmark. Whether a landmark is out of
/// line is judged in the joint space `choice` settled on.
pub fn summarise(
    material: &Material<'_>,
    ways: &[Way],
    trials: &Trials,
    way: usize,
    choice: &Choice,
    alignment: Option<Alignment>,
    asked: &Asked,
) -> Vec<LeftOut> {
    // One and the same space for all, and the one for which the limits were simulated.
    let flags = contradicted(trials, choice.way);
    material
        .landmarks
        .list()
        .iter()
        .enumerate()
        .map(|(at, landmark)| {
            let without = choose(ways, trials, alignment, Some(landmark.block));
            let chosen = ways[without.way]
                .joint()
                .expect("a choice is a joint space");
            LeftOut {
                asked: asked.of(at),
                placed: trials.single[alignment.map_or(way, |_| without.way)][at],
                chosen,
                distance: distance_without(material, chosen, landmark.block, asked.of(at)),
                contradicted: flags[at].then_some(trials.single[choice.way][at]),
            }
        })
        .collect()
}

/// Where the counterparts of left-out landmarks came under one kind of evidence.
pub fn firsts(landmarks: &Landmarks, left_out: &[LeftOut]) -> Vec<Pair<FirstOf>> {
    landmarks
        .list()
        .iter()
        .zip(left_out)
        .map(|(landmark, found)| {
            Pair::from_fn(|from: Side| FirstOf {
                share: None,
                placed: found.placed[from],
                members: landmark.parcels[from.opposite()].len(),
            })
        })
        .collect()
}

/// The joint space of all landmarks but one block, in standard units.
pub fn map_without(material: &Material<'_>, params: Params, block: usize) -> JointMap {
    let weights = material.weights(|b| if b == block { 0.0 } else { 1.0 });
    align::fit(params, material.anchors_in(params.embedding), &weights)
        .expect("two landmarks or more remain, with checked weights")
        .in_standard_units(material.embedded_in(params.embedding))
}

fn distance_without(
    material: &Material<'_>,
    params: Params,
    block: usize,
    members: Pair<usize>,
) -> f64 {
    let embedded = material.embedded_in(params.embedding);
    let positions = map_without(material, params, block).positions(embedded);
    let gap = &positions.a.row(members.a) - &positions.b.row(members.b);
    gap.dot(&gap).sqrt()
}
