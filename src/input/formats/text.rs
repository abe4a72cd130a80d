//! Tables of text, with labels above and before the numbers, in one of these places, or nowhere.

use std::collections::HashSet;

use ndarray::Array2;

use super::{edges, Wanted};
use crate::input::delimited::{self, Row, Separator, Table};
use crate::input::error::{InputError, Place, Problem};
use crate::input::grid::{Grid, Label, Origin};
use crate::input::source::Source;

/// Spellings of a missing entry, besides the empty cell.
const MISSING: [&str; 6] = ["na", "n/a", "nan", "null", "none", "-"];

/// Reads a table, or a list of connections, from a text.
///
/// # Errors
/// [`InputError`] for rows of different length and cells that are no number.
pub fn read(source: &Source, wanted: &Wanted<'_>) -> Result<Grid, InputError> {
    let path = source.path();
    wanted
        .no_arrays("a text table")
        .map_err(|fault| InputError::new(Place::file(path), fault.into()))?;
    let table = delimited::parse(source)?;
    if edges::is_list(&table.header) {
        return edges::read(table, path, wanted);
    }
    let Table {
        separator,
        header,
        rows,
    } = table;
    let mut rows: Vec<Row> = std::iter::once(header).chain(rows).collect();
    let layout = Layout::of(&rows, separator, wanted.labels.map(<[Label]>::len));
    let skip = usize::from(layout.column);
    let width = rows[0].cells.len() - skip;

    let label = |row: &Row, at: usize| Label {
        text: row.cells.get(at).unwrap_or("").to_owned(),
        place: Place::line(path, row.line).column(at + 1),
    };
    let column_labels = layout.header.then(|| {
        let header = rows.remove(0);
        (skip..skip + width)
            .map(|at| label(&header, at))
            .collect::<Vec<Label>>()
    });
    let row_labels = layout
        .column
        .then(|| rows.iter().map(|row| label(row, 0)).collect::<Vec<Label>>());

    let mut values = Vec::with_capacity(rows.len() * width);
    for (i, row) in rows.iter().enumerate() {
        for j in 0..width {
            let cell = row.cells.get(skip + j).unwrap_or("");
            let value = number(cell, separator).map_err(|problem| {
                let place = Place::line(path, row.line).column(skip + j + 1);
                InputError::new(
                    match (&row_labels, &column_labels) {
                        (Some(rows), Some(columns)) => {
                            place.parcel(&format!("{} to {}", rows[i].text, columns[j].text))
                        }
                        _ => place,
                    },
                    problem,
                )
            })?;
            values.push(value);
        }
    }
    Ok(Grid {
        file: path.to_path_buf(),
        values: Array2::from_shape_vec((rows.len(), width), values)
            .expect("a number was taken from every cell"),
        row_labels,
        column_labels,
        origin: Origin::Lines { rows, skip },
    })
}

/// Where a table holds labels.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
struct Layout {
    /// In its first row.
    header: bool,
    /// In its first column.
    column: bool,
}

impl Layout {
    const BOTH: Layout = Layout {
        header: true,
        column: true,
    };
    const HEADER: Layout = Layout {
        header: true,
        column: false,
    };
    const COLUMN: Layout = Layout {
        header: false,
        column: true,
    };
    const NEITHER: Layout = Layout {
        header: false,
        column: false,
    };

    /// Labels stand in the first row and the first column, unless these hold numbers and the matrix
    /// is square without them. `given` is how many labels a file of their own holds.
    fn of(rows: &[Row], separator: Separator, given: Option<usize>) -> Layout {
        let (height, width) = (rows.len(), rows[0].cells.len());
        let numeric = |cell: &&str| could_be_number(cell, separator);
        let corner = rows[0].cells.get(0).unwrap_or("");
        let above: Vec<&str> = rows[0].cells.iter().skip(1).collect();
        let before: Vec<&str> = rows[1..]
            .iter()
            .map(|row| row.cells.get(0).unwrap_or(""))
            .collect();
        if corner.is_empty() {
            return Layout::BOTH;
        }
        let row_is_numbers = above.iter().all(numeric);
        let column_is_numbers = !before.is_empty() && before.iter().all(numeric);
        // Whatever stands both above and before the rest is labels, even if a row or column lacks.
        let same = {
            let (above, before): (HashSet<&&str>, HashSet<&&str>) =
                (above.iter().collect(), before.iter().collect());
            above.is_subset(&before) || before.is_subset(&above)
        };
        if numeric(&corner) && row_is_numbers && column_is_numbers {
            let header_is_ids = are_ids(rows[0].cells.iter());
            let column_is_ids = are_ids(std::iter::once(corner).chain(before.iter().copied()));
            let both_are_ids = are_ids(above.iter().copied()) && are_ids(before.iter().copied());
            return if same && both_are_ids && given != Some(width) {
                Layout::BOTH
            } else if given == Some(height) {
                // A label for every row: none of them is a header.
                Layout::NEITHER
            } else if height == width + 1 && header_is_ids {
                Layout::HEADER
            } else if width == height + 1 && column_is_ids {
                Layout::COLUMN
            } else {
                Layout::NEITHER
            };
        }
        if column_is_numbers && !same {
            let no_labels = !row_is_numbers && !are_ids(before.iter().copied());
            if height == width + 1 || no_labels {
                return Layout::HEADER;
            }
        }
        if row_is_numbers && width == height + 1 && !same {
            return Layout::COLUMN;
        }
        Layout::BOTH
    }
}

/// Whether all are whole numbers, none twice, as labels may be.
fn are_ids<'c>(cells: impl Iterator<Item = &'c str>) -> bool {
    let mut seen = HashSet::new();
    let mut cells = cells;
    cells.all(|cell| {
        !cell.is_empty() && cell.bytes().all(|b| b.is_ascii_digit()) && seen.insert(cell)
    })
}

/// Whether a cell is a number, stands for a missing one, or is one with a decimal comma.
fn could_be_number(cell: &str, separator: Separator) -> bool {
    !matches!(number(cell, separator), Err(Problem::NotANumber(_)))
}

/// Whether a cell stands for a missing entry.
fn is_missing(cell: &str) -> bool {
    cell.is_empty() || MISSING.contains(&cell.to_ascii_lowercase().as_str())
}

/// One cell as a number; NaN where it stands for a missing one.
pub fn number(cell: &str, separator: Separator) -> Result<f64, Problem> {
    if let Ok(value) = cell.parse() {
        return Ok(value);
    }
    if is_missing(cell) {
        return Ok(f64::NAN);
    }
    let pointed = cell.replacen(',', ".", 1);
    if separator != Separator::Comma && pointed.parse::<f64>().is_ok() {
        return Err(Problem::DecimalComma(cell.to_owned()));
    }
    Err(Problem::NotANumber(cell.to_owned()))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn layout(text: &str, given: Option<usize>) -> Layout {
        let rows: Vec<Row> = text
            .lines()
            .zip(1..)
            .map(|(line, at)| Row {
                line: at,
                cells: line.split(',').collect(),
            })
            .collect();
        Layout::of(&rows, Separator::Comma, given)
    }

    #[test]
    fn labels_are_found_where_they_stand() {
        assert_eq!(layout("x,p,q\np,0,1\nq,1,0", None), Layout::BOTH);
        assert_eq!(layout(",p,q\np,0,1\nq,1,0", None), Layout::BOTH);
        assert_eq!(layout("p,q\n0,1\n1,n/a", None), Layout::HEADER);
        assert_eq!(layout("p,0,1\nq,1,0", None), Layout::COLUMN);
        assert_eq!(layout("0,1,1\n1,0,1\n2,1,0", None), Layout::NEITHER);
        assert_eq!(layout("nan,1,1\n1,nan,1\n2,1,nan", None), Layout::NEITHER);
    }

    #[test]
    fn labels_that_are_numbers_are_told_by_the_shape() {
        assert_eq!(layout("parcel,7,9\n7,0,1\n9,1,0", None), Layout::BOTH);
        assert_eq!(layout("0,7,9\n7,0,1\n9,1,0", None), Layout::BOTH);
        assert_eq!(layout("0,7,9\n7,0,1\n9,1,0", Some(3)), Layout::NEITHER);
        assert_eq!(layout("7,9\n0,1\n1,0", None), Layout::HEADER);
        assert_eq!(layout("7,0,1\n9,1,0", None), Layout::COLUMN);
        // A row too few does not make a label of the corner.
        assert_eq!(layout("parcel,7,9,8\n7,0,1,1\n9,1,0,1", None), Layout::BOTH);
        assert_eq!(layout("0,7,9,8\n7,0,1,1\n9,1,0,1", None), Layout::BOTH);
    }

    #[test]
    fn a_header_above_a_table_that_is_not_square_stays_one() {
        assert_eq!(layout("p,q,r\n0,1,2\n0,0,3", None), Layout::HEADER);
    }
}
