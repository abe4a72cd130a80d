//! The folder of a run: what a run does with every state it can find there, and that whatever stops
//! it (a refusal, Ctrl-C, a kill, a full disk) leaves what was there before.

// Signals, links and mounts as Unix has them.
#![cfg(unix)]

mod common;

use std::fs;
use std::io::Write;
use std::path::{Path, PathBuf};
use std::process::{Child, Command, Stdio};
use std::time::{Duration, Instant};

use common::{contents, delete, names, program, read, record, tool, Run, Study, RUN};
use serde_json::{json, Value};
use sha2::{Digest, Sha256};
use tempfile::TempDir;

/// A study that has been run into its folder.
fn finished() -> Study {
    let study = Study::new();
    study.run(&[]).succeeded();
    study
}

/// The marker an unfinished run with these options leaves, which is how its record begins.
fn marker(options: &[&str]) -> String {
    let study = Study::new();
    let mut command = program();
    command
        .current_dir(study.path(""))
        .args(["locate", "study.toml", "--out", "out", "--quiet"])
        .args(options);
    Run::of(&mut command).succeeded();
    let record = read(&study.path("out/run.json"));
    let end = record.find(",\n  \"title\"").expect("the title comes next");
    record[..end].to_owned() + "\n}\n"
}

/// Runs in the study's own folder, so that paths in the marker are the same for every copy of it.
fn run_inside(study: &Study, options: &[&str]) -> Run {
    let mut command = program();
    command
        .current_dir(study.path(""))
        .args(["locate", "study.toml", "--out", "out", "--quiet"])
        .args(options);
    Run::of(&mut command)
}

/// Names of what lies beside the four files of a study.
fn beside(study: &Study) -> Vec<String> {
    let mut names = names(&study.path(""));
    names.retain(|name| !["study.toml", "a.csv", "b.csv", "landmarks.csv"].contains(&&**name));
    names
}

fn copy_folder(from: &Path, to: &Path) {
    fs::create_dir_all(to).expect("the temporary folder can be written");
    for name in names(from) {
        let (from, to) = (from.join(&name), to.join(&name));
        if from.is_dir() {
            copy_folder(&from, &to);
        } else {
            fs::copy(from, to).expect("the temporary folder can be written");
        }
    }
}

// ---------------------------------------------------------------------------------------------
// States of the folder.

#[test]
fn a_run_into_nothing_leaves_exactly_its_files() {
    let study = finished();
    assert_eq!(names(&study.out()), RUN);
    assert_eq!(beside(&study), ["out"]);
}

#[test]
fn missing_folders_above_are_made() {
    let study = Study::new();
    study.run_into(&study.path("new/deep/run"), &[]).succeeded();
    assert_eq!(names(&study.path("new/deep")), ["run"]);
    assert_eq!(names(&study.path("new/deep/run")), RUN);
}

#[test]
fn an_empty_folder_takes_a_run() {
    let study = Study::new();
    fs::create_dir(study.out()).unwrap();
    study.run(&[]).succeeded();
    assert_eq!(names(&study.out()), RUN);
    assert_eq!(beside(&study), ["out"]);
}

#[test]
fn a_link_to_a_folder_stays_a_link() {
    let study = Study::new();
    let real = study.path("real");
    fs::create_dir(&real).unwrap();
    std::os::unix::fs::symlink(&real, study.out()).unwrap();
    study.run(&[]).succeeded();
    study.run(&["--replace"]).succeeded();
    assert!(fs::symlink_metadata(study.out()).unwrap().is_symlink());
    assert_eq!(names(&real), RUN);
    assert_eq!(beside(&study), ["out", "real"]);
}

#[test]
fn a_finished_run_is_kept() {
    let study = finished();
    let before = contents(&study.out());
    study.run(&["--seed", "2"]).refused(&[
        "out holds a finished run",
        "name another folder",
        "--replace",
    ]);
    assert_eq!(contents(&study.out()), before);
    assert_eq!(beside(&study), ["out"]);
}

#[test]
fn a_finished_run_is_replaced_where_that_is_asked_for() {
    let study = finished();
    study.run(&["--seed", "2", "--replace"]).succeeded();
    assert_eq!(record(&study.out())["settings"]["seed"], 2);
    assert_eq!(names(&study.out()), RUN);
    study.setting("replace = true");
    study.run(&["--seed", "3"]).succeeded();
    assert_eq!(record(&study.out())["settings"]["seed"], 3);
    assert_eq!(names(&study.out()), RUN);
    assert_eq!(beside(&study), ["out"]);
}

/// What is no part of a run stays, whatever is asked for.
#[test]
fn foreign_files_are_left_alone() {
    type Mess = fn(&Path);
    let messes: [(&str, Mess, &str); 8] = [
        (
            "a file in a folder without a run",
            |out| {
                RUN.iter().for_each(|name| delete(&out.join(name)));
                fs::write(out.join("thesis.txt"), "three years of work").unwrap();
            },
            "thesis.txt",
        ),
        (
            "a file beside a finished run",
            |out| fs::write(out.join("notes.md"), "which of these is right?").unwrap(),
            "notes.md",
        ),
        (
            "a hidden file",
            |out| fs::write(out.join(".keep"), "").unwrap(),
            ".keep",
        ),
        (
            "a folder",
            |out| fs::create_dir(out.join("drafts")).unwrap(),
            "drafts",
        ),
        (
            "a file among the figures",
            |out| fs::write(out.join("figures/mine.svg"), "<svg/>").unwrap(),
            "figures/mine.svg",
        ),
        (
            "tables without a record",
            |out| fs::remove_file(out.join("run.json")).unwrap(),
            "axes.csv",
        ),
        (
            "the record of another program",
            |out| fs::write(out.join("run.json"), "{\"program\": \"other\"}").unwrap(),
            "axes.csv",
        ),
        (
            "a file beside an unfinished run",
            |out| {
                RUN.iter().for_each(|name| delete(&out.join(name)));
                fs::write(out.join("unfinished.json"), "").unwrap();
                fs::write(out.join("notes.md"), "stopped it").unwrap();
            },
            "notes.md",
        ),
    ];
    for (name, mess, found) in messes {
        for options in [&[][..], &["--replace"]] {
            let study = finished();
            mess(&study.out());
            let (before, listed) = (contents(&study.out()), names(&study.out()));
            let faults = study.run(options).faults(&[
                &format!("out holds {found:?}, which is no part of a run"),
                "left untouched",
                "name a new or empty folder",
            ]);
            assert!(faults.is_empty(), "{name}, {options:?}: {faults:?}");
            assert_eq!(contents(&study.out()), before, "{name}, {options:?}");
            assert_eq!(names(&study.out()), listed, "{name}, {options:?}");
            assert_eq!(beside(&study), ["out"], "{name}, {options:?}");
        }
    }
}

#[test]
fn an_unfinished_run_of_the_same_study_is_taken_over() {
    let study = Study::new();
    fs::create_dir(study.out()).unwrap();
    study.write("out/unfinished.json", marker(&["--replicates", "30"]));
    run_inside(&study, &["--replicates", "30"]).succeeded();
    assert_eq!(names(&study.out()), RUN);
    assert_eq!(beside(&study), ["out"]);
}

#[test]
fn an_unfinished_run_of_something_else_is_dropped_only_where_that_is_asked_for() {
    let same = marker(&["--replicates", "30"]);
    let others: [(&str, &[&str], String); 3] = [
        ("settings", &["--replicates", "40"], same.clone()),
        ("seed", &["--replicates", "30", "--seed", "2"], same.clone()),
        (
            "version",
            &["--replicates", "30"],
            same.replace(env!("CARGO_PKG_VERSION"), "0.0.0"),
        ),
    ];
    for (name, options, marker) in others {
        let study = Study::new();
        fs::create_dir(study.out()).unwrap();
        study.write("out/unfinished.json", &marker);
        run_inside(&study, options).refused(&[
            "out holds an unfinished run of other input, settings or version",
            "name another folder",
            "--replace",
        ]);
        assert_eq!(names(&study.out()), ["unfinished.json"], "{name}");
        assert_eq!(study.text("out/unfinished.json"), marker, "{name}");
        run_inside(&study, &[options, &["--replace"]].concat()).succeeded();
        assert_eq!(names(&study.out()), RUN, "{name}");
    }
    // Input counts by what is in the files, not by their names.
    let study = Study::new();
    fs::create_dir(study.out()).unwrap();
    study.write("out/unfinished.json", &same);
    study.set("a.csv", 2, 3, "102");
    run_inside(&study, &["--replicates", "30"]).refused(&["an unfinished run of other input"]);
    assert_eq!(study.text("out/unfinished.json"), same);
}

#[test]
fn a_marker_that_says_nothing_guards_nothing() {
    for garbage in ["", "{\n  \"program\": \"kin", "\0\0\0\0"] {
        let study = Study::new();
        fs::create_dir(study.out()).unwrap();
        study.write("out/unfinished.json", garbage);
        study.run(&[]).succeeded();
        assert_eq!(names(&study.out()), RUN, "{garbage:?}");
    }
}

#[test]
fn what_is_no_folder_is_refused() {
    let study = Study::new();
    study.write("file", "not a folder");
    fs::create_dir(study.path("inside")).unwrap();
    let before = contents(&study.path(""));
    let cases: [(PathBuf, &[&str]); 4] = [
        (study.path("file"), &["/file is not a folder"]),
        (study.path("file/run"), &["/file is not a folder"]),
        (study.path("file/deep/run"), &["/file is not a folder"]),
        (
            study.path("nowhere/.."),
            &["does not name a folder of its own", "name a new one"],
        ),
    ];
    for (out, says) in cases {
        study.run_into(&out, &[]).refused(says);
        study.run_into(&out, &["--replace"]).refused(says);
    }
    // The folder above is a folder, but not ours.
    for options in [&[][..], &["--replace"]] {
        let mut command = study.command(Path::new(".."), options);
        Run::of(command.current_dir(study.path("inside"))).refused(&["which is no part of a run"]);
    }
    study
        .run_into(Path::new("/"), &["--replace"])
        .refused(&["does not name a folder of its own"]);
    assert_eq!(contents(&study.path("")), before);
    assert_eq!(beside(&study), ["file", "inside"]);
}

/// A run needs room for a longer name beside its folder. That there is none, or no permission, must
/// not come out when hours have been spent: this run would take many minutes.
#[test]
fn a_place_that_will_not_take_the_result_is_refused_at_the_start() {
    let study = Study::new();
    let out = study.path(&"long".repeat(62));
    Run::of(&mut study.command(&out, &["--replicates", "10000000"])).refused(&[
        "kinmark-new",
        "name too long",
        "check",
    ]);
    assert_eq!(beside(&study), Vec::<String>::new());
}

#[test]
fn a_fault_in_the_input_touches_nothing() {
    let study = finished();
    let before = contents(&study.out());
    study.set("b.csv", 3, 4, "many");
    study
        .run(&["--replace"])
        .refused(&["b.csv, line 3, column 4"]);
    assert_eq!(contents(&study.out()), before);
    assert_eq!(beside(&study), ["out"]);
}

// ---------------------------------------------------------------------------------------------
// Kills at the very end of a run.

/// Two finished runs that differ, in folders named as those a run passes through.
fn killed_between_renames() -> (Study, PathBuf, PathBuf) {
    let study = Study::new();
    let (old, new) = (
        study.path(".out.kinmark-old"),
        study.path(".out.kinmark-new"),
    );
    study.run_into(&old, &["--seed", "1"]).succeeded();
    study.run_into(&new, &["--seed", "2"]).succeeded();
    (study, old, new)
}

#[test]
fn a_kill_between_both_renames_loses_neither_run() {
    let (study, _, new) = killed_between_renames();
    let whole: Vec<Vec<u8>> = contents(&new).into_values().collect();
    study.run(&[]).refused(&["out holds a finished run"]);
    let found: Vec<Vec<u8>> = contents(&study.out()).into_values().collect();
    assert!(found == whole, "the new run was complete, so it counts");
    assert_eq!(beside(&study), ["out"]);
}

#[test]
fn a_kill_before_the_new_run_is_whole_brings_back_the_old_one() {
    let (study, old, new) = killed_between_renames();
    fs::remove_file(new.join("run.json")).unwrap();
    let whole: Vec<Vec<u8>> = contents(&old).into_values().collect();
    study.run(&[]).refused(&["out holds a finished run"]);
    let found: Vec<Vec<u8>> = contents(&study.out()).into_values().collect();
    assert!(found == whole);
    // What is left of the new run goes with the next one.
    study.run(&["--replace"]).succeeded();
    assert_eq!(beside(&study), ["out"]);
}

#[test]
fn a_kill_before_the_last_deletion_is_tidied_up() {
    let (study, old, _) = killed_between_renames();
    fs::remove_dir_all(study.path(".out.kinmark-new")).unwrap();
    copy_folder(&old, &study.out());
    let before = contents(&study.out());
    study.run(&[]).refused(&["out holds a finished run"]);
    assert_eq!(contents(&study.out()), before);
    assert_eq!(beside(&study), ["out"]);
}

#[test]
fn a_kill_while_tables_were_written_is_tidied_up() {
    let study = Study::new();
    let half = study.path(".out.kinmark-new");
    fs::create_dir(&half).unwrap();
    fs::write(half.join("positions.csv"), "species,par").unwrap();
    study.run(&[]).succeeded();
    assert_eq!(names(&study.out()), RUN);
    assert_eq!(beside(&study), ["out"]);
}

// ---------------------------------------------------------------------------------------------
// Signals, and two runs at once.

/// A program that is ended with the test, whatever comes.
struct Running(Child);

impl Running {
    /// Starts a run that would take minutes, and waits until it has told who it is.
    fn long(study: &Study, out: &Path, options: &[&str]) -> Running {
        Running::start(
            study
                .command(out, &["--replicates", "5000000"])
                .args(options),
            out,
        )
    }

    fn start(command: &mut Command, out: &Path) -> Running {
        let running = Running(
            command
                .stdout(Stdio::piped())
                .stderr(Stdio::piped())
                .spawn()
                .expect("the program can be started"),
        );
        wait_until("the run has begun", || {
            fs::read(out.join("unfinished.json"))
                .is_ok_and(|bytes| serde_json::from_slice::<Value>(&bytes).is_ok())
        });
        running
    }

    fn signal(&self, name: &str) {
        assert!(tool("kill", &[format!("-{name}"), self.0.id().to_string()]));
    }

    /// Whether it has opened a file; where the system does not tell, after a second.
    fn holds_open(&self, file: &Path) -> bool {
        match fs::read_dir(format!("/proc/{}/fd", self.0.id())) {
            Ok(open) => open
                .flatten()
                .any(|entry| fs::read_link(entry.path()).is_ok_and(|path| path == file)),
            Err(_) => {
                std::thread::sleep(Duration::from_secs(1));
                true
            }
        }
    }

    /// Waits for its end.
    fn end(mut self) -> Run {
        let output = |pipe: Option<&mut dyn std::io::Read>| {
            let mut text = String::new();
            pipe.expect("it is piped")
                .read_to_string(&mut text)
                .expect("the program speaks UTF-8");
            text
        };
        let stdout = output(self.0.stdout.as_mut().map(|p| p as _));
        let stderr = output(self.0.stderr.as_mut().map(|p| p as _));
        Run {
            code: self.0.wait().expect("it can be waited for").code(),
            stdout,
            stderr,
        }
    }
}

impl Drop for Running {
    fn drop(&mut self) {
        let _ = self.0.kill();
        let _ = self.0.wait();
    }
}

fn wait_until(what: &str, holds: impl Fn() -> bool) {
    let start = Instant::now();
    while !holds() {
        assert!(start.elapsed() < Duration::from_secs(60), "never: {what}");
        std::thread::sleep(Duration::from_millis(2));
    }
}

#[test]
fn a_run_that_is_interrupted_leaves_nothing() {
    for signal in ["INT", "TERM"] {
        let study = Study::new();
        let deep = study.path("new/deep/run");
        let running = Running::long(&study, &deep, &[]);
        running.signal(signal);
        let run = running.end();
        assert_eq!(run.code, Some(130), "{signal}");
        assert_eq!(run.stdout, "", "{signal}");
        assert!(run.stderr.contains("interrupted"), "{}", run.stderr);
        assert!(run.stderr.contains("nothing was written"), "{}", run.stderr);
        assert_eq!(beside(&study), Vec::<String>::new(), "{signal}");
    }
}

#[test]
fn an_interrupted_replacement_leaves_the_finished_run() {
    let study = finished();
    let before = contents(&study.out());
    let mut command = study.command(&study.out(), &["--replicates", "5000000", "--replace"]);
    let running = Running(
        command
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .unwrap(),
    );
    let held = study.out().join("run.json").canonicalize().unwrap();
    wait_until("the run has begun", || running.holds_open(&held));
    study
        .run(&["--replace"])
        .refused(&["another run is writing into"]);
    running.signal("INT");
    assert_eq!(running.end().code, Some(130));
    assert_eq!(contents(&study.out()), before);
    assert_eq!(beside(&study), ["out"]);
}

#[test]
fn a_run_that_is_killed_tells_what_it_was_and_can_be_repeated() {
    let study = Study::new();
    let options = ["--replicates", "40000", "--seed", "7"];
    let mut running = Running::start(&mut study.command(&study.out(), &options), &study.out());
    running.0.kill().unwrap();
    assert_eq!(running.end().code, None);

    assert_eq!(names(&study.out()), ["unfinished.json"]);
    let marker: Value = serde_json::from_str(&study.text("out/unfinished.json")).unwrap();
    assert_eq!(marker["program"], "kinmark");
    assert_eq!(marker["version"], env!("CARGO_PKG_VERSION"));
    assert_eq!(marker["settings"]["replicates"], 40000);
    assert_eq!(marker["settings"]["seed"], 7);
    assert_eq!(marker["treatment"]["a"]["weights"], "counts");
    inputs_are_recorded(&study, &marker["inputs"]);

    study
        .run(&[])
        .refused(&["holds an unfinished run of other input, settings or version"]);
    Run::of(&mut study.command(&study.out(), &options)).succeeded();
    assert_eq!(names(&study.out()), RUN);
    assert_eq!(beside(&study), ["out"]);
}

#[test]
fn a_second_run_into_the_same_folder_is_refused() {
    let study = Study::new();
    let running = Running::long(&study, &study.out(), &[]);
    let before = contents(&study.out());
    let same = ["--replicates", "5000000"];
    Run::of(&mut study.command(&study.out(), &same)).refused(&[
        "another run is writing into",
        "out at this moment",
        "wait for it or name another folder",
    ]);
    // Whatever its settings, and even where it may replace.
    study.run(&[]).refused(&["another run is writing into"]);
    study
        .run(&["--replace"])
        .refused(&["another run is writing into"]);
    assert_eq!(contents(&study.out()), before);
    running.signal("INT");
    assert_eq!(running.end().code, Some(130));
    assert!(!study.out().exists());
}

#[test]
fn a_reader_that_has_seen_enough_is_no_error() {
    let study = Study::new();
    let mut child = study
        .command(&study.out(), &["--replicates", "20"])
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    drop(child.stdout.take());
    drop(child.stderr.take());
    assert_eq!(child.wait().unwrap().code(), Some(0));
    assert_eq!(names(&study.out()), RUN);
}

// ---------------------------------------------------------------------------------------------
// Disks that are full, read-only or the folder itself.

/// A small disk of its own, gone after the test.
struct Disk(TempDir);

impl Disk {
    /// Mounts a disk in memory; `None`, said aloud, where that is not allowed.
    fn mount(test: &str, size: &str) -> Option<Disk> {
        let at = tempfile::tempdir().expect("a temporary folder can be made");
        let place = at.path().to_string_lossy().into_owned();
        let size = format!("size={size}");
        if tool("mount", &["-t", "tmpfs", "-o", &size, "tmpfs", &place]) {
            return Some(Disk(at));
        }
        // Not by a macro, whose words the test harness would keep to itself.
        let _ = writeln!(
            std::io::stderr(),
            "\nSKIPPED: {test} needs the right to mount a disk; run it as root"
        );
        None
    }

    fn path(&self, name: &str) -> PathBuf {
        self.0.path().join(name)
    }

    fn root(&self) -> &Path {
        self.0.path()
    }

    fn make_read_only(&self) {
        let place = self.0.path().to_string_lossy().into_owned();
        assert!(tool("mount", &["-o", "remount,ro", &place]));
    }

    /// Fills it up but for some bytes.
    fn fill(&self, but: u64) {
        let mut filler = fs::File::create(self.path("filler")).expect("the disk can be written");
        while filler.write_all(&[b'x'; 4096]).is_ok() {}
        let full = filler.metadata().expect("the file is open").len();
        filler
            .set_len(full.saturating_sub(but))
            .expect("the disk can be written");
    }
}

impl Drop for Disk {
    fn drop(&mut self) {
        tool("umount", &[self.0.path()]);
    }
}

const FULL: [&str; 3] = ["cannot write", "No space left on device", "free space"];

#[test]
fn a_full_disk_leaves_no_folder() {
    let Some(disk) = Disk::mount("a_full_disk_leaves_no_folder", "64k") else {
        return;
    };
    // Without room for anything, and with room for the marker but not for the tables.
    for room in [0, 8192] {
        disk.fill(room);
        let study = Study::new();
        study.run_into(&disk.path("run"), &[]).refused(&FULL);
        assert_eq!(names(disk.root()), ["filler"], "{room} bytes left");
    }
}

#[test]
fn a_full_disk_leaves_the_finished_run() {
    let Some(disk) = Disk::mount("a_full_disk_leaves_the_finished_run", "4m") else {
        return;
    };
    let (study, out) = (Study::new(), disk.path("run"));
    study.run_into(&out, &[]).succeeded();
    let before = contents(&out);
    for room in [0, 8192] {
        disk.fill(room);
        study
            .run_into(&out, &["--replace", "--seed", "2"])
            .refused(&["No space left on device", "free space"]);
        assert_eq!(contents(&out), before, "{room} bytes left");
        assert_eq!(names(disk.root()), ["filler", "run"], "{room} bytes left");
    }
    fs::remove_file(disk.path("filler")).unwrap();
    study
        .run_into(&out, &["--replace", "--seed", "2"])
        .succeeded();
    assert_eq!(names(disk.root()), ["run"]);
}

#[test]
fn a_disk_is_no_folder_of_its_own() {
    let Some(disk) = Disk::mount("a_disk_is_no_folder_of_its_own", "1m") else {
        return;
    };
    let study = Study::new();
    let says = [
        "is where a file system is mounted",
        "name a folder inside it, such as",
    ];
    study.run_into(disk.root(), &[]).refused(&says);
    assert_eq!(names(disk.root()), Vec::<String>::new());

    let elsewhere = finished();
    copy_folder(&elsewhere.out(), disk.root());
    let before = contents(disk.root());
    study.run_into(disk.root(), &["--replace"]).refused(&says);
    assert_eq!(contents(disk.root()), before);
}

#[test]
fn a_disk_that_cannot_be_written_is_refused() {
    let Some(disk) = Disk::mount("a_disk_that_cannot_be_written_is_refused", "1m") else {
        return;
    };
    let (study, out) = (Study::new(), disk.path("run"));
    study.run_into(&out, &[]).succeeded();
    let before = contents(&out);
    disk.make_read_only();
    study
        .run_into(&disk.path("new/run"), &[])
        .refused(&["cannot create the folder", "Read-only file system"]);
    study.run_into(&out, &["--replace"]).refused(&[
        "run.json",
        "Read-only file system",
        "check permissions",
    ]);
    assert_eq!(contents(&out), before);
}

// ---------------------------------------------------------------------------------------------
// What the record says.

/// Checks the checksum of each of the four files.
fn inputs_are_recorded(study: &Study, inputs: &Value) {
    for (file, recorded) in [
        ("study.toml", &inputs["study"]),
        ("landmarks.csv", &inputs["landmarks"]),
        ("a.csv", &inputs["matrix"]["a"]),
        ("b.csv", &inputs["matrix"]["b"]),
    ] {
        let digest = Sha256::digest(study.text(file).as_bytes());
        let sum: String = digest.iter().map(|b| format!("{b:02x}")).collect();
        assert_eq!(recorded["sha256"], sum, "{file}");
        assert_eq!(
            recorded["path"],
            study.path(file).to_string_lossy().as_ref(),
            "{file}"
        );
    }
}

#[test]
fn the_record_says_what_was_done() {
    let study = Study::with(|s| {
        s.setting("ridge = 0.25");
        s.edit_table("landmarks.csv", |rows| {
            for (row, cell) in rows.iter_mut().zip(["block", "x", "x", "", "", "", ""]) {
                row.push(cell.to_owned());
            }
        });
    });
    let started = Instant::now();
    study
        .run(&[
            "--seed",
            "18446744073709551615",
            "--threads",
            "2",
            "--top",
            "all",
        ])
        .succeeded();
    let elapsed = started.elapsed().as_secs_f64();
    let record = record(&study.out());
    assert_eq!(record["program"], "kinmark");
    assert_eq!(record["version"], env!("CARGO_PKG_VERSION"));
    assert_eq!(
        record["settings"],
        json!({
            "replicates": 20,
            "rank-replicates": 20,
            "subject-replicates": 20,
            "seed": u64::MAX,
            "axes": "auto",
            "embedding": "diffusion",
            "density-exponent": 0.5,
            "diffusion-time": 1.0,
            "evidence": "mixture",
            "mass": "uniform",
            "transport-replicates": 120,
            "ridge": 0.25,
            "resampling": "bayesian",
            "hemispheres": "ignore",
            "top": "all",
            "level": 0.9,
        })
    );
    assert_eq!(
        record["treatment"]["b"],
        json!({
            "weights": "fractions",
            "transform": "log1p",
            "affinity": {"likeness": "cosine", "strongest": 1.0},
        })
    );
    inputs_are_recorded(&study, &record["inputs"]);
    assert_eq!(record["title"], "Vole and shrew");
    for (side, name, parcels) in [("a", "Vole", 10), ("b", "Shrew", 12)] {
        let species = &record["species"][side];
        assert_eq!(species["name"], name);
        assert_eq!(species["parcels"], parcels);
        assert_eq!(species["set-aside"], json!([]));
    }
    assert_eq!(record["landmarks"], 6);
    assert_eq!(record["landmark-blocks"], 5);
    assert!(record["warnings"].is_array());
    let mut files: Vec<String> = serde_json::from_value(record["files"].clone()).unwrap();
    files.sort();
    assert_eq!(files, common::TABLES);
    assert_eq!(record["threads"], 2);
    let wall = record["wall-seconds"].as_f64().unwrap();
    assert!(wall > 0.0 && wall <= elapsed, "{wall} of {elapsed}");
    assert!(record["caution"].as_str().unwrap().contains("hypothesis"));
}
