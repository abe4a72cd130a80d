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

#[cfg(test)]
mod tests {
    use super::*;
    use crate::bootstrap::Purpose;
    use crate::domain::{Hemisphere, Seed, Share};

    fn landmarks(blocks: &[usize]) -> Landmarks {
        let list = blocks.iter().enumerate().map(|(at, &block)| Landmark {
            name: at.to_string(),
            parcels: Pair {
                a: vec![at],
                b: vec![at],
            },
            weight: Share::ALL,
            block,
            basis: None,
        });
        let most = blocks.iter().max().unwrap();
        let names = (0..=*most).map(|block| block.to_string());
        Landmarks::new(list.collect(), names.collect()).unwrap()
    }

    fn partners(blocks: &[usize], candidates: &Candidates, draw: u64) -> Option<Vec<usize>> {
        let mut chance = Stream::new(Seed(1), Purpose::PermutedPairs, draw);
        let found = shuffled(&landmarks(blocks), candidates, &mut chance)?;
        Some(found.list().iter().map(|l| l.parcels.b[0]).collect())
    }

    #[test]
    fn blocks_change_partners_as_a_whole() {
        let mut seen = std::collections::BTreeMap::new();
        for draw in 0..600 {
            let found = partners(&[0, 0, 1, 1, 2, 3, 4], &Candidates::everywhere(), draw).unwrap();
            assert!(matches!(found[..4], [0, 1, 2, 3] | [2, 3, 0, 1]));
            *seen.entry(found).or_insert(0_u32) += 1;
        }
        // Two orders of the pairs and six of the single ones, alike likely: 50 each, give or take 5
        // standard deviations of a binomial.
        assert_eq!(seen.len(), 12);
        let spread = 5.0 * (600.0_f64 / 12.0 * 11.0 / 12.0).sqrt();
        assert!(seen.values().all(|&n| (f64::from(n) - 50.0).abs() < spread));
    }

    #[test]
    fn sides_are_kept_where_they_must_be() {
        use Hemisphere::{Left, Right};
        let sides = || vec![Some(Left), Some(Left), Some(Right), Some(Right)];
        let candidates = Candidates::same_side(Pair {
            a: sides(),
            b: sides(),
        });
        for draw in 0..50 {
            let found = partners(&[0, 1, 2, 3], &candidates, draw).unwrap();
            assert!(found[..2].iter().all(|b| *b < 2), "{found:?}");
        }
    }
}
