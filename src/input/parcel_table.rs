//! The table of parcels: `label` and any of `hemisphere`, `x`, `y`, `z`, `area` or `volume`, `group`,
//! `long_name`.

use std::collections::{BTreeMap, HashMap, HashSet};

use super::delimited::{self, Row, Table};
use super::error::{InputError, Place, Problem};
use super::nearest::nearest_few;
use super::parcel_fault::ParcelFault;
use super::source::{InputFile, Source};
use crate::domain::{Attributes, Extent, Hemisphere};
use crate::warning::Warning;

/// The column that must be there.
pub(super) const LABEL: &str = "label";
/// The columns that may be.
pub(super) const ATTRIBUTES: [&str; 8] = [
    "hemisphere",
    "x",
    "y",
    "z",
    "area",
    "volume",
    "group",
    "long_name",
];
/// Spellings of "not known" besides an empty cell, in lower case: that of BIDS and usual ones.
const UNKNOWN: [&str; 4] = ["n/a", "na", "nan", "-"];

/// Attributes as read.
#[derive(Debug, Clone)]
pub struct ParcelTable {
    /// The file.
    pub file: InputFile,
    /// Attributes of each parcel of the matrix, in the order of its labels.
    pub attributes: Vec<Attributes>,
    /// What is legal but suspicious.
    pub warnings: Vec<Warning>,
}

/// Reads the attributes of the parcels that a matrix names by `labels`.
///
/// # Errors
/// [`InputError`] for a table without labels, a label twice, a hemisphere that is none, a number that
/// is none or outside its range, and coordinates given in part.
pub fn read(source: &Source, labels: &[String], species: &str) -> Result<ParcelTable, InputError> {
    let table = delimited::parse(source)?;
    let mut warnings = Vec::new();
    let columns = columns(&table, source, species, &mut warnings)?;
    let at_label: HashMap<&str, usize> = labels
        .iter()
        .enumerate()
        .map(|(at, label)| (label.as_str(), at))
        .collect();
    let mut attributes: Vec<Option<Attributes>> = vec![None; labels.len()];
    let mut lines: HashMap<String, u64> = HashMap::new();
    let mut strangers = Vec::new();
    for row in &table.rows {
        let reader = Reader {
            source,
            row,
            columns: &columns,
        };
        let label = reader.label()?;
        if let Some(&line) = lines.get(label) {
            return Err(reader.fault(
                LABEL,
                ParcelFault::LabelTwice {
                    label: label.to_owned(),
                    line,
                },
            ));
        }
        lines.insert(label.to_owned(), row.line);
        // Read all the same, so that a slip is not found only after the label was mended.
        let read = reader.attributes()?;
        match at_label.get(label) {
            Some(&at) => attributes[at] = Some(read),
            None => strangers.push(label.to_owned()),
        }
    }
    if !strangers.is_empty() {
        warnings.push(Warning::ParcelsUnknown {
            species: species.to_owned(),
            parcels: strangers,
        });
    }
    let bare: Vec<String> = (0..labels.len())
        .filter(|&at| attributes[at].is_none())
        .map(|at| labels[at].clone())
        .collect();
    if !bare.is_empty() {
        warnings.push(Warning::ParcelsUndescribed {
            species: species.to_owned(),
            parcels: bare,
        });
    }
    Ok(ParcelTable {
        file: source.file.clone(),
        attributes: attributes
            .into_iter()
            .map(Option::unwrap_or_default)
            .collect(),
        warnings,
    })
}

/// Where each known column stands.
fn columns(
    table: &Table,
    source: &Source,
    species: &str,
    warnings: &mut Vec<Warning>,
) -> Result<BTreeMap<&'static str, usize>, InputError> {
    let place = Place::line(source.path(), table.header.line);
    let known = || std::iter::once(LABEL).chain(ATTRIBUTES);
    let mut found: BTreeMap<&'static str, usize> = BTreeMap::new();
    for (at, spelt) in table.header.cells.iter().enumerate() {
        let column = spelt.to_lowercase();
        match known().find(|k| *k == column) {
            Some(column) if found.contains_key(column) => {
                return Err(InputError::new(
                    place.column(at + 1),
                    Problem::ColumnTwice(spelt.to_owned()),
                ));
            }
            Some(column) => {
                found.insert(column, at);
            }
            None => warnings.push(Warning::AttributeIgnored {
                species: species.to_owned(),
                column: spelt.to_owned(),
                near: Some(column)
                    .filter(|c| c.chars().count() > 2)
                    .and_then(|c| nearest_few(&c, known()).first().map(|n| (*n).to_owned())),
            }),
        }
    }
    if !found.contains_key(LABEL) {
        return Err(InputError::new(
            place,
            ParcelFault::NoLabelColumn {
                found: table.header.cells.iter().collect::<Vec<_>>().join(","),
                known: ATTRIBUTES.join(", "),
            }
            .into(),
        ));
    }
    if let (true, Some(&volume)) = (found.contains_key("area"), found.get("volume")) {
        let filled = |column: &str| {
            let at = found[column];
            let cells = || table.rows.iter().filter_map(|row| row.cells.get(at));
            cells().map(str::trim).any(|cell| !is_unknown(cell))
        };
        if filled("area") && filled("volume") {
            return Err(InputError::new(
                place.column(volume + 1),
                ParcelFault::AreaAndVolume.into(),
            ));
        }
    }
    Ok(found)
}

fn is_unknown(cell: &str) -> bool {
    cell.is_empty() || UNKNOWN.contains(&cell.to_lowercase().as_str())
}

/// One row and what is needed to say where a fault is.
struct Reader<'r> {
    source: &'r Source,
    row: &'r Row,
    columns: &'r BTreeMap<&'static str, usize>,
}

impl<'r> Reader<'r> {
    fn cell(&self, column: &str) -> Option<&'r str> {
        let at = self.columns.get(column)?;
        self.row.cells.get(*at).filter(|cell| !cell.is_empty())
    }

    fn fault(&self, column: &str, fault: ParcelFault) -> InputError {
        let mut place = Place::line(self.source.path(), self.row.line);
        if let Some(at) = self.columns.get(column) {
            place = place.column(at + 1);
        }
        if let Some(label) = self.cell(LABEL) {
            place = place.parcel(label);
        }
        InputError::new(place, fault.into())
    }

    fn label(&self) -> Result<&'r str, InputError> {
        self.cell(LABEL)
            .ok_or_else(|| self.fault(LABEL, ParcelFault::EmptyLabel))
    }

    fn attributes(&self) -> Result<Attributes, InputError> {
        let hemisphere = match self.known("hemisphere") {
            None => None,
            Some(word) => Some(Hemisphere::spelled(word).ok_or_else(|| {
                let found = word.to_owned();
                self.fault("hemisphere", ParcelFault::Hemisphere { found })
            })?),
        };
        let text = |column| {
            let cell = self.cell(column).filter(|c| !c.eq_ignore_ascii_case("n/a"));
            cell.map(str::to_owned)
        };
        Ok(Attributes {
            hemisphere,
            coordinates: self.coordinates()?,
            extent: match (self.size("area")?, self.size("volume")?) {
                (Some(area), _) => Some(Extent::Area(area)),
                (None, Some(volume)) => Some(Extent::Volume(volume)),
                (None, None) => None,
            },
            group: text("group"),
            long_name: text("long_name"),
        })
    }

    fn coordinates(&self) -> Result<Option<[f64; 3]>, InputError> {
        let axes = ["x", "y", "z"];
        let mut found = [None; 3];
        for (at, axis) in axes.into_iter().enumerate() {
            found[at] = self.number(axis)?;
        }
        match found {
            [Some(x), Some(y), Some(z)] => Ok(Some([x, y, z])),
            [None, None, None] => Ok(None),
            _ => {
                let given = |at: &usize| found[*at].is_some();
                let missing = (0..3).find(|at| !given(at)).map_or("", |at| axes[at]);
                Err(self.fault(missing, ParcelFault::PartOfCoordinates { missing }))
            }
        }
    }

    fn size(&self, column: &'static str) -> Result<Option<f64>, InputError> {
        match self.number(column)? {
            Some(found) if found <= 0.0 => {
                Err(self.fault(column, ParcelFault::Extent { column, found }))
            }
            size => Ok(size),
        }
    }

    fn known(&self, column: &str) -> Option<&'r str> {
        self.cell(column).filter(|cell| !is_unknown(cell))
    }

    fn number(&self, column: &'static str) -> Result<Option<f64>, InputError> {
        self.known(column)
            .map(|cell| {
                let number = cell.parse::<f64>().ok().filter(|x| x.is_finite());
                number.ok_or_else(|| {
                    let found = cell.to_owned();
                    self.fault(column, ParcelFault::Number { column, found })
                })
            })
            .transpose()
    }
}

/// What a table of parcels looks like to somebody who only guesses: the labels it names, where its
/// header has `label` and an attribute.
pub(super) fn looks(table: &Table) -> Option<Vec<String>> {
    let header: Vec<String> = table.header.cells.iter().map(str::to_lowercase).collect();
    let at = header.iter().position(|column| column == LABEL)?;
    let known: HashSet<&str> = ATTRIBUTES.into_iter().collect();
    header
        .iter()
        .any(|column| known.contains(column.as_str()))
        .then(|| {
            let cells = table.rows.iter().filter_map(|row| row.cells.get(at));
            cells
                .filter(|cell| !cell.is_empty())
                .map(str::to_owned)
                .collect()
        })
}
