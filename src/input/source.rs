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

/// A file in memory as it stands on the disk. The checksum is of the very bytes that are parsed.
#[derive(Debug, Clone)]
pub struct Bytes {
    /// Where it was read and what it holds, for the run record.
    pub file: InputFile,
    /// What it holds.
    pub bytes: Vec<u8>,
}

impl Bytes {
    /// Reads a file of any kind.
    ///
    /// # Errors
    /// [`InputError`] for a missing file, a folder, or a file the system does not give.
    pub fn read(path: &Path) -> Result<Bytes, InputError> {
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
        Ok(Bytes::of(path, bytes))
    }

    /// Takes bytes for those of a file.
    #[must_use]
    pub fn of(path: &Path, bytes: Vec<u8>) -> Bytes {
        let sha256 = Sha256::digest(&bytes)
            .iter()
            .map(|b| format!("{b:02x}"))
            .collect();
        Bytes {
            file: InputFile {
                path: path.to_path_buf(),
                sha256,
            },
            bytes,
        }
    }
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
        Source::of(Bytes::read(path)?)
    }

    /// Takes bytes for text.
    ///
    /// # Errors
    /// [`InputError`] for an empty file or bytes that are no UTF-8 text.
    pub fn of(Bytes { file, bytes }: Bytes) -> Result<Source, InputError> {
        let path = &file.path;
        let body = bytes.strip_prefix(b"\xef\xbb\xbf").unwrap_or(&bytes);
        let line_of = |at: usize| 1 + body[..at].iter().filter(|b| **b == b'\n').count() as u64;
        let not_text =
            |at: usize| InputError::new(Place::line(path, line_of(at)), Problem::NotText(body[at]));
        if body.iter().all(u8::is_ascii_whitespace) {
            return Err(InputError::new(Place::file(path), Problem::EmptyFile));
        }
        if body.starts_with(b"\xff\xfe") || body.starts_with(b"\xfe\xff") {
            return Err(InputError::new(Place::file(path), Problem::Utf16));
        }
        if let Some(at) = body.iter().position(|b| *b == 0) {
            return Err(not_text(at));
        }
        let text = std::str::from_utf8(body).map_err(|e| not_text(e.valid_up_to()))?;
        // One kind of line end, so that lines are counted as an editor counts them.
        let text = if text.contains('\r') {
            text.replace("\r\n", "\n").replace('\r', "\n")
        } else {
            text.to_owned()
        };
        Ok(Source { file, text })
    }

    /// Path of the file.
    #[must_use]
    pub fn path(&self) -> &Path {
        &self.file.path
    }
}
