//! A table of a finished run, its columns found by name: later versions may add some.

use std::path::Path;

use super::RunError;
use crate::input::{nearest_few, Bytes, InputError, Place, Problem, Source};

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
    /// [`RunError`] for a file that is missing or no table.
    pub fn read(path: &Path) -> Result<Table, RunError> {
        Table::of(Source::read(path)?)
    }

    /// Takes the bytes of a table that has not been written yet for the file that it will be.
    ///
    /// # Errors
    /// [`RunError`] for bytes that are no table.
    pub fn parse(path: &Path, bytes: Vec<u8>) -> Result<Table, RunError> {
        Table::of(Source::of(Bytes::of(path, bytes))?)
    }

    fn of(source: Source) -> Result<Table, RunError> {
        let path = source.path();
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
    #[must_use]
    pub fn header(&self) -> &[String] {
        &self.header
    }

    /// The rows below the header.
    #[must_use]
    pub fn rows(&self) -> &[Row] {
        &self.rows
    }

    /// Where a column stands.
    ///
    /// # Errors
    /// [`RunError::NoColumn`].
    pub fn column(&self, name: &str) -> Result<usize, RunError> {
        let at = self.header.iter().position(|column| column == name);
        at.ok_or_else(|| RunError::NoColumn {
            place: Box::new(Place::file(self.source.path())),
            column: name.to_owned(),
            near: nearest_few(name, self.header.iter().map(String::as_str))
                .into_iter()
                .map(str::to_owned)
                .collect(),
        })
    }

    /// A cell; the table is rectangular.
    #[must_use]
    pub fn text<'r>(&self, row: &'r Row, column: usize) -> &'r str {
        row.cells.get(column).unwrap_or_default()
    }

    /// A cell as a number, NaN where it is empty.
    ///
    /// # Errors
    /// [`RunError::Cell`].
    pub fn number(&self, row: &Row, column: usize) -> Result<f64, RunError> {
        match self.text(row, column) {
            "" => Ok(f64::NAN),
            cell => cell
                .parse()
                .map_err(|_| self.fault(row, column, "a number")),
        }
    }

    /// Says what is wrong with a cell.
    #[must_use]
    pub fn fault(&self, row: &Row, column: usize, expected: &str) -> RunError {
        RunError::Cell {
            place: Box::new(Place::line(self.source.path(), row.line).column(column + 1)),
            expected: expected.to_owned(),
            found: self.text(row, column).to_owned(),
        }
    }
}
