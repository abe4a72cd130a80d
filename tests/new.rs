//! `kinmark new`: the study file it drafts, its guesses, and what it leaves alone.

mod common;

use std::fs;
use std::path::{Path, PathBuf};

use common::{contents, csv, names, program, read, Run, Study};
use kinmark::input::{read_study_file, StudyFile};
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
            assert_eq!(file_name(&draft.matrix), file_name(&real.matrix));
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
    new(folder.path()).refused(&["found no matrix", "no table at all"]);
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
    assert_eq!(file_name(&draft.species.b.matrix), "shrew.csv");
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
    assert_eq!(file_name(&draft.species.a.matrix), "zz vole.csv");
    assert_eq!(file_name(&draft.species.b.matrix), "shrew-connectivity.csv");
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
    assert_eq!(file_name(&draft.species.a.matrix), odd[0]);
    assert_eq!(file_name(&draft.species.b.matrix), odd[1]);
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
