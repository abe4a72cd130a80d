//! Results to bytes: tables, the run record, the summary, and the folder they go into. Computes
//! nothing that a table does not show.

mod gifti;
mod inspection;
mod map_folder;
mod record;
mod run_folder;
mod summary;
mod tables;

pub use gifti::{gifti, SurfaceMap};
pub use inspection::{inspection, inspection_json};
pub use map_folder::{keep_out_of_run, write_maps, MapsError};
pub use record::{Identity, Record, Wall};
pub use run_folder::{FolderError, RunFolder, Survey, RECORD, TABLES, UNFINISHED};
pub use summary::{summary, CAUTION};
pub use tables::tables;
