//! Locate, then report: in that order, nothing else.

use std::path::{Path, PathBuf};
use std::time::Instant;

use crate::error::Error;
use crate::locate::locate;
use crate::prepare::Study;
use crate::report::{self, Identity, Record, RunFolder, Survey, Wall};
use crate::warning::Warning;
use crate::watch::{Interrupted, Watch};

/// A finished run.
#[derive(Debug)]
pub struct Finished {
    /// The answers, for people.
    pub summary: String,
    /// Every warning.
    pub warnings: Vec<Warning>,
    /// Where the tables are.
    pub folder: PathBuf,
}

/// Runs the whole job on a study that [`prepare`](crate::prepare::prepare) has read: places every
/// parcel and writes the tables to `out`. Wall time is counted from `started`.
///
/// ```
/// use std::{path::Path, time::Instant};
/// use kinmark::{pipeline, prepare::prepare, settings::Request, watch::Unwatched};
///
/// let started = Instant::now();
/// let mut asked = Request::default();
/// asked.set("replicates", "50").unwrap();
/// let study = prepare(Path::new("species-demo/study.toml"), asked).unwrap();
/// let out = tempfile::tempdir().unwrap();
/// let run = pipeline::run(study, &out.path().join("run"), &Unwatched, started).unwrap();
/// assert!(run.folder.join("counterparts.csv").exists());
/// ```
///
/// # Errors
/// [`Error`] for a folder that cannot take the run, or an interruption; nothing that was there
/// before has then changed.
pub fn run(
    study: Study,
    out: &Path,
    watch: &dyn Watch,
    started: Instant,
) -> Result<Finished, Error> {
    let survey = Survey::of(out, study.conduct.replace)?;
    let folder: RunFolder = survey.open(&Identity::of(&study).json())?;
    let threads = study.conduct.threads;
    let pool = rayon::ThreadPoolBuilder::new()
        .num_threads(threads)
        .build()
        .map_err(|source| Error::Threads { threads, source })?;
    let located = pool.install(|| locate(&study, watch))?;
    if watch.interrupted() {
        return Err(Interrupted.into());
    }
    let wall = Wall {
        threads: pool.current_num_threads(),
        wall_seconds: started.elapsed().as_secs_f64(),
    };
    let record = Record::new(&study, &located, wall).json();
    let folder = folder.finish(&report::tables(&study, &located), &record)?;
    Ok(Finished {
        summary: report::summary(&study, &located),
        warnings: study.warnings.into_iter().chain(located.warnings).collect(),
        folder,
    })
}
