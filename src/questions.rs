//! Questions to a study beyond where its parcels fall: what its landmarks are worth, held out.

mod check;
mod held_out;
mod influence;
mod permuted;
mod plan;
mod rate;

pub use check::{
    check, conformal, further, rule, without_blocks, AskError, CheckRequest, Checked, CheckedPair,
    Contrast, Further, Ground, Grounds, Lean, Lie, Nearer, Question, Ruling, Selected, Separation,
    Usual, Variation, Verdict, View,
};
pub use held_out::{hold_out, Figures, HeldOut, HeldOutLandmark};
pub use influence::{Influence, Moved};
pub use permuted::{permute, Permuted};
pub use plan::{PlanError, PlanRequest, Sets};
pub use rate::{by_chance, wilson, Estimate, LEVEL};
