//! What a finished run has left in its folder.

use std::collections::{BTreeMap, HashMap};
use std::path::{Path, PathBuf};

use serde_json::Value;

use super::table::Table;
use super::RunError;
use crate::domain::Pair;
use crate::report::{read_record, RecordError, RECORD};

/// A finished run.
#[derive(Debug)]
pub struct Run {
    /// Its record, `run.json`.
    pub record: Value,
    /// Title of the study.
    pub title: String,
    /// What gave the distances, as the record names it.
    pub distances_from: String,
    /// Both species.
    pub species: Pair<Species>,
    /// `positions.csv`.
    pub positions: Table,
    /// `counterparts.csv`.
    pub counterparts: Table,
    /// Where the tables stand, or will stand.
    folder: PathBuf,
    /// The tables of a run that is not written yet.
    unwritten: Option<BTreeMap<&'static str, Vec<u8>>>,
}

/// The parcels of one species.
#[derive(Debug)]
pub struct Species {
    /// Its name.
    pub name: String,
    /// Labels of the parcels that take part, in the order of the tables.
    pub parcels: Vec<String>,
    /// Where each stands.
    pub at: HashMap<String, usize>,
    /// The landmark of each, if it belongs to one.
    pub landmarks: Vec<Option<String>>,
    /// Labels of parcels without connections.
    pub set_aside: Vec<String>,
    /// For each parcel, its row of `positions.csv`.
    pub rows: Vec<usize>,
}

impl Run {
    /// Reads the record and the tables of a run.
    ///
    /// # Errors
    /// [`RunError`] for a folder that holds no finished run, or tables that were changed.
    pub fn read(folder: &Path) -> Result<Run, RunError> {
        Run::of(folder, read_record(folder)?, None)
    }

    /// Takes the record and the tables of a run that is complete but not yet in its `folder`.
    ///
    /// # Errors
    /// [`RunError`] for a record or tables of another form.
    pub fn of_unwritten(
        folder: &Path,
        record: &[u8],
        tables: &[(&'static str, Vec<u8>)],
    ) -> Result<Run, RunError> {
        let record = serde_json::from_slice(record).map_err(|e| RecordError::NotARun {
            folder: folder.to_owned(),
            why: format!("its {RECORD} is no JSON ({e})"),
        })?;
        Run::of(folder, record, Some(tables.iter().cloned().collect()))
    }

    fn of(
        folder: &Path,
        record: Value,
        unwritten: Option<BTreeMap<&'static str, Vec<u8>>>,
    ) -> Result<Run, RunError> {
        let not_a_run = |what: &str| RecordError::NotARun {
            folder: folder.to_owned(),
            why: format!("its {RECORD} does not say {what}"),
        };
        let text = |value: &Value, what: &str| {
            let text = value.as_str().map(str::to_owned);
            text.ok_or_else(|| not_a_run(what)).map_err(RunError::from)
        };
        let positions = table(folder, unwritten.as_ref(), "positions.csv")?;
        let counterparts = table(folder, unwritten.as_ref(), "counterparts.csv")?;
        let names = Pair::try_from_fn(|side| {
            text(
                &record["species"][side.letter()]["name"],
                "what its species are called",
            )
        })?;
        let species = Pair::try_from_fn(|side| {
            let aside = &record["species"][side.letter()]["set-aside"];
            let aside = aside.as_array().map(Vec::as_slice).unwrap_or_default();
            let aside = aside.iter().filter_map(Value::as_str).map(str::to_owned);
            Species::of(&names[side], aside.collect(), &positions)
        })?;
        Ok(Run {
            title: text(&record["title"], "its title")?,
            distances_from: text(&record["choice"]["evidence"], "what gave its distances")?,
            record,
            species,
            positions,
            counterparts,
            folder: folder.to_owned(),
            unwritten,
        })
    }

    /// Another table of the run.
    ///
    /// # Errors
    /// [`RunError`] where it is missing or no table.
    pub fn table(&self, name: &str) -> Result<Table, RunError> {
        table(&self.folder, self.unwritten.as_ref(), name)
    }

    /// Says what the run lacks.
    #[must_use]
    pub fn incomplete(&self, why: &str) -> RunError {
        RunError::from(RecordError::NotARun {
            folder: self.folder.clone(),
            why: why.to_owned(),
        })
    }

    /// A table that an answer may have added to the run, if it is there.
    ///
    /// # Errors
    /// [`RunError`] where it is there and no table.
    pub fn answer(&self, name: &str) -> Result<Option<Table>, RunError> {
        let is_there = match &self.unwritten {
            Some(tables) => tables.contains_key(name),
            None => self.folder.join(name).exists(),
        };
        is_there.then(|| self.table(name)).transpose()
    }
}

/// A table as it stands in the folder, or will stand there.
fn table(
    folder: &Path,
    unwritten: Option<&BTreeMap<&'static str, Vec<u8>>>,
    name: &str,
) -> Result<Table, RunError> {
    let path = folder.join(name);
    match unwritten.and_then(|tables| tables.get(name)) {
        Some(bytes) => Table::parse(&path, bytes.clone()),
        None => Table::read(&path),
    }
}

impl Species {
    fn of(name: &str, set_aside: Vec<String>, positions: &Table) -> Result<Species, RunError> {
        let [species, parcel, landmark] =
            ["species", "parcel", "landmark"].map(|column| positions.column(column));
        let (species, parcel, landmark) = (species?, parcel?, landmark?);
        let mut found = Species {
            name: name.to_owned(),
            parcels: Vec::new(),
            at: HashMap::new(),
            landmarks: Vec::new(),
            set_aside,
            rows: Vec::new(),
        };
        for (at, row) in positions.rows().iter().enumerate() {
            if positions.text(row, species) != name {
                continue;
            }
            let label = positions.text(row, parcel).to_owned();
            let place = found.parcels.len();
            if found.at.insert(label.clone(), place).is_some() {
                return Err(positions.fault(row, parcel, "each parcel once"));
            }
            found.parcels.push(label);
            let landmark = positions.text(row, landmark);
            let landmark = (!landmark.is_empty()).then(|| landmark.to_owned());
            found.landmarks.push(landmark);
            found.rows.push(at);
        }
        Ok(found)
    }
}
