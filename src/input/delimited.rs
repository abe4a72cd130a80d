//! Text tables with commas, semicolons or tabs between cells.

use csv::StringRecord;

use super::error::{InputError, Place, Problem};
use super::source::Source;

/// What separates the cells of a table.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Separator {
    /// `,`
    Comma,
    /// `;`
    Semicolon,
    /// A tab.
    Tab,
    /// Any number of blanks, where the table says nothing else and could be nothing else.
    Blanks,
}

impl Separator {
    const ALL: [Separator; 3] = [Separator::Comma, Separator::Semicolon, Separator::Tab];

    fn byte(self) -> u8 {
        match self {
            Separator::Comma => b',',
            Separator::Semicolon => b';',
            Separator::Tab => b'\t',
            Separator::Blanks => b' ',
        }
    }

    /// The separator in words, for messages.
    pub fn name(self) -> &'static str {
        match self {
            Separator::Comma => "(comma)",
            Separator::Semicolon => "(semicolon)",
            Separator::Tab => "(tab)",
            Separator::Blanks => "(blank)",
        }
    }

    /// The one that occurs most often outside quotes in the first line.
    fn of(text: &str) -> Separator {
        let first = text.lines().find(|l| !l.trim().is_empty()).unwrap_or("");
        let count = |separator: Separator| {
            let mut quoted = false;
            first
                .bytes()
                .filter(|b| {
                    quoted ^= *b == b'"';
                    !quoted && *b == separator.byte()
                })
                .count()
        };
        if Separator::ALL.into_iter().all(|s| count(s) == 0) && is_blank_separated(first) {
            return Separator::Blanks;
        }
        // `max_by_key` keeps the last of equals; commas are the commonest, so they come last.
        Separator::ALL
            .into_iter()
            .rev()
            .max_by_key(|s| count(*s))
            .unwrap_or(Separator::Comma)
    }
}

/// Whether a line is several numbers, or the header of an edge list, between blanks. Labels may hold
/// blanks, so blanks separate nothing else.
fn is_blank_separated(line: &str) -> bool {
    let words: Vec<&str> = line.split_whitespace().collect();
    words.len() > 1
        && (words.iter().all(|w| w.parse::<f64>().is_ok())
            || words == ["source", "target", "weight"])
}

/// One row of a table: its line in the file and its cells, without surrounding blanks.
#[derive(Debug, Clone)]
pub struct Row {
    /// Line the row starts on, counted from 1.
    pub line: u64,
    /// The cells.
    pub cells: StringRecord,
}

/// Counts lines. The csv reader's own count is that of the place where it went on reading, which
/// lies before the row itself where blank lines come between.
struct Lines<'t> {
    text: &'t [u8],
    at: usize,
    line: u64,
}

impl<'t> Lines<'t> {
    fn of(text: &'t str) -> Self {
        Lines {
            text: text.as_bytes(),
            at: 0,
            line: 1,
        }
    }

    /// The line of the first row at or after a byte; bytes must not go back.
    fn line_from(&mut self, byte: u64) -> u64 {
        let byte = usize::try_from(byte).unwrap_or(usize::MAX);
        while let Some(&here) = self.text.get(self.at) {
            if self.at >= byte && here != b'\n' {
                break;
            }
            self.line += u64::from(here == b'\n');
            self.at += 1;
        }
        self.line
    }
}

/// A table as read: a header and rows of the same width.
#[derive(Debug)]
pub struct Table {
    /// What separated the cells.
    pub separator: Separator,
    /// The first row.
    pub header: Row,
    /// All others.
    pub rows: Vec<Row>,
}

/// Splits a text into rows, all as wide as the header.
///
/// # Errors
/// [`InputError`] for a single column, a cell over several lines or a ragged row.
pub fn parse(source: &Source) -> Result<Table, InputError> {
    let separator = Separator::of(&source.text);
    if separator == Separator::Blanks {
        return tabulate(source, separator, blank_separated(&source.text));
    }
    let mut reader = csv::ReaderBuilder::new()
        .has_headers(false)
        .flexible(true)
        .delimiter(separator.byte())
        .trim(csv::Trim::All)
        .from_reader(source.text.as_bytes());
    let mut rows = Vec::new();
    let mut cells = StringRecord::new();
    let mut lines = Lines::of(&source.text);
    loop {
        match reader.read_record(&mut cells) {
            Ok(false) => break,
            Ok(true) => {
                let line = lines.line_from(cells.position().map_or(0, csv::Position::byte));
                // A quote without its partner swallows the lines below it.
                if let Some(at) = cells.iter().position(|c| c.contains('\n')) {
                    return Err(InputError::new(
                        Place::line(source.path(), line).column(at + 1),
                        Problem::LineBreak,
                    ));
                }
                rows.push(Row {
                    line,
                    cells: cells.clone(),
                });
            }
            Err(e) => {
                return Err(InputError::new(
                    Place::file(source.path()),
                    Problem::Unreadable(e.to_string()),
                ))
            }
        }
    }
    tabulate(source, separator, rows)
}

/// Rows of a text whose cells stand between blanks.
fn blank_separated(text: &str) -> Vec<Row> {
    text.lines()
        .zip(1..)
        .map(|(line, at)| Row {
            line: at,
            cells: line.split_whitespace().collect(),
        })
        .collect()
}

/// Parts the header from the rest and sees that all rows are as wide.
fn tabulate(
    source: &Source,
    separator: Separator,
    mut rows: Vec<Row>,
) -> Result<Table, InputError> {
    // A line of separators only is what spreadsheets leave below a table.
    rows.retain(|row| row.cells.iter().any(|c| !c.is_empty()));
    let mut rows = rows.into_iter();
    let Some(header) = rows.next() else {
        return Err(InputError::new(
            Place::file(source.path()),
            Problem::EmptyFile,
        ));
    };
    if header.cells.len() < 2 {
        return Err(InputError::new(
            Place::line(source.path(), header.line),
            Problem::OneColumn,
        ));
    }
    let rows: Vec<Row> = rows.collect();
    for row in &rows {
        if row.cells.len() != header.cells.len() {
            let place = Place::line(source.path(), row.line);
            let expected = header.cells.len();
            if rows.iter().all(|row| row.cells.len() == expected + 1) {
                return Err(InputError::new(
                    Place::line(source.path(), header.line),
                    Problem::HeaderShort {
                        header: expected,
                        rows: expected + 1,
                    },
                ));
            }
            return Err(InputError::new(
                match row.cells.get(0) {
                    Some(label) if !label.is_empty() => place.parcel(label),
                    _ => place,
                },
                Problem::Ragged {
                    expected,
                    found: row.cells.len(),
                    separator: separator.name(),
                },
            ));
        }
    }
    Ok(Table {
        separator,
        header,
        rows,
    })
}
