//! Matrices in every format: what common programs write is read as one and the same connectivity,
//! a whole run does not depend on the format, and broken files are refused with a message.

mod common;

use std::io::Write;
use std::path::{Path, PathBuf};

use common::{Run, Study};
use flate2::write::GzEncoder;
use flate2::Compression;
use kinmark::domain::{Connectivity, WeightKind};
use kinmark::input::{read_matrix_of, InputError, SpeciesFile};

fn data(name: &str) -> PathBuf {
    Path::new("tests/data/formats").join(name)
}

/// A species whose matrix is a file beside the script that made it.
fn species(matrix: &str) -> SpeciesFile {
    SpeciesFile::new("Vole", &data(matrix), WeightKind::Counts)
}

fn read(species: &SpeciesFile) -> Connectivity {
    let matrix = read_matrix_of(species, species.source()).unwrap_or_else(|e| panic!("{e}"));
    assert_eq!(matrix.warnings, [], "{}", species.source().display());
    assert_eq!(matrix.file.path, species.source());
    assert_eq!(
        matrix.labels.first().map(|l| &l.path),
        species.labels.as_ref(),
        "{}",
        species.source().display()
    );
    matrix.network
}

fn with_labels(matrix: &str) -> SpeciesFile {
    SpeciesFile {
        labels: Some(data("labels.txt")),
        ..species(matrix)
    }
}

fn error(species: &SpeciesFile) -> InputError {
    read_matrix_of(species, species.source()).expect_err("it must be refused")
}

/// The matrix that all files hold.
fn expected() -> Connectivity {
    let network = read(&species("labelled.csv"));
    assert_eq!(network.row_labels()[4], "Tê, <lateral>");
    assert_eq!(network.weights()[(2, 3)], 410.0);
    assert_eq!(network.weights()[(3, 2)], 380.0);
    network
}

#[test]
fn formats_with_labels_give_the_same_connectivity() {
    let expected = expected();
    for name in [
        "labelled.tsv",
        "labelled.csv.gz",
        "header-only.csv",
        "column-only.csv",
        "sub-1_relmat.tsv",
        "sub-2_relmat.tsv",
        "stored.npz",
        "deflated.npz",
        "bytes.npz",
        "plain.mat",
        "compressed.mat",
        "single.mat",
        "f4.pconn.nii",
        "f8.pconn.nii",
    ] {
        assert_eq!(read(&species(name)), expected, "{name}");
        // Labels of a file of their own win, and here they are the same.
        assert_eq!(read(&with_labels(name)), expected, "{name}");
    }
}

#[test]
fn formats_without_labels_give_the_same_connectivity() {
    let expected = expected();
    for name in [
        "bare.csv",
        "bare.csv.gz",
        "savetxt.txt",
        "f8.npy",
        "f4.npy",
        "f8-big.npy",
        "f8-fortran.npy",
        "edges.csv",
        "edges.tsv",
    ] {
        assert_eq!(read(&with_labels(name)), expected, "{name}");
    }
}

#[test]
fn integers_of_every_width_are_read() {
    let expected = expected();
    for name in ["u2", "i2", "u4", "i4", "u8", "i8", "i4-big"] {
        let network = read(&with_labels(&format!("{name}.npy")));
        assert_eq!(
            network.weights(),
            &expected.weights().mapv(f64::floor),
            "{name}"
        );
    }
    for name in ["u1", "i1"] {
        let network = read(&with_labels(&format!("{name}.npy")));
        let remainder = expected.weights().mapv(|w| w.floor() % 100.0);
        assert_eq!(network.weights(), &remainder, "{name}");
    }
    assert_eq!(
        read(&species("integers.mat")).weights(),
        &expected.weights().mapv(f64::floor)
    );
}

#[test]
fn a_list_without_labels_has_the_parcels_that_occur() {
    let (network, expected) = (read(&species("edges.csv")), expected());
    let at = |label: &String| expected.row_labels().iter().position(|l| l == label);
    let order: Vec<usize> = network.row_labels().iter().filter_map(at).collect();
    assert_eq!(order[0], 4, "the first source comes first");
    assert_eq!(network, expected.select(&order, &order));
}

#[test]
fn keys_say_which_array_is_meant() {
    let expected = expected();
    for file in ["several.npz", "several.mat"] {
        let several = SpeciesFile {
            variable: Some("weights".to_owned()),
            label_variable: Some(
                if file.ends_with("npz") {
                    "labels"
                } else {
                    "names"
                }
                .to_owned(),
            ),
            ..species(file)
        };
        assert_eq!(read(&several), expected, "{file}");
        let lengths = SpeciesFile {
            variable: Some("lengths".to_owned()),
            ..several
        };
        assert_eq!(read(&lengths).weights(), &expected.weights().t(), "{file}");
    }
    // Rows of characters are labels as well.
    let letters = read(&species("characters.mat"));
    assert_eq!(letters.row_labels(), ["ab", "c", "de", "f", "g"]);
}

#[test]
fn labels_that_win_rename_parcels_but_never_exchange_them() {
    let folder = tempfile::tempdir().unwrap();
    let labels = folder.path().join("labels.txt");
    let named = |text: &str, matrix: &str| {
        std::fs::write(&labels, text).unwrap();
        SpeciesFile {
            labels: Some(labels.clone()),
            ..species(matrix)
        }
    };
    let renamed = read(&named("p\n\"q\"\nr, s\nt\nu\n\n", "stored.npz"));
    assert_eq!(renamed.row_labels(), ["p", "q", "r, s", "t", "u"]);
    assert_eq!(renamed.weights(), expected().weights());

    let says = |species: &SpeciesFile, fragments: &[&str]| {
        let said = error(species).to_string();
        for fragment in fragments {
            assert!(said.contains(fragment), "{said} lacks {fragment:?}");
        }
    };
    says(
        &named("A1\nV1\nM1\nhippocampus\nTê, <lateral>\n", "f4.pconn.nii"),
        &[
            "labels.txt, line 1: ",
            "\"A1\" where",
            "itself says \"V1\"",
            "another order",
        ],
    );
    says(
        &named("p\nq\nr\ns\n", "f8.npy"),
        &["labels.txt: ", "4 labels for the 5 rows of", "f8.npy"],
    );
    says(
        &named("p\nq\nr\np\ns\n", "f8.npy"),
        &["labels.txt, line 4 (p): ", "came before, at line 1;"],
    );
    says(
        &named("p\nq\n\nr\ns\n", "f8.npy"),
        &["labels.txt, line 3: ", "expected a parcel label"],
    );
}

/// One file to refuse: more keys of its species, what is in it, what the message must say.
struct Case {
    name: &'static str,
    keys: &'static str,
    bytes: Vec<u8>,
    says: &'static [&'static str],
}

/// Runs every case as species a of the small study before it fails.
fn refuse(cases: Vec<Case>) {
    let mut faults = Vec::new();
    for case in cases {
        let study = Study::new();
        study.write("x.bin", &case.bytes);
        study.write("labels.txt", "V1\nA1\nM1\nhippocampus\nTê, <lateral>\n");
        let keys = format!("matrix = \"x.bin\"\n{}", case.keys);
        study.swap("study.toml", "matrix = \"a.csv\"", &keys);
        let run = study.run(&[]);
        let mut found = run.faults(case.says);
        if !run.stderr.contains("x.bin") && !run.stderr.contains("study.toml") {
            found.push(format!("names no file: {}", run.stderr));
        }
        if study.out().exists() {
            found.push("the folder for results was made".to_owned());
        }
        if !found.is_empty() {
            faults.push(format!("{}:\n    {}", case.name, found.join("\n    ")));
        }
    }
    assert!(faults.is_empty(), "\n{}", faults.join("\n"));
}

fn file(name: &str) -> Vec<u8> {
    std::fs::read(data(name)).unwrap()
}

fn case(name: &'static str, bytes: Vec<u8>, says: &'static [&'static str]) -> Case {
    Case {
        name,
        keys: "",
        bytes,
        says,
    }
}

impl Case {
    fn keys(self, keys: &'static str) -> Case {
        Case { keys, ..self }
    }

    fn labelled(self) -> Case {
        self.keys("labels = \"labels.txt\"")
    }
}

fn cut(name: &str, bytes: usize) -> Vec<u8> {
    let mut file = file(name);
    file.truncate(file.len() - bytes);
    file
}

/// The bytes of a file with one piece of it replaced.
fn replaced(name: &str, from: &[u8], to: &[u8]) -> Vec<u8> {
    let file = file(name);
    let at = file
        .windows(from.len())
        .position(|w| w == from)
        .expect("it is there");
    [&file[..at], to, &file[at + from.len()..]].concat()
}

fn gzip(bytes: &[u8]) -> Vec<u8> {
    let mut encoder = GzEncoder::new(Vec::new(), Compression::best());
    encoder.write_all(bytes).unwrap();
    encoder.finish().unwrap()
}

/// A NumPy file with this header and these elements.
fn npy(header: &str, elements: &[u8]) -> Vec<u8> {
    let mut bytes = b"\x93NUMPY\x01\x00".to_vec();
    bytes.extend((header.len() as u16).to_le_bytes());
    bytes.extend(header.as_bytes());
    bytes.extend(elements);
    bytes
}

#[test]
fn broken_numpy_files() {
    refuse(vec![
        case("cut off", cut("f8.npy", 8), &["ends too early", "5 x 5", "200 bytes, 192 are"]).labelled(),
        case("cut off in its header", file("f8.npy")[..60].to_vec(), &["damaged", "NumPy array"]).labelled(),
        case("nothing but the magic bytes", b"\x93NUMPY".to_vec(), &["damaged", "save it again"]).labelled(),
        case(
            "a header that claims 10^12 entries",
            npy("{'descr': '<f8', 'fortran_order': False, 'shape': (1000000, 1000000), }", &[0; 64]),
            &["ends too early", "8000000000000 bytes, 64 are there"],
        )
        .labelled(),
        case(
            "a header that claims more than can be counted",
            npy("{'descr': '<f8', 'fortran_order': False, 'shape': (18446744073709551615, 18446744073709551615), }", &[]),
            &["ends too early"],
        )
        .labelled(),
        case("a header of nonsense", npy("{'descr': <f8}", &[]), &["damaged", "NumPy header is"]).labelled(),
        case("truth values", file("bool.npy"), &["expected real numbers", "found bool", ".astype(float)"]).labelled(),
        case("complex numbers", file("complex.npy"), &["found complex numbers"]).labelled(),
        case("records", file("records.npy"), &["expected real numbers", "('x', '<f8')"]).labelled(),
        case("three axes", file("cube.npy"), &["expected a matrix", "an array of 2 x 5 x 5"]).labelled(),
        case("one axis", file("list.npy"), &["expected a matrix", "a list of 5"]).labelled(),
        case("no labels", file("f8.npy"), &["5 rows of numbers but no labels", "labels = \"FILE\""]),
        case("a key without use", file("f8.npy"), &["key variable names an array", "a single array"])
            .keys("variable = \"weights\""),
        case(
            "a negative number",
            npy("{'descr': '<i1', 'fortran_order': False, 'shape': (5, 5), }", &{
                let mut entries = [1; 25];
                entries[7] = (-3_i8).cast_unsigned();
                entries
            }),
            &["x.bin, row 2, column 3 (A1 to M1): ", "zero or more (counts)", "found -3"],
        )
        .labelled(),
    ]);
}

/// A 5 x 5 array of f32 in which one entry differs.
fn one_entry(value: f32) -> Vec<u8> {
    let mut bytes: Vec<u8> = Vec::new();
    for i in 0..25 {
        bytes.extend(if i == 14 { value } else { 1.0 }.to_le_bytes());
    }
    npy(
        "{'descr': '<f4', 'fortran_order': True, 'shape': (5, 5), }",
        &bytes,
    )
}

#[test]
fn infinite_entries_say_where_they_are() {
    refuse(vec![case(
        "infinite",
        one_entry(f32::INFINITY),
        &[
            "row 5, column 3 (Tê, <lateral> to M1): ",
            "finite number",
            "\"inf\"",
        ],
    )
    .labelled()]);
}

#[test]
fn missing_entries_are_told_from_zeros() {
    let folder = tempfile::tempdir().unwrap();
    let matrix = folder.path().join("x");
    std::fs::write(&matrix, one_entry(f32::NAN)).unwrap();
    let array = SpeciesFile {
        matrix: Some(matrix.clone()),
        ..with_labels("labels.txt")
    };
    let network = read(&array);
    assert_eq!(network.missing(), 1);
    assert!(network.is_missing(4, 2));
    std::fs::write(&matrix, "source,target,weight\nV1,A1,n/a\nA1,V1,2\n").unwrap();
    let network = read(&array);
    assert!(network.is_missing(0, 1) && network.missing() == 1);
}

#[test]
fn broken_archives_of_arrays() {
    refuse(vec![
        case(
            "cut off",
            cut("deflated.npz", 30),
            &["damaged", "save it again"],
        ),
        case(
            "without arrays",
            file("nothing.zip"),
            &["without NumPy arrays", "readme.txt"],
        ),
        case(
            "several matrices",
            file("several.npz"),
            &["several matrices: weights, lengths", "variable = \"NAME\""],
        ),
        case(
            "no such array",
            file("several.npz"),
            &["names the array \"wieghts\"", "did you mean \"weights\"?"],
        )
        .keys("variable = \"wieghts\""),
        case(
            "no matrix",
            file("several.npz"),
            &["\"cube\", which is an array of 2 x 2 x 2 of float64"],
        )
        .keys("variable = \"cube\""),
        case(
            "several lists of labels",
            file("several.npz"),
            &["lists of labels that fit: labels, lobes", "label-variable"],
        )
        .keys("variable = \"weights\""),
        case(
            "numbers for labels",
            file("several.npz"),
            &[
                "label-variable names the array \"lengths\"",
                "a list of texts",
            ],
        )
        .keys("variable = \"weights\"\nlabel-variable = \"lengths\""),
        case(
            "two keys for labels",
            file("stored.npz"),
            &["study.toml, line 8", "both labels and label-variable"],
        )
        .keys("labels = \"labels.txt\"\nlabel-variable = \"labels\""),
        case(
            "an array that claims 10^12 entries",
            replaced(
                "stored.npz",
                b"'shape': (5, 5), }          ",
                b"'shape': (1000000, 1000000)}",
            ),
            &["ends too early", "8000000000000 bytes"],
        ),
    ]);
}

#[test]
fn broken_matlab_files() {
    refuse(vec![
        case(
            "cut off",
            cut("plain.mat", 300),
            &["ends too early", "a variable takes"],
        ),
        case(
            "cut off, compressed",
            cut("compressed.mat", 20),
            &["ends too early", "a variable takes"],
        ),
        case(
            "header only",
            file("plain.mat")[..100].to_vec(),
            &["ends too early", "MATLAB header"],
        ),
        case(
            "10^12 entries",
            replaced(
                "plain.mat",
                &[5, 0, 0, 0, 5, 0, 0, 0],
                &[0x40, 0x42, 0x0f, 0, 0x40, 0x42, 0x0f, 0],
            ),
            &[
                "ends too early",
                "1000000 x 1000000",
                "8000000000000 bytes, 200 are there",
            ],
        ),
        case(
            "several matrices",
            file("several.mat"),
            &["several matrices: weights, lengths", "variable = \"NAME\""],
        ),
        case(
            "three axes",
            file("several.mat"),
            &["\"cube\", which is an array of 2 x 2 x 2"],
        )
        .keys("variable = \"cube\""),
        case(
            "truth values",
            file("several.mat"),
            &["logical values; save double(NAME)"],
        )
        .keys("variable = \"mask\""),
        case("complex numbers", file("several.mat"), &["complex numbers"])
            .keys("variable = \"phase\""),
        case(
            "sparse",
            file("several.mat"),
            &["a sparse matrix; save full(NAME)"],
        )
        .keys("variable = \"thin\""),
        case("a structure", file("several.mat"), &["a structure"]).keys("variable = \"about\""),
        case(
            "version 7.3",
            [
                b"MATLAB 7.3 MAT-file, Platform: GLNXA64".as_slice(),
                &[0; 474],
                b"\x89HDF\r\n\x1a\n",
            ]
            .concat(),
            &["HDF5", "'-v7'"],
        ),
    ]);
}

#[test]
fn broken_cifti_files() {
    refuse(vec![
        case("cut off", cut("f4.pconn.nii", 4), &["ends too early", "5 x 5 takes 100 bytes, 96 are there"]),
        case("cut off in its XML", file("f4.pconn.nii")[..900].to_vec(), &["damaged", "start at byte 1440", "has 900"]),
        case("header only", file("f4.pconn.nii")[..300].to_vec(), &["ends too early", "NIfTI-2 header"]),
        case("10^12 entries", {
            let mut file = file("f4.pconn.nii");
            for at in [16 + 40, 16 + 48] {
                file[at..at + 8].copy_from_slice(&1_000_000_i64.to_le_bytes());
            }
            file
        }, &["ends too early", "4000000000000 bytes, 100 are there"]),
        case("integers", {
            let mut file = file("f4.pconn.nii");
            file[12] = 8;
            file
        }, &["expected real numbers", "NIfTI data type 8"]),
        case(
            "a bomb of entities",
            xml("<!DOCTYPE b [<!ENTITY a \"aaaaaaaaaaaaaaaa\"><!ENTITY b \"&a;&a;&a;&a;\">]><CIFTI>&b;</CIFTI>"),
            &["document type declaration", "not read"],
        ),
        case("an entity", xml("<CIFTI>&b;</CIFTI>"), &["the entity \"b\""]),
        case(
            "an entity in a name",
            xml("<CIFTI><MatrixIndicesMap AppliesToMatrixDimension=\"0,1\" IndicesMapToDataType=\"CIFTI_INDEX_TYPE_PARCELS\"><Parcel Name=\"&b;\"/></MatrixIndicesMap></CIFTI>"),
            &["a reference that cannot be resolved"],
        ),
        case("XML that is none", xml("<CIFTI><Matrix></CIFTI>"), &["damaged", "XML cannot be read"]),
        case("no maps", xml("<CIFTI></CIFTI>"), &["parcellated CIFTI-2", "without parcels on both axes"]),
        case("scalars", file("pscalar.nii"), &["parcellated CIFTI-2", "\"SCALARS\" on dimension 0"]),
        case("an image", file("image2.nii"), &["a NIfTI-2 file of 4 x 4 x 4"]),
        case("an image of version 1", file("image1.nii"), &["NIfTI-1 image"]),
    ]);
}

/// The small CIFTI-2 file with another XML of the same length.
fn xml(text: &str) -> Vec<u8> {
    let mut file = file("f4.pconn.nii");
    let end = 1440;
    assert!(552 + text.len() <= end);
    file[552..end].fill(0);
    file[552..552 + text.len()].copy_from_slice(text.as_bytes());
    file
}

#[test]
fn broken_gzip_files() {
    refuse(vec![
        case(
            "a bomb",
            gzip(&vec![b'0'; 64 << 20]),
            &["grows beyond", "without compression"],
        ),
        case("cut off", cut("labelled.csv.gz", 20), &["damaged"]),
        case("twice", gzip(&gzip(b"a,b\n")), &["compressed twice"]),
        case(
            "a text in it with a fault",
            gzip(b"x,p,q\np,0,many\nq,1,0\n"),
            &["line 2, column 3 (p to q): ", "found \"many\""],
        ),
    ]);
}

#[test]
fn broken_lists_of_connections() {
    let list = |lines: &str| format!("source,target,weight\n{lines}").into_bytes();
    refuse(vec![
        case(
            "unknown parcel",
            list("V1,A1,2\nV1,hipocampus,3\n"),
            &[
                "line 3, column 2: ",
                "did you mean \"hippocampus\"?",
                "labels.txt",
            ],
        )
        .labelled(),
        case(
            "a pair twice",
            list("V1,A1,2\nA1,V1,1\n\nV1,A1,2\n"),
            &["line 5 (V1 to A1): ", "at line 2;"],
        ),
        case(
            "an empty end",
            list("V1,,2\n"),
            &["line 2, column 2: ", "expected a parcel label"],
        ),
        case(
            "text",
            list("V1,A1,many\n"),
            &["line 2, column 3 (V1 to A1): ", "found \"many\""],
        ),
        case(
            "negative",
            list("V1,A1,3\nA1,M1,-2\n"),
            &["line 3, column 3 (A1 to M1): ", "found -2"],
        ),
        case(
            "another column",
            b"source,target,weight,note\nV1,A1,3,x\n".to_vec(),
            &["line 1, column 4: ", "unknown column \"note\""],
        ),
    ]);
    let logarithms = SpeciesFile {
        weights: WeightKind::Log10,
        ..with_labels("edges.csv")
    };
    let said = error(&logarithms).to_string();
    assert!(
        said.contains("V1 to hippocampus is not in the list"),
        "{said}"
    );
}

#[test]
fn broken_texts() {
    refuse(vec![
        case(
            "numbers without labels",
            file("bare.csv"),
            &["5 rows of numbers but no labels"],
        ),
        case(
            "a key without use",
            file("labelled.csv"),
            &["key label-variable names", "a text table"],
        )
        .keys("label-variable = \"x\""),
        case(
            "numbers, not square",
            b"0,1,2.5\n0,0,3\n".to_vec(),
            &["labels.txt: ", "5 labels for the 2 rows"],
        )
        .labelled(),
        case(
            "text between numbers",
            b"0 1 2\n1 0 x\n3 1 0\n".to_vec(),
            &["line 2, column 3: ", "found \"x\""],
        )
        .labelled(),
    ]);
}

/// Every byte of every binary file changed in turn, and every beginning of it: read or refused.
#[test]
fn no_damage_makes_it_panic() {
    let folder = tempfile::tempdir().unwrap();
    let damaged = SpeciesFile {
        matrix: Some(folder.path().join("x")),
        ..species("f8.npy")
    };
    let mut tried = 0;
    for name in [
        "f4.npy",
        "deflated.npz",
        "stored.npz",
        "several.mat",
        "plain.mat",
        "f4.pconn.nii",
        "labelled.csv.gz",
    ] {
        let whole = file(name);
        for at in 0..whole.len() {
            let mut changed = whole.clone();
            changed[at] ^= [0xff, 0x01, 0x80][at % 3];
            for bytes in [changed.as_slice(), &whole[..at]] {
                std::fs::write(damaged.source(), bytes).unwrap();
                for variable in [None, Some("weights".to_owned())] {
                    let described = SpeciesFile {
                        variable,
                        ..damaged.clone()
                    };
                    let _ = read_matrix_of(&described, described.source());
                    tried += 1;
                }
            }
        }
    }
    assert!(tried > 20_000, "{tried}");
}

#[test]
fn gzip_may_hold_any_format() {
    let folder = tempfile::tempdir().unwrap();
    let matrix = folder.path().join("x.pconn.nii.gz");
    std::fs::write(&matrix, gzip(&file("f4.pconn.nii"))).unwrap();
    let packed = SpeciesFile {
        matrix: Some(matrix),
        ..species("f8.npy")
    };
    assert_eq!(read(&packed), expected());
}

/// Reads a labelled CSV without quotes.
fn table(path: &Path) -> (Vec<String>, Vec<Vec<f64>>) {
    let text = common::read(path);
    let mut lines = text.lines();
    let labels = lines.next().unwrap().split(',').skip(1);
    let labels = labels.map(str::to_owned).collect();
    let numbers = |line: &str| {
        line.split(',')
            .skip(1)
            .map(|c| c.parse().unwrap())
            .collect()
    };
    (labels, lines.map(numbers).collect())
}

/// Runs the worm study with both matrices rewritten, and gives its counterparts.
fn counterparts(rewrite: impl Fn(&[String], &[Vec<f64>], &str) -> Vec<u8>, keys: &str) -> String {
    let worm = Path::new("tests/data/worm-stages");
    let folder = tempfile::tempdir().unwrap();
    let at = |name: &str| folder.path().join(name);
    std::fs::copy(worm.join("landmarks.csv"), at("landmarks.csv")).unwrap();
    let mut study = common::read(&worm.join("study.toml"));
    for side in ["a", "b"] {
        let name = format!("{side}.csv");
        let text = common::read(&worm.join(&name));
        let (labels, weights) = table(&worm.join(&name));
        std::fs::write(
            at(&format!("{side}.any")),
            rewrite(&labels, &weights, &text),
        )
        .unwrap();
        std::fs::write(at(&format!("{side}.txt")), labels.join("\n")).unwrap();
        let keys = keys.replace("SIDE", side);
        study = study.replace(
            &format!("matrix = \"{side}.csv\""),
            &format!("matrix = \"{side}.any\"\n{keys}"),
        );
    }
    std::fs::write(at("study.toml"), study).unwrap();
    let out = at("out");
    let mut command = common::program();
    command
        .arg("locate")
        .arg(at("study.toml"))
        .arg("--out")
        .arg(&out)
        .args(["--replicates", "20", "--quiet"]);
    Run::of(&mut command).succeeded();
    let inputs = &common::record(&out)["inputs"];
    let recorded = inputs["labels"]["b"][0]["path"].as_str();
    assert_eq!(recorded.is_some(), keys.contains("labels"), "{inputs}");
    common::read(&out.join("counterparts.csv"))
}

#[test]
fn a_run_does_not_depend_on_the_format() {
    const LABELS: &str = "labels = \"SIDE.txt\"";
    let text = counterparts(|_, _, text| text.as_bytes().to_vec(), "");
    let same = |format: &str, other: String| assert!(text == other, "{format} differs from CSV");
    same("gzip", counterparts(|_, _, text| gzip(text.as_bytes()), ""));
    same(
        "npy",
        counterparts(
            |labels, weights, _| {
                let n = labels.len();
                let bytes: Vec<u8> = weights
                    .iter()
                    .flatten()
                    .flat_map(|w| w.to_le_bytes())
                    .collect();
                npy(
                    &format!("{{'descr': '<f8', 'fortran_order': False, 'shape': ({n}, {n}), }}"),
                    &bytes,
                )
            },
            LABELS,
        ),
    );
    same(
        "list",
        counterparts(
            |labels, weights, _| {
                let mut list = "source;target;weight\n".to_owned();
                for (from, row) in labels.iter().zip(weights).rev() {
                    for (to, weight) in labels.iter().zip(row).filter(|(_, w)| **w != 0.0) {
                        list += &format!("{from};{to};{weight}\n");
                    }
                }
                list.into_bytes()
            },
            LABELS,
        ),
    );
}

/// The small matrix against itself in every binary format.
#[test]
fn a_run_on_the_small_matrix_does_not_depend_on_the_format() {
    let folder = tempfile::tempdir().unwrap();
    let at = |name: &str| folder.path().join(name);
    let landmarks = "landmark,a,b\nsight,V1,V1\nhearing,A1,A1\nmovement,M1,M1\n";
    std::fs::write(at("landmarks.csv"), landmarks).unwrap();
    let here = std::env::current_dir().unwrap();
    let run = |name: &str, labels: bool| {
        let mut study = "title = \"x\"\nlandmarks = \"landmarks.csv\"\n".to_owned();
        for side in ["a", "b"] {
            study += &format!(
                "[species.{side}]\nname = \"{side}\"\nweights = \"counts\"\nmatrix = {:?}\n",
                here.join(data(name))
            );
            if labels {
                study += &format!("labels = {:?}\n", here.join(data("labels.txt")));
            }
        }
        std::fs::write(at("study.toml"), study).unwrap();
        let out = at(&format!("out-{name}-{labels}"));
        let mut command = common::program();
        command
            .arg("locate")
            .arg(at("study.toml"))
            .arg("--out")
            .arg(&out)
            .args(["--replicates", "20", "--quiet"]);
        Run::of(&mut command).succeeded();
        common::read(&out.join("counterparts.csv"))
    };
    let text = run("labelled.csv", false);
    assert!(text.contains("hippocampus"));
    for (name, labels) in [
        ("f4.npy", true),
        ("f8-fortran.npy", true),
        ("deflated.npz", false),
        ("stored.npz", false),
        ("plain.mat", false),
        ("compressed.mat", false),
        ("f4.pconn.nii", false),
        ("f8.pconn.nii", false),
        ("edges.csv", true),
        ("sub-1_relmat.tsv", false),
    ] {
        assert!(run(name, labels) == text, "{name} differs from CSV");
    }
}
