//! Progress on standard error: a bar on a terminal, a plain line now and then elsewhere.

use std::io::{IsTerminal, Write};
use std::sync::atomic::{AtomicBool, AtomicUsize, Ordering};
use std::sync::{Arc, Mutex};
use std::time::{Duration, Instant};

use indicatif::{ProgressBar, ProgressStyle};
use kinmark::watch::Watch;

/// Between plain lines.
const EVERY: Duration = Duration::from_secs(10);

/// Shows how far a run is, and passes Ctrl-C on.
pub struct Progress {
    interrupted: Arc<AtomicBool>,
    shown: Shown,
    done: AtomicUsize,
}

enum Shown {
    Nothing,
    Bar(Mutex<Option<ProgressBar>>),
    Lines(Mutex<Stage>),
}

/// The stage that plain lines speak of.
struct Stage {
    name: String,
    steps: usize,
    last_line: Instant,
}

impl Progress {
    /// `interrupted` is set from outside when the user wants to stop.
    pub fn new(quiet: bool, interrupted: Arc<AtomicBool>) -> Progress {
        let shown = if quiet {
            Shown::Nothing
        } else if std::io::stderr().is_terminal() {
            Shown::Bar(Mutex::new(None))
        } else {
            Shown::Lines(Mutex::new(Stage {
                name: String::new(),
                steps: 0,
                last_line: Instant::now(),
            }))
        };
        Progress {
            interrupted,
            shown,
            done: AtomicUsize::new(0),
        }
    }
}

impl Watch for Progress {
    fn begin(&self, stage: &str, steps: usize) {
        self.done.store(0, Ordering::Relaxed);
        match &self.shown {
            Shown::Nothing => {}
            Shown::Bar(bar) => {
                let style = ProgressStyle::with_template("{msg:24} {wide_bar} {pos}/{len} {eta}")
                    .expect("the template is well formed");
                let fresh = ProgressBar::new(steps as u64).with_style(style);
                fresh.set_message(stage.to_owned());
                *lock(bar) = Some(fresh);
            }
            Shown::Lines(current) => {
                *lock(current) = Stage {
                    name: stage.to_owned(),
                    steps,
                    last_line: Instant::now(),
                };
            }
        }
    }

    fn advance(&self, steps: usize) {
        let done = self.done.fetch_add(steps, Ordering::Relaxed) + steps;
        match &self.shown {
            Shown::Nothing => {}
            Shown::Bar(bar) => {
                if let Some(bar) = &*lock(bar) {
                    bar.inc(steps as u64);
                }
            }
            Shown::Lines(stage) => {
                let mut stage = lock(stage);
                if stage.last_line.elapsed() >= EVERY {
                    stage.last_line = Instant::now();
                    // A closed standard error is no reason to stop the work.
                    let _ = writeln!(
                        std::io::stderr(),
                        "{}: {done} of {}",
                        stage.name,
                        stage.steps
                    );
                }
            }
        }
    }

    fn end(&self) {
        if let Shown::Bar(bar) = &self.shown {
            if let Some(bar) = lock(bar).take() {
                bar.finish_and_clear();
            }
        }
    }

    fn interrupted(&self) -> bool {
        self.interrupted.load(Ordering::Relaxed)
    }
}

/// Locks in spite of a panic elsewhere: what is shown matters less than that it is shown.
fn lock<T>(mutex: &Mutex<T>) -> std::sync::MutexGuard<'_, T> {
    mutex
        .lock()
        .unwrap_or_else(std::sync::PoisonError::into_inner)
}
