//! The folder of painted maps. Each file appears whole or not at all, and none replaces another
//! unless that was asked for.

use std::fs;
use std::io::{self, Write};
use std::path::{Path, PathBuf};

use tempfile::{Builder, NamedTempFile};
use thiserror::Error;

use super::gifti::is_ours;

/// Why maps could not be put into a folder.
#[derive(Debug, Error)]
pub enum MapsError {
    /// A file stands where the folder should be.
    #[error("{} is not a folder; name a folder for the maps with --out", .0.display())]
    NotAFolder(PathBuf),
    /// The folder of a run, which holds the run alone.
    #[error("{} lies in the folder of the run, which holds the run alone; name another folder with --out", .0.display())]
    InRun(PathBuf),
    /// Other maps that must not be lost.
    #[error("{} is there already and differs; name another folder with --out, or add --replace to replace it", .0.display())]
    Exists(PathBuf),
    /// A file that is none of this program's.
    #[error("{} is there already and was not painted by this program; it is left untouched. Name another folder with --out", .0.display())]
    Foreign(PathBuf),
    /// A table with another header.
    #[error("{} is there already and has not the columns that this program writes; it is left untouched. Name a folder with --out", .0.display())]
    OtherTable(PathBuf),
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

fn on<'p>(doing: &'static str, path: &'p Path) -> impl FnOnce(io::Error) -> MapsError + 'p {
    move |source| MapsError::System {
        doing,
        path: path.to_owned(),
        source,
    }
}

/// Refuses a folder inside that of a run, before any work is done.
///
/// # Errors
/// [`MapsError::InRun`].
pub fn keep_out_of_run(folder: &Path, run: &Path) -> Result<(), MapsError> {
    let Ok(run) = run.canonicalize() else {
        return Ok(());
    };
    // What is not there yet has a real place as far as it is there.
    let mut nearest = folder.ancestors().filter_map(|above| {
        let above = if above.as_os_str().is_empty() {
            Path::new(".")
        } else {
            above
        };
        above.canonicalize().ok()
    });
    match nearest.next() {
        Some(real) if real.starts_with(&run) => Err(MapsError::InRun(folder.to_owned())),
        _ => Ok(()),
    }
}

/// Writes files of maps, all of them complete before the first takes its place. A file that is there
/// with the same bytes stays.
///
/// # Errors
/// [`MapsError`] where a file must not be replaced or the system refuses.
pub fn write_maps(
    folder: &Path,
    files: &[(String, Vec<u8>)],
    replace: bool,
) -> Result<Vec<PathBuf>, MapsError> {
    write_files(folder, files, replace, &|there, _| {
        Hold::of_ours(is_ours(there))
    })
}

/// How a file that is there and differs may be replaced.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Hold {
    /// Not at all: it is none of this program's.
    Never,
    /// If that was asked for.
    UnlessAsked,
    /// At any time: nothing is lost.
    Freely,
}

impl Hold {
    /// The rule for results: one of this program's may be replaced if that was asked for.
    pub(super) fn of_ours(is_ours: bool) -> Hold {
        match is_ours {
            true => Hold::UnlessAsked,
            false => Hold::Never,
        }
    }
}

/// Writes files, all of them complete before the first takes its place; names may lead into folders
/// below. One that is there with the same bytes stays; `hold(there, new)` says how one that differs may
/// be replaced.
pub(super) fn write_files(
    folder: &Path,
    files: &[(String, Vec<u8>)],
    replace: bool,
    hold: &dyn Fn(&[u8], &[u8]) -> Hold,
) -> Result<Vec<PathBuf>, MapsError> {
    if folder.exists() && !folder.is_dir() {
        return Err(MapsError::NotAFolder(folder.to_owned()));
    }
    let mut paths = Vec::new();
    let mut new = Vec::new();
    for (name, bytes) in files {
        let path = folder.join(name);
        match fs::read(&path) {
            Ok(there) if there == *bytes => {}
            Ok(there) => match hold(&there, bytes) {
                Hold::Never => return Err(MapsError::Foreign(path)),
                Hold::UnlessAsked if !replace => return Err(MapsError::Exists(path)),
                Hold::UnlessAsked | Hold::Freely => new.push((path.clone(), bytes, true)),
            },
            Err(e) if e.kind() == io::ErrorKind::NotFound => {
                new.push((path.clone(), bytes, replace));
            }
            Err(_) if path.is_dir() => return Err(MapsError::Foreign(path)),
            Err(e) => return Err(on("read", &path)(e)),
        }
        paths.push(path);
    }
    let made = !folder.exists();
    fs::create_dir_all(folder).map_err(on("create the folder", folder))?;
    for (path, ..) in &new {
        let below = path.parent().unwrap_or(folder);
        fs::create_dir_all(below).map_err(on("create the folder", below))?;
    }
    let placed = place(folder, &new);
    if placed.is_err() && made {
        // Goes only if nothing has come into it.
        let _ = fs::remove_dir(folder);
    }
    placed.map(|()| paths)
}

/// Puts files in place: paths, bytes, and whether one that is there may be replaced.
fn place(folder: &Path, files: &[(PathBuf, &Vec<u8>, bool)]) -> Result<(), MapsError> {
    let mut whole = Vec::new();
    for (path, bytes, replace) in files {
        let mut file = hidden(folder).map_err(on("write into", folder))?;
        file.write_all(bytes).map_err(on("write", path))?;
        file.as_file().sync_all().map_err(on("write", path))?;
        whole.push((path, file, *replace));
    }
    for (path, file, replace) in whole {
        let kept = if replace {
            file.persist(path)
        } else {
            // Fails where another process has put a file there meanwhile.
            file.persist_noclobber(path)
        };
        kept.map_err(|e| match e.error.kind() {
            io::ErrorKind::AlreadyExists => MapsError::Exists(path.clone()),
            _ => on("move into place", path)(e.error),
        })?;
    }
    Ok(())
}

/// A new hidden file that goes away unless it is given its name.
fn hidden(folder: &Path) -> io::Result<NamedTempFile> {
    let mut builder = Builder::new();
    builder.prefix(".kinmark-").suffix(".part");
    #[cfg(unix)]
    {
        use std::os::unix::fs::PermissionsExt;
        // As any new file: the user's mask takes away what it does.
        builder.permissions(fs::Permissions::from_mode(0o666));
    }
    builder.tempfile_in(folder)
}
