//! The table of landmarks: `landmark,a,b` and optionally `weight`, `block`, `basis`.

use std::collections::{BTreeMap, BTreeSet};

use super::delimited::{self, Row, Table};
use super::error::{InputError, Place, Problem};
use super::nearest::{nearest, nearest_few};
use super::sides::differ_only_by_side;
use super::source::Source;
use crate::domain::{Basis, Landmark, LandmarkError, Landmarks, Pair, Parcels, Share, Side};
use crate::warning::Warning;

/// Separates several parcels in one cell.
const PARCEL_SEPARATOR: char = ';';

const COLUMNS: [&str; 6] = ["landmark", "a", "b", "weight", "block", "basis"];

/// Reads the landmarks and finds their parcels.
///
/// # Errors
/// [`InputError`] for a missing column, an empty cell, an unknown or repeated parcel, a
/// repeated landmark, a weight outside (0, 1] or fewer than three landmarks.
pub fn read(
    source: &Source,
    parcels: Pair<&Parcels>,
) -> Result<(Landmarks, Vec<Warning>), InputError> {
    let table = delimited::parse(source)?;
    let mut warnings = Vec::new();
    let columns = Columns::find(&table, source, &mut warnings)?;

    let mut list: Vec<Landmark> = Vec::new();
    let mut blocks: Vec<String> = Vec::new();
    let mut names: BTreeMap<String, u64> = BTreeMap::new();
    let mut used: Pair<BTreeMap<usize, (String, u64)>> = Pair::default();
    let mut without = Without::default();
    let mut merged = Vec::new();
    for row in &table.rows {
        let at = |column: usize| Place::line(source.path(), row.line).column(column + 1);
        let name = row.cells.get(columns.landmark).unwrap_or("").to_owned();
        if name.is_empty() {
            return Err(InputError::new(
                at(columns.landmark),
                Problem::EmptyCell("a landmark's name"),
            ));
        }
        if let Some(&line) = names.get(&name) {
            return Err(InputError::new(
                at(columns.landmark).parcel(&name),
                Problem::LandmarkTwice { name, line },
            ));
        }
        names.insert(name.clone(), row.line);
        let fault = |side: Side| {
            let place = at(columns.parcels[side]).parcel(&name);
            |problem| InputError::new(place, problem)
        };
        let members = Pair::try_from_fn(|side| {
            members(row, columns.parcels[side], parcels[side], side).map_err(fault(side))
        })?;
        if let Some(first) = same_when_folded(&list, &members, parcels) {
            merged.push((first.name.clone(), name));
            continue;
        }
        for side in Side::BOTH {
            claim(
                &members[side].placed,
                parcels[side],
                side,
                &mut used[side],
                &name,
                row.line,
            )
            .map_err(fault(side))?;
        }
        let weight = match cell(row, columns.weight) {
            None => Share::ALL,
            Some(text) => text
                .parse::<f64>()
                .ok()
                .and_then(|w| Share::new(w).ok())
                .ok_or_else(|| {
                    InputError::new(
                        at(columns.weight.unwrap_or_default()).parcel(&name),
                        Problem::LandmarkWeight(text.to_owned()),
                    )
                })?,
        };
        for side in Side::BOTH {
            for label in &members[side].unplaced {
                without.note(&name, label, parcels[side].species());
            }
        }
        if members.a.placed.is_empty() || members.b.placed.is_empty() {
            without.landmarks.push(name);
            continue;
        }
        let block = match cell(row, columns.block) {
            // A block of its own, told from named ones by a spelling no cell can have.
            None => {
                blocks.push(format!("\n{name}"));
                blocks.len() - 1
            }
            Some(named) => blocks.iter().position(|b| b == named).unwrap_or_else(|| {
                blocks.push(named.to_owned());
                blocks.len() - 1
            }),
        };
        let basis = columns
            .basis
            .map(|_| Basis(cell(row, columns.basis).unwrap_or("").to_owned()));
        list.push(Landmark {
            name,
            parcels: members.map(|m| m.placed),
            weight,
            block,
            basis,
        });
    }
    let blocks = blocks
        .into_iter()
        .map(|b| b.trim_start().to_owned())
        .collect();
    warnings.extend(without.warning());
    if !merged.is_empty() {
        warnings.push(Warning::LandmarksMerged { pairs: merged });
    }
    warnings.extend(suspicions(&list, parcels));
    let landmarks = Landmarks::new(list, blocks).map_err(|e| match e {
        LandmarkError::TooFew { found, needed } => InputError::new(
            Place::file(source.path()),
            Problem::TooFewLandmarks { found, needed },
        ),
        LandmarkError::Empty { .. } | LandmarkError::Shared { .. } => {
            unreachable!("rows were checked one by one: {e}")
        }
    })?;
    Ok((landmarks, warnings))
}

/// Where each column of the table stands.
struct Columns {
    landmark: usize,
    parcels: Pair<usize>,
    weight: Option<usize>,
    block: Option<usize>,
    basis: Option<usize>,
}

impl Columns {
    fn find(
        table: &Table,
        source: &Source,
        warnings: &mut Vec<Warning>,
    ) -> Result<Columns, InputError> {
        let place = Place::line(source.path(), table.header.line);
        let mut found: BTreeMap<&str, usize> = BTreeMap::new();
        for (at, column) in table.header.cells.iter().enumerate() {
            if COLUMNS.contains(&column) {
                if found.insert(column, at).is_some() {
                    return Err(InputError::new(
                        place.column(at + 1),
                        Problem::ColumnTwice(column.to_owned()),
                    ));
                }
            } else if column.chars().count() > 2 && !nearest_few(column, COLUMNS).is_empty() {
                return Err(InputError::new(
                    place.column(at + 1),
                    Problem::UnknownColumn {
                        found: column.to_owned(),
                        nearest: nearest(column, COLUMNS).unwrap_or_default().to_owned(),
                    },
                ));
            } else {
                warnings.push(Warning::ColumnIgnored {
                    column: column.to_owned(),
                });
            }
        }
        let needed = |column: &'static str| {
            found.get(column).copied().ok_or_else(|| {
                InputError::new(
                    place.clone(),
                    Problem::MissingColumn {
                        missing: column,
                        found: table.header.cells.iter().collect::<Vec<_>>().join(","),
                    },
                )
            })
        };
        Ok(Columns {
            landmark: needed("landmark")?,
            parcels: Pair {
                a: needed("a")?,
                b: needed("b")?,
            },
            weight: found.get("weight").copied(),
            block: found.get("block").copied(),
            basis: found.get("basis").copied(),
        })
    }
}

/// A cell that is there and not empty.
fn cell(row: &Row, column: Option<usize>) -> Option<&str> {
    column
        .and_then(|at| row.cells.get(at))
        .filter(|text| !text.is_empty())
}

/// The parcels one cell names.
struct Members {
    /// Those that take part.
    placed: Vec<usize>,
    /// Labels of those that were set aside.
    unplaced: Vec<String>,
}

/// Landmark parcels that were set aside, and landmarks that have none left.
#[derive(Default)]
struct Without {
    parcels: Vec<String>,
    landmarks: Vec<String>,
}

impl Without {
    fn note(&mut self, landmark: &str, parcel: &str, species: &str) {
        self.parcels
            .push(format!("{parcel} of {species} ({landmark})"));
    }

    fn warning(self) -> Option<Warning> {
        (!self.parcels.is_empty()).then_some(Warning::LandmarksReduced {
            parcels: self.parcels,
            landmarks: self.landmarks,
        })
    }
}

/// Reads the parcels one cell names.
fn members(row: &Row, column: usize, parcels: &Parcels, side: Side) -> Result<Members, Problem> {
    let cell = row.cells.get(column).unwrap_or("");
    // A label may itself contain the separator: then it is the label that counts.
    let labels: Vec<&str> = match parcels.find(cell) {
        Some(_) => vec![cell],
        None => cell.split(PARCEL_SEPARATOR).map(str::trim).collect(),
    };
    let (mut members, mut unplaced) = (Vec::new(), Vec::new());
    for label in labels {
        if label.is_empty() {
            return Err(Problem::EmptyCell("a parcel"));
        }
        let Some(parcel) = parcels.find(label) else {
            let aside = [parcels.isolated(), parcels.uncovered()].concat();
            let resolved = parcels.resolve(label);
            if aside.iter().any(|known| known == resolved) {
                unplaced.push(label.to_owned());
                continue;
            }
            return Err(Problem::UnknownParcel {
                side,
                species: parcels.species().to_owned(),
                parcel: label.to_owned(),
                near: nearest_few(label, parcels.labels().iter().map(String::as_str))
                    .into_iter()
                    .map(str::to_owned)
                    .collect(),
            });
        };
        // Both copies of a folded parcel may be named; together they are one.
        if parcels.folded() == 0 || !members.contains(&parcel) {
            members.push(parcel);
        }
    }
    Ok(Members {
        placed: members,
        unplaced,
    })
}

/// Sees that no landmark has these parcels yet.
fn claim(
    members: &[usize],
    parcels: &Parcels,
    side: Side,
    used: &mut BTreeMap<usize, (String, u64)>,
    landmark: &str,
    line: u64,
) -> Result<(), Problem> {
    for &parcel in members {
        if let Some((landmark, line)) = used.insert(parcel, (landmark.to_owned(), line)) {
            return Err(Problem::ParcelTwice {
                side,
                parcel: parcels.labels()[parcel].clone(),
                landmark,
                line,
            });
        }
    }
    Ok(())
}

/// An earlier landmark of the very same parcels, where brains are folded: then the left and the right
/// copy of one landmark are one, and nothing is gained by counting it twice.
fn same_when_folded<'l>(
    list: &'l [Landmark],
    members: &Pair<Members>,
    parcels: Pair<&Parcels>,
) -> Option<&'l Landmark> {
    if Side::BOTH
        .into_iter()
        .all(|side| parcels[side].folded() == 0)
    {
        return None;
    }
    let set = |parcels: &[usize]| -> BTreeSet<usize> { parcels.iter().copied().collect() };
    list.iter().find(|landmark| {
        let same = |side| set(&landmark.parcels[side]) == set(&members[side].placed);
        Side::BOTH.into_iter().all(same)
    })
}

/// What is legal but should be known.
fn suspicions(list: &[Landmark], parcels: Pair<&Parcels>) -> Vec<Warning> {
    let mut warnings = Vec::new();
    for (at, first) in list.iter().enumerate() {
        for second in &list[at + 1..] {
            let by_side = Side::BOTH.into_iter().all(|side| {
                match (&first.parcels[side][..], &second.parcels[side][..]) {
                    ([one], [other]) => {
                        let labels = parcels[side].labels();
                        differ_only_by_side(&labels[*one], &labels[*other])
                    }
                    _ => differ_only_by_side(&first.name, &second.name),
                }
            });
            if first.block != second.block && by_side {
                warnings.push(Warning::SidesNotBlocked {
                    first: first.name.clone(),
                    second: second.name.clone(),
                });
            }
        }
    }
    let circular: Vec<String> = list
        .iter()
        .filter(|l| l.basis.as_ref().is_some_and(Basis::is_circular))
        .map(|l| l.name.clone())
        .collect();
    if !circular.is_empty() {
        warnings.push(Warning::Circular {
            landmarks: circular,
        });
    }
    warnings
}
