//! A finished run to look at: one page that needs nothing but itself, and its figures as files.
//!
//! Everything comes from the tables and the record of the run ([`Model`]), so that `locate` and `report`
//! write the same bytes, and from nothing that differs between two runs of the same study.

mod data;
mod figures;
mod html;
mod model;

use std::path::{Path, PathBuf};

pub use figures::{figures, Figure, Layout};
pub use model::{Model, Standing};

use crate::finished::{Run, RunError};
use crate::report::{self, FilesError, FIGURES, PAGE};
use thiserror::Error;

/// Why there is no page.
#[derive(Debug, Error)]
pub enum PageError {
    /// A run that cannot be read.
    #[error(transparent)]
    Run(#[from] RunError),
    /// A page or figure that cannot be written.
    #[error(transparent)]
    Files(#[from] FilesError),
}

/// The page and the figures of a run: names within its folder, and bytes. Each ends with a seal that
/// tells whether it was changed by hand since.
///
/// # Errors
/// [`RunError`] for tables that were changed after the run.
pub fn files(run: &Run) -> Result<Vec<(&'static str, Vec<u8>)>, RunError> {
    let model = Model::of(run)?;
    let figures = figures(&model);
    let page = html::page(&model, &figures);
    let mut files = vec![(PAGE, report::sealed(page))];
    for (name, figure) in FIGURES.into_iter().zip(&figures) {
        debug_assert!(name.ends_with(&format!("/{}.svg", figure.name)));
        files.push((name, report::sealed(figure.file())));
    }
    Ok(files)
}

/// Writes the page and the figures of a finished run into its folder. Earlier ones are replaced, but not
/// those that were changed by hand, unless `replace` says so.
///
/// # Errors
/// [`PageError`] for a folder that holds no finished run, tables that were changed, and files that
/// must not be replaced; then nothing has changed.
pub fn write(folder: &Path, replace: bool) -> Result<Vec<PathBuf>, PageError> {
    let files = files(&Run::read(folder)?)?;
    Ok(report::write_derived(folder, &files, replace)?)
}

/// Writes the page of a run anew where it has one, after an answer was added to it. A page that was
/// changed by hand is left as it is.
///
/// # Errors
/// [`PageError`] as for [`write()`].
pub fn refresh(folder: &Path) -> Result<(), PageError> {
    if !folder.join(PAGE).exists() {
        return Ok(());
    }
    match write(folder, false) {
        Err(PageError::Files(FilesError::Edited(_) | FilesError::NotOurs(_))) => Ok(()),
        written => written.map(|_| ()),
    }
}
