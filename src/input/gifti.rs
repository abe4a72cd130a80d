//! Labels of a surface in a GIFTI file (`.label.gii`): which parcel each vertex belongs to.
//!
//! Geometry format for neuroimaging, version 1.0: an XML with a table of labels and, for each vertex,
//! the key of its label.

use std::collections::{BTreeMap, HashMap};
use std::path::Path;

mod document;
mod fault;
mod values;

pub use fault::GiftiFault;

use super::error::{InputError, Place, Problem};
use super::formats::{self, Kind};
use super::source::{Bytes, InputFile};
use document::{Document, Entry};

/// Beyond this whole numbers are not exact in double precision.
const LARGEST_KEY: f64 = 9_007_199_254_740_992.0;

/// Which parcel each vertex of a surface belongs to.
#[derive(Debug, Clone, PartialEq)]
pub struct SurfaceLabels {
    /// The file.
    pub file: InputFile,
    /// The part of the brain, such as `CortexLeft`, where the file says it.
    pub structure: Option<String>,
    /// The names in the table of labels, in its order, each once.
    pub names: Vec<String>,
    /// For each vertex the position of its label in `names`; `None` where its key has no name.
    pub vertices: Vec<Option<usize>>,
    /// Keys that the table lacks, and how many vertices bear them.
    pub nameless: BTreeMap<i64, usize>,
    /// Arrays of labels; the first one is read.
    pub arrays: usize,
}

/// Reads the first array of labels of a GIFTI file, perhaps compressed by gzip.
///
/// # Errors
/// [`InputError`] with the line for anything but a GIFTI file with a table of labels and one key for
/// each vertex.
pub fn read(path: &Path) -> Result<SurfaceLabels, InputError> {
    let (kind, bytes) = formats::plain(Bytes::read(path)?)?;
    let body = bytes.bytes.strip_prefix(b"\xef\xbb\xbf");
    let body = body.unwrap_or(&bytes.bytes);
    let fail = |at: usize, fault: GiftiFault| {
        let before = &body[..at.min(body.len())];
        let line = 1 + before.iter().filter(|b| **b == b'\n').count() as u64;
        InputError::new(Place::line(path, line), fault.into())
    };
    if body.iter().all(u8::is_ascii_whitespace) {
        return Err(InputError::new(Place::file(path), Problem::EmptyFile));
    }
    if kind != Kind::Text {
        return Err(fail(0, GiftiFault::not_gifti("another format")));
    }
    let xml = std::str::from_utf8(body)
        .map_err(|e| fail(e.valid_up_to(), GiftiFault::not_gifti("no UTF-8 text")))?;
    let document = document::parse(xml).map_err(|(at, fault)| fail(at, fault))?;
    let Document {
        structure,
        table,
        array,
        arrays,
    } = document;
    let (names, by_key) = name_keys(&table).map_err(|(at, fault)| fail(at, fault))?;
    let keys = values::decode(&array).map_err(|fault| fail(array.at, fault))?;
    let mut nameless = BTreeMap::new();
    let mut vertices = Vec::with_capacity(keys.len());
    for (vertex, &key) in keys.iter().enumerate() {
        if key.fract() != 0.0 || !(-LARGEST_KEY..=LARGEST_KEY).contains(&key) {
            let found = key.to_string();
            return Err(fail(array.at, GiftiFault::KeyNotWhole { vertex, found }));
        }
        let key = key as i64;
        vertices.push(by_key.get(&key).copied().unwrap_or_else(|| {
            *nameless.entry(key).or_insert(0) += 1;
            None
        }));
    }
    Ok(SurfaceLabels {
        file: bytes.file,
        structure: structure.or(array.structure),
        names,
        vertices,
        nameless,
        arrays,
    })
}

/// The names of a table, and what each key stands for; an empty name is none.
type Names = (Vec<String>, HashMap<i64, Option<usize>>);

fn name_keys(table: &[Entry]) -> Result<Names, (usize, GiftiFault)> {
    let mut names: Vec<String> = Vec::new();
    let mut at: HashMap<&str, usize> = HashMap::new();
    let mut by_key = HashMap::with_capacity(table.len());
    for entry in table {
        let name = entry.name.as_str();
        let position = (!name.is_empty()).then(|| {
            *at.entry(name).or_insert_with(|| {
                names.push(name.to_owned());
                names.len() - 1
            })
        });
        if let Some(before) = by_key.insert(entry.key, position) {
            if before != position {
                let fault = GiftiFault::KeyTwice {
                    key: entry.key,
                    first: before.map_or_else(String::new, |at| names[at].clone()),
                    second: name.to_owned(),
                };
                return Err((entry.at, fault));
            }
        }
    }
    Ok((names, by_key))
}
