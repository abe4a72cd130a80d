//! `kinmark paint`: label files as other programs write them, maps that equal the tables, and what is
//! refused.

mod common;

use std::collections::BTreeMap;
use std::fs;
use std::io::{Read, Write};
use std::path::{Path, PathBuf};

use base64::engine::general_purpose::STANDARD;
use base64::Engine;
use common::{contents, names, program, read, Run, Study, Tables, PARCELS_A, PARCELS_B};
use flate2::read::ZlibDecoder;
use flate2::write::ZlibEncoder;
use flate2::Compression;
use kinmark::input::{read_surface_labels, SurfaceLabels};

fn data(name: &str) -> PathBuf {
    Path::new("tests/data/gifti").join(name)
}

fn demo(name: &str) -> PathBuf {
    Path::new("species-demo").join(name)
}

// ---------------------------------------------------------------------------------------------
// Reading
// ---------------------------------------------------------------------------------------------

/// The label of each vertex as nibabel reads it; see the script beside the files.
fn expected() -> Vec<String> {
    let text = read(&data("expected.csv"));
    let mut reader = csv::Reader::from_reader(text.as_bytes());
    let rows = reader.records().map(|row| row.unwrap()[1].to_owned());
    rows.collect()
}

fn spelt(labels: &SurfaceLabels) -> Vec<String> {
    let name = |at: &Option<usize>| labels.names[at.unwrap()].clone();
    labels.vertices.iter().map(name).collect()
}

#[test]
fn every_coding_of_nibabel_is_read() {
    let expected = expected();
    assert_eq!(expected[4], "Tê, <lateral> & \"so\"");
    for name in [
        "ascii.label.gii",
        "base64.label.gii",
        "base64-big.label.gii",
        "gzip.label.gii",
        "gzip-big.label.gii",
        "uint8.label.gii",
        "float32.label.gii",
        "several.label.gii",
        "gzipped.label.gii.gz",
    ] {
        let labels = read_surface_labels(&data(name)).unwrap_or_else(|e| panic!("{e}"));
        assert_eq!(spelt(&labels), expected, "{name}");
        assert_eq!(labels.structure.as_deref(), Some("CortexLeft"), "{name}");
        assert!(labels.nameless.is_empty(), "{name}");
        assert_eq!(
            labels.arrays,
            if name.starts_with("several") { 2 } else { 1 }
        );
    }
}

/// A label file of these pieces, uncompressed unless the piece says otherwise.
struct Gifti<'t> {
    doctype: &'t str,
    table: &'t str,
    attributes: &'t str,
    data: &'t str,
}

impl Gifti<'static> {
    fn new() -> Self {
        Gifti {
            doctype: "<!DOCTYPE GIFTI SYSTEM \"http://www.nitrc.org/frs/download.php/115/gifti.dtd\">",
            table: "<LabelTable><Label Key=\"0\">wall</Label><Label Key=\"1\">insula</Label></LabelTable>",
            attributes: "Intent=\"NIFTI_INTENT_LABEL\" DataType=\"NIFTI_TYPE_INT32\" Dimensionality=\"1\" Dim0=\"3\" Encoding=\"ASCII\" Endian=\"LittleEndian\"",
            data: "0 1 1",
        }
    }
}

impl Gifti<'_> {
    fn text(&self) -> String {
        format!(
            "<?xml version=\"1.0\"?>\n{}\n<GIFTI Version=\"1.0\">\n{}\n<DataArray {}>\n<Data>{}</Data></DataArray></GIFTI>\n",
            self.doctype, self.table, self.attributes, self.data
        )
    }
}

fn read_text(text: impl AsRef<[u8]>) -> Result<SurfaceLabels, String> {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("x.label.gii");
    fs::write(&path, text).unwrap();
    read_surface_labels(&path).map_err(|e| e.to_string())
}

fn binary(encoding: &str, dim: &str) -> String {
    format!("Intent=\"NIFTI_INTENT_LABEL\" DataType=\"NIFTI_TYPE_INT32\" Dimensionality=\"1\" Dim0=\"{dim}\" Encoding=\"{encoding}\" Endian=\"LittleEndian\"")
}

fn base64(keys: &[i32]) -> String {
    let bytes: Vec<u8> = keys.iter().flat_map(|k| k.to_le_bytes()).collect();
    STANDARD.encode(bytes)
}

fn deflated(bytes: &[u8]) -> String {
    let mut encoder = ZlibEncoder::new(Vec::new(), Compression::best());
    encoder.write_all(bytes).unwrap();
    STANDARD.encode(encoder.finish().unwrap())
}

#[test]
fn what_the_standard_allows_is_read() {
    let plain = read_text(Gifti::new().text()).unwrap();
    assert_eq!(spelt(&plain), ["wall", "insula", "insula"]);
    assert_eq!(plain.structure, None);
    let two_axes = Gifti {
        attributes: &Gifti::new().attributes.replace(
            "Dimensionality=\"1\" Dim0=\"3\"",
            "Dimensionality=\"2\" Dim0=\"3\" Dim1=\"1\"",
        ),
        ..Gifti::new()
    };
    let references = Gifti {
        table: "<LabelTable><Label Key=\"0\">w&#x61;ll</Label><Label Index=\"1\"><![CDATA[in]]>sula</Label></LabelTable>",
        ..Gifti::new()
    };
    let lines = base64(&[0, 1, 1]);
    let in_lines = Gifti {
        attributes: &binary("Base64Binary", "3"),
        data: &format!("\n  {}\n  {}\n", &lines[..6], &lines[6..]),
        ..Gifti::new()
    };
    let no_doctype = Gifti {
        doctype: "",
        ..Gifti::new()
    };
    for text in [
        two_axes.text(),
        references.text(),
        in_lines.text(),
        no_doctype.text(),
        format!("\u{feff}{}", Gifti::new().text()),
        Gifti::new().text().replace('\n', "\r\n"),
    ] {
        let labels = read_text(&text).unwrap_or_else(|e| panic!("{e}: {text}"));
        assert_eq!(spelt(&labels), spelt(&plain), "{text}");
    }
    // Keys without a name are no labels, and counted.
    let nameless = Gifti {
        data: "0 5 -1",
        ..Gifti::new()
    };
    let labels = read_text(nameless.text()).unwrap();
    assert_eq!(labels.vertices, [Some(0), None, None]);
    assert_eq!(labels.nameless, BTreeMap::from([(-1, 1), (5, 1)]));
}

#[test]
fn broken_label_files_are_refused() {
    let with = |attributes: &str, data: &str| {
        Gifti {
            attributes,
            data,
            ..Gifti::new()
        }
        .text()
    };
    let table = |table| {
        Gifti {
            table,
            ..Gifti::new()
        }
        .text()
    };
    let doctype = |doctype| {
        Gifti {
            doctype,
            ..Gifti::new()
        }
        .text()
    };
    let swapped = |from: &str, to: &str| Gifti::new().text().replacen(from, to, 1);
    let keys = base64(&[0, 1, 1]);
    let zeros = deflated(&vec![0; 40_000_000]);
    let shape = fs::read_to_string(data("shape.shape.gii")).unwrap();
    let deep = format!("<GIFTI>{}", "<a>".repeat(100_000));
    let cases: Vec<(&str, String, &[&str])> = vec![
        ("empty", " \n".to_owned(), &["the file is empty"]),
        ("no XML", "parcel,x\n".to_owned(), &["expected a GIFTI label file", "found a text"]),
        ("other XML", "<svg/>".to_owned(), &["line 1", "an XML file of <svg>"]),
        ("cut off", Gifti::new().text()[..300].to_owned(), &["damaged"]),
        ("crossed", swapped("</LabelTable>", "</Labels>"), &["line 4", "XML cannot be read"]),
        ("a map", shape, &["expected an array of labels", "found NIFTI_INTENT_SHAPE", "not a surface"]),
        ("no table", table(""), &["no table of labels"]),
        ("an empty table", table("<LabelTable/>"), &["no table of labels"]),
        (
            "a key twice",
            table("<LabelTable><Label Key=\"1\">insula</Label>\n<Label Key=\"1\">motor</Label></LabelTable>"),
            &["line 5", "key 1 stands for \"insula\" and for \"motor\""],
        ),
        ("a key that is none", table("<LabelTable><Label Key=\"x\">insula</Label></LabelTable>"), &["line 4", "found \"x\""]),
        ("a label without a key", table("<LabelTable><Label>insula</Label></LabelTable>"), &["whole number as the key"]),
        (
            "entities that grow",
            doctype("<!DOCTYPE GIFTI [<!ENTITY a \"aaaa\"><!ENTITY b \"&a;&a;\">]>"),
            &["document type with declarations", "not read"],
        ),
        ("an unknown entity", table("<LabelTable><Label Key=\"0\">&bomb;</Label></LabelTable>"), &["the entity \"bomb\""]),
        ("an unknown entity in an attribute", swapped("Key=\"0\"", "Key=\"&bomb;\""), &["cannot be resolved"]),
        ("a character that is none", table("<LabelTable><Label Key=\"0\">&#x110000;</Label></LabelTable>"), &["cannot be resolved"]),
        ("a word among numbers", with(Gifti::new().attributes, "0 one 1"), &["\"one\" stands where a number"]),
        ("too few numbers", with(Gifti::new().attributes, "0 1"), &["hold 3 keys, but 2 are there"]),
        ("too many numbers", with(Gifti::new().attributes, "0 1 1 1"), &["hold 3 keys, but 4 are there"]),
        ("a fraction", with(Gifti::new().attributes, "0 1.5 1"), &["vertex 1 (counted from 0) has the key 1.5"]),
        ("no number", with(Gifti::new().attributes, "0 nan 1"), &["has the key NaN"]),
        ("Base64 cut off", with(&binary("Base64Binary", "3"), &keys[..10]), &["no Base64"]),
        ("Base64 too short", with(&binary("Base64Binary", "3"), &base64(&[0, 1])), &["hold 3 keys, which take 12 bytes, but 8 are there"]),
        ("Base64 too long", with(&binary("Base64Binary", "2"), &keys), &["hold 2 keys, which take 8 bytes, but more are there"]),
        ("foreign characters", with(&binary("Base64Binary", "3"), "AA*="), &["no Base64"]),
        ("10^12 keys", with(&binary("Base64Binary", "1000000000000"), &keys), &["hold 1000000000000 keys", "12 are there"]),
        ("10^12 keys, deflated", with(&binary("GZipBase64Binary", "1000000000000"), &deflated(&[0; 12])), &["hold 1000000000000 keys, more than kinmark inflates"]),
        ("10^12 keys, written out", with(&Gifti::new().attributes.replace("\"3\"", "\"1000000000000\""), "0 1 1"), &["hold 1000000000000 keys, but 3 are there"]),
        ("more than can be counted", with(&binary("Base64Binary", "99999999999999999999999"), &keys), &["one key for each vertex", "Dim0"]),
        ("more inside than is said", with(&binary("GZipBase64Binary", "3"), &zeros), &["hold 3 keys", "but more are there"]),
        ("less inside than is said", with(&binary("GZipBase64Binary", "3"), &deflated(&[0; 8])), &["but 8 are there"]),
        ("not deflated", with(&binary("GZipBase64Binary", "3"), &keys), &["cannot be inflated"]),
        ("no vertices", with(&binary("Base64Binary", "0"), ""), &["found an array of 0"]),
        ("a negative size", with(&binary("Base64Binary", "-3"), &keys), &["Dim0 = \"-3\""]),
        ("three numbers a vertex", swapped("Dimensionality=\"1\" Dim0=\"3\"", "Dimensionality=\"2\" Dim0=\"1\" Dim1=\"3\""), &["an array of 1 x 3"]),
        ("many dimensions", swapped("Dimensionality=\"1\"", "Dimensionality=\"4000000000\""), &["an array with 4000000000 dimensions"]),
        ("a missing dimension", swapped("Dim0=\"3\"", ""), &["Dim0"]),
        ("another file", swapped("\"ASCII\"", "\"ExternalFileBinary\""), &["another file", "with its data inside"]),
        ("an unknown encoding", swapped("\"ASCII\"", "\"Base85\""), &["unknown Encoding \"Base85\"", "known are ASCII"]),
        ("an unknown type", swapped("NIFTI_TYPE_INT32", "NIFTI_TYPE_RGB24"), &["unknown type of numbers", "NIFTI_TYPE_INT32"]),
        ("an unknown order", with(&binary("Base64Binary", "3").replace("LittleEndian", "Middle"), &keys), &["unknown Endian \"Middle\""]),
        ("nested without end", deep, &["nested more than 32 deep"]),
    ];
    for (name, text, says) in cases {
        let fault = read_text(&text).expect_err(name);
        for fragment in says {
            assert!(
                fault.contains(fragment),
                "{name}: {fragment:?} not in: {fault}"
            );
        }
        assert!(fault.contains("x.label.gii"), "{name}: {fault}");
        assert!(!fault.contains('\n'), "{name}: {fault}");
    }
    let image = fs::read("tests/data/formats/image1.nii").unwrap();
    let fault = read_text(image).expect_err("an image");
    assert!(fault.contains("another format"), "{fault}");
    let fault = read_text(b"<GIFTI>\xff</GIFTI>").expect_err("bytes");
    assert!(fault.contains("no UTF-8 text"), "{fault}");
}

/// Cut off and with any byte changed a file is read or refused, never more.
#[test]
fn damage_of_any_byte_is_no_panic() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("x.label.gii");
    let read = |bytes: &[u8]| {
        fs::write(&path, bytes).unwrap();
        read_surface_labels(&path)
    };
    for name in ["gzip.label.gii", "ascii.label.gii", "gzipped.label.gii.gz"] {
        let whole = fs::read(data(name)).unwrap();
        for at in 0..whole.len() {
            if at % 7 == 0 {
                assert!(read(&whole[..at]).is_err(), "{name} cut at {at}");
            }
            for change in [0x01, 0x20, 0xff] {
                let mut damaged = whole.clone();
                damaged[at] ^= change;
                if let Ok(labels) = read(&damaged) {
                    assert!(labels.vertices.len() <= 13, "{name}, byte {at}");
                }
            }
        }
    }
}

// ---------------------------------------------------------------------------------------------
// Painting
// ---------------------------------------------------------------------------------------------

/// A finished run of the small study, with label files for its species.
struct Painting {
    study: Study,
}

/// A GIFTI label file with these labels, one vertex after the other.
fn label_file(labels: &[&str]) -> String {
    let mut table: Vec<&str> = labels.to_vec();
    table.sort_unstable();
    table.dedup();
    let key = |label: &&str| table.iter().position(|l| l == label).unwrap().to_string();
    let keys: Vec<String> = labels.iter().map(key).collect();
    let entries: String = table
        .iter()
        .zip(0..)
        .map(|(label, key): (_, usize)| format!("<Label Key=\"{key}\">{label}</Label>"))
        .collect();
    Gifti {
        table: &format!("<MetaData><MD><Name>AnatomicalStructurePrimary</Name><Value>CortexRight</Value></MD></MetaData><LabelTable>{entries}</LabelTable>"),
        attributes: &Gifti::new().attributes.replace("\"3\"", &format!("\"{}\"", labels.len())),
        data: &keys.join(" "),
        ..Gifti::new()
    }
    .text()
}

impl Painting {
    fn new() -> Painting {
        let study = Study::new();
        study.run(&[]).succeeded();
        let mut b: Vec<&str> = PARCELS_B.to_vec();
        b.extend(["wall", "Claus", "Tect", "wall"]);
        study.write("b.label.gii", label_file(&b));
        study.write("a.label.gii", label_file(&PARCELS_A));
        Painting { study }
    }

    fn paint(&self, options: &[&str]) -> Run {
        let mut command = program();
        command.arg("paint").arg(self.study.out());
        Run::of(command.args(options))
    }

    fn path(&self, name: &str) -> String {
        self.study.path(name).to_str().unwrap().to_owned()
    }

    fn maps(&self) -> PathBuf {
        self.study.path("out-maps")
    }
}

/// A painted file, read without the program's own code.
struct Decoded {
    about: BTreeMap<String, String>,
    maps: BTreeMap<String, Vec<f32>>,
}

fn between<'t>(text: &'t str, from: &str, to: &str) -> Vec<&'t str> {
    let pieces = text.split(from).skip(1);
    pieces.map(|rest| rest.split_once(to).unwrap().0).collect()
}

fn unescaped(text: &str) -> String {
    text.replace("&lt;", "<")
        .replace("&gt;", ">")
        .replace("&quot;", "\"")
        .replace("&apos;", "'")
        .replace("&amp;", "&")
}

fn pairs(text: &str) -> BTreeMap<String, String> {
    let names = between(text, "<Name>", "</Name>")
        .into_iter()
        .map(unescaped);
    let values = between(text, "<Value>", "</Value>")
        .into_iter()
        .map(unescaped);
    names.zip(values).collect()
}

fn decode(path: &Path) -> Decoded {
    let text = read(path);
    let (head, _) = text.split_once("<DataArray").unwrap();
    let mut maps = BTreeMap::new();
    let arrays = between(&text, "<DataArray", "</DataArray>");
    assert!(head.contains(&format!("NumberOfDataArrays=\"{}\"", arrays.len())));
    for array in arrays {
        for attribute in [
            "Intent=\"NIFTI_INTENT_NONE\"",
            "DataType=\"NIFTI_TYPE_FLOAT32\"",
            "ArrayIndexingOrder=\"RowMajorOrder\"",
            "Encoding=\"GZipBase64Binary\"",
            "Endian=\"LittleEndian\"",
        ] {
            assert!(array.contains(attribute), "{attribute}");
        }
        let packed = STANDARD
            .decode(between(array, "<Data>", "</Data>")[0])
            .unwrap();
        let mut bytes = Vec::new();
        ZlibDecoder::new(packed.as_slice())
            .read_to_end(&mut bytes)
            .unwrap();
        let values: Vec<f32> = bytes
            .chunks_exact(4)
            .map(|b| f32::from_le_bytes(b.try_into().unwrap()))
            .collect();
        assert!(array.contains(&format!("Dim0=\"{}\"", values.len())));
        assert!(pairs(array)["Meaning"].contains("NaN on vertices of no parcel"));
        maps.insert(pairs(array)["Name"].clone(), values);
    }
    Decoded {
        about: pairs(head),
        maps,
    }
}

/// Asserts that each vertex holds what the tables say of its parcel.
fn assert_equals(map: &[f32], labels: &[String], value: impl Fn(&str) -> Option<String>) -> usize {
    assert_eq!(map.len(), labels.len());
    let mut numbers = 0;
    for (vertex, (found, label)) in map.iter().zip(labels).enumerate() {
        match value(label) {
            Some(cell) => {
                let cell: f64 = cell.parse().unwrap();
                assert_eq!(*found, cell as f32, "vertex {vertex}, {label}");
                numbers += 1;
            }
            None => assert!(found.is_nan(), "vertex {vertex}, {label}: {found}"),
        }
    }
    numbers
}

/// Every vertex of the demo, both species, against the tables.
#[test]
fn maps_of_the_demo_equal_its_tables() {
    let study = Study::demo();
    study.run(&[]).succeeded();
    let tables = Tables::of(&study.out());
    let positions = tables.rows("positions.csv");
    let counterparts = tables.rows("counterparts.csv");
    for (species, own, other, parcel) in [
        ("Loamick", "a", "Pellivane", "Snovon"),
        ("b", "b", "Loamick", "Plalo"),
    ] {
        let label_file = demo(&format!("{own}.label.gii"));
        let mut command = program();
        command
            .arg("paint")
            .arg(study.out())
            .args(["--species", species]);
        command
            .arg("--labels")
            .arg(&label_file)
            .args(["--parcel", parcel]);
        let run = Run::of(&mut command).succeeded();
        assert!(
            run.stderr.contains(
                "1 label is no parcel of the run, so 50 vertices are without a value: \"wall\""
            ),
            "{}",
            run.stderr
        );
        assert_eq!(run.stderr.lines().count(), 1, "{}", run.stderr);
        let species = if own == "a" { "Loamick" } else { "Pellivane" };

        let labels = spelt(&read_surface_labels(&label_file).unwrap());
        let evidence = common::record(&study.out())["choice"]["evidence"].clone();
        let evidence = evidence.as_str().unwrap();
        let folder = study.path("out-maps");
        let axes = decode(&folder.join(format!("{own}.axes-{evidence}.func.gii")));
        assert_eq!(axes.about["AnatomicalStructurePrimary"], "CortexLeft");
        assert_eq!(axes.about["Species"], species);
        assert_eq!(axes.about["ComparedWith"], other);
        assert!(axes.about["Caution"].contains("statistical hypothesis, not a target"));
        let columns = positions[0].keys();
        let is_axis = |c: &&String| {
            let axis = c.strip_prefix(&format!("{evidence}_"));
            axis.is_some_and(|a| a.parse::<usize>().is_ok())
        };
        assert_eq!(
            axes.maps.keys().collect::<Vec<_>>(),
            columns.filter(is_axis).collect::<Vec<_>>()
        );
        let of_parcel = |column: &str, label: &str| {
            let mut rows = positions.iter();
            let row = rows.find(|row| row["species"] == species && row["parcel"] == label);
            row.map(|row| row[column].clone())
        };
        for (name, map) in &axes.maps {
            let numbers = assert_equals(map, &labels, |label| of_parcel(name, label));
            assert_eq!(numbers, 950);
        }

        let strength = decode(&folder.join(format!("{own}.correspondence.func.gii")));
        let first = |column: &str, label: &str| {
            let mut rows = counterparts.iter();
            let row = rows
                .find(|row| row["from"] == species && row["parcel"] == label && row["rank"] == "1");
            row.map(|row| row[column].clone())
        };
        for column in ["distance", "support"] {
            let map = &strength.maps[&format!("first_{column}")];
            let numbers = assert_equals(map, &labels, |label| first(column, label));
            assert!(
                (700..950).contains(&numbers),
                "landmarks have none: {numbers}"
            );
        }
        let beyond = &strength.maps["beyond_landmarks"];
        assert_equals(beyond, &labels, |label| {
            of_parcel("beyond_landmarks", label)
        });

        let from = decode(&folder.join(format!("{own}.from-{parcel}.func.gii")));
        let falls = |column: &str, label: &str| {
            let mut rows = counterparts.iter();
            let row = rows.find(|row| {
                row["from"] == other && row["parcel"] == parcel && row["counterpart"] == label
            });
            row.map(|row| row[column].clone())
        };
        for column in ["support", "rank", "distance"] {
            let map = &from.maps[&format!("{column} for {parcel} of {other}")];
            let numbers = assert_equals(map, &labels, |label| falls(column, label));
            assert!(
                (10..300).contains(&numbers),
                "ten parcels are listed: {numbers}"
            );
        }
    }
}

#[test]
fn the_same_run_paints_the_same_bytes_and_more_can_be_added() {
    let painting = Painting::new();
    let labels = painting.path("b.label.gii");
    let options = ["--species", "Shrew", "--labels", &labels];
    painting.paint(&options).succeeded();
    let before = contents(&painting.maps());
    assert_eq!(before.len(), 2);
    painting.paint(&options).succeeded();
    assert_eq!(contents(&painting.maps()), before);
    let elsewhere = painting.path("deep/er");
    painting
        .paint(&[&options[..], &["--out", &elsewhere]].concat())
        .succeeded();
    let there: Vec<Vec<u8>> = contents(Path::new(&elsewhere)).into_values().collect();
    assert_eq!(there, before.values().cloned().collect::<Vec<_>>());

    // Another parcel and the other alignment come into files of their own.
    painting
        .paint(
            &[
                &options[..],
                &["--parcel", "temporal", "--parcel", "parietal"],
            ]
            .concat(),
        )
        .succeeded();
    painting
        .paint(&[&options[..], &["--alignment", "procrustes"]].concat())
        .succeeded();
    painting
        .paint(&[&options[..], &["--alignment", "canonical"]].concat())
        .succeeded();
    let after = contents(&painting.maps());
    assert!(before.iter().all(|(path, bytes)| after[path] == *bytes));
    assert_eq!(
        names(&painting.maps()),
        [
            "b.axes-canonical.func.gii",
            "b.axes-procrustes.func.gii",
            "b.correspondence.func.gii",
            "b.from-parietal.func.gii",
            "b.from-temporal.func.gii",
        ]
    );
    // The run itself is as it was.
    assert_eq!(names(&painting.study.out()), common::RUN);
}

#[test]
fn earlier_maps_are_kept_unless_told() {
    let painting = Painting::new();
    let labels = painting.path("b.label.gii");
    let options = ["--species", "Shrew", "--labels", &labels];
    painting.paint(&options).succeeded();
    let before = contents(&painting.maps());
    // Another division of the same name.
    painting
        .study
        .write("b.label.gii", label_file(&["Temp", "Par", "wall"]));
    painting
        .paint(&options)
        .refused(&["out-maps", "differs", "--out", "--replace"]);
    assert_eq!(contents(&painting.maps()), before);
    painting
        .paint(&[&options[..], &["--replace"]].concat())
        .succeeded();
    let after = contents(&painting.maps());
    assert_eq!(after.len(), before.len());
    assert!(before.iter().all(|(path, bytes)| after[path] != *bytes));

    // What is not the program's own stays whatever is said, and nothing is written beside it.
    let folder = painting.path("mine");
    fs::create_dir(&folder).unwrap();
    fs::write(Path::new(&folder).join("b.correspondence.func.gii"), "mine").unwrap();
    let there = contents(Path::new(&folder));
    painting
        .paint(&[&options[..], &["--replace", "--out", &folder]].concat())
        .refused(&["not painted by this program", "left untouched"]);
    assert_eq!(contents(Path::new(&folder)), there);
    painting
        .paint(&[&options[..], &["--out", &painting.path("a.csv")]].concat())
        .refused(&["a.csv is not a folder"]);
    for inside in ["out", "out/maps", "out/deep/maps"] {
        painting
            .paint(&[&options[..], &["--out", &painting.path(inside)]].concat())
            .refused(&["the folder of the run", "--out"]);
    }
    assert_eq!(names(&painting.study.out()), common::RUN);
}

#[test]
fn both_hemispheres_are_painted_in_one_go() {
    let painting = Painting::new();
    painting
        .study
        .write("left.label.gii", label_file(&PARCELS_B[..5]));
    painting
        .study
        .write("right.label.gii", label_file(&PARCELS_B[5..]));
    let (left, right) = (
        painting.path("left.label.gii"),
        painting.path("right.label.gii"),
    );
    let one = painting
        .paint(&["--species", "Shrew", "--labels", &left])
        .succeeded();
    assert!(
        one.stderr
            .contains("Shrew: 7 of 12 parcels of the run lie on no vertex"),
        "{}",
        one.stderr
    );
    assert!(one.stderr.contains("Claus") && one.stderr.contains("both hemispheres"));
    let both = painting
        .paint(&["--species", "Shrew", "--labels", &left, "--labels", &right])
        .succeeded();
    assert_eq!(both.stderr, "");
    assert!(
        both.stdout.contains("5 parcels on 5 of 5 vertices")
            && both.stdout.contains("7 parcels on 7 of 7 vertices")
    );
    assert!(both.stdout.contains("not a target"));
    assert_eq!(names(&painting.maps()).len(), 4);
    painting
        .paint(&["--species", "Shrew", "--labels", &left, "--labels", &left])
        .refused(&["maps of the same names"]);
}

#[test]
fn labels_that_do_not_match_are_told() {
    let painting = Painting::new();
    let labels = painting.path("c.label.gii");
    let paint = |divided: &[&str]| {
        painting.study.write("c.label.gii", label_file(divided));
        painting.paint(&["--species", "Shrew", "--labels", &labels, "--replace"])
    };
    let run = paint(&["Calc", "Tenp", "???", "Tenp"]).succeeded();
    assert!(
        run.stderr
            .contains("2 labels are no parcel of the run, so 3 vertices are without a value"),
        "{}",
        run.stderr
    );
    assert!(
        run.stderr.contains("\"Tenp\" (near \"Temp\")"),
        "{}",
        run.stderr
    );
    paint(&["calc", "tenp"]).refused(&[
        "none of its labels is a parcel of Shrew",
        "\"calc\" is near \"Calc\"",
    ]);
    paint(&["motor", "insula"]).refused(&["Its labels are parcels of Vole: check --species"]);
    paint(&["xyzzy"]).refused(&[
        "It has \"xyzzy\"; the run has \"Calc\"",
        "8 more",
        "parcellation",
    ]);
    // Keys without a name, and a second array.
    let text = label_file(&["Calc", "Temp"]).replace("<Data>0 1</Data>", "<Data>0 9</Data>");
    let second = text.split_once("<DataArray").unwrap().1.to_owned();
    let text = text.replace("</GIFTI>", &format!("<DataArray{second}"));
    painting.study.write("c.label.gii", text);
    let run = painting
        .paint(&["--species", "Shrew", "--labels", &labels, "--replace"])
        .succeeded();
    assert!(
        run.stderr
            .contains("1 key is without a label in the table, so 1 vertex is without a value: 9"),
        "{}",
        run.stderr
    );
    assert!(
        run.stderr
            .contains("2 arrays of labels, of which the first"),
        "{}",
        run.stderr
    );
}

#[test]
fn parcels_that_cannot_be_asked_are_refused() {
    let painting = Painting::new();
    let labels = painting.path("b.label.gii");
    let from = |parcel: &str| {
        painting.paint(&[
            "--species",
            "Shrew",
            "--labels",
            &labels,
            "--parcel",
            parcel,
        ])
    };
    from("temporl").refused(&["must name a parcel of Vole", "did you mean \"temporal\"?"]);
    from("Temp").refused(&["one of Shrew, the species that is painted"]);
    from("motor").refused(&["belongs to the landmark \"movement\"", "given, not asked"]);
    painting
        .paint(&["--species", "Shrw", "--labels", &labels])
        .refused(&["no species \"Shrw\"", "\"Vole\" (a) and \"Shrew\" (b)"]);
    painting
        .paint(&[
            "--species",
            "b",
            "--labels",
            &labels,
            "--alignment",
            "procrutes",
        ])
        .refused(&["no axes of \"procrutes\"", "procrustes, canonical"]);
    painting
        .paint(&[
            "--species",
            "b",
            "--labels",
            &painting.path("none.label.gii"),
        ])
        .refused(&["none.label.gii", "no such file"]);
    assert!(!painting.maps().exists());
}

#[test]
fn parcels_set_aside_have_no_value() {
    let study = Study::new();
    for (name, size, at) in [("a.csv", 10, 8), ("b.csv", 12, 10)] {
        for k in 2..size + 2 {
            study.set(name, at + 2, k, "0");
            study.set(name, k, at + 2, "0");
        }
    }
    study.run(&[]).succeeded();
    study.write("b.label.gii", label_file(&PARCELS_B));
    let painting = Painting { study };
    let labels = painting.path("b.label.gii");
    let options = ["--species", "Shrew", "--labels", &labels];
    let run = painting.paint(&options).succeeded();
    assert!(run.stderr.contains("1 parcel is set aside in the run for want of connections, so 1 vertex is without a value: Claus"), "{}", run.stderr);
    assert_eq!(run.stderr.lines().count(), 1, "{}", run.stderr);
    let strength = decode(&painting.maps().join("b.correspondence.func.gii"));
    assert!(strength.maps["beyond_landmarks"][10].is_nan());
    assert!(strength.maps["beyond_landmarks"][11].is_finite());
    painting
        .paint(&[&options[..], &["--parcel", "cingulate"]].concat())
        .refused(&["\"cingulate\" of Vole was set aside"]);
}

#[test]
fn only_finished_runs_are_painted() {
    let painting = Painting::new();
    let labels = painting.path("b.label.gii");
    let paint = || painting.paint(&["--species", "b", "--labels", &labels]);
    let out = painting.study.out();
    let record = read(&out.join("run.json"));
    let says = |text: &str, says: &[&str]| {
        fs::write(out.join("run.json"), text).unwrap();
        paint().refused(says);
    };
    says(
        "{",
        &["out: expected the folder of a finished run", "no JSON"],
    );
    says("{\"program\": \"other\"}", &["another program"]);
    says(
        "{\"program\": \"kinmark\"}",
        &["does not say what its species are called"],
    );
    fs::remove_file(out.join("run.json")).unwrap();
    paint().refused(&["holds no run.json"]);
    fs::write(out.join("unfinished.json"), "{}").unwrap();
    paint().refused(&["not finished", "run kinmark locate again"]);
    fs::write(out.join("run.json"), &record).unwrap();

    let table = read(&out.join("counterparts.csv"));
    let changed = |text: &str, says: &[&str]| {
        fs::write(out.join("counterparts.csv"), text).unwrap();
        paint().refused(says);
    };
    changed(
        &table.replacen("support", "suport", 1),
        &[
            "counterparts.csv",
            "lacks the column \"support\"",
            "\"suport\"",
        ],
    );
    let cell = table.lines().find(|l| l.starts_with("Shrew")).unwrap();
    let broken = cell.replacen(",Vole,", ",Vole,,", 1);
    changed(
        &table.replacen(cell, &broken, 1),
        &["counterparts.csv", "cannot be read"],
    );
    let first = table
        .lines()
        .find(|l| l.starts_with("Shrew") && l.contains(",1,"))
        .unwrap();
    let cells: Vec<&str> = first.split(',').collect();
    let spoilt = [&cells[..7], &["far"], &cells[8..]].concat().join(",");
    changed(
        &table.replacen(first, &spoilt, 1),
        &["line ", "column 8", "expected a number, found \"far\""],
    );
    fs::remove_file(out.join("counterparts.csv")).unwrap();
    paint().refused(&["counterparts.csv", "no such file"]);

    let nowhere = painting.path("nowhere");
    let mut command = program();
    let run = Run::of(command.args(["paint", &nowhere, "--species", "b", "--labels", &labels]));
    run.refused(&["nowhere", "no such folder"]);
    assert!(!painting.maps().exists());
}

/// Columns in another order and more of them, as other versions may write them.
#[test]
fn columns_are_found_by_name() {
    let painting = Painting::new();
    let labels = painting.path("b.label.gii");
    let options = [
        "--species",
        "Shrew",
        "--labels",
        &labels,
        "--parcel",
        "temporal",
    ];
    painting.paint(&options).succeeded();
    let before = contents(&painting.maps());
    for name in ["positions.csv", "counterparts.csv"] {
        let path = painting.study.out().join(name);
        let text = read(&path);
        let turned: String = text
            .lines()
            .map(|line| {
                let mut cells: Vec<&str> = line.split(',').collect();
                cells.push("added");
                cells.reverse();
                cells.join(",") + "\n"
            })
            .collect();
        fs::write(path, turned).unwrap();
    }
    painting.paint(&options).succeeded();
    assert_eq!(contents(&painting.maps()), before);
}

/// Labels with markup, blanks and signs that no file name takes.
#[test]
fn odd_labels_are_escaped() {
    let odd = "Tê, <lateral>/\"so\" & 'on'";
    let study = Study::new();
    let quoted = format!("\"{}\"", odd.replace('"', "\"\""));
    study.edit("a.csv", |text| text.replace("temporal", &quoted));
    study.run(&["--top", "all"]).succeeded();
    study.write("b.label.gii", label_file(&PARCELS_B));
    let painting = Painting { study };
    let labels = painting.path("b.label.gii");
    painting
        .paint(&["--species", "b", "--labels", &labels, "--parcel", odd])
        .succeeded();
    let name = "b.from-Tê%2C%20%3Clateral%3E%2F%22so%22%20%26%20%27on%27.func.gii";
    let from = decode(&painting.maps().join(name));
    let ranks = &from.maps[&format!("rank for {odd} of Vole")];
    let mut found: Vec<f32> = ranks.iter().copied().filter(|r| r.is_finite()).collect();
    found.sort_by(f32::total_cmp);
    assert_eq!(found, [1.0, 2.0, 3.0, 4.0, 5.0, 6.0]);
}

/// A run that is the folder at hand, and maps that can be read by all that may read new files.
#[test]
fn the_folder_at_hand_can_be_painted() {
    let painting = Painting::new();
    let labels = painting.path("b.label.gii");
    let mut command = program();
    command.current_dir(painting.study.out());
    let run = Run::of(command.args(["paint", ".", "--species", "b", "--labels", &labels]));
    run.succeeded();
    assert_eq!(names(&painting.maps()).len(), 2);
    #[cfg(unix)]
    {
        use std::os::unix::fs::PermissionsExt;
        let mode = |path: &Path| fs::metadata(path).unwrap().permissions().mode() & 0o777;
        let fresh = painting.study.path("fresh");
        fs::write(&fresh, "").unwrap();
        let map = painting.maps().join("b.correspondence.func.gii");
        assert_eq!(mode(&map), mode(&fresh));
    }
}
