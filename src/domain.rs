//! What the program speaks about: species, parcels, connectivities, landmarks. No files, no maths.

mod attributes;
mod choice;
mod connectivity;
mod geometry;
mod hemisphere;
mod landmarks;
mod orientation;
mod parcels;
mod scalars;
mod side;
mod weights;

pub use attributes::{Attributes, Extent};
pub(crate) use choice::choices;
pub use choice::{Choice, UnknownChoice};
pub use connectivity::{Connectivity, ShapeError};
pub use geometry::{DistanceSource, Geometry};
pub use hemisphere::{Hemisphere, Hemispheres};
pub use landmarks::{Basis, Landmark, LandmarkError, Landmarks};
pub use orientation::{RowsAre, Tracer};
pub use parcels::{Parcels, Standing};
pub use scalars::{ScalarError, Seed, Share};
pub use side::{Pair, Side};
pub use weights::{Transform, WeightKind};
