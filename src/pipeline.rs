//! Locate, or ask a question, then report: in that order, nothing else.

use std::path::{Path, PathBuf};
use std::time::Instant;

use crate::error::Error;
use crate::finished::{Run, RunError};
use crate::locate::locate;
use crate::page;
use crate::prepare::Study;
use crate::questions::{self, CheckRequest, PlanRequest};
use crate::reopen::Reopened;
use crate::report::{self, AnswerRecord, Identity, Record, RunFolder, Survey, Wall};
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
    let pool = workers(&study)?;
    let located = pool.install(|| locate(&study, watch))?;
    if watch.interrupted() {
        return Err(Interrupted.into());
    }
    let wall = wall(&pool, started);
    let record = Record::new(&study, &located, wall).json();
    let tables = report::tables(&study, &located);
    let page = if study.conduct.no_report {
        Ok(Vec::new())
    } else {
        page_of(folder.path(), &record, &tables)
    };
    // A run is not lost for want of its page.
    let (page, fault) = match page {
        Ok(page) => (page, None),
        Err(error) => (Vec::new(), Some(Warning::NoPage(error.to_string()))),
    };
    let folder = folder.finish(&[tables, page].concat(), &record)?;
    Ok(Finished {
        summary: report::summary(&study, &located),
        warnings: study
            .warnings
            .into_iter()
            .chain(located.warnings)
            .chain(fault)
            .collect(),
        folder,
    })
}

/// The page and the figures of a run that is not in its folder yet.
fn page_of(
    folder: &Path,
    record: &[u8],
    tables: &[NamedBytes],
) -> Result<Vec<NamedBytes>, RunError> {
    page::files(&Run::of_unwritten(folder, record, tables)?)
}

/// A file within a run: its name and what it holds.
type NamedBytes = (&'static str, Vec<u8>);

/// Worker threads for a study.
fn workers(study: &Study) -> Result<rayon::ThreadPool, Error> {
    let threads = study.conduct.threads;
    rayon::ThreadPoolBuilder::new()
        .num_threads(threads)
        .build()
        .map_err(|source| Error::Threads { threads, source })
}

/// What a command took so far.
fn wall(pool: &rayon::ThreadPool, started: Instant) -> Wall {
    Wall {
        threads: pool.current_num_threads(),
        wall_seconds: started.elapsed().as_secs_f64(),
    }
}

/// A question that was answered.
#[derive(Debug)]
pub struct Answered {
    /// The answer, for people.
    pub text: String,
    /// Every warning.
    pub warnings: Vec<Warning>,
    /// What is to be written, and where to.
    pub destination: Destination,
}

/// Where tables go that answer a question. They are complete, and nothing is written before
/// [`Destination::write`], so that the answer can be shown first.
#[derive(Debug)]
pub enum Destination {
    /// Nowhere.
    Nowhere,
    /// To the folder of the run that was asked.
    Run {
        /// The folder.
        folder: PathBuf,
        /// The tables.
        tables: Vec<(&'static str, Vec<u8>)>,
        /// Whether others may be replaced.
        replace: bool,
    },
    /// To a folder of their own.
    Folder {
        /// The folder.
        folder: Box<RunFolder>,
        /// The tables.
        tables: Vec<(&'static str, Vec<u8>)>,
        /// The record beside them.
        record: Vec<u8>,
    },
}

impl Destination {
    /// Writes the tables; returns the folder that holds them. The page of a run shows them from then on.
    ///
    /// # Errors
    /// [`Error`] where the folder does not take them; nothing that was there has then changed. Where only
    /// the page cannot be written anew, the tables are there all the same.
    pub fn write(self) -> Result<Option<PathBuf>, Error> {
        match self {
            Destination::Nowhere => Ok(None),
            Destination::Run {
                folder,
                tables,
                replace,
            } => {
                report::add_to_run(&folder, &tables, replace)?;
                page::refresh(&folder)?;
                Ok(Some(folder))
            }
            Destination::Folder {
                folder,
                tables,
                record,
            } => Ok(Some(folder.finish(&tables, &record)?)),
        }
    }
}

/// Holds landmarks out as `plan` says, and judges the pairing against `permutations` others. Tables go
/// to `out`; without it to the run that was asked, if one was.
///
/// # Errors
/// [`Error`] for landmarks that cannot be held out, a folder that cannot take the tables, or an
/// interruption.
pub fn hold_out(
    asked: Reopened,
    plan: &PlanRequest,
    permutations: usize,
    out: Option<&Path>,
    watch: &dyn Watch,
    started: Instant,
) -> Result<Answered, Error> {
    let Reopened { study, run } = asked;
    let sets = plan.sets(&study.landmarks, study.settings.axes, study.settings.seed)?;
    let folder = folder_for(&study, out)?;
    let pool = workers(&study)?;
    let found = pool.install(|| questions::hold_out(&study, plan, sets, permutations, watch))?;
    if watch.interrupted() {
        return Err(Interrupted.into());
    }
    let inspection = crate::inspect::inspect(&study);
    let text = report::held_out(&study, &found, &inspection);
    let tables = report::held_out_tables(&study, &found);
    let destination = match (folder, run) {
        (Some(folder), _) => {
            let wall = wall(&pool, started);
            let asked = report::held_out_json(&study, &found);
            let record = AnswerRecord::new(&study, asked, &found.warnings, &tables, wall).json();
            Destination::Folder {
                folder: Box::new(folder),
                tables,
                record,
            }
        }
        (None, Some(folder)) => Destination::Run {
            folder,
            tables,
            replace: study.conduct.replace,
        },
        (None, None) => Destination::Nowhere,
    };
    Ok(Answered {
        text,
        warnings: study.warnings.into_iter().chain(found.warnings).collect(),
        destination,
    })
}

/// A folder of its own for an answer, where one was named.
fn folder_for(study: &Study, out: Option<&Path>) -> Result<Option<RunFolder>, Error> {
    out.map(|out| {
        let survey = Survey::of(out, study.conduct.replace)?;
        Ok(survey.open(&Identity::of(study).json())?)
    })
    .transpose()
}

/// Ranks all parcels by how surely they correspond. The table goes to `out`, where that is given.
///
/// # Errors
/// [`Error`] for a folder that cannot take the table, or an interruption.
pub fn rank(
    asked: Reopened,
    out: Option<&Path>,
    watch: &dyn Watch,
    started: Instant,
) -> Result<Answered, Error> {
    let study = asked.study;
    let folder = folder_for(&study, out)?;
    let pool = workers(&study)?;
    let located = pool.install(|| locate(&study, watch))?;
    if watch.interrupted() {
        return Err(Interrupted.into());
    }
    let text = report::ranked(&study, &located);
    let destination = match folder {
        Some(folder) => {
            let tables = report::ranked_tables(&study, &located);
            let wall = wall(&pool, started);
            let asked = serde_json::json!({"command": "rank", "candidate-sets": located.set_level});
            let record = AnswerRecord::new(&study, asked, &located.warnings, &tables, wall).json();
            Destination::Folder {
                folder: Box::new(folder),
                tables,
                record,
            }
        }
        None => Destination::Nowhere,
    };
    Ok(Answered {
        text,
        warnings: study.warnings.into_iter().chain(located.warnings).collect(),
        destination,
    })
}

/// Checks whether the positions of named candidates are conserved. The table goes to `out`; without it to
/// the run that was asked, if one was, among the checks that stand there already.
///
/// # Errors
/// [`Error`] for parcels that cannot be checked, a folder that cannot take the table, or an
/// interruption.
pub fn check(
    asked: Reopened,
    request: &CheckRequest,
    as_json: bool,
    out: Option<&Path>,
    watch: &dyn Watch,
    started: Instant,
) -> Result<Answered, Error> {
    let Reopened { study, run } = asked;
    let questions = request.questions(&study)?;
    let folder = folder_for(&study, out)?;
    let pool = workers(&study)?;
    let found = pool.install(|| questions::check(&study, &questions, watch))?;
    if watch.interrupted() {
        return Err(Interrupted.into());
    }
    let text = match as_json {
        true => String::from_utf8_lossy(&report::checked_json(&study, &found)).into_owned(),
        false => report::checked(&study, &found),
    };
    let mut warnings: Vec<Warning> = Vec::new();
    for warning in found.iter().flat_map(|answer| &answer.warnings) {
        if !warnings.contains(warning) {
            warnings.push(warning.clone());
        }
    }
    let mut tables = report::checked_tables(&study, &found);
    let destination = match (folder, run) {
        (Some(folder), _) => {
            let wall = wall(&pool, started);
            let asked = serde_json::json!({"command": "check", "questions": found.len()});
            let record = AnswerRecord::new(&study, asked, &warnings, &tables, wall).json();
            Destination::Folder {
                folder: Box::new(folder),
                tables,
                record,
            }
        }
        (None, Some(folder)) => {
            for (name, bytes) in &mut tables {
                let new = std::mem::take(bytes);
                *bytes = report::with_earlier_rows(&folder, name, new, report::CHECK_KEY)?;
            }
            Destination::Run {
                folder,
                tables,
                // Earlier checks are among the rows, so nothing is lost.
                replace: true,
            }
        }
        (None, None) => Destination::Nowhere,
    };
    Ok(Answered {
        text,
        warnings: study.warnings.into_iter().chain(warnings).collect(),
        destination,
    })
}
