//! What must not change the tables, what must, and how the lists of counterparts hang together.

mod common;

use std::collections::{BTreeMap, BTreeSet};

use common::{record, Run, Study, Tables, PARCELS_A, PARCELS_B};

/// How far numbers may lie apart that differ by rounding only.
const TOLERANCE: f64 = 1e-9;

#[test]
fn the_number_of_threads_changes_no_byte() {
    for (study, replicates) in [(Study::new(), "300"), (Study::demo(), "100")] {
        let [one, two] = ["1", "2"].map(|threads| {
            let out = study.path(threads);
            let options = ["--replicates", replicates, "--threads", threads, "--quiet"];
            Run::of(&mut study.command(&out, &options)).succeeded();
            assert_eq!(record(&out)["threads"].to_string(), threads);
            Tables::of(&out)
        });
        assert!(one == two);
    }
}

#[test]
fn the_seed_decides() {
    let study = Study::new();
    let first = study.tables(&["--seed", "5"]);
    assert!(first == study.tables(&["--seed", "5"]));
    let other = study.tables(&["--seed", "6"]);
    assert_ne!(
        first.text("counterparts.csv"),
        other.text("counterparts.csv")
    );
    assert_ne!(first.text("positions.csv"), other.text("positions.csv"));
}

#[test]
fn quiet_keeps_words_from_standard_error_only() {
    let study = Study::new();
    let mut runs = Vec::new();
    for options in [
        &["--replicates", "20"][..],
        &["--replicates", "20", "--quiet"],
    ] {
        let out = study.path(&format!("out{}", options.len()));
        let run = Run::of(&mut study.command(&out, options)).succeeded();
        runs.push((run, Tables::of(&out)));
    }
    let [(loud, loud_tables), (quiet, quiet_tables)] = &runs[..] else {
        unreachable!("two runs were made");
    };
    assert!(loud.stderr.contains("Tables and run record"));
    assert_eq!(quiet.stderr, "");
    assert_eq!(loud.stdout, quiet.stdout);
    assert!(loud_tables == quiet_tables);
    study.setting("quiet = true");
    let out = study.path("quiet in the file");
    let run = Run::of(&mut study.command(&out, &["--replicates", "20"])).succeeded();
    assert_eq!((run.stderr.as_str(), &run.stdout), ("", &quiet.stdout));
    assert!(Tables::of(&out) == *quiet_tables);
}

/// Rows by the parcels they are about: everything else in them.
fn by_pair(tables: &Tables) -> BTreeMap<[String; 4], BTreeMap<String, String>> {
    let rows = tables.rows("counterparts.csv");
    let count = rows.len();
    let by_pair: BTreeMap<_, _> = rows
        .into_iter()
        .map(|mut row| {
            let key = ["from", "parcel", "to", "counterpart"]
                .map(|column| row.remove(column).expect("the table has the column"));
            (key, row)
        })
        .collect();
    assert_eq!(by_pair.len(), count, "a pair is listed twice");
    by_pair
}

/// Asserts that two lists of counterparts are the same but for rounding and the order of rows.
fn assert_same_counterparts(found: &Tables, expected: &Tables, what: &str) {
    let (found, expected) = (by_pair(found), by_pair(expected));
    assert!(found.keys().eq(expected.keys()), "{what}: other pairs");
    for (pair, row) in &found {
        for (column, cell) in row {
            let other = &expected[pair][column];
            let same = match column.as_str() {
                "distance" | "support" => {
                    let number = |cell: &str| cell.parse::<f64>().expect("a number");
                    (number(cell) - number(other)).abs() <= TOLERANCE
                }
                _ => cell == other,
            };
            assert!(same, "{what}, {pair:?}, {column}: {cell} and {other}");
        }
    }
}

/// Puts the parcels of a matrix into another order, rows and columns alike.
fn shuffle(study: &Study, name: &str, step: usize) {
    study.edit_table(name, |rows| {
        let n = rows.len() - 1;
        // A step without a common divisor visits every parcel once.
        let order: Vec<usize> = std::iter::once(0)
            .chain((0..n).map(|i| 1 + (i * step + 3) % n))
            .collect();
        *rows = order
            .iter()
            .map(|&i| order.iter().map(|&j| rows[i][j].clone()).collect())
            .collect();
    });
}

#[test]
fn the_order_of_parcels_changes_no_answer() {
    let plain = Study::new();
    let shuffled = Study::with(|s| {
        shuffle(s, "a.csv", 7);
        shuffle(s, "b.csv", 5);
    });
    assert_ne!(plain.text("a.csv"), shuffled.text("a.csv"));
    for options in [&[][..], &["--embedding", "components", "--top", "all"]] {
        let (found, expected) = (shuffled.tables(options), plain.tables(options));
        assert_same_counterparts(&found, &expected, "shuffled");
        // The rows themselves come in the order of the matrix.
        let listed: Vec<String> = found
            .rows("positions.csv")
            .iter()
            .map(|row| row["parcel"].clone())
            .collect();
        assert_eq!(listed.len(), PARCELS_A.len() + PARCELS_B.len());
        assert_eq!(listed[0], PARCELS_A[3]);
        assert_eq!(listed[1], PARCELS_A[0]);
    }
}

#[test]
fn the_unit_of_counts_changes_no_answer() {
    for transform in ["log1p", "log-floor", "ranks"] {
        let study = |factor: f64| {
            Study::with(|s| {
                s.swap(
                    "study.toml",
                    "\"counts\"",
                    &format!("\"counts\"\ntransform = \"{transform}\""),
                );
                s.reweigh("a.csv", |_, _, cell| {
                    let count: f64 = cell.parse().expect("the study holds numbers");
                    (count * factor).to_string()
                });
            })
        };
        let expected = study(1.0).tables(&["--top", "all"]);
        for factor in [1e-6, 1e6] {
            let found = study(factor).tables(&["--top", "all"]);
            assert_same_counterparts(&found, &expected, &format!("{transform}, {factor}"));
        }
    }
}

/// Every setting that shapes numbers, with a value that is not the default.
const SETTINGS: [(&str, &str); 17] = [
    ("replicates", "40"),
    ("rank-replicates", "5"),
    ("seed", "9"),
    ("axes", "2"),
    ("embedding", "\"components\""),
    ("density-exponent", "0"),
    ("diffusion-time", "3"),
    ("evidence", "\"procrustes\""),
    ("evidence", "\"canonical\""),
    ("evidence", "\"fingerprint\""),
    ("evidence", "\"grown\""),
    ("evidence", "\"transport\""),
    ("mass", "\"free\""),
    ("transport-replicates", "24"),
    ("ridge", "2.5"),
    ("resampling", "\"ordinary\""),
    ("top", "2"),
];

/// Runs with these options and nothing else.
fn run_plainly(study: &Study, options: &[&str]) -> (Tables, serde_json::Value) {
    let scratch = tempfile::tempdir().expect("a temporary folder can be made");
    let out = scratch.path().join("run");
    Run::of(&mut study.command(&out, options)).succeeded();
    (Tables::of(&out), record(&out)["settings"].clone())
}

#[test]
fn a_setting_means_the_same_in_the_study_file_and_on_the_command_line() {
    let (plain, _) = run_plainly(&Study::new(), &["--replicates=20"]);
    let mut of_evidence = Vec::new();
    for (key, value) in SETTINGS {
        let bare = value.trim_matches('"');
        let option = format!("--{key}={bare}");
        let mut options = vec![option.as_str()];
        if key != "replicates" {
            options.push("--replicates=20");
        }
        let on_the_line = run_plainly(&Study::new(), &options);
        let in_the_file = Study::with(|s| {
            s.setting(&format!("{key} = {value}"));
            if key != "replicates" {
                s.setting("replicates = 20");
            }
        });
        let in_the_file = run_plainly(&in_the_file, &[]);
        assert!(in_the_file == on_the_line, "{key} = {value}");
        assert_eq!(
            on_the_line.1[key].to_string().trim_end_matches(".0"),
            value,
            "{key}"
        );
        assert!(on_the_line.0 != plain, "{key} = {value} changes nothing");
        if key == "evidence" {
            of_evidence.push(on_the_line.0);
        }
    }
    for (at, one) in of_evidence.iter().enumerate() {
        assert!(of_evidence[..at].iter().all(|other| other != one));
    }
}

#[test]
fn the_command_line_wins_over_the_study_file() {
    let study = Study::with(|s| {
        for line in ["replicates = 50", "seed = 9", "axes = 2", "top = \"all\""] {
            s.setting(line);
        }
    });
    let options = ["--replicates=20", "--seed=1", "--axes=auto", "--top=10"];
    assert!(run_plainly(&study, &options) == run_plainly(&Study::new(), &options));
}

#[test]
fn all_counterparts_are_listed_where_all_are_asked_for() {
    let tables = Study::new().tables(&["--top", "all"]);
    let mut lists: BTreeMap<(String, String), Vec<(String, usize)>> = BTreeMap::new();
    for row in tables.rows("counterparts.csv") {
        let rank = row["rank"].parse().expect("a rank is a number");
        lists
            .entry((row["from"].clone(), row["parcel"].clone()))
            .or_default()
            .push((row["counterpart"].clone(), rank));
    }
    // The first six of either species are landmarks.
    let (open_a, open_b) = (&PARCELS_A[6..], &PARCELS_B[6..]);
    assert_eq!(lists.len(), open_a.len() + open_b.len());
    for ((from, parcel), list) in lists {
        let candidates = if from == "Vole" { open_b } else { open_a };
        let found: BTreeSet<&str> = list.iter().map(|(label, _)| label.as_str()).collect();
        assert_eq!(found, candidates.iter().copied().collect(), "{parcel}");
        let ranks: Vec<usize> = list.iter().map(|(_, rank)| *rank).collect();
        assert_eq!(
            ranks,
            (1..=candidates.len()).collect::<Vec<_>>(),
            "{parcel}"
        );
    }
}

#[test]
fn a_short_list_is_the_beginning_of_the_long_one() {
    let study = Study::demo();
    let (all, three) = (
        study.tables(&["--top", "all"]),
        study.tables(&["--top", "3"]),
    );
    let mut lines = all.text("counterparts.csv").lines();
    let header = lines.next().expect("there is a header");
    let rank = header
        .split(',')
        .position(|column| column == "rank")
        .expect("there are ranks");
    let expected: Vec<&str> = std::iter::once(header)
        .chain(
            lines.filter(|line| ["1", "2", "3"].contains(&line.split(',').nth(rank).unwrap_or(""))),
        )
        .collect();
    let found: Vec<&str> = three.text("counterparts.csv").lines().collect();
    assert_eq!(found, expected);
    for name in ["positions.csv", "landmarks.csv", "axes.csv"] {
        assert_eq!(all.text(name), three.text(name), "{name}");
    }
}
