//! Landmarks left out: where their counterparts come, and which choices that favours.

mod choose;
mod contradiction;
mod trials;

pub use choose::{choose, Choice, Curve, Point};
pub use contradiction::contradicted;
pub use trials::{run, Asked, Placed, Trials, Way};
