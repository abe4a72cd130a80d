//! Which landmarks a verdict leans on: the tests again without each block.

use super::ground::Ground;
use super::nearer::nearer;
use super::ruling::{Grounds, Ruling, Verdict};
use super::separation::{conformal, Separation};
use super::spot::strained;
use super::view::View;
use crate::domain::{Pair, Side};
use crate::evidence::Material;
use crate::locate::LeftOut;

/// The verdict without one block.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Lean {
    /// The block.
    pub block: usize,
    /// The verdict without it.
    pub verdict: Verdict,
    /// p of the test against homologous pairs, landmarks left out one by one.
    pub p_further: f64,
    /// p of the test against unrelated pairs.
    pub p_nearer: f64,
}

/// Rules on a pair without each block in turn. Number of axes and weights of kinds are chosen again;
/// the pair's interval keeps its width, and the search is compared with the other blocks' only.
#[must_use]
pub fn leans(ground: &Ground, from: Side, pair: Pair<usize>, ruling: &Ruling) -> Vec<Lean> {
    let Ground {
        study,
        located,
        view,
        ..
    } = ground;
    let material = Material::new(study.species.as_ref(), &study.landmarks);
    let width = ruling.separation.interval.1 - ruling.separation.own;
    (0..view.without.len())
        .map(|block| {
            let (stand, compared) = &view.without[block];
            let LeftOut { chosen, .. } = located.left_out[*stand];
            let seen = View {
                full: compared.clone(),
                without: Vec::new(),
            };
            let nearer = nearer(&seen, pair, &located.beyond, &study.candidates);
            let own = strained(&material, chosen, &[block], &[pair])[0];
            let left_out: Vec<f64> = (0..view.without.len())
                .filter(|&other| other != block)
                .map(|other| {
                    let asked = ground.asked.of(view.without[other].0);
                    strained(&material, chosen, &[block, other], &[asked])[0]
                })
                .collect();
            let p_further = conformal(own, &left_out);
            let separation = Separation {
                own,
                interval: (own, own + width),
                left_out,
                unrelated: strained(&material, chosen, &[block], &nearer.pairs),
            };
            let p_search = ruling.selected.p(from, Some(block));
            let grounds = Grounds::of(&study.settings, p_further, nearer.p, p_search, &separation);
            Lean {
                block,
                verdict: grounds.verdict(),
                p_further,
                p_nearer: nearer.p,
            }
        })
        .collect()
}
