//! Landmarks whose pairing means nothing.

use rand::seq::SliceRandom;

use crate::bootstrap::Stream;
use crate::domain::{Landmark, Landmarks, Pair, Side};
use crate::place::Candidates;

/// Draws of a pairing that is admissible before one is given up.
const TRIES: usize = 200;

/// The landmarks with their parcels of b exchanged between blocks of as many landmarks, blocks changing
/// partners as a whole; every pairing alike likely of those that `candidates` admit. `None` where none
/// was found.
///
/// # Panics
/// Never: the parcels are those of checked landmarks.
#[must_use]
pub fn shuffled(
    landmarks: &Landmarks,
    candidates: &Candidates,
    chance: &mut Stream,
) -> Option<Landmarks> {
    let list = landmarks.list();
    let blocks: Vec<Vec<usize>> = (0..landmarks.blocks())
        .map(|block| {
            (0..list.len())
                .filter(|&at| list[at].block == block)
                .collect()
        })
        .collect();
    let largest = blocks.iter().map(Vec::len).max().unwrap_or(0);
    for _ in 0..TRIES {
        let mut partner: Vec<usize> = (0..list.len()).collect();
        for size in 1..=largest {
            let alike: Vec<&Vec<usize>> = blocks.iter().filter(|b| b.len() == size).collect();
            let mut order: Vec<usize> = (0..alike.len()).collect();
            order.shuffle(chance);
            for (own, &other) in alike.iter().zip(&order) {
                for (&at, &with) in own.iter().zip(alike[other]) {
                    partner[at] = with;
                }
            }
        }
        let paired: Vec<Landmark> = list
            .iter()
            .zip(&partner)
            .map(|(landmark, &with)| Landmark {
                parcels: Pair {
                    a: landmark.parcels.a.clone(),
                    b: list[with].parcels.b.clone(),
                },
                ..landmark.clone()
            })
            .collect();
        let is_admissible = |l: &Landmark| {
            let Pair { a, b } = &l.parcels;
            a.iter()
                .any(|&a| b.iter().any(|&b| candidates.admit(Side::A, a, b)))
        };
        if paired.iter().all(is_admissible) {
            let names = (0..landmarks.blocks()).map(|b| landmarks.block_name(b).to_owned());
            let checked = Landmarks::new(paired, names.collect());
            return Some(checked.expect("the parcels are the same as before"));
        }
    }
    None
}
