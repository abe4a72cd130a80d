//! Replicates in fixed blocks by index: workers own whole blocks, sums run in the blocks' order, so
//! that the number of workers changes no bit.

use rayon::prelude::*;

use crate::watch::{Interrupted, Watch};

/// Replicates in a block.
pub const BLOCK: usize = 20;

/// Runs `step` for replicates `0..replicates` and adds up what it collects.
///
/// Every block starts from `start()`; `add` receives the blocks in order of index. At most a few
/// blocks for each worker are held at once. `scratch()` makes what the replicates of a block may
/// reuse and nothing is kept of.
///
/// # Errors
/// [`Interrupted`] where the watch says so between blocks.
pub fn accumulate<T: Send, S>(
    replicates: usize,
    watch: &dyn Watch,
    start: impl Fn() -> T + Sync,
    scratch: impl Fn() -> S + Sync,
    step: impl Fn(&mut T, &mut S, usize) + Sync,
    mut add: impl FnMut(&mut T, T),
) -> Result<T, Interrupted> {
    let mut total = start();
    let blocks: Vec<usize> = (0..replicates).step_by(BLOCK).collect();
    for wave in blocks.chunks(2 * rayon::current_num_threads()) {
        if watch.interrupted() {
            return Err(Interrupted);
        }
        let done: Vec<T> = wave
            .par_iter()
            .map(|&first| {
                let (mut block, mut scratch) = (start(), scratch());
                for replicate in first..(first + BLOCK).min(replicates) {
                    step(&mut block, &mut scratch, replicate);
                    watch.advance(1);
                }
                block
            })
            .collect();
        for block in done {
            add(&mut total, block);
        }
    }
    Ok(total)
}
