//! Named candidates checked, through the program: what is said, what is written, what is refused.

mod common;

use std::collections::BTreeMap;
use std::fs;
use std::path::{Path, PathBuf};

use common::{program, read, Run, Study};
use serde_json::Value;

fn check(asked: &Path, options: &[&str]) -> Run {
    let mut command = program();
    Run::of(command.arg("check").arg(asked).arg("--quiet").args(options))
}

fn demo(file: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("species-demo")
        .join(file)
}

fn rows(file: &Path) -> Vec<BTreeMap<String, String>> {
    let mut reader = csv::Reader::from_path(file).expect("the table is there");
    reader
        .deserialize()
        .map(|row| row.expect("rows have named cells"))
        .collect()
}

/// Few replicates, where only agreement is looked at.
const FEW: [&str; 4] = ["--replicates", "40", "--transport-replicates", "24"];

fn json(asked: &Path, options: &[&str]) -> Value {
    let shown = check(asked, &[options, &["--json"]].concat())
        .succeeded()
        .stdout;
    serde_json::from_str(&shown).expect("valid JSON")
}

/// The demo's five displaced parcels are named against where their names point; each truly lies
/// elsewhere (species-demo/displaced.csv). None may be called conserved, most are found displaced, and of
/// both candidates the true one is nearer.
#[test]
fn the_demo_s_displaced_parcels_are_not_called_conserved() {
    let displaced = rows(&demo("displaced.csv"));
    let folder = tempfile::tempdir().unwrap();
    let pairs = folder.path().join("pairs.csv");
    let mut table = String::from("a,b\n");
    for row in &displaced {
        for column in ["named_candidate", "true_counterpart"] {
            table += &format!("{},{}\n", row["a"], row[column]);
        }
    }
    fs::write(&pairs, table).unwrap();
    let options = ["--pairs", pairs.to_str().unwrap(), "--replicates", "200"];
    let found = json(&demo("study.toml"), &options);
    let checks = found["checks"].as_array().unwrap();
    assert_eq!(checks.len(), displaced.len());
    let mut said_displaced = 0;
    let mut right = 0;
    for (row, check) in displaced.iter().zip(checks) {
        let verdict = |b: &str| {
            let pairs = check["pairs"].as_array().unwrap();
            let pair = pairs.iter().find(|pair| pair["b"] == b).unwrap();
            pair["verdict"].as_str().unwrap().to_owned()
        };
        assert_ne!(verdict(&row["named_candidate"]), "conserved", "{row:?}");
        assert_ne!(verdict(&row["true_counterpart"]), "displaced", "{row:?}");
        said_displaced += usize::from(verdict(&row["named_candidate"]) == "displaced");
        right += usize::from(check["contrasts"][0]["nearer"] == row["true_counterpart"].as_str());
    }
    assert!(2 * said_displaced > displaced.len(), "{said_displaced}");
    assert!(right + 1 >= displaced.len(), "{right}");
}

/// With six blocks of landmarks no p reaches a tenth: the program says so and how many it takes.
#[test]
fn few_landmarks_cannot_show_conservation() {
    let study = Study::new();
    let options = [&FEW[..], &["--parcel", "temporal", "--against", "Temp"]].concat();
    let shown = check(&study.path("study.toml"), &options)
        .succeeded()
        .stdout;
    assert!(shown.contains("THESE DATA CANNOT SHOW IT"), "{shown}");
    assert!(shown.contains("6 landmark blocks allow no p of 10 %; at least 9 are needed"));
    assert!(shown.contains("Caution"), "{shown}");
    assert!(shown.contains("Methods."), "{shown}");
    assert!(!study.out().exists(), "nothing is written unless asked");
}

/// Without a candidate there is no verdict.
#[test]
fn a_parcel_alone_gets_no_verdict() {
    let study = Study::new();
    let options = [&FEW[..], &["--parcel", "temporal"]].concat();
    let shown = check(&study.path("study.toml"), &options)
        .succeeded()
        .stdout;
    assert!(shown.contains("No verdict"), "{shown}");
    let found = json(&study.path("study.toml"), &options);
    assert_eq!(found["checks"][0]["pairs"].as_array().unwrap().len(), 0);
    assert!(found["checks"][0]["chance"].is_number());
}

/// A question about a landmark's parcel is asked without that landmark's block, from either species.
#[test]
fn a_landmark_does_not_vouch_for_itself() {
    let study = Study::new();
    for (species, parcel, against) in [("a", "motor", "Mot"), ("b", "Mot", "motor")] {
        let asked = [
            "--species",
            species,
            "--parcel",
            parcel,
            "--against",
            against,
        ];
        let found = json(&study.path("study.toml"), &[&FEW[..], &asked].concat());
        let check = &found["checks"][0];
        assert_eq!(check["landmark-blocks"].as_array().unwrap().len(), 5);
        let left_out = check["left-out"][0].as_str().unwrap();
        assert!(!check["landmark-blocks"].to_string().contains(left_out));
        assert_eq!(check["pairs"][0]["a"], "motor");
        assert_eq!(check["pairs"][0]["b"], "Mot");
    }
}

/// Checks of a run add up in its folder; the same question again replaces its row only, and the number of
/// threads changes no byte.
#[test]
fn checks_of_a_run_add_up() {
    let study = Study::new();
    study.run(&FEW[2..]).succeeded();
    let ask = |parcel: &str, against: &str, threads: &str| {
        let options = [
            "--parcel",
            parcel,
            "--against",
            against,
            "--threads",
            threads,
        ];
        check(&study.out(), &options).succeeded();
        read(&study.out().join("checks.csv"))
    };
    ask("temporal", "Temp", "1");
    let both = ask("parietal", "Par,Cing", "1");
    let table = rows(&study.out().join("checks.csv"));
    let named: Vec<(&str, &str)> = table.iter().map(|r| (&*r["a"], &*r["b"])).collect();
    assert_eq!(
        named,
        [
            ("temporal", "Temp"),
            ("parietal", "Par"),
            ("parietal", "Cing")
        ]
    );
    assert_eq!(ask("parietal", "Par,Cing", "2"), both);
    let row = &table[0];
    for (column, top) in [("p_further", 1.0), ("p_nearer", 1.0), ("p_search", 1.0)] {
        let p: f64 = row[column].parse().unwrap();
        assert!(p > 0.0 && p <= top, "{column}");
    }
    assert_eq!(row["least_p"].parse::<f64>().unwrap(), 1.0 / 7.0);
    // The rest of the run stays, and is still one to which locate may add nothing without --replace.
    assert!(study.out().join("run.json").exists());
    assert_eq!(study.run(&FEW[2..]).code, Some(2));
}

/// A table that has gone through other hands is not overwritten.
#[test]
fn a_table_with_another_header_is_kept() {
    let study = Study::new();
    study.run(&FEW[2..]).succeeded();
    let table = study.out().join("checks.csv");
    fs::write(&table, "mine\nkeep this\n").unwrap();
    let found = check(&study.out(), &["--parcel", "temporal", "--against", "Temp"]);
    assert_eq!(found.code, Some(2));
    assert_eq!(fs::read_to_string(&table).unwrap(), "mine\nkeep this\n");
}

#[test]
fn what_cannot_be_asked_is_said() {
    let study = Study::new();
    let refused = |options: &[&str], expected: &[&str]| {
        let found = check(&study.path("study.toml"), &[&FEW[..], options].concat());
        assert_eq!(found.code, Some(2), "{options:?}");
        for words in expected {
            assert!(
                found.stderr.contains(words),
                "{words:?} in {}",
                found.stderr
            );
        }
    };
    refused(
        &["--parcel", "tempural", "--against", "Temp"],
        &["\"tempural\" is no parcel of", "did you mean \"temporal\"?"],
    );
    refused(
        &["--parcel", "Temp"],
        &["the other species has one: say --species"],
    );
    refused(
        &["--parcel", "temporal", "--species", "c"],
        &["--species must be"],
    );
    refused(
        &["--parcel", "temporal", "--against", "temporal"],
        &["is no parcel of"],
    );
    let folder = tempfile::tempdir().unwrap();
    let pairs = folder.path().join("pairs.csv");
    let file = pairs.to_str().unwrap();
    for (text, expected) in [
        ("a,c\ntemporal,Temp\n", "lacks the column \"b\""),
        ("a,b\n", "expected rows of a parcel of a and a parcel of b"),
        ("a,b\ntemporal,\n", "expected a parcel, found an empty cell"),
        (
            "a,b\ntemporal,Temp\nparietal,Parr\n",
            "pairs.csv:3: \"Parr\" is no parcel of",
        ),
    ] {
        fs::write(&pairs, text).unwrap();
        refused(&["--pairs", file], &[expected, "pairs.csv"]);
    }
    // A run whose inputs have changed is not asked.
    study.run(&FEW[2..]).succeeded();
    let matrix = study.path("a.csv");
    let text = fs::read_to_string(&matrix).unwrap();
    fs::write(&matrix, text.replacen('1', "2", 1)).unwrap();
    let found = check(&study.out(), &["--parcel", "temporal", "--against", "Temp"]);
    assert_eq!(found.code, Some(2));
    assert!(
        found.stderr.contains("has changed since the run"),
        "{}",
        found.stderr
    );
}
