//! The program: parse, run, print the error, choose the exit code.

#![cfg_attr(not(test), warn(clippy::unwrap_used))]

mod cli;

use std::io::Write;
use std::process::ExitCode;
use std::sync::atomic::{AtomicBool, Ordering};

fn main() -> ExitCode {
    let told = AtomicBool::new(false);
    std::panic::set_hook(Box::new(move |fault| {
        // Several workers may run into the same fault; one report will do.
        if told.swap(true, Ordering::Relaxed) {
            return;
        }
        let _ = writeln!(
            std::io::stderr(),
            "kinmark: a fault of the program, not of your input; please report this with the command and its input\n{fault}"
        );
    }));
    match std::panic::catch_unwind(cli::run) {
        Ok(Ok(())) => ExitCode::SUCCESS,
        Ok(Err(error)) => {
            let _ = writeln!(std::io::stderr(), "kinmark: {error}");
            ExitCode::from(error.exit_code())
        }
        Err(_) => ExitCode::FAILURE,
    }
}
