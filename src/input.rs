//! Files to domain types. Every fault names file, line, column and parcel, and says what to do.

mod delimited;
mod distances;
mod error;
mod formats;
mod gifti;
mod grid;
mod label_file;
mod landmark_table;
mod matrix;
mod nearest;
mod pair_table;
mod parcel_fault;
mod parcel_table;
mod recognise;
mod sides;
mod source;
mod study_file;
mod subjects;

pub use distances::{read as read_distances, Distances};
pub use error::{InputError, Place, Problem};
pub use formats::{Fault, Inflated};
pub use gifti::{read as read_surface_labels, GiftiFault, SurfaceLabels};
pub use landmark_table::read as read_landmarks;
pub use matrix::{read as read_matrix, read_of as read_matrix_of, Matrix};
pub use nearest::{nearest, nearest_few};
pub use pair_table::{read as read_pairs, NamedPair};
pub use parcel_fault::ParcelFault;
pub use parcel_table::{read as read_parcels, ParcelTable};
pub use recognise::{
    is_binary, recognise, Form, LandmarkLooks, Looks, MatrixLooks, ParcelLooks, Pick,
};
pub use sides::{differ_only_by_side, without_side, SideMark};
pub use source::{Bytes, InputFile, Source};
pub use study_file::{read as read_study_file, SpeciesFile, StudyFile};
pub use subjects::{read as read_subjects, Subject, SubjectFiles};
