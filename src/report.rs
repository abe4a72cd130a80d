//! Results to bytes: tables, the run record, the summary, and the folder they go into. Computes
//! nothing that a table does not show.

mod answers;
mod checked;
mod derived;
mod finished;
mod gifti;
mod held_out;
mod inspection;
mod map_folder;
mod ranked;
mod record;
mod run_folder;
mod summary;
mod tables;

pub use answers::{add_to_run, with_earlier_rows, AnswerRecord};
pub use checked::{checked, checked_json, checked_tables, CHECK_KEY};
pub use derived::{sealed, write_derived, FilesError, FIGURES, PAGE};
pub use finished::{read_record, RecordError};
pub use gifti::{gifti, SurfaceMap};

pub use held_out::{held_out, held_out_json, held_out_tables};
pub use inspection::{inspection, inspection_json};
pub use map_folder::{keep_out_of_run, write_maps, MapsError};
pub use ranked::{ranked, ranked_tables};
pub use record::{Identity, Record, Wall};
pub use run_folder::{FolderError, RunFolder, Survey, ANSWERS, RECORD, TABLES, UNFINISHED};
pub use summary::{summary, CAUTION};
pub use tables::tables;
