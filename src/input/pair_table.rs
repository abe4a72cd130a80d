//! A table of named pairs to be checked: `a,b`.

use super::delimited;
use super::error::{InputError, Place, Problem};
use super::source::Source;
use crate::domain::Pair;

/// A pair of labels and the line it stands on.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct NamedPair {
    /// The labels.
    pub labels: Pair<String>,
    /// Line in the file, counted from 1.
    pub line: u64,
}

/// Reads pairs. Whether there are such parcels is not checked.
///
/// # Errors
/// [`InputError`] for a missing column, an empty cell or a table without rows.
pub fn read(source: &Source) -> Result<Vec<NamedPair>, InputError> {
    let table = delimited::parse(source)?;
    let header = |name: &'static str| {
        let found = table.header.cells.iter().position(|cell| cell == name);
        found.ok_or_else(|| {
            let cells: Vec<&str> = table.header.cells.iter().collect();
            InputError::new(
                Place::line(source.path(), table.header.line),
                Problem::PairColumn {
                    missing: name,
                    found: cells.join(", "),
                },
            )
        })
    };
    let columns = Pair {
        a: header("a")?,
        b: header("b")?,
    };
    let cell = |row: &delimited::Row, column: usize| {
        let text = row.cells.get(column).unwrap_or("");
        match text.is_empty() {
            true => Err(InputError::new(
                Place::line(source.path(), row.line).column(column + 1),
                Problem::EmptyCell("a parcel"),
            )),
            false => Ok(text.to_owned()),
        }
    };
    let pairs: Vec<NamedPair> = table
        .rows
        .iter()
        .map(|row| {
            Ok(NamedPair {
                labels: Pair {
                    a: cell(row, columns.a)?,
                    b: cell(row, columns.b)?,
                },
                line: row.line,
            })
        })
        .collect::<Result<_, _>>()?;
    if pairs.is_empty() {
        return Err(InputError::new(
            Place::file(source.path()),
            Problem::NoPairs,
        ));
    }
    Ok(pairs)
}
