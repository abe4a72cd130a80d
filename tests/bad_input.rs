//! Input the program must refuse: exit code 2, nothing on standard output, one message that says
//! where the fault is, what was expected, what came and what to do, and no folder for results.

mod common;

use common::{Run, Study};

/// One way to spoil the valid study, and what the message must say about it.
struct Case {
    /// What is wrong, for the report of a failed test.
    name: &'static str,
    /// Does the damage.
    spoil: fn(&Study),
    /// Options of the command line.
    options: &'static [&'static str],
    /// Fragments of the message: place, finding and remedy.
    says: &'static [&'static str],
}

fn case(name: &'static str, spoil: fn(&Study), says: &'static [&'static str]) -> Case {
    Case {
        name,
        spoil,
        options: &[],
        says,
    }
}

impl Case {
    fn options(self, options: &'static [&'static str]) -> Case {
        Case { options, ..self }
    }
}

/// Runs all cases before it fails, so that one run shows every fault.
fn refuse(cases: &[Case]) {
    let mut faults = Vec::new();
    for case in cases {
        let study = Study::with(case.spoil);
        let run = study.run(case.options);
        let mut found = run.faults(case.says);
        if study.out().exists() {
            found.push("the folder for results was made".to_owned());
        }
        if !found.is_empty() {
            faults.push(format!("{}:\n    {}", case.name, found.join("\n    ")));
        }
    }
    assert!(faults.is_empty(), "\n{}", faults.join("\n"));
}

/// Makes a folder of a file.
fn folder_instead(study: &Study, name: &str) {
    study.remove(name);
    std::fs::create_dir(study.path(name)).expect("the temporary folder can be written");
}

/// Adds a column to the landmark table: its name and the cell of the first landmark; the other cells
/// stay empty.
fn landmark_column(study: &Study, column: &str, first: &str) {
    study.edit_table("landmarks.csv", |rows| {
        for (at, row) in rows.iter_mut().enumerate() {
            row.push(match at {
                0 => column.to_owned(),
                1 => first.to_owned(),
                _ => String::new(),
            });
        }
    });
}

/// Cuts all connections of a parcel; `at` counts from 1.
fn isolate(study: &Study, name: &str, at: usize) {
    study.edit_table(name, |rows| {
        for other in 1..rows.len() {
            rows[at][other] = "0".to_owned();
            rows[other][at] = "0".to_owned();
        }
    });
}

/// Keeps the first parcels of a matrix.
fn keep_parcels(study: &Study, name: &str, parcels: usize) {
    study.edit_table(name, |rows| {
        rows.truncate(parcels + 1);
        for row in rows {
            row.truncate(parcels + 1);
        }
    });
}

/// Deletes the connections between the first six parcels and the rest.
fn fall_apart(study: &Study, name: &str) {
    study.edit_table(name, |rows| {
        for i in 1..rows.len() {
            for j in 1..rows.len() {
                if (i <= 6) != (j <= 6) {
                    rows[i][j] = "0".to_owned();
                }
            }
        }
    });
}

#[test]
fn the_study_they_spoil_is_valid() {
    let study = Study::new();
    assert_eq!(study.run(&[]).succeeded().stderr, "");
}

#[test]
fn files_that_cannot_be_read() {
    refuse(&[
        case(
            "no study file",
            |s| s.remove("study.toml"),
            &["study.toml: ", "no such file", "check the path"],
        ),
        case(
            "no matrix",
            |s| s.remove("a.csv"),
            &["a.csv: ", "no such file", "relative to that file's folder"],
        ),
        case(
            "no landmark table",
            |s| s.remove("landmarks.csv"),
            &["landmarks.csv: ", "no such file"],
        ),
        case(
            "study file is a folder",
            |s| folder_instead(s, "study.toml"),
            &[
                "study.toml: ",
                "expected a file, found a folder",
                "name a file",
            ],
        ),
        case(
            "matrix is a folder",
            |s| folder_instead(s, "b.csv"),
            &["b.csv: ", "expected a file, found a folder"],
        ),
        case(
            "landmark table is a folder",
            |s| folder_instead(s, "landmarks.csv"),
            &["landmarks.csv: ", "expected a file, found a folder"],
        ),
        case(
            "empty study file",
            |s| s.write("study.toml", ""),
            &["study.toml: ", "the file is empty; check that it was saved"],
        ),
        case(
            "empty matrix",
            |s| s.write("a.csv", ""),
            &["a.csv: ", "the file is empty"],
        ),
        case(
            "empty landmark table",
            |s| s.write("landmarks.csv", ""),
            &["landmarks.csv: ", "the file is empty"],
        ),
        case(
            "blanks only",
            |s| s.write("a.csv", " \n\t\r\n  \n"),
            &["a.csv: ", "the file is empty"],
        ),
        case(
            "byte-order mark only",
            |s| s.write("a.csv", b"\xef\xbb\xbf"),
            &["a.csv: ", "the file is empty"],
        ),
        case(
            "separators only",
            |s| s.write("a.csv", ",,,\n,,,\n"),
            &["a.csv: ", "the file is empty"],
        ),
        case(
            "random bytes",
            |s| s.write("a.csv", b"\x93\x1f\xe0\x07\xfe\x81\x9c\xd3\x55\xaa"),
            &["a.csv, line 1: ", "UTF-8", "byte 0x93"],
        ),
        case(
            "random bytes for a study file",
            |s| s.write("study.toml", b"title = \"x\"\n\x93\x1f\xe0\x07"),
            &["study.toml, line 2: ", "UTF-8", "byte 0x93"],
        ),
        case(
            "NUL",
            |s| s.swap("a.csv", "\nmotor,", "\nmo\0tor,"),
            &["a.csv, line 4: ", "UTF-8", "byte 0x00"],
        ),
        case(
            "UTF-16, little end first",
            |s| {
                let text = s.text("a.csv");
                let mut bytes = b"\xff\xfe".to_vec();
                bytes.extend(text.encode_utf16().flat_map(u16::to_le_bytes));
                s.write("a.csv", bytes);
            },
            &["a.csv: ", "found UTF-16", "save the file again as UTF-8"],
        ),
        case(
            "UTF-16, big end first",
            |s| {
                let text = s.text("landmarks.csv");
                let mut bytes = b"\xfe\xff".to_vec();
                bytes.extend(text.encode_utf16().flat_map(u16::to_be_bytes));
                s.write("landmarks.csv", bytes);
            },
            &["landmarks.csv: ", "found UTF-16"],
        ),
        case(
            "Latin-1",
            |s| {
                let text = s.text("a.csv").replace("parietal", "pari?tal");
                let bytes: Vec<u8> = text
                    .bytes()
                    .map(|b| if b == b'?' { 0xe9 } else { b })
                    .collect();
                s.write("a.csv", bytes);
            },
            &[
                "a.csv, line 1: ",
                "found the byte 0xe9",
                "save the file again as UTF-8",
            ],
        ),
    ]);
}

#[test]
fn matrices_of_the_wrong_shape() {
    refuse(&[
        case(
            "short row",
            |s| s.edit_table("a.csv", |rows| rows[3].truncate(8)),
            &[
                "a.csv, line 4 (motor): ",
                "expected 11 cells",
                "found 8",
                "(comma)",
            ],
        ),
        case(
            "long row",
            |s| s.edit_table("b.csv", |rows| rows[12].push("0".to_owned())),
            &[
                "b.csv, line 13 (Tect): ",
                "expected 13 cells",
                "found 14",
                "remove cells",
            ],
        ),
        case(
            "header without a cell above the row labels",
            |s| {
                s.edit_table("a.csv", |rows| {
                    rows[0].remove(0);
                });
            },
            &[
                "a.csv, line 1: ",
                "header has 10 cells",
                "every row below it 11",
                "above the row labels",
            ],
        ),
        case(
            "quote without its partner",
            |s| s.set("a.csv", 4, 1, "\"motor"),
            &[
                "a.csv, line 4, column 1: ",
                "goes on over the end of the line",
                "close the quote",
            ],
        ),
        case(
            "label over two lines",
            |s| s.set("landmarks.csv", 5, 1, "\"high\nvalue\""),
            &[
                "landmarks.csv, line 5, column 1: ",
                "keep the cell on one line",
            ],
        ),
        case(
            "a row too few",
            |s| {
                s.edit_table("a.csv", |rows| {
                    rows.remove(6);
                });
            },
            &[
                "a.csv: ",
                "9 rows and 10 columns",
                "a row and a column",
                "\"insula\" has no row",
            ],
        ),
        case(
            "a column too few",
            |s| {
                s.edit_table("a.csv", |rows| {
                    for row in rows {
                        row.remove(2);
                    }
                });
            },
            &[
                "a.csv: ",
                "10 rows and 9 columns",
                "\"auditory\" has no column",
            ],
        ),
        case(
            "single column",
            |s| s.edit("a.csv", |text| text.replace(',', " ")),
            &[
                "a.csv, line 1: ",
                "a single column",
                "commas, semicolons or tabs",
            ],
        ),
        case(
            "too few parcels",
            |s| keep_parcels(s, "a.csv", 3),
            &[
                "a.csv: ",
                "3 parcels with connections",
                "at least 4 are needed",
                "give a matrix of more parcels",
            ],
        ),
        case(
            "header only",
            |s| keep_parcels(s, "a.csv", 0),
            &["a.csv, line 1: ", "a single column"],
        ),
    ]);
}

#[test]
fn labels_that_do_not_fit() {
    refuse(&[
        case(
            "row label twice",
            |s| s.set("a.csv", 5, 1, "motor"),
            &[
                "a.csv, line 5, column 1 (motor): ",
                "came before, at line 4, column 1",
                "a label of its own",
            ],
        ),
        case(
            "column label twice",
            |s| s.set("a.csv", 1, 7, "motor"),
            &[
                "a.csv, line 1, column 7 (motor): ",
                "came before, at line 1, column 4",
            ],
        ),
        case(
            "empty row label",
            |s| s.set("a.csv", 5, 1, ""),
            &[
                "a.csv, line 5, column 1: ",
                "expected a parcel label",
                "an empty cell",
            ],
        ),
        case(
            "empty column label",
            |s| s.set("b.csv", 1, 3, "  "),
            &["b.csv, line 1, column 3: ", "expected a parcel label"],
        ),
        case(
            "rows and columns spelled differently",
            |s| s.set("a.csv", 6, 1, "hipocampus"),
            &[
                "a.csv, line 6, column 1 (hipocampus): ",
                "no column label",
                "did you mean \"hippocampus\"?",
            ],
        ),
        case(
            "rows and columns of different parcels",
            |s| s.set("a.csv", 1, 2, "thalamus"),
            &[
                "a.csv, line 2, column 1 (calcarine): ",
                "no column label;",
                "the same parcels",
            ],
        ),
    ]);
}

#[test]
fn entries_that_are_no_weight() {
    refuse(&[
        case(
            "text",
            |s| s.set("a.csv", 4, 6, "many"),
            &[
                "a.csv, line 4, column 6 (motor to hippocampus): ",
                "expected a number",
                "found \"many\"",
                "remove text",
            ],
        ),
        case(
            "number with a unit",
            |s| s.set("a.csv", 4, 6, "12 mm"),
            &["a.csv, line 4, column 6", "found \"12 mm\"", "units"],
        ),
        case(
            "text, after blank lines",
            |s| {
                s.set("a.csv", 8, 2, "many");
                s.edit("a.csv", |text| {
                    text.replace("\nmotor", "\n\nmotor")
                        .replace("\ntemporal", "\n\n \n\ntemporal")
                });
            },
            &["a.csv, line 12, column 2 (temporal to calcarine): "],
        ),
        case(
            "text, lines ending as on Windows",
            |s| {
                s.set("a.csv", 8, 2, "many");
                s.edit("a.csv", |text| text.replace('\n', "\r\n"));
            },
            &["a.csv, line 8, column 2 (temporal to calcarine): "],
        ),
        case(
            "text, lines ending as on Windows, some blank",
            |s| {
                s.set("a.csv", 8, 2, "many");
                s.edit("a.csv", |text| {
                    text.replace("\ntemporal", "\n\ntemporal")
                        .replace('\n', "\r\n")
                });
            },
            &["a.csv, line 9, column 2 (temporal to calcarine): "],
        ),
        case(
            "text, lines ending as on old Macs",
            |s| {
                s.set("a.csv", 8, 2, "many");
                s.edit("a.csv", |text| text.replace('\n', "\r"));
            },
            &["a.csv, line 8, column 2 (temporal to calcarine): "],
        ),
        case(
            "inf",
            |s| s.set("a.csv", 11, 2, "inf"),
            &[
                "a.csv, line 11, column 2 (somatic to calcarine): ",
                "expected a finite number",
                "found \"inf\"; correct the entry",
            ],
        ),
        case(
            "-inf among logarithms",
            |s| {
                s.swap("study.toml", "\"fractions\"", "\"log10\"");
                s.set("b.csv", 2, 3, "-inf");
            },
            &[
                "b.csv, line 2, column 3 (Calc to Aud): ",
                "found \"-inf\"",
                "the logarithm of an absent connection",
            ],
        ),
        case(
            "too large to hold",
            |s| s.set("a.csv", 2, 11, "1e999"),
            &[
                "a.csv, line 2, column 11 (calcarine to somatic): ",
                "found \"1e999\"",
            ],
        ),
        case(
            "nothing but missing entries",
            |s| {
                s.edit_table("a.csv", |rows| {
                    for row in rows.iter_mut().skip(1) {
                        for cell in row.iter_mut().skip(1) {
                            *cell = "NA".to_owned();
                        }
                    }
                });
            },
            &["a.csv: ", "of no parcel were enough entries observed"],
        ),
        case(
            "negative count",
            |s| s.set("a.csv", 9, 3, "-4"),
            &[
                "a.csv, line 9, column 3 (parietal to auditory): ",
                "zero or more (counts)",
                "found -4",
                "weights = \"correlations\"",
            ],
        ),
        case(
            "negative fraction",
            |s| s.set("b.csv", 9, 3, "-0.1"),
            &["b.csv, line 9, column 3", "(fractions)", "found -0.1"],
        ),
        case(
            "negative class",
            |s| {
                s.swap("study.toml", "\"counts\"", "\"ordinal\"");
                s.set("a.csv", 9, 3, "-1");
            },
            &["a.csv, line 9, column 3", "(ordinal)", "found -1"],
        ),
        case(
            "decimal comma",
            |s| s.edit("b.csv", |text| text.replace(',', ";").replace('.', ",")),
            &[
                "b.csv, line 2, column 3 (Calc to Aud): ",
                "decimal point",
                "found \"0,0",
                "instead of commas",
            ],
        ),
        case(
            "a span no number can hold",
            |s| s.set("a.csv", 2, 3, "1e-320"),
            &[
                "a.csv: ",
                "species a yields no axis at all",
                "check that its weights",
            ],
        ),
        case(
            "nothing but zeros",
            |s| {
                s.edit_table("a.csv", |rows| {
                    for row in &mut rows[1..] {
                        row[1..].fill("0".to_owned());
                    }
                });
            },
            &[
                "a.csv: ",
                "every weight off the diagonal is zero",
                "some connections",
                "check what was exported",
            ],
        ),
    ]);
}

#[test]
fn landmark_tables() {
    refuse(&[
        case(
            "unknown parcel of a",
            |s| s.set("landmarks.csv", 4, 2, "motr"),
            &[
                "landmarks.csv, line 4, column 2 (movement): ",
                "species a (Vole) has no parcel \"motr\"",
                "did you mean \"motor\"?",
                "use a label of its matrix",
            ],
        ),
        case(
            "unknown parcel of b, several near",
            |s| s.set("landmarks.csv", 4, 3, "xar"),
            &[
                "landmarks.csv, line 4, column 3 (movement): ",
                "species b (Shrew) has no parcel \"xar\"",
                "\"Par\"",
            ],
        ),
        case(
            "unknown parcel, none near",
            |s| s.set("landmarks.csv", 4, 2, "thalamus"),
            &["has no parcel \"thalamus\";"],
        ),
        case(
            "unknown parcel of several",
            |s| s.set("landmarks.csv", 2, 2, "calcarine;parietol"),
            &[
                "landmarks.csv, line 2, column 2 (sight): ",
                "no parcel \"parietol\"",
                "\"parietal\"",
            ],
        ),
        case(
            "parcel in two landmarks",
            |s| s.set("landmarks.csv", 5, 3, "Aud"),
            &[
                "landmarks.csv, line 5, column 3 (value): ",
                "\"Aud\" of species b is already part of landmark \"hearing\" at line 3",
                "one landmark at most",
            ],
        ),
        case(
            "parcel twice in one landmark",
            |s| s.set("landmarks.csv", 5, 3, "Orb;Orb"),
            &[
                "landmarks.csv, line 5, column 3 (value): ",
                "\"value\" at line 5",
            ],
        ),
        case(
            "landmark twice",
            |s| s.set("landmarks.csv", 6, 1, "hearing"),
            &[
                "landmarks.csv, line 6, column 1 (hearing): ",
                "came before, at line 3",
                "a name of its own",
            ],
        ),
        case(
            "landmark without a name",
            |s| s.set("landmarks.csv", 6, 1, ""),
            &[
                "landmarks.csv, line 6, column 1: ",
                "expected a landmark's name",
                "an empty cell",
                "remove the row",
            ],
        ),
        case(
            "landmark without a parcel",
            |s| s.set("landmarks.csv", 6, 2, ""),
            &[
                "landmarks.csv, line 6, column 2 (memory): ",
                "expected a parcel",
                "an empty cell",
            ],
        ),
        case(
            "weight 0",
            |s| landmark_column(s, "weight", "0"),
            &[
                "landmarks.csv, line 2, column 4 (sight): ",
                "above 0 and at most 1",
                "found \"0\"",
                "empty for 1",
            ],
        ),
        case(
            "weight 1.5",
            |s| landmark_column(s, "weight", "1.5"),
            &["landmarks.csv, line 2, column 4 (sight): ", "found \"1.5\""],
        ),
        case(
            "weight in words",
            |s| landmark_column(s, "weight", "full"),
            &[
                "landmarks.csv, line 2, column 4 (sight): ",
                "found \"full\"",
            ],
        ),
        case(
            "weight NaN",
            |s| landmark_column(s, "weight", "NaN"),
            &["landmarks.csv, line 2, column 4 (sight): ", "found \"NaN\""],
        ),
        case(
            "no column b",
            |s| s.set("landmarks.csv", 1, 3, "other animal"),
            &[
                "landmarks.csv, line 1: ",
                "lacks the column \"b\"",
                "found landmark,a,other animal",
                "Expected landmark,a,b",
            ],
        ),
        case(
            "misspelt column",
            |s| landmark_column(s, "wieght", "1"),
            &[
                "landmarks.csv, line 1, column 4: ",
                "unknown column \"wieght\"",
                "did you mean \"weight\"?",
                "Rename or remove it",
            ],
        ),
        case(
            "column twice",
            |s| landmark_column(s, "a", "x"),
            &[
                "landmarks.csv, line 1, column 4: ",
                "column \"a\" came before",
                "keep one of them",
            ],
        ),
        case(
            "ragged row",
            |s| {
                s.edit_table("landmarks.csv", |rows| {
                    rows[3].pop();
                })
            },
            &[
                "landmarks.csv, line 4 (movement): ",
                "expected 3 cells",
                "found 2",
            ],
        ),
        case(
            "two landmarks",
            |s| s.edit_table("landmarks.csv", |rows| rows.truncate(3)),
            &[
                "landmarks.csv: ",
                "found 2 landmarks",
                "at least 3 are needed",
                "add rows",
            ],
        ),
        case(
            "header only",
            |s| s.edit_table("landmarks.csv", |rows| rows.truncate(1)),
            &["landmarks.csv: ", "found 0 landmarks"],
        ),
        case(
            "fewer landmarks than axes",
            |_| {},
            &[
                "landmarks.csv: ",
                "6 landmarks cannot fix 9 axes",
                "at least 10 are needed",
                "at most 5 axes",
            ],
        )
        .options(&["--axes", "9"]),
        case(
            "fewer blocks than axes",
            |s| {
                landmark_column(s, "block", "field");
                s.set("landmarks.csv", 3, 4, "field");
                s.set("landmarks.csv", 4, 4, "field");
            },
            &[
                "landmarks.csv: ",
                "6 landmarks in 4 blocks cannot fix 5 axes",
                "at most 3 axes",
            ],
        )
        .options(&["--axes", "5"]),
        case(
            "more axes than can be counted",
            |_| {},
            &[
                "landmarks.csv: ",
                "6 landmarks cannot fix 18446744073709551615 axes",
            ],
        )
        .options(&["--axes", "18446744073709551615"]),
        case(
            "two blocks",
            |s| {
                landmark_column(s, "block", "field");
                s.edit_table("landmarks.csv", |rows| rows.truncate(4));
                s.set("landmarks.csv", 3, 4, "field");
            },
            &[
                "landmarks.csv: ",
                "3 landmarks count as 2",
                "at least 3 blocks are needed",
                "add landmarks",
            ],
        ),
        case(
            "two blocks on one axis",
            |s| {
                landmark_column(s, "block", "field");
                s.edit_table("landmarks.csv", |rows| rows.truncate(4));
                s.set("landmarks.csv", 3, 4, "field");
            },
            &["landmarks.csv: ", "3 landmarks count as 2"],
        )
        .options(&["--axes", "1"]),
        case(
            "landmarks without connections, and too few others",
            |s| {
                s.edit_table("landmarks.csv", |rows| rows.truncate(4));
                isolate(s, "b.csv", 3);
            },
            &["landmarks.csv: ", "found 2 landmarks", "add rows"],
        ),
        case(
            "a landmark parcel that was not observed, and too few others",
            |s| {
                s.edit_table("landmarks.csv", |rows| rows.truncate(4));
                s.edit_table("a.csv", |rows| {
                    for at in 1..rows.len() {
                        rows[at][2] = String::new();
                        rows[2][at] = "NaN".to_owned();
                    }
                });
            },
            &["landmarks.csv: ", "found 2 landmarks"],
        ),
    ]);
}

#[test]
fn study_files() {
    refuse(&[
        case(
            "no TOML",
            |s| s.swap("study.toml", "matrix = \"a.csv\"", "matrix = a.csv\""),
            &["study.toml, line 6, column ", "not valid TOML"],
        ),
        case(
            "table twice",
            |s| s.edit("study.toml", |text| text + "[species.a]\nname = \"x\"\n"),
            &["study.toml, line 13", "not valid TOML", "duplicate key"],
        ),
        case(
            "unknown key at the top",
            |s| s.swap("study.toml", "title = ", "titel = "),
            &[
                "study.toml, line 1, column 1: ",
                "unknown key \"titel\" in the study file",
                "did you mean \"title\"?",
            ],
        ),
        case(
            "unknown key of a species",
            |s| s.swap("study.toml", "matrix = \"a.csv\"", "matrx = \"a.csv\""),
            &[
                "study.toml, line 6, column 1: ",
                "unknown key \"matrx\" in [species.a]",
                "did you mean \"matrix\"?",
                "Known here: name, matrix, subjects, weights",
            ],
        ),
        case(
            "unknown setting",
            |s| s.setting("replicats = 10"),
            &[
                "study.toml, line 15, column 1: ",
                "unknown key \"replicats\" in [settings]",
                "did you mean \"replicates\"?",
            ],
        ),
        case(
            "setting above all tables",
            |s| s.edit("study.toml", |text| format!("replicates = 50\n{text}")),
            &[
                "study.toml, line 1, column 1: ",
                "key \"replicates\" does not belong in the study file but in [settings]",
                "move it there",
            ],
        ),
        case(
            "setting of a species among the settings",
            |s| s.setting("weights = \"counts\""),
            &[
                "study.toml, line 15, column 1: ",
                "key \"weights\" does not belong in [settings] but in [species.a] or [species.b]",
            ],
        ),
        case(
            "a third species",
            |s| s.edit("study.toml", |text| text + "[species.c]\nname = \"x\"\n"),
            &[
                "study.toml, line 13",
                "unknown key \"c\" in [species]",
                "Known here: a, b",
            ],
        ),
        case(
            "unknown weights",
            |s| s.swap("study.toml", "\"counts\"", "\"count\""),
            &[
                "study.toml, line 7, column 1: ",
                "unknown value \"count\" for weights",
                "did you mean \"counts\"?",
                "Known: counts, fractions, log10",
            ],
        ),
        case(
            "unknown transform",
            |s| {
                s.swap(
                    "study.toml",
                    "\"counts\"",
                    "\"counts\"\ntransform = \"log1\"",
                );
            },
            &[
                "study.toml, line 8, column 1: ",
                "unknown value \"log1\" for transform",
                "did you mean \"log1p\"?",
            ],
        ),
        case(
            "unknown affinity",
            |s| {
                s.swap(
                    "study.toml",
                    "\"counts\"",
                    "\"counts\"\naffinity = \"cosin\"",
                );
            },
            &[
                "study.toml, line 8, column 1: ",
                "unknown value \"cosin\" for affinity",
                "did you mean \"cosine\"?",
            ],
        ),
        case(
            "unknown embedding",
            |s| s.setting("embedding = \"difusion\""),
            &[
                "study.toml, line 15, column 1: ",
                "unknown value \"difusion\" for embedding",
                "did you mean \"diffusion\"?",
            ],
        ),
        case(
            "number for a path",
            |s| s.swap("study.toml", "matrix = \"a.csv\"", "matrix = 3"),
            &[
                "study.toml, line 6, column 1: ",
                "matrix must be text in quotes, found 3\n",
            ],
        ),
        case(
            "list for a path",
            |s| s.swap("study.toml", "matrix = \"a.csv\"", "matrix = [\"a.csv\"]"),
            &[
                "study.toml, line 6, column 1: ",
                "matrix must be text in quotes",
                "array",
            ],
        ),
        case(
            "text for a table",
            |s| s.edit("study.toml", |text| format!("settings = 3\n{text}")),
            &[
                "study.toml, line 1, column 1: ",
                "settings must be a table such as [settings], found 3\n",
            ],
        ),
        case(
            "no weights",
            |s| s.swap("study.toml", "weights = \"counts\"\n", ""),
            &[
                "study.toml, line 4: [species.a] lacks the key \"weights\"",
                "add a line such as: weights = \"counts\"",
            ],
        ),
        case(
            "no matrix",
            |s| s.swap("study.toml", "matrix = \"b.csv\"\n", ""),
            &[
                "study.toml, line 9: [species.b] lacks the key \"matrix\"",
                "matrix = \"",
            ],
        ),
        case(
            "no landmarks",
            |s| s.swap("study.toml", "landmarks = \"landmarks.csv\"\n", ""),
            &[
                "study.toml: the study file lacks the key \"landmarks\"",
                "landmarks = \"",
            ],
        ),
        case(
            "no title",
            |s| s.swap("study.toml", "title = \"Vole and shrew\"\n", ""),
            &["study.toml: ", "lacks the key \"title\"", "title = \""],
        ),
        case(
            "no species",
            |s| s.write("study.toml", "title = \"x\"\nlandmarks = \"y\"\n"),
            &[
                "study.toml: there is no table [species.a]",
                "name, matrix and weights",
            ],
        ),
        case(
            "one species",
            |s| {
                s.edit("study.toml", |text| {
                    text[..text.find("[species.b]").expect("it is there")].to_owned()
                });
            },
            &["study.toml: there is no table [species.b]; add it"],
        ),
        case(
            "two species of one name",
            |s| s.swap("study.toml", "\"Shrew\"", "\"Vole\""),
            &[
                "study.toml, line 10, column 1: ",
                "both species are called \"Vole\"",
                "give them different names",
            ],
        ),
        case(
            "a blank name",
            |s| s.swap("study.toml", "\"Shrew\"", "\" \""),
            &[
                "study.toml, line 10, column 1: ",
                "name must be more than blanks",
            ],
        ),
        case(
            "transform that does not suit",
            |s| {
                s.swap(
                    "study.toml",
                    "\"counts\"",
                    "\"counts\"\ntransform = \"fisher-z\"",
                );
            },
            &[
                "study.toml, line 8, column 1: ",
                "transform \"fisher-z\" cannot be used on weights \"counts\"",
                "leave the key out",
            ],
        ),
        case(
            "share out of range",
            |s| s.swap("study.toml", "\"counts\"", "\"counts\"\nstrongest = 1.5"),
            &[
                "study.toml, line 8, column 1: ",
                "strongest must be a share above 0 and at most 1, found 1.5\n",
            ],
        ),
        case(
            "all scales of what falls apart",
            |s| fall_apart(s, "a.csv"),
            &[
                "a.csv: ",
                "diffusion-time 0",
                "species a falls apart",
                "set diffusion-time to 1",
            ],
        )
        .options(&["--diffusion-time", "0"]),
    ]);
}

/// Settings no run can use: key, value as in a study file, what the message calls for, what it finds.
const OUT_OF_RANGE: [(&str, &str, &str); 15] = [
    ("replicates", "1", "a whole number from 2 to 10000000"),
    ("replicates", "2.5", "a whole number from 2"),
    ("replicates", "10000001", "a whole number from 2"),
    ("rank-replicates", "0", "a whole number from 1 to 100000"),
    ("rank-replicates", "9999999999", "a whole number from 1"),
    ("seed", "-1", "a whole number of 0 or more"),
    ("threads", "0", "a whole number from 1 to 1024"),
    ("threads", "9999999999", "a whole number from 1"),
    ("axes", "0", "auto or a whole number of 1 or more"),
    ("axes", "many", "auto or a whole number"),
    ("density-exponent", "2", "a number from 0 to 1"),
    ("density-exponent", "nan", "a number from 0 to 1"),
    ("diffusion-time", "-0.5", "a number from 0 to 1000"),
    ("ridge", "-1", "a number"),
    ("top", "0", "all or a whole number of 1 or more"),
];

#[test]
fn settings_out_of_range_in_the_study_file() {
    for (key, value, expected) in OUT_OF_RANGE {
        let study = Study::with(|s| {
            let quoted = if value == "many" {
                "\"many\"".to_owned()
            } else {
                value.to_owned()
            };
            s.setting(&format!("{key} = {quoted}"));
        });
        let place = "study.toml, line 15, column 1: ";
        Run::of(&mut study.command(&study.out(), &[])).refused(&[
            place,
            &format!("{key} must be {expected}"),
            "found",
        ]);
        assert!(!study.out().exists());
    }
}

#[test]
fn settings_out_of_range_on_the_command_line() {
    for (key, value, expected) in OUT_OF_RANGE {
        let study = Study::new();
        let option = format!("--{key}={value}");
        usage_error(
            &study,
            &[&option],
            &[
                &format!("--{key}"),
                &format!("{key} must be {expected}"),
                value,
            ],
        );
    }
}

#[test]
fn options_that_do_not_exist() {
    let study = Study::new();
    usage_error(
        &study,
        &["--replicats", "10"],
        &["unexpected argument '--replicats'", "'--replicates'"],
    );
    usage_error(
        &study,
        &["--embedding", "pca"],
        &["--embedding", "\"pca\"", "diffusion, components"],
    );
    usage_error(
        &study,
        &["second.toml"],
        &["unexpected argument 'second.toml'"],
    );
    usage_error(
        &study,
        &["--seed", "1", "--seed", "2"],
        &["--seed", "multiple times"],
    );
}

#[test]
fn commands_that_do_not_exist() {
    for (arguments, says) in [
        (
            &["find", "study.toml"][..],
            "unrecognized subcommand 'find'",
        ),
        (&["locate"], "--out <DIR>"),
        (&[], "Usage: kinmark"),
    ] {
        let run = Run::of(common::program().args(arguments));
        assert_eq!(
            (run.code, run.stdout.as_str()),
            (Some(2), ""),
            "{arguments:?}"
        );
        assert!(run.stderr.contains(says), "{}", run.stderr);
    }
}

/// Usage errors come from the parser of the command line, which adds a word on how it is used.
fn usage_error(study: &Study, options: &[&str], says: &[&str]) {
    let run = Run::of(&mut study.command(&study.out(), options));
    assert_eq!(run.code, Some(2), "{options:?}");
    assert_eq!(run.stdout, "", "{options:?}");
    assert!(run.stderr.starts_with("error: "), "{}", run.stderr);
    assert!(run.stderr.contains("--help"), "{}", run.stderr);
    for fragment in says {
        assert!(
            run.stderr.contains(fragment),
            "{options:?}: {fragment:?} not in {}",
            run.stderr
        );
    }
    assert!(!study.out().exists());
}
