//! Decompositions with fixed signs, and the small change around them.

mod eigen;
mod sign;
mod small;

pub use eigen::largest_eigenpairs;
pub use sign::{fix_signs, leading_entry};
pub use small::{from_small, principal_root_inverse, small_svd, SmallSvd};
