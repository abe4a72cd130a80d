//! Decompositions with fixed signs, and the small change around them.

mod eigen;
mod kernel;
mod median;
mod sign;
mod small;
mod spearman;

pub use eigen::largest_eigenpairs;
pub use kernel::{count_below, first_least, keep_least, least_difference, squared_distances};
pub use median::median;
pub use sign::{fix_signs, leading_entry};
pub use small::{from_small, principal_root_inverse, small_svd, SmallSvd};
pub use spearman::spearman;
