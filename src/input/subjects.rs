//! Matrices of individuals: which files they are, and all of them read alike.

use std::path::{Path, PathBuf};

use super::error::{InputError, Place, Problem};
use super::formats::stack;
use super::matrix::{Matrix, Reader};
use super::source::Bytes;
use super::study_file::SpeciesFile;

/// Endings of files that may hold a matrix; a folder of subjects often holds notes beside them.
const ENDINGS: [&str; 7] = ["csv", "tsv", "txt", "npy", "npz", "mat", "nii"];
/// Characters that make a path a pattern.
const WILD: [char; 3] = ['*', '?', '['];

/// Where the matrices of individuals are, as a study file says.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum SubjectFiles {
    /// A folder, a pattern, or one array of three axes.
    Path(PathBuf),
    /// Files one by one.
    List(Vec<PathBuf>),
}

/// One individual.
#[derive(Debug, Clone)]
pub struct Subject {
    /// Its name: that of its file, or its number in a stack.
    pub name: String,
    /// Its matrix.
    pub matrix: Matrix,
}

impl SubjectFiles {
    /// A path to name in messages.
    #[must_use]
    pub fn path(&self) -> &Path {
        match self {
            SubjectFiles::Path(path) => path,
            SubjectFiles::List(files) => files.first().map_or(Path::new(""), PathBuf::as_path),
        }
    }
}

/// Reads the matrices of all individuals of a species.
///
/// # Errors
/// [`InputError`] where there is no such file or fewer than two, or where one of them cannot be read.
pub fn read(described: &SpeciesFile, files: &SubjectFiles) -> Result<Vec<Subject>, InputError> {
    let reader = Reader::new(described)?;
    let files = match files {
        SubjectFiles::List(files) => files.clone(),
        SubjectFiles::Path(path) if path.is_dir() => in_folder(path)?,
        SubjectFiles::Path(path) if !path.exists() && is_pattern(path) => matching(path)?,
        SubjectFiles::Path(path) => {
            let bytes = Bytes::read(path)?;
            let file = bytes.file.clone();
            return stack::read(&bytes)?
                .into_iter()
                .zip(1..)
                .map(|(grid, at)| {
                    Ok(Subject {
                        name: format!("subject {at}"),
                        matrix: reader.grid(grid, file.clone())?,
                    })
                })
                .collect();
        }
    };
    files
        .iter()
        .map(|file| {
            Ok(Subject {
                name: file
                    .file_name()
                    .unwrap_or(file.as_os_str())
                    .to_string_lossy()
                    .into_owned(),
                matrix: reader.file(file)?,
            })
        })
        .collect()
}

fn is_pattern(path: &Path) -> bool {
    path.to_string_lossy().contains(WILD)
}

/// Files of a folder that may hold a matrix, in order of their names.
fn in_folder(folder: &Path) -> Result<Vec<PathBuf>, InputError> {
    let unreadable = |e: std::io::Error| {
        InputError::new(Place::file(folder), Problem::Unreadable(e.to_string()))
    };
    let mut files = Vec::new();
    for entry in std::fs::read_dir(folder).map_err(unreadable)? {
        let path = entry.map_err(unreadable)?.path();
        if path.is_file() && may_hold_matrix(&path) {
            files.push(path);
        }
    }
    files.sort();
    some(files, folder)
}

/// Whether a file's name is that of a matrix: not hidden, and of a known ending, perhaps compressed.
fn may_hold_matrix(path: &Path) -> bool {
    let name = path
        .file_name()
        .map_or_else(String::new, |name| name.to_string_lossy().to_lowercase());
    let plain = name.strip_suffix(".gz").unwrap_or(&name);
    !name.starts_with('.')
        && plain
            .rsplit_once('.')
            .is_some_and(|(_, ending)| ENDINGS.contains(&ending))
}

/// Files whose path fits a pattern, in order.
fn matching(pattern: &Path) -> Result<Vec<PathBuf>, InputError> {
    let place = || Place::file(pattern);
    let found = glob::glob(&pattern.to_string_lossy())
        .map_err(|e| InputError::new(place(), Problem::BadPattern(e.msg.to_owned())))?;
    let mut files = Vec::new();
    for path in found {
        let path =
            path.map_err(|e| InputError::new(place(), Problem::Unreadable(e.error().to_string())))?;
        if path.is_file() {
            files.push(path);
        }
    }
    files.sort();
    some(files, pattern)
}

fn some(files: Vec<PathBuf>, place: &Path) -> Result<Vec<PathBuf>, InputError> {
    if files.is_empty() {
        return Err(InputError::new(Place::file(place), Problem::NoSubjects));
    }
    Ok(files)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn notes_beside_the_matrices_are_no_subjects() {
        for (name, is) in [
            ("s1.csv", true),
            ("S1_relmat.TSV.gz", true),
            ("s1.pconn.nii", true),
            ("s1.json", false),
            (".s1.csv", false),
            ("README", false),
        ] {
            assert_eq!(may_hold_matrix(Path::new(name)), is, "{name}");
        }
    }
}
