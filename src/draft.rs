//! A first study file for the files of a folder: what each is guessed to be, with the reasons.

mod account;
mod guess;
mod labels;
mod names;
mod roles;
mod text;

pub use guess::{guess, Guess};

use std::io::Write;
use std::path::{Path, PathBuf};

use thiserror::Error;

use crate::domain::{Pair, Transform};
use crate::input::{Form, InputError, Pick};

/// The file that is written.
pub const STUDY_FILE: &str = "study.toml";
/// Files named in a message before the rest is left out.
const NAMED: usize = 4;

/// Why no study file was written.
#[derive(Debug, Error)]
pub enum DraftError {
    /// No such folder.
    #[error("{}: there is no such folder; name the folder that holds your matrices", .0.display())]
    NotFound(PathBuf),
    /// A file stands where a folder was expected.
    #[error("{}: expected a folder, found a file; name the folder that holds your matrices", .0.display())]
    NotAFolder(PathBuf),
    /// The system refused to list it.
    #[error("{}: cannot be listed: {reason}", folder.display())]
    Unlisted {
        /// The folder.
        folder: PathBuf,
        /// What the system said.
        reason: String,
    },
    /// There is a study file already.
    #[error("{}: there is a study file already, which is left as it is; look at it with kinmark inspect, or remove it first", .0.display())]
    Exists(PathBuf),
    /// Nothing that looks like a matrix.
    #[error("{}: found no matrix; expected square matrices as tables (.csv, .tsv, .txt), lists of connections, NumPy (.npy, .npz), MATLAB (.mat) or .pconn.nii files{}", folder.display(), reasons(looked_at))]
    NoMatrix {
        /// The folder.
        folder: PathBuf,
        /// Files in it and why each is no matrix.
        looked_at: Vec<(String, String)>,
    },
    /// The file could not be written.
    #[error("{}: cannot be written: {reason}", file.display())]
    Unwritten {
        /// The file.
        file: PathBuf,
        /// What the system said.
        reason: String,
    },
}

fn reasons(looked_at: &[(String, String)]) -> String {
    let named: Vec<String> = looked_at
        .iter()
        .take(NAMED)
        .map(|(name, why)| format!("{name:?}: {why}"))
        .collect();
    match looked_at.len() {
        0 => ", and found no such file at all".to_owned(),
        n if n > NAMED => format!(". {}. And {} more", named.join(". "), n - NAMED),
        _ => format!(". {}", named.join(". ")),
    }
}

/// A matrix that was found.
#[derive(Debug, Clone, PartialEq)]
pub struct FoundMatrix {
    /// Name of the file in the folder.
    pub file: String,
    /// How it is stored.
    pub form: Form,
    /// Its rows.
    pub rows: usize,
    /// Labels of its rows, its own or from a file; none where there are none.
    pub labels: Vec<String>,
    /// The file of its labels, where it needs one and one was found.
    pub label_file: Option<FoundLabels>,
    /// Whether it needs a file of labels that was not found.
    pub lacks_labels: bool,
    /// Array that is the matrix, where the file must be told.
    pub variable: Option<Pick>,
    /// Array that holds the labels, where the file must be told.
    pub label_variable: Option<Pick>,
    /// What its weights seem to be.
    pub guess: Guess,
    /// How such weights are transformed by default; unknown where it cannot be read yet.
    pub transform: Option<Transform>,
    /// What keeps it from being read.
    pub fault: Option<InputError>,
}

/// A file of labels that was found.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct FoundLabels {
    /// Name of the file in the folder.
    pub file: String,
    /// The labels.
    pub labels: Vec<String>,
    /// Files that fit as well, where only their order decided.
    pub others: Vec<String>,
}

/// A landmark table that was found.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct FoundLandmarks {
    /// Name of the file in the folder.
    pub file: String,
    /// Rows below the header.
    pub rows: usize,
    /// Parcels it names that the matrix has, and all it names.
    pub known: Pair<(usize, usize)>,
}

/// A table of parcels that was found.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct FoundParcels {
    /// Name of the file in the folder.
    pub file: String,
    /// Parcels it describes that the matrix has, and all it describes.
    pub known: (usize, usize),
}

/// One species of the draft.
#[derive(Debug, Clone, PartialEq)]
pub struct DraftSpecies {
    /// Its name, from the name of the file.
    pub name: String,
    /// Its matrix, where one was found.
    pub matrix: Option<FoundMatrix>,
    /// The table of its parcels, where one was found.
    pub parcels: Option<FoundParcels>,
}

/// A study file to be, and what it rests on.
#[derive(Debug, Clone, PartialEq)]
pub struct Draft {
    /// Both species.
    pub species: Pair<DraftSpecies>,
    /// The landmark table, where one was found.
    pub landmarks: Option<FoundLandmarks>,
    /// Files that are not used, and why.
    pub unused: Vec<(String, String)>,
}

/// Looks at the files of a folder and guesses their roles. Writes nothing.
///
/// # Errors
/// [`DraftError`] for a folder that is none, that has a study file already, or without a matrix.
pub fn draft(folder: &Path) -> Result<Draft, DraftError> {
    if !folder.exists() {
        return Err(DraftError::NotFound(folder.to_path_buf()));
    }
    if !folder.is_dir() {
        return Err(DraftError::NotAFolder(folder.to_path_buf()));
    }
    let file = folder.join(STUDY_FILE);
    if file.symlink_metadata().is_ok() {
        return Err(DraftError::Exists(file));
    }
    roles::assign(folder)
}

impl Draft {
    /// The study file, with every guess explained and every setting in a comment.
    #[must_use]
    pub fn study_file(&self) -> String {
        text::study_file(self)
    }

    /// What was guessed and what comes next, for people; the study file stands at `file`.
    #[must_use]
    pub fn account(&self, file: &Path) -> String {
        account::account(self, file)
    }

    /// Writes the study file to a folder, never over another, and says where it is.
    ///
    /// # Errors
    /// [`DraftError`] where there is one already, or the system refuses.
    pub fn write(&self, folder: &Path) -> Result<PathBuf, DraftError> {
        let file = folder.join(STUDY_FILE);
        let unwritten = |e: std::io::Error| match e.kind() {
            std::io::ErrorKind::AlreadyExists => DraftError::Exists(file.clone()),
            _ => DraftError::Unwritten {
                file: file.clone(),
                reason: e.to_string(),
            },
        };
        std::fs::OpenOptions::new()
            .write(true)
            .create_new(true)
            .open(&file)
            .and_then(|mut open| open.write_all(self.study_file().as_bytes()))
            .map_err(unwritten)?;
        Ok(file)
    }
}
