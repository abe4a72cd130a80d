//! Input the program must read whatever its dress, and input it reads with a warning.

mod common;

use common::{record, recorded_warnings, Run, Study, Tables, PARCELS_A, PARCELS_B};

const CSV: [&str; 3] = ["a.csv", "b.csv", "landmarks.csv"];

/// Changes every table of a study alike.
fn each_table(study: &Study, change: impl Fn(String) -> String) {
    for name in CSV {
        study.edit(name, &change);
    }
}

/// Gives a parcel another label wherever it stands; the label goes into the files as it is.
fn relabel(study: &Study, old: &str, new: &str) {
    each_table(study, |text| {
        text.lines()
            .map(|line| {
                let cells: Vec<&str> = line
                    .split(',')
                    .map(|cell| if cell == old { new } else { cell })
                    .collect();
                cells.join(",") + "\n"
            })
            .collect()
    });
}

/// Puts quotes around every cell.
fn quoted(text: &str) -> String {
    text.lines()
        .map(|line| format!("\"{}\"\n", line.replace(',', "\",\"")))
        .collect()
}

/// Adds a column to the landmark table, one cell for each landmark.
fn landmark_column(study: &Study, column: &str, cells: [&str; 6]) {
    study.edit_table("landmarks.csv", |rows| {
        rows[0].push(column.to_owned());
        for (row, cell) in rows[1..].iter_mut().zip(cells) {
            row.push(cell.to_owned());
        }
    });
}

/// Another way to write the same study.
type Dress = fn(&Study);

#[test]
fn the_dress_of_a_table_changes_nothing() {
    let study = Study::new();
    study.run(&[]).succeeded();
    let (plain, warnings) = (Tables::of(&study.out()), recorded_warnings(&study.out()));
    let dresses: [(&str, Dress); 16] = [
        ("byte-order mark", |s| {
            each_table(s, |text| format!("\u{feff}{text}"));
            s.edit("study.toml", |text| format!("\u{feff}{text}"));
        }),
        ("Windows line ends", |s| {
            each_table(s, |text| text.replace('\n', "\r\n"));
            s.edit("study.toml", |text| text.replace('\n', "\r\n"));
        }),
        ("old Mac line ends", |s| {
            each_table(s, |text| text.replace('\n', "\r"));
        }),
        ("semicolons", |s| {
            each_table(s, |text| text.replace(',', ";"))
        }),
        ("tabs", |s| each_table(s, |text| text.replace(',', "\t"))),
        ("another separator in every table", |s| {
            s.edit("a.csv", |text| text.replace(',', "\t"));
            s.edit("b.csv", |text| text.replace(',', ";"));
        }),
        ("quotes", |s| each_table(s, |text| quoted(&text))),
        ("blanks around cells", |s| {
            each_table(s, |text| text.replace(',', " , "));
        }),
        ("no line end at the end", |s| {
            each_table(s, |text| text.trim_end().to_owned());
        }),
        ("blank lines", |s| {
            each_table(s, |text| {
                "\n".to_owned() + &text.replace('\n', "\n\n") + "\n  \n"
            });
        }),
        ("empty rows below, as spreadsheets leave them", |s| {
            each_table(s, |text| text + ",,\n,,,,,\n");
        }),
        ("other words above the row labels", |s| {
            s.set("a.csv", 1, 1, "");
            s.set("b.csv", 1, 1, "from \\ to");
        }),
        ("other spellings of numbers", |s| {
            s.reweigh("a.csv", |_, _, cell| match cell {
                "0" => "0.000".to_owned(),
                _ => format!("+{cell}.0e0"),
            });
        }),
        ("a diagonal of missing entries", |s| {
            s.reweigh("a.csv", |i, j, cell| {
                if i == j { "NaN" } else { cell }.to_owned()
            });
            s.reweigh("b.csv", |i, j, cell| {
                if i == j { "" } else { cell }.to_owned()
            });
        }),
        ("landmark columns in another order", |s| {
            s.edit_table("landmarks.csv", |rows| {
                for row in rows {
                    row.rotate_left(1);
                }
            });
        }),
        ("optional columns that say what holds anyway", |s| {
            landmark_column(s, "weight", ["1", "", "1.0", "", "1e0", "1"]);
            landmark_column(s, "block", [""; 6]);
        }),
    ];
    for (name, dress) in dresses {
        let study = Study::with(dress);
        let run = study.run(&[]);
        assert_eq!((run.code, run.stderr.as_str()), (Some(0), ""), "{name}");
        assert!(Tables::of(&study.out()) == plain, "{name}");
        assert_eq!(recorded_warnings(&study.out()), warnings, "{name}");
    }
}

#[test]
fn columns_may_come_in_another_order_than_rows() {
    let study = Study::with(|s| {
        s.edit_table("a.csv", |rows| {
            for row in rows {
                row[1..].reverse();
            }
        });
    });
    assert!(study.tables(&[]) == Study::new().tables(&[]));
    warns(
        &study,
        &[],
        &["Vole: columns came in another order than rows"],
    );
}

/// Labels that need quotes in a table. They sort as the plain ones do, so that even the last bit of
/// every number is the same.
#[test]
fn labels_may_contain_separators() {
    let plain = Study::new().tables(&[]);
    let plain = plain.text("counterparts.csv");
    let both = |s: &Study| {
        relabel(s, "temporal", "\"temporal, anterior\"");
        relabel(s, "motor", "\"motor;premotor\"");
    };
    let found = Study::with(both).tables(&[]);
    assert_eq!(
        found
            .text("counterparts.csv")
            .replace("\"temporal, anterior\"", "temporal"),
        plain
    );
    assert_eq!(found.rows("landmarks.csv")[2]["a"], "motor;premotor");

    let found = Study::with(|s| {
        relabel(s, "temporal", "temporal/anterior");
        relabel(s, "motor", "\"motor;premotor\"");
        each_table(s, |text| text.replace(',', ";").replace('/', ","));
    })
    .tables(&[]);
    assert_eq!(
        found
            .text("counterparts.csv")
            .replace("\"temporal,anterior\"", "temporal"),
        plain
    );
    assert_eq!(found.rows("landmarks.csv")[2]["a"], "motor;premotor");
}

#[test]
fn labels_are_text_even_where_they_look_like_numbers() {
    let study = Study::with(|s| {
        for (old, new) in [
            ("calcarine", "10"),
            ("auditory", "2"),
            ("temporal", "02"),
            ("parietal", "1e1"),
            ("cingulate", "2.0"),
            ("somatic", "pariétal"),
        ] {
            relabel(s, old, new);
        }
    });
    let tables = study.tables(&[]);
    let landmarks = tables.rows("landmarks.csv");
    assert_eq!((&*landmarks[0]["a"], &*landmarks[1]["a"]), ("10", "2"));
    let mut placed: Vec<String> = tables
        .rows("counterparts.csv")
        .into_iter()
        .filter(|row| row["from"] == "Vole")
        .map(|row| row["parcel"].clone())
        .collect();
    placed.dedup();
    assert_eq!(placed, ["02", "1e1", "2.0", "pariétal"]);
    // Positions keep the order of the matrix.
    let listed: Vec<String> = tables
        .rows("positions.csv")
        .into_iter()
        .map(|row| row["parcel"].clone())
        .take(10)
        .collect();
    assert_eq!(
        listed,
        [
            "10",
            "2",
            "motor",
            "orbital",
            "hippocampus",
            "insula",
            "02",
            "1e1",
            "2.0",
            "pariétal"
        ]
    );
}

#[test]
fn a_landmark_may_be_a_group_and_say_more_about_itself() {
    let study = Study::with(|s| {
        s.set("landmarks.csv", 4, 2, "motor; somatic");
        s.set("landmarks.csv", 4, 3, "Mot;Som");
        landmark_column(s, "weight", ["", "", "0.5", "", "", ""]);
        landmark_column(s, "block", ["senses", "senses", "", "", "", ""]);
        landmark_column(s, "basis", ["cytoarchitecture"; 6]);
    });
    let run = study.run(&[]).succeeded();
    assert!(
        run.stdout.contains("6 landmarks in 5 blocks"),
        "{}",
        run.stdout
    );
    let tables = Tables::of(&study.out());
    let landmarks = tables.rows("landmarks.csv");
    let cells =
        |at: usize| ["a", "b", "weight", "block", "basis"].map(|c| landmarks[at][c].clone());
    assert_eq!(
        cells(0),
        ["calcarine", "Calc", "1", "senses", "cytoarchitecture"]
    );
    assert_eq!(
        cells(2),
        [
            "motor;somatic",
            "Mot;Som",
            "0.5",
            "movement",
            "cytoarchitecture"
        ]
    );
    for row in tables.rows("counterparts.csv") {
        assert!(!["somatic", "Som"].contains(&&*row["parcel"]));
        assert!(!["somatic", "Som"].contains(&&*row["counterpart"]));
    }
    let of_somatic = tables
        .rows("positions.csv")
        .into_iter()
        .find(|row| row["parcel"] == "somatic")
        .expect("every parcel has a position");
    assert_eq!(of_somatic["landmark"], "movement");
    let run = record(&study.out());
    assert_eq!(
        (&run["landmarks"], &run["landmark-blocks"]),
        (&6.into(), &5.into())
    );
}

/// Nothing is left to place then, but landmarks can still be left out and judged.
#[test]
fn every_parcel_may_be_a_landmark() {
    let study = Study::with(|s| {
        s.edit_table("landmarks.csv", |rows| {
            for at in 6..PARCELS_A.len() {
                let name = format!("field {at}");
                rows.push(vec![
                    name,
                    PARCELS_A[at].to_owned(),
                    PARCELS_B[at].to_owned(),
                ]);
            }
            let last = rows.len() - 1;
            rows[last][2] += ";Claus;Tect";
        });
    });
    let tables = study.tables(&[]);
    assert_eq!(tables.rows("landmarks.csv").len(), 10);
    assert_eq!(tables.rows("counterparts.csv").len(), 0);
    assert_eq!(tables.rows("positions.csv").len(), 22);
}

/// Runs the study with these options and asserts that the warning is on standard error and in the
/// record, and that `--quiet` keeps it from the first only.
fn warns(study: &Study, options: &[&str], says: &[&str]) {
    let loud = study.path("loud");
    let mut command = study.command(&loud, &["--replicates", "20"]);
    let run = Run::of(command.args(options)).succeeded();
    let warnings = recorded_warnings(&loud);
    let found = warnings
        .iter()
        .find(|warning| says.iter().all(|fragment| warning.contains(fragment)))
        .unwrap_or_else(|| panic!("{says:?} not among {warnings:?}"));
    assert!(
        run.stderr
            .lines()
            .any(|line| line == format!("warning: {found}")),
        "{found:?} not in {}",
        run.stderr
    );
    assert!(!run.stdout.contains("warning: "), "{}", run.stdout);

    let quiet = study.run(options).succeeded();
    assert_eq!(quiet.stderr, "");
    assert_eq!(recorded_warnings(&study.out()), warnings);
}

/// Asserts that a study gives no warning of this kind.
fn does_not_warn(study: &Study, of: &str) {
    study.run(&[]).succeeded();
    let warnings = recorded_warnings(&study.out());
    assert!(
        !warnings.iter().any(|warning| warning.contains(of)),
        "{warnings:?}"
    );
}

/// A study whose species b holds correlations.
fn with_correlations(change: impl FnOnce(&Study)) -> Study {
    Study::with(|s| {
        s.swap("study.toml", "\"fractions\"", "\"correlations\"");
        change(s);
    })
}

#[test]
fn a_network_that_falls_apart_is_told() {
    let study = Study::with(|s| {
        s.reweigh("a.csv", |i, j, cell| {
            let apart = (i < 6) != (j < 6);
            if apart { "0" } else { cell }.to_owned()
        });
    });
    warns(
        &study,
        &[],
        &["Vole: the network falls into 2 parts; outside the largest: temporal, parietal, cingulate, somatic"],
    );
}

#[test]
fn parcels_without_connections_are_set_aside_and_told() {
    let study = Study::with(|s| {
        s.reweigh("a.csv", |i, j, cell| {
            if i == 6 || j == 6 { "0" } else { cell }.to_owned()
        });
    });
    warns(
        &study,
        &[],
        &["Vole: set aside, no connection at all: temporal"],
    );
    let record = record(&study.out());
    assert_eq!(record["species"]["a"]["parcels"], PARCELS_A.len() - 1);
    assert_eq!(record["species"]["a"]["set-aside"][0], "temporal");
    let tables = Tables::of(&study.out());
    assert!(!tables.text("positions.csv").contains("temporal"));
    assert!(!tables.text("counterparts.csv").contains("temporal"));
}

#[test]
fn a_diagonal_that_is_no_data_is_told() {
    let study = Study::with(|s| s.set("a.csv", 4, 4, "5"));
    warns(&study, &[], &["Vole: on the diagonal 1 entry is not zero"]);
    assert!(study.tables(&[]) == Study::new().tables(&[]));
    let study = Study::with(|s| {
        s.reweigh("a.csv", |i, j, cell| {
            if i == j { "7" } else { cell }.to_owned()
        });
    });
    warns(
        &study,
        &[],
        &["Vole: on the diagonal 10 entries are not zero"],
    );
    // A parcel correlates with itself to 1 by nature.
    does_not_warn(
        &with_correlations(|s| {
            s.reweigh("b.csv", |i, j, cell| {
                if i == j { "1" } else { cell }.to_owned()
            });
        }),
        "diagonal",
    );
}

#[test]
fn odd_correlations_are_told() {
    does_not_warn(&with_correlations(|_| {}), "correlations");
    warns(
        &with_correlations(|s| s.set("b.csv", 2, 4, "0.511")),
        &[],
        &[
            "Shrew: the correlations are not symmetric",
            "largest difference 0.5",
            "mean of both halves",
        ],
    );
    warns(
        &with_correlations(|s| {
            s.set("b.csv", 3, 5, "-1.2");
            s.set("b.csv", 5, 3, "-1.2");
        }),
        &[],
        &["Shrew: off the diagonal 2 correlations are 1 or beyond, such as Aud with Orb; Fisher's z cuts at 0.999"],
    );
}

#[test]
fn odd_fractions_are_told() {
    warns(
        &Study::with(|s| s.set("b.csv", 3, 5, "1.5")),
        &[],
        &["Shrew: 1 fraction is above 1; are these counts?"],
    );
}

#[test]
fn odd_logarithms_are_told() {
    let logarithms = |s: &Study| {
        s.swap("study.toml", "\"fractions\"", "\"log10\"");
        s.reweigh("b.csv", |i, j, cell| {
            let weight: f64 = cell.parse().expect("the study holds numbers");
            if i == j {
                "0".to_owned()
            } else {
                format!("{:.4}", weight.log10())
            }
        });
    };
    does_not_warn(&Study::with(logarithms), "logarithms");
    warns(
        &Study::with(|s| {
            logarithms(s);
            s.set("b.csv", 2, 4, "0");
            s.set("b.csv", 4, 2, "0");
        }),
        &[],
        &[
            "Shrew: 2 logarithms are exactly 0",
            "give the weights themselves",
        ],
    );
}

#[test]
fn two_sides_of_one_area_in_two_blocks_are_told() {
    let sides = |s: &Study| {
        for (old, new) in [
            ("auditory", "lh-motor"),
            ("motor", "rh-motor"),
            ("Aud", "lh.Mot"),
            ("Mot", "rh.Mot"),
        ] {
            relabel(s, old, new);
        }
    };
    warns(
        &Study::with(sides),
        &[],
        &[
            "landmarks hearing and movement look like the two sides of one area",
            "give both the same block",
        ],
    );
    does_not_warn(
        &Study::with(|s| {
            sides(s);
            landmark_column(s, "block", ["", "motor", "motor", "", "", ""]);
        }),
        "two sides",
    );
}

#[test]
fn landmarks_that_rest_on_connectivity_are_told() {
    warns(
        &Study::with(|s| {
            let basis = [
                "cytoarchitecture",
                "connectivity",
                "physiology",
                "",
                "Connectivity",
                "x",
            ];
            landmark_column(s, "basis", basis);
        }),
        &[],
        &["homology of hearing, value, memory rests on connectivity or on nothing said"],
    );
}

#[test]
fn a_column_that_is_not_used_is_told() {
    let study = Study::with(|s| landmark_column(s, "comment", ["", "see notes", "", "", "", ""]));
    warns(
        &study,
        &[],
        &["landmark table: column \"comment\" is not used"],
    );
    assert!(study.tables(&[]) == Study::new().tables(&[]));
}

#[test]
fn more_axes_than_left_out_landmarks_can_fix_are_told() {
    warns(
        &Study::new(),
        &["--axes", "5"],
        &[
            "with one of 6 landmark blocks left out the rest do not fix 5 axes",
            "ask for fewer axes",
        ],
    );
}

#[test]
fn replicates_with_too_few_landmarks_are_told() {
    warns(
        &Study::new(),
        &["--resampling", "ordinary"],
        &[
            "of 20 replicates drew fewer distinct landmark blocks than axes + 1",
            "--resampling bayesian",
        ],
    );
}

/// Two groups that connect to each other only, all alike: one axis tells them apart, and that is all.
#[test]
fn an_embedding_with_few_axes_is_told() {
    warns(
        &Study::with(|s| {
            s.reweigh("a.csv", |i, j, _| {
                if i % 2 == j % 2 { "0" } else { "5" }.to_owned()
            });
        }),
        &[],
        &["Vole: the embedding yields only 1 axis"],
    );
}

/// All connections alike tell no parcel from another, so that axes mean nothing.
#[test]
fn landmarks_that_do_not_span_the_axes_are_told() {
    warns(
        &Study::with(|s| {
            s.reweigh("a.csv", |i, j, _| if i == j { "0" } else { "5" }.to_owned());
        }),
        &[],
        &[
            "the landmarks fix only",
            "of 3 axes",
            "positions are arbitrary",
        ],
    );
}

/// The demo study has one wrong landmark, and its answers name the right partner.
#[test]
fn a_landmark_that_the_others_contradict_is_told() {
    let study = Study::demo();
    warns(
        &study,
        &[],
        &[
            "landmark taste field is contradicted by the others",
            "check it",
        ],
    );
    let contradicted: Vec<String> = Tables::of(&study.out())
        .rows("landmarks.csv")
        .into_iter()
        .filter(|row| row["contradicted"] == "true")
        .map(|row| row["landmark"].clone())
        .collect();
    assert_eq!(contradicted, ["taste field"]);

    study.swap("landmarks.csv", "Grizix", "Wezent");
    let repaired = study.tables(&[]);
    assert!(repaired
        .rows("landmarks.csv")
        .iter()
        .all(|row| row["contradicted"] == "false"));
}
