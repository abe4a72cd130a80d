//! Seeded draws, replicates in blocks, and what is summed over them. Knows no alignment.

mod blocks;
mod interval;
mod resample;
mod spread;
mod stream;

pub use blocks::{accumulate, BLOCK};
pub use interval::{interval, interval_of, LEVEL};
pub use resample::{steady, Resampling};
pub use spread::Spread;
pub use stream::{Purpose, Stream};
