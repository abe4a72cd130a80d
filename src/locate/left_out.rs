//! Each landmark as the others see it.

use crate::align::{self, Alignment, JointMap, Params};
use crate::domain::Pair;
use crate::evidence::Material;
use crate::holdout::{choose, contradicted, Asked, Choice, Placed, Trials, Way};

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
    /// Whether the other landmarks contradict it.
    pub contradicted: bool,
}

/// Collects what the trials say about each landmark.
pub fn summarise(
    material: &Material<'_>,
    ways: &[Way],
    trials: &Trials,
    choice: &Choice,
    evidence: Option<Alignment>,
    asked: &Asked,
) -> Vec<LeftOut> {
    let landmarks = material.landmarks;
    let by_block: Vec<Choice> = (0..landmarks.blocks())
        .map(|block| choose(ways, trials, evidence, Some(block)))
        .collect();
    let nested: Vec<(usize, f64)> = landmarks
        .list()
        .iter()
        .enumerate()
        .map(|(at, landmark)| {
            let way = by_block[landmark.block].way;
            let distance = distance_without(material, ways[way].0, landmark.block, asked.of(at));
            (way, distance)
        })
        .collect();
    // Whether a landmark is out of line is judged in one and the same space for all.
    let flags = contradicted(trials, choice.way);
    nested
        .into_iter()
        .enumerate()
        .map(|(at, (way, distance))| LeftOut {
            asked: asked.of(at),
            placed: trials.single[way][at],
            chosen: ways[way].0,
            distance,
            contradicted: flags[at],
        })
        .collect()
}

/// The joint space of all landmarks but one block, in standard units.
pub fn map_without(material: &Material<'_>, params: Params, block: usize) -> JointMap {
    let weights = material.weights(|b| if b == block { 0.0 } else { 1.0 });
    align::fit(params, material.anchors.as_ref(), &weights)
        .expect("two landmarks or more remain, with checked weights")
        .in_standard_units(material.embedded())
}

fn distance_without(
    material: &Material<'_>,
    params: Params,
    block: usize,
    members: Pair<usize>,
) -> f64 {
    let positions = map_without(material, params, block).positions(material.embedded());
    let gap = &positions.a.row(members.a) - &positions.b.row(members.b);
    gap.dot(&gap).sqrt()
}
