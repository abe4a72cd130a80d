//! What is to be painted.

use std::path::{Path, PathBuf};

use super::PaintError;
use crate::finished::RunError;
use crate::report::RecordError;

/// What is to be painted, of which run, and where to.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct PaintRequest {
    /// Folder of a finished run.
    pub run: PathBuf,
    /// The species whose surfaces the label files describe: its name, or `a` or `b`.
    pub species: String,
    /// GIFTI label files of that species, one for each surface.
    pub labels: Vec<PathBuf>,
    /// Parcels of the other species whose counterparts are painted.
    pub parcels: Vec<String>,
    /// Alignment whose axes are painted; that of the distances where none is named.
    pub alignment: Option<String>,
    /// Folder for the maps; that of the run with `-maps` behind its name where none is named.
    pub out: Option<PathBuf>,
    /// Whether maps that are there already may be replaced.
    pub replace: bool,
}

impl PaintRequest {
    /// The folder for the maps.
    pub(super) fn folder(&self) -> Result<PathBuf, PaintError> {
        if let Some(out) = &self.out {
            return Ok(out.clone());
        }
        let named = |run: &Path| {
            let name = run.file_name()?.to_string_lossy().into_owned();
            Some(run.with_file_name(format!("{name}-maps")))
        };
        // A path such as `.` gets its name from the system.
        named(&self.run)
            .or_else(|| named(&self.run.canonicalize().ok()?))
            .ok_or_else(|| {
                RunError::from(RecordError::NotARun {
                    folder: self.run.clone(),
                    why: "there is no such folder".to_owned(),
                })
                .into()
            })
    }
}
