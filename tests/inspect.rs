//! `kinmark inspect`: what it says of a study, held against counts made here from the files.

mod common;

use std::collections::{BTreeMap, BTreeSet};
use std::path::{Path, PathBuf};

use common::{csv, matrix, program, read, Run, Study, PARCELS_A};
use serde_json::Value;

fn path(file: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join(file)
}

fn inspect(study: &Path, options: &[&str]) -> Run {
    Run::of(program().arg("inspect").arg(study).args(options))
}

/// The text for people; nothing may go to standard error.
fn text(study: &Path) -> String {
    let run = inspect(study, &[]).succeeded();
    assert_eq!(run.stderr, "");
    run.stdout
}

fn json(study: &Path) -> Value {
    let run = inspect(study, &["--json"]).succeeded();
    assert_eq!(run.stderr, "");
    serde_json::from_str(&run.stdout).expect("it is JSON")
}

fn strings(list: &Value) -> Vec<String> {
    let list = list.as_array().expect("a list");
    let text = |v: &Value| v.as_str().expect("text").to_owned();
    list.iter().map(text).collect()
}

fn mentions(list: &Value, words: &str) -> bool {
    strings(list).iter().any(|said| said.contains(words))
}

/// A matrix file as labels and weights, read here without the library.
fn load(file: &Path) -> (Vec<String>, Vec<Vec<f64>>) {
    let text = read(file);
    let mut lines = text.lines();
    let header: Vec<&str> = lines.next().unwrap().split(',').collect();
    let labels = header[1..].iter().map(|l| (*l).to_owned()).collect();
    let rows = lines
        .map(|line| {
            let cells = line.split(',').skip(1);
            cells.map(|cell| cell.parse().unwrap()).collect()
        })
        .collect();
    (labels, rows)
}

/// Counts of a matrix file against what is said of it.
fn agrees_with_the_file(file: &Path, said: &Value) {
    let (labels, w) = load(file);
    let n = labels.len();
    let pairs = || {
        (0..n)
            .flat_map(|i| (0..n).map(move |j| (i, j)))
            .filter(|(i, j)| i != j)
    };
    let alone: Vec<String> = (0..n)
        .filter(|&i| (0..n).all(|j| i == j || (w[i][j] == 0.0 && w[j][i] == 0.0)))
        .map(|i| labels[i].clone())
        .collect();
    assert_eq!(strings(&said["set-aside"]), alone);
    let kept = n - alone.len();
    assert_eq!(said["parcels"], kept);

    let links = pairs().filter(|&(i, j)| w[i][j] != 0.0).count();
    assert_eq!(said["connections"], links);
    let density = links as f64 / (kept * (kept - 1)) as f64;
    assert!((said["density"].as_f64().unwrap() - density).abs() < 1e-12);
    let directed = pairs().any(|(i, j)| w[i][j] != w[j][i]);
    assert_eq!(said["directed"], directed);

    let values: Vec<f64> = pairs().map(|(i, j)| w[i][j]).collect();
    let largest = values.iter().copied().fold(f64::MIN, f64::max);
    let smallest = values.iter().copied().fold(f64::MAX, f64::min);
    let positive = values.iter().copied().filter(|w| *w > 0.0);
    let least = positive.fold(f64::MAX, f64::min);
    assert_eq!(said["largest"], largest);
    assert_eq!(said["smallest"], smallest);
    assert_eq!(said["least-positive"], least);
    let span = (largest / least).log10();
    assert!((said["span"].as_f64().unwrap() - span).abs() < 1e-12);

    // The strongest parcel and its partners.
    let strength = |i: usize| -> f64 {
        let both = (0..n)
            .filter(|&j| j != i)
            .map(|j| w[i][j].abs() + w[j][i].abs());
        both.sum::<f64>() / if directed { 1.0 } else { 2.0 }
    };
    let hub = (0..n)
        .max_by(|&i, &j| strength(i).total_cmp(&strength(j)))
        .unwrap();
    let partners = (0..n)
        .filter(|&j| j != hub && (w[hub][j] != 0.0 || w[j][hub] != 0.0))
        .count();
    let first = &said["hubs"][0];
    assert_eq!(first["parcel"], labels[hub].as_str());
    assert_eq!(first["partners"], partners);
    assert!((first["strength"].as_f64().unwrap() - strength(hub)).abs() < 1e-6);
}

#[test]
fn facts_agree_with_counts_of_the_files() {
    for (study, transform) in [
        ("species-demo", ["log-floor", "log-floor"]),
        ("tests/data/worm-stages", ["log1p", "log1p"]),
        ("tests/data/left-right-rest", ["fisher-z", "fisher-z"]),
    ] {
        let said = json(&path(study).join("study.toml"));
        for (side, transform) in ["a", "b"].into_iter().zip(transform) {
            let species = &said["species"][side];
            agrees_with_the_file(&path(study).join(format!("{side}.csv")), species);
            assert_eq!(species["transform"], transform, "{study} {side}");
            assert_eq!(species["parts"], 1);
        }
        assert!(said["caution"].as_str().unwrap().starts_with("Caution"));
        assert_eq!(said["warnings"], Value::Array(vec![]), "{study}");
    }
}

#[test]
fn landmarks_of_the_demo_are_counted() {
    let said = json(&path("species-demo/study.toml"));
    let table = read(&path("species-demo/landmarks.csv"));
    let rows: Vec<Vec<&str>> = table
        .lines()
        .skip(1)
        .map(|l| l.split(',').collect())
        .collect();
    let facts = &said["landmarks"];
    assert_eq!(facts["count"], rows.len());
    let named: BTreeSet<&str> = rows
        .iter()
        .map(|r| r[4])
        .filter(|b| !b.is_empty())
        .collect();
    let alone = rows.iter().filter(|r| r[4].is_empty()).count();
    assert_eq!(facts["blocks"], named.len() + alone);
    assert_eq!(facts["shared-blocks"][0][0], "body map");
    assert_eq!(strings(&facts["groups"]), ["smell field"]);
    assert_eq!(facts["weighted"][0][0], "body state field");
    assert_eq!(facts["weighted"][0][1], 0.5);
    let mut bases: BTreeMap<&str, usize> = BTreeMap::new();
    for row in &rows {
        *bases.entry(row[5]).or_default() += 1;
    }
    for basis in facts["bases"].as_array().unwrap() {
        assert_eq!(basis["landmarks"], bases[basis["basis"].as_str().unwrap()]);
    }
    // Blocks less 3, at most 12.
    assert_eq!(said["axes"]["fewest"], 2);
    assert_eq!(said["axes"]["most"], 10);
}

/// Every parcel is in one system; the parcels that have none of the shared patterns are among those
/// least like a landmark.
#[test]
fn systems_share_out_the_parcels_and_outsiders_stand_out() {
    let said = json(&path("species-demo/study.toml"));
    for side in ["a", "b"] {
        let coverage = &said["species"][side]["coverage"];
        let mut members: Vec<String> = Vec::new();
        for system in coverage["systems"].as_array().unwrap() {
            members.extend(strings(&system["parcels"]));
        }
        members.sort();
        let (mut labels, _) = load(&path("species-demo").join(format!("{side}.csv")));
        labels.sort();
        assert_eq!(members, labels);
    }
    let strange = read(&path("species-demo/no_counterpart.csv"));
    let least = said["species"]["a"]["coverage"]["least-covered"]
        .as_array()
        .unwrap();
    let found = least
        .iter()
        .filter(|far| strange.contains(&format!("a,{}\n", far["parcel"].as_str().unwrap())))
        .count();
    assert!(found >= 2, "{found}");
}

#[test]
fn text_is_short_begins_with_the_verdict_and_ends_with_the_caution() {
    for study in [
        "species-demo",
        "tests/data/worm-stages",
        "tests/data/left-right-rest",
    ] {
        let said = text(&path(study).join("study.toml"));
        let lines: Vec<&str> = said.lines().collect();
        assert!(lines[1].starts_with("Can be run"), "{said}");
        assert!(lines.len() <= 75, "{} lines", lines.len());
        assert!(lines.iter().all(|l| l.chars().count() <= 130), "{said}");
        assert!(said.trim_end().ends_with(kinmark::report::CAUTION));
    }
}

/// The valid study with the matrix of a changed.
fn with_a(change: impl FnOnce(&mut Vec<Vec<f64>>)) -> Study {
    let study = Study::new();
    let (_, mut weights) = load(&study.path("a.csv"));
    change(&mut weights);
    study.write(
        "a.csv",
        csv(&matrix(&PARCELS_A, |i, j| weights[i][j].to_string())),
    );
    study
}

#[test]
fn rows_that_sum_to_one_are_seen_and_questioned() {
    let to_one = |weights: &mut Vec<Vec<f64>>| {
        for (i, row) in weights.iter_mut().enumerate() {
            row[i] = 0.0;
            let sum: f64 = row.iter().sum();
            row.iter_mut().for_each(|w| *w /= sum);
        }
    };
    let study = with_a(to_one);
    study.swap("study.toml", "\"counts\"", "\"fractions\"");
    let said = json(&study.path("study.toml"));
    assert_eq!(said["species"]["a"]["sums-to-one"], "rows");
    assert_eq!(said["species"]["b"]["sums-to-one"], "neither");
    assert!(mentions(&said["suggestions"], "transpose the table"));
    assert!(text(&study.path("study.toml")).contains("each row (shares of a source)"));

    let turned = with_a(|weights| {
        to_one(weights);
        let before = weights.clone();
        for (i, row) in weights.iter_mut().enumerate() {
            for (j, w) in row.iter_mut().enumerate() {
                *w = before[j][i];
            }
        }
    });
    turned.swap("study.toml", "\"counts\"", "\"fractions\"");
    let said = json(&turned.path("study.toml"));
    assert_eq!(said["species"]["a"]["sums-to-one"], "columns");
    assert!(!mentions(&said["suggestions"], "transpose"));
}

#[test]
fn a_network_that_falls_apart_is_described() {
    // The last three parcels are no landmarks and stand apart.
    let study = with_a(|weights| {
        for i in 0..10 {
            for j in 0..10 {
                if (i < 7) != (j < 7) {
                    weights[i][j] = 0.0;
                }
            }
        }
    });
    let said = json(&study.path("study.toml"));
    let a = &said["species"]["a"];
    assert_eq!(a["parts"], 2);
    let mut outside = strings(&a["outside-largest-part"]);
    outside.sort();
    assert_eq!(outside, ["cingulate", "parietal", "somatic"]);
    assert_eq!(a["affinity-parts"], 2);
    assert!(mentions(&said["warnings"], "falls into 2 parts"));
    assert!(mentions(
        &said["suggestions"],
        "parts of the network without a landmark"
    ));
    assert!(mentions(
        &said["suggestions"],
        "no landmark in the system of 3 parcels"
    ));
    assert!(mentions(
        &said["suggestions"],
        "no likeness to any landmark"
    ));
    let shown = text(&study.path("study.toml"));
    assert!(shown.contains("2; 3 parcels outside"), "{shown}");
}

#[test]
fn isolated_parcels_and_half_a_matrix_are_named() {
    let study = with_a(|weights| {
        for i in 0..10 {
            weights[8][i] = 0.0;
            for j in 0..=i {
                weights[i][j] = 0.0;
            }
        }
        for row in weights.iter_mut() {
            row[8] = 0.0;
        }
    });
    let said = json(&study.path("study.toml"));
    assert_eq!(strings(&said["species"]["a"]["set-aside"]), ["cingulate"]);
    assert_eq!(said["species"]["a"]["filled"], "above");
    assert!(mentions(&said["suggestions"], "fill in the half below"));
    assert!(text(&study.path("study.toml")).contains("set aside, no links: cingulate"));
}

#[test]
fn settings_worth_a_thought_are_suggested() {
    // Whole numbers called other; a full matrix; a table without basis; two sides not in a block.
    let study = Study::new();
    study.swap("study.toml", "\"counts\"", "\"other\"");
    study.set("landmarks.csv", 2, 1, "paw left");
    study.set("landmarks.csv", 3, 1, "paw right");
    study.edit_table("landmarks.csv", |rows| {
        rows[1][1] = "calcarine;insula".to_owned();
        rows.remove(6);
        rows.remove(5);
        rows[2][2] = "Aud;Ins".to_owned();
        rows[4][1] = "orbital".to_owned();
        rows[4][2] = "Orb".to_owned();
    });
    let said = json(&study.path("study.toml"));
    for words in [
        "weights = \"counts\"",
        "strongest = 0.2",
        "column basis",
        "4 blocks are few",
    ] {
        assert!(mentions(&said["suggestions"], words), "{words}: {said:#}");
    }
    let wide = with_a(|weights| weights[0][1] = 9e6);
    wide.edit("study.toml", |text| {
        text.replace("\"counts\"", "\"counts\"\ntransform = \"log1p\"")
    });
    let said = json(&wide.path("study.toml"));
    assert_eq!(said["species"]["a"]["transform-because"], "asked");
    assert!(mentions(&said["suggestions"], "log-floor"));
}

#[test]
fn left_and_right_without_a_block_are_suggested_one() {
    let study = Study::new();
    let sides = |from: &str, to: &str, name: &str| study.edit(name, |t| t.replace(from, to));
    for name in ["a.csv", "landmarks.csv"] {
        sides("calcarine", "paw-L", name);
        sides("auditory", "paw-R", name);
    }
    for name in ["b.csv", "landmarks.csv"] {
        sides("Calc", "Paw-L", name);
        sides("Aud", "Paw-R", name);
    }
    let said = json(&study.path("study.toml"));
    assert!(mentions(&said["warnings"], "two sides of one area"));
    assert!(mentions(
        &said["suggestions"],
        "1 pair looks like left and right"
    ));
}

/// Exit code 0 exactly where `locate` would run, else its very message.
#[test]
fn refusals_are_those_of_locate() {
    type Spoil = fn(&Study);
    let spoilt: [(Spoil, &[&str]); 7] = [
        (|s| s.remove("study.toml"), &[]),
        (|s| s.remove("b.csv"), &[]),
        (|s| s.set("a.csv", 3, 2, "-4"), &[]),
        (|s| s.set("b.csv", 3, 2, "inf"), &[]),
        (|s| s.set("landmarks.csv", 2, 2, "calcarin"), &[]),
        (|s| s.setting("replicates = 1"), &[]),
        (|_| (), &["--axes", "6"]),
    ];
    for (spoil, options) in spoilt {
        let study = Study::with(spoil);
        let here = inspect(&study.path("study.toml"), options).refused(&[]);
        let there = study.run(options).refused(&[]);
        assert_eq!(here.stderr, there.stderr);
        let as_json: Vec<&str> = options.iter().copied().chain(["--json"]).collect();
        assert_eq!(
            inspect(&study.path("study.toml"), &as_json)
                .refused(&[])
                .stderr,
            there.stderr
        );
    }
    let study = Study::new();
    inspect(&study.path("study.toml"), &["--axes", "4"]).succeeded();
    study.run(&["--axes", "4"]).succeeded();
}

/// Nothing is written anywhere.
#[test]
fn inspecting_writes_nothing() {
    let study = Study::new();
    let before = common::contents(study.path("").as_path());
    text(&study.path("study.toml"));
    json(&study.path("study.toml"));
    assert_eq!(common::contents(study.path("").as_path()), before);
}
