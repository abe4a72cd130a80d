//! What can be wrong with an input file: where, what was expected, what came, what to do.

use std::fmt;
use std::path::{Path, PathBuf};

use super::formats::Fault;
use super::gifti::GiftiFault;
use super::parcel_fault::ParcelFault;
use crate::domain::Side;

/// A place in an input file, as exactly as it is known.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Place {
    /// The file.
    pub file: PathBuf,
    /// Array of a file that holds several.
    pub array: Option<String>,
    /// Line, counted from 1.
    pub line: Option<u64>,
    /// Row of a table without lines, counted from 1.
    pub row: Option<usize>,
    /// Column of a table or character of a line, counted from 1.
    pub column: Option<usize>,
    /// Parcel or landmark the entry belongs to.
    pub parcel: Option<String>,
}

impl Place {
    /// A whole file.
    #[must_use]
    pub fn file(file: &Path) -> Self {
        Place {
            file: file.to_path_buf(),
            array: None,
            line: None,
            row: None,
            column: None,
            parcel: None,
        }
    }

    /// A line of a file.
    #[must_use]
    pub fn line(file: &Path, line: u64) -> Self {
        Place {
            line: Some(line),
            ..Place::file(file)
        }
    }

    /// The same file, in an array of it.
    #[must_use]
    pub fn array(self, name: &str) -> Self {
        Place {
            array: Some(name.to_owned()),
            ..self
        }
    }

    /// The same table, at a row.
    #[must_use]
    pub fn row(self, row: usize) -> Self {
        Place {
            row: Some(row),
            ..self
        }
    }

    /// The same line or row, at a column.
    #[must_use]
    pub fn column(self, column: usize) -> Self {
        Place {
            column: Some(column),
            ..self
        }
    }

    /// The same place, naming the parcel or landmark.
    #[must_use]
    pub fn parcel(self, parcel: &str) -> Self {
        Place {
            parcel: Some(parcel.to_owned()),
            ..self
        }
    }
}

impl Place {
    /// The place in words, without the file.
    #[must_use]
    pub fn within_file(&self) -> String {
        let parts = [
            self.array.as_ref().map(|array| format!("array {array:?}")),
            self.line.map(|line| format!("line {line}")),
            self.row.map(|row| format!("row {row}")),
            self.column.map(|column| format!("column {column}")),
        ];
        parts.into_iter().flatten().collect::<Vec<_>>().join(", ")
    }
}

impl fmt::Display for Place {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}", self.file.display())?;
        let within = self.within_file();
        if !within.is_empty() {
            write!(f, ", {within}")?;
        }
        if let Some(parcel) = &self.parcel {
            write!(f, " ({parcel})")?;
        }
        Ok(())
    }
}

/// A fault in an input file.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[error("{place}: {problem}")]
pub struct InputError {
    /// Where; boxed to keep results small.
    pub place: Box<Place>,
    /// What.
    pub problem: Box<Problem>,
}

impl InputError {
    /// Puts place and problem together.
    #[must_use]
    pub fn new(place: Place, problem: Problem) -> Self {
        InputError {
            place: Box::new(place),
            problem: Box::new(problem),
        }
    }
}

/// What is wrong. The wording of every message lives here, save that of single formats.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum Problem {
    /// A fault of one format of matrices.
    #[error(transparent)]
    Format(#[from] Fault),
    /// A fault of a file of labels of a surface.
    #[error(transparent)]
    Gifti(#[from] GiftiFault),
    /// A fault in what is said of parcels.
    #[error(transparent)]
    Parcels(#[from] ParcelFault),
    /// No such file.
    #[error("there is no such file; check the path (in a study file it is relative to that file's folder)")]
    NotFound,
    /// A folder stands where a file was expected.
    #[error("expected a file, found a folder; name a file in it")]
    IsFolder,
    /// The system refused to read it.
    #[error("cannot be read: {0}")]
    Unreadable(String),
    /// Nothing in it.
    #[error("the file is empty; check that it was saved, and that it is the one you mean")]
    EmptyFile,
    /// UTF-16 text.
    #[error("expected UTF-8 text, found UTF-16; save the file again as UTF-8 (in a spreadsheet: CSV UTF-8)")]
    Utf16,
    /// Bytes that are no text.
    #[error("expected UTF-8 text, found the byte {0:#04x}, which is none; save the file again as UTF-8 (in a spreadsheet: CSV UTF-8)")]
    NotText(u8),
    /// A study file that is no TOML.
    #[error("not valid TOML: {0}")]
    Toml(String),
    /// A key the study file does not know.
    #[error("unknown key {found:?} in {table}; did you mean {nearest:?}? Known here: {known}")]
    UnknownKey {
        /// The key.
        found: String,
        /// Table it stands in.
        table: String,
        /// Most similar known key.
        nearest: String,
        /// All known keys.
        known: String,
    },
    /// A key that another table knows.
    #[error("key {found:?} does not belong in {table} but in {belongs}; move it there")]
    MisplacedKey {
        /// The key.
        found: String,
        /// Table it stands in.
        table: String,
        /// Table it belongs in.
        belongs: String,
    },
    /// A key that must be there is not.
    #[error("{table} lacks the key {key:?}; add a line such as: {example}")]
    MissingKey {
        /// The key.
        key: &'static str,
        /// Table it belongs in.
        table: String,
        /// A line that would do.
        example: String,
    },
    /// A species nothing is said about.
    #[error("there is no table {0}; add it, with the species' name, matrix and weights")]
    MissingTable(String),
    /// A value of the wrong type or out of range.
    #[error("{key} must be {expected}, found {found}")]
    BadValue {
        /// The key.
        key: String,
        /// What it must be.
        expected: String,
        /// What came.
        found: String,
    },
    /// A value outside a fixed list.
    #[error("unknown value {found:?} for {key}; did you mean {nearest:?}? Known: {known}")]
    UnknownValue {
        /// The key.
        key: String,
        /// The value.
        found: String,
        /// Most similar known value.
        nearest: String,
        /// All known values.
        known: String,
    },
    /// A transform that does not suit the weights.
    #[error("transform {transform:?} cannot be used on weights {weights:?}: {why}; leave the key out for the default")]
    TransformMismatch {
        /// The transform asked for.
        transform: String,
        /// The kind of weights.
        weights: String,
        /// The reason.
        why: &'static str,
    },
    /// Both species carry one name.
    #[error("both species are called {0:?}; give them different names, which the tables use to tell them apart")]
    SameName(String),
    /// A row with another number of cells than the header.
    #[error("expected {expected} cells as in the header, found {found}; fill or remove cells, and quote labels that contain the separator {separator}")]
    Ragged {
        /// Cells of the header.
        expected: usize,
        /// Cells of this row.
        found: usize,
        /// The separator in use, in words.
        separator: &'static str,
    },
    /// A header without a cell above the row labels.
    #[error("the header has {header} cells, every row below it {rows}; give the header a cell for every column, also above the row labels (such as \"parcel\")")]
    HeaderShort {
        /// Cells of the header.
        header: usize,
        /// Cells of every row.
        rows: usize,
    },
    /// A cell with a line break in it.
    #[error("a cell in quotes goes on over the end of the line; close the quote, or keep the cell on one line")]
    LineBreak,
    /// Only one column: no separator recognised.
    #[error("found a single column; expected cells separated by commas, semicolons or tabs")]
    OneColumn,
    /// A cell that is no number.
    #[error("expected a number, found {0:?}; remove text and units from the matrix")]
    NotANumber(String),
    /// A number with a decimal comma.
    #[error("expected a number with a decimal point, found {0:?}; write decimal points instead of commas")]
    DecimalComma(String),
    /// An infinite number.
    #[error("expected a finite number, found {found:?}; {}", if *.logarithm { "where this is the logarithm of an absent connection, give the weights themselves and say weights = \"fractions\" or \"counts\"" } else { "correct the entry" })]
    Infinite {
        /// What came.
        found: String,
        /// Whether it should have been a logarithm.
        logarithm: bool,
    },
    /// A negative count, fraction or ordinal.
    #[error("expected a weight of zero or more ({weights}), found {found}; if negative weights are meant, say weights = \"correlations\", \"log10\" or \"other\"")]
    Negative {
        /// The kind of weights.
        weights: String,
        /// The weight.
        found: f64,
    },
    /// Nearly square: a line seems to be lost.
    #[error("expected a square matrix, found {rows} rows and {columns} columns of data; every parcel needs a row and a column, but {label:?} has no {lacks}. If these links were not measured, add rows = \"sources\" or rows = \"targets\" to the species in the study file")]
    LineLost {
        /// Rows of data.
        rows: usize,
        /// Columns of data.
        columns: usize,
        /// The first parcel without a partner.
        label: String,
        /// `row` or `column`, whichever it lacks.
        lacks: &'static str,
    },
    /// Some lines are rows and columns, others only rows, others only columns.
    #[error("found {rows} rows and {columns} columns of data, and the {is} {label:?} is no {lacks}{}; in a square matrix every parcel has a row and a column, and in a rectangular one the areas on the shorter side are among those on the longer. Correct the label, or, if the two sides are different areas, add rows = \"sources\" or rows = \"targets\" to the species in the study file", hint(near))]
    LineAlone {
        /// Rows of data.
        rows: usize,
        /// Columns of data.
        columns: usize,
        /// The first label of the shorter side that is not on the longer one.
        label: String,
        /// `row` or `column`, whichever it is.
        is: &'static str,
        /// The other, which it lacks.
        lacks: &'static str,
        /// Near spellings on the longer side.
        near: Vec<String>,
    },
    /// An empty label.
    #[error("expected a parcel label, found an empty cell; every row and column needs a label")]
    EmptyLabel,
    /// A label that came before.
    #[error("the label {label:?} came before, at {first}; every parcel needs a label of its own")]
    DuplicateLabel {
        /// The label.
        label: String,
        /// Where it came first.
        first: String,
    },
    /// A row label that no column carries, or the reverse.
    #[error(
        "{axis} label {label:?} is no {other} label{}; rows and columns must name the same parcels",
        hint(near)
    )]
    LabelMismatch {
        /// `row` or `column`.
        axis: &'static str,
        /// The other of the two.
        other: &'static str,
        /// The label.
        label: String,
        /// Near spellings.
        near: Vec<String>,
    },
    /// No connection at all.
    #[error("every weight off the diagonal is zero; expected at least some connections, so check what was exported")]
    AllZero,
    /// Nothing observed.
    #[error("of no parcel were enough entries observed to compare it with others; expected numbers, so check what was exported")]
    AllMissing,
    /// A folder or pattern without files.
    #[error("no matrices of subjects there; name a folder that holds them, a pattern such as \"subjects/*.csv\", a list of files, or one .npy of three axes")]
    NoSubjects,
    /// A pattern that cannot be understood.
    #[error(
        "this pattern of file names is not understood: {0}; use * for any characters and ? for one"
    )]
    BadPattern(String),
    /// Too few individuals to draw again.
    #[error("found {found} subjects with the same parcels, at least {needed} are needed to tell how much they differ{}; give more subjects, or a group matrix alone as matrix", aside(set_aside))]
    TooFewSubjects {
        /// Subjects that can be used.
        found: usize,
        /// Subjects needed.
        needed: usize,
        /// Those that cannot, and why.
        set_aside: Vec<(String, String)>,
    },
    /// Too few columns to compare parcels by.
    #[error("found {found} columns of data to compare parcels by, at least {needed} are needed; give links with more areas")]
    TooFewColumns {
        /// Columns found.
        found: usize,
        /// Columns needed.
        needed: usize,
    },
    /// Too few parcels to embed.
    #[error("found {found} parcels with connections, at least {needed} are needed; give a matrix of more parcels")]
    TooFewParcels {
        /// Parcels with a connection.
        found: usize,
        /// Parcels needed.
        needed: usize,
    },
    /// A table without a column it needs.
    #[error("the table lacks the column {missing:?}; found {found}. Expected landmark,a,b and optionally weight, block, basis")]
    MissingColumn {
        /// The column.
        missing: &'static str,
        /// Columns found.
        found: String,
    },
    /// A table of pairs without a column it needs.
    #[error("the table of pairs lacks the column {missing:?}; found {found}. Expected a,b: a parcel of either species in each row")]
    PairColumn {
        /// The column.
        missing: &'static str,
        /// Columns found.
        found: String,
    },
    /// A table of pairs without a row.
    #[error("expected rows of a parcel of a and a parcel of b, found none; add pairs")]
    NoPairs,
    /// A column that came before.
    #[error("the column {0:?} came before in this line; keep one of them")]
    ColumnTwice(String),
    /// A column that looks like a slip for a known one.
    #[error("unknown column {found:?}; did you mean {nearest:?}? Rename or remove it")]
    UnknownColumn {
        /// The column.
        found: String,
        /// Most similar known column.
        nearest: String,
    },
    /// A landmark names a parcel its species does not have.
    #[error("species {} ({species}) has no parcel {parcel:?}{}; use a label of its matrix", side.letter(), hint(near))]
    UnknownParcel {
        /// The species.
        side: Side,
        /// Its name.
        species: String,
        /// The parcel.
        parcel: String,
        /// Near spellings.
        near: Vec<String>,
    },
    /// A parcel that an earlier landmark uses.
    #[error("parcel {parcel:?} of species {} is already part of landmark {landmark:?} at line {line}; a parcel belongs to one landmark at most", side.letter())]
    ParcelTwice {
        /// The species.
        side: Side,
        /// The parcel.
        parcel: String,
        /// The landmark that has it.
        landmark: String,
        /// Its line.
        line: u64,
    },
    /// A landmark name that came before.
    #[error("landmark {name:?} came before, at line {line}; give each landmark one row with a name of its own")]
    LandmarkTwice {
        /// The name.
        name: String,
        /// Line of the first.
        line: u64,
    },
    /// A landmark row without name or parcel.
    #[error("expected {0}, found an empty cell; fill it in or remove the row")]
    EmptyCell(&'static str),
    /// A landmark weight outside (0, 1].
    #[error("expected a weight above 0 and at most 1, found {0:?}; leave the cell empty for 1")]
    LandmarkWeight(String),
    /// Fewer landmarks than any alignment needs.
    #[error("found {found} landmarks, at least {needed} are needed; add rows")]
    TooFewLandmarks {
        /// Landmarks found.
        found: usize,
        /// Landmarks needed.
        needed: usize,
    },
    /// Landmarks enough, but in fewer blocks than can be left out one by one.
    #[error("{landmarks} landmarks count as {found} because those of one block are left out together; at least {needed} blocks are needed: add landmarks, or divide the blocks where their landmarks are independent")]
    TooFewBlocks {
        /// Landmarks found.
        landmarks: usize,
        /// Blocks they form.
        found: usize,
        /// Blocks needed.
        needed: usize,
    },
    /// Fewer independent landmarks than axes + 1.
    #[error("{found} landmarks{} cannot fix {axes} axes: at least {} are needed; ask for at most {} axes or add landmarks", blocks(*found, *in_blocks), axes.saturating_add(1), in_blocks.saturating_sub(1))]
    FewerLandmarksThanAxes {
        /// Landmarks found.
        found: usize,
        /// Blocks they form.
        in_blocks: usize,
        /// Axes asked for.
        axes: usize,
    },
    /// A matrix without any axis.
    #[error("the connectivity of species {} yields no axis at all; check that its weights differ, span no more than numbers can hold, and are of the kind the study file states", side.letter())]
    NoAxes {
        /// The species.
        side: Side,
    },
    /// More axes than the matrix yields.
    #[error("{axes} axes were asked for, but the connectivity of species {} yields only {available}; ask for fewer", side.letter())]
    TooManyAxes {
        /// The species.
        side: Side,
        /// Axes asked for.
        axes: usize,
        /// Axes it has.
        available: usize,
    },
    /// Evidence that was asked for by name and has nothing to go by.
    #[error("evidence {kind} was asked for alone, but is unavailable: {why}; ask for evidence = \"mixture\", which does without it")]
    EvidenceUnavailable {
        /// The kind.
        kind: String,
        /// The reason.
        why: String,
    },
    /// Mass by area without areas.
    #[error("mass = \"area\" needs the area of every parcel of both species, but those of species {} are not known; ask for mass = \"uniform\" or \"free\"", side.letter())]
    NoAreas {
        /// A species without areas.
        side: Side,
    },
    /// The multi-scale diffusion time on a disconnected affinity.
    #[error("diffusion-time 0 (all scales) needs a connected affinity, but that of species {} falls apart; set diffusion-time to 1 or more", side.letter())]
    Disconnected {
        /// The species.
        side: Side,
    },
}

/// Near spellings in words, with a blank before; empty where there are none.
pub(super) fn hint(near: &[String]) -> String {
    if near.is_empty() {
        return String::new();
    }
    let words: Vec<String> = near.iter().map(|w| format!("{w:?}")).collect();
    format!(" (did you mean {}?)", words.join(" or "))
}

/// Subjects that cannot be used, in words.
fn aside(subjects: &[(String, String)]) -> String {
    subjects
        .iter()
        .take(3)
        .map(|(name, why)| format!(" ({name}: {why})"))
        .collect()
}

fn blocks(landmarks: usize, blocks: usize) -> String {
    if landmarks == blocks {
        String::new()
    } else {
        format!(" in {blocks} blocks")
    }
}
