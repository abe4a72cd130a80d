//! `kinmark new`: the study file it drafts, its guesses, and what it leaves alone.

mod common;

use std::fs;
use std::path::{Path, PathBuf};

use common::{contents, csv, names, program, read, Run, Study};
use kinmark::domain::{Connectivity, WeightKind};
use kinmark::input::{read_matrix_of, read_study_file, SpeciesFile, StudyFile};
use serde_json::Value;
use tempfile::TempDir;

fn path(file: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join(file)
}

fn new(folder: &Path) -> Run {
    Run::of(program().arg("new").arg(folder))
}

fn inspect(folder: &Path) -> Run {
    let study = folder.join("study.toml");
    Run::of(program().arg("inspect").arg(study).arg("--json"))
}

/// A folder with copies of a study's tables and without its study file.
fn tables_of(study: &str) -> TempDir {
    let folder = tempfile::tempdir().unwrap();
    for entry in fs::read_dir(path(study)).unwrap() {
        let from = entry.unwrap().path();
        if from.extension().is_some_and(|e| e == "csv") {
            fs::copy(&from, folder.path().join(from.file_name().unwrap())).unwrap();
        }
    }
    folder
}

/// The small valid study's tables under other names.
fn small(names: &[(&str, &str)]) -> TempDir {
    let folder = tempfile::tempdir().unwrap();
    let study = Study::new();
    for (from, to) in names {
        fs::write(folder.path().join(to), study.text(from)).unwrap();
    }
    folder
}

fn drafted(folder: &Path) -> StudyFile {
    read_study_file(&folder.join("study.toml")).unwrap()
}

fn file_name(path: &Path) -> &str {
    path.file_name().unwrap().to_str().unwrap()
}

/// What the draft chose is what the makers of the studies chose.
#[test]
fn drafts_agree_with_the_studies_that_come_along() {
    for study in [
        "species-demo",
        "tests/data/worm-stages",
        "tests/data/left-right-rest",
    ] {
        let folder = tables_of(study);
        let run = new(folder.path()).succeeded();
        assert_eq!(run.stderr, "");
        let (draft, real) = (drafted(folder.path()), drafted(&path(study)));
        assert_eq!(file_name(&draft.landmarks), file_name(&real.landmarks));
        for side in kinmark::domain::Side::BOTH {
            let (draft, real) = (&draft.species[side], &real.species[side]);
            assert_eq!(file_name(draft.source()), file_name(real.source()));
            assert_eq!(draft.weights, real.weights);
            assert_eq!(draft.transform, real.transform);
            assert_eq!(draft.likeness, real.likeness);
            assert_eq!(draft.strongest, real.strongest);
            let name = |path: &Option<PathBuf>| path.as_deref().map(file_name).map(str::to_owned);
            assert_eq!(name(&draft.parcels), name(&real.parcels));
        }
        assert_eq!(draft.request, real.request);

        // Inspected, both give the same facts but for names and places.
        let facts = |folder: &Path| -> Value {
            let run = inspect(folder).succeeded();
            let mut said: Value = serde_json::from_str(&run.stdout).unwrap();
            for side in ["a", "b"] {
                said["species"][side]["name"] = Value::Null;
                said["inputs"]["matrix"][side]["path"] = Value::Null;
            }
            for key in ["title", "inputs", "suggestions", "warnings"] {
                said[key] = Value::Null;
            }
            said
        };
        assert_eq!(facts(folder.path()), facts(&path(study)));
    }
}

#[test]
fn every_setting_stands_there_and_can_be_uncommented() {
    let folder = tables_of("species-demo");
    new(folder.path()).succeeded();
    let file = folder.path().join("study.toml");
    let before = drafted(folder.path());
    let key = |line: &str| -> Option<String> {
        let (key, _) = line.strip_prefix("# ")?.split_once(" = ")?;
        let word = |c: char| c.is_ascii_lowercase() || c == '-';
        (!key.is_empty() && key.chars().all(word)).then(|| key.to_owned())
    };
    let text = read(&file);
    let keys: Vec<String> = text.lines().filter_map(key).collect();
    for setting in kinmark::settings::Request::KEYS {
        assert!(keys.iter().any(|k| k == setting), "{setting}");
    }
    for (setting, times) in [("transform", 2), ("affinity", 2), ("strongest", 2)] {
        assert_eq!(keys.iter().filter(|k| *k == setting).count(), times);
    }
    let bare: Vec<&str> = text
        .lines()
        .map(|line| {
            if key(line).is_some() {
                &line[2..]
            } else {
                line
            }
        })
        .collect();
    fs::write(&file, bare.join("\n")).unwrap();
    let after = drafted(folder.path());
    // What was shown are the defaults.
    assert_eq!(
        after.request.clone().settle().0,
        before.request.clone().settle().0
    );
    let study = kinmark::prepare::prepare(&file, Default::default()).unwrap();
    assert_eq!(study.treatment.a.transform.to_string(), "log-floor");
}

#[test]
fn the_next_command_is_shown_and_works() {
    let folder = tables_of("species-demo");
    let run = new(folder.path()).succeeded();
    let last = run.stdout.lines().last().unwrap().trim();
    let study = folder.path().join("study.toml");
    assert_eq!(last, format!("kinmark inspect {}", study.display()));
    assert!(run.stdout.contains("a.csv, 90 parcels"));
    assert!(run.stdout.contains("not used   truth.csv"));
    assert!(!run.stdout.contains("To do"), "{}", run.stdout);
}

#[test]
fn a_study_file_is_never_overwritten() {
    let folder = tables_of("species-demo");
    fs::write(folder.path().join("study.toml"), "mine").unwrap();
    let before = contents(folder.path());
    new(folder.path()).refused(&["study.toml", "already", "remove it"]);
    assert_eq!(contents(folder.path()), before);
}

#[test]
fn places_that_cannot_be_are_refused() {
    let folder = tables_of("species-demo");
    new(&folder.path().join("nowhere")).refused(&["nowhere", "no such folder", "name the folder"]);
    new(&folder.path().join("a.csv")).refused(&["a.csv", "expected a folder, found a file"]);
    assert!(!folder.path().join("study.toml").exists());
}

#[test]
fn no_matrix_at_all_is_refused_with_reasons() {
    let folder = tempfile::tempdir().unwrap();
    new(folder.path()).refused(&["found no matrix", "no such file at all"]);
    let folder = small(&[("landmarks.csv", "landmarks.csv")]);
    fs::write(
        folder.path().join("places.csv"),
        "parcel,x,y\nA,1,2\nB,3,4\n",
    )
    .unwrap();
    fs::write(folder.path().join("empty.tsv"), "").unwrap();
    new(folder.path()).refused(&[
        "found no matrix",
        "\"places.csv\": its rows and columns do not name the same parcels",
        "\"empty.tsv\": the file is empty",
    ]);
    assert_eq!(
        names(folder.path()),
        ["empty.tsv", "landmarks.csv", "places.csv"]
    );
}

#[test]
fn one_matrix_leaves_a_gap_to_fill() {
    let folder = small(&[("b.csv", "shrew.csv"), ("landmarks.csv", "marks.txt")]);
    let run = new(folder.path()).succeeded();
    assert!(
        run.stdout.contains("no second matrix found"),
        "{}",
        run.stdout
    );
    assert!(run.stdout.contains("To do before a run"));
    // The landmarks say that it is species b.
    let draft = drafted(folder.path());
    assert_eq!(draft.species.b.name, "Shrew");
    assert_eq!(file_name(draft.species.b.source()), "shrew.csv");
    inspect(folder.path()).refused(&["species-a.csv", "no such file"]);
    // Filled, it runs.
    fs::write(
        folder.path().join("species-a.csv"),
        Study::new().text("a.csv"),
    )
    .unwrap();
    inspect(folder.path()).succeeded();
}

#[test]
fn of_three_matrices_the_landmarks_choose() {
    let folder = small(&[
        ("a.csv", "zz vole.csv"),
        ("b.csv", "shrew-connectivity.csv"),
        ("landmarks.csv", "homologies.csv"),
    ]);
    let third = common::matrix(&["q", "r", "s", "t"], |i, j| (i + j).to_string());
    fs::write(folder.path().join("aaa.csv"), csv(&third)).unwrap();
    let run = new(folder.path()).succeeded();
    let draft = drafted(folder.path());
    assert_eq!(file_name(draft.species.a.source()), "zz vole.csv");
    assert_eq!(
        file_name(draft.species.b.source()),
        "shrew-connectivity.csv"
    );
    assert_eq!(draft.species.b.name, "Shrew");
    assert!(run
        .stdout
        .contains("not used   aaa.csv: two other matrices were taken"));
    inspect(folder.path()).succeeded();
}

#[test]
fn without_a_landmark_table_its_form_is_shown() {
    let folder = small(&[("a.csv", "vole.csv"), ("b.csv", "shrew.csv")]);
    let run = new(folder.path()).succeeded();
    assert!(run.stdout.contains("no table found"), "{}", run.stdout);
    assert!(read(&folder.path().join("study.toml")).contains("#   landmark,a,b,weight,block,basis"));
    assert_eq!(
        names(folder.path()),
        ["shrew.csv", "study.toml", "vole.csv"]
    );
    inspect(folder.path()).refused(&["landmarks.csv", "no such file"]);
}

#[test]
fn odd_names_are_spelled_as_toml_needs_them() {
    let odd = ["my \"vole\".csv", "shrew's 'own' #1\\2.csv"];
    let folder = small(&[
        ("a.csv", odd[0]),
        ("b.csv", odd[1]),
        ("landmarks.csv", "über = 1.csv"),
    ]);
    fs::write(folder.path().join("two\nlines.csv"), "x,y\n1,2\n").unwrap();
    fs::write(
        folder.path().join(".hidden.csv"),
        Study::new().text("a.csv"),
    )
    .unwrap();
    let run = new(folder.path()).succeeded();
    assert!(run.stdout.contains(r#""two\nlines.csv""#), "{}", run.stdout);
    let draft = drafted(folder.path());
    assert_eq!(file_name(draft.species.a.source()), odd[0]);
    assert_eq!(file_name(draft.species.b.source()), odd[1]);
    assert_eq!(file_name(&draft.landmarks), "über = 1.csv");
    inspect(folder.path()).succeeded();

    let spaced = tables_of("species-demo");
    let inner = spaced.path().join("with a blank");
    fs::create_dir(&inner).unwrap();
    fs::copy(spaced.path().join("a.csv"), inner.join("a.csv")).unwrap();
    let run = new(&inner).succeeded();
    let last = run.stdout.lines().last().unwrap().trim().to_owned();
    assert!(last.ends_with("/with a blank/study.toml'"), "{last}");
}

#[test]
fn a_matrix_with_a_fault_is_taken_and_the_fault_told() {
    let folder = small(&[("a.csv", "a.csv"), ("landmarks.csv", "landmarks.csv")]);
    let study = Study::with(|s| s.set("b.csv", 3, 2, "inf"));
    fs::write(folder.path().join("b.csv"), study.text("b.csv")).unwrap();
    let run = new(folder.path()).succeeded();
    assert!(
        run.stdout.contains("line 3, column 2 (Aud to Calc)"),
        "{}",
        run.stdout
    );
    inspect(folder.path()).refused(&["b.csv, line 3, column 2"]);
}

// ---------------------------------------------------------------------------------------------
// Every format
// ---------------------------------------------------------------------------------------------

/// A folder with files of tests/data/formats under other names, and three landmarks.
fn formats(files: &[(&str, &str)]) -> TempDir {
    let folder = tempfile::tempdir().unwrap();
    for (from, to) in files {
        let from = path("tests/data/formats").join(from);
        fs::copy(from, folder.path().join(to)).unwrap();
    }
    fs::write(
        folder.path().join("landmarks.csv"),
        "landmark,a,b\nsight,V1,V1\nhearing,A1,A1\nmovement,M1,M1\n",
    )
    .unwrap();
    folder
}

/// What was drafted runs as it stands.
fn runs(folder: &Path) {
    let mut command = program();
    command.arg("locate").arg(folder.join("study.toml"));
    command.arg("--out").arg(folder.join("run"));
    Run::of(command.args(["--replicates", "10", "--quiet"])).succeeded();
}

fn network(species: &SpeciesFile) -> Connectivity {
    let matrix = read_matrix_of(species, species.source()).unwrap_or_else(|e| panic!("{e}"));
    matrix.network
}

/// Files that carry their labels, and files that need the list beside them.
#[test]
fn every_format_that_locate_reads_is_drafted_and_runs_unedited() {
    let plain = SpeciesFile::new(
        "",
        &path("tests/data/formats/labelled.csv"),
        WeightKind::Other,
    );
    let expected = network(&plain);
    for (file, named, needs) in [
        ("labelled.csv", "vole.csv", false),
        ("labelled.tsv", "vole.tsv", false),
        ("labelled.csv.gz", "vole.csv.gz", false),
        ("header-only.csv", "vole.csv", false),
        ("column-only.csv", "vole.csv", false),
        ("sub-1_relmat.tsv", "vole_relmat.tsv", false),
        ("bare.csv", "vole.csv", true),
        ("bare.csv.gz", "vole.csv.gz", true),
        ("savetxt.txt", "vole.txt", true),
        ("f8.npy", "vole.npy", true),
        ("f4.npy", "vole", true),
        ("f8-big.npy", "vole.npy", true),
        ("f8-fortran.npy", "vole.npy", true),
        ("stored.npz", "vole.npz", false),
        ("deflated.npz", "vole.npz", false),
        ("bytes.npz", "vole.npz", false),
        ("plain.mat", "vole.mat", false),
        ("compressed.mat", "vole.mat", false),
        ("f8.pconn.nii", "vole.pconn.nii", false),
        ("f4.pconn.nii", "vole.nii", false),
        ("edges.csv", "vole.csv", true),
        ("edges.tsv", "vole_edges.tsv", true),
    ] {
        let mut files = vec![(file, named), ("labelled.csv", "shrew.csv")];
        if needs {
            files.push(("labels.txt", "vole-labels.txt"));
        }
        let folder = formats(&files);
        let run = new(folder.path()).succeeded();
        assert!(!run.stdout.contains("To do"), "{file}: {}", run.stdout);
        assert!(
            !read(&folder.path().join("study.toml")).contains("TO DO"),
            "{file}"
        );
        // Both have the same labels, so either may be species a.
        let draft = drafted(folder.path());
        let vole = match draft.species.a.name.as_str() {
            "Vole" => &draft.species.a,
            _ => &draft.species.b,
        };
        assert_eq!(vole.name, "Vole", "{file}");
        assert_eq!(file_name(vole.source()), named);
        let labels = vole.labels.as_deref().map(file_name);
        assert_eq!(labels, needs.then_some("vole-labels.txt"), "{file}");
        assert_eq!(
            (&vole.variable, &vole.label_variable),
            (&None, &None),
            "{file}"
        );
        assert_eq!(network(vole), expected, "{file}");
        runs(folder.path());
    }
}

#[test]
fn a_list_of_connections_needs_no_labels() {
    let folder = formats(&[("edges.csv", "vole.csv"), ("labelled.csv", "shrew.csv")]);
    let run = new(folder.path()).succeeded();
    assert!(!run.stdout.contains("To do"), "{}", run.stdout);
    let draft = drafted(folder.path());
    assert_eq!(
        (draft.species.a.labels, draft.species.b.labels),
        (None, None)
    );
    assert!(
        read(&folder.path().join("study.toml")).contains("A list of connections among 5 parcels")
    );
    runs(folder.path());
}

/// Several arrays: the likeliest names are taken, and the others named.
#[test]
fn of_several_arrays_one_is_picked_and_the_others_are_told() {
    let folder = formats(&[("several.npz", "vole.npz"), ("several.mat", "shrew.mat")]);
    let run = new(folder.path()).succeeded();
    for says in [
        "variable weights",
        "check variable of species a; lengths",
        "check label-variable",
    ] {
        assert!(run.stdout.contains(says), "{says}: {}", run.stdout);
    }
    let draft = drafted(folder.path());
    let mut of_file: Vec<(&str, Option<&str>, Option<&str>)> = [&draft.species.a, &draft.species.b]
        .map(|s| {
            (
                file_name(s.source()),
                s.variable.as_deref(),
                s.label_variable.as_deref(),
            )
        })
        .into();
    of_file.sort_unstable();
    assert_eq!(
        of_file,
        [
            ("shrew.mat", Some("weights"), None),
            ("vole.npz", Some("weights"), Some("labels"))
        ]
    );
    let text = read(&folder.path().join("study.toml"));
    assert!(
        text.contains("# TO DO: check; the file holds other square matrices as well: \"lengths\".")
    );
    assert!(text.contains(
        "# TO DO: check; the file holds other lists of as many texts as well: \"lobes\"."
    ));
    runs(folder.path());
}

#[test]
fn without_labels_it_is_said_what_to_write() {
    let folder = formats(&[("f8.npy", "vole.npy"), ("labelled.csv", "shrew.csv")]);
    fs::write(folder.path().join("few.txt"), "V1\nA1\nM1\nS1\n").unwrap();
    let run = new(folder.path()).succeeded();
    assert!(
        run.stdout.contains("write the 5 labels of species"),
        "{}",
        run.stdout
    );
    assert!(
        run.stdout
            .contains("not used   few.txt: 4 labels, one a line, but no matrix"),
        "{}",
        run.stdout
    );
    let draft = drafted(folder.path());
    let (vole, letter) = match draft.species.a.name.as_str() {
        "Vole" => (&draft.species.a, "a"),
        _ => (&draft.species.b, "b"),
    };
    let labels = vole.labels.clone().unwrap();
    assert_eq!(file_name(&labels), format!("species-{letter}-labels.txt"));
    assert!(read(&folder.path().join("study.toml"))
        .contains("# TO DO: it holds no labels. Write its 5 labels, one a line"));
    inspect(folder.path()).refused(&["labels.txt", "no such file"]);
    // Filled, it runs.
    fs::copy(path("tests/data/formats/labels.txt"), labels).unwrap();
    runs(folder.path());
}

/// Lists go to the matrices whose names they share; where names say nothing, the order decides and
/// that is told; two matrices of the same parcels may share one.
#[test]
fn labels_go_to_the_matrix_they_are_named_after() {
    let files = |folder: &TempDir| {
        let draft = drafted(folder.path());
        let mut pairs: Vec<(String, Option<String>)> = [&draft.species.a, &draft.species.b]
            .map(|s| {
                let labels = s.labels.as_deref().map(|l| file_name(l).to_owned());
                (file_name(s.source()).to_owned(), labels)
            })
            .into();
        pairs.sort();
        pairs
    };
    let pair = |matrix: &str, labels: &str| (matrix.to_owned(), Some(labels.to_owned()));
    let named = formats(&[
        ("f8.npy", "shrew.npy"),
        ("bare.csv", "vole.csv"),
        ("labels.txt", "a-vole.names.txt"),
        ("labels.txt", "labels_shrew.txt"),
    ]);
    let run = new(named.path()).succeeded();
    assert!(!run.stdout.contains("To do"), "{}", run.stdout);
    assert_eq!(
        files(&named),
        [
            pair("shrew.npy", "labels_shrew.txt"),
            pair("vole.csv", "a-vole.names.txt")
        ]
    );
    runs(named.path());

    let shared = formats(&[
        ("f8.npy", "one.npy"),
        ("bare.csv", "two.csv"),
        ("labels.txt", "atlas.txt"),
    ]);
    new(shared.path()).succeeded();
    assert_eq!(
        files(&shared),
        [pair("one.npy", "atlas.txt"), pair("two.csv", "atlas.txt")]
    );
    runs(shared.path());

    let open = formats(&[
        ("f8.npy", "one.npy"),
        ("bare.csv", "two.csv"),
        ("labels.txt", "first.txt"),
        ("labels.txt", "second.txt"),
    ]);
    let run = new(open.path()).succeeded();
    assert!(
        run.stdout.contains("second.txt would fit as well"),
        "{}",
        run.stdout
    );
    assert_eq!(
        files(&open),
        [pair("one.npy", "first.txt"), pair("two.csv", "second.txt")]
    );
    assert!(read(&open.path().join("study.toml"))
        .contains("# TO DO: check; these have as many labels: \"second.txt\"."));
}

/// What is no matrix is named with the reason, or passed over where it has nothing to do with any.
#[test]
fn other_files_are_told_or_passed_over() {
    let folder = formats(&[
        ("labelled.csv", "vole.csv"),
        ("f8.pconn.nii", "shrew.pconn.nii"),
        ("image1.nii", "scan.nii"),
        ("pscalar.nii", "scalars.nii"),
        ("nothing.zip", "archive.xlsx"),
        ("list.npy", "list.npy"),
        ("complex.npy", "phase.npy"),
        ("cube.npy", "cube.npy"),
    ]);
    fs::write(folder.path().join("README.md"), "V1\nA1\nM1\nS1\nS2\n").unwrap();
    fs::write(
        folder.path().join("lengths.txt"),
        "1.5\n2.5\n3.5\n4.5\n0.5\n",
    )
    .unwrap();
    fs::copy(
        path("species-demo/a.label.gii"),
        folder.path().join("a.label.gii"),
    )
    .unwrap();
    let mut hdf5 = vec![0; 512];
    hdf5.extend(b"\x89HDF\r\n\x1a\n");
    fs::write(folder.path().join("new.mat"), hdf5).unwrap();
    let whole = fs::read(path("tests/data/formats/labelled.csv.gz")).unwrap();
    fs::write(folder.path().join("cut.csv.gz"), &whole[..whole.len() - 12]).unwrap();
    let run = new(folder.path()).succeeded();
    let text = read(&folder.path().join("study.toml"));
    for says in [
        "\"scan.nii\": the file is a NIfTI-1 image",
        "\"scalars.nii\": expected a parcellated CIFTI-2 matrix",
        "\"archive.xlsx\": the file is a zip archive without NumPy arrays",
        "\"list.npy\": expected a matrix with rows and columns, found a list of 5",
        "\"phase.npy\": expected real numbers",
        "\"cube.npy\": expected a matrix",
        "\"new.mat\": the file is HDF5",
        "\"cut.csv.gz\": the file is damaged",
        "\"lengths.txt\": neither a table nor different labels",
    ] {
        assert!(text.contains(says), "{says}: {text}");
    }
    assert!(
        !text.contains("README") && !text.contains("label.gii"),
        "{text}"
    );
    assert!(run.stdout.contains("not used   1 more"), "{}", run.stdout);
    runs(folder.path());
}

/// A label with a comma does not make a table of the list.
#[test]
fn labels_may_hold_separators() {
    let folder = formats(&[("f8.npy", "vole.npy"), ("labelled.csv", "shrew.csv")]);
    let labels = read(&path("tests/data/formats/labels.txt"));
    let mut lines: Vec<&str> = labels.lines().collect();
    lines.rotate_right(1);
    assert!(lines[0].contains(','));
    fs::write(folder.path().join("vole.txt"), lines.join("\n")).unwrap();
    // A table with a row too short stays one.
    fs::write(
        folder.path().join("places.csv"),
        "V1,1,2\nA1,3\nM1,2,2\nS1,1,1\nS2,2,1\n",
    )
    .unwrap();
    let run = new(folder.path()).succeeded();
    assert!(run.stdout.contains("labels vole.txt"), "{}", run.stdout);
    assert!(
        run.stdout
            .contains("not used   places.csv: expected 3 cells"),
        "{}",
        run.stdout
    );
    runs(folder.path());
}

#[test]
fn a_damaged_matrix_of_connections_is_told() {
    let folder = formats(&[("edges.csv", "vole.csv"), ("labelled.csv", "shrew.csv")]);
    let list = folder.path().join("vole.csv");
    fs::write(&list, read(&list) + "V1,A1,x\n").unwrap();
    let run = new(folder.path()).succeeded();
    assert!(run.stdout.contains("To do before a run"), "{}", run.stdout);
    assert!(run.stdout.contains("vole.csv, line"), "{}", run.stdout);
}
