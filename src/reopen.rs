//! A study given as its file, or as the folder of a finished run: then the inputs are read again and
//! must be what they were.

use std::path::{Path, PathBuf};

use serde_json::Value;
use thiserror::Error;

use crate::error::Error;
use crate::prepare::{prepare, Study};
use crate::report::{read_record, RecordError};
use crate::settings::Request;

/// Why a run cannot be asked anything.
#[derive(Debug, Error)]
pub enum ReopenError {
    /// A folder without a finished run.
    #[error(transparent)]
    Record(#[from] RecordError),
    /// A record that does not say enough.
    #[error("{}: its run.json does not say {what}; run kinmark locate again", folder.display())]
    Silent {
        /// The folder.
        folder: PathBuf,
        /// What is missing.
        what: String,
    },
    /// A file that is not what it was.
    #[error("{}: the file has changed since the run in {} (SHA-256 {found}, then {expected}); restore it, or run kinmark locate again", file.display(), run.display())]
    Changed {
        /// The folder of the run.
        run: PathBuf,
        /// The file.
        file: PathBuf,
        /// Checksum in the record.
        expected: String,
        /// Checksum now.
        found: String,
    },
    /// Other files than then.
    #[error("{}: the study names other files than the run did ({what}); run kinmark locate again", run.display())]
    OtherFiles {
        /// The folder of the run.
        run: PathBuf,
        /// How they differ.
        what: String,
    },
    /// A setting that the run did not have.
    #[error("the run in {} has {key} = {run_has}, and {asked} was asked for; leave the option out, or name the study file instead of the run", run.display())]
    OtherSetting {
        /// The folder of the run.
        run: PathBuf,
        /// The setting.
        key: String,
        /// Its value in the run.
        run_has: String,
        /// The value asked for.
        asked: String,
    },
    /// A setting of the record that this version does not know.
    #[error("{}: its run.json has the setting {key}, which this version cannot take ({why}); run kinmark locate again", run.display())]
    UnknownSetting {
        /// The folder of the run.
        run: PathBuf,
        /// The setting.
        key: String,
        /// Why not.
        why: String,
    },
}

/// A study, and the folder of its run where that was given.
#[derive(Debug)]
pub struct Reopened {
    /// The study.
    pub study: Study,
    /// The run.
    pub run: Option<PathBuf>,
}

/// Reads a study from its file, or again from the folder of a finished run.
///
/// # Errors
/// [`enum@Error`] for a fault in the input, or inputs or settings that are not those of the run.
pub fn reopen(path: &Path, asked: Request) -> Result<Reopened, Error> {
    if !path.is_dir() {
        return Ok(Reopened {
            study: prepare(path, asked)?,
            run: None,
        });
    }
    let record = read_record(path).map_err(ReopenError::from)?;
    let silent = |what: &str| ReopenError::Silent {
        folder: path.to_owned(),
        what: what.to_owned(),
    };
    let file = record["inputs"]["study"]["path"]
        .as_str()
        .ok_or_else(|| silent("where its study file is"))?;
    let settings = record["settings"]
        .as_object()
        .ok_or_else(|| silent("its settings"))?;
    let mut then = Request::default();
    for (key, value) in settings {
        then.set(key, &plain(value))
            .map_err(|e| ReopenError::UnknownSetting {
                run: path.to_owned(),
                key: key.clone(),
                why: e.to_string(),
            })?;
    }
    let study = prepare(Path::new(file), asked.or(then))?;
    same_files(path, &record["inputs"], &study)?;
    let now = serde_json::to_value(&study.settings).expect("settings are plain values");
    for (key, value) in settings {
        if now[key] != *value {
            return Err(ReopenError::OtherSetting {
                run: path.to_owned(),
                key: key.clone(),
                run_has: plain(value),
                asked: plain(&now[key]),
            }
            .into());
        }
    }
    Ok(Reopened {
        study,
        run: Some(path.to_owned()),
    })
}

/// A value as it is written in a study file, without quotation marks.
fn plain(value: &Value) -> String {
    value
        .as_str()
        .map_or_else(|| value.to_string(), str::to_owned)
}

fn same_files(run: &Path, then: &Value, study: &Study) -> Result<(), ReopenError> {
    let now = serde_json::to_value(&study.inputs).expect("paths of a run are text");
    let (mut was, mut is) = (Vec::new(), Vec::new());
    files(then, String::new(), &mut was);
    files(&now, String::new(), &mut is);
    for ((role, path, expected), (role_now, _, found)) in was.iter().zip(&is) {
        if role != role_now {
            break;
        }
        if expected != found {
            return Err(ReopenError::Changed {
                run: run.to_owned(),
                file: path.into(),
                expected: expected.clone(),
                found: found.clone(),
            });
        }
    }
    let roles = |all: &[(String, String, String)]| -> Vec<String> {
        all.iter().map(|(role, ..)| role.clone()).collect()
    };
    let (was, is) = (roles(&was), roles(&is));
    if was == is {
        return Ok(());
    }
    let lost = was.iter().find(|role| !is.contains(role));
    let new = is.iter().find(|role| !was.contains(role));
    Err(ReopenError::OtherFiles {
        run: run.to_owned(),
        what: match (lost, new) {
            (Some(role), _) => format!("{role} is gone"),
            (None, Some(role)) => format!("{role} is new"),
            (None, None) => "in another order".to_owned(),
        },
    })
}

/// Role, path and checksum of every file in a description of inputs.
fn files(value: &Value, role: String, found: &mut Vec<(String, String, String)>) {
    match value {
        Value::Object(fields) => {
            let text = |key: &str| fields.get(key).and_then(Value::as_str).map(str::to_owned);
            if let (Some(path), Some(sha256)) = (text("path"), text("sha256")) {
                found.push((role, path, sha256));
                return;
            }
            for (key, value) in fields {
                let role = match role.is_empty() {
                    true => key.clone(),
                    false => format!("{role}.{key}"),
                };
                files(value, role, found);
            }
        }
        Value::Array(items) => {
            for (at, value) in items.iter().enumerate() {
                files(value, format!("{role}[{}]", at + 1), found);
            }
        }
        _ => {}
    }
}
