//! Which parcels the rows and columns of a matrix stand for: by its own labels, by files of labels,
//! by both.

use std::collections::{HashMap, HashSet};
use std::path::Path;

use crate::input::error::{InputError, Place, Problem};
use crate::input::formats::Fault;
use crate::input::grid::{Grid, Label};
use crate::input::label_file::LabelFile;
use crate::input::nearest::nearest_few;

/// A matrix whose shorter side has this share of the longer one's lines is rather a square one that
/// lost some than a rectangular one, unless the study says otherwise. Common practice, no source:
/// tracer data seldom cover more than half of the areas.
const NEARLY_SQUARE: f64 = 0.8;

/// What is known about rows and columns besides the matrix itself.
#[derive(Debug, Clone, Copy, Default)]
pub struct Given<'k> {
    /// Labels of the parcels.
    pub labels: Option<&'k LabelFile>,
    /// Labels of the columns, where these differ.
    pub column_labels: Option<&'k LabelFile>,
    /// Whether the study says what rows are, so that they may be other things than columns.
    pub orientation_stated: bool,
}

/// How the labels of rows and columns relate.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Shape {
    /// The same parcels.
    Square,
    /// Rows are all parcels, columns fewer of them.
    ColumnsWithin,
    /// Columns are all parcels, rows fewer of them.
    RowsWithin,
    /// Rows are parcels, columns (at least some) are other things.
    ColumnsElse,
    /// Columns are parcels, rows carry no labels.
    RowsElse,
}

/// The labels of a matrix, settled.
#[derive(Debug)]
pub struct Lines {
    /// A label for each row.
    pub rows: Vec<String>,
    /// A label for each column, in the order of `column`.
    pub columns: Vec<String>,
    /// Where each of these columns stands in the file.
    pub column: Vec<usize>,
    /// How the two relate.
    pub shape: Shape,
}

impl Lines {
    /// Settles which parcels rows and columns stand for, and takes the grid's labels.
    ///
    /// # Errors
    /// [`InputError`] where labels are missing, come twice, are too few, or where rows and columns
    /// differ in a way that nothing explains.
    pub fn settle(grid: &mut Grid, given: Given<'_>) -> Result<Lines, InputError> {
        let (rows, columns) = grid.values.dim();
        let own = (grid.row_labels.take(), grid.column_labels.take());
        let file = grid.file.as_path();
        for file in [given.labels, given.column_labels].into_iter().flatten() {
            check(&file.labels)?;
        }
        if let (Some(labels), None) = (given.labels, given.column_labels) {
            if rows == columns {
                return renamed_square(own, labels, file, (rows, columns));
            }
        }
        for labels in [&own.1, &own.0].into_iter().flatten() {
            check(labels)?;
        }
        let (for_rows, for_columns) = match (given.labels, given.column_labels) {
            (Some(labels), None) if labels.labels.len() == columns => (None, Some(labels)),
            both => both,
        };
        let of_rows = replaced(own.0, for_rows, rows, file, "rows")?;
        let of_columns = replaced(own.1, for_columns, columns, file, "columns")?;
        match (of_rows, of_columns) {
            (Some(of_rows), Some(of_columns)) => both(of_rows, of_columns, given, file),
            (Some(labels), None) | (None, Some(labels)) if rows == columns => {
                Ok(square(labels, (0..columns).collect()))
            }
            (None, None) => Err(InputError::new(
                Place::file(file),
                Fault::NoLabels { rows }.into(),
            )),
            _ if !given.orientation_stated => Err(InputError::new(
                Place::file(file),
                Fault::NotSquare { rows, columns }.into(),
            )),
            (Some(labels), None) => Ok(Lines {
                columns: nameless("column", columns, &labels),
                rows: texts(labels),
                column: (0..columns).collect(),
                shape: Shape::ColumnsElse,
            }),
            (None, Some(labels)) => Ok(Lines {
                rows: nameless("row", rows, &labels),
                columns: texts(labels),
                column: (0..columns).collect(),
                shape: Shape::RowsElse,
            }),
        }
    }
}

fn square(labels: Vec<Label>, column: Vec<usize>) -> Lines {
    let labels = texts(labels);
    Lines {
        columns: labels.clone(),
        rows: labels,
        column,
        shape: Shape::Square,
    }
}

/// Rows and columns that both carry labels.
fn both(
    rows: Vec<Label>,
    columns: Vec<Label>,
    given: Given<'_>,
    file: &Path,
) -> Result<Lines, InputError> {
    let known = |labels: &[Label]| -> HashSet<String> {
        labels.iter().map(|label| label.text.clone()).collect()
    };
    let (of_rows, of_columns) = (known(&rows), known(&columns));
    let shape = match (
        of_columns.is_subset(&of_rows),
        of_rows.is_subset(&of_columns),
    ) {
        (true, true) => {
            let column = column_order(&rows, &columns)?;
            return Ok(square(rows, column));
        }
        (true, false) => Shape::ColumnsWithin,
        (false, true) => Shape::RowsWithin,
        (false, false) if given.orientation_stated => Shape::ColumnsElse,
        (false, false) if rows.len() == columns.len() => {
            column_order(&rows, &columns)?;
            Shape::Square
        }
        (false, false) => {
            return Err(InputError::new(Place::file(file), alone(&rows, &columns)));
        }
    };
    let (few, many) = (rows.len().min(columns.len()), rows.len().max(columns.len()));
    if !given.orientation_stated && few as f64 >= NEARLY_SQUARE * many as f64 {
        return Err(InputError::new(Place::file(file), lost(&rows, &columns)));
    }
    Ok(Lines {
        column: (0..columns.len()).collect(),
        rows: texts(rows),
        columns: texts(columns),
        shape,
    })
}

/// A square matrix whose parcels a file of labels names; its own labels, if any, still say which
/// column belongs to which row.
fn renamed_square(
    own: (Option<Vec<Label>>, Option<Vec<Label>>),
    given: &LabelFile,
    file: &Path,
    (rows, columns): (usize, usize),
) -> Result<Lines, InputError> {
    count(given, rows, "rows", file)?;
    let (own, column) = match own {
        (Some(of_rows), Some(of_columns)) if !same(&of_rows, &of_columns) => {
            check(&of_columns)?;
            check(&of_rows)?;
            let column = column_order(&of_rows, &of_columns)?;
            (Some(of_rows), column)
        }
        (of_rows, of_columns) => (of_rows.or(of_columns), (0..columns).collect()),
    };
    if let Some(own) = own {
        refuse_other_order(&own, given, file)?;
    }
    Ok(square(given.labels.clone(), column))
}

/// Labels of one axis: those of a file where one is given, else the matrix's own.
fn replaced(
    own: Option<Vec<Label>>,
    given: Option<&LabelFile>,
    lines: usize,
    file: &Path,
    axis: &'static str,
) -> Result<Option<Vec<Label>>, InputError> {
    let Some(given) = given else {
        return Ok(own);
    };
    count(given, lines, axis, file)?;
    if let Some(own) = own {
        refuse_other_order(&own, given, file)?;
    }
    Ok(Some(given.labels.clone()))
}

fn count(
    given: &LabelFile,
    lines: usize,
    axis: &'static str,
    matrix: &Path,
) -> Result<(), InputError> {
    if given.labels.len() == lines {
        return Ok(());
    }
    Err(InputError::new(
        Place::file(&given.file.path),
        Fault::LabelCount {
            found: given.labels.len(),
            lines,
            axis,
            matrix: matrix.to_path_buf(),
        }
        .into(),
    ))
}

/// Names for lines without labels, none of which is a label of the others.
fn nameless(line: &str, count: usize, others: &[Label]) -> Vec<String> {
    let known: HashSet<&str> = others.iter().map(|label| label.text.as_str()).collect();
    let mut before = format!("{line} ");
    while (1..=count).any(|k| known.contains(format!("{before}{k}").as_str())) {
        before.insert(0, '*');
    }
    (1..=count).map(|k| format!("{before}{k}")).collect()
}

fn texts(labels: Vec<Label>) -> Vec<String> {
    labels.into_iter().map(|label| label.text).collect()
}

fn same(one: &[Label], other: &[Label]) -> bool {
    one.iter()
        .map(|label| &label.text)
        .eq(other.iter().map(|label| &label.text))
}

/// Labels given for those of the matrix rename its parcels. The same labels in another order would
/// exchange them, which nobody means.
fn refuse_other_order(own: &[Label], given: &LabelFile, matrix: &Path) -> Result<(), InputError> {
    let Some(at) = (0..own.len()).find(|&i| own[i].text != given.labels[i].text) else {
        return Ok(());
    };
    let of = |labels| -> HashSet<String> { texts(labels).into_iter().collect() };
    if of(own.to_vec()) != of(given.labels.clone()) {
        return Ok(());
    }
    Err(InputError::new(
        given.labels[at].place.clone(),
        Fault::LabelsReordered {
            given: given.labels[at].text.clone(),
            own: own[at].text.clone(),
            matrix: matrix.to_path_buf(),
        }
        .into(),
    ))
}

/// Sees that no label is empty and none comes twice.
fn check(labels: &[Label]) -> Result<(), InputError> {
    let mut first: HashMap<&str, &Place> = HashMap::new();
    for Label { text, place } in labels {
        if text.is_empty() {
            return Err(InputError::new(place.clone(), Problem::EmptyLabel));
        }
        if let Some(before) = first.insert(text, place) {
            return Err(InputError::new(
                place.clone().parcel(text),
                Problem::DuplicateLabel {
                    label: text.clone(),
                    first: before.within_file(),
                },
            ));
        }
    }
    Ok(())
}

/// The fault of a matrix of which some lines are both rows and columns, some on the longer axis only,
/// and some, against all expectation, on the shorter only: by the first of these.
fn alone(rows: &[Label], columns: &[Label]) -> Problem {
    let (more, fewer, is, lacks) = if rows.len() > columns.len() {
        (rows, columns, "column", "row")
    } else {
        (columns, rows, "row", "column")
    };
    let known: HashSet<&str> = more.iter().map(|label| label.text.as_str()).collect();
    let label = fewer
        .iter()
        .find(|label| !known.contains(label.text.as_str()))
        .map_or_else(String::new, |label| label.text.clone());
    Problem::LineAlone {
        rows: rows.len(),
        columns: columns.len(),
        near: nearest_few(&label, more.iter().map(|l| l.text.as_str()))
            .into_iter()
            .map(str::to_owned)
            .collect(),
        label,
        is,
        lacks,
    }
}

/// The fault of a square matrix that lost lines, by the first of them.
fn lost(rows: &[Label], columns: &[Label]) -> Problem {
    let (more, fewer, lacks) = if rows.len() > columns.len() {
        (rows, columns, "column")
    } else {
        (columns, rows, "row")
    };
    let known: HashSet<&str> = fewer.iter().map(|label| label.text.as_str()).collect();
    Problem::LineLost {
        rows: rows.len(),
        columns: columns.len(),
        label: more
            .iter()
            .find(|label| !known.contains(label.text.as_str()))
            .map_or_else(String::new, |label| label.text.clone()),
        lacks,
    }
}

/// For each row, the column that carries its label.
fn column_order(rows: &[Label], columns: &[Label]) -> Result<Vec<usize>, InputError> {
    let at: HashMap<&str, usize> = columns
        .iter()
        .enumerate()
        .map(|(i, label)| (label.text.as_str(), i))
        .collect();
    rows.iter()
        .map(|Label { text, place }| {
            at.get(text.as_str()).copied().ok_or_else(|| {
                InputError::new(
                    place.clone().parcel(text),
                    Problem::LabelMismatch {
                        axis: "row",
                        other: "column",
                        label: text.clone(),
                        near: nearest_few(text, columns.iter().map(|c| c.text.as_str()))
                            .into_iter()
                            .map(str::to_owned)
                            .collect(),
                    },
                )
            })
        })
        .collect()
}
