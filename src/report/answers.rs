//! Answers to questions about a study: added to the folder of its run, or a folder of their own.

use std::path::{Path, PathBuf};

use serde::Serialize;
use serde_json::Value;

use super::map_folder::{write_files, Hold, MapsError};
use super::record::json;
use super::tables::Table;
use super::{Identity, Wall};
use crate::prepare::Study;
use crate::warning::Warning;

/// The record of answers that stand in a folder of their own.
#[derive(Debug, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct AnswerRecord<'s> {
    #[serde(flatten)]
    identity: Identity<'s>,
    title: &'s str,
    /// The command, and what it was told beside the settings.
    asked: Value,
    warnings: Vec<&'s Warning>,
    files: Vec<&'s str>,
    #[serde(flatten)]
    wall: Wall,
    caution: &'static str,
}

impl<'s> AnswerRecord<'s> {
    /// The record of answers in `files`.
    #[must_use]
    pub fn new(
        study: &'s Study,
        asked: Value,
        warnings: &'s [Warning],
        files: &'s [(&'static str, Vec<u8>)],
        wall: Wall,
    ) -> AnswerRecord<'s> {
        AnswerRecord {
            identity: Identity::of(study),
            title: &study.title,
            asked,
            warnings: study.warnings.iter().chain(warnings).collect(),
            files: files.iter().map(|(name, _)| *name).collect(),
            wall,
            caution: super::CAUTION,
        }
    }

    /// The record as JSON.
    #[must_use]
    pub fn json(&self) -> Vec<u8> {
        json(self)
    }
}

/// Adds tables to the folder of a finished run. One that is there with the same bytes stays; one that
/// differs is replaced only where that was asked for, and only if it has the same header.
///
/// # Errors
/// [`MapsError`] where a file must not be replaced or the system refuses; then none has changed.
pub fn add_to_run(
    run: &Path,
    tables: &[(&'static str, Vec<u8>)],
    replace: bool,
) -> Result<Vec<PathBuf>, MapsError> {
    let files: Vec<(String, Vec<u8>)> = tables
        .iter()
        .map(|(name, bytes)| ((*name).to_owned(), bytes.clone()))
        .collect();
    let header =
        |bytes: &[u8]| -> Vec<u8> { bytes.iter().copied().take_while(|b| *b != b'\n').collect() };
    write_files(run, &files, replace, &|there, new| {
        Hold::of_ours(header(there) == header(new))
    })
    .map_err(|error| match error {
        MapsError::Foreign(path) => MapsError::OtherTable(path),
        other => other,
    })
}

/// A table with the rows that stand in the run already, except those that the new ones replace: rows alike
/// in the first `key` cells. A table with another header is left to [`add_to_run`], which refuses it.
///
/// # Errors
/// [`MapsError`] where the table is there and cannot be read.
pub fn with_earlier_rows(
    run: &Path,
    name: &str,
    new: Vec<u8>,
    key: usize,
) -> Result<Vec<u8>, MapsError> {
    let path = run.join(name);
    let there = match std::fs::read(&path) {
        Ok(bytes) => bytes,
        Err(error) if error.kind() == std::io::ErrorKind::NotFound => return Ok(new),
        Err(source) => {
            return Err(MapsError::System {
                doing: "read",
                path,
                source,
            })
        }
    };
    let rows = |bytes: &[u8]| -> Option<Vec<csv::StringRecord>> {
        csv::ReaderBuilder::new()
            .has_headers(false)
            .from_reader(bytes)
            .into_records()
            .collect::<Result<_, _>>()
            .ok()
    };
    let (Some(earlier), Some(added)) = (rows(&there), rows(&new)) else {
        return Ok(new);
    };
    if earlier.first() != added.first() {
        return Ok(new);
    }
    let is_replaced = |row: &csv::StringRecord| {
        let same = |other: &csv::StringRecord| other.iter().take(key).eq(row.iter().take(key));
        added.iter().any(same)
    };
    let mut table = Table::new(added.first().into_iter().flatten());
    let kept = earlier.iter().skip(1).filter(|row| !is_replaced(row));
    for row in kept.chain(added.iter().skip(1)) {
        table.row(row);
    }
    Ok(table.bytes())
}
