//! A small valid study in a temporary folder, of which a test changes one thing, and the built
//! program to run on it.

// Every test file is a program of its own and uses its share of this.
#![allow(dead_code)]

use std::collections::BTreeMap;
use std::ffi::OsStr;
use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Command, Output};

use serde_json::Value;
use tempfile::TempDir;

/// What a finished run consists of; its figures are in a folder.
pub const RUN: [&str; 8] = [
    "axes.csv",
    "counterparts.csv",
    "figures",
    "landmarks.csv",
    "parcels.csv",
    "positions.csv",
    "report.html",
    "run.json",
];
/// The tables among them.
pub const TABLES: [&str; 5] = [
    "axes.csv",
    "counterparts.csv",
    "landmarks.csv",
    "parcels.csv",
    "positions.csv",
];

/// Parcels of species a; the first six are landmarks.
pub const PARCELS_A: [&str; 10] = [
    "calcarine",
    "auditory",
    "motor",
    "orbital",
    "hippocampus",
    "insula",
    "temporal",
    "parietal",
    "cingulate",
    "somatic",
];
/// Parcels of species b: counterparts of a's in the same order, and two that have none.
pub const PARCELS_B: [&str; 12] = [
    "Calc", "Aud", "Mot", "Orb", "Hipp", "Ins", "Temp", "Par", "Cing", "Som", "Claus", "Tect",
];
/// Where the parcels lie; connections fall off with distance.
const PLACES: [[f64; 3]; 12] = [
    [0.0, 0.1, 0.0],
    [1.0, 0.2, 0.9],
    [0.9, 1.2, 0.1],
    [2.1, 0.1, 0.3],
    [1.2, 0.1, 2.0],
    [2.0, 1.3, 1.1],
    [0.4, 0.3, 1.4],
    [0.3, 1.0, 0.4],
    [1.6, 0.9, 0.2],
    [1.1, 1.5, 0.8],
    [1.9, 0.5, 1.7],
    [0.2, 1.6, 1.6],
];

/// A study file, two matrices and a landmark table, all valid until a test changes them.
pub struct Study {
    folder: TempDir,
}

impl Study {
    /// Writes the valid study.
    pub fn new() -> Study {
        let study = Study {
            folder: tempfile::tempdir().expect("a temporary folder can be made"),
        };
        study.write("study.toml", study_file());
        study.write("a.csv", csv(&matrix_a()));
        study.write("b.csv", csv(&matrix_b()));
        study.write("landmarks.csv", csv(&landmarks()));
        study
    }

    /// A copy of the demo study, which is larger: 90 and 118 parcels.
    pub fn demo() -> Study {
        let demo = Path::new(env!("CARGO_MANIFEST_DIR")).join("species-demo");
        let study = Study::new();
        for name in [
            "study.toml",
            "a.csv",
            "b.csv",
            "landmarks.csv",
            "a_parcels.csv",
            "b_parcels.csv",
        ] {
            study.write(name, read(&demo.join(name)));
        }
        study
    }

    /// The same study with one thing changed.
    pub fn with(change: impl FnOnce(&Study)) -> Study {
        let study = Study::new();
        change(&study);
        study
    }

    /// Path of a file of the study, or of anything beside it.
    pub fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    /// The folder `locate` is told to write to; absent at first.
    pub fn out(&self) -> PathBuf {
        self.path("out")
    }

    /// Writes a file of the study anew.
    pub fn write(&self, name: &str, bytes: impl AsRef<[u8]>) {
        fs::write(self.path(name), bytes).expect("the temporary folder can be written");
    }

    /// Deletes a file of the study.
    pub fn remove(&self, name: &str) {
        fs::remove_file(self.path(name)).expect("the file is there");
    }

    /// Reads a file of the study.
    pub fn text(&self, name: &str) -> String {
        fs::read_to_string(self.path(name)).expect("the file is there")
    }

    /// Rewrites a whole file.
    pub fn edit(&self, name: &str, change: impl FnOnce(String) -> String) {
        self.write(name, change(self.text(name)));
    }

    /// Replaces one piece of text that must occur exactly once, so that no test changes less or more
    /// than it says.
    pub fn swap(&self, name: &str, from: &str, to: &str) {
        let text = self.text(name);
        assert_eq!(text.matches(from).count(), 1, "{from:?} in {name}");
        self.write(name, text.replace(from, to));
    }

    /// Sets one cell of a table; line and column count from 1, as messages do.
    pub fn set(&self, name: &str, line: usize, column: usize, cell: &str) {
        self.edit_table(name, |rows| rows[line - 1][column - 1] = cell.to_owned());
    }

    /// Changes a table as rows of cells.
    pub fn edit_table(&self, name: &str, change: impl FnOnce(&mut Vec<Vec<String>>)) {
        let mut rows: Vec<Vec<String>> = self
            .text(name)
            .lines()
            .map(|line| line.split(',').map(str::to_owned).collect())
            .collect();
        change(&mut rows);
        self.write(name, csv(&rows));
    }

    /// Recomputes every weight of a matrix from its row, its column and what it was.
    pub fn reweigh(&self, name: &str, weight: impl Fn(usize, usize, &str) -> String) {
        self.edit_table(name, |rows| {
            for (i, row) in rows[1..].iter_mut().enumerate() {
                for (j, cell) in row[1..].iter_mut().enumerate() {
                    *cell = weight(i, j, cell);
                }
            }
        });
    }

    /// Adds a line under `[settings]`.
    pub fn setting(&self, line: &str) {
        self.edit("study.toml", |text| {
            if text.contains("[settings]") {
                text + line + "\n"
            } else {
                text + "\n[settings]\n" + line + "\n"
            }
        });
    }

    /// `kinmark locate STUDY --out OUT` with these options and nothing else.
    pub fn command(&self, out: &Path, options: &[&str]) -> Command {
        let mut command = program();
        command
            .arg("locate")
            .arg(self.path("study.toml"))
            .arg("--out")
            .arg(out)
            .args(options);
        command
    }

    /// Runs `kinmark locate STUDY --out OUT --replicates 20 --quiet` with more options.
    pub fn run_into(&self, out: &Path, options: &[&str]) -> Run {
        let mut command = self.command(out, &["--replicates", "20", "--quiet"]);
        Run::of(command.args(options))
    }

    /// The same into the study's own folder for results.
    pub fn run(&self, options: &[&str]) -> Run {
        self.run_into(&self.out(), options)
    }

    /// Runs into a fresh folder, which must succeed, and gives the tables.
    pub fn tables(&self, options: &[&str]) -> Tables {
        let scratch = tempfile::tempdir().expect("a temporary folder can be made");
        let out = scratch.path().join("run");
        self.run_into(&out, options).succeeded();
        Tables::of(&out)
    }
}

/// The built program.
pub fn program() -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_kinmark"));
    // A test must not depend on the terminal it is started from.
    command.env_remove("RUST_BACKTRACE").env("TERM", "dumb");
    command
}

/// What a run of the program said.
pub struct Run {
    /// Its exit code; `None` where a signal ended it.
    pub code: Option<i32>,
    /// Standard output.
    pub stdout: String,
    /// Standard error.
    pub stderr: String,
}

impl Run {
    /// Runs a command to its end.
    pub fn of(command: &mut Command) -> Run {
        Run::from(command.output().expect("the program can be started"))
    }

    /// Asserts success.
    pub fn succeeded(self) -> Run {
        assert_eq!(self.code, Some(0), "stderr: {}", self.stderr);
        self
    }

    /// Asserts that the run was refused as it should be: exit code 2, nothing on standard output and
    /// one line on standard error, which contains every fragment.
    pub fn refused(self, says: &[&str]) -> Run {
        let faults = self.faults(says);
        assert!(faults.is_empty(), "{}", faults.join("\n"));
        self
    }

    /// What is wrong with a refusal.
    pub fn faults(&self, says: &[&str]) -> Vec<String> {
        let mut faults = Vec::new();
        if self.code != Some(2) {
            faults.push(format!("exit code {:?}", self.code));
        }
        if !self.stdout.is_empty() {
            faults.push(format!("on standard output: {:?}", self.stdout));
        }
        if self.stderr.lines().count() != 1 || !self.stderr.starts_with("kinmark: ") {
            faults.push("not one line that starts with the program's name".to_owned());
        }
        for trace in ["panicked", "fault of the program", "src/", "unwrap"] {
            if self.stderr.contains(trace) {
                faults.push(format!("shows the program's inside: {trace:?}"));
            }
        }
        for fragment in says {
            if !self.stderr.contains(fragment) {
                faults.push(format!("does not say {fragment:?}"));
            }
        }
        if !faults.is_empty() {
            faults.push(format!("it says: {}", self.stderr.trim_end()));
        }
        faults
    }
}

impl From<Output> for Run {
    fn from(output: Output) -> Run {
        let text = |bytes| String::from_utf8(bytes).expect("the program speaks UTF-8");
        Run {
            code: output.status.code(),
            stdout: text(output.stdout),
            stderr: text(output.stderr),
        }
    }
}

/// The bytes of every table of a run.
#[derive(Debug, PartialEq, Eq)]
pub struct Tables(BTreeMap<&'static str, String>);

impl Tables {
    /// Reads the tables of a finished run.
    pub fn of(run: &Path) -> Tables {
        Tables(
            TABLES
                .into_iter()
                .map(|name| (name, read(&run.join(name))))
                .collect(),
        )
    }

    /// One table as it stands in its file.
    pub fn text(&self, name: &str) -> &str {
        &self.0[name]
    }

    /// One table as rows, each from column to cell.
    pub fn rows(&self, name: &str) -> Vec<BTreeMap<String, String>> {
        let mut reader = csv::Reader::from_reader(self.0[name].as_bytes());
        reader
            .deserialize()
            .map(|row| row.expect("the program writes proper tables"))
            .collect()
    }
}

/// Reads a text file that must be there.
pub fn read(path: &Path) -> String {
    fs::read_to_string(path).unwrap_or_else(|e| panic!("{}: {e}", path.display()))
}

/// The record of a finished run.
pub fn record(run: &Path) -> Value {
    serde_json::from_str(&read(&run.join("run.json"))).expect("run.json is JSON")
}

/// The warnings in a run's record.
pub fn recorded_warnings(run: &Path) -> Vec<String> {
    record(run)["warnings"]
        .as_array()
        .expect("warnings are a list")
        .iter()
        .map(|w| w.as_str().expect("a warning is text").to_owned())
        .collect()
}

/// Every file below a folder with its bytes, to see that nothing has changed.
pub fn contents(folder: &Path) -> BTreeMap<PathBuf, Vec<u8>> {
    let mut found = BTreeMap::new();
    let mut waiting = vec![folder.to_path_buf()];
    while let Some(folder) = waiting.pop() {
        for entry in fs::read_dir(&folder).expect("the folder can be listed") {
            let path = entry.expect("the folder can be listed").path();
            if path.is_dir() {
                waiting.push(path);
            } else {
                found.insert(path.clone(), fs::read(&path).expect("it can be read"));
            }
        }
    }
    found
}

/// Deletes a file, or a folder with all that is in it.
pub fn delete(path: &Path) {
    let deleted = match path.is_dir() {
        true => fs::remove_dir_all(path),
        false => fs::remove_file(path),
    };
    deleted.expect("it is there and can be deleted");
}

/// Names of what is in a folder, in order.
pub fn names(folder: &Path) -> Vec<String> {
    let mut names: Vec<String> = fs::read_dir(folder)
        .expect("the folder can be listed")
        .map(|entry| entry.expect("the folder can be listed").file_name())
        .map(|name: std::ffi::OsString| name.to_string_lossy().into_owned())
        .collect();
    names.sort();
    names
}

/// Whether a tool of the system ran and was content.
pub fn tool<S: AsRef<OsStr>>(name: &str, arguments: &[S]) -> bool {
    Command::new(name)
        .args(arguments)
        .output()
        .is_ok_and(|output| output.status.success())
}

/// The study file.
pub fn study_file() -> String {
    r#"title = "Vole and shrew"
landmarks = "landmarks.csv"

[species.a]
name = "Vole"
matrix = "a.csv"
weights = "counts"

[species.b]
name = "Shrew"
matrix = "b.csv"
weights = "fractions"
"#
    .to_owned()
}

/// Counts of species a: a directed network.
pub fn matrix_a() -> Vec<Vec<String>> {
    matrix(&PARCELS_A, |i, j| {
        let count = 900.0 * closeness(i, j) * wobble(7 * i + j);
        format!("{}", count.round())
    })
}

/// Fractions of species b: the same on both sides of the diagonal.
pub fn matrix_b() -> Vec<Vec<String>> {
    matrix(&PARCELS_B, |i, j| {
        let fraction = 0.05 * closeness(i, j) * wobble(3 * (i + j) + i * j);
        format!("{fraction:.6}")
    })
}

/// A labelled matrix with a zero diagonal.
pub fn matrix(labels: &[&str], weight: impl Fn(usize, usize) -> String) -> Vec<Vec<String>> {
    let mut rows = vec![vec!["parcel".to_owned()]];
    rows[0].extend(labels.iter().map(|label| (*label).to_owned()));
    for (i, label) in labels.iter().enumerate() {
        let mut row = vec![(*label).to_owned()];
        row.extend((0..labels.len()).map(|j| if i == j { "0".to_owned() } else { weight(i, j) }));
        rows.push(row);
    }
    rows
}

/// Six landmarks, each one parcel against one.
pub fn landmarks() -> Vec<Vec<String>> {
    let mut rows = vec![["landmark", "a", "b"].map(str::to_owned).to_vec()];
    let names = ["sight", "hearing", "movement", "value", "memory", "body"];
    for ((name, a), b) in names.iter().zip(PARCELS_A).zip(PARCELS_B) {
        rows.push([name, a, b].map(str::to_owned).to_vec());
    }
    rows
}

/// Rows of cells as comma-separated text.
pub fn csv(rows: &[Vec<String>]) -> String {
    rows.iter().map(|row| row.join(",") + "\n").collect()
}

/// Falls off with the distance between two parcels.
fn closeness(i: usize, j: usize) -> f64 {
    let square: f64 = PLACES[i]
        .iter()
        .zip(PLACES[j])
        .map(|(x, y)| (x - y).powi(2))
        .sum();
    (-1.6 * square.sqrt()).exp()
}

/// A factor near 1, so that no two connections are alike.
fn wobble(n: usize) -> f64 {
    0.9 + 0.2 * ((n * 37 % 101) as f64 / 101.0)
}
