//! Files compressed by gzip, and how far anything compressed may grow.

use std::io::Read;

use flate2::read::MultiGzDecoder;

use super::Fault;
use crate::input::error::{InputError, Place};
use crate::input::source::Bytes;

/// How far compressed bytes may grow. A small file that claims to hold a large matrix would
/// otherwise fill the memory.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Inflated {
    /// The most bytes they may become.
    pub most: u64,
}

impl Inflated {
    /// Every file may become as large as this.
    const ALWAYS: u64 = 16 << 20;
    /// Growth by more has no matrix with connections in it; deflate itself reaches 1032.
    const TIMES: u64 = 1000;
    /// No file may become larger than this.
    const NEVER: u64 = 4 << 30;

    /// The bound for so many compressed bytes.
    #[must_use]
    pub fn of(compressed: usize) -> Inflated {
        let grown = (compressed as u64).saturating_mul(Inflated::TIMES);
        Inflated {
            most: grown.clamp(Inflated::ALWAYS, Inflated::NEVER),
        }
    }
}

/// Inflates a file; its checksum stays that of the compressed bytes.
///
/// # Errors
/// [`InputError`] for damage and for more bytes than [`Inflated`] allows.
pub fn inflate(file: Bytes) -> Result<Bytes, InputError> {
    let fail = |fault: Fault| InputError::new(Place::file(&file.file.path), fault.into());
    let allowed = Inflated::of(file.bytes.len());
    let mut bytes = Vec::new();
    MultiGzDecoder::new(file.bytes.as_slice())
        .take(allowed.most + 1)
        .read_to_end(&mut bytes)
        .map_err(|e| fail(Fault::Damaged(e.to_string())))?;
    if bytes.len() as u64 > allowed.most {
        return Err(fail(Fault::InflatesBeyond(allowed)));
    }
    Ok(Bytes {
        file: file.file,
        bytes,
    })
}
