//! A list of connections: source, target, weight. A pair that is not in it is not connected.

use std::collections::HashMap;
use std::path::Path;

use ndarray::Array2;

use super::{text, Fault, Wanted};
use crate::domain::WeightKind;
use crate::input::delimited::{Row, Table};
use crate::input::error::{InputError, Place, Problem};
use crate::input::grid::{Grid, Label, Origin};
use crate::input::nearest::nearest_few;

/// The columns of a list.
const COLUMNS: [&str; 3] = ["source", "target", "weight"];
/// The matrix of more parcels than this would take gigabytes, and its embedding days.
const MOST_PARCELS: usize = 20_000;

/// Whether a table is a list of connections, by its header.
#[must_use]
pub fn is_list(header: &Row) -> bool {
    COLUMNS.iter().all(|name| position(header, name).is_some())
}

fn position(header: &Row, name: &str) -> Option<usize> {
    header
        .cells
        .iter()
        .position(|cell| cell.eq_ignore_ascii_case(name))
}

/// Reads a list of connections. The parcels are those of the file of labels, in its order; without
/// one, those that occur, in the order in which they do.
///
/// # Errors
/// [`InputError`] for unknown columns and parcels, pairs that come twice, and weights that are no
/// number.
pub fn read(table: Table, path: &Path, wanted: &Wanted<'_>) -> Result<Grid, InputError> {
    let fail = |row: &Row, column: usize, problem| {
        InputError::new(Place::line(path, row.line).column(column + 1), problem)
    };
    let Table {
        separator,
        header,
        rows,
    } = table;
    let [source, target, weight] = COLUMNS.map(|name| position(&header, name).unwrap_or_default());
    if let Some((at, found)) = header
        .cells
        .iter()
        .enumerate()
        .find(|(at, _)| ![source, target, weight].contains(at))
    {
        let found = found.to_owned();
        return Err(fail(&header, at, Fault::EdgeColumn { found }.into()));
    }

    let mut parcels = Parcels::new(wanted.labels);
    let mut ends = Vec::with_capacity(rows.len());
    for row in &rows {
        let mut end = |at: usize| {
            let label = row.cells.get(at).unwrap_or("");
            parcels
                .find(label, || Place::line(path, row.line).column(at + 1))
                .map_err(|problem| fail(row, at, problem))
        };
        ends.push((end(source)?, end(target)?));
    }
    let n = parcels.labels.len();
    if n > MOST_PARCELS {
        let most = MOST_PARCELS;
        return Err(InputError::new(
            Place::file(path),
            Fault::TooManyParcels { found: n, most }.into(),
        ));
    }

    let mut values = Array2::zeros((n, n));
    let mut at = HashMap::with_capacity(rows.len());
    for (line, (row, &pair)) in rows.iter().zip(&ends).enumerate() {
        let in_words = || {
            format!(
                "{} to {}",
                parcels.labels[pair.0].text, parcels.labels[pair.1].text
            )
        };
        if let Some(first) = at.insert(pair, line) {
            let line = rows[first].line;
            return Err(InputError::new(
                Place::line(path, row.line).parcel(&in_words()),
                Fault::PairTwice { line }.into(),
            ));
        }
        let cell = row.cells.get(weight).unwrap_or("");
        values[pair] = text::number(cell, separator).map_err(|problem| {
            let place = Place::line(path, row.line).column(weight + 1);
            InputError::new(place.parcel(&in_words()), problem)
        })?;
    }
    if wanted.weights == WeightKind::Log10 {
        let pairs = (0..n).flat_map(|i| (0..n).map(move |j| (i, j)));
        if let Some((i, j)) = pairs
            .into_iter()
            .find(|p| p.0 != p.1 && !at.contains_key(p))
        {
            let (from, to) = (&parcels.labels[i].text, &parcels.labels[j].text);
            return Err(InputError::new(
                Place::file(path),
                Fault::AbsentLogarithm {
                    from: from.clone(),
                    to: to.clone(),
                }
                .into(),
            ));
        }
    }
    Ok(Grid {
        file: path.to_path_buf(),
        row_labels: (!parcels.given).then_some(parcels.labels),
        column_labels: None,
        values,
        origin: Origin::Pairs {
            rows,
            cell: weight,
            at,
        },
    })
}

/// The parcels of a list, found by label.
struct Parcels {
    labels: Vec<Label>,
    at: HashMap<String, usize>,
    given: bool,
}

impl Parcels {
    fn new(given: Option<&[Label]>) -> Self {
        let labels = given.unwrap_or_default().to_vec();
        Parcels {
            at: labels
                .iter()
                .enumerate()
                .map(|(at, label)| (label.text.clone(), at))
                .collect(),
            labels,
            given: given.is_some(),
        }
    }

    /// The number of a parcel; a new one where parcels are those that occur.
    fn find(&mut self, label: &str, place: impl FnOnce() -> Place) -> Result<usize, Problem> {
        if label.is_empty() {
            return Err(Problem::EmptyLabel);
        }
        if let Some(&at) = self.at.get(label) {
            return Ok(at);
        }
        if self.given {
            return Err(Fault::UnknownEnd {
                found: label.to_owned(),
                near: nearest_few(label, self.labels.iter().map(|l| l.text.as_str()))
                    .into_iter()
                    .map(str::to_owned)
                    .collect(),
                labels: self
                    .labels
                    .first()
                    .map_or_else(Default::default, |l| l.place.file.clone()),
            }
            .into());
        }
        self.at.insert(label.to_owned(), self.labels.len());
        self.labels.push(Label {
            text: label.to_owned(),
            place: place(),
        });
        Ok(self.labels.len() - 1)
    }
}
