//! Evidence that is too dear to be fitted again without every landmark: replicates that each do
//! without a third of the landmark blocks serve both the average and, for the blocks they lack, the
//! left-out figures (out of bag, as Breiman 1996 does for trees).

use ndarray::Array2;
use rand::seq::SliceRandom;
use rayon::prelude::*;

use super::trials::Questions;
use crate::bootstrap::{steady, Purpose, Stream};
use crate::domain::{Pair, Seed};
use crate::evidence::{Evidence, Material, Unavailable};
use crate::watch::{Interrupted, Watch};

/// Parts into which the blocks are divided; each is left out once.
const PARTS: usize = 3;
/// Fewest replicates: every block is then left out of eight.
pub const FEWEST_REPLICATES: usize = 8 * PARTS;

/// Replicates of costly evidence and their averages.
#[derive(Debug, Clone)]
pub struct OutOfBag {
    /// Mean dissimilarity over all replicates `(parcels of a, parcels of b)`.
    pub mean: Array2<f64>,
    /// Mean shares, where the evidence carries mass.
    pub shares: Option<Pair<Array2<f64>>>,
    /// For each block the mean dissimilarity over the replicates that do without it.
    pub without: Vec<Array2<f64>>,
    /// For each landmark the mean shares of its asked members over the replicates that do without
    /// its block: over b's parcels from a's member, over a's parcels from b's member.
    pub asked: Vec<Pair<Vec<f64>>>,
    /// Each replicate's dissimilarities between open parcels.
    pub each: Vec<Array2<f32>>,
}

/// One replicate.
struct Replicate {
    dissimilarities: Array2<f64>,
    shares: Option<Pair<Array2<f64>>>,
}

/// Blocks that a replicate does without. Of three replicates in a row each leaves out another third.
fn left_out(seed: Seed, replicate: usize, blocks: usize) -> Vec<usize> {
    let mut chance = Stream::new(seed, Purpose::OutOfBag, (replicate / PARTS) as u64);
    let mut order: Vec<usize> = (0..blocks).collect();
    order.shuffle(&mut chance);
    let part = replicate % PARTS;
    order.into_iter().skip(part).step_by(PARTS).collect()
}

/// Runs the replicates; `members` take turns so that each meets every third of the blocks.
///
/// # Errors
/// [`Interrupted`] where the watch says so; within it [`Unavailable`] where the study does not have
/// what the evidence needs.
pub fn out_of_bag(
    material: &Material<'_>,
    members: &[&dyn Evidence],
    replicates: usize,
    questions: &Questions<'_>,
    watch: &dyn Watch,
) -> Result<Result<OutOfBag, Unavailable>, Interrupted> {
    let Questions {
        open, asked, seed, ..
    } = *questions;
    let landmarks = material.landmarks;
    let blocks = landmarks.blocks();
    let every = material
        .species
        .map(|species| (0..species.parcels.len()).collect::<Vec<_>>());
    let size = (every.a.len(), every.b.len());
    let one = |replicate: usize| {
        let out = left_out(seed, replicate, blocks);
        let mut chance = Stream::new(seed, Purpose::OutOfBagWeights, replicate as u64);
        let mut by_block = steady(blocks, &mut chance);
        for block in out {
            by_block[block] = 0.0;
        }
        let member = members[(replicate % PARTS + replicate / PARTS) % members.len()];
        let weights = material.weights(|block| by_block[block]);
        let mut chance = Stream::new(seed, Purpose::OutOfBagFit, replicate as u64);
        let fitted = member.fit(material, &weights, &mut chance)?;
        let mut dissimilarities = Array2::zeros(size);
        fitted.dissimilarities(&every.a, &every.b, &mut dissimilarities);
        Ok(Replicate {
            dissimilarities,
            shares: fitted.shares().map(|shares| shares.map(Clone::clone)),
        })
    };

    watch.begin("transport replicates", replicates);
    let mut found = OutOfBag {
        mean: Array2::zeros(size),
        shares: None,
        without: vec![Array2::zeros(size); blocks],
        asked: (0..landmarks.len())
            .map(|_| Pair {
                a: vec![0.0; size.1],
                b: vec![0.0; size.0],
            })
            .collect(),
        each: Vec::with_capacity(replicates),
    };
    let mut lacking = vec![0.0; blocks];
    let indices: Vec<usize> = (0..replicates).collect();
    for wave in indices.chunks(4 * rayon::current_num_threads()) {
        let done: Vec<Option<Result<Replicate, Unavailable>>> = wave
            .par_iter()
            .map(|&replicate| {
                let result = (!watch.interrupted()).then(|| one(replicate));
                watch.advance(1);
                result
            })
            .collect();
        // Sums run in the order of the replicates, whoever made them.
        for (&replicate, result) in wave.iter().zip(done) {
            let Some(result) = result else {
                watch.end();
                return Err(Interrupted);
            };
            let Replicate {
                dissimilarities,
                shares,
            } = match result {
                Ok(replicate) => replicate,
                Err(unavailable) => {
                    watch.end();
                    return Ok(Err(unavailable));
                }
            };
            let out = left_out(seed, replicate, blocks);
            for &block in &out {
                found.without[block] += &dissimilarities;
                lacking[block] += 1.0;
            }
            found.mean += &dissimilarities;
            found.each.push(Array2::from_shape_fn(
                (open.a.len(), open.b.len()),
                |(i, j)| dissimilarities[(open.a[i], open.b[j])] as f32,
            ));
            if let Some(shares) = shares {
                for (at, landmark) in landmarks.list().iter().enumerate() {
                    if out.contains(&landmark.block) {
                        let members = asked.of(at);
                        add(&mut found.asked[at].a, shares.a.row(members.a).iter());
                        add(&mut found.asked[at].b, shares.b.column(members.b).iter());
                    }
                }
                match &mut found.shares {
                    Some(sum) => {
                        sum.a += &shares.a;
                        sum.b += &shares.b;
                    }
                    none => *none = Some(shares),
                }
            }
        }
    }
    watch.end();
    let count = replicates as f64;
    found.mean /= count;
    if let Some(shares) = &mut found.shares {
        shares.a /= count;
        shares.b /= count;
    }
    for (without, count) in found.without.iter_mut().zip(&lacking) {
        *without /= *count;
    }
    for (landmark, shares) in landmarks.list().iter().zip(&mut found.asked) {
        let count = lacking[landmark.block];
        for share in shares.a.iter_mut().chain(&mut shares.b) {
            *share /= count;
        }
    }
    Ok(Ok(found))
}

fn add<'x>(to: &mut [f64], values: impl Iterator<Item = &'x f64>) {
    for (sum, x) in to.iter_mut().zip(values) {
        *sum += x;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn of_three_replicates_each_block_is_left_out_of_one() {
        for blocks in [3, 4, 12, 16] {
            for triple in 0..5 {
                let mut times = vec![0; blocks];
                for part in 0..PARTS {
                    let out = left_out(Seed(3), triple * PARTS + part, blocks);
                    assert!(blocks - out.len() >= 2);
                    out.into_iter().for_each(|block| times[block] += 1);
                }
                assert_eq!(times, vec![1; blocks]);
            }
        }
    }
}
