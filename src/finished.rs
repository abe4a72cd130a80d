//! A finished run read again: its record and its tables, columns found by name, since another version
//! may have written them.

mod fault;
mod run;
mod table;

pub(crate) use fault::hint;
pub use fault::RunError;
pub use run::{Run, Species};
pub use table::{Row, Table};
