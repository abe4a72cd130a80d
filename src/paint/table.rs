//! A table of a finished run, its columns found by name: later versions may add some.

use std::path::Path;

use super::PaintError;
use crate::input::{nearest_few, InputError, Place, Problem, Source};

/// A table of a run.
#[derive(Debug)]
pub struct Table {
    source: Source,
    header: Vec<String>,
    rows: Vec<Row>,
}

/// A row of a table.
#[derive(Debug)]
pub struct Row {
    line: u64,
    cells: csv::StringRecord,
}

impl Table {
    /// Reads a table that a run has written.
    ///
    /// # Errors
    /// [`PaintError`] for a file that is missing or no table.
    pub fn read(path: &Path) -> Result<Table, PaintError> {
        let source = Source::read(path)?;
        let unreadable = |e: csv::Error| {
            let line = e.position().map(csv::Position::line);
            let place = line.map_or_else(|| Place::file(path), |line| Place::line(path, line));
            InputError::new(place, Problem::Unreadable(e.to_string()))
        };
        let mut reader = csv::Reader::from_reader(source.text.as_bytes());
        let header = reader.headers().map_err(unreadable)?;
        let header = header.iter().map(str::to_owned).collect();
        let mut rows = Vec::new();
        for cells in reader.records() {
            let cells = cells.map_err(unreadable)?;
            rows.push(Row {
                line: cells.position().map_or(0, csv::Position::line),
                cells,
            });
        }
        Ok(Table {
            source,
            header,
            rows,
        })
    }

    /// Names of the columns.
    pub fn header(&self) -> &[String] {
        &self.header
    }

    /// The rows below the header.
    pub fn rows(&self) -> &[Row] {
        &self.rows
    }

    /// Where a column stands.
    ///
    /// # Errors
    /// [`PaintError::NoColumn`].
    pub fn column(&self, name: &str) -> Result<usize, PaintError> {
        let at = self.header.iter().position(|column| column == name);
        at.ok_or_else(|| PaintError::NoColumn {
            place: Box::new(Place::file(self.source.path())),
            column: name.to_owned(),
            near: nearest_few(name, self.header.iter().map(String::as_str))
                .into_iter()
                .map(str::to_owned)
                .collect(),
        })
    }

    /// A cell; the table is rectangular.
    pub fn text<'r>(&self, row: &'r Row, column: usize) -> &'r str {
        row.cells.get(column).unwrap_or_default()
    }

    /// A cell as a number, NaN where it is empty.
    ///
    /// # Errors
    /// [`PaintError::Cell`].
    pub fn number(&self, row: &Row, column: usize) -> Result<f64, PaintError> {
        match self.text(row, column) {
            "" => Ok(f64::NAN),
            cell => cell
                .parse()
                .map_err(|_| self.fault(row, column, "a number")),
        }
    }

    /// Says what is wrong with a cell.
    pub fn fault(&self, row: &Row, column: usize, expected: &str) -> PaintError {
        PaintError::Cell {
            place: Box::new(Place::line(self.source.path(), row.line).column(column + 1)),
            expected: expected.to_owned(),
            found: self.text(row, column).to_owned(),
        }
    }
}
