//! What can stop a run, and the exit code it maps to.

use thiserror::Error;

use crate::draft::DraftError;
use crate::input::InputError;
use crate::page::PageError;
use crate::paint::PaintError;
use crate::questions::{AskError, PlanError};
use crate::reopen::ReopenError;
use crate::report::{FolderError, MapsError};
use crate::watch::Interrupted;

/// Anything that stops a run.
#[derive(Debug, Error)]
pub enum Error {
    /// A fault in the input.
    #[error(transparent)]
    Input(#[from] InputError),
    /// A folder that cannot take the run.
    #[error(transparent)]
    Folder(#[from] FolderError),
    /// A folder for which no study file can be drafted.
    #[error(transparent)]
    Draft(#[from] DraftError),
    /// A run or a surface that cannot be painted.
    #[error(transparent)]
    Paint(#[from] PaintError),
    /// A run that cannot be shown.
    #[error(transparent)]
    Page(#[from] PageError),
    /// A run that cannot be asked anything.
    #[error(transparent)]
    Reopen(#[from] ReopenError),
    /// Landmarks that cannot be held out.
    #[error(transparent)]
    Plan(#[from] PlanError),
    /// A pair that cannot be checked.
    #[error(transparent)]
    Ask(#[from] AskError),
    /// Tables that cannot be added to a run.
    #[error(transparent)]
    Files(#[from] MapsError),
    /// Told to stop.
    #[error("interrupted; nothing was written")]
    Interrupted(#[from] Interrupted),
    /// No worker threads could be started.
    #[error("cannot start {threads} worker threads: {source}; ask for fewer with --threads")]
    Threads {
        /// Threads asked for.
        threads: usize,
        /// Why not.
        source: rayon::ThreadPoolBuildError,
    },
}

impl Error {
    /// The exit code of the program: 2 for input, usage or file system, 130 when interrupted. (A
    /// fault of the program itself panics, and ends with 1.)
    #[must_use]
    pub fn exit_code(&self) -> u8 {
        match self {
            Error::Input(_)
            | Error::Folder(_)
            | Error::Draft(_)
            | Error::Paint(_)
            | Error::Page(_)
            | Error::Reopen(_)
            | Error::Plan(_)
            | Error::Ask(_)
            | Error::Files(_)
            | Error::Threads { .. } => 2,
            Error::Interrupted(_) => 130,
        }
    }
}
