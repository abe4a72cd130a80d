//! Landmarks held out and parcels ranked, through the program: what is shown, what is written, what is
//! refused, and that figures agree with those of `locate`.

mod common;

use std::collections::BTreeMap;
use std::path::Path;

use common::{contents, names, program, read, record, Run, Study};

/// Few replicates and permutations, where only agreement is looked at.
const FEW: [&str; 5] = [
    "--replicates",
    "20",
    "--transport-replicates",
    "24",
    "--quiet",
];

fn holdout(asked: &Path, options: &[&str]) -> Run {
    let mut command = program();
    command
        .arg("holdout")
        .arg(asked)
        .args(["--permutations", "19", "--quiet"]);
    Run::of(command.args(options))
}

fn rank(asked: &Path, options: &[&str]) -> Run {
    let mut command = program();
    Run::of(command.arg("rank").arg(asked).arg("--quiet").args(options))
}

/// A table as rows of named cells.
fn rows(file: &Path) -> Vec<BTreeMap<String, String>> {
    let mut reader = csv::Reader::from_path(file).expect("the table is there");
    reader
        .deserialize()
        .map(|row| row.expect("rows have named cells"))
        .collect()
}

/// A study whose run stands in its folder for results.
fn located(options: &[&str]) -> Study {
    let study = Study::new();
    let options = [&FEW[2..4], options].concat();
    study.run(&options).succeeded();
    study
}

/// Left-out ranks of `locate` and of `holdout` are one and the same figures, and the summary is that
/// of the table.
#[test]
fn each_landmark_comes_where_locate_says() {
    let study = located(&[]);
    let shown = holdout(&study.out(), &[]).succeeded().stdout;
    let (left_out, held_out) = (
        rows(&study.out().join("landmarks.csv")),
        rows(&study.out().join("holdout.csv")),
    );
    assert_eq!(left_out.len(), held_out.len());
    for (left_out, held_out) in left_out.iter().zip(&held_out) {
        for column in [
            "landmark",
            "block",
            "asked_a",
            "rank_from_a",
            "candidates_from_a",
            "percentile_from_a",
            "rank_from_b",
            "candidates_from_b",
            "percentile_from_b",
            "distance",
            "axes",
            "contradicted",
        ] {
            assert_eq!(left_out[column], held_out[column], "{column}");
        }
    }
    let mean: f64 = held_out
        .iter()
        .map(|row| 1.0 / row["rank_from_a"].parse::<f64>().unwrap())
        .sum::<f64>()
        / held_out.len() as f64;
    let line = shown
        .lines()
        .find(|l| l.starts_with("mean reciprocal"))
        .unwrap();
    assert!(line.contains(&format!("{mean:.2}")), "{line}: {mean}");
    for says in ["chance", "fingerprint", "permutations)", "not a target"] {
        assert!(shown.contains(says), "{says}: {shown}");
    }
}

/// Holding landmarks out by name is a rerun without them: the rank of one counterpart is that which
/// `locate` gives it when its row is taken from the landmark table.
#[test]
fn a_named_landmark_is_ranked_as_if_it_had_never_been_told() {
    let study = Study::new();
    let out = study.path("held");
    let table = rows(&study.path("landmarks.csv"));
    let (gone, name) = (&table[2], table[2]["landmark"].clone());
    let options = [
        &FEW[..4],
        &["--leave", &name, "--out", out.to_str().unwrap()],
    ]
    .concat();
    holdout(&study.path("study.toml"), &options).succeeded();
    let held = rows(&out.join("holdout.csv"));
    assert_eq!(held.len(), 1);
    assert_eq!(record(&out)["asked"]["command"], "holdout");
    assert_eq!(names(&out), ["holdout.csv", "influence.csv", "run.json"]);

    let (a, b) = (gone["a"].clone(), gone["b"].clone());
    study.edit_table("landmarks.csv", |rows| rows.retain(|row| row[0] != name));
    let without = study.tables(&[&FEW[2..4], &["--top", "all"]].concat());
    for (side, parcel, counterpart) in [("a", &a, &b), ("b", &b, &a)] {
        let counterparts = without.rows("counterparts.csv");
        let found = counterparts
            .iter()
            .find(|row| row["parcel"] == **parcel && row["counterpart"] == **counterpart)
            .unwrap();
        assert_eq!(
            found["rank"],
            held[0][&format!("rank_from_{side}")],
            "from {side}"
        );
    }
}

/// Everyone else is in the table of influence once for each set, and someone moves.
#[test]
fn influence_names_everyone_else() {
    let study = located(&[]);
    holdout(&study.out(), &[]).succeeded();
    let influence = rows(&study.out().join("influence.csv"));
    let positions = rows(&study.out().join("positions.csv"));
    let blocks: std::collections::BTreeSet<_> = influence.iter().map(|r| &r["held_out"]).collect();
    for block in &blocks {
        let own = influence.iter().filter(|r| r["held_out"] == **block);
        let others = positions.iter().filter(|r| r["landmark"] != **block);
        assert_eq!(own.clone().count(), others.count(), "{block}");
        assert!(own.clone().all(|r| r["landmark"] != **block));
        let moved: f64 = own.map(|r| r["moved"].parse::<f64>().unwrap()).sum();
        assert!(moved > 0.0, "{block}");
    }
    for row in &influence {
        let is_open = row["landmark"].is_empty();
        assert_eq!(is_open, !row["first_with"].is_empty());
        if is_open {
            let stays = row["first_with"] == row["first_without"];
            assert_eq!(stays, row["rank_without"] == "1", "{row:?}");
        }
    }
}

/// Sets of two of six blocks: all fifteen where the budget allows, else as many as it says.
#[test]
fn subsets_keep_to_their_budget() {
    let study = Study::new();
    let out = study.path("held");
    for (budget, sets) in [("15", 15), ("4", 4)] {
        let options = [
            "--evidence",
            "fingerprint",
            "--subsets",
            "2",
            "--budget",
            budget,
            "--replace",
            "--out",
            out.to_str().unwrap(),
        ];
        let shown = holdout(&study.path("study.toml"), &options).succeeded();
        let held = rows(&out.join("holdout.csv"));
        let found: std::collections::BTreeSet<_> = held.iter().map(|r| &r["held_out"]).collect();
        assert_eq!(
            (found.len(), held.len()),
            (sets, 2 * sets),
            "{}",
            shown.stdout
        );
    }
}

/// A run answers only for the inputs and settings it had, and a refusal leaves it as it was.
#[test]
fn a_run_is_asked_only_about_what_it_was() {
    let study = located(&["--seed", "5"]);
    let before = contents(&study.out());
    holdout(&study.out(), &["--seed", "6"]).refused(&["seed", "5", "6", "study file"]);
    rank(&study.out(), &["--level", "0.8"]).refused(&["level"]);
    study.set("a.csv", 2, 3, "17");
    holdout(&study.out(), &[]).refused(&["a.csv", "changed", "SHA-256"]);
    rank(&study.out(), &[]).refused(&["a.csv", "changed"]);
    assert_eq!(contents(&study.out()), before);
    holdout(&study.path("nowhere"), &[]).refused(&["nowhere"]);
    holdout(study.out().parent().unwrap(), &[]).refused(&["finished run", "run.json"]);
}

#[test]
fn what_cannot_be_held_out_is_refused() {
    let study = Study::new();
    let file = study.path("study.toml");
    let name = rows(&study.path("landmarks.csv"))[0]["landmark"].clone();
    let near = format!("{name}x");
    holdout(&file, &["--leave", &near]).refused(&[&near, &name, "neither"]);
    holdout(&file, &["--leave", " , "]).refused(&["--leave", "at least one"]);
    holdout(&file, &["--subsets", "4"]).refused(&["4 of 6", "3 are needed"]);
    holdout(&file, &["--subsets", "0"]).refused(&["at least 1"]);
    holdout(&file, &["--axes", "3", "--subsets", "3"]).refused(&["3 axes"]);
    holdout(&file, &["--leave-file", "nowhere.txt"]).refused(&["nowhere.txt"]);
}

/// Without a place for tables nothing is written; a table that differs is kept.
#[test]
fn nothing_is_written_unasked_or_over_another_table() {
    let study = Study::new();
    let before = contents(&study.path("."));
    holdout(&study.path("study.toml"), &["--evidence", "canonical"]).succeeded();
    rank(&study.path("study.toml"), &["--evidence", "canonical"]).succeeded();
    assert_eq!(contents(&study.path(".")), before);

    study.run(&["--evidence", "canonical"]).succeeded();
    holdout(&study.out(), &[]).succeeded();
    let first = contents(&study.out());
    holdout(&study.out(), &[]).succeeded();
    assert_eq!(
        contents(&study.out()),
        first,
        "the same question changes nothing"
    );
    let name = rows(&study.path("landmarks.csv"))[0]["landmark"].clone();
    let other = holdout(&study.out(), &["--leave", &name]);
    assert_eq!(other.code, Some(2), "{}", other.stderr);
    assert!(other.stderr.contains("--replace"), "{}", other.stderr);
    assert_eq!(contents(&study.out()), first);
    holdout(&study.out(), &["--leave", &name, "--replace"]).succeeded();
    assert_eq!(rows(&study.out().join("holdout.csv")).len(), 1);
    // A run with answers in it is still a run, which a new one replaces as a whole.
    study
        .run(&["--evidence", "canonical", "--replace"])
        .succeeded();
    assert_eq!(names(&study.out()), common::RUN);
}

/// The number of threads changes no byte of an answer.
#[test]
fn threads_change_nothing() {
    let study = Study::new();
    let (one, four) = (study.path("one"), study.path("four"));
    for (out, threads) in [(&one, "1"), (&four, "4")] {
        let out = out.to_str().unwrap();
        let options = [&FEW[..4], &["--threads", threads, "--out", out]].concat();
        holdout(&study.path("study.toml"), &options).succeeded();
    }
    for table in ["holdout.csv", "influence.csv"] {
        assert_eq!(read(&one.join(table)), read(&four.join(table)));
    }
    let permuted = |out: &Path| record(out)["asked"]["permuted"].clone();
    assert_eq!(permuted(&one), permuted(&four));
}

/// `rank` shows the candidate sets of `counterparts.csv`, best first, and sets grow with their level.
#[test]
fn sets_are_those_of_the_counterparts_and_grow_with_the_level() {
    let study = Study::demo();
    let settings = [&FEW[..4], &["--top", "all"]].concat();
    let mut before: Option<BTreeMap<(String, String), bool>> = None;
    for level in ["0.7", "0.9"] {
        let out = study.path(level);
        let options = [&settings[2..], &["--level", level]].concat();
        study.run_into(&out, &options).succeeded();
        let held: BTreeMap<(String, String), bool> = rows(&out.join("counterparts.csv"))
            .into_iter()
            .map(|row| {
                let is_in = row["in_candidate_set"] == "true";
                (
                    (
                        row["from"].clone() + &row["parcel"],
                        row["counterpart"].clone(),
                    ),
                    is_in,
                )
            })
            .collect();
        if let Some(smaller) = &before {
            assert!(smaller.iter().all(|(pair, is_in)| !is_in || held[pair]));
            let count = |sets: &BTreeMap<_, bool>| sets.values().filter(|x| **x).count();
            assert!(count(smaller) < count(&held));
        }
        let ranked = study.path(&format!("rank-{level}"));
        rank(&out, &["--out", ranked.to_str().unwrap()]).succeeded();
        let ranked = rows(&ranked.join("rank.csv"));
        assert_eq!(ranked.len(), (90 - 14) + (118 - 15));
        let mut last = (String::new(), f64::INFINITY);
        for row in &ranked {
            let of = row["from"].clone() + &row["parcel"];
            let set: Vec<&str> = row["candidate_set"].split(';').collect();
            assert_eq!(row["set_size"], set.len().to_string());
            assert_eq!(set[0], row["counterpart"]);
            let listed = held.iter().filter(|((p, _), is_in)| *p == of && **is_in);
            assert_eq!(listed.count(), set.len());
            assert!(set.iter().all(|c| held[&(of.clone(), (*c).to_owned())]));
            let chance: f64 = row["chance"].parse().unwrap();
            assert!(row["from"] != last.0 || chance <= last.1);
            last = (row["from"].clone(), chance);
            let (p, q): (f64, f64) = (row["p"].parse().unwrap(), row["q"].parse().unwrap());
            assert!(0.0 < p && p <= q && q <= 1.0);
        }
        before = Some(held);
    }
}

/// Five blocks allow five of six at most: the level is lowered, and the program says so.
#[test]
fn too_few_landmarks_lower_the_level_and_are_told() {
    let study = Study::new();
    let shown = rank(&study.path("study.toml"), &["--evidence", "canonical"]).succeeded();
    assert!(shown.stdout.contains("86 % of parcels"), "{}", shown.stdout);
    assert!(
        shown.stdout.contains("6 landmark blocks allow no more"),
        "{}",
        shown.stdout
    );
    assert!(
        shown.stdout.contains("90 % was asked for and takes 9"),
        "{}",
        shown.stdout
    );
    let run = located(&["--evidence", "canonical"]);
    let sets = record(&run.out())["candidate-sets"].clone();
    assert_eq!(
        (sets["asked"].as_f64(), sets["blocks"].as_u64()),
        (Some(0.9), Some(6))
    );
    assert!((sets["used"].as_f64().unwrap() - 6.0 / 7.0).abs() < 1e-12);
}
