//! Landmarks left out: where their counterparts come, and which choices that favours.

mod choose;
mod contradiction;
mod mixture;
mod out_of_bag;
mod trials;
mod without;

pub use choose::{choose, errors_of_embeddings, Choice, Curve, Point};
pub use contradiction::contradicted;
pub use mixture::{leave_out, placed_out_of_bag, weigh, Blend, FirstOf, LeftOutOfMixture, Member};
pub use out_of_bag::{out_of_bag, OutOfBag, FEWEST_REPLICATES};
pub use trials::{joint_ways, place_each, place_one, run, Asked, Placed, Questions, Trials, Way};
pub use without::{Compared, Ranked};
