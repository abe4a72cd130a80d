//! The names of parcels in the XML of a CIFTI-2 file.

use quick_xml::events::{BytesStart, Event};
use quick_xml::Reader;

use super::Fault;

/// The map of a matrix of parcels.
const PARCELS: &str = "CIFTI_INDEX_TYPE_PARCELS";

/// Names of the parcels of dimension 0 (columns) and of dimension 1 (rows).
///
/// # Errors
/// [`Fault`] for broken XML, declarations of types or entities, and other maps than of parcels.
pub fn read(xml: &str) -> Result<(Vec<String>, Vec<String>), Fault> {
    let mut reader = Reader::from_str(xml);
    let mut names: [Option<Vec<String>>; 2] = [None, None];
    // The dimensions that the map being read applies to, and its parcels.
    let mut open: Option<([bool; 2], Vec<String>)> = None;
    loop {
        match reader.read_event().map_err(broken)? {
            Event::Eof => break,
            Event::DocType(_) => {
                return Err(Fault::XmlDeclares {
                    found: "a document type declaration".to_owned(),
                })
            }
            Event::GeneralRef(reference) => {
                let name: &str = &reference;
                let known = ["lt", "gt", "amp", "apos", "quot"].contains(&name);
                if !known && !reference.is_char_ref() {
                    return Err(Fault::XmlDeclares {
                        found: format!("the entity {name:?}"),
                    });
                }
            }
            Event::Start(tag) if is(&tag, "MatrixIndicesMap") => {
                open = Some((map(&tag)?, Vec::new()));
            }
            Event::Start(tag) | Event::Empty(tag) if is(&tag, "Parcel") => {
                if let Some((_, parcels)) = &mut open {
                    parcels.push(attribute(&tag, "Name")?.unwrap_or_default());
                }
            }
            Event::End(tag) if tag.name().as_ref() == "MatrixIndicesMap" => {
                if let Some((applies, parcels)) = open.take() {
                    for (names, applies) in names.iter_mut().zip(applies) {
                        if applies {
                            *names = Some(parcels.clone());
                        }
                    }
                }
            }
            _ => {}
        }
    }
    match names {
        [Some(columns), Some(rows)] => Ok((columns, rows)),
        _ => Err(Fault::NotParcels {
            found: "a CIFTI-2 file without parcels on both axes".to_owned(),
        }),
    }
}

/// The dimensions a map applies to; it must be of parcels.
fn map(tag: &BytesStart<'_>) -> Result<[bool; 2], Fault> {
    let dimensions = attribute(tag, "AppliesToMatrixDimension")?.unwrap_or_default();
    let kind = attribute(tag, "IndicesMapToDataType")?.unwrap_or_default();
    if kind != PARCELS {
        let kind = kind.strip_prefix("CIFTI_INDEX_TYPE_").unwrap_or(&kind);
        return Err(Fault::NotParcels {
            found: format!("{kind:?} on dimension {dimensions}"),
        });
    }
    let applies = |dimension| dimensions.split(',').any(|d| d.trim() == dimension);
    Ok([applies("0"), applies("1")])
}

fn is(tag: &BytesStart<'_>, name: &str) -> bool {
    tag.name().as_ref() == name
}

/// An attribute, its references resolved.
fn attribute(tag: &BytesStart<'_>, name: &str) -> Result<Option<String>, Fault> {
    let Some(attribute) = tag.try_get_attribute(name).map_err(broken)? else {
        return Ok(None);
    };
    match attribute.normalized_value(quick_xml::XmlVersion::Implicit1_0) {
        Ok(value) => Ok(Some(value.into_owned())),
        Err(e) => Err(Fault::XmlDeclares {
            found: format!("a reference that cannot be resolved ({e})"),
        }),
    }
}

fn broken(error: impl std::fmt::Display) -> Fault {
    Fault::Damaged(format!("its XML cannot be read ({error})"))
}
