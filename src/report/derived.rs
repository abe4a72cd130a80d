//! The page and the figures of a run: derived from its tables, so that they can be written again at any
//! time, unless somebody has worked on them since.

use std::io;
use std::path::{Path, PathBuf};

use sha2::{Digest, Sha256};
use thiserror::Error;

use super::map_folder::{write_files, Hold, MapsError};

/// The page of a run.
pub const PAGE: &str = "report.html";
/// The folder of its figures.
pub const FIGURES_FOLDER: &str = "figures";
/// Its figures.
pub const FIGURES: [&str; 6] = [
    "figures/left-out.svg",
    "figures/counterparts.svg",
    "figures/joint-space.svg",
    "figures/axes.svg",
    "figures/landmarks.svg",
    "figures/matrix.svg",
];

/// What stands around the checksum of a seal; a comment in HTML and in SVG.
const BEFORE: &str = concat!(
    "<!-- ",
    env!("CARGO_PKG_NAME"),
    ": SHA-256 of everything before this line "
);
const AFTER: &str = " -->\n";

/// Why a page or a figure could not be written.
#[derive(Debug, Error)]
pub enum FilesError {
    /// Changed since it was written.
    #[error("{} was changed since kinmark wrote it, and is kept; move it to another folder, or add --replace to replace it", .0.display())]
    Edited(PathBuf),
    /// A file that is none of this program's.
    #[error("{} was not written by kinmark; it is left untouched. Move it to another folder", .0.display())]
    NotOurs(PathBuf),
    /// The operating system said no.
    #[error("cannot {doing} {}: {source}; check permissions and free space", .path.display())]
    System {
        /// What was tried.
        doing: &'static str,
        /// On what.
        path: PathBuf,
        /// Why not.
        source: io::Error,
    },
}

/// A text of markup with a last line that tells whether it was changed since.
#[must_use]
pub fn sealed(mut text: String) -> Vec<u8> {
    if !text.ends_with('\n') {
        text.push('\n');
    }
    let seal = checksum(text.as_bytes());
    text += BEFORE;
    text += &seal;
    text += AFTER;
    text.into_bytes()
}

fn checksum(bytes: &[u8]) -> String {
    let digest = Sha256::digest(bytes);
    digest.iter().map(|byte| format!("{byte:02x}")).collect()
}

/// How a file that is there may be replaced.
fn hold(there: &[u8]) -> Hold {
    let text = String::from_utf8_lossy(there);
    let Some(at) = text.rfind(BEFORE) else {
        return Hold::Never;
    };
    let is_whole = text[at + BEFORE.len()..] == (checksum(&text.as_bytes()[..at]) + AFTER);
    match is_whole {
        true => Hold::Freely,
        false => Hold::UnlessAsked,
    }
}

/// Writes files that are derived from the tables of a run into its folder, all of them complete before
/// the first takes its place.
///
/// # Errors
/// [`FilesError`] where a file was changed by hand and `replace` does not say to replace it, is none of
/// this program's, or the system refuses; then none has changed.
pub fn write_derived(
    run: &Path,
    files: &[(&'static str, Vec<u8>)],
    replace: bool,
) -> Result<Vec<PathBuf>, FilesError> {
    let files: Vec<(String, Vec<u8>)> = files
        .iter()
        .map(|(name, bytes)| ((*name).to_owned(), bytes.clone()))
        .collect();
    write_files(run, &files, replace, &|there, _| hold(there)).map_err(|error| match error {
        MapsError::Exists(path) => FilesError::Edited(path),
        MapsError::System {
            doing,
            path,
            source,
        } => FilesError::System {
            doing,
            path,
            source,
        },
        MapsError::NotAFolder(path)
        | MapsError::InRun(path)
        | MapsError::Foreign(path)
        | MapsError::OtherTable(path) => FilesError::NotOurs(path),
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_seal_tells_what_was_changed() {
        let whole = sealed("<svg></svg>".to_owned());
        assert_eq!(hold(&whole), Hold::Freely);
        let text = String::from_utf8(whole).unwrap();
        assert_eq!(
            hold(text.replace("svg", "SVG").as_bytes()),
            Hold::UnlessAsked
        );
        assert_eq!(hold((text + "more").as_bytes()), Hold::UnlessAsked);
        assert_eq!(hold(b"<svg></svg>"), Hold::Never);
        assert_eq!(hold(b""), Hold::Never);
    }
}
