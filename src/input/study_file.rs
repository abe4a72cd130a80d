//! The study file: which matrices, which landmarks, which settings.

use std::path::{Path, PathBuf};

use toml_edit::{Document, Item, TableLike};

use super::error::{InputError, Place, Problem};
use super::formats::Fault;
use super::nearest::nearest;
use super::source::{InputFile, Source};
use super::subjects::SubjectFiles;
use crate::affinity::Likeness;
use crate::domain::{Choice, Pair, RowsAre, Share, Side, Tracer, Transform, WeightKind};
use crate::settings::{BadSetting, Request};

/// One species as its study file describes it.
#[derive(Debug, Clone, PartialEq)]
pub struct SpeciesFile {
    /// Its name, used in every table.
    pub name: String,
    /// Its connectivity; the mean of its subjects where absent.
    pub matrix: Option<PathBuf>,
    /// The same of individuals.
    pub subjects: Option<SubjectFiles>,
    /// Its parcels' labels, where a file of their own holds them.
    pub labels: Option<PathBuf>,
    /// Labels of the columns, where these differ and a file of their own holds them.
    pub column_labels: Option<PathBuf>,
    /// What the rows are.
    pub rows: Option<RowsAre>,
    /// How injected areas were traced.
    pub tracer: Option<Tracer>,
    /// Array that is the matrix, in a file of several.
    pub variable: Option<String>,
    /// Array that holds the labels, in a file of several.
    pub label_variable: Option<String>,
    /// What is known of its parcels besides.
    pub parcels: Option<PathBuf>,
    /// Distances between its parcels.
    pub distances: Option<PathBuf>,
    /// What the weights measure.
    pub weights: WeightKind,
    /// Transform asked for.
    pub transform: Option<Transform>,
    /// Likeness of profiles asked for.
    pub likeness: Option<Likeness>,
    /// Share of each profile kept, where asked for.
    pub strongest: Option<Share>,
}

impl SpeciesFile {
    /// A species of which nothing is said but what must be.
    #[must_use]
    pub fn new(name: &str, matrix: &Path, weights: WeightKind) -> SpeciesFile {
        SpeciesFile {
            name: name.to_owned(),
            matrix: Some(matrix.to_path_buf()),
            subjects: None,
            labels: None,
            column_labels: None,
            rows: None,
            tracer: None,
            variable: None,
            label_variable: None,
            parcels: None,
            distances: None,
            weights,
            transform: None,
            likeness: None,
            strongest: None,
        }
    }

    /// The file, or one of the files, that its connectivity is read from.
    #[must_use]
    pub fn source(&self) -> &Path {
        match (&self.matrix, &self.subjects) {
            (Some(matrix), _) => matrix,
            (None, Some(subjects)) => subjects.path(),
            (None, None) => Path::new(""),
        }
    }
}

/// A study as its file describes it; paths are resolved, nothing else has been read.
#[derive(Debug, Clone, PartialEq)]
pub struct StudyFile {
    /// The file itself.
    pub file: InputFile,
    /// Title for people.
    pub title: String,
    /// The landmark table.
    pub landmarks: PathBuf,
    /// Both species.
    pub species: Pair<SpeciesFile>,
    /// The `[settings]`.
    pub request: Request,
}

const TOP_KEYS: &[&str] = &["title", "landmarks", "species", "settings"];
const SPECIES_KEYS: &[&str] = &[
    "name",
    "matrix",
    "subjects",
    "weights",
    "transform",
    "affinity",
    "strongest",
    "labels",
    "column-labels",
    "rows",
    "tracer",
    "variable",
    "label-variable",
    "parcels",
    "distances",
];

/// Reads and checks a study file.
///
/// # Errors
/// [`InputError`] for anything but TOML with the keys described in docs/formats.md.
pub fn read(path: &Path) -> Result<StudyFile, InputError> {
    let source = Source::read(path)?;
    let document = Document::parse(source.text.as_str()).map_err(|e| {
        let place = e.span().map_or_else(
            || Place::file(path),
            |span| source_place(path, &source.text, span.start),
        );
        InputError::new(place, Problem::Toml(e.message().replace('\n', "; ")))
    })?;
    let reader = Reader {
        path,
        text: &source.text,
    };
    let top = Table {
        reader: &reader,
        name: "the study file".to_owned(),
        table: document.as_table(),
        start: None,
    };
    top.only(TOP_KEYS)?;
    let folder = path.parent().unwrap_or(Path::new(""));

    let species = top.table("species", "[species.a]")?;
    species.only(&["a", "b"])?;
    let species_files = Pair::try_from_fn(|side: Side| {
        let example = format!("[species.{}]", side.letter());
        species_file(&species.table(side.letter(), &example)?, folder)
    })?;
    if species_files.a.name == species_files.b.name {
        let b = species.table("b", "[species.b]")?;
        return Err(InputError::new(
            b.place_of("name"),
            Problem::SameName(species_files.a.name),
        ));
    }
    let mut request = Request::default();
    if top.has("settings") {
        let settings = top.table("settings", "[settings]")?;
        settings.only(Request::KEYS)?;
        for key in Request::KEYS {
            if let Some(text) = settings.scalar(key)? {
                request
                    .set(key, &text)
                    .map_err(|e| InputError::new(settings.place_of(key), bad_setting(e)))?;
            }
        }
    }
    Ok(StudyFile {
        title: top.text("title", "title = \"My study\"")?,
        landmarks: folder.join(top.text("landmarks", "landmarks = \"landmarks.csv\"")?),
        species: species_files,
        request,
        file: source.file,
    })
}

fn species_file(table: &Table<'_>, folder: &Path) -> Result<SpeciesFile, InputError> {
    table.only(SPECIES_KEYS)?;
    let weights: WeightKind = table
        .choice("weights")?
        .ok_or_else(|| table.missing("weights", "weights = \"counts\""))?;
    let transform: Option<Transform> = table.choice("transform")?;
    if let Some(why) = transform.and_then(|t| t.mismatch(weights)) {
        return Err(InputError::new(
            table.place_of("transform"),
            Problem::TransformMismatch {
                transform: transform.map(|t| t.to_string()).unwrap_or_default(),
                weights: weights.to_string(),
                why,
            },
        ));
    }
    let strongest = match table.scalar("strongest")? {
        None => None,
        Some(text) => Some(
            text.parse::<f64>()
                .ok()
                .and_then(|x| Share::new(x).ok())
                .ok_or_else(|| table.bad_value("strongest", "a share above 0 and at most 1"))?,
        ),
    };
    let name = table.text("name", "name = \"My species\"")?;
    if name.trim().is_empty() {
        return Err(table.bad_value("name", "more than blanks"));
    }
    let file = |key| Ok(table.optional_text(key)?.map(|path| folder.join(path)));
    let subjects = table.subjects(folder)?;
    let matrix = match subjects {
        Some(_) => file("matrix")?,
        None => Some(folder.join(table.text("matrix", "matrix = \"matrix.csv\"")?)),
    };
    let labels = file("labels")?;
    let label_variable = table.optional_text("label-variable")?;
    if labels.is_some() && label_variable.is_some() {
        return Err(InputError::new(
            table.place_of("label-variable"),
            Fault::TwoLabelKeys.into(),
        ));
    }
    Ok(SpeciesFile {
        name,
        labels,
        column_labels: file("column-labels")?,
        rows: table.choice("rows")?,
        tracer: table.choice("tracer")?,
        variable: table.optional_text("variable")?,
        label_variable,
        parcels: file("parcels")?,
        distances: file("distances")?,
        matrix,
        subjects,
        weights,
        transform,
        likeness: table.choice("affinity")?,
        strongest,
    })
}

/// The wording for a bad setting in a file.
fn bad_setting(error: BadSetting) -> Problem {
    match error {
        BadSetting::UnknownKey(found) => Problem::UnknownKey {
            nearest: nearest(&found, Request::KEYS.iter().copied())
                .unwrap_or_default()
                .to_owned(),
            found,
            table: "[settings]".to_owned(),
            known: Request::KEYS.join(", "),
        },
        BadSetting::Value {
            key,
            expected,
            found,
        } => Problem::BadValue {
            key: key.to_owned(),
            expected: expected.to_owned(),
            found,
        },
        BadSetting::Choice { key, found, known } => Problem::UnknownValue {
            key: key.to_owned(),
            nearest: nearest(&found, known.iter().copied())
                .unwrap_or_default()
                .to_owned(),
            found,
            known: known.join(", "),
        },
    }
}

/// The table a known key belongs in.
fn home_of(key: &str) -> Option<&'static str> {
    if TOP_KEYS.contains(&key) {
        Some("the study file, above all tables")
    } else if SPECIES_KEYS.contains(&key) {
        Some("[species.a] or [species.b]")
    } else if Request::KEYS.contains(&key) {
        Some("[settings]")
    } else {
        None
    }
}

/// The file a table was read from, for places in messages.
struct Reader<'s> {
    path: &'s Path,
    text: &'s str,
}

fn source_place(path: &Path, text: &str, at: usize) -> Place {
    let before = &text[..at.min(text.len())];
    let line = before.bytes().filter(|b| *b == b'\n').count() as u64 + 1;
    let column = before
        .rsplit('\n')
        .next()
        .map_or(0, |line| line.chars().count())
        + 1;
    Place::line(path, line).column(column)
}

/// A table of the study file, with what is needed to say where a fault is.
struct Table<'s> {
    reader: &'s Reader<'s>,
    name: String,
    table: &'s dyn TableLike,
    /// Where its header stands; nowhere for the study file itself and for a table only its parts name.
    start: Option<usize>,
}

impl<'s> Table<'s> {
    fn has(&self, key: &str) -> bool {
        self.table.contains_key(key)
    }

    fn place(&self, at: usize) -> Place {
        source_place(self.reader.path, self.reader.text, at)
    }

    /// Where the table begins: its line, as far as there is one.
    fn place_of_start(&self) -> Place {
        Place {
            column: None,
            ..self
                .start
                .map_or_else(|| Place::file(self.reader.path), |at| self.place(at))
        }
    }

    fn place_of(&self, key: &str) -> Place {
        self.table
            .get_key_value(key)
            .and_then(|(key, item)| key.span().or_else(|| item.span()))
            .map_or_else(|| self.place_of_start(), |span| self.place(span.start))
    }

    fn missing(&self, key: &'static str, example: &str) -> InputError {
        InputError::new(
            self.place_of_start(),
            Problem::MissingKey {
                key,
                table: self.name.clone(),
                example: example.to_owned(),
            },
        )
    }

    /// Refuses every key that is not known here.
    fn only(&self, known: &[&str]) -> Result<(), InputError> {
        for (key, _) in self.table.iter() {
            if let (false, Some(belongs)) = (known.contains(&key), home_of(key)) {
                return Err(InputError::new(
                    self.place_of(key),
                    Problem::MisplacedKey {
                        found: key.to_owned(),
                        table: self.name.clone(),
                        belongs: belongs.to_owned(),
                    },
                ));
            }
            if !known.contains(&key) {
                return Err(InputError::new(
                    self.place_of(key),
                    Problem::UnknownKey {
                        found: key.to_owned(),
                        table: self.name.clone(),
                        nearest: nearest(key, known.iter().copied())
                            .unwrap_or_default()
                            .to_owned(),
                        known: known.join(", "),
                    },
                ));
            }
        }
        Ok(())
    }

    fn table(&self, key: &'static str, example: &str) -> Result<Table<'s>, InputError> {
        let item = self.table.get(key).ok_or_else(|| {
            InputError::new(
                Place::file(self.reader.path),
                Problem::MissingTable(example.to_owned()),
            )
        })?;
        let table = item
            .as_table_like()
            .ok_or_else(|| self.bad_value(key, &format!("a table such as {example}")))?;
        Ok(Table {
            reader: self.reader,
            name: match key {
                "a" | "b" => format!("[species.{key}]"),
                _ => format!("[{key}]"),
            },
            table,
            start: item.span().map(|span| span.start),
        })
    }

    fn text(&self, key: &'static str, example: &str) -> Result<String, InputError> {
        let item = self
            .table
            .get(key)
            .ok_or_else(|| self.missing(key, example))?;
        item.as_str()
            .map(str::to_owned)
            .ok_or_else(|| self.bad_value(key, "text in quotes"))
    }

    /// Text in quotes; `None` where the key is absent.
    fn optional_text(&self, key: &'static str) -> Result<Option<String>, InputError> {
        self.has(key).then(|| self.text(key, "")).transpose()
    }

    /// Where the matrices of individuals are; `None` where nothing is said.
    fn subjects(&self, folder: &Path) -> Result<Option<SubjectFiles>, InputError> {
        let key = "subjects";
        let Some(item) = self.table.get(key) else {
            return Ok(None);
        };
        if let Some(path) = item.as_str() {
            return Ok(Some(SubjectFiles::Path(folder.join(path))));
        }
        let files: Option<Vec<PathBuf>> = item.as_array().and_then(|list| {
            list.iter()
                .map(|file| Some(folder.join(file.as_str()?)))
                .collect()
        });
        match files {
            Some(files) if !files.is_empty() => Ok(Some(SubjectFiles::List(files))),
            _ => Err(self.bad_value(
                key,
                "a folder, a pattern, a .npy of three axes, or a list of files",
            )),
        }
    }

    /// A string, number or truth value as text; `None` where the key is absent.
    fn scalar(&self, key: &str) -> Result<Option<String>, InputError> {
        let Some(item) = self.table.get(key) else {
            return Ok(None);
        };
        scalar(item)
            .map(Some)
            .ok_or_else(|| self.bad_value(key, "a single value"))
    }

    fn choice<C: Choice>(&self, key: &'static str) -> Result<Option<C>, InputError> {
        let Some(text) = self.scalar(key)? else {
            return Ok(None);
        };
        C::from_name(&text).map(Some).map_err(|e| {
            InputError::new(
                self.place_of(key),
                bad_setting(BadSetting::Choice {
                    key,
                    found: e.found,
                    known: C::names().collect(),
                }),
            )
        })
    }

    fn bad_value(&self, key: &str, expected: &str) -> InputError {
        let found = self.table.get(key).map_or_else(String::new, |item| {
            match (scalar(item), item.as_str()) {
                (None, _) => format!("a value of type {}", item.type_name()),
                (Some(_), Some(text)) => format!("{text:?}"),
                (Some(number), None) => number,
            }
        });
        InputError::new(
            self.place_of(key),
            Problem::BadValue {
                key: key.to_owned(),
                expected: expected.to_owned(),
                found,
            },
        )
    }
}

fn scalar(item: &Item) -> Option<String> {
    let value = item.as_value()?;
    value
        .as_str()
        .map(str::to_owned)
        .or_else(|| value.as_integer().map(|i| i.to_string()))
        .or_else(|| value.as_float().map(|x| x.to_string()))
        .or_else(|| value.as_bool().map(|b| b.to_string()))
}
