//! The XML of a GIFTI file, as far as labels of a surface need it.

use std::collections::BTreeSet;

use quick_xml::events::{BytesRef, BytesStart, Event};
use quick_xml::{Reader, XmlVersion};

use super::fault::GiftiFault;

/// GIFTI itself is five deep.
const DEEPEST: usize = 32;
/// The intent of an array of labels.
const LABELS: &str = "NIFTI_INTENT_LABEL";
/// The key of a surface's part of the brain, among the metadata.
const STRUCTURE: &str = "AnatomicalStructurePrimary";

/// What a file says about labels.
#[derive(Debug)]
pub struct Document {
    /// The part of the brain, from the metadata of the file.
    pub structure: Option<String>,
    /// The table of labels.
    pub table: Vec<Entry>,
    /// The first array of labels.
    pub array: Array,
    /// How many arrays of labels there are.
    pub arrays: usize,
}

/// A label of the table.
#[derive(Debug)]
pub struct Entry {
    /// Its key.
    pub key: i64,
    /// Its name, without blanks around it.
    pub name: String,
    /// Where it stands, in bytes.
    pub at: usize,
}

/// An array as it is written.
#[derive(Debug, Default)]
pub struct Array {
    /// Where it stands, in bytes.
    pub at: usize,
    /// `DataType`.
    pub data_type: String,
    /// `Encoding`.
    pub encoding: String,
    /// `Endian`.
    pub endian: String,
    /// `Dim0` and those that follow.
    pub dimensions: Vec<u64>,
    /// Its numbers.
    pub data: String,
    /// The part of the brain, from the metadata of the array.
    pub structure: Option<String>,
}

/// A fault, and where it stands in bytes.
type At = (usize, GiftiFault);

/// Reads the XML. Entities other than those of XML itself and declarations are refused, so nothing
/// can grow.
///
/// # Errors
/// [`GiftiFault`] with its place for broken XML, and for a file without labels.
pub fn parse(xml: &str) -> Result<Document, At> {
    let mut reader = Reader::from_str(xml);
    let mut parts = Parts::default();
    loop {
        let at = position(reader.buffer_position());
        let event = reader.read_event().map_err(|e| {
            let fault = GiftiFault::Damaged(format!("its XML cannot be read ({e})"));
            (position(reader.error_position()), fault)
        })?;
        let taken = match event {
            Event::Eof => break,
            // The document type that the standard prescribes names a file, which nobody fetches.
            Event::DocType(declared) if declared.contains('[') => Err(GiftiFault::Declares {
                found: "a document type with declarations of its own".to_owned(),
            }),
            Event::Start(tag) => parts.open(&tag, at),
            Event::Empty(tag) => parts.open(&tag, at).and_then(|()| parts.close()),
            Event::End(_) => parts.close(),
            Event::Text(text) => parts.take(|| text.xml_content(XmlVersion::Implicit1_0)),
            Event::CData(text) => parts.take(|| text.xml_content(XmlVersion::Implicit1_0)),
            Event::GeneralRef(reference) => resolve(&reference)
                .and_then(|c| parts.take(|| std::borrow::Cow::Owned(c.to_string()))),
            _ => Ok(()),
        };
        taken.map_err(|fault| (at, fault))?;
    }
    parts.finish().map_err(|fault| (xml.len(), fault))
}

fn position(at: u64) -> usize {
    usize::try_from(at).unwrap_or(usize::MAX)
}

/// The character a reference stands for.
fn resolve(reference: &BytesRef<'_>) -> Result<char, GiftiFault> {
    let name: &str = reference;
    let known = match name {
        "lt" => Some('<'),
        "gt" => Some('>'),
        "amp" => Some('&'),
        "apos" => Some('\''),
        "quot" => Some('"'),
        _ => reference
            .resolve_char_ref()
            .map_err(|e| GiftiFault::Damaged(format!("a reference cannot be resolved ({e})")))?,
    };
    known.ok_or_else(|| GiftiFault::Declares {
        found: format!("the entity {name:?}"),
    })
}

/// What has been read so far.
#[derive(Debug, Default)]
struct Parts {
    /// Names of the elements that are open.
    path: Vec<String>,
    /// Text of the innermost one, where it is wanted.
    text: String,
    /// Name of the metadata whose value comes next.
    about: String,
    structure: Option<String>,
    table: Option<Vec<Entry>>,
    /// Key and place of the label that is open.
    label: Option<(i64, usize)>,
    /// The array that is open, if it is the first one of labels.
    open: Option<Array>,
    array: Option<Array>,
    arrays: usize,
    intents: BTreeSet<String>,
}

/// What an element is, by the names from the outermost to itself.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Element {
    LabelTable,
    Label,
    DataArray,
    Data,
    MetaName,
    MetaValue,
    Other,
}

impl Parts {
    fn element(&self) -> Element {
        let mut names = ["", "", "", "", ""];
        if self.path.len() > names.len() {
            return Element::Other;
        }
        for (name, open) in names.iter_mut().zip(&self.path) {
            *name = open;
        }
        match names {
            ["GIFTI", "LabelTable", "", ..] => Element::LabelTable,
            ["GIFTI", "LabelTable", "Label", "", ""] => Element::Label,
            ["GIFTI", "DataArray", "", ..] => Element::DataArray,
            ["GIFTI", "DataArray", "Data", "", ""] => Element::Data,
            ["GIFTI", "MetaData", "MD", "Name", ""]
            | ["GIFTI", "DataArray", "MetaData", "MD", "Name"] => Element::MetaName,
            ["GIFTI", "MetaData", "MD", "Value", ""]
            | ["GIFTI", "DataArray", "MetaData", "MD", "Value"] => Element::MetaValue,
            _ => Element::Other,
        }
    }

    fn open(&mut self, tag: &BytesStart<'_>, at: usize) -> Result<(), GiftiFault> {
        let name = tag.name().as_ref().to_owned();
        if self.path.is_empty() && name != "GIFTI" {
            let shown: String = name.chars().take(40).collect();
            return Err(GiftiFault::NotGifti {
                found: format!("an XML file of <{shown}>"),
            });
        }
        self.path.push(name);
        self.text.clear();
        if self.path.len() > DEEPEST {
            return Err(GiftiFault::Damaged(format!(
                "its XML is nested more than {DEEPEST} deep"
            )));
        }
        match self.element() {
            Element::LabelTable => {
                self.table.get_or_insert_default();
            }
            Element::Label => {
                let key = match attribute(tag, "Key")? {
                    Some(key) => key,
                    // The name of the attribute in early files.
                    None => attribute(tag, "Index")?.unwrap_or_default(),
                };
                let number = key.trim().parse();
                let number = number.map_err(|_| GiftiFault::BadKey { found: key })?;
                self.label = Some((number, at));
            }
            Element::DataArray => {
                let intent = attribute(tag, "Intent")?.unwrap_or_default();
                if intent == LABELS {
                    self.arrays += 1;
                    if self.array.is_none() {
                        self.open = Some(Array::of(tag, at)?);
                    }
                } else {
                    self.intents.insert(intent.chars().take(40).collect());
                }
            }
            _ => {}
        }
        Ok(())
    }

    fn take<'t>(
        &mut self,
        text: impl FnOnce() -> std::borrow::Cow<'t, str>,
    ) -> Result<(), GiftiFault> {
        let wanted = match self.element() {
            Element::Label | Element::MetaName | Element::MetaValue => true,
            Element::Data => self.open.is_some(),
            _ => false,
        };
        if wanted {
            self.text.push_str(&text());
        }
        Ok(())
    }

    fn close(&mut self) -> Result<(), GiftiFault> {
        match self.element() {
            Element::Label => {
                if let (Some((key, at)), Some(table)) = (self.label.take(), &mut self.table) {
                    let name = self.text.trim().to_owned();
                    table.push(Entry { key, name, at });
                }
            }
            Element::MetaName => self.about = self.text.trim().to_owned(),
            Element::MetaValue if self.about == STRUCTURE => {
                let value = Some(self.text.trim().to_owned()).filter(|v| !v.is_empty());
                match (self.path.len(), &mut self.open) {
                    (4, _) => self.structure = value,
                    (_, Some(array)) => array.structure = value,
                    _ => {}
                }
            }
            Element::Data => {
                if let Some(array) = &mut self.open {
                    array.data = std::mem::take(&mut self.text);
                }
            }
            Element::DataArray => {
                if let Some(array) = self.open.take() {
                    self.array = Some(array);
                }
            }
            _ => {}
        }
        self.text.clear();
        self.path.pop();
        Ok(())
    }

    fn finish(self) -> Result<Document, GiftiFault> {
        if let Some(open) = self.path.last() {
            let open: String = open.chars().take(40).collect();
            return Err(GiftiFault::Damaged(format!("it ends within <{open}>")));
        }
        let Some(array) = self.array else {
            return Err(match self.intents.is_empty() && self.table.is_none() {
                true => GiftiFault::not_gifti("a text without any array"),
                false => GiftiFault::NoLabelArray {
                    found: self.intents.into_iter().collect(),
                },
            });
        };
        Ok(Document {
            structure: self.structure,
            table: self
                .table
                .filter(|table| !table.is_empty())
                .ok_or(GiftiFault::NoTable)?,
            array,
            arrays: self.arrays,
        })
    }
}

impl Array {
    fn of(tag: &BytesStart<'_>, at: usize) -> Result<Array, GiftiFault> {
        let text = |name| Ok(attribute(tag, name)?.unwrap_or_default());
        let count = |name: &str| {
            let found = attribute(tag, name)?.unwrap_or_default();
            let number = found.trim().parse::<u64>();
            number.map_err(|_| GiftiFault::Shape {
                found: format!("{name} = {found:?}"),
            })
        };
        let axes = count("Dimensionality")?;
        if !(1..=6).contains(&axes) {
            return Err(GiftiFault::Shape {
                found: format!("an array with {axes} dimensions"),
            });
        }
        Ok(Array {
            at,
            data_type: text("DataType")?,
            encoding: text("Encoding")?,
            endian: text("Endian")?,
            dimensions: (0..axes)
                .map(|axis| count(&format!("Dim{axis}")))
                .collect::<Result<_, _>>()?,
            ..Array::default()
        })
    }
}

/// An attribute, its references resolved.
fn attribute(tag: &BytesStart<'_>, name: &str) -> Result<Option<String>, GiftiFault> {
    let broken =
        |e: &dyn std::fmt::Display| GiftiFault::Damaged(format!("its XML cannot be read ({e})"));
    let Some(attribute) = tag.try_get_attribute(name).map_err(|e| broken(&e))? else {
        return Ok(None);
    };
    match attribute.normalized_value(XmlVersion::Implicit1_0) {
        Ok(value) => Ok(Some(value.into_owned())),
        Err(e) => Err(GiftiFault::Declares {
            found: format!("a reference that cannot be resolved ({e})"),
        }),
    }
}
