//! What is known of parcels: their table, hemispheres matched and folded, distances.

mod common;
mod planted;

use std::collections::{BTreeMap, BTreeSet};
use std::fmt::Write as _;
use std::path::Path;

use common::{program, record, recorded_warnings, Run, Study, Tables, PARCELS_A, PARCELS_B};
use kinmark::domain::{Hemisphere, Side};
use kinmark::locate::{locate, Located};
use kinmark::prepare::{prepare, Study as Prepared};
use kinmark::settings::Request;
use kinmark::watch::Unwatched;
use planted::{label, Plan};
use rand::seq::SliceRandom;
use serde_json::Value;

/// The valid study with a table of parcels for species a.
fn described(table: &str) -> Study {
    Study::with(|study| {
        study.swap(
            "study.toml",
            "matrix = \"a.csv\"",
            "matrix = \"a.csv\"\nparcels = \"p.csv\"",
        );
        study.write("p.csv", table);
    })
}

/// A table with one row for each parcel of a, and cells by the parcel's place.
fn table(header: &str, cells: impl Fn(usize) -> String) -> String {
    let mut text = format!("label,{header}\n");
    for (at, label) in PARCELS_A.iter().enumerate() {
        writeln!(text, "{label},{}", cells(at)).unwrap();
    }
    text
}

fn inspected(study: &Path, options: &[&str]) -> Value {
    let run = Run::of(
        program()
            .arg("inspect")
            .arg(study)
            .arg("--json")
            .args(options),
    )
    .succeeded();
    serde_json::from_str(&run.stdout).unwrap()
}

fn mentions(list: &Value, words: &str) -> bool {
    list.as_array()
        .unwrap()
        .iter()
        .any(|s| s.as_str().unwrap().contains(words))
}

#[test]
fn faults_of_the_table_are_refused_with_their_place() {
    let spoilt = |from: &str, to: &str| {
        let sound = table("hemisphere,x,y,z,area", |at| format!("left,{at},1,2,3.5"));
        assert_eq!(sound.matches(from).count(), 1, "{from}");
        sound.replace(from, to)
    };
    let cases: Vec<(String, &[&str])> = vec![
        (
            spoilt("motor,left", "motor,dorsal"),
            &[
                "p.csv, line 4, column 2 (motor)",
                "\"dorsal\"",
                "left, l, lh; right, r, rh; midline",
            ],
        ),
        (
            spoilt("motor,left,2", "motor,left,"),
            &[
                "line 4, column 3 (motor)",
                "x, y and z",
                "all three or none",
            ],
        ),
        (
            spoilt("motor,left,2", "motor,left,inf"),
            &["line 4, column 3 (motor)", "finite number for x", "\"inf\""],
        ),
        (
            spoilt("motor,left,2,1,2,3.5", "motor,left,2,1,2,0"),
            &["line 4, column 6 (motor)", "area above 0", "found 0"],
        ),
        (
            spoilt("motor", "auditory"),
            &[
                "line 4, column 1 (auditory)",
                "came before, at line 3",
                "one row",
            ],
        ),
        (
            spoilt("motor", ""),
            &["line 4, column 1", "expected a parcel label", "empty"],
        ),
        (
            spoilt("label,", "parcel,"),
            &[
                "p.csv, line 1",
                "lacks the column \"label\"",
                "parcel,hemisphere",
                "long_name",
            ],
        ),
        (
            spoilt("hemisphere", "X"),
            &["line 1, column 3", "\"x\"", "came before"],
        ),
        (
            table("area,volume", |_| "3,4".to_owned()),
            &["line 1, column 3", "both an area and a volume", "keep one"],
        ),
        (
            table("area", |_| "large".to_owned()),
            &[
                "line 2, column 2 (calcarine)",
                "number for area",
                "\"large\"",
            ],
        ),
    ];
    for (text, says) in cases {
        let study = described(&text);
        study.run(&[]).refused(says);
        assert!(!study.out().exists());
    }
    let study = described("");
    study.remove("p.csv");
    study.run(&[]).refused(&["p.csv", "no such file"]);
}

#[test]
fn odd_tables_draw_warnings_and_are_used() {
    let study = described(
        "Label;HEMISPHERE;hemi;Colour;long_name\ncalcarine;LH;x;red;first sight area\nnowhere;R;;;\nmotor;n/a;;;\n",
    );
    study.run(&[]).succeeded();
    let warnings = recorded_warnings(&study.out()).join("\n");
    for said in [
        "column \"Colour\" is not used",
        "column \"hemi\" is not used",
        "not in the matrix and not used: nowhere",
        "no row for auditory, orbital, hippocampus",
    ] {
        assert!(warnings.contains(said), "{said}: {warnings}");
    }
    let positions = Tables::of(&study.out()).rows("positions.csv");
    let row = |parcel: &str| positions.iter().find(|r| r["parcel"] == parcel).unwrap();
    assert_eq!(row("calcarine")["hemisphere"], "left");
    assert_eq!(row("calcarine")["long_name"], "first sight area");
    assert_eq!(row("motor")["hemisphere"], "");
}

/// Every attribute comes out as it went in, and changes nothing else.
#[test]
fn attributes_are_carried_into_tables_record_and_summary() {
    let study = described(&table("hemisphere,x,y,z,volume,group,long_name", |at| {
        let side = ["L", "rh", "Bilateral"][at % 3];
        format!(
            "{side},{at}.5,-1,0.25,{},group {},area of {at}",
            at + 1,
            at % 2
        )
    }));
    let run = study.run(&[]).succeeded();
    assert!(
        run.stdout.contains("    (area of 9 - no long name)"),
        "{}",
        run.stdout
    );
    let given = Tables::of(&study.out());
    let at = |label: &str| PARCELS_A.iter().position(|l| *l == label).unwrap();
    for row in given.rows("positions.csv") {
        if row["species"] == "Shrew" {
            for column in [
                "hemisphere",
                "x",
                "z",
                "area",
                "volume",
                "group",
                "long_name",
            ] {
                assert_eq!(row[column], "");
            }
            continue;
        }
        let at = at(&row["parcel"]);
        assert_eq!(row["hemisphere"], ["left", "right", "midline"][at % 3]);
        assert_eq!(
            [&row["x"], &row["y"], &row["z"]],
            [&format!("{at}.5"), "-1", "0.25"]
        );
        assert_eq!(
            (row["volume"].as_str(), row["area"].as_str()),
            (&*format!("{}", at + 1), "")
        );
        assert_eq!(row["group"], format!("group {}", at % 2));
    }
    for row in given.rows("counterparts.csv") {
        let (own, other) = if row["from"] == "Vole" {
            ("parcel", "counterpart")
        } else {
            ("counterpart", "parcel")
        };
        let at = at(&row[own]);
        assert_eq!(row[&format!("{own}_long_name")], format!("area of {at}"));
        assert_eq!(
            row[&format!("{own}_hemisphere")],
            ["left", "right", "midline"][at % 3]
        );
        assert_eq!(row[&format!("{other}_group")], "");
    }
    let inputs = &record(&study.out())["inputs"];
    assert_eq!(inputs["parcels"]["a"]["sha256"].as_str().unwrap().len(), 64);
    assert_eq!(inputs["parcels"]["b"], Value::Null);

    // Without the table the columns are there and empty; every other cell is the same.
    let bare = Study::new().tables(&[]);
    for name in ["positions.csv", "counterparts.csv"] {
        let known = |column: &str| {
            ["hemisphere", "group", "long_name"]
                .iter()
                .any(|a| column.ends_with(a))
                || ["x", "y", "z", "area", "volume"].contains(&column)
        };
        let (with, without) = (given.rows(name), bare.rows(name));
        assert_eq!(with.len(), without.len());
        for (with, without) in with.iter().zip(&without) {
            for (column, cell) in without {
                let expected = if known(column) { "" } else { &with[column] };
                assert_eq!(cell, expected, "{name} {column}");
            }
        }
    }
    assert_eq!(record(&study.out())["settings"]["hemispheres"], "ignore");
}

/// 60 parcels of a planted pair, on both sides by turns, every tenth on the midline.
fn sided() -> (tempfile::TempDir, std::path::PathBuf) {
    let plan = Plan {
        parcels: 60,
        landmarks: 14,
        drift: 0.2,
        noise: 0.3,
        related: true,
    };
    let folder = tempfile::tempdir().unwrap();
    let study = plan.draw(3).write(folder.path());
    for side in ["a", "b"] {
        let mut text = "label,hemisphere\n".to_owned();
        for i in 0..60 {
            let hemisphere = if i % 10 == 9 {
                "midline"
            } else {
                ["left", "right"][i % 2]
            };
            writeln!(text, "{},{hemisphere}", label(side, i)).unwrap();
        }
        std::fs::write(folder.path().join(format!("p{side}.csv")), text).unwrap();
        let toml = std::fs::read_to_string(&study).unwrap();
        let from = format!("matrix = \"{side}.csv\"");
        let to = format!("{from}\nparcels = \"p{side}.csv\"");
        std::fs::write(&study, toml.replace(&from, &to)).unwrap();
    }
    (folder, study)
}

fn run(study: &Path, settings: &[(&str, &str)]) -> (Prepared, Located) {
    let mut asked = Request::default();
    for (key, value) in [("replicates", "30"), ("top", "all")]
        .iter()
        .chain(settings)
    {
        asked.set(key, value).unwrap();
    }
    let study = prepare(study, asked).unwrap();
    let located = locate(&study, &Unwatched).unwrap();
    (study, located)
}

#[test]
fn matched_sides_restrict_ranks_support_and_left_out_landmarks() {
    let (_folder, file) = sided();
    let (study, free) = run(&file, &[]);
    let (_, matched) = run(&file, &[("hemispheres", "match")]);
    let hemisphere =
        |side: Side, parcel: usize| study.species[side].attributes[parcel].hemisphere.unwrap();
    for side in Side::BOTH {
        let other = side.opposite();
        for (free, matched) in free.placements[side].iter().zip(&matched.placements[side]) {
            assert_eq!(free.parcel, matched.parcel);
            let own = hemisphere(side, matched.parcel);
            let admissible = |c: usize| {
                let other = hemisphere(other, c);
                own == other || own == Hemisphere::Midline || other == Hemisphere::Midline
            };
            let expected = free
                .counterparts
                .iter()
                .filter(|c| admissible(c.parcel))
                .count();
            assert_eq!(matched.counterparts.len(), expected);
            let ranks = matched.counterparts.iter().map(|c| c.rank);
            assert!(ranks.eq(1..=expected));
            for c in &matched.counterparts {
                assert!(admissible(c.parcel));
                assert!(c.rank_interval.1 as usize <= expected && c.rank_interval.0 >= 1);
            }
            // Support is shared out among the admissible alone.
            let total: f64 = matched.counterparts.iter().map(|c| c.support).sum();
            assert!((total - 1.0).abs() < 1e-9, "{total}");
        }
    }
    let (mut fewer, mut all) = (0, 0);
    for (at, (f, m)) in free.left_out.iter().zip(&matched.left_out).enumerate() {
        assert_eq!(f.asked, m.asked);
        for side in Side::BOTH {
            let own = hemisphere(side, m.asked[side]);
            let open = free.placements[side.opposite()].iter().map(|p| p.parcel);
            let admissible = |c: &usize| own.matches(hemisphere(side.opposite(), *c));
            let expected = open.filter(admissible).count() + 1;
            assert_eq!(m.placed[side].candidates, expected, "landmark {at}");
            assert!(m.placed[side].rank <= expected);
            fewer += m.placed[side].candidates;
            all += f.placed[side].candidates;
        }
    }
    assert!(fewer * 10 < all * 7, "{fewer} of {all}");
}

#[test]
fn the_order_of_parcels_changes_no_match() {
    let (folder, file) = sided();
    let (_, before) = run(&file, &[("hemispheres", "match")]);
    let mut rng = planted::rng(5);
    for name in ["pa.csv", "pb.csv"] {
        let path = folder.path().join(name);
        let text = std::fs::read_to_string(&path).unwrap();
        let mut lines: Vec<&str> = text.lines().collect();
        lines[1..].shuffle(&mut rng);
        std::fs::write(&path, lines.join("\n")).unwrap();
    }
    let path = folder.path().join("a.csv");
    let text = std::fs::read_to_string(&path).unwrap();
    let mut lines: Vec<&str> = text.lines().collect();
    lines[1..].shuffle(&mut rng);
    std::fs::write(&path, lines.join("\n")).unwrap();
    let (_, after) = run(&file, &[("hemispheres", "match")]);
    for side in Side::BOTH {
        let by_parcel = |located: &Located| -> BTreeMap<usize, _> {
            let placements = located.placements[side].iter();
            placements
                .map(|p| (p.parcel, p.counterparts.clone()))
                .collect()
        };
        assert_eq!(by_parcel(&before), by_parcel(&after));
    }
    assert_eq!(before.left_out, after.left_out);
}

#[test]
fn matching_needs_sides_and_landmarks_that_keep_to_them() {
    Study::new().run(&["--hemispheres", "match"]).refused(&[
        "study.toml",
        "needs the side of the parcels, but none of species a",
        "parcels = \"FILE\"",
    ]);
    let both = |b: &str| {
        let study = described(&table("hemisphere", |at| ["l", "r"][at % 2].to_owned()));
        study.swap(
            "study.toml",
            "matrix = \"b.csv\"",
            "matrix = \"b.csv\"\nparcels = \"q.csv\"",
        );
        study.write("q.csv", b);
        study
    };
    let of_b = |side: &dyn Fn(usize) -> &'static str| {
        let rows = PARCELS_B.iter().enumerate();
        rows.fold("label,hemisphere\n".to_owned(), |t, (at, l)| {
            t + &format!("{l},{}\n", side(at))
        })
    };
    both(&of_b(&|at| ["l", "r"][(at + 1) % 2]))
        .run(&["--hemispheres", "match"])
        .refused(&[
            "landmarks.csv",
            "\"sight\" pairs no parcels of one side",
            "ignore",
        ]);
    // Open parcels of a on the right find nobody; those whose side is not known find all.
    let study = both(&of_b(&|at| match at {
        0..=5 => ["l", "r"][at % 2],
        6 => "",
        _ => "l",
    }));
    study.edit("p.csv", |text| text.replace("temporal,l", "temporal,"));
    study.edit("q.csv", |text| text.replace("Temp,\n", "Temp,l\n"));
    study.run(&["--hemispheres", "match"]).succeeded();
    let warnings = recorded_warnings(&study.out()).join("\n");
    assert!(
        warnings.contains("Vole: no hemisphere is known of temporal"),
        "{warnings}"
    );
    assert!(
        warnings.contains("lies on the side of parietal, somatic"),
        "{warnings}"
    );
    let rows = Tables::of(&study.out()).rows("counterparts.csv");
    let count = |parcel: &str| rows.iter().filter(|r| r["parcel"] == parcel).count();
    assert_eq!(
        (count("parietal"), count("cingulate"), count("temporal")),
        (0, 6, 6)
    );
}

/// A brain of two alike hemispheres without links between them, folded, is one hemisphere: same
/// tables byte for byte but for the attributes. Landmarks may be named by either copy or by the
/// area, and both copies of a pair count once.
#[test]
fn a_folded_symmetric_brain_equals_one_hemisphere() {
    let one = Study::new();
    let single = one.tables(&["--top", "all"]);
    let double = Study::new();
    double.edit_table("a.csv", |rows| {
        let n = rows.len() - 1;
        let weights: Vec<Vec<String>> = rows[1..].iter().map(|r| r[1..].to_vec()).collect();
        let side = |s: usize| ["L", "R"][s];
        let mut header = vec!["parcel".to_owned()];
        for s in 0..2 {
            header.extend(PARCELS_A.iter().map(|l| format!("{l}_{}", side(s))));
        }
        *rows = vec![header];
        for s in 0..2 {
            for i in 0..n {
                let mut row = vec![format!("{}_{}", PARCELS_A[i], side(s))];
                for t in 0..2 {
                    row.extend((0..n).map(|j| {
                        if s == t {
                            weights[i][j].clone()
                        } else {
                            "0".to_owned()
                        }
                    }));
                }
                rows.push(row);
            }
        }
    });
    double.edit("landmarks.csv", |text| {
        text.replace("calcarine", "calcarine_R")
            .replace("motor", "motor_L;motor_R")
            + "hearing right,auditory_R,Aud\n"
    });
    let folded = double.tables(&["--top", "all", "--hemispheres", "fold"]);
    for name in common::TABLES {
        let strip = |tables: &Tables| -> Vec<BTreeMap<String, String>> {
            let mut rows = tables.rows(name);
            for row in &mut rows {
                row.retain(|column, _| !column.ends_with("hemisphere"));
            }
            rows
        };
        assert_eq!(strip(&folded), strip(&single), "{name}");
    }
    double.run(&["--hemispheres", "fold"]).succeeded();
    assert_eq!(record(&double.out())["species"]["a"]["folded"], 10);
    let warnings = recorded_warnings(&double.out()).join("\n");
    assert!(warnings.contains("hearing and hearing right"), "{warnings}");
    assert!(!warnings.contains("falls into"), "{warnings}");

    // Which is which is asked for where nobody said so.
    let said = inspected(&double.path("study.toml"), &["--hemispheres", "fold"]);
    assert!(!mentions(&said["suggestions"], "hemispheres"));
    double.write(
        "landmarks.csv",
        PARCELS_A[..4]
            .iter()
            .zip(PARCELS_B)
            .fold("landmark,a,b\n".to_owned(), |t, (a, b)| {
                t + &format!("{b},{a}_L;{a}_R,{b}\n")
            }),
    );
    let said = inspected(&double.path("study.toml"), &[]);
    assert!(
        mentions(&said["suggestions"], "Shrew seems to have one and Vole two"),
        "{said}"
    );
}

#[test]
fn folding_needs_copies() {
    Study::new().run(&["--hemispheres", "fold"]).refused(&[
        "study.toml",
        "no left and right copies",
        "V1-L, V1-R",
    ]);
}

#[test]
fn sums_beyond_the_range_of_numbers_are_refused() {
    let labels: Vec<String> = (0..8)
        .map(|i| format!("{}-{}", i / 2, ["L", "R"][i % 2]))
        .collect();
    let labels: Vec<&str> = labels.iter().map(String::as_str).collect();
    let study = Study::new();
    let huge = common::matrix(&labels, |_, _| "1.7e308".to_owned());
    study.write("a.csv", common::csv(&huge));
    study
        .run(&["--hemispheres", "fold"])
        .refused(&["a.csv", "too large", "divide all weights"]);
}

#[test]
fn inspect_asks_what_two_hemispheres_mean() {
    let (_folder, file) = sided();
    let said = inspected(&file, &[]);
    assert!(
        mentions(&said["suggestions"], "both maps have two"),
        "{said}"
    );
    let attributes = &said["species"]["a"]["attributes"];
    assert_eq!(
        (
            &attributes["left"],
            &attributes["right"],
            &attributes["midline"]
        ),
        (&30.into(), &24.into(), &6.into())
    );
    let said = inspected(&file, &["--hemispheres", "ignore"]);
    assert!(!mentions(&said["suggestions"], "hemispheres"));
}

/// Rank correlations of strength and distance against scipy (tests/data/parcels, made by the script
/// in it).
#[test]
fn strength_over_distance_agrees_with_scipy() {
    let data = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/data/parcels");
    let read = |name: &str| std::fs::read_to_string(data.join(name)).unwrap();
    let expected: Value = serde_json::from_str(&read("expected.json")).unwrap();
    let study = Study::new();
    study.write("a.csv", read("weights.csv"));
    study.write("places.csv", read("places.csv"));
    study.write("distances.csv", read("distances.csv"));
    let pairs = PARCELS_B[..6].iter().enumerate();
    let rows = pairs.fold("landmark,a,b\n".to_owned(), |t, (at, b)| {
        t + &format!("l{at},p{at:02},{b}\n")
    });
    study.write("landmarks.csv", rows);
    study.swap(
        "study.toml",
        "weights = \"counts\"",
        "weights = \"other\"\nparcels = \"places.csv\"",
    );
    let agrees = |source: &str| {
        let said = inspected(&study.path("study.toml"), &[]);
        let (found, expected) = (&said["species"]["a"]["distances"], &expected[source]);
        assert_eq!(found["from"], source);
        assert_eq!(found["pairs"], 14 * 13 / 2);
        assert_eq!(found["connections"], expected["connections"]);
        for (key, reference) in [
            ("smallest", "smallest"),
            ("largest", "largest"),
            ("strength-with-distance", "over_connections"),
            ("strength-with-distance-all", "over_all"),
        ] {
            let (x, y) = (
                found[key].as_f64().unwrap(),
                expected[reference].as_f64().unwrap(),
            );
            assert!((x - y).abs() < 1e-12, "{source} {key}: {x} {y}");
        }
        said
    };
    agrees("coordinates");
    study.swap(
        "study.toml",
        "parcels = \"places.csv\"",
        "parcels = \"places.csv\"\ndistances = \"distances.csv\"",
    );
    let said = agrees("file");
    assert_eq!(
        said["inputs"]["distances"]["a"]["sha256"]
            .as_str()
            .unwrap()
            .len(),
        64
    );
    let text = Run::of(program().arg("inspect").arg(study.path("study.toml")))
        .succeeded()
        .stdout;
    assert!(text.contains("falls (Spearman -0."), "{text}");
}

/// The valid study with distances between the parcels of a: ten apart for each step in their order.
fn apart(change: impl Fn(usize, usize) -> String) -> Study {
    let study = Study::new();
    study.write("d.csv", common::csv(&common::matrix(&PARCELS_A, change)));
    study.swap(
        "study.toml",
        "matrix = \"a.csv\"",
        "matrix = \"a.csv\"\ndistances = \"d.csv\"",
    );
    study
}

#[test]
fn distances_are_checked_and_change_no_table() {
    let steps = |i: usize, j: usize| (10 * i.abs_diff(j)).to_string();
    let study = apart(steps);
    assert_eq!(study.tables(&[]), Study::new().tables(&[]));

    let negative = apart(|i, j| {
        if (i, j) == (2, 1) {
            "-3".to_owned()
        } else {
            steps(i, j)
        }
    });
    negative.run(&[]).refused(&[
        "d.csv, line 4, column 3 (motor to auditory)",
        "0 or more",
        "-3",
    ]);
    let several = apart(steps);
    let file = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/data/formats/several.npz");
    several.write("d.csv", std::fs::read(file).unwrap());
    several
        .run(&[])
        .refused(&["d.csv", "several arrays", "matrix of distances alone"]);
    let short = apart(steps);
    short.edit_table("d.csv", |rows| {
        rows.remove(3);
        rows.iter_mut().for_each(|row| drop(row.remove(3)));
    });
    short
        .run(&[])
        .refused(&["d.csv", "no distances for 1 of the parcels", "motor"]);

    let warned = |study: &Study, words: &str| {
        let said = inspected(&study.path("study.toml"), &[]);
        assert!(mentions(&said["warnings"], words), "{said}");
        said["species"]["a"]["distances"].clone()
    };
    let lopsided = apart(|i, j| {
        if (i, j) == (0, 9) {
            "110".to_owned()
        } else {
            steps(i, j)
        }
    });
    let found = warned(&lopsided, "not symmetric (largest difference 20.000)");
    assert_eq!(found["largest"], 100.0);
    let half = apart(|i, j| if i < j { steps(i, j) } else { "0".to_owned() });
    let found = warned(&half, "one half of the matrix of distances");
    assert_eq!(
        (found["smallest"].as_f64(), found["largest"].as_f64()),
        (Some(10.0), Some(90.0))
    );
    let same = apart(|i, j| {
        if i + j == 1 {
            "0".to_owned()
        } else {
            steps(i, j)
        }
    });
    warned(&same, "1 pair of different parcels at the distance 0");
}

/// Bare numbers take the labels of the species.
#[test]
fn distances_without_labels_take_those_of_the_species() {
    let study = Study::new();
    let text = common::matrix_a();
    let rows: Vec<String> = text[1..].iter().map(|row| row[1..].join(",")).collect();
    study.write("a.csv", rows.join("\n"));
    study.write("labels.txt", PARCELS_A.join("\n"));
    let apart: Vec<String> = (0..10_usize)
        .map(|i| {
            (0..10)
                .map(|j| (0.5 + i.abs_diff(j) as f64).to_string())
                .collect::<Vec<_>>()
                .join(",")
        })
        .collect();
    study.write("d.csv", apart.join("\n"));
    study.swap(
        "study.toml",
        "matrix = \"a.csv\"",
        "matrix = \"a.csv\"\nlabels = \"labels.txt\"\ndistances = \"d.csv\"",
    );
    let said = inspected(&study.path("study.toml"), &[]);
    assert_eq!(said["species"]["a"]["distances"]["largest"], 9.5);
}

/// Parcels listed by `new`: both tables of the demo are found, and a table of strangers is not taken.
#[test]
fn new_finds_tables_of_parcels() {
    let study = described(&table("hemisphere", |_| "left".to_owned()));
    study.write("strange.csv", "label,area\nsomewhere,3\nelsewhere,4\n");
    study.remove("study.toml");
    Run::of(program().arg("new").arg(study.path(""))).succeeded();
    let text = study.text("study.toml");
    let lines: BTreeSet<&str> = text.lines().collect();
    assert!(lines.contains("parcels = \"p.csv\""), "{text}");
    assert!(
        text.contains("\"strange.csv\": it describes parcels"),
        "{text}"
    );
    assert_eq!(text.matches("\nparcels = ").count(), 1);
}
