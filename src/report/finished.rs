//! The record of a finished run, read again.

use std::path::{Path, PathBuf};

use serde_json::Value;
use thiserror::Error;

use super::run_folder::{RECORD, UNFINISHED};

/// Why a folder has no record to read.
#[derive(Debug, Error)]
pub enum RecordError {
    /// A folder without a run.
    #[error("{}: expected the folder of a finished run, but {why}; name the folder that kinmark locate wrote with --out", folder.display())]
    NotARun {
        /// The folder.
        folder: PathBuf,
        /// What is wrong with it.
        why: String,
    },
    /// A run in progress, or one that was killed.
    #[error("{}: the run in it is not finished; wait for it, or run kinmark locate again", .0.display())]
    Unfinished(PathBuf),
}

/// Reads the record of a folder with a finished run of this program.
///
/// # Errors
/// [`RecordError`] for a folder that holds none.
pub fn read_record(folder: &Path) -> Result<Value, RecordError> {
    let not_a_run = |why: String| RecordError::NotARun {
        folder: folder.to_owned(),
        why,
    };
    if !folder.exists() {
        return Err(not_a_run("there is no such folder".to_owned()));
    }
    if !folder.is_dir() {
        return Err(not_a_run("it is a file".to_owned()));
    }
    let path = folder.join(RECORD);
    if !path.exists() {
        return Err(match folder.join(UNFINISHED).exists() {
            true => RecordError::Unfinished(folder.to_owned()),
            false => not_a_run(format!("it holds no {RECORD}")),
        });
    }
    let bytes = std::fs::read(&path)
        .map_err(|e| not_a_run(format!("its {RECORD} cannot be read ({e})")))?;
    let record: Value = serde_json::from_slice(&bytes)
        .map_err(|e| not_a_run(format!("its {RECORD} is no JSON ({e})")))?;
    if record["program"] != env!("CARGO_PKG_NAME") {
        return Err(not_a_run(format!("its {RECORD} is of another program")));
    }
    Ok(record)
}
