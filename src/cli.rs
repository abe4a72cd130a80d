//! The only place that knows a terminal.

mod args;
mod progress;

use std::io::Write;
use std::sync::atomic::{AtomicBool, Ordering};
use std::sync::Arc;
use std::time::Instant;

use clap::Parser;
use kinmark::draft::draft;
use kinmark::error::Error;
use kinmark::page;
use kinmark::paint;
use kinmark::pipeline::{self, Answered, Finished};
use kinmark::prepare::prepare;
use kinmark::reopen::reopen;
use kinmark::report::{self, CAUTION};

use args::{Check, Cli, Command, Holdout, Inspect, Locate, New, Paint, Rank, Report};
use progress::Progress;

/// Exit code after Ctrl-C: 128 and the number of the signal.
const INTERRUPTED: i32 = 130;

/// Parses the command line and does what it says.
pub fn run() -> Result<(), Error> {
    match Cli::parse().command {
        Command::New(options) => new(&options),
        Command::Inspect(options) => inspect(&options),
        Command::Locate(options) => locate(&options),
        Command::Check(options) => check(&options),
        Command::Holdout(options) => holdout(&options),
        Command::Rank(options) => rank(&options),
        Command::Report(options) => report_of(&options),
        Command::Paint(options) => paint(options),
    }
}

fn locate(options: &Locate) -> Result<(), Error> {
    let started = Instant::now();
    let interrupted = stop_on_interrupt();
    let study = prepare(&options.study, options.request())?;
    let quiet = study.conduct.quiet;
    let progress = Progress::new(quiet, interrupted);
    let finished = pipeline::run(study, &options.out, &progress, started)?;
    show(&finished, quiet);
    Ok(())
}

fn new(options: &New) -> Result<(), Error> {
    let draft = draft(&options.folder)?;
    let file = draft.write(&options.folder)?;
    say(draft.account(&file).as_bytes());
    Ok(())
}

fn inspect(options: &Inspect) -> Result<(), Error> {
    let study = prepare(&options.study, options.request())?;
    let found = kinmark::inspect::inspect(&study);
    if options.json {
        say(&report::inspection_json(&study, &found));
    } else {
        say(report::inspection(&study, &found).as_bytes());
        say(format!("\n{CAUTION}\n").as_bytes());
    }
    Ok(())
}

fn check(options: &Check) -> Result<(), Error> {
    let started = Instant::now();
    let interrupted = stop_on_interrupt();
    let request = options.what()?;
    let asked = reopen(&options.asked, options.request())?;
    let quiet = asked.study.conduct.quiet;
    let progress = Progress::new(quiet, interrupted);
    let out = options.out.as_deref();
    let found = pipeline::check(asked, &request, options.json, out, &progress, started)?;
    answer(found, quiet, options.json)
}

fn holdout(options: &Holdout) -> Result<(), Error> {
    let started = Instant::now();
    let interrupted = stop_on_interrupt();
    let plan = options.plan()?;
    let asked = reopen(&options.asked, options.request())?;
    let quiet = asked.study.conduct.quiet;
    let progress = Progress::new(quiet, interrupted);
    let out = options.out.as_deref();
    let permutations = options.permutations();
    let found = pipeline::hold_out(asked, &plan, permutations, out, &progress, started)?;
    answer(found, quiet, false)
}

fn rank(options: &Rank) -> Result<(), Error> {
    let started = Instant::now();
    let interrupted = stop_on_interrupt();
    let asked = reopen(&options.asked, options.request())?;
    let quiet = asked.study.conduct.quiet;
    let progress = Progress::new(quiet, interrupted);
    let found = pipeline::rank(asked, options.out.as_deref(), &progress, started)?;
    answer(found, quiet, false)
}

/// Shows an answer, then writes what goes with it, so that nothing is lost where a folder refuses. For
/// machines the answer holds the caution itself.
fn answer(found: Answered, quiet: bool, for_machines: bool) -> Result<(), Error> {
    match for_machines {
        true => say(found.text.as_bytes()),
        false => say(format!("{}\n{CAUTION}\n", found.text).as_bytes()),
    }
    let mut err = std::io::stderr();
    if !quiet {
        for warning in &found.warnings {
            let _ = writeln!(err, "warning: {warning}");
        }
    }
    if let Some(folder) = found.destination.write()? {
        if !quiet {
            let _ = writeln!(err, "Tables: {}", folder.display());
        }
    }
    Ok(())
}

fn paint(options: Paint) -> Result<(), Error> {
    let painted = paint::paint(&options.request())?;
    let mut err = std::io::stderr();
    for warning in &painted.warnings {
        let _ = writeln!(err, "warning: {warning}");
    }
    say(format!("{}\n{CAUTION}\n", painted.account()).as_bytes());
    Ok(())
}

fn report_of(options: &Report) -> Result<(), Error> {
    let written = page::write(&options.run, options.replace)?;
    let mut text = String::new();
    for path in &written {
        text += &format!("{}\n", path.display());
    }
    say(format!("{text}\n{CAUTION}\n").as_bytes());
    Ok(())
}

/// Writes to standard output.
fn say(bytes: &[u8]) {
    let mut out = std::io::stdout();
    // A reader that has closed the pipe has seen enough: no error.
    let _ = out.write_all(bytes);
    let _ = out.flush();
}

/// Answers and the caution to standard output, the rest to standard error.
fn show(finished: &Finished, quiet: bool) {
    let (mut out, mut err) = (std::io::stdout(), std::io::stderr());
    // A reader that has closed the pipe has seen enough: no error.
    let _ = out.write_all(finished.summary.as_bytes());
    let _ = out.flush();
    if !quiet {
        for warning in &finished.warnings {
            let _ = writeln!(err, "warning: {warning}");
        }
        let _ = writeln!(err, "Tables and run record: {}", finished.folder.display());
        let page = finished.folder.join(report::PAGE);
        if page.exists() {
            let _ = writeln!(err, "To look at: {}", page.display());
        }
        let _ = err.flush();
    }
    let _ = writeln!(out, "\n{CAUTION}");
    let _ = out.flush();
}

/// Tells a flag when the user presses Ctrl-C, and gives up at once the second time.
fn stop_on_interrupt() -> Arc<AtomicBool> {
    let interrupted = Arc::new(AtomicBool::new(false));
    let flag = Arc::clone(&interrupted);
    let handler = ctrlc::set_handler(move || {
        if flag.swap(true, Ordering::Relaxed) {
            #[allow(clippy::exit)] // The first Ctrl-C asked nicely.
            std::process::exit(INTERRUPTED);
        }
    });
    if let Err(error) = handler {
        let _ = writeln!(
            std::io::stderr(),
            "warning: Ctrl-C will end the run without tidying up: {error}"
        );
    }
    interrupted
}
