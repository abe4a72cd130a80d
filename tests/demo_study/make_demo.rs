//! Writes the files of the demo study into a directory.
//!
//! Usage: `cargo run --example make_demo -- [--seed N] DIR`
#![allow(clippy::print_stderr)] // A program of its own, small enough to speak for itself.

use std::path::{Path, PathBuf};
use std::process::ExitCode;

#[path = "mod.rs"]
mod demo_study;

/// How the program is called.
const USAGE: &str = "usage: make_demo [--seed N] DIR";

/// What the command line asks for.
struct Request {
    seed: u64,
    directory: PathBuf,
}

/// Reads the arguments after the program's name, or says what is wrong with them.
fn parse(mut arguments: impl Iterator<Item = String>) -> Result<Request, String> {
    let mut seed = demo_study::DEFAULT_SEED;
    let mut directory = None;
    while let Some(argument) = arguments.next() {
        if argument == "--seed" {
            let value = arguments.next().ok_or("--seed needs a whole number")?;
            seed = value
                .parse()
                .map_err(|_| format!("--seed needs a whole number, not \"{value}\""))?;
        } else if argument.starts_with('-') {
            return Err(format!("unknown option \"{argument}\""));
        } else if directory.replace(PathBuf::from(&argument)).is_some() {
            return Err(format!(
                "one directory only, \"{argument}\" is a second one"
            ));
        }
    }
    let directory = directory.ok_or("the directory to write to is missing")?;
    Ok(Request { seed, directory })
}

/// Writes every file of the study, making the directory if need be.
fn write(directory: &Path, seed: u64) -> std::io::Result<()> {
    std::fs::create_dir_all(directory)?;
    for (name, content) in demo_study::files(seed) {
        std::fs::write(directory.join(name), content)?;
    }
    Ok(())
}

fn main() -> ExitCode {
    let request = match parse(std::env::args().skip(1)) {
        Ok(request) => request,
        Err(fault) => {
            eprintln!("make_demo: {fault}\n{USAGE}");
            return ExitCode::from(2);
        }
    };
    match write(&request.directory, request.seed) {
        Ok(()) => ExitCode::SUCCESS,
        Err(fault) => {
            eprintln!("make_demo: {}: {fault}", request.directory.display());
            ExitCode::FAILURE
        }
    }
}
