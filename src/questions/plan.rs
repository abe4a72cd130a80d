//! Which landmarks are held out together.

use std::collections::BTreeSet;

use rand::seq::index::sample;
use thiserror::Error;

use crate::bootstrap::{Purpose, Stream};
use crate::domain::{Landmarks, Seed};
use crate::input::nearest_few;
use crate::settings::Axes;

/// What is asked to be held out.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum PlanRequest {
    /// Every block by itself.
    Each,
    /// The blocks of these landmarks, all at once; names of landmarks or of blocks.
    Named(Vec<String>),
    /// Sets of so many blocks: all of them, or as many as the budget allows, drawn by the seed.
    Subsets {
        /// Blocks in a set.
        size: usize,
        /// Most sets.
        budget: usize,
    },
}

/// Sets of blocks that are held out, each set in ascending order.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Sets {
    /// The sets.
    pub sets: Vec<Vec<usize>>,
    /// How many sets of this size there are, where only some were drawn.
    pub drawn_of: Option<u128>,
}

/// Landmarks that cannot be held out.
#[derive(Debug, Clone, PartialEq, Eq, Error)]
pub enum PlanError {
    /// A name that is neither a landmark's nor a block's.
    #[error("--leave must name landmarks or blocks of the landmark table; {found:?} is neither{}", hint(.near))]
    Unknown {
        /// The name.
        found: String,
        /// Near names.
        near: Vec<String>,
    },
    /// Nothing named.
    #[error("--leave names no landmark; name at least one, separated by commas")]
    Nothing,
    /// Too few blocks would remain.
    #[error("holding out {out} of {blocks} landmark blocks leaves {left}, and {needed} are needed{}; hold out fewer", for_axes(.axes))]
    TooMany {
        /// Blocks held out.
        out: usize,
        /// All blocks.
        blocks: usize,
        /// Blocks left.
        left: usize,
        /// Blocks needed.
        needed: usize,
        /// Number of axes, where that is why.
        axes: Option<usize>,
    },
    /// Sets without a block.
    #[error("--subsets must be at least 1")]
    Empty,
}

fn hint(near: &[String]) -> String {
    if near.is_empty() {
        return String::new();
    }
    let words: Vec<String> = near.iter().map(|word| format!("{word:?}")).collect();
    format!(" (did you mean {}?)", words.join(" or "))
}

fn for_axes(axes: &Option<usize>) -> String {
    axes.map_or_else(String::new, |axes| format!(" for {axes} axes"))
}

impl PlanRequest {
    /// Finds the sets, and checks that enough landmarks remain to be aligned at.
    ///
    /// # Errors
    /// [`PlanError`].
    pub fn sets(&self, landmarks: &Landmarks, axes: Axes, seed: Seed) -> Result<Sets, PlanError> {
        let blocks = landmarks.blocks();
        let all = |sets| Sets {
            sets,
            drawn_of: None,
        };
        let found = match self {
            PlanRequest::Each => all((0..blocks).map(|block| vec![block]).collect()),
            PlanRequest::Named(names) => all(vec![named(landmarks, names)?]),
            PlanRequest::Subsets { size: 0, .. } => return Err(PlanError::Empty),
            PlanRequest::Subsets { size, budget } => {
                enough(*size, blocks, axes)?;
                subsets(blocks, *size, *budget, seed)
            }
        };
        let largest = found.sets.iter().map(Vec::len).max().unwrap_or(0);
        if !matches!(self, PlanRequest::Each) {
            enough(largest, blocks, axes)?;
        }
        Ok(found)
    }
}

/// Whether a rerun without so many blocks is possible: one more must be spared to judge it by.
fn enough(out: usize, blocks: usize, axes: Axes) -> Result<(), PlanError> {
    let (needed, axes) = match axes {
        Axes::Number(axes) => ((axes + 1).max(Landmarks::FEWEST), Some(axes)),
        Axes::Auto => (Landmarks::FEWEST, None),
    };
    let left = blocks.saturating_sub(out);
    if left < needed {
        return Err(PlanError::TooMany {
            out,
            blocks,
            left,
            needed,
            axes: axes.filter(|axes| axes + 1 > Landmarks::FEWEST),
        });
    }
    Ok(())
}

fn named(landmarks: &Landmarks, names: &[String]) -> Result<Vec<usize>, PlanError> {
    let mut blocks = BTreeSet::new();
    for name in names {
        let landmark = landmarks.list().iter().find(|l| l.name == *name);
        let block = (0..landmarks.blocks()).find(|&b| landmarks.block_name(b) == name);
        match landmark.map(|l| l.block).or(block) {
            Some(block) => blocks.insert(block),
            None => {
                let known = landmarks.list().iter().map(|l| l.name.as_str());
                let known = known.chain((0..landmarks.blocks()).map(|b| landmarks.block_name(b)));
                let known: BTreeSet<&str> = known.collect();
                return Err(PlanError::Unknown {
                    found: name.clone(),
                    near: nearest_few(name, known)
                        .into_iter()
                        .map(str::to_owned)
                        .collect(),
                });
            }
        };
    }
    match blocks.is_empty() {
        true => Err(PlanError::Nothing),
        false => Ok(blocks.into_iter().collect()),
    }
}

/// All sets of `size` of `blocks`, in lexical order, where the budget allows; else so many different
/// ones drawn at random.
fn subsets(blocks: usize, size: usize, budget: usize, seed: Seed) -> Sets {
    let mut there_are: u128 = 1;
    for k in 0..size {
        there_are = there_are.saturating_mul((blocks - k) as u128) / (k as u128 + 1);
    }
    if there_are <= budget as u128 {
        let mut sets = Vec::new();
        let mut set: Vec<usize> = (0..size).collect();
        loop {
            sets.push(set.clone());
            // The last place that can still move on; those behind it follow.
            let Some(at) = (0..size).rev().find(|&at| set[at] < blocks - size + at) else {
                return Sets {
                    sets,
                    drawn_of: None,
                };
            };
            set[at] += 1;
            for next in at + 1..size {
                set[next] = set[next - 1] + 1;
            }
        }
    }
    let mut chance = Stream::new(seed, Purpose::HeldOutSets, size as u64);
    let mut sets = BTreeSet::new();
    while sets.len() < budget {
        let mut set = sample(&mut chance, blocks, size).into_vec();
        set.sort_unstable();
        sets.insert(set);
    }
    Sets {
        sets: sets.into_iter().collect(),
        drawn_of: Some(there_are),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn all_sets_where_the_budget_allows_else_different_ones_of_each() {
        let all = subsets(5, 2, 10, Seed(1));
        assert_eq!(all.sets.len(), 10);
        assert_eq!(all.sets[0], [0, 1]);
        assert_eq!(all.sets[9], [3, 4]);
        assert_eq!(all.drawn_of, None);
        let some = subsets(12, 3, 50, Seed(1));
        assert_eq!(some.drawn_of, Some(220));
        let different: BTreeSet<_> = some.sets.iter().collect();
        assert_eq!(different.len(), 50);
        assert!(some
            .sets
            .iter()
            .all(|s| s.len() == 3 && s[0] < s[1] && s[1] < s[2]));
        assert_eq!(some, subsets(12, 3, 50, Seed(1)));
        assert_ne!(some, subsets(12, 3, 50, Seed(2)));
    }
}
