//! Is a pair further apart than homologous pairs? Full conformal prediction (Vovk, Gammerman & Shafer
//! 2005): the pair joins the landmarks, every choice is made with it among them, each is left out in turn,
//! and all are treated alike. If the pair is homologous and exchangeable with the landmarks, p is at most
//! x with chance at most x.

use super::separation::conformal;
use super::spot::strained;
use crate::align::{Alignment, Params};
use crate::domain::{Landmark, Landmarks, Pair, Share};
use crate::evidence::Material;
use crate::holdout::{choose, joint_ways, place_each, Asked, Questions, Trials};
use crate::locate::stand_ins;
use crate::place;
use crate::prepare::Study;

/// How a pair's distance compares with those of landmarks, the pair being one of them.
#[derive(Debug, Clone, PartialEq)]
pub struct Further {
    /// p-value for "the pair is homologous".
    pub p: f64,
    /// The joint space that all of them chose.
    pub space: Params,
    /// Distance of the pair without itself, logarithm, after division by its strain.
    pub own: f64,
    /// The same of the landmark that stands for each block, without its block.
    pub others: Vec<f64>,
}

/// Puts the pair among the landmarks of the study. `alignment` is the one that was asked for, if one was.
///
/// # Panics
/// If a parcel of the pair is a landmark's.
#[must_use]
pub fn further(study: &Study, alignment: Option<Alignment>, pair: Pair<usize>) -> Further {
    let landmarks = joined(&study.landmarks, pair);
    let material = Material::new(study.species.as_ref(), &landmarks);
    let open = place::open_parcels(&landmarks, material.sizes());
    let asked = Asked::draw(&landmarks, &study.candidates, study.settings.seed);
    let questions = Questions {
        open: &open,
        candidates: &study.candidates,
        asked: &asked,
        seed: study.settings.seed,
    };
    let mut trials = Trials {
        single: Vec::new(),
        nested: Vec::new(),
        blocks: landmarks.list().iter().map(|l| l.block).collect(),
    };
    let ways = joint_ways(&study.axes, study.settings.ridge, material.embeddings());
    for way in &ways {
        let evidence = way.evidence().expect("joint spaces are cheap to fit");
        trials.add(place_each(&material, &*evidence, &questions));
    }
    let space = ways[choose(&ways, &trials, alignment, None).way]
        .joint()
        .expect("a choice is a joint space");
    let mut distances: Vec<f64> = stand_ins(&landmarks, study.settings.seed)
        .into_iter()
        .map(|at| {
            let block = landmarks.list()[at].block;
            strained(&material, space, &[block], &[asked.of(at)])[0]
        })
        .collect();
    let own = distances.pop().expect("the pair's block is the last");
    Further {
        p: conformal(own, &distances),
        space,
        own,
        others: distances,
    }
}

/// The landmarks and the pair, in a block of its own.
fn joined(landmarks: &Landmarks, pair: Pair<usize>) -> Landmarks {
    let blocks = landmarks.blocks();
    let mut list = landmarks.list().to_vec();
    let mut names: Vec<String> = (0..blocks)
        .map(|b| landmarks.block_name(b).to_owned())
        .collect();
    list.push(Landmark {
        name: String::from("the pair"),
        parcels: pair.map(|parcel| vec![parcel]),
        weight: Share::ALL,
        block: blocks,
        basis: None,
    });
    names.push(String::from("the pair"));
    Landmarks::new(list, names).expect("the pair is no landmark")
}
