//! The landmarks in numbers.

use serde::Serialize;

use crate::domain::{Basis, Pair, Side};
use crate::prepare::Study;

/// Landmarks that rest on the same.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct BasisCount {
    /// What they rest on; empty where nothing is said.
    pub basis: String,
    /// How many.
    pub landmarks: usize,
}

/// What the landmark table holds.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct LandmarkFacts {
    /// Landmarks.
    pub count: usize,
    /// Blocks: what is left out together counts once.
    pub blocks: usize,
    /// Blocks of more than one landmark, and the landmarks in each.
    pub shared_blocks: Vec<(String, Vec<String>)>,
    /// Landmarks with several parcels on a side.
    pub groups: Vec<String>,
    /// Parcels of each species that belong to a landmark.
    pub parcels: Pair<usize>,
    /// Landmarks with a weight below 1, and that weight.
    pub weighted: Vec<(String, f64)>,
    /// What they rest on, commonest first; empty where the table has no such column.
    pub bases: Vec<BasisCount>,
}

impl LandmarkFacts {
    /// Counts the landmarks of a study.
    #[must_use]
    pub fn of(study: &Study) -> LandmarkFacts {
        let landmarks = &study.landmarks;
        let list = landmarks.list();
        let named = |keep: &dyn Fn(&crate::domain::Landmark) -> bool| -> Vec<String> {
            let kept = list.iter().filter(|l| keep(l));
            kept.map(|l| l.name.clone()).collect()
        };
        let mut bases: Vec<BasisCount> = Vec::new();
        for Basis(basis) in list.iter().filter_map(|l| l.basis.as_ref()) {
            match bases.iter_mut().find(|known| known.basis == *basis) {
                Some(known) => known.landmarks += 1,
                None => bases.push(BasisCount {
                    basis: basis.clone(),
                    landmarks: 1,
                }),
            }
        }
        // Stable: equals keep the order of the table.
        bases.sort_by_key(|basis| std::cmp::Reverse(basis.landmarks));
        LandmarkFacts {
            count: landmarks.len(),
            blocks: landmarks.blocks(),
            shared_blocks: (0..landmarks.blocks())
                .map(|block| {
                    let name = landmarks.block_name(block).to_owned();
                    (name, named(&|l| l.block == block))
                })
                .filter(|(_, members)| members.len() > 1)
                .collect(),
            groups: named(&|l| Side::BOTH.into_iter().any(|side| l.parcels[side].len() > 1)),
            parcels: Pair::from_fn(|side| list.iter().map(|l| l.parcels[side].len()).sum()),
            weighted: list
                .iter()
                .filter(|l| l.weight.get() < 1.0)
                .map(|l| (l.name.clone(), l.weight.get()))
                .collect(),
            bases,
        }
    }
}
