//! Why a finished run could not be read, in words.

use thiserror::Error;

use crate::input::{InputError, Place};
use crate::report::RecordError;

/// Why a finished run could not be read.
#[derive(Debug, Error)]
pub enum RunError {
    /// A table that cannot be read.
    #[error(transparent)]
    Input(#[from] InputError),
    /// A folder without a finished run.
    #[error(transparent)]
    Record(#[from] RecordError),
    /// A table without a column that is needed.
    #[error("{place}: the table lacks the column {column:?}{}; run kinmark locate again", hint(.near))]
    NoColumn {
        /// The file.
        place: Box<Place>,
        /// The column.
        column: String,
        /// Near names among those there are.
        near: Vec<String>,
    },
    /// A cell of a table that the program did not write so.
    #[error("{place}: expected {expected}, found {found:?}; the table was changed after its run: run kinmark locate again")]
    Cell {
        /// Where.
        place: Box<Place>,
        /// What was expected.
        expected: String,
        /// What came.
        found: String,
    },
}

/// Near spellings in words, with a blank before; empty where there are none.
pub(crate) fn hint(near: &[String]) -> String {
    if near.is_empty() {
        return String::new();
    }
    let words: Vec<String> = near.iter().map(|word| format!("{word:?}")).collect();
    format!(" (did you mean {}?)", words.join(" or "))
}
