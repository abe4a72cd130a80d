//! One input file: its bytes, read once, and their checksum.

use std::path::{Path, PathBuf};

use serde::Serialize;
use sha2::{Digest, Sha256};

use super::error::{InputError, Place, Problem};

/// Path and SHA-256 of a file that a run has read.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct InputFile {
    /// Path as given, relative ones resolved against the study file's folder.
    pub path: PathBuf,
    /// SHA-256 of its bytes, in hexadecimal.
    pub sha256: String,
}

/// A text file in memory. The checksum is of the very bytes that are parsed.
#[derive(Debug, Clone)]
pub struct Source {
    /// Where it was read and what it holds, for the run record.
    pub file: InputFile,
    /// Its text, without a byte-order mark, lines ended by a line feed.
    pub text: String,
}

impl Source {
    /// Reads a text file.
    ///
    /// # Errors
    /// [`InputError`] for a missing file, a folder, an empty file, or bytes that are no UTF-8 text.
    pub fn read(path: &Path) -> Result<Source, InputError> {
        let fail = |problem| InputError::new(Place::file(path), problem);
        if path.is_dir() {
            return Err(fail(Problem::IsFolder));
        }
        let bytes = std::fs::read(path).map_err(|e| {
            fail(match e.kind() {
                std::io::ErrorKind::NotFound => Problem::NotFound,
                _ => Problem::Unreadable(e.to_string()),
            })
        })?;
        let sha256 = Sha256::digest(&bytes)
            .iter()
            .map(|b| format!("{b:02x}"))
            .collect();
        let body = bytes.strip_prefix(b"\xef\xbb\xbf").unwrap_or(&bytes);
        if body.iter().all(u8::is_ascii_whitespace) {
            return Err(fail(Problem::EmptyFile));
        }
        let line_of = |at: usize| 1 + body[..at].iter().filter(|b| **b == b'\n').count() as u64;
        if body.starts_with(b"\xff\xfe") || body.starts_with(b"\xfe\xff") {
            return Err(fail(Problem::Utf16));
        }
        if let Some(at) = body.iter().position(|b| *b == 0) {
            return Err(InputError::new(
                Place::line(path, line_of(at)),
                Problem::NotText(0),
            ));
        }
        match std::str::from_utf8(body) {
            Ok(text) => Ok(Source {
                file: InputFile {
                    path: path.to_path_buf(),
                    sha256,
                },
                // One kind of line end, so that lines are counted as an editor counts them.
                text: if text.contains('\r') {
                    text.replace("\r\n", "\n").replace('\r', "\n")
                } else {
                    text.to_owned()
                },
            }),
            Err(e) => {
                let at = e.valid_up_to();
                Err(InputError::new(
                    Place::line(path, line_of(at)),
                    Problem::NotText(body[at]),
                ))
            }
        }
    }

    /// Path of the file.
    #[must_use]
    pub fn path(&self) -> &Path {
        &self.file.path
    }
}
