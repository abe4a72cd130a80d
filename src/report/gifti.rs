//! Maps of numbers over the vertices of a surface as a GIFTI file (`.func.gii`).
//!
//! Geometry format for neuroimaging, version 1.0. Its numbers are single precision: the standard
//! knows no double, and programs that keep to it refuse one.

use std::fmt::Write as _;
use std::io::Write as _;

use base64::engine::general_purpose::STANDARD;
use base64::Engine;
use flate2::write::ZlibEncoder;
use flate2::Compression;
use quick_xml::escape::escape;

/// How every file of maps begins that this program writes.
const BEGINNING: &str = concat!(
    "<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n",
    "<!DOCTYPE GIFTI SYSTEM \"http://www.nitrc.org/frs/download.php/115/gifti.dtd\">\n",
    "<!-- Painted by ",
    env!("CARGO_PKG_NAME"),
    " -->\n"
);

/// Numbers over a surface.
#[derive(Debug, Clone, PartialEq)]
pub struct SurfaceMap {
    /// Short name, for lists of maps.
    pub name: String,
    /// What the numbers are, their unit, and where there are none.
    pub meaning: String,
    /// One number for each vertex; NaN where there is none.
    pub values: Vec<f32>,
}

/// A file of maps; `about` are names and values of its metadata.
///
/// # Panics
/// Never: writing to memory does not fail.
#[must_use]
pub fn gifti(about: &[(&str, &str)], maps: &[SurfaceMap]) -> Vec<u8> {
    let mut xml = BEGINNING.to_owned();
    let _ = writeln!(
        xml,
        "<GIFTI Version=\"1.0\" NumberOfDataArrays=\"{}\">",
        maps.len()
    );
    metadata(&mut xml, about);
    xml.push_str("<LabelTable/>\n");
    for map in maps {
        let _ = writeln!(
            xml,
            "<DataArray Intent=\"NIFTI_INTENT_NONE\" DataType=\"NIFTI_TYPE_FLOAT32\" \
             ArrayIndexingOrder=\"RowMajorOrder\" Dimensionality=\"1\" Dim0=\"{}\" \
             Encoding=\"GZipBase64Binary\" Endian=\"LittleEndian\" ExternalFileName=\"\" \
             ExternalFileOffset=\"0\">",
            map.values.len()
        );
        metadata(&mut xml, &[("Name", &map.name), ("Meaning", &map.meaning)]);
        let _ = writeln!(xml, "<Data>{}</Data>\n</DataArray>", packed(&map.values));
    }
    xml.push_str("</GIFTI>\n");
    xml.into_bytes()
}

/// Whether bytes are a file of maps that this program has written.
#[must_use]
pub fn is_ours(bytes: &[u8]) -> bool {
    bytes.starts_with(BEGINNING.as_bytes())
}

fn metadata(xml: &mut String, about: &[(&str, &str)]) {
    xml.push_str("<MetaData>\n");
    for (name, value) in about {
        let (name, value) = (text(name), text(value));
        let _ = writeln!(xml, "<MD><Name>{name}</Name><Value>{value}</Value></MD>");
    }
    xml.push_str("</MetaData>\n");
}

/// Text as XML 1.0 holds it: markup escaped, and no character that it forbids.
fn text(words: &str) -> String {
    let allowed: String = words
        .chars()
        .map(|c| match c {
            '\t' | '\n' => c,
            '\u{fffe}' | '\u{ffff}' => char::REPLACEMENT_CHARACTER,
            c if c.is_control() => char::REPLACEMENT_CHARACTER,
            c => c,
        })
        .collect();
    escape(allowed.as_str()).into_owned()
}

/// Little-endian numbers, deflated, in Base64.
fn packed(values: &[f32]) -> String {
    let mut encoder = ZlibEncoder::new(Vec::new(), Compression::default());
    for value in values {
        encoder
            .write_all(&value.to_le_bytes())
            .expect("writing to memory does not fail");
    }
    let bytes = encoder.finish().expect("writing to memory does not fail");
    STANDARD.encode(bytes)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn no_text_breaks_the_xml() {
        assert_eq!(text("a < b & \"c\""), "a &lt; b &amp; &quot;c&quot;");
        assert_eq!(text("tab\tbell\u{7}\u{ffff}"), "tab\tbell\u{fffd}\u{fffd}");
        let map = SurfaceMap {
            name: "]]></Name>".to_owned(),
            meaning: "\u{0}".to_owned(),
            values: vec![1.5, f32::NAN],
        };
        let bytes = gifti(&[("Run", "<!-- a -->")], &[map]);
        let xml = std::str::from_utf8(&bytes).unwrap();
        let mut reader = quick_xml::Reader::from_str(xml);
        let mut names = 0;
        loop {
            match reader.read_event().unwrap() {
                quick_xml::events::Event::Eof => break,
                quick_xml::events::Event::Start(tag) if tag.name().as_ref() == "Name" => names += 1,
                _ => {}
            }
        }
        assert_eq!(names, 3);
    }
}
