//! The folder of a run: absent or empty, unfinished, finished, or somebody else's.
//!
//! A run is prepared in a folder beside its target and renamed into place when it is complete, so
//! that at no moment a half-written table can be taken for a result, and an earlier run is never
//! touched before the new one is whole. A kill between the two renames is repaired at the next start.

use std::fs::{self, File};
use std::io::{self, Write};
use std::path::{Path, PathBuf};

use thiserror::Error;

use super::derived::{FIGURES, FIGURES_FOLDER, PAGE};

/// The record of a finished run, the last file to be written.
pub const RECORD: &str = "run.json";
/// What an unfinished run says about itself.
pub const UNFINISHED: &str = "unfinished.json";
/// The tables of a finished run.
pub const TABLES: [&str; 5] = [
    "positions.csv",
    "counterparts.csv",
    "landmarks.csv",
    "axes.csv",
    "parcels.csv",
];

/// Tables that answers to questions about a finished run add to its folder, or that are written alone.
pub const ANSWERS: [&str; 4] = ["holdout.csv", "influence.csv", "rank.csv", "checks.csv"];

/// Why a folder cannot take a run.
#[derive(Debug, Error)]
pub enum FolderError {
    /// A finished run that must not be lost.
    #[error("{} holds a finished run, which is kept; name another folder, or add --replace to replace it", .0.display())]
    Finished(PathBuf),
    /// An unfinished run of other input or settings.
    #[error("{} holds an unfinished run of other input, settings or version; name another folder, or add --replace to drop it", .0.display())]
    OtherUnfinished(PathBuf),
    /// A run that is being written at this moment.
    #[error("another run is writing into {} at this moment; wait for it or name another folder", .0.display())]
    InUse(PathBuf),
    /// Files that are no part of a run.
    #[error("{} holds {found:?}, which is no part of a run, and is left untouched; name a new or empty folder", .folder.display())]
    Foreign {
        /// The folder.
        folder: PathBuf,
        /// One of the files.
        found: String,
    },
    /// A file where the folder should be.
    #[error("{} is not a folder; name a folder, or a place where there is nothing yet", .0.display())]
    NotAFolder(PathBuf),
    /// A path without a name, such as `..`.
    #[error("{} does not name a folder of its own; name a new one", .0.display())]
    NoName(PathBuf),
    /// The root of a mounted file system, which cannot be renamed.
    #[error("{} is where a file system is mounted; name a folder inside it, such as {}", .0.display(), .0.join("run").display())]
    MountPoint(PathBuf),
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

/// Wraps an operating-system error with what was tried.
fn on<'p>(doing: &'static str, path: &'p Path) -> impl FnOnce(io::Error) -> FolderError + 'p {
    move |source| FolderError::System {
        doing,
        path: path.to_owned(),
        source,
    }
}

/// What stands at a path before a run.
#[derive(Debug, Clone, PartialEq, Eq)]
enum State {
    Absent,
    Empty,
    Unfinished,
    Finished,
}

/// A target that can take a run; nothing has been created yet.
#[derive(Debug)]
pub struct Survey {
    target: PathBuf,
    state: State,
    replace: bool,
}

impl Survey {
    /// Looks at the target, and repairs what a kill at the very end of an earlier run left behind.
    ///
    /// # Errors
    /// [`FolderError`] where the target cannot take a run.
    pub fn of(target: &Path, replace: bool) -> Result<Survey, FolderError> {
        let target = match target.canonicalize() {
            Ok(real) => real,
            Err(_) => target.to_owned(),
        };
        if target.file_name().is_none() {
            return Err(FolderError::NoName(target));
        }
        repair(&target)?;
        let state = state(&target)?;
        if state == State::Finished && !replace {
            return Err(FolderError::Finished(target));
        }
        if state != State::Absent && is_mount_point(&target) {
            return Err(FolderError::MountPoint(target));
        }
        Ok(Survey {
            target,
            state,
            replace,
        })
    }

    /// Creates the folder, or takes over an unfinished one, under the identity given as JSON.
    ///
    /// # Errors
    /// [`FolderError`] where that fails, or another run owns the folder.
    pub fn open(self, identity: &[u8]) -> Result<RunFolder, FolderError> {
        let Survey {
            target,
            state,
            replace,
        } = self;
        let marker = target.join(UNFINISHED);
        let fresh = matches!(state, State::Absent | State::Empty);
        let made = if fresh {
            Made::folder(&target)?
        } else {
            Made::default()
        };
        let held = match state {
            State::Finished => target.join(RECORD),
            _ => marker.clone(),
        };
        let opened = File::options()
            .read(true)
            .append(true)
            .create(fresh)
            .open(&held);
        let lock = match opened {
            // Another run has come to its end since the survey.
            Err(e) if !fresh && e.kind() == io::ErrorKind::NotFound => {
                return Survey::of(&target, replace)?.open(identity);
            }
            opened => opened.map_err(on("write", &held))?,
        };
        match lock.try_lock() {
            Ok(()) => {}
            Err(fs::TryLockError::WouldBlock) => return Err(FolderError::InUse(target)),
            Err(fs::TryLockError::Error(source)) => return Err(on("lock", &held)(source)),
        }
        if state == State::Unfinished && !replace {
            let known = fs::read(&marker).map_err(on("read", &marker))?;
            // A kill while it was written leaves a marker that says nothing and guards nothing.
            let says_something = serde_json::from_slice::<serde_json::Value>(&known).is_ok();
            if says_something && known != identity {
                return Err(FolderError::OtherUnfinished(target));
            }
        }
        let folder = RunFolder {
            target,
            made,
            _lock: lock,
            done: false,
        };
        if state != State::Finished {
            write(&marker, identity)?;
        }
        try_beside(&folder.target)?;
        Ok(folder)
    }
}

/// A folder this process owns until the run is finished or given up.
#[derive(Debug)]
pub struct RunFolder {
    target: PathBuf,
    made: Made,
    /// Held open: dropping it releases the folder.
    _lock: File,
    done: bool,
}

impl RunFolder {
    /// Where the run will be.
    #[must_use]
    pub fn path(&self) -> &Path {
        &self.target
    }

    /// Writes the tables, then the record, and puts the whole in place.
    ///
    /// # Errors
    /// [`FolderError`] where the file system refuses; then nothing that was there has changed.
    pub fn finish(
        mut self,
        tables: &[(&'static str, Vec<u8>)],
        record: &[u8],
    ) -> Result<PathBuf, FolderError> {
        let fresh = beside(&self.target, "new");
        remove_ours(&fresh)?;
        let built = build(&fresh, tables, record);
        if let Err(error) = built.and_then(|()| swap(&self.target, &fresh)) {
            // The space is given back; what was there stays.
            let _ = fs::remove_dir_all(&fresh);
            return Err(error);
        }
        self.done = true;
        self.made.keep();
        Ok(self.target.clone())
    }
}

impl Drop for RunFolder {
    /// A run that is given up leaves the target as it was found.
    fn drop(&mut self) {
        if self.done {
            return;
        }
        let marker = self.target.join(UNFINISHED);
        if marker.exists() {
            let _ = fs::remove_file(&marker);
        }
    }
}

/// Folders that were made for a run, innermost first. Unless they are kept they go again, as far as
/// they are empty.
#[derive(Debug, Default)]
struct Made(Vec<PathBuf>);

impl Made {
    /// Makes a folder and those above it that are missing.
    fn folder(folder: &Path) -> Result<Made, FolderError> {
        let missing = folder
            .ancestors()
            .take_while(|above| !above.as_os_str().is_empty() && !above.exists());
        let made = Made(missing.map(Path::to_owned).collect());
        fs::create_dir_all(folder).map_err(on("create the folder", folder))?;
        Ok(made)
    }

    fn keep(&mut self) {
        self.0.clear();
    }
}

impl Drop for Made {
    fn drop(&mut self) {
        for folder in &self.0 {
            let _ = fs::remove_dir(folder);
        }
    }
}

/// What stands at the target.
fn state(target: &Path) -> Result<State, FolderError> {
    match fs::symlink_metadata(target) {
        Err(e) if e.kind() == io::ErrorKind::NotFound => return Ok(State::Absent),
        Err(e) if e.kind() == io::ErrorKind::NotADirectory => {
            let file = target.ancestors().find(|above| above.is_file());
            return Err(FolderError::NotAFolder(file.unwrap_or(target).to_owned()));
        }
        Err(e) => return Err(on("look at", target)(e)),
        Ok(meta) if !meta.is_dir() => return Err(FolderError::NotAFolder(target.to_owned())),
        Ok(_) => {}
    }
    let mut names = Vec::new();
    for entry in fs::read_dir(target).map_err(on("list", target))? {
        let entry = entry.map_err(on("list", target))?;
        let name = entry.file_name().to_string_lossy().into_owned();
        if name == FIGURES_FOLDER && entry.path().is_dir() {
            // What somebody has put beside the figures is no part of the run either.
            for below in fs::read_dir(entry.path()).map_err(on("list", target))? {
                let below = below.map_err(on("list", target))?.file_name();
                names.push(format!("{name}/{}", below.to_string_lossy()));
            }
        } else {
            names.push(name);
        }
    }
    names.sort();
    let has = |name: &str| names.iter().any(|n| n == name);
    let (state, ours): (State, Vec<&str>) = if names.is_empty() {
        (State::Empty, vec![])
    } else if has(UNFINISHED) && !has(RECORD) {
        (State::Unfinished, vec![UNFINISHED])
    } else {
        (
            State::Finished,
            [&TABLES[..], &ANSWERS[..], &[PAGE], &FIGURES[..]].concat(),
        )
    };
    let foreign = names
        .iter()
        .find(|name| !ours.contains(&name.as_str()) && name.as_str() != RECORD);
    let record_is_ours = !has(RECORD) || is_record(&target.join(RECORD));
    match foreign {
        Some(found) => Err(FolderError::Foreign {
            folder: target.to_owned(),
            found: found.clone(),
        }),
        None if state == State::Finished && !(has(RECORD) && record_is_ours) => {
            Err(FolderError::Foreign {
                folder: target.to_owned(),
                found: names.into_iter().next().unwrap_or_default(),
            })
        }
        None => Ok(state),
    }
}

/// Whether a file is the record of a run of this program.
fn is_record(path: &Path) -> bool {
    fs::read(path)
        .ok()
        .and_then(|bytes| serde_json::from_slice::<serde_json::Value>(&bytes).ok())
        .is_some_and(|record| record["program"] == env!("CARGO_PKG_NAME"))
}

/// The folder beside the target that a run passes through.
fn beside(target: &Path, what: &str) -> PathBuf {
    let name = target.file_name().unwrap_or_default().to_string_lossy();
    target.with_file_name(format!(".{name}.kinmark-{what}"))
}

/// Tries now what is needed at the end, so that no long run is lost for want of permission.
fn try_beside(target: &Path) -> Result<(), FolderError> {
    let fresh = beside(target, "new");
    remove_ours(&fresh)?;
    fs::create_dir(&fresh).map_err(on("create the folder", &fresh))?;
    remove_ours(&fresh)
}

fn build(
    folder: &Path,
    tables: &[(&'static str, Vec<u8>)],
    record: &[u8],
) -> Result<(), FolderError> {
    fs::create_dir(folder).map_err(on("create the folder", folder))?;
    for (name, bytes) in tables {
        let path = folder.join(name);
        let below = path.parent().unwrap_or(folder);
        fs::create_dir_all(below).map_err(on("create the folder", below))?;
        write(&path, bytes)?;
    }
    let record_path = folder.join(RECORD);
    let part = folder.join(".run.json.part");
    write(&part, record)?;
    fs::rename(&part, &record_path).map_err(on("rename", &record_path))?;
    sync(folder);
    Ok(())
}

/// Moves what is at the target aside, the new folder in, and deletes the old.
fn swap(target: &Path, fresh: &Path) -> Result<(), FolderError> {
    let old = beside(target, "old");
    remove_ours(&old)?;
    if target.exists() {
        fs::rename(target, &old).map_err(on("move aside", target))?;
    }
    if let Err(error) = fs::rename(fresh, target) {
        if old.exists() {
            let _ = fs::rename(&old, target);
        }
        return Err(on("move into place", target)(error));
    }
    if let Some(parent) = target.parent() {
        sync(parent);
    }
    // The new run is in place; what cannot be deleted now is deleted at the next start.
    let _ = fs::remove_dir_all(&old);
    Ok(())
}

/// Undoes a kill between the two renames, or before the last deletion.
fn repair(target: &Path) -> Result<(), FolderError> {
    let (old, fresh) = (beside(target, "old"), beside(target, "new"));
    if !old.exists() {
        return Ok(());
    }
    if target.exists() {
        return remove_ours(&old);
    }
    let whole = if fresh.join(RECORD).exists() {
        &fresh
    } else {
        &old
    };
    fs::rename(whole, target).map_err(on("move into place", target))?;
    remove_ours(&old)
}

/// Deletes a folder that only this program makes, if it is there.
fn remove_ours(folder: &Path) -> Result<(), FolderError> {
    match fs::remove_dir_all(folder) {
        Err(e) if e.kind() != io::ErrorKind::NotFound => Err(on("delete", folder)(e)),
        _ => Ok(()),
    }
}

fn write(path: &Path, bytes: &[u8]) -> Result<(), FolderError> {
    let doing = "write";
    let mut file = File::create(path).map_err(on(doing, path))?;
    file.write_all(bytes).map_err(on(doing, path))?;
    file.sync_all().map_err(on(doing, path))
}

/// Makes renames in a folder durable where the system can; a refusal loses nothing by itself.
fn sync(folder: &Path) {
    if let Ok(handle) = File::open(folder) {
        let _ = handle.sync_all();
    }
}

#[cfg(unix)]
fn is_mount_point(folder: &Path) -> bool {
    use std::os::unix::fs::MetadataExt;
    let device = |path: &Path| fs::metadata(path).map(|m| m.dev()).ok();
    folder
        .parent()
        .is_some_and(|parent| device(parent) != device(folder))
}

#[cfg(not(unix))]
fn is_mount_point(_folder: &Path) -> bool {
    false
}
