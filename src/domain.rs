//! What the program speaks about: species, parcels, connectivities, landmarks. No files, no maths.

mod choice;
mod connectivity;
mod landmarks;
mod orientation;
mod parcels;
mod scalars;
mod side;
mod weights;

pub(crate) use choice::choices;
pub use choice::{Choice, UnknownChoice};
pub use connectivity::{Connectivity, ShapeError};
pub use landmarks::{Basis, Landmark, LandmarkError, Landmarks};
pub use orientation::{RowsAre, Tracer};
pub use parcels::{Parcels, Standing};
pub use scalars::{ScalarError, Seed, Share};
pub use side::{Pair, Side};
pub use weights::{Transform, WeightKind};
