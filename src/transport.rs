//! Transport between two networks: which mass of one goes to which mass of the other. Knows no
//! species and no landmarks.

mod carried;
mod gromov;
mod masses;
mod simplex;
mod structure;

pub use carried::{agreement, shares_of};
pub use gromov::{Coupling, Fused, Marginals};
pub use masses::{Mass, Masses, UNIT};
pub use simplex::{Flow, Transportation};
pub use structure::{Structure, Structures};
