//! Is a named candidate's position conserved? Two tests and a guard against selection, three answers.

mod agreement;
mod answer;
mod ask;
mod contrast;
mod further;
mod ground;
mod lean;
mod nearer;
mod ruling;
mod selected;
mod separation;
mod spot;
mod view;

pub use agreement::Variation;
pub use answer::{check, Checked, CheckedPair};
pub use ask::{AskError, CheckRequest, Question};
pub use contrast::Contrast;
pub use further::{further, Further};
pub use ground::{without_blocks, Ground};
pub use lean::Lean;
pub use nearer::Nearer;
pub use ruling::{rule, Grounds, Ruling, Verdict};
pub use selected::{Lie, Selected};
pub use separation::{conformal, Separation, Usual};
pub use view::View;
