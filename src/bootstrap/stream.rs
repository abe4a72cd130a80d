//! One random stream for each (seed, purpose, index), so that a new use of chance never changes the
//! numbers of an old one and replicates can be computed in any order.

use rand::{RngCore, SeedableRng};
use rand_xoshiro::Xoshiro256PlusPlus;
use sha2::{Digest, Sha256};

use crate::domain::Seed;

/// What a stream is drawn for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Purpose {
    /// Weights of landmark blocks in a bootstrap replicate.
    LandmarkWeights,
    /// Which member of a landmark is asked when it is left out.
    AskedMember,
    /// Chance inside a kind of evidence, in a replicate.
    Evidence,
    /// Chance inside a kind of evidence, with landmarks left out.
    EvidenceLeftOut,
    /// Which individuals are drawn, in a replicate of one species.
    Subjects,
    /// Which blocks of landmarks costly evidence does without, in three replicates.
    OutOfBag,
    /// Weights of the blocks it keeps, in a replicate.
    OutOfBagWeights,
    /// Chance inside it, in a replicate.
    OutOfBagFit,
    /// Which landmark is paired with which, where pairings are permuted.
    PermutedPairs,
    /// The same, where axes are judged.
    PermutedAxes,
    /// Which sets of landmark blocks are held out.
    HeldOutSets,
    /// Which landmark stands for its block where blocks are counted.
    StandsForBlock,
}

impl Purpose {
    fn name(self) -> &'static str {
        match self {
            Purpose::LandmarkWeights => "landmark weights",
            Purpose::AskedMember => "asked member",
            Purpose::Evidence => "evidence",
            Purpose::EvidenceLeftOut => "evidence left out",
            Purpose::Subjects => "subjects",
            Purpose::OutOfBag => "out of bag",
            Purpose::OutOfBagWeights => "out of bag weights",
            Purpose::OutOfBagFit => "out of bag fit",
            Purpose::PermutedPairs => "permuted pairs",
            Purpose::PermutedAxes => "permuted axes",
            Purpose::HeldOutSets => "held-out sets",
            Purpose::StandsForBlock => "stands for block",
        }
    }
}

/// A random stream.
#[derive(Debug, Clone)]
pub struct Stream(Xoshiro256PlusPlus);

impl Stream {
    /// The stream of one seed, purpose and index: a xoshiro256++ generator seeded with the SHA-256
    /// of the three.
    #[must_use]
    pub fn new(seed: Seed, purpose: Purpose, index: u64) -> Stream {
        let mut hash = Sha256::new();
        hash.update(seed.0.to_le_bytes());
        hash.update(purpose.name().as_bytes());
        hash.update(index.to_le_bytes());
        Stream(Xoshiro256PlusPlus::from_seed(hash.finalize().into()))
    }
}

impl RngCore for Stream {
    fn next_u32(&mut self) -> u32 {
        self.0.next_u32()
    }

    fn next_u64(&mut self) -> u64 {
        self.0.next_u64()
    }

    fn fill_bytes(&mut self, dest: &mut [u8]) {
        self.0.fill_bytes(dest);
    }

    fn try_fill_bytes(&mut self, dest: &mut [u8]) -> Result<(), rand::Error> {
        self.0.try_fill_bytes(dest)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_part_of_the_key_matters_and_the_rest_does_not() {
        let first = |seed, purpose, index| Stream::new(Seed(seed), purpose, index).next_u64();
        let one = first(1, Purpose::LandmarkWeights, 0);
        assert_eq!(one, first(1, Purpose::LandmarkWeights, 0));
        assert_ne!(one, first(2, Purpose::LandmarkWeights, 0));
        assert_ne!(one, first(1, Purpose::AskedMember, 0));
        assert_ne!(one, first(1, Purpose::LandmarkWeights, 1));
    }
}
