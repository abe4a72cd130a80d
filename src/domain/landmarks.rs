//! Landmarks: groups of parcels, one in each species, assumed homologous.

use serde::Serialize;
use thiserror::Error;

use super::{Pair, Share, Side};

/// What the assumption of homology rests on.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
#[serde(transparent)]
pub struct Basis(pub String);

impl Basis {
    /// Whether the landmark was chosen because of connectivity, or nobody says why: then agreement
    /// found in connectivity is partly put in by hand.
    #[must_use]
    pub fn is_circular(&self) -> bool {
        self.0.is_empty() || self.0.eq_ignore_ascii_case("connectivity")
    }
}

/// One landmark: parcels of a and of b that are taken for the same part of the brain.
#[derive(Debug, Clone, PartialEq)]
pub struct Landmark {
    /// Name from the landmark table.
    pub name: String,
    /// Parcels of each species, as indices into its parcels; never empty.
    pub parcels: Pair<Vec<usize>>,
    /// How much the fit trusts it, in (0, 1].
    pub weight: Share,
    /// Block it belongs to: landmarks of one block are left out together.
    pub block: usize,
    /// What the homology rests on, where the table has that column.
    pub basis: Option<Basis>,
}

/// A set of landmarks that breaks a rule every later step relies on.
#[derive(Debug, Clone, PartialEq, Eq, Error)]
pub enum LandmarkError {
    /// Fewer than the three that fix a plane.
    #[error("{found} landmarks, at least {needed} are needed")]
    TooFew {
        /// Landmarks given.
        found: usize,
        /// Landmarks needed.
        needed: usize,
    },
    /// A landmark without a parcel on one side.
    #[error("landmark {name:?} names no parcel of species {}", side.letter())]
    Empty {
        /// The landmark.
        name: String,
        /// The species without a parcel.
        side: Side,
    },
    /// One parcel in two landmarks.
    #[error("landmarks {first:?} and {second:?} share a parcel of species {}", side.letter())]
    Shared {
        /// The landmark that came first.
        first: String,
        /// The landmark that came later.
        second: String,
        /// The species of the parcel.
        side: Side,
    },
}

/// The landmarks of a study, checked: at least three, none empty, no parcel in two of them, blocks
/// numbered from 0 without gaps.
#[derive(Debug, Clone, PartialEq)]
pub struct Landmarks {
    list: Vec<Landmark>,
    block_names: Vec<String>,
}

impl Landmarks {
    /// Fewest landmarks that any alignment is fitted to.
    pub const FEWEST: usize = 3;

    /// Checks a list of landmarks whose `block` fields index `block_names`.
    ///
    /// # Errors
    /// [`LandmarkError`] where a rule is broken.
    ///
    /// # Panics
    /// If a block index lies outside `block_names`: a fault of the caller, not of the input.
    pub fn new(list: Vec<Landmark>, block_names: Vec<String>) -> Result<Self, LandmarkError> {
        if list.len() < Self::FEWEST {
            return Err(LandmarkError::TooFew {
                found: list.len(),
                needed: Self::FEWEST,
            });
        }
        assert!(list.iter().all(|l| l.block < block_names.len()));
        for side in Side::BOTH {
            let mut owner = std::collections::BTreeMap::new();
            for landmark in &list {
                if landmark.parcels[side].is_empty() {
                    return Err(LandmarkError::Empty {
                        name: landmark.name.clone(),
                        side,
                    });
                }
                for &parcel in &landmark.parcels[side] {
                    if let Some(first) = owner.insert(parcel, &landmark.name) {
                        return Err(LandmarkError::Shared {
                            first: first.clone(),
                            second: landmark.name.clone(),
                            side,
                        });
                    }
                }
            }
        }
        Ok(Landmarks { list, block_names })
    }

    /// The landmarks of other blocks, these numbered anew.
    ///
    /// # Errors
    /// [`LandmarkError::TooFew`] where too few remain.
    pub fn without(&self, blocks: &[usize]) -> Result<Landmarks, LandmarkError> {
        let stay: Vec<usize> = (0..self.blocks()).filter(|b| !blocks.contains(b)).collect();
        let list = self
            .list
            .iter()
            .filter_map(|landmark| {
                let block = stay.binary_search(&landmark.block).ok()?;
                Some(Landmark {
                    block,
                    ..landmark.clone()
                })
            })
            .collect();
        let names = stay.iter().map(|&b| self.block_name(b).to_owned());
        Landmarks::new(list, names.collect())
    }

    /// The landmarks, in the order of the table.
    #[must_use]
    pub fn list(&self) -> &[Landmark] {
        &self.list
    }

    /// Number of landmarks.
    #[must_use]
    pub fn len(&self) -> usize {
        self.list.len()
    }

    /// Whether there is none; never true for a checked set.
    #[must_use]
    pub fn is_empty(&self) -> bool {
        self.list.is_empty()
    }

    /// Number of blocks: the number of independent landmarks.
    #[must_use]
    pub fn blocks(&self) -> usize {
        self.block_names.len()
    }

    /// Name of a block.
    #[must_use]
    pub fn block_name(&self, block: usize) -> &str {
        &self.block_names[block]
    }

    /// Which landmark a parcel belongs to, for every parcel of the species (`parcels` of them).
    #[must_use]
    pub fn owners(&self, side: Side, parcels: usize) -> Vec<Option<usize>> {
        let mut owners = vec![None; parcels];
        for (at, landmark) in self.list.iter().enumerate() {
            for &parcel in &landmark.parcels[side] {
                owners[parcel] = Some(at);
            }
        }
        owners
    }
}
