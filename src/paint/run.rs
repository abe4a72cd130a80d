//! What a finished run has left in its folder, as far as it can be painted.

use std::collections::HashMap;
use std::path::Path;

use serde_json::Value;

use super::table::Table;
use super::PaintError;
use crate::domain::{Pair, Side};
use crate::report::{RECORD, UNFINISHED};

/// A finished run.
#[derive(Debug)]
pub struct Run {
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
    /// [`PaintError`] for a folder that holds no finished run, or tables that were changed.
    pub fn read(folder: &Path) -> Result<Run, PaintError> {
        let record = record(folder)?;
        let not_a_run = |what: &str| PaintError::NotARun {
            folder: folder.to_owned(),
            why: format!("its {RECORD} does not say {what}"),
        };
        let text = |value: &Value, what: &str| {
            let text = value.as_str().map(str::to_owned);
            text.ok_or_else(|| not_a_run(what))
        };
        let positions = Table::read(&folder.join("positions.csv"))?;
        let counterparts = Table::read(&folder.join("counterparts.csv"))?;
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
            species,
            positions,
            counterparts,
        })
    }

    /// The species of a name; `a` and `b` will do where no species is called so.
    ///
    /// # Errors
    /// [`PaintError::NoSpecies`].
    pub fn side(&self, name: &str) -> Result<Side, PaintError> {
        let called = |side: &Side| self.species[*side].name == name;
        let lettered = |side: &Side| side.letter() == name;
        Side::BOTH
            .into_iter()
            .find(called)
            .or_else(|| Side::BOTH.into_iter().find(lettered))
            .ok_or_else(|| PaintError::NoSpecies {
                found: name.to_owned(),
                a: self.species.a.name.clone(),
                b: self.species.b.name.clone(),
            })
    }
}

/// The record of a folder with a finished run of this program.
fn record(folder: &Path) -> Result<Value, PaintError> {
    let not_a_run = |why: String| PaintError::NotARun {
        folder: folder.to_owned(),
        why,
    };
    if !folder.exists() {
        return Err(not_a_run("there is no such folder".to_owned()));
    }
    if !folder.is_dir() {
        return Err(not_a_run("it is a file".to_owned()));
    }
    let path = folder.join(RECORD);
    if !path.exists() {
        return Err(match folder.join(UNFINISHED).exists() {
            true => PaintError::Unfinished(folder.to_owned()),
            false => not_a_run(format!("it holds no {RECORD}")),
        });
    }
    let bytes = std::fs::read(&path)
        .map_err(|e| not_a_run(format!("its {RECORD} cannot be read ({e})")))?;
    let record: Value = serde_json::from_slice(&bytes)
        .map_err(|e| not_a_run(format!("its {RECORD} is no JSON ({e})")))?;
    if record["program"] != env!("CARGO_PKG_NAME") {
        return Err(not_a_run(format!("its {RECORD} is of another program")));
    }
    Ok(record)
}

impl Species {
    fn of(name: &str, set_aside: Vec<String>, positions: &Table) -> Result<Species, PaintError> {
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
