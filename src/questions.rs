//! Questions to a study beyond where its parcels fall: what its landmarks are worth, held out.

mod held_out;
mod influence;
mod permuted;
mod plan;
mod rate;

pub use held_out::{hold_out, Figures, HeldOut, HeldOutLandmark};
pub use influence::{Influence, Moved};
pub use permuted::{permute, Permuted};
pub use plan::{PlanError, PlanRequest, Sets};
pub use rate::{by_chance, wilson, Estimate, LEVEL};
