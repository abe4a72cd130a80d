//! Labels of a matrix in a file of their own, one a line.

use std::path::Path;

use super::error::{InputError, Place};
use super::grid::Label;
use super::source::{InputFile, Source};

/// Labels and the file they were read from.
#[derive(Debug, Clone)]
pub struct LabelFile {
    /// The file.
    pub file: InputFile,
    /// The labels, in the order of the rows they belong to.
    pub labels: Vec<Label>,
}

/// Reads labels, one a line. A line is a label as it stands, without the blanks around it and a pair
/// of double quotes. Blank lines at the end do not count.
///
/// # Errors
/// [`InputError`] where the file is no text.
pub fn read(path: &Path) -> Result<LabelFile, InputError> {
    let source = Source::read(path)?;
    Ok(LabelFile {
        labels: labels_of(&source),
        file: source.file,
    })
}

/// The labels in a text.
#[must_use]
pub fn labels_of(source: &Source) -> Vec<Label> {
    source
        .text
        .trim_end()
        .lines()
        .zip(1..)
        .map(|(line, at)| Label {
            text: unquoted(line.trim()),
            place: Place::line(source.path(), at),
        })
        .collect()
}

fn unquoted(line: &str) -> String {
    match line.strip_prefix('"').and_then(|l| l.strip_suffix('"')) {
        Some(inner) => inner.replace("\"\"", "\""),
        None => line.to_owned(),
    }
}
